--- Everything that a plan expects in its record, as the plots draw it.

local core = require "libration.core"
local filter = require "libration.filter"

local M = {}

local function number(value)
  return type(value) == "number" and value or value:number()
end

--- Half of the interval that a source may stand in.
-- @param demand table: a demand
-- @param source table: one of its lines or interferers
-- @return number: Hz to either side of its nominal frequency
-- @usage
-- local half = require("libration.report.sources").half
-- local source = { driver = 1, lock_hz = 100, free_hz = 2 }
-- assert(half({ drivers = { { spread = 0.01 } } }, source) == 3)
function M.half(demand, source)
  local driver = demand.drivers and demand.drivers[source.driver]
  return math.abs(source.lock_hz or 0) * (driver and driver.spread or 0) + (source.free_hz or 0)
end

--- The plan's filter, ready to be asked.
-- @param plan table: a plan
-- @return table: what lb.filter makes; or nil when there is none
-- @usage
-- assert(require("libration.report.sources").filter { digitizer = {} } == nil)
function M.filter(plan)
  local spec = plan.digitizer and plan.digitizer.filter
  if not spec or spec.shape == "none" then
    return nil
  end
  if getmetatable(spec) == filter.Filter then
    return spec
  end
  return filter.new(spec)
end

local function source_of(plan, source, kind, response, rate)
  local hz = number(source.hz)
  local fold = { core.plan.fold(hz, rate) }
  if type(fold[1]) == "table" then
    fold = { fold[1].shown_hz, fold[1].zone, fold[1].inverted }
  end
  return {
    name = source.name, kind = kind, hz = hz, half = M.half(plan.demand, source),
    least = source.least or 0, most = source.most or 0,
    gain = response and response:gain(hz, rate) or 1,
    shown_hz = fold[1], zone = fold[2], inverted = fold[3],
  }
end

--- Lines and interferers of a plan with where they show in its record.
-- @param plan table: a plan with its demand and digitizer
-- @return table: list of { name, kind ("line" or "interferer"), hz, half (Hz to
-- either side), least, most (unit), gain (of the filter), shown_hz, zone, inverted }
-- @usage
-- local list = require("libration.report.sources").list { rate = lb.fraction.new(1000),
--   digitizer = {}, demand = { lines = { { name = "a", hz = lb.fraction.new(700) } } } }
-- assert(list[1].shown_hz == 300 and list[1].inverted)
function M.list(plan)
  local list, response, rate = {}, M.filter(plan), number(plan.rate)
  for _, line in ipairs(plan.demand.lines or {}) do
    list[#list + 1] = source_of(plan, line, "line", response, rate)
  end
  for _, other in ipairs(plan.demand.interferers or {}) do
    list[#list + 1] = source_of(plan, other, "interferer", response, rate)
  end
  return list
end

return M
