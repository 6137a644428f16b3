--- Synthesis: tones at any sample number, orders of a driver, keyed noise, and
-- the digitizer model. Frequencies in Hz with the sample rate given, phases in
-- rad, noise as one-sided density in unit/sqrt(Hz). The same seed gives the
-- same samples on any number of threads, in pieces of any size.

local core = require "libration.core"
local common = require "libration.synth.common"
local filters = require "libration.filter"
local multisine = require "libration.synth.multisine"
local options = require "libration.options"
local plants = require "libration.synth.plant"
local signals = require "libration.synth.signals"

local M = {}

local number, level, hertz, seconds = common.number, common.level, common.hertz, common.seconds
local key, target = common.key, common.target

local point = options.record {
  hz = { hertz, required = true }, density = { options.number { above = 0 }, required = true },
}

-- A density: a number, or a list of points { hz =, density = }.
local function density_kind(value, path, mistakes)
  if type(value) == "table" then
    return options.list(point, 1, 256)(value, path, mistakes)
  end
  return level(value, path, mistakes)
end

local tone_schema = {
  hz = { hertz, required = true },
  amplitude = { number, required = true },
  phase = { number, default = 0 },
  ramp = { number, default = 0 },
  swing_hz = { number, default = 0 },
  swing_s = { options.number { above = 0 }, default = 1 },
  swing_phase = { number, default = 0 },
}

local shared = {
  tones = { options.list(options.record(tone_schema), 0, 65536), default = {} },
  offset = { number, default = 0 },
  seed = { key, default = 0 },
  trial = { key, default = 0 },
  channel = { key, default = 0 },
}

local function schema_with(extra)
  for name, row in pairs(shared) do
    extra[name] = row
  end
  return common.schema(extra)
end

-- In cycles per sample.
local function reduced(tone, rate)
  local swing = tone.swing_hz / rate
  return {
    amplitude = tone.amplitude, cycles = tone.hz / rate, phase = tone.phase,
    ramp = tone.ramp / rate / rate, swing = swing,
    beat = swing ~= 0 and 1 / (tone.swing_s * rate) or 0, swing_phase = tone.swing_phase,
  }
end

local function tapped(points, rate, half)
  local at, density = {}, {}
  for i, p in ipairs(points) do
    at[i], density[i] = p.hz / rate, p.density * math.sqrt(rate / 2)
  end
  return core.synth.shape(core.samples.from(at), core.samples.from(density), half)
end

local function signal_of(read)
  local rate = read.rate
  local signal = {
    offset = read.offset, first = read.first, workers = read.workers, seed = read.seed,
    trial = read.trial, channel = read.channel, purpose = read.purpose, tones = {}, sigma = 0,
  }
  for i, tone in ipairs(read.tones) do
    signal.tones[i] = reduced(tone, rate)
  end
  if type(read.noise) == "table" then
    signal.sigma, signal.taps = 1, tapped(read.noise, rate, read.noise_taps)
  elseif read.noise then
    signal.sigma = read.noise * math.sqrt(rate / 2)
  end
  return signal
end

local tones_schema = schema_with {
  noise = { density_kind },
  noise_taps = { options.integer(0, 2048), default = 256 },
  purpose = { key, default = 64 },
}

--- A signal: offset, tones and Gaussian noise, without any digitizer.
-- A tone is { hz =, amplitude = (peak), phase = (rad, at sample 0), ramp = (Hz
-- per second), swing_hz =, swing_s =, swing_phase = (slow sinusoidal frequency
-- modulation: peak, period, phase) }. Noise is a one-sided density
-- (unit/sqrt(Hz)), or a list of points { hz =, density = } joined by straight
-- lines on logarithmic axes, flat outside; shaped by a symmetric filter of
-- noise_taps taps on each side, which blurs the curve over about
-- rate / noise_taps.
-- @param spec table: rate (S/s), samples (how many) or into (samples to fill),
-- first (number of the first sample, 0), tones, offset, noise, noise_taps
-- (256), seed, trial, channel, purpose (integers, key of the noise), workers
-- (threads; 0: one per core)
-- @return samples: the signal; raises with all mistakes in spec
-- @usage
-- local x = lb.synth.tones { rate = 1000, samples = 1000, seed = 7, noise = 1e-3,
--   tones = { { hz = 24.6, amplitude = 2, phase = 0.3 } } }
-- assert(#x == 1000 and math.abs(x:rms() - math.sqrt(2)) < 0.05)
function M.tones(spec)
  local read = options.take(tones_schema, spec, "tones")
  return core.synth.fill(target(read, "tones"), signal_of(read))
end

local noise_schema = {}
for _, name in ipairs { "rate", "samples", "into", "first", "seed", "trial", "channel",
  "purpose", "workers", "noise_taps" } do
  noise_schema[name] = tones_schema[name]
end
noise_schema.density = { density_kind, required = true }

--- Gaussian noise of a stated one-sided density.
-- @param spec table: density (unit/sqrt(Hz), or points { hz =, density = }),
-- rate, samples or into, first, noise_taps, seed, trial, channel, purpose,
-- workers; as in tones
-- @return samples: the noise; white noise has variance density^2 rate / 2
-- @usage
-- local x = lb.synth.noise { density = 1, rate = 200, samples = 10000, seed = 1 }
-- assert(math.abs(x:rms() - 10) < 0.5)
function M.noise(spec)
  local read = options.take(noise_schema, spec, "noise")
  read.noise, read.tones, read.offset = read.density, {}, 0
  return core.synth.fill(target(read, "noise"), signal_of(read))
end

local orders_schema = {
  hz = { hertz, required = true },
  ramp = { number, default = 0 },
  list = { options.list(options.record {
    times = { options.number { least = 0 }, required = true },
    amplitude = { number, required = true },
    phase = { number, default = 0 },
  }, 1, 4096), required = true },
}

--- Tones that are multiples of one driver, such as the orders of a shaft.
-- @param spec table: hz (of the driver), ramp (of the driver, Hz per second),
-- list = { { times =, amplitude =, phase = }, ... }
-- @return table: list of tones for tones and record
-- @usage
-- local list = lb.synth.orders { hz = 24.6, ramp = 0.5,
--   list = { { times = 1, amplitude = 2 }, { times = 7, amplitude = 0.3 } } }
-- assert(math.abs(list[2].hz - 172.2) < 1e-12 and list[2].ramp == 3.5)
function M.orders(spec)
  local read, tones = options.take(orders_schema, spec, "orders"), {}
  for i, order in ipairs(read.list) do
    tones[i] = { hz = read.hz * order.times, ramp = read.ramp * order.times,
                 amplitude = order.amplitude, phase = order.phase }
  end
  return tones
end

-- What lb.filter takes, or a filter that it made.
local function filter_kind(value, path, mistakes)
  local ok, made = pcall(filters.new, value)
  if ok then
    return made
  end
  mistakes:add(path, tostring(made))
end

local record_schema = schema_with {
  timebase = { options.number { above = -1 }, default = 0 },
  filter = { filter_kind },
  delay_s = { options.quantity(common.in_unit "s", { unit = "s" }), default = 0 },
  jitter_s = { seconds, default = 0 },
  gain_error = { number, default = 0 },
  input_noise = { level, default = 0 },
  own_noise = { level, default = 0 },
  noise_taps = { options.integer(0, 2048), default = 128 },
  bits = { options.integer(0, 32), default = 0 },
  range = { options.number { above = 0 }, default = math.huge },
  codes = { options.boolean(), default = false },
}
record_schema.workers = nil

--- What a digitizer makes of tones and noise.
-- The filter acts at each tone's true frequency and shapes the noise at its
-- input (folds included); sampling instants are those of the true rate, rate
-- (1 + timebase), delayed and jittered; the quantiser is mid-tread with codes
-- -2^(bits-1) .. 2^(bits-1)-1 over -range .. range.
-- @param spec table: rate, samples or into, first, tones, offset, seed, trial,
-- channel as in tones; timebase (relative), filter (as lb.filter takes it),
-- delay_s, jitter_s, gain_error (relative), input_noise and own_noise
-- (unit/sqrt(Hz)), noise_taps (of the shaping, 128), bits (0: no quantiser),
-- range (largest |value|, needed with bits), codes (true: integer codes too)
-- @return samples: the record, in the tones' unit
-- @return integer: how many samples the rails changed
-- @return samples: the integer codes, where asked for
-- @usage
-- local x, clipped = lb.synth.record { rate = 1000, samples = 500, bits = 16, range = 5,
--   tones = { { hz = 50, amplitude = 3 } },
--   filter = { shape = "butterworth", order = 4, corner = "400 Hz" } }
-- assert(clipped == 0 and math.abs(x:peak() - 3) < 0.01)
function M.record(spec)
  local read = options.take(record_schema, spec, "record")
  if read.bits > 0 and read.range == math.huge then
    error("record: range is missing; bits = " .. read.bits .. " needs it", 0)
  elseif read.bits == 0 and read.codes then
    error("record: bits is missing; codes = true needs it", 0)
  end
  local x = target(read, "record")
  read.codes = read.codes and core.samples.new(#x) or nil
  if read.filter and read.filter.shape ~= "none" and read.input_noise > 0 then
    read.input_shape = core.synth.input_shape(read.filter, read.rate, read.noise_taps)
  end
  return x, core.synth.record(x, read), read.codes
end

--- Tones of one fundamental with phases that keep the peaks of their sum low.
-- @param spec table: hz (fundamental), harmonics (increasing list) or count (1 .. count); amplitude
--   (peak of each), amplitudes (a list) or rms (of the sum); phases: "schroeder" (default),
--   "newman", "rudin_shapiro", "equal", "random"; seed (of random phases, 0)
-- @return table: list of tones for tones and record. With consecutive harmonics of equal amplitude
--   the crest factor of newman and schroeder phases is about 1.7 (4.6 dB); gaps raise it
-- @usage
-- local list = lb.synth.multisine { hz = 10, count = 64, amplitude = 1 }
-- local x = lb.synth.tones { rate = 40960, samples = 4096, tones = list }
-- assert(#list == 64 and math.abs(x:peak() / x:rms() - 1.7065) < 0.003)
function M.multisine(spec)
  return multisine.tones(spec)
end

--- A tone whose frequency runs from one value to another, once; silence before and after.
-- @param spec table: from_hz, to_hz, duration_s, amplitude (peak), law ("linear" or "exponential"),
--   phase (rad, at the start), start_s (0), fade_s (raised-cosine rise and fall, 0); rate, samples
--   or into, first, workers as in tones
-- @return samples: the chirp
-- @usage
-- local x = lb.synth.chirp { rate = 1000, samples = 1000, from_hz = 10, to_hz = 400,
--   duration_s = 0.5, amplitude = 2, law = "exponential" }
-- assert(x[1] == 2 and x[501] == 0)
function M.chirp(spec)
  return signals.chirp(spec)
end

--- A swept sine: pass after pass, for ever, without a jump of the phase.
-- @param spec table: as for chirp, without fade_s; duration_s is that of one pass; back (true:
--   every other pass runs backwards, so that the frequency does not jump either)
-- @return samples: the swept sine
-- @usage
-- local x = lb.synth.sweep { rate = 1000, samples = 3000, from_hz = 10, to_hz = 50,
--   duration_s = 1, amplitude = 1, back = true }
-- assert(math.abs(x:rms() - math.sqrt(0.5)) < 0.01)
function M.sweep(spec)
  return signals.sweep(spec)
end

--- Orders of a driver whose speed follows straight lines between points.
-- Beyond the first and last point the speed stays as it is there.
-- @param spec table: speed, a list of { s =, hz = } (of the driver); orders, a list of { times =,
--   amplitude =, phase = (rad, at the first point), power = (the amplitude goes with that power of
--   speed over reference_hz; 0) }; reference_hz (default: the highest speed); rate, samples or
--   into, first, workers as in tones
-- @return samples: the sum of the orders
-- @usage
-- local x = lb.synth.ramp { rate = 1000, samples = 2000,
--   speed = { { s = 0, hz = 10 }, { s = 2, hz = 40 } },
--   orders = { { times = 1, amplitude = 1, power = 2 }, { times = 3.5, amplitude = 0.1 } } }
-- assert(x:slice(1, 500):rms() < x:slice(1501):rms())
function M.ramp(spec)
  return signals.ramp(spec)
end

--- A carrier whose amplitude and frequency are modulated by tones.
-- @param spec table: hz, amplitude, phase of the carrier; am, a list of { hz =, depth =
--   (relative), phase = (of the cosine) }; fm, a list of { hz =, deviation_hz = (peak), phase =
--   (of the cosine that the frequency follows) }; rate, samples or into, first, workers
-- @return samples: the carrier
-- @usage
-- local x = lb.synth.modulated { rate = 1000, samples = 1000, hz = 200, amplitude = 1,
--   am = { { hz = 10, depth = 0.5 } } }
-- assert(math.abs(x:rms() ^ 2 - 0.5 * (1 + 0.125)) < 1e-12)
function M.modulated(spec)
  return signals.modulated(spec)
end

--- Damped modes that are struck: what a tapped structure does.
-- @param spec table: modes, a list of { hz = (natural), damping = (ratio), amplitude = (per
--   strength, 1), phase = (rad, of the sine) }; hits, a list of { s =, strength = } (default: one
--   of 1 at 0 s); rate, samples or into, first, workers
-- @return samples: the sum of the decays
-- @usage
-- local x = lb.synth.decays { rate = 1000, samples = 1000,
--   modes = { { hz = 50, damping = 0.01 }, { hz = 90, damping = 0.02, amplitude = 0.3 } } }
-- assert(x:slice(1, 100):rms() > 10 * x:slice(901):rms())
function M.decays(spec)
  return signals.decays(spec)
end

--- Damped modes struck again and again at slipping intervals, as a rolling-element fault does it.
-- Interval k is (1 + slip g) / hz with normal g, each from its own draw, so that instants wander.
-- @param spec table: modes as in decays; hz (impacts per second); slip (standard deviation of an
--   interval, relative, 0 .. 0.1); strength (1), scatter (its relative standard deviation, 0);
--   load_hz, load_depth, load_phase (strength follows 1 + depth cos(2 pi load_hz t + phase));
--   start_s (0); seed, trial, channel; rate, samples or into, first, workers
-- @return samples: the decays
-- @return samples: the instants of the impacts, s
-- @usage
-- local x, at = lb.synth.impacts { rate = 20000, samples = 20000, hz = 107.36, slip = 0.01,
--   modes = { { hz = 3000, damping = 0.05 } } }
-- assert(#at > 100 and x:peak() / x:rms() > 3)
function M.impacts(spec)
  return signals.impacts(spec)
end

--- Plants a failure into a record: the copy lies in the way the name says.
-- The record given is not changed. Integer channels hold integer codes again afterwards; gaps and
-- counters are not kept, so that nothing gives the failure away. The same options give the same
-- bits.
-- @param record record: what is to be spoilt
-- @param failure string: a name of failures
-- @param spec table: its options, as failures lists them; all have defaults except where required
-- @return record: the spoilt record
-- @return table: failure, row, options (as they were used) and what happened, such as at, clipped,
--   changed, seen_hz; raises where an option or the failure does not fit the record
-- @usage
-- local x = lb.synth.tones { rate = 1000, samples = 1000, tones = { { hz = 50, amplitude = 1 } } }
-- local record = lb.record.new { rate = 1000, samples = x }
-- local lying, facts = lb.synth.plant(record, "lost_samples", { at = 501, count = 3 })
-- assert(lying.samples == 997 and facts.row == 28 and lying:values()[501] == x[504])
function M.plant(record, failure, spec)
  return plants.plant(record, failure, spec)
end

--- The failures that can be planted, and those that cannot.
-- @return table: list of { name, row (of the project's catalogue of failures), does, options = list
--   of { name, unit, default (nil: depends on the record, see text), required, text } }
-- @return table: list of { row, why } of the catalogue's other rows: mistakes of an analysis, which
--   no record carries
-- @usage
-- local list = lb.synth.failures()
-- assert(#list > 30 and list[1].name == "adc_clipping" and list[1].row == 1)
function M.failures()
  return plants.failures()
end

return M
