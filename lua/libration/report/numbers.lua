--- Numbers as people read them, never better than they are.
-- An error is rounded up, a tolerance down, so that what is printed can be
-- relied on; three digits unless told. Exact values are printed exactly, or
-- marked with "~" where their decimals do not end. The point is always '.'.

local base = require("libration.core").base
local fraction = require "libration.fraction"

local M = {}

local function shift(digits, exponent) -- digits d1d2d3 x 10^(exponent - 2) as fixed text
  local count = #digits
  if exponent >= count - 1 then
    return digits .. ("0"):rep(exponent - count + 1)
  elseif exponent >= 0 then
    return digits:sub(1, exponent + 1) .. "." .. digits:sub(exponent + 2)
  end
  return "0." .. ("0"):rep(-exponent - 1) .. digits
end

-- Rounds a positive number to `count` digits; side > 0 up, < 0 down, 0 nearest.
-- What the last bits of the arithmetic did (1e-12) does not count.
local function digits_of(value, count, side)
  local text = string.format("%." .. count - 1 .. "e", value)
  local head, tail, exponent = text:match("^(%d)%D?(%d*)e([-+]%d+)$")
  local digits, power = math.tointeger(head .. tail), math.tointeger(tonumber(exponent))
  local rounded = tonumber(digits .. "e" .. power - count + 1)
  if side > 0 and rounded < value * (1 - 1e-12) then
    digits = digits + 1
  elseif side < 0 and rounded > value * (1 + 1e-12) then
    digits = digits - 1
    if #tostring(digits) < count then
      digits, power = digits * 10 + 9, power - 1
    end
  end
  if #tostring(digits) > count then
    digits, power = digits // 10, power + 1
  end
  return tostring(digits), power
end

--- Text of a number with a few digits.
-- @param value number: any
-- @param count integer: digits, default 3
-- @param side integer: 1 rounds up, -1 down (away from or towards 0), 0 to the
-- nearest (default)
-- @return string: fixed from 10^-7 to below 10^7, else with an exponent
-- @usage
-- local round = require("libration.report.numbers").round
-- assert(round(0.01234) == "0.0123" and round(0.01231, 3, 1) == "0.0124")
-- assert(round(1234567) == "1230000" and round(2e-9) == "2.00e-9")
function M.round(value, count, side)
  count, side = count or 3, side or 0
  if value ~= value then
    return "unknown"
  elseif value == math.huge or value == -math.huge then
    return value > 0 and "unbounded" or "-unbounded"
  elseif value == 0 then
    return "0"
  end
  local sign = value < 0 and "-" or ""
  local digits, power = digits_of(math.abs(value), count, side)
  if power < -7 or power >= 7 then
    local tail = digits:sub(2)
    return sign .. digits:sub(1, 1) .. (tail ~= "" and "." .. tail or "") .. "e" .. power
  end
  return sign .. shift(digits, power)
end

--- Text of an error: rounded up.
-- @param value number: any unit, or nil
-- @return string: three digits; "" for nil
-- @usage
-- assert(require("libration.report.numbers").error(0.0001501) == "0.000151")
function M.error(value)
  return value and M.round(value, 3, 1) or ""
end

--- Text of a tolerance: rounded down.
-- @param value number: any unit, or nil
-- @return string: three digits; "none" for nil and for infinity
-- @usage
-- assert(require("libration.report.numbers").tolerance(0.0001509) == "0.000150")
function M.tolerance(value)
  if not value or value == math.huge then
    return "none"
  end
  return M.round(value, 3, -1)
end

--- Text of a number as it was given: shortest that reads back.
-- @param value number or fraction: or nil
-- @return string: "24.6"; "~24.5763123" where the decimals do not end; "" for nil
-- @usage
-- local exact = require("libration.report.numbers").exact
-- assert(exact(0.05) == "0.05" and exact(lb.fraction.new "1/3") == "~0.333333333")
function M.exact(value)
  if value == nil then
    return ""
  elseif not base.is_fraction(value) then
    return (base.number_text(value):gsub("%.0$", ""))
  end
  local decimal = fraction.decimal(value)
  if decimal and #decimal <= 14 then
    return decimal
  end
  return "~" .. M.round(value:number(), 9)
end

--- Text of a share as per cent.
-- @param ratio number: 1 is 100 %
-- @param side integer: 1 rounds up (default), -1 down, 0 to the nearest
-- @return string: "37 %", "0.4 %" below ten
-- @usage
-- local percent = require("libration.report.numbers").percent
-- assert(percent(0.3701) == "38 %" and percent(0.0041, 0) == "0.41 %")
function M.percent(ratio, side)
  local value = ratio * 100
  if value ~= value or value == math.huge then
    return M.round(value)
  end
  local count = value >= 1000 and 4 or value >= 100 and 3 or 2
  return M.round(value, count, side or 1) .. " %"
end

local prefixes = { { 1, "s" }, { 1e-3, "ms" }, { 1e-6, "us" }, { 1e-9, "ns" } }

--- Text of a time.
-- @param seconds number: s
-- @return string: four digits with a unit: "4.000 s", "2.500 ms", "2 h 5 min"
-- @usage
-- local time = require("libration.report.numbers").time
-- assert(time(4) == "4.000 s" and time(0.0025) == "2.500 ms")
-- assert(time(7500) == "2 h 5 min")
function M.time(seconds)
  if seconds >= 600 and seconds < math.huge then
    local minutes = math.ceil(seconds / 60 - 1e-9)
    if minutes < 60 then
      return minutes .. " min"
    end
    return minutes // 60 .. " h " .. minutes % 60 .. " min"
  end
  for _, prefix in ipairs(prefixes) do
    if seconds >= prefix[1] or prefix[1] == 1e-9 or seconds == 0 then
      return M.round(seconds / prefix[1], 4) .. " " .. prefix[2]
    end
  end
end

--- Small bar of a share.
-- @param ratio number: 1 fills it
-- @param width integer: columns, default 10
-- @return string: "####......"; "##########!" past the end; a step begun is shown
-- whole, but empty below half of the first one
-- @usage
-- assert(require("libration.report.numbers").bar(0.31) == "####......")
-- assert(require("libration.report.numbers").bar(0.04) == "..........")
function M.bar(ratio, width)
  width = width or 10
  if ratio ~= ratio or ratio > 1 then
    return ("#"):rep(width) .. "!"
  end
  local full = ratio * width < 0.5 and 0 or math.ceil(ratio * width - 1e-9)
  return ("#"):rep(full) .. ("."):rep(width - full)
end

return M
