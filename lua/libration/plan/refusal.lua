--- Refusals: why no plan holds a demand, and the smallest changes that would help.

local core = require "libration.core"
local coarse = require "libration.plan.coarse"
local problem = require "libration.plan.problem"
local relax = require "libration.plan.relax"
local text = require "libration.report.text"

local M = {}

local Refusal = { __name = "libration.refusal" }
Refusal.__index = Refusal

--- A refusal as text: what binds, how far off, what would help.
-- @return string
function Refusal:__tostring()
  return text.refusal(self)
end

local MOST_SHARE = 40 -- errors beyond this many tolerances are not pursued
local STEPS = 5         -- bisections of the smallest share

local function new(fields)
  return setmetatable(fields, Refusal)
end

--- A refusal that needs no search: clipping, or no rate at all.
-- @param demand table: from lb.demand
-- @param digitizer table: from lb.digitizer
-- @param posed table: from libration.plan.problem
-- @param read table: read options
-- @return refusal: or nil when a search makes sense
-- @usage
-- assert(type(require("libration.plan.refusal").blocked) == "function")
function M.blocked(demand, digitizer, posed, read)
  local front = problem.front(demand, digitizer)
  local peak = problem.peak(demand, front)
  if front.range and peak > front.range then
    return new { demand = demand, digitizer = digitizer,
      binding = { term = "clipping", limit = "range", ratio = peak / front.range },
      message = ("all sources together can reach %.4g %s, the digitizer's range ends at %.4g %s")
        :format(peak, demand.unit, front.range, demand.unit),
      relaxations = relax.range(demand, digitizer, read, peak / front.range) }
  end
  if core.plan.rates(posed.handle) == 0 then
    return new { demand = demand, digitizer = digitizer,
      binding = { term = "sample rate", limit = "rates of the digitizer" },
      message = "the digitizer has no rate that carries the highest line below half of it and "
        .. "respects the limits on rates",
      relaxations = relax.rates(demand, digitizer, read) }
  end
  return nil
end

-- The smallest share of the tolerances with which a plan exists, and it.
local function smallest_share(posed, read, demand)
  local low, high, found = read.share, nil, nil
  local share = read.share * 1.25
  while not found and share <= MOST_SHARE do
    found = relax.search(posed, demand, read, share)
    if found then
      high = share
    else
      low, share = share, share * 2
    end
  end
  for _ = 1, found and STEPS or 0 do
    local middle = math.sqrt(low * high)
    local better = relax.search(posed, demand, read, middle)
    if better then
      found, high = better, middle
    else
      low = middle
    end
  end
  return high, found
end

-- The line that is worst off for a choice (rate, mode, samples), and by what.
local function worst_line(posed, choice)
  local judged = core.plan.judge(posed.handle, choice.rate, choice.mode, choice.samples)
  local worst = 1
  for i, row in ipairs(judged) do
    if row.ratio > judged[worst].ratio then
      worst = i
    end
  end
  local row = judged[worst]
  if row.ratio_hz >= row.ratio then
    return worst, row.ratio, { term = "frequency" }
  end
  local terms = core.plan.budget(posed.handle, choice.rate, choice.mode, choice.samples, worst)
  table.sort(terms, function(a, b) return a.value > b.value end)
  return worst, row.ratio, { term = terms[1].term,
    from = terms[1].source and posed.source[terms[1].source].name }
end

-- Limits that no longer record and no other rate can move.
local fixed_limits = {
  ["sensor and range"] = "the accuracy of sensor and range",
  ["jitter loss"] = "the digitizer's jitter",
  ["filter droop"] = "the filter's corner and flatness",
  quantisation = "the digitizer's bits and range",
}

local function limit_of(demand, digitizer, posed, read, choice, term)
  local rate = choice.rate
  if fixed_limits[term] then
    return fixed_limits[term]
  end
  local total = choice.samples / rate * (demand.averages or 1)
  local _, _, most_rate = core.plan.rates(posed.handle)
  if read.within and total > 0.8 * read.within then
    return ("within %g s"):format(read.within)
  end
  local memory = digitizer.memory and digitizer.memory // (digitizer.channels or 1)
  local most = digitizer.samples and digitizer.samples.most or 2 ^ 24
  if choice.samples > 0.8 * math.min(memory or math.huge, most) then
    return memory and memory < most and ("memory for %d samples a channel"):format(memory)
      or ("records of %d samples"):format(most)
  end
  if rate > 0.9 * most_rate then
    return ("the highest rate, %g S/s"):format(most_rate)
  end
  return "the digitizer's rates and filter"
end

--- Why a search found nothing, and what would help.
-- @param demand table: from lb.demand
-- @param digitizer table: from lb.digitizer
-- @param posed table: from libration.plan.problem
-- @param read table: read options
-- @param code string: "infeasible" or "stopped"
-- @return refusal: binding {line, term, from, limit, ratio}, relaxations, notes
-- @usage
-- assert(type(require("libration.plan.refusal").explain) == "function")
function M.explain(demand, digitizer, posed, read, code)
  local refusal = new { demand = demand, digitizer = digitizer, notes = {},
    gave_up = code == "stopped" }
  if code == "stopped" then
    refusal.notes[1] = ("The search gave up after about %g s of work; a plan may exist. Fewer "
      .. "windows, a narrower range of rates, or a larger effort_s would settle it.")
      :format(read.effort_s)
  end
  local share, choice = smallest_share(posed, read, demand)
  local shown = choice or select(2, coarse.find(demand, digitizer, posed, read))
  if shown then
    local line, ratio, term = worst_line(posed, shown)
    refusal.binding = { line = demand.lines[line].name, term = term.term, from = term.from,
      limit = limit_of(demand, digitizer, posed, read, shown, term.term), ratio = ratio }
    refusal.message = (choice and "line %s would be off by %.3g times its tolerance"
      or code == "stopped" and "no plan was found; in long records line %s would still be off by "
      .. "%.3g times its tolerance"
      or "line %s would be off by %.3g times its tolerance even in the longest record")
      :format(demand.lines[line].name, ratio)
  else
    refusal.binding = { term = "record length", limit = "within, memory or longest record" }
    refusal.message = "no admissible record is long enough to read lines in"
  end
  refusal.relaxations = relax.all(demand, digitizer, read, refusal.binding, share)
  return refusal
end

return M
