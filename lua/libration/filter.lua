--- Analog low-pass responses: what stands before a converter.
-- A filter is a plain table of its description with methods that ask the core
-- for its gain. It takes part wherever a filter's description is asked for.
-- Filters for records are made by lb.filter.digital (recursive; see
-- libration.recursive), and by lb.filter.linear, taps, decimator and resampler
-- (see libration.linear_phase).

local core = require "libration.core"
local fields = require "libration.digitizer.fields"
local linear_phase = require "libration.linear_phase"
local options = require "libration.options"
local recursive = require "libration.recursive"

local M = {
  digital = recursive.new,
  linear = linear_phase.linear,
  taps = linear_phase.taps,
  decimator = linear_phase.decimator,
  resampler = linear_phase.resampler,
}

local Filter = {}
Filter.__index = Filter
Filter.__name = "libration.filter"

-- The designed form of each filter, so that a design is made once.
local prepared = setmetatable({}, { __mode = "k" })

local function designed(filter)
  local made = prepared[filter]
  if not made then
    made = core.filter.prepare(filter)
    prepared[filter] = made
  end
  return made
end

--- Gain magnitude at a frequency.
-- @param hz number: frequency, Hz, 0 or more
-- @param rate number: sample rate, S/s; needed when the corner is a share of it
-- @return number: |F(hz)|; 1 is the full pass band
-- @usage
-- local f = lb.filter { shape = "butterworth", order = 4, corner = "100 Hz" }
-- assert(math.abs(f:gain(100) ^ 2 - 0.5) < 1e-12)
function Filter:gain(hz, rate)
  return core.filter.gain(designed(self), hz, rate)
end

--- Gain in decibels at a frequency.
-- @param hz number: frequency, Hz, 0 or more
-- @param rate number: sample rate, S/s; needed when the corner is a share of it
-- @return number: 20 lg |F(hz)|, dB; -math.huge where nothing passes
-- @usage
-- local f = lb.filter { shape = "butterworth", order = 8, corner = "0.4 rate" }
-- assert(math.abs(f:gain_db(800, 1000) + 48.1649) < 1e-3)
function Filter:gain_db(hz, rate)
  return 20 * math.log(core.filter.gain(designed(self), hz, rate), 10)
end

--- Complex response at a frequency; a table of points has no phase.
-- @param hz number: frequency, Hz, 0 or more
-- @param rate number: sample rate, S/s; needed when the corner is a share of it
-- @return number: real part
-- @return number: imaginary part
-- @usage
-- local f = lb.filter { shape = "butterworth", order = 2, corner = "100 Hz" }
-- local re, im = f:response(100)
-- assert(math.abs(re) < 1e-12 and math.abs(im + math.sqrt(0.5)) < 1e-12)
function Filter:response(hz, rate)
  return core.filter.response(designed(self), hz, rate)
end

--- Least and largest gain over an interval of frequencies.
-- Both bounds hold at every frequency of the interval, ripples included.
-- @param hz1 number: one end, Hz, 0 or more
-- @param hz2 number: the other end, Hz, 0 or more
-- @param rate number: sample rate, S/s; needed when the corner is a share of it
-- @return number: no gain in the interval is below this
-- @return number: no gain in the interval is above this
-- @usage
-- local f = lb.filter { shape = "bessel", order = 4, corner = "100 Hz" }
-- local low, high = f:range(50, 100)
-- assert(math.abs(low ^ 2 - 0.5) < 1e-9 and high > low and high < 1)
function Filter:range(hz1, hz2, rate)
  return core.filter.range(designed(self), hz1, hz2, rate)
end

--- The frequency beyond which the gain stays at or below a level.
-- @param level number: gain, above 0
-- @param rate number: sample rate, S/s; needed when the corner is a share of it
-- @return number: Hz; math.huge when the gain never settles below the level
-- @usage
-- local f = lb.filter { shape = "butterworth", order = 8, corner = "1000 Hz" }
-- assert(math.abs(f:edge(1e-4) - 3162.28) < 0.01)
function Filter:edge(level, rate)
  return core.filter.edge(designed(self), level, rate)
end

local function show_corner(self)
  return self.corner_of_rate and ("%.9g of the rate"):format(self.corner)
    or ("%.9g Hz"):format(self.corner)
end

-- One line a person reads.
function Filter:__tostring()
  if self.shape == "none" then
    return "no filter"
  elseif self.shape == "points" then
    return ("low-pass given by %d points, %.9g to %.9g %s"):format(#self.points,
      self.points[1].at, self.points[#self.points].at,
      self.corner_of_rate and "of the rate" or "Hz")
  end
  local parts = { ("%s low-pass, order %d, corner %s"):format(self.shape, self.order,
    show_corner(self)) }
  if self.ripple_db then parts[#parts + 1] = ("ripple %.9g dB"):format(self.ripple_db) end
  if self.stop_db then parts[#parts + 1] = ("stop band %.9g dB"):format(self.stop_db) end
  return table.concat(parts, ", ")
end

-- What a person writes as what rooms exchange; all mistakes in one error.
local function read(spec)
  local mistakes = options.mistakes()
  local filter = fields.filter()(spec, "", mistakes)
  if mistakes.count > 0 then
    error(mistakes:message "filter", 3)
  end
  return filter
end

local function copy(spec)
  local out = {}
  for key, value in pairs(spec) do out[key] = value end
  if spec.points then
    out.points = {}
    for i, row in ipairs(spec.points) do out.points[i] = { at = row.at, db = row.db } end
  end
  return setmetatable(out, Filter)
end

--- Makes a filter from its description, the same as in a digitizer.
-- Butterworth and Bessel corners are where the power is halved; Chebyshev and elliptic corners
-- are the edge of the ripple. A table of points is interpolated in dB over log frequency, flat
-- outside. A misspelt, missing or meaningless field is an error that says what is valid.
-- @param spec table: shape ("none", "butterworth", "chebyshev", "bessel", "elliptic", "points"),
--   order (1 to 16), corner ("10 kHz" or "0.4 rate"), ripple (dB,
--   chebyshev and elliptic), stop (dB, elliptic), points = { { "1 kHz", "-0.1 dB" }, ... } (0 dB
--   passes), flatness (relative, the deviation stated for the pass band); or the filter of a
--   digitizer
-- @return table: the filter, with methods gain, gain_db, response, range, edge
-- @usage
-- local f = lb.filter { shape = "elliptic", order = 6, corner = "1 kHz", ripple = "0.1 dB",
--   stop = "80 dB" }
-- assert(math.abs(f:gain_db(2000) + 66.21) < 0.01)
function M.new(spec)
  local filter = copy(type(spec) == "table" and spec.corner_of_rate ~= nil and spec or read(spec))
  local ok, message = pcall(designed, filter)
  if not ok then
    error("filter: " .. (message:match("^bad argument.-%((.*)%)$") or message), 2)
  end
  return filter
end

M.Filter = Filter

-- lb.filter { ... } is lb.filter.new { ... }
return setmetatable(M, { __call = function(_, spec) return M.new(spec) end })
