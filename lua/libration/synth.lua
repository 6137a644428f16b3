--- Synthesis: tones at any sample number, orders of a driver, keyed noise, and
-- the digitizer model. Frequencies in Hz with the sample rate given, phases in
-- rad, noise as one-sided density in unit/sqrt(Hz). The same seed gives the
-- same samples on any number of threads, in pieces of any size.

local core = require "libration.core"
local filters = require "libration.filter"
local options = require "libration.options"
local units = require "libration.units"

local M = {}

local MOST_SAMPLES = 1 << 40

-- Numbers as they are; text and fractions through the units.
local function in_unit(unit)
  return function(value)
    if type(value) == "number" and value - value == 0 then
      return value + 0.0
    end
    return units.number(value, unit)
  end
end

local number = options.number()
local level = options.number { least = 0 }
local hertz = options.quantity(in_unit "Hz", { least = 0, unit = "Hz" })
local seconds = options.quantity(in_unit "s", { least = 0, unit = "s" })
local rate_kind = options.quantity(function(value)
  if type(value) == "number" and value - value == 0 then
    return value + 0.0
  end
  local rate, reason = units.rate(value)
  return rate and rate:number(), reason
end, { above = 0, unit = "S/s" })

-- Seeds and sample numbers: any 64-bit integer.
local function key(value, path, mistakes)
  local whole = type(value) == "number" and math.tointeger(value)
  if not whole then
    mistakes:add(path, options.show(value) .. " is not a whole number")
  end
  return whole or nil
end

local function samples_kind(value, path, mistakes)
  if core.samples.is(value) then
    return value
  end
  mistakes:add(path, options.show(value) .. " is not samples")
end

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

local common = {
  rate = { rate_kind, required = true },
  samples = { options.integer(0, MOST_SAMPLES) },
  into = { samples_kind },
  first = { key, default = 0 },
  tones = { options.list(options.record(tone_schema), 0, 65536), default = {} },
  offset = { number, default = 0 },
  seed = { key, default = 0 },
  trial = { key, default = 0 },
  channel = { key, default = 0 },
}

local function schema_with(extra)
  local schema = {}
  for name, row in pairs(common) do
    schema[name] = row
  end
  for name, row in pairs(extra) do
    schema[name] = row
  end
  return schema
end

-- The samples to be filled: the caller's, or new ones.
local function target(read, what)
  if (read.into == nil) == (read.samples == nil) then
    error(what .. ": give samples (how many) or into (samples to be filled), one of them", 0)
  end
  return read.into or core.samples.new(read.samples)
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
  workers = { options.integer(0, 256), default = 0 },
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
  delay_s = { options.quantity(in_unit "s", { unit = "s" }), default = 0 },
  jitter_s = { seconds, default = 0 },
  gain_error = { number, default = 0 },
  input_noise = { level, default = 0 },
  own_noise = { level, default = 0 },
  noise_taps = { options.integer(0, 2048), default = 128 },
  bits = { options.integer(0, 32), default = 0 },
  range = { options.number { above = 0 }, default = math.huge },
  codes = { options.boolean(), default = false },
}

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

return M
