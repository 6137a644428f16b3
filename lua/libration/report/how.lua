--- How a plan measures, in words: rate, record, window, reading, what binds.
-- Short phrases that the text reports are put together from.

local numbers = require "libration.report.numbers"

local M = {}

local kinds = { -- kind of rates: what its clock is called, and whether it has one
  divider = "clock", pll = "reference clock",
}

local function setting_text(setting)
  local names, parts = {}, {}
  for name in pairs(setting) do
    names[#names + 1] = tostring(name)
  end
  table.sort(names)
  for _, name in ipairs(names) do
    local value = setting[name]
    if type(value) == "number" then
      value = numbers.exact(value)
    end
    if name ~= "kind" then
      parts[#parts + 1] = name:gsub("_", " ") .. " " .. tostring(value)
    end
  end
  return table.concat(parts, ", ")
end

--- The rate and how the digitizer makes it.
-- @param plan table: a plan
-- @return string: "24576 S/s: clock 12288000 Hz, decimation 1, divider 500"
-- @usage
-- local how = require "libration.report.how"
-- assert(how.rate { rate = lb.fraction.new(8000) } == "8000 S/s")
function M.rate(plan)
  local text = numbers.exact(plan.rate) .. " S/s"
  local rates = plan.digitizer and plan.digitizer.rates
  local made = {}
  if type(rates) == "table" and rates.clock then
    made[1] = (kinds[rates.kind] or "clock") .. " " .. numbers.exact(rates.clock) .. " Hz"
  end
  if type(plan.setting) == "table" and next(plan.setting) ~= nil then
    made[#made + 1] = setting_text(plan.setting)
  end
  if text:sub(1, 1) == "~" then
    made[#made + 1] = "exactly " .. tostring(plan.rate) .. " S/s"
  end
  return #made == 0 and text or text .. ": " .. table.concat(made, ", ")
end

--- Time that all records of a plan take together.
-- @param plan table: a plan
-- @return number: s
-- @usage
-- assert(require("libration.report.how").total { duration_s = 2, averages = 3 } == 6)
function M.total(plan)
  return plan.duration_s * (plan.averages or 1)
end

--- The record: samples, duration, averages.
-- @param plan table: a plan
-- @return string: "98304 samples = 4.000 s, 8 averaged, 32.00 s in all"
-- @usage
-- local how = require "libration.report.how"
-- assert(how.record { samples = 16000, duration_s = 2 } == "16000 samples = 2.000 s")
function M.record(plan)
  local text = plan.samples .. " samples = " .. numbers.time(plan.duration_s)
  if (plan.averages or 1) > 1 then
    text = text .. ", " .. plan.averages .. " averaged, " .. numbers.time(M.total(plan))
      .. " in all"
  end
  return text
end

--- The window.
-- @param plan table: a plan
-- @return string: name and parameter
-- @usage
-- local how = require "libration.report.how"
-- assert(how.window { window = { name = "kaiser", parameter = 9 } } == "kaiser, parameter 9")
function M.window(plan)
  local window = plan.window or {}
  local text = window.name or "none"
  if window.parameter and window.parameter ~= 0 then
    text = text .. ", parameter " .. numbers.exact(window.parameter)
  end
  return text
end

local readings = {
  bin = "bin: the bin of the windowed transform nearest to the line",
  tracked = "tracked: the highest point of the windowed transform near the line",
  fit = "fit: least squares of all lines at once",
  designed = "designed: weights made for this demand",
}

--- The reading.
-- @param plan table: a plan
-- @return string: its name and what it does
-- @usage
-- assert(require("libration.report.how").reading { reading = "bin" }:find "nearest")
function M.reading(plan)
  return readings[plan.reading] or tostring(plan.reading)
end

--- With how many standard deviations noise counts.
-- @param plan table: a plan
-- @return string: or nil when the plan does not say
-- @usage
-- assert(require("libration.report.how").coverage {
--   demand = { coverage = 3 } } == "counts with 3 standard deviations")
function M.coverage(plan)
  local coverage = plan.coverage or plan.demand and plan.demand.coverage
  return coverage and "counts with " .. numbers.exact(coverage) .. " standard deviations"
end

--- The random part of a line's error.
-- @param plan table: a plan
-- @param line table: one of its lines
-- @return string: "3 x 0.00120"
-- @usage
-- assert(require("libration.report.how").random({ coverage = 3 }, { random = 2 }) == "3 x 2.00")
function M.random(plan, line)
  local coverage = plan.coverage or plan.demand and plan.demand.coverage or 3
  return numbers.exact(coverage) .. " x " .. numbers.error(line.random)
end

--- What binds a refused demand.
-- @param binding table: line, term, limit, each a text or nil
-- @return string: one sentence
-- @usage
-- local text = require("libration.report.how").binding { line = "shaft", term = "leakage" }
-- assert(text == "line shaft, by leakage")
function M.binding(binding)
  local text = binding.line and "line " .. binding.line or "the demand as a whole"
  if binding.term then
    text = text .. ", by " .. binding.term
    if binding.from and binding.from ~= "" then
      text = text .. " from " .. binding.from
    end
  end
  if binding.limit then
    text = text .. ", at the limit: " .. tostring(binding.limit)
  end
  return text
end

--- A change that was tried, when it has no text of its own.
-- @param change any: text, or a table of names and values
-- @return string: what was changed
-- @usage
-- assert(require("libration.report.how").change { within = "9 s" } == "within 9 s")
function M.change(change)
  if type(change) == "table" then
    return setting_text(change)
  end
  return tostring(change)
end

return M
