--- From a demand and a digitizer to the bare numbers the core plans with.
-- Everything the core sees is in the demand's unit; what the digitizer states
-- in volts is brought there by the demand's sensitivity.

local core = require "libration.core"
local rates = require "libration.plan.rates"

local M = {}

local function scale(demand, digitizer)
  local unit = digitizer.range_unit
  if demand.sensitivity then
    return 1 / demand.sensitivity -- also volts per volt: probes and amplifiers
  elseif not unit or unit == demand.unit then
    return 1
  end
  error(("sensitivity: the demand is in %s and the digitizer's range in %s; give the demand a "
    .. 'sensitivity such as "100 mV/(%s)"'):format(demand.unit, unit, demand.unit), 0)
end

local function source_row(line)
  return {
    hz = line.hz:number(), lock_hz = line.lock_hz, free_hz = line.free_hz,
    wander = line.wander, least = line.least, most = line.most, driver = line.driver,
  }
end

local function line_row(line)
  return { tolerance = line.tolerance, tolerance_abs = line.tolerance_abs,
    tolerance_hz = line.tolerance_hz }
end

--- The digitizer's side in the demand's unit.
-- @param demand table: from lb.demand
-- @param digitizer table: from lb.digitizer
-- @return table: filter, flatness, accuracy, timebase, jitter_s, range, step,
-- noise, skew_s; range and step absent where the digitizer does not state them
-- @usage
-- local front = require("libration.plan.problem").front
-- local demand = lb.demand { unit = "V", lines = {
--   { name = "tone", hz = 100, amplitude = "1 V", tolerance = "1 %" } } }
-- local digitizer = lb.digitizer { rates = { "1 kHz" }, bits = 8, range = "2 V" }
-- assert(front(demand, digitizer).step == 4 / 256)
function M.front(demand, digitizer)
  local factor = scale(demand, digitizer)
  local filter = digitizer.filter or { shape = "none" }
  local range = digitizer.range and digitizer.range * factor
  return {
    filter = filter, flatness = filter.flatness or 0, accuracy = digitizer.accuracy or 0,
    timebase = digitizer.timebase or 0, jitter_s = digitizer.jitter_s or 0, range = range,
    step = range and digitizer.bits and 2 * range / 2 ^ digitizer.bits or 0,
    noise = (digitizer.noise or 0) * factor, skew_s = digitizer.skew_s or 0,
  }
end

-- The most a filter lifts anything by: shapes by design do not, tables may.
local function lift(filter)
  local most = 1
  for _, point in ipairs(filter.points or {}) do
    most = math.max(most, 10 ^ (point.db / 20))
  end
  return most
end

--- The largest value all sources and the offset can add up to in the record.
-- Gain errors are in; what a filter takes away is not, noise is not.
-- @param demand table: from lb.demand
-- @param front table: from front above
-- @return number: demand's unit
-- @usage
-- local problem = require "libration.plan.problem"
-- local front = { filter = { shape = "none" }, flatness = 0, accuracy = 0.5 }
-- assert(problem.peak({ offset = 1, lines = { { most = 2 } }, interferers = {} }, front) == 4.5)
function M.peak(demand, front)
  local sum = demand.offset or 0
  for _, list in ipairs { demand.lines, demand.interferers } do
    for _, source in ipairs(list) do
      sum = sum + source.most
    end
  end
  return sum * lift(front.filter) * (1 + front.flatness) * (1 + front.accuracy)
end

-- The highest frequency a line may have, as the record sees it.
local function top_hz(demand, timebase)
  local top = 0
  for _, line in ipairs(demand.lines) do
    local half = line.lock_hz * demand.drivers[line.driver].spread + line.free_hz
    top = math.max(top, (line.hz:number() + half) / (1 - timebase))
  end
  return top
end

--- The longest record of a digitizer.
-- @param digitizer table: from lb.digitizer
-- @return number: samples per channel
-- @usage
-- local digitizer = lb.digitizer { rates = { "1 kHz" }, memory = "4 Ki", channels = 2 }
-- assert(require("libration.plan.problem").most_samples(digitizer) == 2048)
function M.most_samples(digitizer)
  local most = digitizer.samples and digitizer.samples.most or 2 ^ 24
  if digitizer.memory then
    most = math.min(most, digitizer.memory // (digitizer.channels or 1))
  end
  return math.max(most, 4)
end

--- Whether a digitizer can record so many samples in one go.
-- @param digitizer table: from lb.digitizer
-- @param samples integer: per channel
-- @return boolean
-- @usage
-- local holds = require("libration.plan.problem").holds
-- local digitizer = lb.digitizer { rates = { "1 kHz" }, block = 8 }
-- assert(holds(digitizer, 64) and not holds(digitizer, 65))
function M.holds(digitizer, samples)
  local least = digitizer.samples and digitizer.samples.least or 16
  return samples >= least and samples <= M.most_samples(digitizer)
    and samples % (digitizer.block or 1) == 0
end

local function rate_limits(demand, digitizer, options)
  local most, least = options.most_rate or math.huge, options.least_rate or 0
  if digitizer.aggregate then
    local share = digitizer.aggregate / (digitizer.channels or 1)
    most = math.min(most, share:number() * (1 + 1e-15))
  end
  if not options.undersample then
    least = math.max(least, 2 * top_hz(demand, digitizer.timebase or 0) * (1 + 1e-12))
  end
  return least, most
end

local function modes(options)
  local list = {}
  for _, window in ipairs(options.windows) do
    for _, reading in ipairs(options.readings) do
      list[#list + 1] = { window = window.name, parameter = window.parameter,
        reading = reading }
    end
  end
  return list
end

--- The problem as the core takes it.
-- @param demand table: from lb.demand
-- @param digitizer table: from lb.digitizer
-- @param options table: read plan options (plan/options.lua)
-- @return table: handle (core problem), modes (list), source (list of the
-- sources in the core's order), rate (function: choice -> exact rate, setting)
-- @usage
-- assert(type(require("libration.plan.problem").new) == "function")
function M.new(demand, digitizer, options)
  local sources, lines, spread, names = {}, {}, {}, {}
  for i, line in ipairs(demand.lines) do
    sources[i], lines[i], names[i] = source_row(line), line_row(line), line
  end
  for _, other in ipairs(demand.interferers) do
    sources[#sources + 1] = source_row(other)
    names[#sources] = other
  end
  for i, driver in ipairs(demand.drivers) do
    spread[i] = driver.spread
  end
  local least_rate, most_rate = rate_limits(demand, digitizer, options)
  local described, exact = rates.describe(demand, digitizer, least_rate, most_rate)
  described.least_rate, described.most_rate = least_rate, most_rate
  local mode_list = modes(options)
  local handle = core.plan.problem {
    sources = sources, lines = lines, spread = spread,
    offset = demand.offset or 0, noise = demand.noise or 0,
    front = M.front(demand, digitizer), rates = described, modes = mode_list,
    least_samples = digitizer.samples and digitizer.samples.least or 16,
    most_samples = M.most_samples(digitizer), block = digitizer.block or 1,
    averages = demand.averages or 1, coverage = demand.coverage or 3,
  }
  return { handle = handle, modes = mode_list, source = names, rate = exact }
end

return M
