--- A coarse look: some plan, where the search for the shortest gave up.
-- Judges a few rates, durations, windows and readings, spread evenly in ratio.

local core = require "libration.core"
local problem = require "libration.plan.problem"

local M = {}

local RATES, DURATIONS, WINDOWS = 6, 20, 4
local SHORTEST, LONGEST = 64, 2 ^ 20 -- samples

-- Up to `count` whole numbers from 1 to `most`, evenly spread, both ends in.
local function spread(most, count)
  local list = {}
  for k = 1, math.min(most, count) do
    list[k] = most <= count and k or 1 + (most - 1) * (k - 1) // (count - 1)
  end
  return list
end

local function holds(posed, choice, share)
  for _, row in ipairs(core.plan.judge(posed.handle, choice.rate, choice.mode, choice.samples)) do
    if row.ratio > share then
      return false
    end
  end
  return true
end

-- The shortest of the durations that holds, at one rate, in one mode.
local function shortest(posed, read, choice, limits)
  for k = 0, DURATIONS - 1 do
    local n = limits.least * (limits.most / limits.least) ^ (k / (DURATIONS - 1))
    choice.samples = math.tointeger(math.floor(n / limits.block) * limits.block)
    if choice.samples / choice.rate >= limits.beaten then
      return false
    elseif choice.samples >= limits.least and holds(posed, choice, read.share) then
      return true
    end
  end
  return false
end

--- Looks for any plan that holds.
-- @param demand table: from lb.demand
-- @param digitizer table: from lb.digitizer
-- @param posed table: from libration.plan.problem
-- @param read table: read options
-- @return table: a choice (rate, setting, mode, samples), the shortest of those
-- looked at; nil when none holds
-- @usage
-- assert(type(require("libration.plan.coarse").find) == "function")
function M.find(demand, digitizer, posed, read)
  local block, best = digitizer.block or 1, nil
  local least = math.max(SHORTEST, digitizer.samples and digitizer.samples.least or 0)
  local beaten = math.huge
  for _, index in ipairs(spread(core.plan.rates(posed.handle), RATES)) do
    local rate, setting = core.plan.rate_at(posed.handle, index)
    local within = (read.within or math.huge) / (demand.averages or 1) * rate
    local most = math.min(problem.most_samples(digitizer), within, LONGEST)
    for _, mode in ipairs(most >= least and spread(#posed.modes, WINDOWS * 2) or {}) do
      local choice = { rate = rate, setting = setting, mode = mode }
      local limits = { least = least, most = most, block = block, beaten = beaten }
      if shortest(posed, read, choice, limits) then
        best, beaten = choice, choice.samples / rate
      end
    end
  end
  return best
end

return M
