--- Exact fractions of 64-bit integers.
-- A float means its shortest decimal (0.3 is 3/10), an integer itself, a text
-- its exact value. Arithmetic is checked: a result that does not fit raises
-- "overflow", it is never wrong. Comparing with == needs fractions on both sides.

local base = require("libration.core").base

local M = {}

--- Makes a fraction.
-- @param value number or text or fraction: "7/2", "12.288e6", 0.3, 5
-- @param below number or text or fraction: what stands below the bar, default 1
-- @return fraction: in lowest terms; misuse and overflow raise
-- @usage
-- local f = lb.fraction.new
-- assert(f(0.3) == f(3, 10) and f "24.6" == f(123, 5))
function M.new(value, below)
  return base.fraction(value, below)
end

--- Makes a fraction of something that came from outside; never raises.
-- @param value any: number, text or fraction
-- @return fraction: or nil, message, code ("format", "overflow", "domain")
-- @usage
-- local value, message, code = lb.fraction.try "twelve"
-- assert(value == nil and code == "format" and message:find "twelve")
function M.try(value)
  return base.try_fraction(value)
end

--- Whether a value is a fraction.
-- @param value any: what to look at
-- @return boolean: true for a fraction
-- @usage
-- assert(lb.fraction.is(lb.fraction.new(1)) and not lb.fraction.is(1))
function M.is(value)
  return base.is_fraction(value)
end

--- Largest fraction that goes a whole number of times into each of a list.
-- @param list table: fractions, numbers or texts, at least one
-- @return fraction: >= 0; raises on overflow
-- @usage
-- assert(tostring(lb.fraction.gcd { "24.6", "172.2", 50 }) == "1/5")
function M.gcd(list)
  local common = base.fraction(0)
  for _, value in ipairs(list) do
    common = base.fraction_gcd(common, value)
  end
  return common
end

--- Exact decimal text of a fraction, where it ends.
-- @param value fraction: or what makes one
-- @return string: "24.6", "12288000"; or nil where the decimals never end or
-- are more than 25
-- @usage
-- assert(lb.fraction.decimal "123/5" == "24.6")
-- assert(lb.fraction.decimal "1/3" == nil)
function M.decimal(value)
  value = base.fraction(value)
  local rest, below = math.abs(value.numerator % value.denominator), value.denominator
  local whole, digits = value.numerator // value.denominator, {}
  if value.numerator < 0 and value.numerator ~= math.mininteger then
    whole, rest = -value.numerator // below, -value.numerator % below
  end
  while rest ~= 0 do
    if #digits == 25 then
      return nil
    end
    local digit, left = 0, 0
    for _ = 1, 10 do -- ten times the rest without leaving 64 bits
      if left >= below - rest then
        left, digit = left - (below - rest), digit + 1
      else
        left = left + rest
      end
    end
    digits[#digits + 1], rest = digit, left
  end
  local sign = value.numerator < 0 and value.numerator ~= math.mininteger and "-" or ""
  local text = string.format("%s%d", sign, whole)
  return #digits == 0 and text or text .. "." .. table.concat(digits)
end

--- Text of a fraction for people: the decimal where it ends, else "1/3".
-- @param value fraction: or what makes one
-- @return string: reads back as the same fraction
-- @usage
-- assert(lb.fraction.text "0.50" == "0.5" and lb.fraction.text "2/6" == "1/3")
function M.text(value)
  return M.decimal(value) or tostring(base.fraction(value))
end

return M
