--- libration: plan, prove and check measurements of spectral lines.
-- The front door: a table of rooms, each loaded when it is first used. It sets
-- no globals, and no module of the library requires it back.

local M = { version = require "libration.version" }

-- Public names and where they live: module, field (absent: the module), and
-- modules that add methods to what it makes.
local rooms = {
  bands = { "libration.bands" },
  load = { "libration.load", "load" },
  digitizer = { "libration.digitizer", "digitizer" },
  demand = { "libration.demand", "demand" },
  filter = { "libration.filter" },
  fraction = { "libration.fraction" },
  record = { "libration.record" },
  json = { "libration.json" },
  lines = { "libration.lines" },
  report = { "libration.report" },
  samples = { "libration.samples" },
  synth = { "libration.synth" },
  spectrum = { "libration.spectrum" },
  load_plan = { "libration.plan", "load", "libration.proof", "libration.measure" },
  plan = { "libration.plan", "plan", "libration.proof", "libration.measure" },
  plans = { "libration.plan", "plans", "libration.proof", "libration.measure" },
  survey = { "libration.survey" },
  units = { "libration.units" },
  window = { "libration.window", "window" },
  windows = { "libration.window", "windows" },
}

return setmetatable(M, {
  rooms = rooms, -- for the reference and the prompt
  __index = function(t, key)
    local room = rooms[key]
    if not room then
      return nil
    end
    for i = 3, #room do
      require(room[i])
    end
    local value = require(room[1])
    if room[2] then
      value = value[room[2]]
    end
    rawset(t, key, value)
    return value
  end,
})
