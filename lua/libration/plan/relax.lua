--- Relaxations: changes to a demand or digitizer that would make it feasible.
-- Each is tried for real; those that do not help are not named.

local core = require "libration.core"
local problem = require "libration.plan.problem"

local M = {}

-- Microseconds of work per second of effort the engineer allows: of one trial,
-- and of all trials of a refusal together.
local ONE_TRIAL, ALL_TRIALS = 1e5, 5e5

--- A search within what is left of a refusal's allowance.
-- @param posed table: from libration.plan.problem
-- @param demand table: from lb.demand
-- @param read table: read options; its field `left` is the allowance
-- @param share number: of the tolerances
-- @return table: the core's choice, or nil
-- @usage
-- assert(type(require("libration.plan.relax").search) == "function")
function M.search(posed, demand, read, share)
  local left = read.left or { work = read.effort_s * ALL_TRIALS }
  read.left = left
  local most = math.min(read.effort_s * ONE_TRIAL, left.work)
  if most <= 0 then
    return nil
  end
  local within = read.within and read.within / (demand.averages or 1) or math.huge
  local choice, effort, _, failed = core.plan.search(posed.handle, { share = share,
    most_duration = within, most_work = most, care_work = most / 4 })
  left.work = left.work - (choice and effort or failed).work
  return choice
end

local FILTER_ORDERS = 8   -- orders beyond the present one that are tried
local TIME_STEPS = { 2, 4, 10, 100, 1e9 }
local RATE_STEPS = { 2, 4, 8 }

local function with(table_, changes)
  local result = setmetatable({}, getmetatable(table_))
  for key, value in pairs(table_) do
    result[key] = value
  end
  for key, value in pairs(changes) do
    result[key] = value
  end
  return result
end

-- The shortest plan of a changed problem, in outline; nil when there is none.
local function attempt(demand, digitizer, read)
  local ok, posed = pcall(problem.new, demand, digitizer, read)
  if not ok or core.plan.rates(posed.handle) == 0 then
    return nil
  end
  local front = problem.front(demand, digitizer)
  if front.range and problem.peak(demand, front) > front.range then
    return nil
  end
  local choice = M.search(posed, demand, read, read.share)
  if not choice then
    return nil
  end
  local rate, setting = posed.rate(choice.setting)
  local worst = 0
  for _, row in ipairs(core.plan.judge(posed.handle, rate:number(), choice.mode,
    choice.samples)) do
    worst = math.max(worst, row.ratio)
  end
  local mode = posed.modes[choice.mode]
  return { rate = rate, setting = setting, samples = choice.samples,
    duration_s = choice.samples / rate:number(), averages = demand.averages or 1,
    window = { name = mode.window, parameter = mode.parameter }, reading = mode.reading,
    worst = worst }
end

local function add(list, change, words, plan)
  if plan then
    list[#list + 1] = { change = change, text = words, plan = plan }
  end
  return plan ~= nil
end

local function longer(list, demand, digitizer, read)
  local free = with(read, {})
  free.within = nil
  -- The plain plan: worth an ordinary search, which the allowance is not.
  local ample = with(free, { left = { work = math.huge }, effort_s = read.effort_s * 5 })
  if read.within and add(list, { within = "free" }, "more time than within allows",
    attempt(demand, digitizer, ample)) then
    return
  end
  for _, times in ipairs(TIME_STEPS) do
    local most = digitizer.samples and digitizer.samples.most or 2 ^ 24
    local bigger = with(digitizer, { samples = { least = digitizer.samples
      and digitizer.samples.least or 16, most = math.min(most * times, 2 ^ 36) } })
    bigger.memory = nil
    local plan = attempt(demand, bigger, free)
    if plan then
      add(list, { samples = plan.samples }, "longer records than the digitizer holds", plan)
      return
    end
  end
end

local function looser(list, demand, digitizer, read, share)
  if not share then
    return
  end
  local times = math.ceil(share / read.share * 100) / 100
  local plan = attempt(demand, digitizer, with(read, { share = read.share * times,
    left = { work = math.huge } }))
  add(list, { tolerances = times }, ("all tolerances times %.2f"):format(times), plan)
end

local function without(demand, name)
  local lines, others = {}, { table.unpack(demand.interferers) }
  for _, line in ipairs(demand.lines) do
    if line.name == name then
      others[#others + 1] = line
    else
      lines[#lines + 1] = line
    end
  end
  return with(demand, { lines = lines, interferers = others })
end

local function fewer(list, demand, digitizer, read, binding)
  if not binding.line or #demand.lines < 2 then
    return
  end
  add(list, { without = binding.line }, ("not measuring %s (still there to disturb)")
    :format(binding.line), attempt(without(demand, binding.line), digitizer, read))
end

local function steadier(list, demand, digitizer, read)
  for _, part in ipairs { 0.5, 0.25, 0.1, 0 } do
    local drivers = {}
    for i, driver in ipairs(demand.drivers) do
      drivers[i] = with(driver, { spread = driver.spread * part })
    end
    local plan = attempt(with(demand, { drivers = drivers }), digitizer, read)
    if plan then
      add(list, { drift = part }, part > 0 and ("drifts held to %g of the stated"):format(part)
        or "no drift at all", plan)
      return
    end
  end
end

local function steeper(list, demand, digitizer, read)
  local filter = digitizer.filter
  if not filter or not filter.order then
    return
  end
  for order = filter.order + 1, math.min(filter.order + FILTER_ORDERS, 16) do
    local plan = attempt(demand, with(digitizer, { filter = with(filter, { order = order }) }),
      read)
    if plan then
      add(list, { filter_order = order }, ("a filter of order %d"):format(order), plan)
      return
    end
  end
end

local faster = {}

function faster.divider(rates, times)
  return with(rates, { least = math.max(1, rates.least // times) })
end

function faster.list(rates, times)
  local top = rates.rates[#rates.rates]
  for _, rate in ipairs(rates.rates) do
    top = rate > top and rate or top
  end
  local list = { table.unpack(rates.rates) }
  list[#list + 1] = top * times
  return with(rates, { rates = list })
end

function faster.range(rates, times)
  return with(rates, { most = rates.most * times })
end

local function higher(list, demand, digitizer, read)
  local raise = faster[digitizer.rates.kind]
  for _, times in ipairs(raise and RATE_STEPS or {}) do
    local quick = with(digitizer, { rates = raise(digitizer.rates, times) })
    quick.aggregate = nil
    local plan = attempt(demand, quick, with(read, { most_rate = math.huge }))
    if plan then
      add(list, { rate = plan.rate }, ("rates up to %d times higher"):format(times), plan)
      return
    end
  end
end

local function averaged(list, demand, digitizer, read)
  for _, count in ipairs { 4, 16, 64 } do
    local averages = (demand.averages or 1) * count
    local plan = attempt(with(demand, { averages = averages }), digitizer, read)
    if plan then
      add(list, { averages = averages }, ("averaging %d records"):format(averages), plan)
      return
    end
  end
end

local function finer(list, demand, digitizer, read)
  for bits = (digitizer.bits or 32) + 1, 32 do
    local plan = attempt(demand, with(digitizer, { bits = bits }), read)
    if plan then
      add(list, { bits = bits }, ("a converter of %d bits"):format(bits), plan)
      return
    end
  end
end

--- Changes that would let the sources fit the range.
-- @param demand table: from lb.demand
-- @param digitizer table: from lb.digitizer
-- @param read table: read options
-- @param times number: how far the sum of peaks is over the range
-- @return table: list of {change, text, plan}
-- @usage
-- assert(type(require("libration.plan.relax").range) == "function")
function M.range(demand, digitizer, read, times)
  local list = {}
  local range = digitizer.range * times * (1 + 1e-12)
  add(list, { range = range }, ("a range of %.4g %s"):format(range, digitizer.range_unit),
    attempt(demand, with(digitizer, { range = range }), read))
  return list
end

--- Changes that would give the digitizer a rate for the demand.
-- @param demand table: from lb.demand
-- @param digitizer table: from lb.digitizer
-- @param read table: read options
-- @return table: list of {change, text, plan}
-- @usage
-- assert(type(require("libration.plan.relax").rates) == "function")
function M.rates(demand, digitizer, read)
  local list = {}
  higher(list, demand, digitizer, read)
  if not read.undersample then
    add(list, { undersample = true }, "deliberate undersampling",
      attempt(demand, digitizer, with(read, { undersample = true })))
  end
  return list
end

--- All single changes that make a refused demand feasible.
-- @param demand table: from lb.demand
-- @param digitizer table: from lb.digitizer
-- @param read table: read options
-- @param binding table: what binds: line, term
-- @param share number: smallest share of the tolerances that is feasible, or nil
-- @return table: list of {change, text, plan}
-- @usage
-- assert(type(require("libration.plan.relax").all) == "function")
function M.all(demand, digitizer, read, binding, share)
  local list = {}
  longer(list, demand, digitizer, read)
  looser(list, demand, digitizer, read, share)
  fewer(list, demand, digitizer, read, binding)
  steadier(list, demand, digitizer, read)
  steeper(list, demand, digitizer, read)
  higher(list, demand, digitizer, read)
  if binding.term == "noise" or binding.term == "quantisation" then
    averaged(list, demand, digitizer, read)
  end
  if binding.term == "quantisation" then
    finer(list, demand, digitizer, read)
  end
  return list
end

return M
