-- W9: what it costs to come in, and what a call costs.

local core = require "libration.core"
local lb = require "libration"

-- A new process each time: requiring again in this one would find everything
-- loaded. The child tells the processor time that it took; that of starting
-- the interpreter is not in it.
local function import(code)
  local command = ("lua5.4 -e 'local t = os.clock() %s io.write(os.clock() - t)'"):format(code)
  return function()
    local pipe = assert(io.popen(command, "r"))
    local taken = pipe:read("n")
    pipe:close()
    return assert(taken, "the child told no time")
  end
end

local rooms = 'local lb = require "libration" local _ = lb.units, lb.filter, lb.window, lb.demand'
local values = {}
for i = 1, 64 do
  values[i] = math.sin(2.385 * i) + 0.1 * math.cos(0.917 * i * i)
end
local x = core.samples.from(values)
local w = lb.window("hann"):samples(64)

return {
  { name = "W9 import", work = "require the library, fresh state", goal = 5e-3,
    ours = import 'require "libration"', peer = "w9_import.py" },
  { name = "W9 import and use", work = "four rooms loaded too",
    ours = import(rooms), peer = "w9_import.py" },
  { name = "W9 call", work = "effective value of 64 samples", goal = 0.5e-6, times = 100000,
    peer = "w9_rms.py", peer_times = 2000,
    ours = function()
      x:rms()
    end },
  { name = "W9 windowed", work = "windowed transform of 64 samples", times = 10000,
    peer = "w9_windowed.py", peer_times = 2000,
    ours = function()
      core.spectrum.windowed(x, w)
    end },
}
