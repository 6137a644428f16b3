--- What a digitizer's fields may say: rates, ranges, filters.

local base = require("libration.core").base
local options = require "libration.options"
local units = require "libration.units"

local M = {}

local show = options.show

-- Ends of "lo..hi", { lo, hi }, { lo, hi, step } or a single value.
local function ends(value)
  if type(value) == "string" then
    local lo, hi = units.range(value)
    return lo or value, hi or value
  elseif type(value) ~= "table" then
    return value, value
  end
  for key in next, value do
    if key ~= 1 and key ~= 2 and key ~= 3 then
      return nil, nil, nil, show(key) .. " has no place here"
    end
  end
  return rawget(value, 1), rawget(value, 2), rawget(value, 3)
end

--- Kind of a run of whole numbers: "128..65535", { 128, 65535 }, { 2, 64, 2 }, 4.
-- @param most integer: largest allowed
-- @param stepped boolean: whether a third number, the step, is allowed
-- @return function: kind giving { least, most, step }
-- @usage
-- local fields, options = require "libration.digitizer.fields", require "libration.options"
-- local run = fields.integers(65536, true)("128..65535", "divider", options.mistakes())
-- assert(run.least == 128 and run.most == 65535 and run.step == 1)
function M.integers(most, stepped)
  local give = ('; give "1..64", { 1, 64 }%s or a number, from 1 to %d'):format(
    stepped and ", { 2, 64, 2 } (with a step)" or "", most)
  return function(value, path, mistakes)
    local lo, hi, step, reason = ends(value)
    local least, highest, by = nil, nil, 1
    if not reason then
      least, reason = units.count(lo)
    end
    if not reason then
      highest, reason = units.count(hi)
    end
    if not reason and step ~= nil then
      by, reason = units.count(step)
    end
    if not reason and not (1 <= least and least <= highest and highest <= most and by >= 1
        and (stepped or step == nil)) then
      reason = type(value) == "table" and "these numbers are no such run" or show(value)
        .. " is out of range"
    end
    if not reason then
      return { least = least, most = highest, step = by }
    end
    mistakes:add(path, (reason:gsub("; give.*", "")) .. give)
  end
end

--- Kind of a range of exact quantities: "200..400 MHz", { "1 kS/s", "100 kS/s" }.
-- @param reader function: of one end, from libration.units
-- @param example string: for messages
-- @return function: kind giving { least, most }, fractions above 0
-- @usage
-- local fields, options = require "libration.digitizer.fields", require "libration.options"
-- local kind = fields.span(lb.units.hz, "200..400 MHz")
-- assert(tostring(kind("1..2 kHz", "vco", options.mistakes()).most) == "2000")
function M.span(reader, example)
  return function(value, path, mistakes)
    local lo, hi, third, reason = ends(value)
    local least, most = nil, nil
    if third ~= nil then
      reason = "a range has two ends"
    end
    if not reason then
      least, reason = reader(lo)
    end
    if not reason then
      most, reason = reader(hi)
    end
    if not reason and not (least > base.fraction(0) and least <= most) then
      reason = type(value) == "table" and "the ends must be above 0 and in order" or show(value)
        .. ": the ends must be above 0 and in order"
    end
    if not reason then
      return { least = least, most = most }
    end
    mistakes:add(path, (reason:gsub("; give.*", "")) .. '; give "' .. example .. '"')
  end
end

local function range(value)
  if type(value) ~= "string" then
    local number, reason = units.number(value, "V")
    return number, reason or "V"
  end
  value = value:gsub("^%s*±%s*", "")
  local quantity, reason = units.parse(value)
  if not quantity then
    return nil, reason .. '; give the largest value, such as "5 V"'
  elseif quantity.decibel or quantity.measure then
    return nil, show(value) .. ' is not a peak value; give one such as "5 V"'
  end
  local unit = quantity.unit == "" and "V" or units.base(quantity.unit)
  local number, problem = units.number(value, unit)
  return number, problem or unit
end

--- Kind of a range: the largest value before clipping, "5 V", "±10 V", "50 m/s^2".
-- @return function: kind giving { value, unit }
-- @usage
-- local fields, options = require "libration.digitizer.fields", require "libration.options"
-- assert(fields.range()("±10 V", "range", options.mistakes()).value == 10)
function M.range()
  return function(value, path, mistakes)
    local number, unit = range(value)
    if not number then
      mistakes:add(path, unit)
    elseif number <= 0 then
      mistakes:add(path, show(value) .. ' is out of range; give a value above 0, such as "5 V"')
    else
      return { value = number, unit = unit }
    end
  end
end

-- A frequency in Hz or a share of the rate.
local function place(value)
  local give = '; give a share of the sample rate ("0.4 rate") or a frequency ("20 kHz")'
  local quantity, reason = nil, show(value) .. " is not a place in frequency"
  if type(value) == "string" then
    quantity, reason = units.parse(value)
  end
  local share = quantity and quantity.signature == "rate:2"
  if quantity and not share and quantity.signature ~= "s:-2" then
    quantity, reason = nil, show(value) .. " is neither"
  end
  if quantity and quantity.number <= 0 then
    quantity, reason = nil, show(value) .. " is not above 0"
  end
  if not quantity then
    return nil, reason .. give
  end
  local number, problem = units.number(value, share and "rate" or "Hz")
  return number and { value = number, of_rate = share }, problem
end

-- One point of a filter table: { "1 kHz", "-0.1 dB" }.
local function point(value, path, mistakes)
  local at, db, third = nil, nil, value
  if type(value) == "table" then
    at, db, third = ends(value)
  end
  if at == nil or db == nil or third ~= nil then
    mistakes:add(path, 'give a point as { "1 kHz", "-0.1 dB" }')
    return nil
  end
  local where, reason = place(at)
  local level, problem = units.db(db)
  if not where then
    mistakes:add(options.join(path, 1), reason)
  end
  if not level or math.abs(level) > 600 then
    mistakes:add(options.join(path, 2), problem or show(db) .. "; give -600 to 600 dB")
    return nil
  end
  return where and { at = where, db = level }
end

local function level(value)
  local db, reason = units.db(value)
  return db and math.abs(db), reason
end

local function outside(value)
  return units.relative(value, "outside")
end

local shapes = {
  none = {}, butterworth = { "order", "corner" }, bessel = { "order", "corner" },
  chebyshev = { "order", "corner", "ripple" },
  elliptic = { "order", "corner", "ripple", "stop" }, points = { "points" },
}
local hints = {
  order = "order = 8", corner = 'corner = "0.4 rate"', ripple = 'ripple = "0.1 dB"',
  stop = 'stop = "80 dB"', points = 'points = { { "1 kHz", "-0.1 dB" }, ... }',
}

-- A shape has all of its fields and none of another's.
local function check_shape(filter, path, mistakes)
  local wanted = {}
  for _, name in ipairs(shapes[filter.shape]) do
    wanted[name] = true
  end
  for _, name in ipairs { "corner", "order", "points", "ripple", "stop" } do
    if wanted[name] and filter[name] == nil then
      mistakes:add(options.join(path, name), ('missing; shape "%s" needs %s'):format(filter.shape,
        hints[name]))
    elseif not wanted[name] and filter[name] ~= nil then
      local list = table.concat(shapes[filter.shape], ", ")
      mistakes:add(options.join(path, name), ('shape "%s" has %s'):format(filter.shape,
        list == "" and "no such field" or "only " .. list))
    end
  end
end

local function check_points(points, path, mistakes)
  for i, row in ipairs(points) do
    local before = points[i - 1]
    if before and before.at.of_rate ~= row.at.of_rate then
      mistakes:add(options.join(path, i), "give all points in Hz, or all as shares of the rate")
    elseif before and row.at.value <= before.at.value then
      mistakes:add(options.join(path, i), "points go from low to high frequencies")
    end
  end
end

-- The fields that other rooms know.
local function normal_filter(filter)
  local points, of_rate = nil, filter.corner and filter.corner.of_rate or false
  if filter.points then
    points, of_rate = {}, filter.points[1].at.of_rate
    for i, row in ipairs(filter.points) do
      points[i] = { at = row.at.value, db = row.db }
    end
  end
  return { shape = filter.shape, order = filter.order,
    corner = filter.corner and filter.corner.value, corner_of_rate = of_rate,
    ripple_db = filter.ripple, stop_db = filter.stop, points = points,
    flatness = filter.flatness }
end

local filter_schema = {
  shape = { options.choice { "none", "butterworth", "chebyshev", "bessel", "elliptic",
    "points" }, required = true, hint = 'give shape = "butterworth" or "none"' },
  order = { options.integer(1, 16) }, corner = { options.quantity(place) },
  ripple = { options.quantity(level, { least = 1e-6, most = 300, unit = "dB" }) },
  stop = { options.quantity(level, { above = 0, most = 300, unit = "dB" }) },
  points = { options.list(point, 1, 256) },
  flatness = { options.quantity(outside, { least = 0, below = 1 }), default = 0.0 },
}

--- Kind of an anti-alias filter.
-- @return function: kind giving shape, order, corner, corner_of_rate, ripple_db,
-- stop_db, points, flatness
-- @usage
-- local fields, options = require "libration.digitizer.fields", require "libration.options"
-- local filter = fields.filter()({ shape = "bessel", order = 4, corner = "0.4 rate" }, "filter",
--   options.mistakes())
-- assert(filter.corner == 0.4 and filter.corner_of_rate)
function M.filter()
  return function(value, path, mistakes)
    local before = mistakes.count
    local filter = options.read(filter_schema, value, path, mistakes)
    if mistakes.count > before then
      return nil
    end
    check_shape(filter, path, mistakes)
    check_points(filter.points or {}, options.join(path, "points"), mistakes)
    if filter.stop and filter.ripple and filter.stop <= filter.ripple then
      mistakes:add(options.join(path, "stop"), "the stop band lies deeper than the ripple")
    end
    return mistakes.count == before and normal_filter(filter) or nil
  end
end

local function relative(default)
  return { options.quantity(outside, { least = 0, below = 1 }), default = default }
end

local function seconds()
  return { options.quantity(units.seconds, { least = 0, unit = "s" }), default = 0.0 }
end

local pll_schema = {
  multiply = { M.integers(1 << 32), required = true, hint = 'give multiply = "8..64"' },
  divide = { M.integers(1 << 32), default = { least = 1, most = 1, step = 1 } },
  after = { options.list(options.integer(1, 1 << 32), 1, 4096), default = { 1 } },
  vco = { M.span(units.hz, "200..400 MHz") },
}

local rate = options.quantity(units.rate, { above = base.fraction(0), unit = "S/s" })

--- Fields of a digitizer, for libration.options.
M.schema = {
  title = { options.text(), default = "digitizer" },
  clock = { options.quantity(units.hz, { above = base.fraction(0), unit = "Hz" }) },
  divider = { M.integers(1 << 40, true) },
  decimation = { options.list(options.integer(1, 1 << 32), 1, 4096) },
  rates = { options.list(rate, 1, 10000) }, rate = { M.span(units.rate, "1..100 kS/s") },
  rate_step = { rate }, pll = { options.record(pll_schema) },
  channels = { options.integer(1, 4096), default = 1 }, aggregate = { rate },
  memory = { options.integer(1, 1 << 50) }, block = { options.integer(1, 1 << 30), default = 1 },
  samples = { M.integers(1 << 40), default = { least = 16, most = 1 << 24 } },
  bits = { options.integer(1, 48) }, range = { M.range() },
  noise = { function(value) return value end }, -- read with the unit of the range
  filter = { M.filter(),
    default = { shape = "none", corner_of_rate = false, flatness = 0.0 } },
  timebase = relative(0.0), accuracy = relative(0.0), jitter = seconds(), skew = seconds(),
  price = { options.number { least = 0 } },
}

return M
