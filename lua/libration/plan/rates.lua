--- The rates of a digitizer: described for the core, and exact for people.

local core = require "libration.core"
local fraction = require "libration.fraction"

local M = {}

local FAST_FACTORS = { 2, 3, 5, 7 }
local ROUND_RATES = 256 -- plain rates a continuous range is also tried at
local COHERENT = 24     -- multiples of the coherent period it is tried at
local MOST_LENGTH = 2 ^ 20

local describe = {}

function describe.divider(rates)
  local decimation = rates.decimation or { 1 }
  return { kind = "divider", clock = rates.clock:number(), least = rates.least,
      most = rates.most, step = rates.step or 1, decimation = decimation },
    function(setting)
      return rates.clock / (setting[1] * setting[2]),
        { divider = setting[1], decimation = #decimation > 1 and setting[2] or nil }
    end
end

function describe.pll(rates)
  local vco = rates.vco or {}
  return { kind = "pll", clock = rates.clock:number(),
      multiply_least = rates.multiply.least, multiply_most = rates.multiply.most,
      multiply_step = rates.multiply.step, divide_step = rates.divide.step,
      divide_least = rates.divide.least, divide_most = rates.divide.most,
      after = rates.after, vco_least = vco.least and vco.least:number(),
      vco_most = vco.most and vco.most:number() },
    function(setting)
      return rates.clock * fraction.new(setting[1], setting[2]) / setting[3],
        { multiply = setting[1], divide = setting[2], after = setting[3] }
    end
end

local function listed(list)
  local numbers = {}
  for i, rate in ipairs(list) do
    numbers[i] = rate:number()
  end
  return { kind = "list", list = numbers }, function(setting)
    return list[setting[1]], {}
  end
end

function describe.list(rates)
  return listed(rates.rates)
end

-- Products of small primes from 16 to MOST_LENGTH: lengths fast to transform.
local function fast_lengths()
  local list = { 1 }
  for _, prime in ipairs(FAST_FACTORS) do
    for i = 1, #list do
      local n = list[i] * prime
      while n <= MOST_LENGTH do
        list[#list + 1] = n
        n = n * prime
      end
    end
  end
  table.sort(list)
  return list
end

local function coherent_period(demand)
  local list = {}
  for i, line in ipairs(demand.lines) do
    list[i] = line.hz
  end
  return core.plan.coherent_period(list)
end

-- A decimal number of four significant digits near a value, exactly.
local function plain(value)
  local text = ("%.3e"):format(value)
  return fraction.new(tonumber(text))
end

-- A continuous range: rates that hold a coherent record of a fast length,
-- and plain ones spread evenly in ratio.
local function continuous(rates, demand, low, high)
  local list, seen = {}, {}
  local function add(rate)
    local key = tostring(rate)
    if rate >= rates.least and rate <= rates.most and not seen[key] then
      seen[key] = true
      list[#list + 1] = rate
    end
  end
  local period, lengths = coherent_period(demand), fast_lengths()
  for k = 1, period and COHERENT or 0 do
    local ok, duration = pcall(function() return period * k end)
    local seconds = ok and duration:number() or math.huge
    for _, n in ipairs(lengths) do
      if n >= 16 and n >= low * seconds and n <= high * seconds then
        add(fraction.new(n) / duration)
      end
    end
  end
  local least, most = math.max(low, rates.least:number()), math.min(high, rates.most:number())
  for k = 0, least <= most and ROUND_RATES or -1 do
    add(plain(least * (most / least) ^ (k / ROUND_RATES)))
  end
  return listed(list)
end

-- A range with a step is a list of its own, as far as it is of use.
local function stepped(rates, low, high)
  local first = math.max(0, math.ceil((low - rates.least:number()) / rates.step:number()) - 1)
  local last = math.min(((rates.most - rates.least) / rates.step):number(),
    (high - rates.least:number()) / rates.step:number() + 1)
  if last - first > 2 ^ 18 then
    error(("rates: the range holds %.0f rates; give a coarser step or a narrower range (at most "
      .. "262144 are searched)"):format(last - first), 0)
  end
  local numbers = {}
  for k = first, last do
    numbers[#numbers + 1] = (rates.least + rates.step * math.tointeger(k)):number()
  end
  return { kind = "list", list = numbers }, function(setting)
    return rates.least + rates.step * (math.tointeger(first) + setting[1] - 1), {}
  end
end

function describe.range(rates, demand, low, high)
  if rates.step then
    return stepped(rates, low, high)
  end
  return continuous(rates, demand, low, high)
end

local function in_run(value, run)
  return math.type(value) == "integer" and value >= run.least and value <= run.most
    and (value - run.least) % (run.step or 1) == 0
end

local function in_list(value, list)
  for _, entry in ipairs(list) do
    if entry == value then
      return true
    end
  end
  return false
end

local admits = {}

function admits.divider(rates, rate, setting)
  local decimation = setting.decimation or 1
  return in_run(setting.divider, rates) and in_list(decimation, rates.decimation or { 1 })
    and rates.clock / (setting.divider * decimation) == rate
end

function admits.list(rates, rate)
  return in_list(rate, rates.rates)
end

function admits.range(rates, rate)
  return rate >= rates.least and rate <= rates.most
    and (not rates.step or ((rate - rates.least) / rates.step).denominator == 1)
end

function admits.pll(rates, rate, setting)
  if not (in_run(setting.multiply, rates.multiply) and in_run(setting.divide, rates.divide)
    and in_list(setting.after, rates.after)) then
    return false
  end
  local vco = rates.clock * fraction.new(setting.multiply, setting.divide)
  local limits = rates.vco
  return (not limits or (vco >= limits.least and vco <= limits.most))
    and vco / setting.after == rate
end

--- Whether a digitizer, set like this, makes a rate.
-- @param rates table: the digitizer's rates
-- @param rate fraction: S/s
-- @param setting table: divider, decimation; multiply, divide, after
-- @return boolean
-- @usage
-- local rates = lb.digitizer({ clock = "1 MHz", divider = { 10, 1000 } }).rates
-- local admits = require("libration.plan.rates").admits
-- assert(admits(rates, lb.fraction.new(100000, 3), { divider = 30 }))
-- assert(not admits(rates, lb.fraction.new(100000, 3), { divider = 31 }))
function M.admits(rates, rate, setting)
  return admits[rates.kind](rates, rate, setting)
end

--- A digitizer's rates for the core, and the way back to exact ones.
-- @param demand table: from lb.demand (a continuous range looks at its lines)
-- @param digitizer table: from lb.digitizer
-- @param low number: no rate below this is needed, S/s
-- @param high number: nor above this
-- @return table: description for core.plan.problem
-- @return function: setting (three integers) -> exact rate (fraction), table of
-- what the digitizer is to be set to
-- @usage
-- local rates = require "libration.plan.rates"
-- local digitizer = lb.digitizer { clock = "1 MHz", divider = { 10, 1000 } }
-- local _, exact = rates.describe(nil, digitizer, 0, math.huge)
-- assert(tostring(exact { 30, 1, 0 }) == "100000/3")
function M.describe(demand, digitizer, low, high)
  return describe[digitizer.rates.kind](digitizer.rates, demand, low, high)
end

return M
