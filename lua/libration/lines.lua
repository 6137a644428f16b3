--- Lines of records: what they are, how large, how sure.
-- Fits of sines, joint fits of many lines, lists of lines that stand above the
-- noise around them, distortion, orders of a shaft and synchronous averages. All
-- take a record (with several channels: channel =) or samples with rate = and
-- unit =. What they return prints as a table with units, carries standard
-- uncertainties (JCGM 100:2008), and has the methods csv() and json(). Amplitudes
-- are peak values; phases are those of the cosine at the centre of the record.

local core = require("libration.core").lines
local list = require "libration.lines.list"
local result = require "libration.lines.result"
local sine = require "libration.lines.sine"

local M = {}

--- The methods of every result here.
M.Result = result.Result

--- Fits a sine wave and an offset by least squares (IEEE Std 1057-2017).
-- Three parameters when the frequency is known, else four. The uncertainties are those of
-- independent errors of equal variance, estimated from the residual; a residual that is not
-- noise (distortion, drift) makes them no more than that.
-- @param source record or samples: 8 samples or more
-- @param options table: hz (the known frequency) or near_hz (a start within half a bin of it;
--   default: the strongest line); channel (of a record), or rate and unit (of samples)
-- @return table: parameters (3 or 4), hz, amplitude (peak), phase and start_phase (rad, of the
--   cosine, at the centre and at the first sample), offset, each with u_ (standard uncertainty),
--   residual_rms, rounds, rate, samples, unit; or nil, message, code ("no_converge", "domain")
-- @usage
-- local x = lb.synth.tones { rate = 1000, samples = 500, tones = { { hz = 50, amplitude = 2 } } }
-- local fit = lb.lines.sine(x, { rate = 1000, unit = "V" })
-- assert(math.abs(fit.hz - 50) < 1e-9 and math.abs(fit.amplitude - 2) < 1e-9)
function M.sine(source, options)
  return sine.sine(source, options)
end

--- Fits amplitudes and phases of many lines of known frequencies, and an offset, at once.
-- So lines do not leak into each other, however close: two that the record is too short to
-- tell apart are refused. Frequencies beyond half the rate are those of undersampled lines.
-- @param source record or samples: 2 samples per line and 2 more at least
-- @param options table: lines (list of Hz or of { hz =, name = }, 1 to 512); channel (of a
--   record), or rate and unit (of samples)
-- @return table: lines[i] = { name, hz, amplitude (peak), phase (rad), u_amplitude, u_phase },
--   offset, u_offset, residual_rms, rate, samples, unit; or nil, message, code ("domain")
-- @usage
-- local x = lb.synth.tones { rate = 1000, samples = 500,
--   tones = { { hz = 50, amplitude = 2 }, { hz = 51.5, amplitude = 1 } } }
-- local fit = lb.lines.joint(x, { rate = 1000, lines = { 50, 51.5 } })
-- assert(math.abs(fit.lines[2].amplitude - 1) < 1e-9)
function M.joint(source, options)
  return sine.joint(source, options)
end

--- Lists the lines that stand above the noise around them.
-- The floor of a bin is the median power of the nearest floor_bins bins outside peaks, corrected
-- by the chi-square law of the averaged power; the threshold over it takes the floor's own
-- scatter into account. Noise alone would show any line at all with the chance false_alarm at
-- most. Each line is then tracked: read at the highest point of its windowed transform, in every
-- segment, and averaged. Its uncertainties are those of the floor's noise. What a stronger line
-- leaks through the window is not listed but counted.
-- @param source record or samples
-- @param options table: false_alarm (0.01), floor_bins (odd, 101), window ("blackman_harris4"),
--   parameter (of the window), segment (samples; default: the whole record), overlap (0.5, share
--   of a segment), most (lines that are too many, 512); channel, or rate and unit
-- @return table: lines[i] = { hz, amplitude (peak), phase (first segment), u_hz, u_amplitude,
--   leak (most that stronger lines add or take, not part of u_amplitude), over_floor_db,
--   floor_density (unit/sqrt(Hz), one-sided), chance (of noise as high anywhere), bin }, leaks, threshold_db, averages (effective), bins_tested, first_hz, last_hz and the
--   options used; or nil, message, code ("domain")
-- @usage
-- local spec = { rate = 1000, samples = 2000, density = 0.01, seed = 1 }
-- local x = lb.synth.noise(spec)
-- x:add(lb.synth.tones { rate = 1000, samples = 2000, tones = { { hz = 123.4, amplitude = 1 } } })
-- local found = lb.lines.list(x, { rate = 1000, unit = "V" })
-- assert(#found.lines == 1 and math.abs(found.lines[1].hz - 123.4) < 0.01)
function M.list(source, options)
  return list.list(source, options)
end

--- The estimators of a frequency from the bins of a transform, with their sources.
-- @return table: list of { name, source, window ("rectangle" or "hann") }
-- @usage
-- assert(#lb.lines.estimators() == 5)
function M.estimators()
  return core.estimators()
end

--- Distance of a line from its bin by one of the estimators.
-- Fast and without a search, but biased by the line's own image and by neighbours; sine() is not.
-- @param name string: of an estimator
-- @param x samples: the record (or its real part), 8 samples or more
-- @param k integer: the bin of the highest power
-- @param im samples: the imaginary part of a complex record; default none
-- @return number: bins; or nil, message, code ("domain") where the formula has no value
-- @usage
-- local x = lb.samples.make(64, function(i) return math.cos(0.8 * i) end)
-- local bins = 8 + lb.lines.estimate("grandke1983", x, 8)
-- assert(math.abs(bins - 64 * 0.8 / (2 * math.pi)) < 0.01)
function M.estimate(name, x, k, im)
  return core.estimate(name, x, k, im)
end

--- A result again from the text that its json() wrote.
-- @param text string: JSON
-- @return table: the result; or nil, message, code ("format")
-- @usage
-- local x = lb.samples.make(64, function(i) return math.cos(i) end)
-- local fit = lb.lines.sine(x, { rate = 64 })
-- assert(lb.lines.from_json(fit:json()).hz == fit.hz)
-- assert(select(3, lb.lines.from_json "{}") == "format")
function M.from_json(text)
  return result.read(text)
end

--- The result as CSV (RFC 4180): names first, numbers that read back bit for bit.
-- @return string: a row per quantity or line
-- @usage
-- local x = lb.samples.make(64, function(i) return math.cos(i) end)
-- assert(lb.lines.sine(x, { rate = 64 }):csv():find "^quantity,value,standard_uncertainty,unit")
function M.Result:csv()
  return result.csv(self)
end

--- The result as JSON, all its fields; from_json reads it back.
-- @return string: the document; or nil, message, code ("format")
-- @usage
-- local x = lb.samples.make(64, function(i) return math.cos(i) end)
-- assert(lb.lines.sine(x, { rate = 64 }):json():find '"kind": "sine"')
function M.Result:json()
  return result.json(self)
end

return M
