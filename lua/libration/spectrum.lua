--- Transforms of records: the discrete Fourier transform and its inverse.
-- A transform carries the number of points it was made with and is not scaled:
-- X[k] = sum over n of x[n] exp(-2 pi i k n / points), k = 0 to points / 2. What
-- an amplitude, a power or a density is made of it is the caller's knowledge.

local core = require("libration.core").spectrum

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

--- The smallest length that transforms fast: no prime factors but 2, 3 and 5.
-- @param n integer: the least length, 1 to 2^27
-- @return integer: the smallest fast length that is not less
-- @usage
-- assert(lb.spectrum.fast_length(7) == 8)
function M.fast_length(n)
  return core.fast_length(n)
end

return M
