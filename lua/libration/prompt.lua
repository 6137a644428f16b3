--- The prompt: Lua's own, with the library at hand.
-- The interpreter reads, runs and prints, goes on reading while a statement is
-- incomplete, and stops what runs on Ctrl-C; this module only lays the table.

local M = {}

local greeting = [[
libration %s. lb is the library; help() shows what it has, help "plan" one part.
Ctrl-C stops what runs, Ctrl-D leaves.]]

local topics = {
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
-- @param thing any: nil for an overview, the name of a part, or a table
-- @return string: several lines
-- @usage
-- local about = require("libration.prompt").about
-- assert(about():find "lb.plan" and about("plan"):find "within")
-- assert(about { a = 1 } == "  .a  (number)")
function M.about(thing)
  if thing == nil then
    local lines = {}
    for _, text in pairs(topics) do
      lines[#lines + 1] = "  " .. text
    end
    table.sort(lines)
    return table.concat(lines, "\n")
  elseif type(thing) == "string" and topics[thing] then
    return topics[thing]
  elseif type(thing) == "table" then
    return fields_of(thing)
  end
  return tostring(thing) .. " (" .. type(thing) .. ")"
end

--- Lays the table: lb and help as globals, our prompt, a greeting.
-- @param lb table: the library
-- @return nothing
-- @usage
-- assert(type(require("libration.prompt").start) == "function")
function M.start(lb)
  _G.lb = lb
  function _G.help(thing)
    print(M.about(thing))
  end
  _G._PROMPT, _G._PROMPT2 = "lb> ", "... "
  print(greeting:format(lb.version))
end

return M
