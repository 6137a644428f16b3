--- Analog low-pass responses: what stands before a converter.
-- A filter is a plain table of its description with methods that ask the core
-- for its gain. It takes part wherever a filter's description is asked for.

local core = require "libration.core"

local M = {}

local fields = {
  shape = "string", order = "number", corner = "number", corner_of_rate = "boolean",
  ripple_db = "number", stop_db = "number", points = "table", flatness = "number",
}
local field_names = "shape, order, corner, corner_of_rate, ripple_db, stop_db, points, flatness"

-- Which fields a shape is made of, besides shape and flatness.
local poles = { order = true, corner = true, corner_of_rate = true }
local of_shape = {
  none = {},
  butterworth = poles,
  bessel = poles,
  chebyshev = { order = true, corner = true, corner_of_rate = true, ripple_db = true },
  elliptic = { order = true, corner = true, corner_of_rate = true, ripple_db = true,
               stop_db = true },
  points = { points = true, corner_of_rate = true },
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
-- local f = lb.filter { shape = "butterworth", order = 4, corner = 100 }
-- assert(math.abs(f:gain(100) ^ 2 - 0.5) < 1e-12)
function Filter:gain(hz, rate)
  return core.filter.gain(designed(self), hz, rate)
end

--- Gain in decibels at a frequency.
-- @param hz number: frequency, Hz, 0 or more
-- @param rate number: sample rate, S/s; needed when the corner is a share of it
-- @return number: 20 lg |F(hz)|, dB; -math.huge where nothing passes
-- @usage
-- local f = lb.filter { shape = "butterworth", order = 8, corner = 0.4, corner_of_rate = true }
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
-- local f = lb.filter { shape = "butterworth", order = 2, corner = 100 }
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
-- local f = lb.filter { shape = "bessel", order = 4, corner = 100 }
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
-- local f = lb.filter { shape = "butterworth", order = 8, corner = 1000 }
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

local function check_fields(spec)
  for key, value in pairs(spec) do
    if not fields[key] then
      error(("filter: unknown field %s; a filter has %s"):format(tostring(key), field_names), 3)
    elseif type(value) ~= fields[key] then
      error(("filter: %s is %s; it must be a %s"):format(key, tostring(value), fields[key]), 3)
    end
  end
  local allowed = of_shape[spec.shape]
  for key in pairs(allowed and spec or {}) do
    if not (allowed[key] or key == "shape" or key == "flatness") then
      error(("filter: %s has no meaning for shape %s"):format(key, spec.shape), 3)
    end
  end
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

--- Makes a filter from its description.
-- Butterworth and Bessel corners are where the power is halved; Chebyshev and elliptic corners
-- are the edge of the ripple. A table of points is interpolated in dB over log frequency, flat
-- outside. A misspelt, missing or meaningless field is an error that says what is valid.
-- @param spec table: shape ("none", "butterworth", "chebyshev", "bessel", "elliptic", "points"),
--   order (1 to 16), corner (Hz, or a share of the rate with corner_of_rate = true), ripple_db
--   (chebyshev, elliptic), stop_db (elliptic), points = { { at =, db = }, ... } (Hz or share,
--   0 dB passes), flatness (relative, stated deviation in the pass band)
-- @return table: the filter, with methods gain, gain_db, response, range, edge
-- @usage
-- local f = lb.filter { shape = "elliptic", order = 6, corner = 1000, ripple_db = 0.1,
--   stop_db = 80 }
-- assert(math.abs(f:gain_db(2000) + 66.21) < 0.01)
function M.new(spec)
  if type(spec) ~= "table" then
    error(("filter: the description is a table, not %s"):format(type(spec)), 2)
  end
  check_fields(spec)
  local ok, message = pcall(core.filter.prepare, spec)
  if not ok then
    error("filter: " .. (message:match("^bad argument.-%((.*)%)$") or message), 2)
  end
  return copy(spec)
end

M.Filter = Filter

return M
