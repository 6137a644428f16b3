--- Recursive digital filters for records, as second-order sections.
-- They come from the same analog shapes as lb.filter by the bilinear
-- transformation, with their band edges exactly where they are asked for. A
-- filter is immutable; streams remember where they stand.

local core = require("libration.core").filter
local options = require "libration.options"
local parts = require "libration.filter.parts"
local units = require "libration.units"

local M = {}

local Recursive = {}
Recursive.__index = Recursive
Recursive.__name = "libration.recursive"

--- Filters a record from left to right.
-- @param x samples: the record
-- @param start string: "rest" (default: zeros came before) or "settled" (the first sample did)
-- @param into samples: as many, which are overwritten and returned, x itself allowed; default new
--   ones
-- @return samples: as many
-- @usage
-- local f = lb.filter.digital { shape = "bessel", order = 4, edge = "50 Hz", rate = "1 kS/s" }
-- assert(math.abs(f:run(lb.samples.new(400):fill(2))[-1] - 2) < 1e-9)
function Recursive:run(x, start, into)
  return self.sections:run(x, start, into)
end

--- Filters a record forward and backward: no phase, no delay, the gain squared.
-- @param x samples: the record
-- @param ends string: how it goes on beyond its ends: "turn" (default, turned by half a turn
--   about the end point), "mirror", "hold" (the end sample) or "bare" (zeros)
-- @param pad integer: samples that are added at each end and dropped afterwards, default
--   settling(1e-9); a record too short for that raises
-- @return samples: as many
-- @usage
-- local f = lb.filter.digital { shape = "butterworth", order = 2, edge = "50 Hz", rate = 1000 }
-- local y = f:both_ways(lb.samples.make(400, function(i) return 0.5 * i end))
-- assert(math.abs(y[1] - 0.5) < 1e-6 and math.abs(y[400] - 200) < 1e-6)
function Recursive:both_ways(x, ends, pad)
  return self.sections:both_ways(x, ends, pad)
end

--- A stream, at rest: its run takes blocks of any size and gives the same bits as one run.
-- @return userdata: the stream, with method run
-- @usage
-- local f = lb.filter.digital { shape = "butterworth", order = 2, edge = "50 Hz", rate = 1000 }
-- local s, x = f:stream(), lb.samples.make(9, function(i) return i % 3 end)
-- assert(s:run(x:slice(1, 4)) .. s:run(x:slice(5)) == f:run(x))
function Recursive:stream()
  return self.sections:stream()
end

--- Gain magnitude at a frequency, or at many.
-- @param hz number or samples: Hz, 0 to half the rate
-- @return number or samples: |H|
-- @usage
-- local f = lb.filter.digital { shape = "butterworth", order = 3, edge = "50 Hz", rate = 1000 }
-- assert(math.abs(f:gain(50) ^ 2 - 0.5) < 1e-12)
function Recursive:gain(hz)
  return self.sections:gain(hz)
end

--- Gain in decibels at a frequency.
-- @param hz number: Hz, 0 to half the rate
-- @return number: 20 lg |H|, dB; -math.huge where nothing passes
-- @usage
-- local f = lb.filter.digital { shape = "butterworth", order = 3, edge = "50 Hz", rate = 1000 }
-- assert(math.abs(f:gain_db(50) + 3.0103) < 1e-4)
function Recursive:gain_db(hz)
  return 20 * math.log(self.sections:gain(hz), 10)
end

--- Complex response at a frequency.
-- @param hz number: Hz, 0 to half the rate
-- @return number: real part
-- @return number: imaginary part
-- @usage
-- local f = lb.filter.digital { shape = "butterworth", order = 2, edge = "50 Hz", rate = 1000 }
-- local re, im = f:response(50)
-- assert(math.abs(re) < 1e-12 and math.abs(im + math.sqrt(0.5)) < 1e-12)
function Recursive:response(hz)
  return self.sections:response(hz)
end

--- Samples after which the slowest decay has reached a level.
-- @param level number: between 0 and 1, default 1e-9
-- @return integer: samples
-- @usage
-- local f = lb.filter.digital { shape = "butterworth", order = 2, edge = "50 Hz", rate = 1000 }
-- assert(f:settling(1e-3) < f:settling())
function Recursive:settling(level)
  return self.sections:settling(level)
end

--- The sections in the order they are run.
-- @return table: list of { b0=, b1=, b2=, a1=, a2= } with
--   y = b0 x + b1 x' + b2 x'' - a1 y' - a2 y''
-- @usage
-- local f = lb.filter.digital { shape = "butterworth", order = 2, edge = 200, rate = 1000 }
-- assert(math.abs(f:coefficients()[1].a1 + 0.369527377351241) < 1e-14)
function Recursive:coefficients()
  return self.sections:coefficients()
end

local band_names = { low = "low-pass", high = "high-pass", pass = "band-pass", stop = "band-stop" }

-- One line a person reads.
function Recursive:__tostring()
  local words = { ("%s %s, order %d, %s at %.12g S/s"):format(self.shape, band_names[self.band],
    self.order, parts.edges_text(self.edge), self.rate) }
  if self.ripple_db then words[#words + 1] = ("ripple %.9g dB"):format(self.ripple_db) end
  if self.stop_db then words[#words + 1] = ("stop band %.9g dB"):format(self.stop_db) end
  words[#words + 1] = ("%d sections"):format(#self:coefficients())
  return table.concat(words, ", ")
end

local shapes = { "butterworth", "chebyshev", "bessel", "elliptic" }

local schema = {
  shape = { options.choice(shapes), required = true },
  order = { options.integer(1, 16), required = true },
  band = { options.choice { "low", "high", "pass", "stop" }, default = "low" },
  edge = { parts.edges(), required = true, hint = 'such as "100 Hz" or "100..200 Hz"' },
  rate = { options.quantity(parts.rate, { above = 0 }), required = true,
    hint = 'such as "51.2 kS/s"' },
  ripple = { options.quantity(units.db, { above = 0, most = 300 }) },
  stop = { options.quantity(units.db, { above = 0, most = 300 }) },
}

-- Fields that the shape needs or does not have.
local function check_shape(spec, mistakes)
  local ripple = spec.shape == "chebyshev" or spec.shape == "elliptic"
  for name, needed in pairs { ripple = ripple, stop = spec.shape == "elliptic" } do
    if needed and not spec[name] then
      mistakes:add(name, ('missing; a filter "%s" has one, such as "0.1 dB"'):format(spec.shape))
    elseif spec[name] and not needed then
      mistakes:add(name, ('a filter "%s" has none'):format(spec.shape))
    end
  end
  if spec.ripple and spec.stop and spec.stop <= spec.ripple then
    mistakes:add("stop", "the stop band lies deeper than the ripple")
  end
end

--- Makes a recursive digital filter.
-- A Butterworth or Bessel edge is where the power is halved (once: run both ways it is
-- quartered), a Chebyshev or elliptic edge is the end of the ripple. For pass and stop the order
-- is that of the low-pass, as many sections. A Bessel filter's delay is flat before the
-- transformation, and after it only well below half the rate. Coefficients are doubles: the gain
-- is within 3e-15 over the square of the lowest edge as a share of the rate (1e-11 at a hundredth
-- of the rate, 3e-7 at a ten thousandth); decimate first where that is too much.
-- @param spec table: shape ("butterworth", "chebyshev", "bessel", "elliptic"), order (1 to 16),
--   band ("low" (default), "high", "pass", "stop"), edge ("100 Hz"; "100..200 Hz" for pass and
--   stop), rate ("51.2 kS/s"), ripple (dB; chebyshev, elliptic), stop (dB; elliptic)
-- @return table: the filter, with methods run, both_ways, stream, gain, gain_db, response,
--   settling, coefficients; raises one error that lists all mistakes
-- @usage
-- local f = lb.filter.digital { shape = "elliptic", order = 6, band = "pass",
--   edge = "100..200 Hz", rate = "1 kS/s", ripple = "0.1 dB", stop = "60 dB" }
-- assert(f:gain_db(50) < -60 and f:gain_db(150) > -0.1001)
function M.new(spec)
  local read = parts.read(schema, spec, "digital filter", check_shape)
  local made = { shape = read.shape, order = read.order, band = read.band, edge = read.edge,
    rate = read.rate, ripple_db = read.ripple, stop_db = read.stop }
  local analog = { shape = read.shape, order = read.order, corner = 1, ripple_db = read.ripple,
    stop_db = read.stop }
  local ok, sections = pcall(core.sections, analog, read.band, read.edge[1],
    read.rate, read.edge[2])
  if not ok then
    error("digital filter: " .. (sections:match("^bad argument.-%((.*)%)$") or sections), 2)
  end
  made.sections = sections
  return setmetatable(made, Recursive)
end

return M
