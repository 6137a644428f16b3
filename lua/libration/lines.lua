--- Lines of records: what they are, how large, how sure.
-- Fits of sines, joint fits of many lines, lists of lines that stand above the
-- noise around them, distortion, orders of a shaft and synchronous averages. All
-- take a record (with several channels: channel =) or samples with rate = and
-- unit =. What they return prints as a table with units, carries standard
-- uncertainties (JCGM 100:2008), and has the methods csv() and json(). Amplitudes
-- are peak values; phases are those of the cosine at the centre of the record.

local core = require("libration.core").lines
local list = require "libration.lines.list"
local orders = require "libration.lines.orders"
local quality = require "libration.lines.quality"
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
--   floor_density (unit/sqrt(Hz), one-sided), chance (of noise as high anywhere), bin },
--   leaks, threshold_db, averages (effective), bins_tested, first_hz, last_hz and the options
--   used; or nil, message, code ("domain")
-- @usage
-- local spec = { rate = 1000, samples = 2000, density = 0.01, seed = 1 }
-- local x = lb.synth.noise(spec)
-- x:add(lb.synth.tones { rate = 1000, samples = 2000, tones = { { hz = 123.4, amplitude = 1 } } })
-- local found = lb.lines.list(x, { rate = 1000, unit = "V" })
-- assert(#found.lines == 1 and math.abs(found.lines[1].hz - 123.4) < 0.01)
function M.list(source, options)
  return list.list(source, options)
end

--- Tracks wanted lines: reads each at the highest point of its interval of frequencies.
-- The reading is that of plans with reading = "tracked", its uncertainty that of the noise around
-- it, as in list. A line is found when it stands above the threshold of list and inside its
-- interval; what is not found is reported all the same, with the reason.
-- @param source record or samples
-- @param options table: lines (list of { from_hz =, to_hz =, name = }; frequencies beyond half the
--   rate are those of undersampled lines), and false_alarm, floor_bins, window, parameter,
--   segment, overlap as in list; channel, or rate and unit
-- @return table: lines[i] = { name, hz, amplitude (peak), phase (first segment), u_hz,
--   u_amplitude, over_floor_db, floor_density, chance, bin, found, at_edge }, threshold_db,
--   averages (effective), and the options used; or nil, message, code ("domain")
-- @usage
-- local x = lb.synth.noise { rate = 1000, samples = 2000, density = 0.01, seed = 1 }
-- x:add(lb.synth.tones { rate = 1000, samples = 2000, tones = { { hz = 123.4, amplitude = 1 } } })
-- local r = lb.lines.track(x, { rate = 1000, lines = { { from_hz = 120, to_hz = 126 },
--   { from_hz = 200, to_hz = 201 } } })
-- assert(r.lines[1].found and not r.lines[2].found)
function M.track(source, options)
  return list.track(source, options)
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

--- Distortion and noise beside one sine: THD, THD + noise, SINAD, effective bits, spurs.
-- The sine is fitted (four parameters, three when hz is known), the harmonics are fitted jointly
-- where they appear after folding, and spurs are read in what the fit leaves, so that nothing
-- leaks from the fundamental as long as it is a steady sine; where it is not, or where the
-- record repeats itself or harmonics fall on each other, warnings say so. Two conventions of
-- effective bits are given: of_full_scale = log2(2 full_scale / (residual rms sqrt 12)) (IEEE Std
-- 1057-2017) and of_sinad = (SINAD - 1.76 dB) / 6.02 dB; they differ below full scale.
-- @param source record or samples: 256 samples or more
-- @param options table: hz (known) or near_hz (start); harmonics (the highest, 10); full_scale
--   (peak, unit; default: the record's own); channel, or rate and unit
-- @return table: hz, amplitude (peak), u_hz, u_amplitude, thd and u_thd (ratio to the
--   fundamental), thd_db, residual_rms (noise and distortion), thd_plus_noise (ratio), sinad_db,
--   u_sinad_db, noise_rms, snr_db (without the harmonics), effective_bits = { of_full_scale,
--   of_sinad }, spur = { hz, amplitude, db, harmonic or nil }, spurious_free_db, harmonics[i] =
--   { harmonic, hz, appears_hz, amplitude, u_amplitude, db, or hidden_by }, warnings (texts); or
--   nil, message, code
-- @usage
-- local x = lb.synth.tones { rate = 1000, samples = 1000, tones = {
--   { hz = 101.3, amplitude = 1 }, { hz = 202.6, amplitude = 0.01 } } }
-- x:add(lb.synth.noise { rate = 1000, samples = 1000, density = 1e-5 })
-- local q = lb.lines.quality(x, { rate = 1000 })
-- assert(math.abs(q.thd - 0.01) < 1e-4 and q.spur.harmonic == 2)
function M.quality(source, options)
  return quality.quality(source, options)
end

--- Fits amplitudes and phases of orders of a shaft, all at once.
-- The shaft runs at a steady, known speed, or its pulses say where it is: then the samples between
-- first and last pulse are fitted against its angle, which steady speed and steady acceleration
-- meet exactly. Trigger jitter takes from high orders (half the power where order x speed x
-- jitter = 0.1325); the loss is stated, not corrected.
-- @param source record or samples
-- @param options table: orders (list, or a text such as "1..10"; up to 64, need not be whole);
--   speed_hz (turns a second), or pulses (times, s from the first sample; a list or samples, 3 or
--   more) and per_turn (pulses in a turn, 1); jitter_s (standard deviation of a pulse's time;
--   default: estimated from the pulses, at most); channel, or rate and unit
-- @return table: lines[i] = { order, hz (mean), amplitude (peak), phase (rad, of the cosine, at
--   the record's centre for speed_hz, at the first pulse for pulses), u_amplitude, u_phase,
--   jitter_loss_db (pulses) }, offset, residual_rms, speed_hz, used (samples), turns, jitter_s,
--   half_power_order; or nil, message, code ("domain")
-- @usage
-- local x = lb.synth.tones { rate = 1000, samples = 1000,
--   tones = { { hz = 24.6, amplitude = 2 }, { hz = 7 * 24.6, amplitude = 0.5 } } }
-- local r = lb.lines.orders(x, { rate = 1000, speed_hz = 24.6, orders = { 1, 7 } })
-- assert(math.abs(r.lines[2].amplitude - 0.5) < 1e-9)
function M.orders(source, options)
  return orders.orders(source, options)
end

--- Averages a record over the turns of a shaft: what is not tied to it averages out.
-- Every turn is read at the same angles, between samples too (1e-5 of a tone's amplitude up to
-- 0.4 of the rate), from the pulses' times to a small part of a sample.
-- @param source record or samples
-- @param options table: pulses (times, s from the first sample; a list or samples, 3 or more),
--   per_turn (pulses in a turn, 1), points (angles of a turn, 256; orders above half of them
--   fold), orders (whole ones to be read from the average, "1..10"), jitter_s (as in orders);
--   channel, or rate and unit
-- @return table: points[i] = { angle_turns (since a pulse), mean, u_mean (standard uncertainty
--   from the scatter of the turns) }, turns, deviation_rms, orders[i] = { order, amplitude (peak),
--   phase (rad, of the cosine, at the pulse), u_amplitude, jitter_loss_db }, speed_hz, jitter_s,
--   half_power_order; or nil, message, code ("domain": no whole turn in the record)
-- @usage
-- local x = lb.synth.tones { rate = 1000, samples = 1000, tones = { { hz = 20, amplitude = 2 } } }
-- local pulses = {}
-- for i = 0, 19 do pulses[i + 1] = 0.05 * i end
-- local r = lb.lines.synchronous(x, { rate = 1000, pulses = pulses })
-- assert(r.turns == 18 and math.abs(r.orders[1].amplitude - 2) < 1e-4)
function M.synchronous(source, options)
  return orders.synchronous(source, options)
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
-- @return string: a row per quantity or line; the last column is the unit: of the quantity, or of
--   the amplitudes of the line (names of other columns end in theirs; phases are in rad)
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
