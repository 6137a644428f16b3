--- Curves of results made ready to be drawn: rows, ranges, thinned to columns.
-- A curve has x and y (lists or samples of one length), or low and high instead
-- of y or beside it. Where an axis is logarithmic, what is not above 0 cannot be
-- shown: it leaves a gap and is counted.

local M = {}

M.columns = 1100 -- of a picture; more points than two a column are thinned

local DECADES = 12 -- that a logarithmic axis shows at most

local function finite(value)
  return value ~= nil and value == value and value ~= math.huge and value ~= -math.huge
end

local function see(range, value, log)
  if finite(value) and (not log or value > 0) then
    range.least, range.most = math.min(range.least, value), math.max(range.most, value)
  end
end

-- Least and most of the named fields of all curves of a panel.
local function seen(panel, fields, log)
  local range = { least = math.huge, most = -math.huge }
  for _, curve in ipairs(panel.curves) do
    for _, field in ipairs(fields) do
      local values = curve[field]
      for k = 1, values and #values or 0 do see(range, values[k], log) end
    end
  end
  return range
end

local function log_range(range, axis)
  if range.least > range.most then return { least = 0, most = 1, log = false } end
  local least = math.max(axis.least or range.least, range.most / 10.0 ^ DECADES)
  least = axis.least or 10 ^ math.floor(math.log(least, 10) - 0.02)
  return { least = least, most = axis.most or 10 ^ math.ceil(math.log(range.most, 10) + 0.02),
           log = true }
end

local function straight_range(range, axis, margin)
  local least, most = axis.least, axis.most
  if range.least > range.most then
    least, most = least or 0, most or (least or 0) + 1
  end
  least, most = least or range.least, most or range.most
  local span = most - least
  if not (span > 1e-12 * math.max(math.abs(least), math.abs(most))) then
    span = math.abs(most) > 0 and math.abs(most) or 1
  end
  if not axis.least then least = least - margin * span end
  if not axis.most then most = most + margin * span end
  if not (most > least) then most = least + span end
  return { least = least, most = most, log = false }
end

--- The range of an axis of a panel.
-- @param panel table: with x, y (axes: log, least, most where they are fixed) and curves
-- @param which string: "x" or "y"
-- @return table: least, most, log (false where nothing can be shown on a logarithmic one)
-- @usage
-- local curves = require "libration.report.curves"
-- local panel = { x = {}, y = { log = true }, curves = { { x = { 1, 2 }, y = { 3, 500 } } } }
-- assert(curves.range(panel, "y").most == 1000 and curves.range(panel, "x").least <= 1)
function M.range(panel, which)
  local axis = panel[which]
  local fields = which == "x" and { "x", "from", "to" } or { "y", "low", "high" }
  if not axis.log then
    return straight_range(seen(panel, fields), axis, which == "x" and 0 or 0.06)
  end
  local shown = which == "y" and { "y", "high" } or fields -- a low limit may be next to nothing
  return log_range(seen(panel, shown, true), axis)
end

-- A value as the axis can show it; nil where it cannot.
local function on(value, axis, clip)
  if not finite(value) then return nil end
  if axis.log and value < axis.least and (clip or value <= 0) then
    return clip and axis.least or nil
  end
  return value
end

-- Adds a row, or a gap, that is an empty row, where a value is missing.
local function push(rows, row, count)
  for i = 1, count do
    if row[i] == nil then
      if #rows > 0 and #rows[#rows] > 0 then rows[#rows + 1] = {} end
      return
    end
  end
  rows[#rows + 1] = row
end

-- The column of a picture in which a place lies.
local function column(x, axis, columns)
  local place = axis.log and math.log(math.max(x, axis.least) / axis.least)
    / math.log(axis.most / axis.least) or (x - axis.least) / (axis.most - axis.least)
  return place * columns // 1
end

-- Indices that keep the least and the most of every column of a long curve.
local function thinned(curve, axis, columns)
  local n, out, k = #curve.x, {}, 1
  while k <= n do
    local c, low, high = column(curve.x[k], axis, columns), k, k
    while k <= n and column(curve.x[k], axis, columns) == c do
      if curve.y[k] < curve.y[low] then low = k end
      if curve.y[k] > curve.y[high] then high = k end
      k = k + 1
    end
    out[#out + 1] = math.min(low, high)
    if low ~= high then out[#out + 1] = math.max(low, high) end
  end
  return out
end

--- Whether a curve has so many points that it is thinned.
-- @param curve table: see rows
-- @param columns integer: of the picture
-- @return boolean: whether
-- @usage
-- local is_long = require("libration.report.curves").is_long
-- assert(not is_long({ kind = "line", x = { 1 } }, 100))
function M.is_long(curve, columns)
  return curve.kind ~= "bars" and not (curve.kind == "points" and curve.low)
    and #curve.x > 4 * columns
end

local function indices(curve, axis, columns)
  if M.is_long(curve, columns) then return thinned(curve, axis, columns) end
  local out = {}
  for k = 1, #curve.x do out[k] = k end
  return out
end

-- Rows x, low, high: all of a band, of a long one least low and most high of every column.
local function limits_of(curve, axis, columns)
  local out, is_long, last = {}, M.is_long(curve, columns), nil
  for k = 1, #curve.x do
    local low, high = curve.low[k], curve.high[k]
    local c = is_long and column(curve.x[k], axis, columns)
    if c and c == last then
      local row = out[#out]
      row[2], row[3] = math.min(row[2], low), math.max(row[3], high)
    else
      out[#out + 1], last = { curve.x[k], low, high }, c
    end
  end
  return out
end

local function band_rows(curve, axes, columns)
  local rows, last = {}, nil
  for _, row in ipairs(limits_of(curve, axes.x, columns)) do
    if curve.wrap and last and math.abs(row[2] - last) > curve.wrap then push(rows, {}, 1) end
    push(rows, { on(row[1], axes.x), on(row[2], axes.y, true), on(row[3], axes.y) }, 3)
    last = row[2]
  end
  return rows
end

local function bar_rows(curve, axes)
  local rows = {}
  for k = 1, #curve.x do
    push(rows, { on(curve.x[k], axes.x), on(curve.y[k], axes.y), on(curve.from[k], axes.x, true),
                 on(curve.to[k], axes.x), axes.y.least }, 5)
  end
  return rows
end

--- The rows of a curve: x and y; x, low, high of a band; x, y, low, high of points with
-- limits; x, y, from, to, bottom of bars. An empty row is a gap.
-- @param curve table: kind ("line", "band", "points", "dots" or "bars") and its lists
-- @param axes table: x and y, as from range
-- @param columns integer: to which long curves are thinned, keeping least and most of each
-- @return table: list of rows
-- @usage
-- local axis = { least = 0, most = 2, log = false }
-- local rows = require("libration.report.curves").rows({ kind = "line", x = { 1, 2 },
--   y = { 5, 0 / 0 } }, { x = axis, y = axis }, 100)
-- assert(#rows == 2 and rows[1][2] == 5 and #rows[2] == 0)
function M.rows(curve, axes, columns)
  if curve.kind == "band" then return band_rows(curve, axes, columns) end
  if curve.kind == "bars" then return bar_rows(curve, axes) end
  local rows, limits = {}, curve.low ~= nil
  for _, k in ipairs(indices(curve, axes.x, columns)) do
    local row = { on(curve.x[k], axes.x), on(curve.y[k], axes.y) }
    if limits then
      row[3] = on(curve.low[k], axes.y, true) or row[2]
      row[4] = on(curve.high[k], axes.y) or row[2]
    end
    push(rows, row, limits and 4 or 2)
  end
  return rows
end

--- How many values of a panel a logarithmic axis cannot show.
-- @param panel table: as of range
-- @param axis table: of y, as from range
-- @return integer: values at or below 0
-- @return integer: values above 0 that are below the axis
-- @usage
-- local panel = { curves = { { x = { 1, 2 }, y = { 0, 1e-9 } } } }
-- local none, below = require("libration.report.curves").hidden(panel, { log = true, least = 1 })
-- assert(none == 1 and below == 1)
function M.hidden(panel, axis)
  local none, below = 0, 0
  for _, curve in ipairs(panel.curves) do
    for k = 1, axis.log and curve.y and #curve.y or 0 do
      local value = curve.y[k]
      if finite(value) and value <= 0 then none = none + 1 end
      if finite(value) and value > 0 and value < axis.least then below = below + 1 end
    end
  end
  return none, below
end

return M
