--- A coarse look: some plan, where the search for the shortest gave up.
-- Judges a few rates, durations, windows and readings, spread evenly in ratio.

local core = require "libration.core"
local problem = require "libration.plan.problem"

local M = {}

local RATES, MODES, HALVINGS = 2, 10, 10
local SHORTEST, LONGEST = 64, 2 ^ 20 -- samples

-- Up to `count` whole numbers from 1 to `most`, evenly spread, both ends in.
local function spread(most, count)
  local list = {}
  for k = 1, math.min(most, count) do
    list[k] = most <= count and k or 1 + (most - 1) * (k - 1) // (count - 1)
  end
  return list
end

-- The worst share of a tolerance, by plain bounds.
local function worst(posed, choice)
  local ratio = 0
  for _, row in ipairs(core.plan.judge(posed.handle, choice.rate, choice.mode, choice.samples,
    "plain")) do
    ratio = math.max(ratio, row.ratio)
  end
  return ratio
end

-- Shortens a choice that holds by bisection; it holds afterwards, too.
local function shorten(posed, read, choice, least, block)
  local low, high = least / block, choice.samples / block
  for _ = 1, HALVINGS do
    local middle = math.tointeger(math.floor(math.sqrt(low * high)))
    if middle * block < least or middle >= high then
      break
    end
    local shorter = { rate = choice.rate, setting = choice.setting, mode = choice.mode,
      samples = middle * block }
    if core.plan.holds(posed.handle, choice.rate, choice.mode, shorter.samples, read.share) then
      choice, high = shorter, middle
    else
      low = middle
    end
  end
  return choice
end

--- Looks for any plan that holds, in long records of a few rates.
-- @param demand table: from lb.demand
-- @param digitizer table: from lb.digitizer
-- @param posed table: from libration.plan.problem
-- @param read table: read options
-- @return table: a choice (rate, setting, mode, samples), the shortest that was
-- come by; nil when none holds
-- @return table: the choice that comes nearest to holding (nil when no record is
-- long enough)
-- @usage
-- assert(type(require("libration.plan.coarse").find) == "function")
function M.find(demand, digitizer, posed, read)
  local block, best, nearest, ratio = digitizer.block or 1, nil, nil, math.huge
  local least = math.max(SHORTEST, digitizer.samples and digitizer.samples.least or 0)
  for _, index in ipairs(spread(core.plan.rates(posed.handle), RATES)) do
    local rate, setting = core.plan.rate_at(posed.handle, index)
    local within = (read.within or math.huge) / (demand.averages or 1) * rate
    local most = math.floor(math.min(problem.most_samples(digitizer), within, LONGEST) / block)
    for _, mode in ipairs(most * block >= least and spread(#posed.modes, MODES) or {}) do
      local choice = { rate = rate, setting = setting, mode = mode,
        samples = math.tointeger(most * block) }
      local now = worst(posed, choice)
      if now < ratio then
        nearest, ratio = choice, now
      end
      if now <= read.share then
        choice = shorten(posed, read, choice, least, block)
        local shorter = not best or choice.samples / rate < best.samples / best.rate
        best = shorter and choice or best
      end
    end
  end
  return best, nearest
end

return M
