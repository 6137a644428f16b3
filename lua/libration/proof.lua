--- Proofs: a plan put on trial.
-- A proof makes records that the demand allows and the digitizer would deliver,
-- reads them the way the plan says, and holds every deviation against the
-- plan's own bound: random trials, and an adversary that climbs towards the
-- worst case of every line. Systematic bounds must never be passed; random
-- deviations are compared with their standard deviation.

local core = require "libration.core"
local plans = require "libration.plan"
local record = require "libration.record"
local window = require("libration.window").window

local M = {}

local LOOK_S = 0.1 -- seconds between two looks at the clock, about
local MOST_CHUNK = 4096
local MOST_TRIALS = 10 ^ 9

local Proof = {}
Proof.__index = Proof
Proof.__name = "libration.proof"

local function fail(level, text, ...)
  error("prove: " .. text:format(...), level + 1)
end

local valid = { adversary = "boolean", noise_trials = "integer", progress = "boolean",
                seed = "integer", trials = "integer", workers = "integer" }
local defaults = { adversary = true, noise_trials = 1000, progress = true, seed = 1,
                   trials = 10000, workers = 0 }

local function kind_of(value)
  return math.type(value) == "integer" and "integer" or type(value)
end

local function check_options(options, kinds, level)
  local names = {}
  for name in pairs(kinds) do names[#names + 1] = name end
  table.sort(names)
  if type(options) ~= "table" then
    fail(level + 1, "the options are a table, not %s", type(options))
  end
  for key, value in pairs(options) do
    if not kinds[key] then
      fail(level + 1, "unknown option %s; valid are %s", tostring(key), table.concat(names, ", "))
    elseif kind_of(value) ~= kinds[key] then
      fail(level + 1, "%s is %s; it must be %s", key, tostring(value), kinds[key])
    end
  end
end

local function with_defaults(options, level)
  options = options or {}
  check_options(options, valid, level + 1)
  local out = {}
  for name, value in pairs(defaults) do
    if options[name] == nil then out[name] = value else out[name] = options[name] end
  end
  for _, name in ipairs { "trials", "noise_trials" } do
    if out[name] < 0 or out[name] > MOST_TRIALS then
      fail(level + 1, "%s is %d; it must be between 0 and %d", name, out[name], MOST_TRIALS)
    end
  end
  out.noise_trials = math.min(out.noise_trials, out.trials)
  if out.workers < 0 or out.workers > 256 then
    fail(level + 1, "workers is %d; it must be between 1 and 256, or 0 for one per core",
      out.workers)
  end
  return out
end

local function plain(value)
  return type(value) == "userdata" and value:number() or value
end

local function sources_of(demand)
  local out = {}
  for _, list in ipairs { demand.lines, demand.interferers or {} } do
    for _, s in ipairs(list) do
      out[#out + 1] = { hz = plain(s.hz), lock_hz = plain(s.lock_hz), free_hz = s.free_hz,
                        wander = s.wander, least = s.least, most = s.most, driver = s.driver }
    end
  end
  return out
end

--- The table that `core.proof.new` takes, for a plan.
-- Volts of the digitizer become units of the demand through its sensitivity.
-- @param plan plan: as lb.plan returns it; its `claims` are what is put on trial
-- @return table: rate, coverage, window, spread, sources, offset, noise, front, claims
-- @usage
-- local demand = lb.demand { unit = "V", lines = {
--   { name = "tone", hz = 100, amplitude = "1 V", tolerance = "1 %" } } }
-- local plan = lb.plan(demand, lb.digitizer { rates = { "1 kHz" } })
-- assert(#require("libration.proof").setup(plan).window == plan.samples)
function M.setup(plan)
  local demand, spread = plan.demand, {}
  for i, driver in ipairs(demand.drivers) do spread[i] = driver.spread end
  return {
    rate = plain(plan.rate), coverage = demand.coverage,
    window = window(plan.window.name, plan.window.parameter):samples(plan.samples),
    spread = spread, sources = sources_of(demand), offset = demand.offset, noise = demand.noise,
    front = plan.front, claims = plan.claims,
  }
end

-- A bar on the error output, drawn at most ten times a second.
local function bar(wanted, total)
  if not wanted or not core.proof.watched() or total == 0 then
    return function() end
  end
  local last = -1
  return function(done)
    local now = core.base.clock()
    if done < total and now - last < 0.1 then return end
    last = now
    local full = math.floor(30 * done / total)
    io.stderr:write(("\rtrials [%s%s] %d of %d"):format(("#"):rep(full), ("."):rep(30 - full),
      done, total), done == total and "\n" or "")
    io.stderr:flush()
  end
end

-- Trials in pieces that take about LOOK_S, so that a bar can move and the person
-- at the keyboard can interrupt; how they are cut does not change the sums.
local function run_trials(trial, options)
  local draw, tallies = bar(options.progress, options.trials), trial:run(options.seed, 0, 0, false)
  local done, chunk = 0, 8
  while done < options.trials do
    local started, noise = core.base.clock(), done < options.noise_trials
    local last = noise and options.noise_trials or options.trials
    local count = math.min(chunk, last - done)
    tallies = trial:run(options.seed, done, count, noise)
    done = done + count
    draw(done)
    local spent = core.base.clock() - started
    if count == chunk and spent < LOOK_S then
      chunk = math.min(2 * chunk, MOST_CHUNK)
    elseif spent > 4 * LOOK_S then
      chunk = math.max(chunk // 2, 1)
    end
  end
  return tallies
end

-- What is reported of one line: the worst of trials and attacks.
local function line_report(plan, i, tally, high, low, noise_trials)
  local claim = plan.claims[i]
  local out = {
    name = plan.lines[i].name, worst = tally.worst, worst_trial = tally.worst_trial,
    violations = tally.violations, violations_hz = tally.violations_hz, tightness = tally.worst,
  }
  if claim.f_hi > claim.f_lo then
    out.worst_hz, out.worst_hz_trial = tally.worst_hz, tally.worst_hz_trial
  end
  if noise_trials > 0 and (claim.sigma or 0) > 0 then
    out.rms = (tally.squares / noise_trials) ^ 0.5
    out.exceedance = tally.beyond / noise_trials
  end
  for side, attack in pairs { high = high, low = low } do
    out[side] = attack.reached
    out.tightness = math.max(out.tightness, attack.reached)
    if attack.reached > 1 then out.violations = out.violations + 1 end
  end
  return out
end

local function worst_case(proof)
  local worst = nil
  local function consider(line, ratio, where)
    if ratio and (not worst or ratio > worst.ratio) then
      where.line, where.name, where.ratio = line, proof.lines[line].name, ratio
      where.seed, worst = proof.seed, where
    end
  end
  for i, line in ipairs(proof.lines) do
    if proof.trials > 0 then
      consider(i, line.worst, { trial = line.worst_trial, of = "amplitude" })
      consider(i, line.worst_hz, { trial = line.worst_hz_trial, of = "frequency" })
    end
    consider(i, line.high, { side = "high", of = "amplitude" })
    consider(i, line.low, { side = "low", of = "amplitude" })
  end
  return worst
end

local function sum_up(proof)
  proof.violations, proof.tightness = 0, 0
  for _, line in ipairs(proof.lines) do
    proof.violations = proof.violations + line.violations + line.violations_hz
    proof.tightness = math.max(proof.tightness, line.tightness)
  end
  proof.worst = worst_case(proof)
  proof.holds = proof.violations == 0
  return setmetatable(proof, Proof)
end

--- Puts a plan on trial: `plan:prove { trials = 10000, seed = 1 }`.
-- @param plan plan: as lb.plan returns it
-- @param options table: trials (default 10000), seed (default 1), adversary (default true),
--   noise_trials (how many of them are made with noise, jitter, limits and codes too, default
--   1000), workers (threads; default 0, one per core), progress (default true: a bar, if standard
--   error is a terminal)
-- @return table: the proof: trials, noise_trials, seed, violations (of systematic bounds; 0 when
--   the plan holds), holds (boolean), tightness (largest deviation over bound), worst (line,
--   name, ratio, of = "amplitude" or "frequency", seed, and trial or side for replay), refused
--   (text, when the adversary could not take part), seconds, and lines[i]: name, worst,
--   worst_trial, worst_hz (random trials; nil where no frequency is claimed), high, low
--   (adversary), tightness, violations, violations_hz, rms (of random deviations, in standard
--   deviations), exceedance (share beyond the demand's coverage); print shows it as a table
-- @usage
-- local demand = lb.demand { unit = "V", lines = {
--   { name = "tone", hz = 100, amplitude = "1 V", tolerance = "1 %" } } }
-- local plan = lb.plan(demand, lb.digitizer { rates = { "1 kHz" } })
-- assert(plan:prove({ trials = 50, noise_trials = 0 }).violations == 0)
function M.prove(plan, options)
  options = with_defaults(options, 2)
  local started = core.base.clock()
  local trial <close> = core.proof.new(M.setup(plan), options.workers)
  local proof = { trials = options.trials, seed = options.seed,
                  noise_trials = options.noise_trials, coverage = plan.demand.coverage, lines = {} }
  local attacks, message
  if options.adversary then
    attacks, message = trial:attack(options.seed)
    proof.refused = message
  end
  local tallies = run_trials(trial, options)
  for i, tally in ipairs(tallies) do
    proof.lines[i] = line_report(plan, i, tally, attacks and attacks[2 * i - 1],
      attacks and attacks[2 * i], options.noise_trials)
  end
  proof.seconds = core.base.clock() - started
  return sum_up(proof)
end

local replay_kinds = { line = "integer", noise = "boolean", seed = "integer", side = "string",
                       trial = "integer" }

-- Seed and line of an attack to be replayed, checked.
local function check_attack(options, plan, level)
  local line, side = options.line, options.side
  if side ~= "high" and side ~= "low" then
    fail(level + 1, 'side is %q; it must be "high" or "low"', tostring(side))
  elseif not line or line < 1 or line > #plan.lines then
    fail(level + 1, "line is %s; it must be between 1 and %d", tostring(line), #plan.lines)
  end
end

--- Makes one record of a proof again: `plan:replay { seed = 1, trial = 17 }`.
-- @param plan plan: as lb.plan returns it
-- @param options table: seed (default 1) and trial (from 0) of a random trial, noise (default
--   true: as the digitizer delivers it); or seed, line (index) and side ("high" or "low") of an
--   attack, which has no noise
-- @return record: bit for bit the same each time; or nil, message, code
-- @return table: particulars: timebase, accuracy, offset, deviation (per driver), sources (hz,
--   amplitude, phase, gain, wander ...), lines (amplitude, read, read_hz, ratio, ratio_hz,
--   deviation)
-- @usage
-- local demand = lb.demand { unit = "V", lines = {
--   { name = "tone", hz = 100, amplitude = "1 V", tolerance = "1 %" } } }
-- local plan = lb.plan(demand, lb.digitizer { rates = { "1 kHz" } })
-- local record, particulars = plan:replay { seed = 1, trial = 3 }
-- assert(record.samples == plan.samples and particulars.sources[1].hz == 100)
function M.replay(plan, options)
  check_options(options, replay_kinds, 2)
  local seed, noise = options.seed or 1, options.noise ~= false
  local trial <close> = core.proof.new(M.setup(plan), 1)
  local x, particulars, lines
  if options.side then
    noise = false
    check_attack(options, plan, 2)
    x, particulars, lines = trial:replay_attack(seed, options.line, options.side)
    if not x then return nil, particulars, lines end
  elseif options.trial and options.trial >= 0 then
    x, particulars, lines = trial:replay(seed, options.trial, noise)
  else
    fail(2, "trial is %s; it must be an integer from 0", tostring(options.trial))
  end
  particulars.lines = lines
  local front, bits = plan.front, plan.digitizer and plan.digitizer.bits
  return record.new { rate = plan.rate, samples = x, unit = plan.demand.unit,
                      full_scale = noise and front.range or nil,
                      bits = noise and front.range and bits or nil }, particulars
end

local function percent(share)
  return share and ("%.3g %%"):format(100 * share) or "-"
end

local function ratio(value)
  return value and ("%.3f"):format(value) or "-"
end

local function verdict(proof)
  if proof.trials == 0 and proof.refused then
    return "not proven: " .. proof.refused
  elseif not proof.holds then
    local w = proof.worst
    return ("FAILS: %d violations; worst %.4f of the bound, %s of %s, replay { seed = %d, %s }")
      :format(proof.violations, w.ratio, w.of, w.name, w.seed, w.trial and "trial = " .. w.trial
        or ("line = %d, side = %q"):format(w.line, w.side))
  end
  return ("holds: no bound passed; the worst case reached %.3f of it"):format(proof.tightness)
end

local function adversary_text(proof)
  return proof.refused and "refused: " .. proof.refused
    or proof.lines[1].high and "on every line" or "not asked"
end

--- A proof as a table that a person reads.
-- @param proof table: as plan:prove returns it
-- @return string: a row per line, the verdict last
-- @usage
-- local demand = lb.demand { unit = "V", lines = {
--   { name = "tone", hz = 100, amplitude = "1 V", tolerance = "1 %" } } }
-- local plan = lb.plan(demand, lb.digitizer { rates = { "1 kHz" } })
-- local text = tostring(plan:prove { trials = 10, adversary = false })
-- assert(text:find "holds: no bound passed")
function M.text(proof)
  local rows = {
    ("Proof: %d random trials (seed %d), %d of them with noise too; adversary %s; %.1f s")
      :format(proof.trials, proof.seed, proof.noise_trials, adversary_text(proof), proof.seconds),
    "Largest deviation over its bound (1 is the bound):",
    ("  %-20s %8s %8s %8s %8s %10s %12s"):format("line", "trials", "high", "low", "hz",
      "rms/sigma", ("beyond %gs"):format(proof.coverage or 3)),
  }
  for _, l in ipairs(proof.lines) do
    rows[#rows + 1] = ("  %-20s %8s %8s %8s %8s %10s %12s"):format(l.name, ratio(l.worst),
      ratio(l.high), ratio(l.low), ratio(l.worst_hz), ratio(l.rms), percent(l.exceedance))
  end
  rows[#rows + 1] = verdict(proof)
  return table.concat(rows, "\n")
end

Proof.__tostring = M.text

plans.Plan.prove = M.prove
plans.Plan.replay = M.replay

return M
