--- Plans: the shortest measurement that is guaranteed to hold a demand.
-- A plan is a rate, a record length, a window and a reading that a digitizer
-- can really do, with the error bound of every line; a refusal says what binds
-- and what would help.

local core = require "libration.core"
local demand_room = require "libration.demand"
local digitizer_room = require "libration.digitizer"
local choices = require "libration.plan.choices"
local coarse = require "libration.plan.coarse"
local file = require "libration.plan.file"
local problem = require "libration.plan.problem"
local rates = require "libration.plan.rates"
local refusal = require "libration.plan.refusal"
local text = require "libration.report.text"
local windows = require "libration.window"

local M = {}

local Plan = {}
M.Plan = Plan -- methods; other modules add theirs (prove, measure)

-- A plan's lines compute their budget when it is first asked for.
local Line = {}

local function budget_rows(line)
  local rows = {}
  local found = core.plan.budget(line._handle, line._rate, line._mode, line._samples, line._index)
  for i, row in ipairs(found) do
    rows[i] = { term = row.term, from = row.source and line._source[row.source].name or nil,
      value = row.value, kind = row.random and "random" or "systematic" }
  end
  return rows
end

function Line.__index(line, key)
  if key == "budget" then
    local rows = budget_rows(line)
    rawset(line, "budget", rows)
    return rows
  end
  return nil
end

local function line_of(plan, i, judged, posed, choice)
  local line = plan.demand.lines[i]
  local hz = line.hz:number()
  local random = plan.coverage / math.sqrt(plan.averages)
  return setmetatable({
    name = line.name, hz = line.hz, bin = math.floor(hz * plan.duration_s + 0.5),
    least = line.least, most = line.most,
    amplitude = judged.amplitude, tolerance = judged.tolerance, error = judged.error,
    ratio = judged.ratio, own = judged.own, others = judged.others,
    systematic = judged.own * judged.amplitude + judged.others, random = judged.sigma,
    hz_error = judged.hz_bound + random * judged.sigma_hz,
    hz_systematic = judged.hz_bound, hz_random = judged.sigma_hz,
    tolerance_hz = line.tolerance_hz, hz_ratio = judged.ratio_hz,
    search_low_hz = judged.search_low_hz, search_high_hz = judged.search_high_hz,
    gain = judged.gain,
    _handle = posed.handle, _rate = choice.rate, _mode = choice.mode,
    _samples = choice.samples, _index = i, _source = posed.source,
  }, Line)
end

local function notes_of(plan)
  local notes = {}
  local digitizer = plan.digitizer
  if not digitizer.range then
    notes[#notes + 1] = "The digitizer states no range: clipping and quantisation were not judged."
  end
  local skew = digitizer.skew_s or 0
  if skew > 0 then
    local top = 0
    for _, line in ipairs(plan.lines) do
      top = math.max(top, line.hz:number())
    end
    notes[#notes + 1] = ("Channels are up to %.3g us apart: phases between them are off by up to "
      .. "%.2g degrees at %.6g Hz."):format(skew * 1e6, 360 * skew * top, top)
  end
  if plan.reading == "bin" then
    notes[#notes + 1] = "A bin reading gives no frequency finer than a bin."
  end
  return notes
end

--- A plan from a choice the core made, with the bounds of every line.
-- @param demand table: from lb.demand
-- @param digitizer table: from lb.digitizer
-- @param posed table: from libration.plan.problem
-- @param choice table: rate, mode, samples, setting
-- @return plan
local function build(demand, digitizer, posed, choice)
  local rate, setting = posed.rate(choice.setting)
  local mode = posed.modes[choice.mode]
  local plan = setmetatable({
    demand = demand, digitizer = digitizer, rate = rate, setting = setting,
    samples = choice.samples, duration_s = choice.samples / rate:number(),
    averages = demand.averages or 1, coverage = demand.coverage or 3,
    window = { name = mode.window, parameter = mode.parameter }, reading = mode.reading,
    lines = {}, claims = {}, worst = 0, front = problem.front(demand, digitizer),
  }, Plan)
  local judged = core.plan.judge(posed.handle, rate:number(), choice.mode, choice.samples)
  for i, row in ipairs(judged) do
    plan.lines[i] = line_of(plan, i, row, posed, choice)
    plan.claims[i] = { own = row.own, others = row.others, sigma = row.sigma,
      hz = row.hz_bound, sigma_hz = row.sigma_hz, f_lo = row.search_low_hz,
      f_hi = row.search_high_hz, gain = row.gain }
    plan.worst = math.max(plan.worst, row.ratio)
  end
  plan.notes = notes_of(plan)
  plan.identity = file.identity(plan)
  return plan
end

local function search(posed, within, share, effort_s, least_s)
  return core.plan.search(posed.handle, { share = share, most_duration = within,
    least_duration = least_s or 0, care_work = least_s and 0 or nil,
    most_work = effort_s * 1e6 })
end

-- Time for one record when all of them must fit.
local function per_record(demand, read)
  return read.within and read.within / (demand.averages or 1) or math.huge
end

local function check_arguments(demand, digitizer)
  if not demand_room.is(demand) then
    error("plan: argument 1 must be a demand; make one by lb.demand { ... } or lb.load(path)", 3)
  elseif not digitizer_room.is(digitizer) then
    error("plan: argument 2 must be a digitizer; make one by lb.digitizer { ... } or "
      .. "lb.load(path)", 3)
  end
end

local function note_effort(plan, read)
  table.insert(plan.notes, 1, ("The search for the shortest plan gave up after about %g s of "
    .. "work (effort_s); this one holds, a shorter one may exist."):format(read.effort_s))
end

--- Plans a measurement: the shortest that holds every tolerance.
-- @param demand table: from lb.demand
-- @param digitizer table: from lb.digitizer
-- @param options table: within (total time, "60 s"), readings ("tracked", "bin"
-- or a list; default both), windows (name, list, or "all" that plans can use; default
-- eleven), undersample (lines may stand above half the rate; default false),
-- share (of each tolerance that the error may take, default "100 %"),
-- least_rate, most_rate, effort_s (seconds of search after which it gives up,
-- default 10; a plan found so far is returned with a note that says so)
-- @return plan: with rate, samples, window, reading, lines, identity; or nil,
-- refusal, "infeasible". Misuse raises an error that lists every mistake
-- @usage
-- local demand = lb.demand { unit = "V", lines = {
--   { name = "tone", hz = 100, amplitude = "1 V", tolerance = "1 %" } } }
-- local plan = lb.plan(demand, lb.digitizer { rates = { "1 kHz" } })
-- assert(plan.worst <= 1 and plan.rate:number() == 1000)
function M.plan(demand, digitizer, options)
  check_arguments(demand, digitizer)
  local read = choices.read(options, windows.windows())
  local posed = problem.new(demand, digitizer, read)
  local blocked = refusal.blocked(demand, digitizer, posed, read)
  if blocked then
    return nil, blocked, "infeasible"
  end
  local choice, message, code = search(posed, per_record(demand, read), read.share, read.effort_s)
  if choice then
    local plan, effort = build(demand, digitizer, posed, choice), message
    if effort.open_s < plan.duration_s then
      note_effort(plan, read)
    end
    return plan
  end
  if code == "stopped" then
    local some = coarse.find(demand, digitizer, posed, read)
    local plan = some and build(demand, digitizer, posed, some)
    if plan then
      note_effort(plan, read)
      return plan
    end
  elseif code ~= "infeasible" then
    return nil, message, code
  end
  return nil, refusal.explain(demand, digitizer, posed, read, code), "infeasible"
end

local SHARES = { 1, 0.7, 0.5, 0.25, 0.1 }
local SLOWER = { 1, 0.25 }

local function dominates(a, b)
  return a.duration_s <= b.duration_s and a.worst <= b.worst and a.samples <= b.samples
    and (a.duration_s < b.duration_s or a.worst < b.worst or a.samples < b.samples)
end

local function front_of(list)
  local kept, seen = {}, {}
  for _, plan in ipairs(list) do
    local beaten = seen[plan.identity]
    for _, other in ipairs(list) do
      beaten = beaten or dominates(other, plan)
    end
    seen[plan.identity] = true
    if not beaten then
      kept[#kept + 1] = plan
    end
  end
  table.sort(kept, function(a, b)
    if a.duration_s ~= b.duration_s then
      return a.duration_s < b.duration_s
    end
    return a.worst < b.worst
  end)
  return kept
end

local function copy(options)
  local result = {}
  for key, value in pairs(options) do
    result[key] = value
  end
  return result
end

--- The trade-off front: plans none of which is beaten in time, error and samples.
-- For shares of the tolerances from 100 % down to 10 %, with all rates and with
-- those up to a quarter of the best plan's, the shortest plan each (by plain
-- bounds after the first); those beaten by another are left out.
-- @param demand table: from lb.demand
-- @param digitizer table: from lb.digitizer
-- @param options table: as for lb.plan
-- @return table: list of plans, shortest first (prints as a table); or nil,
-- refusal, "infeasible"
-- @usage
-- local demand = lb.demand { unit = "V", noise = "1 mV/rtHz", lines = {
--   { name = "tone", hz = 100, amplitude = "1 V", tolerance = "1 %" } } }
-- local front = lb.plans(demand, lb.digitizer { rates = { "1 kHz", "4 kHz" } })
-- assert(#front >= 2 and front[1].duration_s < front[#front].duration_s)
function M.plans(demand, digitizer, options)
  local best, refused, code = M.plan(demand, digitizer, options)
  if not best then
    return nil, refused, code
  end
  local read = choices.read(options, windows.windows())
  local list = { best }
  for _, slower in ipairs(SLOWER) do
    local narrowed = copy(read)
    narrowed.most_rate = slower < 1 and best.rate:number() * slower or read.most_rate
    local posed = problem.new(demand, digitizer, narrowed)
    local before = best -- smaller shares and slower rates never take less time
    for k, share in ipairs(SHARES) do
      local known = slower == 1 and k == 1
      local choice = not known and core.plan.rates(posed.handle) > 0 and search(posed,
        per_record(demand, read), read.share * share, read.effort_s,
        before.duration_s * (1 - 1e-9))
      if not (choice or known) then
        break
      end
      before = known and best or build(demand, digitizer, posed, choice)
      list[#list + 1] = before
    end
  end
  return setmetatable(front_of(list), { __tostring = text.front })
end

-- The problem whose only rate, length, window and reading are a plan's own.
local function posed_again(demand, digitizer, stored)
  local read = choices.read({ windows = { { stored.window, stored.parameter } },
    readings = stored.reading, undersample = true }, windows.windows())
  return problem.new(demand, digitizer, read)
end

--- Loads a saved plan and judges it again.
-- @param path string: file written by plan:save
-- @return plan; or nil, message, code: "io" (the file cannot be read), "format"
-- (it is not a plan), "stale" (its bounds or identity are not what was saved)
-- @usage
-- local plan, message, code = lb.load_plan "no such file"
-- assert(plan == nil and code == "io" and message:find "no such file")
function M.load(path)
  local stored, demand, digitizer = file.read(path)
  if not stored then
    return nil, demand, digitizer
  end
  if not rates.admits(digitizer.rates, stored.rate, stored.setting) then
    return nil, ("%s: plan.rate: the digitizer, set like this, does not make %s S/s"):format(path,
      tostring(stored.rate)), "stale"
  elseif not problem.holds(digitizer, stored.samples) then
    return nil, ("%s: plan.samples: the digitizer does not record %d samples in one go")
      :format(path, stored.samples), "stale"
  end
  local ok, posed = pcall(posed_again, demand, digitizer, stored)
  if not ok then
    return nil, path .. ": " .. tostring(posed), "format"
  end
  local choice = { rate = stored.rate:number(), samples = stored.samples, mode = 1, setting = {} }
  posed.rate = function()
    return stored.rate, stored.setting
  end
  local built, plan = pcall(build, demand, digitizer, posed, choice)
  if not built then
    return nil, path .. ": " .. tostring(plan), "format"
  end
  if plan.identity ~= stored.identity or plan.worst > 1 then
    return nil, path .. ": the plan does not hold what it says (it was changed, or made by "
      .. "another version); plan again from its demand and digitizer", "stale"
  end
  return plan
end

Plan.__index = Plan
Plan.__name = "libration.plan"

--- A plan as a table a person reads at a glance.
-- @return string
function Plan:__tostring()
  return text.plan(self)
end

--- Writes a plan, its demand and its digitizer to a data file.
-- @param path string: file to write; replaced in one step
-- @return boolean: true; or nil, message, code
-- @usage
-- local demand = lb.demand { unit = "V", lines = {
--   { name = "tone", hz = 100, amplitude = "1 V", tolerance = "1 %" } } }
-- local plan = lb.plan(demand, lb.digitizer { rates = { "1 kHz" } })
-- local path = os.tmpname()
-- assert(plan:save(path) and lb.load_plan(path).identity == plan.identity)
-- os.remove(path)
function Plan:save(path)
  return file.write(self, path)
end

--- The error budget of one line, as text.
-- @param which string or integer: name or index, default the tightest line
-- @return string
-- @usage
-- local demand = lb.demand { unit = "V", lines = {
--   { name = "tone", hz = 100, amplitude = "1 V", tolerance = "1 %" } } }
-- local plan = lb.plan(demand, lb.digitizer { rates = { "1 kHz" } })
-- assert(plan:budget("tone"):find "own image")
function Plan:budget(which)
  return text.budget(self, which)
end

local function fold_row(plan, source, is_line)
  local hz = source.hz:number()
  local shown, zone, inverted = core.plan.fold(hz, plan.rate:number())
  return { name = source.name, hz = hz, shown_hz = shown, zone = zone, inverted = inverted,
    line = is_line, most = source.most }
end

--- Where every line and interferer shows in the record.
-- @return table: rows name, hz, shown_hz, zone, inverted, line (boolean), most
-- @usage
-- local demand = lb.demand { unit = "V", lines = {
--   { name = "tone", hz = 100, amplitude = "1 V", tolerance = "1 %" } } }
-- local plan = lb.plan(demand, lb.digitizer { rates = { "1 kHz" } })
-- assert(plan:fold_map()[1].shown_hz == 100)
function Plan:fold_map()
  local rows = {}
  for _, line in ipairs(self.demand.lines) do
    rows[#rows + 1] = fold_row(self, line, true)
  end
  for _, other in ipairs(self.demand.interferers) do
    rows[#rows + 1] = fold_row(self, other, false)
  end
  return rows
end

return M
