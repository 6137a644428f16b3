--- Signals that move or ring: chirps, speed ramps, modulated carriers, decays
-- and impact series. Each reads its options, turns seconds into samples and
-- hands the work to the core.

local core = require "libration.core"
local common = require "libration.synth.common"
local options = require "libration.options"

local M = {}

local number, level, above, hertz = common.number, common.level, common.above, common.hertz
local seconds = common.seconds
local PI = math.pi

local chirp_schema = common.schema {
  from_hz = { hertz, required = true }, to_hz = { hertz, required = true },
  duration_s = { options.number { above = 0 }, required = true },
  start_s = { number, default = 0 },
  fade_s = { seconds, default = 0 },
  amplitude = { number, required = true }, phase = { number, default = 0 },
  law = { options.choice { "linear", "exponential" }, default = "linear" },
}

local sweep_schema = {}
for name, row in pairs(chirp_schema) do
  sweep_schema[name] = row
end
sweep_schema.fade_s = nil
sweep_schema.back = { options.boolean(), default = false }

local function run_chirp(read, what, repeats)
  local rate = read.rate
  if read.law == "exponential" and not (read.from_hz > 0 and read.to_hz > 0) then
    error(("%s: an exponential law needs from_hz and to_hz above 0, not %g and %g")
      :format(what, read.from_hz, read.to_hz), 0)
  elseif (read.fade_s or 0) > read.duration_s / 2 then
    error(("%s: fade_s is %g; at most half of duration_s, %g"):format(what, read.fade_s,
      read.duration_s / 2), 0)
  end
  return core.synth.chirp(common.target(read, what, true), {
    amplitude = read.amplitude, phase = read.phase, from = read.from_hz / rate,
    to = read.to_hz / rate, start = read.start_s * rate, length = read.duration_s * rate,
    fade = (read.fade_s or 0) * rate, exponential = read.law == "exponential",
    repeats = repeats, back = read.back, first = read.first, workers = read.workers })
end

function M.chirp(spec)
  return run_chirp(options.take(chirp_schema, spec, "chirp"), "chirp", false)
end

function M.sweep(spec)
  return run_chirp(options.take(sweep_schema, spec, "sweep"), "sweep", true)
end

local ramp_schema = common.schema {
  speed = { options.list(options.record {
    s = { number, required = true }, hz = { hertz, required = true },
  }, 1, 65536), required = true },
  orders = { options.list(options.record {
    times = { level, required = true }, amplitude = { number, required = true },
    phase = { number, default = 0 }, power = { number, default = 0 },
  }, 1, 4096), required = true },
  reference_hz = { above },
}

function M.ramp(spec)
  local read = options.take(ramp_schema, spec, "ramp")
  local knots, rate, highest = {}, read.rate, 0
  for i, point in ipairs(read.speed) do
    if i > 1 and point.s <= read.speed[i - 1].s then
      error(("ramp: speed[%d].s is %g; instants must increase"):format(i, point.s), 0)
    end
    knots[i] = { at = point.s * rate, speed = point.hz / rate }
    highest = math.max(highest, point.hz)
  end
  local reference = read.reference_hz or highest
  if reference == 0 then
    error("ramp: the driver stands still; reference_hz must say where amplitudes hold", 0)
  end
  return core.synth.orders(common.target(read, "ramp", true), { knots = knots,
    orders = read.orders, reference = reference / rate, first = read.first,
    workers = read.workers })
end

local modulated_schema = common.schema {
  hz = { hertz, required = true }, amplitude = { number, required = true },
  phase = { number, default = 0 },
  am = { options.list(options.record {
    hz = { hertz, required = true }, depth = { number, required = true },
    phase = { number, default = 0 } }, 0, 256), default = {} },
  fm = { options.list(options.record {
    hz = { above, required = true }, deviation_hz = { number, required = true },
    phase = { number, default = 0 } }, 0, 256), default = {} },
}

function M.modulated(spec)
  local read, am, pm = options.take(modulated_schema, spec, "modulated"), {}, {}
  for i, m in ipairs(read.am) do
    am[i] = { cycles = m.hz / read.rate, depth = m.depth, phase = m.phase }
  end
  for i, m in ipairs(read.fm) do
    pm[i] = { cycles = m.hz / read.rate, depth = m.deviation_hz / m.hz, phase = m.phase }
  end
  return core.synth.modulated(common.target(read, "modulated", true), {
    amplitude = read.amplitude, cycles = read.hz / read.rate, phase = read.phase, am = am,
    pm = pm, first = read.first, workers = read.workers })
end

local modes_kind = options.list(options.record {
  hz = { hertz, required = true },
  damping = { options.number { above = 0, below = 1 }, required = true },
  amplitude = { number, default = 1 }, phase = { number, default = 0 },
}, 1, 4096)

-- Natural frequency and damping ratio as damped frequency and decay.
local function modes_of(read)
  local modes = {}
  for i, m in ipairs(read.modes) do
    local natural = m.hz / read.rate
    modes[i] = { amplitude = m.amplitude, phase = m.phase,
      cycles = natural * math.sqrt(1 - m.damping ^ 2), decay = 2 * PI * natural * m.damping }
    if natural == 0 then
      error(("modes[%d].hz is 0; a mode that decays needs more"):format(i), 0)
    end
  end
  return modes
end

local function strike(read, what, at, strength)
  return core.synth.struck(common.target(read, what, true), { modes = modes_of(read),
    at = core.samples.from(at), strength = core.samples.from(strength), first = read.first,
    workers = read.workers })
end

local decays_schema = common.schema {
  modes = { modes_kind, required = true },
  hits = { options.list(options.record {
    s = { number, required = true }, strength = { number, default = 1 } }, 1, 65536),
    default = { { s = 0, strength = 1 } } },
}

function M.decays(spec)
  local read, at, strength = options.take(decays_schema, spec, "decays"), {}, {}
  for i, hit in ipairs(read.hits) do
    at[i], strength[i] = hit.s * read.rate, hit.strength
    if i > 1 and at[i] < at[i - 1] then
      error(("decays: hits[%d].s is %g; instants must not decrease"):format(i, hit.s), 0)
    end
  end
  return strike(read, "decays", at, strength)
end

local impacts_schema = common.schema {
  modes = { modes_kind, required = true },
  hz = { options.number { above = 0 }, required = true },
  start_s = { number, default = 0 },
  slip = { options.number { least = 0, most = 0.1 }, default = 0 },
  strength = { number, default = 1 },
  scatter = { level, default = 0 },
  load_hz = { hertz, default = 0 },
  load_depth = { number, default = 0 },
  load_phase = { number, default = 0 },
  seed = { common.key, default = 0 },
  trial = { common.key, default = 0 },
  channel = { common.key, default = 0 },
}

local MOST_IMPACTS = 1 << 24

-- Instants and strengths of all impacts before sample `last`. Impact k depends
-- on the key and on the ones before it, never on where the samples begin.
local function train(read, last)
  local period = read.rate / read.hz
  -- The shortest interval the normal numbers of the core can make.
  local most = math.max(1, math.ceil((last - read.start_s * read.rate) / period
    / (1 - 8.6 * read.slip)) + 1)
  if most > MOST_IMPACTS then
    error(("impacts: %d impacts; at most %d"):format(most, MOST_IMPACTS), 0)
  end
  local function gaussian(purpose)
    return core.synth.gaussian(core.samples.new(most), read.seed,
      { read.trial, read.channel, purpose })
  end
  local slips, scatters = gaussian(66), gaussian(67)
  local at, strength, t = {}, {}, read.start_s * read.rate
  for k = 1, most do
    if t > last then break end
    local load = 1 + read.load_depth
      * math.cos(2 * PI * read.load_hz * t / read.rate + read.load_phase)
    at[k], strength[k] = t, read.strength * load * (1 + read.scatter * scatters[k])
    t = t + period * (1 + read.slip * slips[k])
  end
  return at, strength
end

function M.impacts(spec)
  local read = options.take(impacts_schema, spec, "impacts")
  local n = read.into and #read.into or read.samples or 0
  local at, strength = train(read, read.first + n)
  return strike(read, "impacts", at, strength), core.samples.from(at) / read.rate
end

return M
