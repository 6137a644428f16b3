--- The prompt: Lua's own, with the library at hand.
-- The interpreter reads, runs and prints, goes on reading while a statement is
-- incomplete, and stops what runs on Ctrl-C; this module only lays the table.

local options = require "libration.options"

local M = {}

local greeting = [[
libration %s. lb is the library; help() shows what it has, help "plan" one part.
Ctrl-C stops what runs, Ctrl-D leaves.]]

local topics = {
  bands = "lb.bands.levels, .groups, .cepstrum, .envelope, .kurtosis  bands, repetitions",
  filter = "lb.filter.new, .digital, .linear  responses before a converter, filters for records",
  lines = "lb.lines.list, .sine, .joint, .orders  lines of records: how large, how sure",
  samples = "lb.samples.new  blocks of numbers with arithmetic in one call",
  spectrum = "lb.spectrum.transform, .zoom  transforms of records",
  survey = "lb.survey.density, .lines, .averages  averaged spectra, coherence, responses",
  synth = "lb.synth.tones, .noise  signals with known contents",
  windows = "lb.windows()  the names of all windows",
  demand = "lb.demand { lines = { { name =, hz =, amplitude =, tolerance = } } }  what to measure",
  digitizer = "lb.digitizer { clock =, divider =, bits =, range = }  what the hardware can do",
  fraction = "lb.fraction.new(value)  exact numbers",
  json = "lb.json.encode(value)  a value as JSON",
  load = "lb.load(path)  demand and digitizer from a data file",
  load_plan = "lb.load_plan(path)  a saved plan",
  plan = "lb.plan(demand, digitizer, { within = \"60 s\" })  the shortest plan, or nil, refusal",
  plans = "lb.plans(demand, digitizer)  the trade-off front",
  record = "lb.record.read(path)  a record from a sound file; record:measure(plan)",
  report = "lb.report.text, .plot, .json, .csv  plans for people and machines",
  units = "lb.units.parse(\"25 ppm\")  quantities as people write them",
  window = "lb.window(name)  a window with its figures of merit",
}

-- The comment that stands above a function of the library, in its source.
local function docstring(f)
  local facts = debug.getinfo(f, "S")
  local file = facts.source:sub(1, 1) == "@" and io.open(facts.source:sub(2), "r")
  if not file then
    return nil
  end
  local block = {}
  for line in file:lines() do
    facts.linedefined = facts.linedefined - 1
    if facts.linedefined == 0 then
      break
    end
    local text = line:match "^%-%-%-? ?(.*)"
    local begins = line:sub(1, 3) == "---"
    block = not text and {} or begins and { text } or block
    block[#block + 1] = not begins and text or nil
  end
  file:close()
  return block[1] and table.concat(block, "\n")
end

local function fields_of(value)
  local names = {}
  for name, item in pairs(value) do
    if type(name) == "string" and name:sub(1, 1) ~= "_" then
      names[#names + 1] = "  ." .. name .. "  (" .. type(item) .. ")"
    end
  end
  table.sort(names)
  return table.concat(names, "\n")
end

--- What can be said about a thing, briefly.
-- @param thing any: nil for an overview, the name of a part, a function of the library (what its
-- source says of it: parameters, options, results), or a table
-- @param lb table: the library, to tell more of a part that is a function
-- @return string: several lines
-- @usage
-- local about = require("libration.prompt").about
-- assert(about():find "lb.plan" and about("plan"):find "within")
-- assert(about("plan", lb):find "effort_s" and about(lb.plan):find "undersample")
-- assert(about { a = 1 } == "  .a  (number)")
function M.about(thing, lb)
  if thing == nil or thing == lb then
    local lines = {}
    for _, text in pairs(topics) do
      lines[#lines + 1] = "  " .. text
    end
    table.sort(lines)
    return table.concat(lines, "\n")
  elseif type(thing) == "string" and topics[thing] then
    local part = lb and lb[thing]
    local more = type(part) == "function" and docstring(part)
    return topics[thing] .. (more and "\n\n" .. more or "")
  elseif type(thing) == "function" then
    return docstring(thing) or tostring(thing)
  elseif type(thing) == "table" then
    return fields_of(thing)
  end
  return tostring(thing) .. " (" .. type(thing) .. ")"
end

local function letters(word)
  local list = { word:lower():byte(1, 100) }
  table.sort(list)
  return string.char(table.unpack(list))
end

-- The name meant by a misspelt one; two letters that changed places are common.
local function meant(word, names)
  for _, name in ipairs(names) do
    if letters(name) == letters(word) then
      return name
    end
  end
  return options.nearest(word, names)
end

-- At the prompt a name that the library does not have is a mistake, not nil.
local function make_strict(lb)
  local meta = getmetatable(lb)
  local names, find = {}, meta.__index
  for name in pairs(meta.rooms) do
    names[#names + 1] = name
  end
  table.sort(names)
  function meta.__index(t, key)
    local value = find(t, key)
    if value == nil and type(key) == "string" then
      local near = meant(key, names)
      error(("lb.%s is not there%s; lb has %s"):format(key,
        near and ("; did you mean lb.%s?"):format(near) or "", table.concat(names, ", ")), 2)
    end
    return value
  end
end

--- Lays the table: lb and help as globals, our prompt, a greeting.
-- @param lb table: the library
-- @return nothing
-- @usage
-- assert(type(require("libration.prompt").start) == "function")
function M.start(lb)
  make_strict(lb)
  _G.lb = lb
  function _G.help(thing)
    print(M.about(thing, lb))
  end
  _G._PROMPT, _G._PROMPT2 = "lb> ", "... "
  print(greeting:format(lb.version))
end

return M
