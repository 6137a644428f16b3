--- Lines of records: what they are, how large, how sure.
-- Fits of sines, joint fits of many lines, lists of lines that stand above the
-- noise around them, distortion, orders of a shaft and synchronous averages. All
-- take a record (with several channels: channel =) or samples with rate = and
-- unit =. What they return prints as a table with units, carries standard
-- uncertainties (JCGM 100:2008), and has the methods csv() and json(). Amplitudes
-- are peak values; phases are those of the cosine at the centre of the record.

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
