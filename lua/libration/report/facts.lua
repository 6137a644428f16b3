--- Plans, refusals, proofs and measurements as plain facts for machines.
-- Every number carries its unit in the last word of its name, amplitudes that
-- of "unit"; exact values stand beside their nearest number.

local base = require("libration.core").base
local json = require "libration.json"

local M = {}

local function number(value)
  return base.is_fraction(value) and value:number() or value
end

local function exact(value)
  return base.is_fraction(value) and tostring(value) or nil
end

local opaque = { ["function"] = true, thread = true, userdata = true }

-- A copy without functions, methods and what names with "_" keep private.
local function plain(value, depth)
  if base.is_fraction(value) or type(value) ~= "table" then
    if not base.is_fraction(value) and opaque[type(value)] then
      return nil
    end
    return value -- false as well
  end
  local copy, named = {}, false
  for key, item in next, value do
    local shown = type(key) ~= "string" or key:sub(1, 1) ~= "_"
    if shown and depth < 12 then
      copy[key] = plain(item, depth + 1)
      named = named or type(key) == "string"
    end
  end
  return named and json.object(copy) or copy
end

local function budget_of(line)
  local terms = {}
  for i, term in ipairs(line.budget or {}) do
    terms[i] = { term = term.term, from = term.from, kind = term.kind, value = term.value }
  end
  return terms
end

local function line_of(line)
  return {
    name = line.name, hz = number(line.hz), hz_exact = exact(line.hz), bin = line.bin,
    least = line.least, most = line.most, at_amplitude = line.amplitude,
    tolerance = line.tolerance, error = line.error, ratio = line.ratio,
    systematic = line.systematic, random = line.random, error_hz = line.hz_error,
    tolerance_hz = line.tolerance_hz, ratio_hz = line.hz_ratio, budget = budget_of(line),
  }
end

--- The facts of a plan.
-- @param plan table: a plan
-- @return table: plain, ready for JSON; kind = "plan"
-- @usage
-- assert(lb.report.facts.plan { worst = 0.5, lines = {} }.holds)
function M.plan(plan)
  local demand, lines = plan.demand or {}, {}
  for i, line in ipairs(plan.lines) do
    lines[i] = line_of(line)
  end
  return {
    kind = "plan", title = demand.title, unit = demand.unit, holds = plan.worst <= 1,
    worst_ratio = plan.worst, rate_hz = number(plan.rate), rate_exact = exact(plan.rate),
    samples = plan.samples, duration_s = plan.duration_s, averages = plan.averages,
    total_s = plan.duration_s and plan.duration_s * (plan.averages or 1),
    window = plan.window and json.object { name = plan.window.name,
      parameter = plan.window.parameter },
    reading = plan.reading, setting = plan.setting and json.object(plain(plan.setting, 0)),
    coverage = plan.coverage, identity = plan.identity, digitizer = (plan.digitizer or {}).title,
    notes = plan.notes and plain(plan.notes, 0), lines = lines,
  }
end

local function relaxation_of(relaxation)
  local plan = relaxation.plan
  return {
    text = relaxation.text, change = plain(relaxation.change, 0),
    plan = plan and {
      rate_hz = number(plan.rate), rate_exact = exact(plan.rate), samples = plan.samples,
      total_s = plan.duration_s and plan.duration_s * (plan.averages or 1),
      worst_ratio = plan.worst, window = plan.window and plan.window.name, reading = plan.reading,
    },
  }
end

--- The facts of a refusal.
-- @param refusal table: what lb.plan returned in place of a plan
-- @return table: plain, ready for JSON; kind = "refusal"
-- @usage
-- assert(lb.report.facts.refusal { message = "no", relaxations = {} }.holds == false)
function M.refusal(refusal)
  local list = {}
  for i, relaxation in ipairs(refusal.relaxations or {}) do
    list[i] = relaxation_of(relaxation)
  end
  return {
    kind = "refusal", holds = false, title = refusal.demand and refusal.demand.title,
    message = refusal.message, binding = plain(refusal.binding, 0), relaxations = list,
    notes = refusal.notes and plain(refusal.notes, 0),
  }
end

--- The facts of whatever has facts.
-- @param value table: a plan, a refusal, or another result, whose public fields
-- are taken as they are
-- @return table: plain, ready for JSON
-- @usage
-- assert(lb.report.facts.of { worst = 0.5, lines = {} }.kind == "plan")
function M.of(value)
  if value.relaxations then
    return M.refusal(value)
  elseif type(value.worst) == "number" and value.lines then
    return M.plan(value)
  end
  return plain(value, 0)
end

return M
