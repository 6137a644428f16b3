--- Quantities as people write them: "12.288 MHz", "25 ppm", "100 mV/g".
-- Values are exact fractions wherever that is possible (decibels and "rms" are
-- not). Readers return the value, or nil and a reason that says what was
-- given and what was expected. A bare number is in the unit the reader asks
-- for. Amplitudes are peak values unless the text ends in "rms". Decimals have
-- a point in every locale.

local base = require("libration.core").base
local symbols = require "libration.units.symbols"

local M = {}

local fraction = base.fraction
local MOST_ORDERS, MOST_BYTES = 1000, 500

-- An example for each unit that the readers are asked for.
local examples = {
  Hz = '"24.6 Hz"', s = '"60 s"', ["S/s"] = '"51.2 kS/s"', V = '"5 V"', S = '"4 MiS"',
  ["1"] = '"1 %" or "25 ppm"', ["m/s^2"] = '"20 mm/s^2"', Pa = '"0.2 Pa"',
  ["m/s^2/rtHz"] = '"60 um/s^2/rtHz"', ["V/rtHz"] = '"50 nV/rtHz"',
  ["V/(m/s^2)"] = '"100 mV/g"', ["V/Pa"] = '"50 mV/Pa"', rate = '"0.4 rate"',
}

-- The text without blanks around it and with a plain minus sign.
local function plain(text)
  local first, last = text:find "%S", #text
  while first and text:find("^%s", last) do -- "%s+$" is slow on long blanks
    last = last - 1
  end
  return first and text:sub(first, last):gsub("−", "-") or ""
end

-- Characters of the decimal number at text[at], or nil.
local function decimal_end(text, at)
  local stop = text:match("^[+-]?%d+%.?%d*()", at) or text:match("^[+-]?%.%d+()", at)
  return stop and (text:match("^[eE][+-]?%d+()", stop) or stop)
end

-- Splits "1/3 Hz" into "1/3" and "Hz"; nil when no number stands in front.
local function split(text)
  local stop = decimal_end(text, 1)
  if not stop then
    return nil
  end
  if text:find("^%s*/%s*[%d.]", stop) then
    local second = text:match("^%s*/%s*()", stop)
    stop = decimal_end(text, second) or stop
  end
  return (text:sub(1, stop - 1):gsub("%s", "")), plain(text:sub(stop))
end

local function cut_measure(rest)
  for _, word in ipairs { "rms", "peak" } do
    if rest == word or rest:find("%s" .. word .. "$") then
      return plain(rest:sub(1, -#word - 1)), word
    end
  end
  return rest, nil
end

local function shown(text)
  return '"' .. (#text > 60 and text:sub(1, 57) .. "..." or text):gsub("%c", "?") .. '"'
end

-- A number times a unit's factor: exact where it fits, and as a double.
local function scaled(digits, factor)
  local value, message, code = base.try_fraction(digits)
  if not value and code ~= "overflow" then
    return nil, nil, message
  end
  local exact = value and base.try_multiply(value, factor)
  if exact then
    return exact, exact:number()
  end
  local number = base.number_read(digits)
  number = number and number * factor:number()
  if not number or number == math.huge or number == -math.huge then
    return nil, nil, "is beyond the range of numbers"
  end
  return nil, number
end

--- Reads a quantity.
-- @param text string: number, unit, and perhaps "rms" or "peak"
-- @return table: number (double, in base units), exact (fraction, or nil where
-- it does not fit), signature (of the base units), unit (as written),
-- measure ("rms", "peak" or nil), decibel (true for dB); or nil and a reason
-- @usage
-- local q = lb.units.parse "12.288 MHz"
-- assert(tostring(q.exact) == "12288000" and q.unit == "MHz")
function M.parse(text)
  if #text > MOST_BYTES then
    return nil, shown(text) .. " is too long for a quantity"
  end
  local digits, rest = split(plain(text))
  if not digits then
    return nil, shown(text) .. " does not begin with a number"
  elseif rest:find "^,%d" then
    return nil, shown(text) .. " has a decimal comma; write a decimal point"
  end
  local unit, measure = cut_measure(rest)
  local entry, reason
  if unit == "dB" then
    entry = { factor = fraction(1), signature = "dB" }
  else
    entry, reason = symbols.parse(unit)
  end
  if not entry then
    return nil, shown(text) .. ": " .. reason
  end
  local exact, number, problem = scaled(digits, entry.factor)
  if problem then
    return nil, shown(text) .. " " .. problem
  end
  return { number = number, exact = exact, signature = entry.signature, unit = unit,
    measure = measure, decibel = unit == "dB" }
end

local function give(unit)
  local entry = symbols.parse(unit)
  local kind = entry.signature == "" and "a ratio" or symbols.kind(entry.signature)
  local example = examples[unit] or examples[symbols.base_unit(entry.signature)]
  return ("give %s%s"):format(kind, example and " such as " .. example
    or (" in %s"):format(unit))
end

local function kind_of(quantity)
  if quantity.decibel then
    return "a level in dB"
  elseif quantity.unit == "" then
    return "a number without a unit"
  end
  return symbols.kind(quantity.signature)
end

-- A bare number in the wanted unit: exact and double.
local function bare(value, unit)
  if type(value) == "number" and (value ~= value or value - value ~= 0) then
    return nil, nil, ("%s is not finite; %s"):format(base.number_text(value), give(unit))
  end
  local exact = base.try_fraction(value)
  return exact, exact and exact:number() or value + 0.0
end

local function is_bare(value)
  return type(value) == "number" or base.is_fraction(value)
end

local function describe(value)
  local kind = type(value)
  return kind == "boolean" and tostring(value) or kind == "nil" and "nil" or "a " .. kind
end

-- Common reader: exact (or nil), double, measure; or nil, nil, reason.
local function read(value, unit)
  if is_bare(value) then
    return bare(value, unit)
  elseif type(value) ~= "string" then
    return nil, nil, ("%s is not a quantity; %s"):format(describe(value), give(unit))
  end
  local quantity, reason = M.parse(value)
  if not quantity then
    return nil, nil, reason .. "; " .. give(unit)
  end
  local wanted = symbols.parse(unit)
  if quantity.unit == "" then
    local exact, number = scaled(split(plain(value)), fraction(1))
    return exact, number, quantity.measure
  elseif quantity.signature ~= wanted.signature then
    return nil, nil, ("%s is %s; %s"):format(shown(value), kind_of(quantity), give(unit))
  end
  local exact = quantity.exact and base.try_divide(quantity.exact, wanted.factor)
  if exact then
    return exact, exact:number(), quantity.measure
  end
  return nil, quantity.number / wanted.factor:number(), quantity.measure
end

local function no_measure(value, unit, measure)
  if measure then
    return ('%s: only an amplitude is "%s"; %s'):format(shown(value), measure, give(unit))
  end
end

--- Reads a quantity as an exact fraction of a unit.
-- @param value string or number or fraction: a bare number is in that unit
-- @param unit string: the unit wanted, such as "Hz"
-- @return fraction: or nil and a reason
-- @usage
-- assert(tostring(lb.units.exact("1500 r/min", "Hz")) == "25")
function M.exact(value, unit)
  local exact, number, measure = read(value, unit)
  if not number then
    return nil, measure
  end
  local problem = no_measure(value, unit, measure)
  if not exact and not problem then
    problem = ("%s does not fit exact arithmetic (fractions of 64-bit integers)")
      :format(is_bare(value) and base.number_text(value) or shown(value))
  end
  return not problem and exact or nil, problem
end

--- Reads a quantity as a number of a unit.
-- @param value string or number or fraction: a bare number is in that unit
-- @param unit string: the unit wanted, such as "V/(m/s^2)"
-- @return number: nearest double (within 2 ulp where no fraction holds it); or nil
-- and a reason
-- @usage
-- assert(lb.units.number("2 ns", "s") == 2e-9)
function M.number(value, unit)
  local _, number, measure = read(value, unit)
  if not number then
    return nil, measure
  end
  local problem = no_measure(value, unit, measure)
  return not problem and number or nil, problem
end

--- Reads an amplitude as a peak value in a unit.
-- @param value string or number or fraction: peak, or with "rms" behind it
-- @param unit string: such as "m/s^2"
-- @return number: peak, in that unit; or nil and a reason
-- @usage
-- assert(lb.units.amplitude("2 m/s^2 rms", "m/s^2") == 2 * math.sqrt(2))
function M.amplitude(value, unit)
  local _, number, measure = read(value, unit)
  if not number then
    return nil, measure
  end
  return measure == "rms" and number * math.sqrt(2) or number
end

--- Reads a frequency in Hz.
-- @param value string or number or fraction: "24.6 Hz", "1500 r/min", 24.6
-- @return fraction: Hz; or nil and a reason
-- @usage
-- assert(tostring(lb.units.hz "12.288 MHz") == "12288000")
-- local value, reason = lb.units.hz "25 mV"
-- assert(value == nil and reason:find "is a voltage; give a frequency")
function M.hz(value)
  return M.exact(value, "Hz")
end

--- Reads a sample rate: samples per second, or hertz.
-- @param value string or number or fraction: "51.2 kS/s", "51.2 kHz", 51200
-- @return fraction: S/s; or nil and a reason
-- @usage
-- assert(lb.units.rate "51.2 kS/s" == lb.units.rate "51.2 kHz")
function M.rate(value)
  local quantity = type(value) == "string" and M.parse(value)
  local unit = quantity and quantity.signature == symbols.parse("Hz").signature and "Hz" or "S/s"
  return M.exact(value, unit)
end

--- Reads a time in seconds.
-- @param value string or number or fraction: "60 s", "2 ns", 0.5
-- @return number: s; or nil and a reason
-- @usage
-- assert(lb.units.seconds "1.5 min" == 90)
function M.seconds(value)
  return M.number(value, "s")
end

--- Reads a level in decibels.
-- @param value string or number: "-80 dB", -80
-- @return number: dB; or nil and a reason
-- @usage
-- assert(lb.units.db "-80 dB" == -80)
function M.db(value)
  local number, problem = nil, nil
  if is_bare(value) then
    number, problem = M.number(value, "1")
  elseif type(value) ~= "string" then
    problem = describe(value) .. " is not a level"
  else
    local quantity, reason = M.parse(value)
    if not quantity then
      problem = reason
    elseif not quantity.decibel and quantity.unit ~= "" or quantity.measure then
      problem = shown(value) .. " is " .. kind_of(quantity)
    else
      number = quantity.number
    end
  end
  return number, not number and problem .. '; give a level such as "-80 dB"' or nil
end

--- Reads a relative amount: "1 %", "25 ppm", "0.1 dB", 0.01.
-- Decibels become the nearer side of the band they describe, 1 - 10^(-x/20),
-- when they limit an error ("inside": staying within it keeps within x dB on
-- both sides), and the farther side, 10^(x/20) - 1, when they describe how wrong
-- something may be ("outside").
-- @param value string or number or fraction: an optional sign "±" is ignored
-- @param side string: "inside" (default) or "outside", for decibels
-- @return number: ratio; or nil and a reason
-- @usage
-- assert(lb.units.relative "25 ppm" == 25e-6)
-- assert(math.abs(lb.units.relative("0.1 dB", "outside") - 0.011579454) < 1e-9)
function M.relative(value, side)
  if type(value) == "string" then
    value = plain(value):gsub("^±%s*", "")
    local quantity = M.parse(value)
    if quantity and quantity.decibel and not quantity.measure then
      local x = math.abs(quantity.number)
      return side == "outside" and 10 ^ (x / 20) - 1 or 1 - 10 ^ (-x / 20)
    end
  end
  return M.number(value, "1")
end

--- Reads a whole count: "4 Mi", "65536 S", 4096.
-- @param value string or number or fraction: a whole number
-- @return integer: or nil and a reason
-- @usage
-- assert(lb.units.count "4 Mi" == 4194304)
function M.count(value)
  local quantity = type(value) == "string" and M.parse(value)
  local unit = quantity and quantity.signature == "S:2" and "S" or "1"
  local exact, reason = M.exact(value, unit)
  if exact and exact.denominator == 1 and not (quantity and quantity.unit == "%") then
    return exact.numerator
  end
  local problem = exact and (is_bare(value) and tostring(exact) or shown(value)) .. " is not whole"
  return nil, (problem or reason:gsub("; give.*", ""))
    .. '; give a whole number such as 4096 or "4 Mi"'
end

--- Splits a range "lo..hi unit" into two quantities with their units.
-- @param text string: "0.05..2 m/s^2", "1 Hz .. 2 kHz", "128..65535"
-- @return string: the lower one with its unit; or nil when it is no range
-- @return string: the higher one
-- @usage
-- local lo, hi = lb.units.range "0.05..2 m/s^2"
-- assert(lo == "0.05 m/s^2" and hi == "2 m/s^2")
function M.range(text)
  if #text > MOST_BYTES then
    return nil
  end
  local lo, hi = plain(text):match "^(.-)%s*%.%.%s*(.+)$"
  if not lo then
    return nil
  end
  local _, own = split(lo)
  local _, shared = split(hi)
  if own == "" and shared and shared ~= "" then
    lo = lo .. " " .. shared
  end
  return lo, hi
end

-- One item of an order list: appends one order or a run of them.
local function add_orders(list, item)
  local lo, hi = nil, nil
  if type(item) == "string" then
    lo, hi = M.range(item)
  end
  local first, last = lo and M.count(lo), hi and M.count(hi)
  if lo and not (first and last and first <= last and last - first < MOST_ORDERS) then
    return ('%s is not a range of orders; write "1..20"'):format(shown(item))
  elseif lo then
    for k = first, last do
      list[#list + 1] = fraction(k)
    end
    return nil
  end
  local order, reason = M.exact(item, "1")
  list[#list + 1] = order
  return reason
end

-- The items of an order list in whatever form; nil and a reason.
local function order_items(value)
  local items = {}
  if type(value) == "table" then
    for key in next, value do
      if math.type(key) ~= "integer" or key < 1 or key > MOST_ORDERS then
        return nil, ('a list of orders is { 1, 2, "7/2" }, at most %d of them'):format(MOST_ORDERS)
      end
      items[key] = rawget(value, key)
    end
  elseif type(value) == "string" and #value <= 10 * MOST_BYTES then
    for item in (value .. ","):gmatch "([^,]*)," do
      items[#items + 1] = plain(item)
    end
  else
    items[1] = value
  end
  return items
end

--- Reads orders: "1..20", "1, 3, 7/2", 3 or a list of these.
-- @param value string or number or fraction or table: all must be positive
-- @return table: fractions in the order given; or nil and a reason
-- @usage
-- local orders = lb.units.orders "1..3, 7/2"
-- assert(#orders == 4 and tostring(orders[4]) == "7/2")
function M.orders(value)
  local items, reason = order_items(value)
  local list, seen = {}, {}
  for _, item in ipairs(items or {}) do
    reason = add_orders(list, item)
    if reason or #list > MOST_ORDERS then
      break
    end
  end
  if reason then
    return nil, reason
  end
  if #list == 0 or #list > MOST_ORDERS then
    return nil, ('%s orders; give 1 to %d, such as "1..20"'):format(
      #list == 0 and "no" or "too many", MOST_ORDERS)
  end
  for _, order in ipairs(list) do
    if order <= 0 or seen[tostring(order)] then
      return nil, ("order %s: orders are positive and each is given once"):format(order)
    end
    seen[tostring(order)] = true
  end
  return list
end

--- A number for people: so many significant digits, a point in every locale.
-- @param x number: any
-- @param digits integer: significant digits, default 6
-- @return string: such as "0.000123457"
-- @usage
-- assert(lb.units.text(math.pi, 4) == "3.142")
function M.text(x, digits)
  return (("%." .. (digits or 6) .. "g"):format(x):gsub(",", "."))
end

--- The base unit of the unit of a quantity or unit text.
-- @param text string: a unit, "mm/s^2"
-- @return string: "m/s^2"; or nil and a reason
-- @usage
-- assert(lb.units.base "mV/rtHz" == "V/rtHz")
function M.base(text)
  local unit, reason = symbols.parse(text)
  return unit and symbols.base_unit(unit.signature), reason
end

return M
