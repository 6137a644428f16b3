--- Transforms of records: the discrete Fourier transform and its inverse.
-- A transform carries the number of points it was made with and is not scaled:
-- X[k] = sum over n of x[n] exp(-2 pi i k n / points), k = 0 to points / 2. What
-- an amplitude, a power or a density is made of it is the caller's knowledge.

local core = require("libration.core").spectrum
local samples = require("libration.core").samples
local units = require "libration.units"

local M = {}

local Transform = {}
Transform.__index = Transform
Transform.__name = "libration.transform"

local fields = { points = true, window = true }

--- Transforms a record.
-- @param x samples: the record, at least one sample
-- @param options table: points (integer: length after zero padding, default #x; products of
--   small primes are fastest), window (samples, as many as the record has)
-- @return table: re, im (samples: points // 2 + 1 values each, from 0 Hz), points, samples (how
--   many the record had); raises on misuse
-- @usage
-- local x = lb.samples.new { 1, 0, 0, 0 }
-- local t = lb.spectrum.transform(x, { points = 8 })
-- assert(#t.re == 5 and t.re[3] == 1 and t.points == 8)
function M.transform(x, options)
  options = options or {}
  for key in pairs(options) do
    if not fields[key] then
      error(("transform: unknown option %s; valid are points, window"):format(tostring(key)), 2)
    end
  end
  local re, im
  if options.window then
    re, im = core.windowed(x, options.window, options.points)
  else
    re, im = core.forward(x, options.points)
  end
  return setmetatable({ re = re, im = im, points = options.points or #x, samples = #x }, Transform)
end

--- The record that has this transform, padding and window included.
-- @return samples: points values
-- @usage
-- local x = lb.samples.new { 3, -1, 2 }
-- assert(math.abs(lb.spectrum.transform(x):inverse()[3] - 2) < 1e-15)
function Transform:inverse()
  return core.back(self.re, self.im, self.points)
end

local zoom_fields = { rate = true, first_hz = true, step_hz = true, points = true, window = true,
                      workers = true }

local function zoom_number(options, field, rate, level)
  local value = options[field]
  local hz = value ~= nil and units.number(value, "Hz")
  if not (hz and math.abs(hz) <= rate) then
    error(("zoom: %s is %s; it must be a number of Hz within the rate"):format(field,
      tostring(value)), level + 1)
  end
  return hz / rate
end

--- A narrow band of a record's transform, as fine as wanted.
-- X(f) = sum over n of w[n] x[n] exp(-2 pi i f n / rate) at f = first_hz + k step_hz; nothing is
-- scaled. Long records are thinned out on the way, without loss: what folds in is below 1e-15 of
-- the sum of |x|. Finer steps than rate / #x resolve nothing more; they show the shape of lines.
-- @param x samples: the record
-- @param options table: rate (S/s), first_hz, step_hz (Hz, within the rate), points (how many
--   frequencies), window (samples, as many as the record has), workers (0: one per core)
-- @return samples: real parts, a value per frequency
-- @return samples: imaginary parts
-- @return samples: the frequencies, Hz
-- @usage
-- local x = lb.samples.make(1000, function(i) return math.cos(2 * math.pi * 0.1003 * (i - 1)) end)
-- local band = { rate = 1000, first_hz = 100, step_hz = 0.1, points = 9 }
-- local re, im, hz = lb.spectrum.zoom(x, band)
-- assert(math.abs(hz[4] - 100.3) < 1e-12 and math.abs(re[4] - 500) < 3 and #im == 9)
function M.zoom(x, options)
  for key in pairs(options) do
    if not zoom_fields[key] then
      error(("zoom: unknown field %s; valid are first_hz, points, rate, step_hz, window, workers")
        :format(tostring(key)), 2)
    end
  end
  local exact, reason = units.rate(options.rate == nil and "none" or options.rate)
  if not exact then error("zoom: rate: " .. reason, 2) end
  local rate, points = exact:number(), options.points
  local first, step = zoom_number(options, "first_hz", rate, 2), zoom_number(options, "step_hz",
    rate, 2)
  if math.type(points) ~= "integer" or points < 1 or points > 2 ^ 26 then
    error(("zoom: points is %s; it must be an integer from 1 to 2^26"):format(tostring(points)), 2)
  end
  local windowed = options.window and x * options.window or x
  local z <close> = core.zoom(#x, first, step, points, options.workers)
  local re, im = z:run(windowed)
  local hz = samples.new(points)
  for k = 1, points do hz[k] = (first + (k - 1) * step) * rate end
  return re, im, hz
end

--- The quadrature of a record: every line turned back by a quarter turn.
-- x + i quadrature is the analytic signal; its size is the envelope. The record is taken as a
-- period (the discrete Hilbert transform): the ends of another record ring.
-- @param x samples: the record
-- @return samples: as many
-- @usage
-- local x = lb.samples.make(64, function(i) return math.cos(2 * math.pi * 5 * i / 64) end)
-- assert(math.abs(lb.spectrum.quadrature(x)[7] - math.sin(2 * math.pi * 5 * 7 / 64)) < 1e-14)
function M.quadrature(x)
  return core.quadrature(x)
end

--- An object that transforms records of one length without making anything anew.
-- Any length: long records are cut up and shared among threads, lengths with large prime factors
-- go by a chirp.
-- @param points integer: length after zero padding, 1 to 2^27
-- @param workers integer: threads; default 0: one per core
-- @return transform: run(x, window, re, im) returns re, im (samples, points // 2 + 1 values each;
--   window, re and im may be nil); close()
-- @usage
-- local t = lb.spectrum.plan(1009)
-- local re, im = t:run(lb.samples.new(1009):fill(1))
-- assert(math.abs(re[1] - 1009) < 1e-9 and #im == 505)
function M.plan(points, workers)
  return core.single(points, workers)
end

--- Tries out plans for transforms of a length and keeps the fastest, for long jobs.
-- Takes 0.3 s for 8192 points, 1 s for 65536, minutes beyond 2^22, and makes averages of such
-- segments 10 to 20 % faster for as long as the process lives. Results may change in their last
-- bits.
-- @param points integer: length after zero padding, 1 to 2^27
-- @usage
-- lb.spectrum.tune(64)
function M.tune(points)
  core.tune(points)
end

--- The smallest length that transforms fast: no prime factors but 2, 3 and 5.
-- @param n integer: the least length, 1 to 2^27
-- @return integer: the smallest fast length that is not less
-- @usage
-- assert(lb.spectrum.fast_length(7) == 8)
function M.fast_length(n)
  return core.fast_length(n)
end

return M
