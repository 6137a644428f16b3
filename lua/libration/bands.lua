--- Bands and repetitions: fractional octaves with frequency weighting, mains groups, cepstrum,
-- envelope spectrum and spectral kurtosis.
-- Every analysis takes a record, or samples with rate = (S/s), and returns a table that says what
-- it is: kind, unit, resolution, window. Levels are root mean squares in the unit of the samples.

local core = require("libration.core").bands
local input = require "libration.bands.input"
local mains = require "libration.bands.mains"
local repeats = require "libration.bands.repeats"
local options = require "libration.options"
local result = require "libration.report.result"
local shown = require "libration.bands.shown"
local windows = require "libration.window"

local M = {}

local LEAST_LINES = 16 -- in the narrowest band: keeps class 1 with a Hann window

local fraction_kind = options.integer(1, 48)
local order_kind = options.integer(3, 32)
local weighting_kind = options.choice { "A", "C", "Z" }

-- Preferred numbers R10 of ISO 266:1997, for bands of 1 and 1/3 octave.
local preferred = { [0] = 1, 1.25, 1.6, 2, 2.5, 3.15, 4, 5, 6.3, 8 }

-- Nominal frequency: ISO 266 for b = 1 and 3; else rounded as Annex E of IEC 61260-1:2014 says,
-- to three digits below a leading 5, to two from there.
local function nominal(b, number, mid)
  local tenths = b == 3 and 30 + number or b == 1 and 30 + 3 * number
  if tenths then
    return preferred[tenths % 10] * 10.0 ^ (tenths // 10)
  end
  local unit = 10.0 ^ math.floor(math.log(mid, 10))
  local step = mid / unit < 5 and unit / 100 or unit / 10
  return tonumber(("%.6g"):format(math.floor(mid / step + 0.5) * step))
end

local function band_of(b, number)
  local mid, low, high = core.band(b, number)
  return { number = number, mid_hz = mid, low_hz = low, high_hz = high,
           nominal_hz = nominal(b, number, mid) }
end

local list_schema = {
  fraction = { fraction_kind, default = 3 },
  from_hz = { input.hertz, required = true }, to_hz = { input.hertz, required = true },
}

--- Fractional-octave bands with their exact frequencies (IEC 61260-1:2014, base ten).
-- @param spec table: fraction (b of 1/b octave, default 3), from_hz and to_hz (the first band holds
--   from_hz, the last to_hz)
-- @return table: list of { number, nominal_hz (the label), mid_hz, low_hz, high_hz (exact) }
-- @usage
-- local list = lb.bands.list { fraction = 3, from_hz = 31.5, to_hz = 16000 }
-- assert(#list == 28 and list[1].nominal_hz == 31.5)
-- assert(math.abs(list[1].mid_hz - 31.6227766) < 1e-7)
function M.list(spec)
  local read, list = options.take(list_schema, spec, "bands"), {}
  for number = core.at(read.fraction, read.from_hz), core.at(read.fraction, read.to_hz) do
    list[#list + 1] = band_of(read.fraction, number)
  end
  return list
end

--- Gain of a frequency weighting of IEC 61672-1:2013 in dB, 0 at 1 kHz.
-- The tables of the standard hold at the exact frequencies 1000 * 10^(n/10) Hz, not at the nominal
-- ones on their labels.
-- @param name string: "A", "C" or "Z" (flat)
-- @param hz number: frequency, Hz, above 0
-- @return number: dB
-- @usage
-- assert(math.abs(lb.bands.weighting_db("A", 10 ^ 1.5) + 39.44) < 0.001)
function M.weighting_db(name, hz)
  return 20 * math.log(core.weighting(name, hz), 10)
end

local Levels = { __name = "libration.band_levels" }
Levels.__index = Levels

function Levels:__tostring()
  local lines = { ("1/%d octave levels, %s weighted, %s window, lines %.6g Hz apart"):format(
    self.fraction, self.weighting, self.window, self.resolution_hz),
    ("  %10s %14s %12s %9s"):format("band Hz", "exact Hz", "rms " .. self.unit, "dB") }
  for _, band in ipairs(self.bands) do
    lines[#lines + 1] = ("  %10.6g %14.6f %12.6g %9.2f"):format(band.nominal_hz, band.mid_hz,
      band.rms, band.db)
  end
  lines[#lines + 1] = ("  %10s %14s %12.6g %9.2f"):format("all", "", self.total_rms,
    self.total_db)
  return table.concat(lines, "\n")
end

shown.levels(Levels)

-- The bands asked for, or all that the lines resolve; nil and why.
local function bands_of(read, resolution_hz, top_hz)
  local b = read.fraction
  if top_hz < LEAST_LINES * resolution_hz then
    return nil, ("the lines are %.6g Hz apart up to %.6g Hz: no band holds %d of them"):format(
      resolution_hz, top_hz, LEAST_LINES), "domain"
  end
  local function lines_in(number)
    local _, low, high = core.band(b, number)
    return (high - low) / resolution_hz
  end
  local last = core.at(b, read.to_hz or top_hz)
  while not read.to_hz and select(3, core.band(b, last)) > top_hz do
    last = last - 1
  end
  local width = (10 ^ (0.15 / b) - 10 ^ (-0.15 / b))
  local first = core.at(b, read.from_hz or LEAST_LINES * resolution_hz / width)
  while not read.from_hz and lines_in(first) < LEAST_LINES do
    first = first + 1
  end
  local mid, low, high = core.band(b, first)
  if lines_in(first) < LEAST_LINES * (1 - 1e-9) then
    return nil, ("the band at %.6g Hz, %.6g .. %.6g Hz, holds %.3g lines %.6g Hz apart; class 1 "
      .. "needs %d: a longer record"):format(mid, low, high, lines_in(first), resolution_hz,
      LEAST_LINES), "domain"
  elseif last < first or select(3, core.band(b, last)) > top_hz * (1 + 1e-9) then
    return nil, ("the band at %.6g Hz ends above half the rate, %.6g Hz"):format(
      core.band(b, last), top_hz), "domain"
  end
  return first, last
end

local function db(power, reference)
  return 10 * math.log(power / reference ^ 2, 10)
end

local function levels_of(power, step_hz, read, facts)
  local top = (#power - 1) * step_hz
  local first, last, code = bands_of(read, step_hz, top)
  if not first then
    return nil, last, code
  end
  local weighted = core.weigh(read.weighting, power, step_hz)
  local powers = core.powers(weighted, step_hz, read.fraction, read.order, first, last - first + 1)
  facts.bands = {}
  for i = 1, #powers do
    local band = band_of(read.fraction, first + i - 1)
    band.rms, band.db = math.sqrt(powers[i]), db(powers[i], read.reference)
    facts.bands[i] = band
  end
  facts.kind, facts.fraction, facts.order = "band rms", read.fraction, read.order
  facts.weighting, facts.reference, facts.resolution_hz = read.weighting, read.reference, step_hz
  facts.total_rms = math.sqrt(weighted:sum())
  facts.total_db = db(weighted:sum(), read.reference)
  return setmetatable(facts, Levels)
end

local function band_fields()
  return {
    fraction = { fraction_kind, default = 3 }, order = { order_kind, default = 6 },
    weighting = { weighting_kind, default = "Z" },
    reference = { options.number { above = 0 }, default = 1 },
    from_hz = { input.hertz }, to_hz = { input.hertz },
  }
end

local levels_schema = input.schema(band_fields())
levels_schema.window = { input.window, default = windows.window "hann" }
levels_schema.segment = { options.integer(2, 1 << 27) }

-- Mean line powers of segments, and how many there are.
local function mean_powers(x, read, size)
  local window, sum, count = read.window:samples(size), nil, 0
  for block in input.segments(x, read, size) do
    local power = core.line_powers(block, window)
    sum, count = sum and sum:add(power) or power, count + 1
  end
  return sum:scale(1 / count), count
end

--- Fractional-octave levels of a record, class 1 of IEC 61260-1:2014.
-- The whole record is transformed at once, or in segments, in bounded memory; the line powers
-- are summed with a band-pass of Butterworth magnitude over each band.
-- @param x record or samples
-- @param spec table: rate (for samples), channel (1), fraction (3), order (of the band-pass, 3 to
--   32, default 6), weighting ("A", "C", "Z"), reference (rms at 0 dB, 1), window ("hann"), segment
--   (samples of each of the segments whose powers are averaged, default: the whole record), from_hz
--   and to_hz (default: all bands that hold 16 lines and end below half the rate)
-- @return table: bands, a list as from list with rms and db; total_rms, total_db (of all lines, 0
--   Hz included), kind, unit, resolution_hz, window, weighting, segments, unused_samples; prints as
--   a table; or nil, message, "domain" where a band asked for is not resolved, a segment is longer
--   than the record, or a transform longer than 2^27
-- @usage
-- local x = lb.synth.tones { rate = 8000, samples = 8000,
--   tones = { { hz = 1000, amplitude = 2 } } }
-- local levels = lb.bands.levels(x, { rate = 8000, from_hz = 500, to_hz = 2000 })
-- assert(#levels.bands == 7 and math.abs(levels.bands[4].rms - math.sqrt(2)) < 1e-3)
function M.levels(x, spec)
  local read = options.take(levels_schema, spec, "levels")
  local n, rate, unit = input.facts(x, read, "levels")
  local size = read.segment or n
  if size > n or size > 1 << 27 or size < 2 * LEAST_LINES then
    return nil, ("levels: a segment of %d samples of %d; it must be %d to 2^27"):format(size, n,
      2 * LEAST_LINES), "domain"
  end
  local power, segments = mean_powers(x, read, size)
  return levels_of(power, rate / size, read, { unit = unit, window = read.window.name,
    segments = segments, unused_samples = n - segments * size })
end

local lines_schema = band_fields()
lines_schema.unit = { options.text(), default = "1" }

--- Fractional-octave levels from the line powers of any one-sided spectrum.
-- @param power samples: squared rms of the lines at 0, step_hz, 2 step_hz ... whose sum is the mean
--   square (a density times the line spacing)
-- @param step_hz number: Hz between lines
-- @param spec table: as in levels, without rate, channel and window; unit (text)
-- @return table: as in levels; or nil, message, "domain"
-- @usage
-- local power = lb.samples.new(4001):fill(1e-3)
-- local levels = lb.bands.of_lines(power, 1, { fraction = 1, from_hz = 250, to_hz = 2000 })
-- assert(math.abs(levels.bands[2].db - levels.bands[1].db - 3) < 0.1)
function M.of_lines(power, step_hz, spec)
  local read = options.take(lines_schema, spec, "of_lines")
  return levels_of(power, step_hz, read, { unit = read.unit, window = "given" })
end

--- Checks an attenuation against the class limits of IEC 61260-1:2014, Table 1.
-- Looks at 401 ratios evenly spaced in their logarithm, and just beside the edges.
-- @param attenuation function: ratio of frequency to exact mid-band frequency -> dB relative to the
--   reference attenuation; default: the band-pass of levels, order 6
-- @param spec table: fraction (3), class (1), reach (largest ratio looked at, default G^4 of the
--   breakpoints)
-- @return table: meets (boolean), margin_db (the smallest distance to a limit, negative outside),
--   at_ratio (where it is)
-- @usage
-- local check = lb.bands.check(nil, { fraction = 1, class = 1 })
-- assert(check.meets and check.margin_db >= 0)
function M.check(attenuation, spec)
  local read = options.take({ fraction = { fraction_kind, default = 3 },
    class = { options.integer(1, 2), default = 1 },
    reach = { options.number { above = 1 } } }, spec, "check")
  local b = read.fraction
  attenuation = attenuation or function(ratio) return core.attenuation(b, 6, ratio) end
  local edge = 10 ^ (0.15 / b)
  local reach = read.reach or 1 + (edge - 1) / (10 ^ 0.15 - 1) * (10 ^ 1.2 - 1)
  local out = { margin_db = math.huge }
  local function look(ratio)
    local least, most = core.limits(b, read.class, ratio)
    local value = attenuation(ratio)
    local margin = math.min(value - least, most - value)
    if not (margin >= out.margin_db) then
      out.margin_db, out.at_ratio = margin, ratio
    end
  end
  for i = -200, 200 do look(reach ^ (i / 200)) end
  for _, near in ipairs { 1 - 1e-9, 1 + 1e-9 } do
    look(edge * near)
    look(1 / (edge * near))
  end
  out.meets = out.margin_db >= 0
  return out
end

--- Harmonic and interharmonic groups and subgroups of a mains signal (IEC 61000-4-7).
-- Rectangular windows of 10 cycles at 50 Hz or 12 at 60 Hz, one after the other; squares are
-- averaged over the windows.
-- @param x record or samples
-- @param spec table: rate (for samples), channel (1), mains_hz (50 or 60, default 50), cycles (of a
--   window, even, default mains_hz / 5), orders (40)
-- @return table: harmonics, a list of { order, hz, line, group, subgroup } (rms); interharmonics, a
--   list of { above_order, group, centred_subgroup }; thd, thd_group, thd_subgroup (relative),
--   windows, unused_samples, resolution_hz, unit; prints as a table; or nil, message, "domain"
--   where a window is no whole number of samples or the record does not hold one
-- @usage
-- local x = lb.synth.tones { rate = 10000, samples = 2000,
--   tones = { { hz = 50, amplitude = 325 }, { hz = 250, amplitude = 13 } } }
-- local groups = lb.bands.groups(x, { rate = 10000 })
-- assert(math.abs(groups.thd - 0.04) < 1e-9 and groups.resolution_hz == 5)
function M.groups(x, spec)
  return mains.groups(x, spec)
end

--- The cepstrum of a record: families of harmonics, sidebands and echoes as one line each.
-- @param x record or samples
-- @param spec table: rate (for samples), channel (1), kind ("real": inverse transform of the
--   logarithm of the magnitudes; "power": squared, of that of the powers), floor (share of the
--   largest magnitude that smaller ones count as, 0), window (default none)
-- @return table: values (value n + 1 is quefrency n step_s), step_s, kind, window; or nil, message,
--   "domain" where a magnitude is 0 and floor is 0
-- @usage
-- local x = lb.samples.new(64)
-- x[1], x[9] = 1, 0.5 -- an echo after 8 samples
-- local c = lb.bands.cepstrum(x, { rate = 1000 })
-- assert(math.abs(c.values[9] - 0.25) < 0.001)
function M.cepstrum(x, spec)
  return repeats.cepstrum(x, spec)
end

--- The envelope of a band of a record: magnitude of its analytic signal.
-- @param x record or samples: taken as one period, so that both ends show each other
-- @param spec table: rate (for samples), channel (1), from_hz, to_hz (sharp edges, included)
-- @return samples: as many as the record has; or nil, message, "domain" where no line lies in the
--   band or it leaves half the rate
-- @usage
-- local x = lb.synth.modulated { rate = 8000, samples = 8000, hz = 2000, amplitude = 1,
--   am = { { hz = 40, depth = 0.5 } } }
-- local e = lb.bands.envelope(x, { rate = 8000, from_hz = 1900, to_hz = 2100 })
-- assert(math.abs(e[1] - 1.5) < 1e-9 and math.abs(e:min() - 0.5) < 1e-9)
function M.envelope(x, spec)
  return repeats.envelope(x, spec)
end

--- The spectrum of the envelope of a band: how fast what rings there is struck.
-- @param x record or samples
-- @param spec table: rate (for samples), channel (1), from_hz, to_hz, squared (true: of the squared
--   envelope), window ("hann")
-- @return table: amplitude (samples, peak amplitude of the lines at 0, step_hz, ..., mean removed),
--   step_hz, mean, kind, unit, window; or nil, message, "domain"
-- @usage
-- local x = lb.synth.modulated { rate = 8000, samples = 8000, hz = 2000, amplitude = 1,
--   am = { { hz = 40, depth = 0.5 } } }
-- local e = lb.bands.envelope_spectrum(x, { rate = 8000, from_hz = 1900, to_hz = 2100 })
-- assert(math.abs(e.amplitude[41] - 0.5) < 1e-9 and e.step_hz == 1)
function M.envelope_spectrum(x, spec)
  return repeats.envelope_spectrum(x, spec)
end

--- Spectral kurtosis: 0 for stationary noise, -1 for steady tones, above 0 where impulses ring.
-- @param x record or samples
-- @param spec table: rate (for samples), channel (1), segment (samples), hop (samples from segment
--   to segment, default segment: independent ones), window ("hann"), unbiased (true; false: the
--   plain estimator with mean -2 / (K + 1) for noise)
-- @return table: values and power (samples, mean |X|^2, per line), step_hz, segments (K),
--   independent (whether segments do not overlap), noise_mean, noise_sigma (for noise and
--   independent segments; not for the lines at 0 Hz and half the rate), kind; or nil, message,
--   "domain" for fewer than 2 segments
-- @usage
-- local x = lb.synth.noise { rate = 1000, samples = 32768, density = 1, seed = 4 }
-- local k = lb.bands.kurtosis(x, { rate = 1000, segment = 256 })
-- assert(k.segments == 128 and math.abs(k.values[60]) < 5 * k.noise_sigma)
function M.kurtosis(x, spec)
  return repeats.kurtosis(x, spec)
end

--- A result again from the text that its json() wrote.
-- @param text string: JSON
-- @return table: the result with its methods; or nil, message, code ("format")
-- @usage
-- local c = lb.bands.cepstrum(lb.samples.new { 1, 0, 0.5, 0 }, { rate = 8 })
-- assert(lb.bands.from_json(c:json()).values == c.values)
function M.from_json(text)
  return result.read(text)
end

return M
