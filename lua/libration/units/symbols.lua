--- Unit symbols and unit expressions: "mm/s^2", "mV/g", "V/rtHz", "r/min".
-- A unit is an exact factor and a signature: the powers of the base symbols
-- (in halves, because of the root of the hertz in densities).

local base = require("libration.core").base

local M = {}

local fraction = base.fraction

-- Base symbols in the order in which they are written.
local order = { "rate", "S", "V", "A", "N", "Pa", "strain", "rad", "m", "s" }

-- symbol = { factor, { base symbol = halves of its power }, prefixes }
local si = "TGMkmuµμnpf"
local symbols = {
  ["1"] = { 1, {} },
  ["%"] = { "1/100", {} },
  ppm = { "1e-6", {} },
  ppb = { "1e-9", {} },
  r = { 1, {} }, -- a revolution: r/s is Hz
  rpm = { "1/60", { s = -2 } },
  rate = { 1, { rate = 2 } }, -- the sample rate, where a field is a share of it
  S = { 1, { S = 2 }, si },
  Hz = { 1, { s = -2 }, si },
  rtHz = { 1, { s = -1 }, si },
  s = { 1, { s = 2 }, si },
  min = { 60, { s = 2 } },
  h = { 3600, { s = 2 } },
  V = { 1, { V = 2 }, si },
  A = { 1, { A = 2 }, si },
  N = { 1, { N = 2 }, si },
  Pa = { 1, { Pa = 2 }, si },
  m = { 1, { m = 2 }, si .. "c" },
  strain = { 1, { strain = 2 }, si },
  rad = { 1, { rad = 2 }, si },
  -- standard acceleration of free fall, 3rd CGPM (1901): exactly 9.80665 m/s^2
  g = { "9.80665", { m = 2, s = -4 }, "muµμn" },
}

local prefixes = {
  T = "1e12", G = "1e9", M = "1e6", k = "1e3", c = "1e-2", m = "1e-3",
  u = "1e-6", ["µ"] = "1e-6", ["μ"] = "1e-6", n = "1e-9", p = "1e-12", f = "1e-15",
}
local binary = { Ki = 1 << 10, Mi = 1 << 20, Gi = 1 << 30 }

-- Several spellings of one thing, rewritten before parsing.
local spellings = {
  { "sqrt%(Hz%)", "rtHz" }, { "√Hz", "rtHz" }, { "Hz^%(1/2%)", "rtHz" }, { "²", "^2" },
  { "³", "^3" }, { "·", "*" }, { "^%s+", "" }, { "%s+$", "" },
}

--- Words for what a signature is, for messages.
-- @param signature string: as unit expressions have it
-- @return string: "a frequency", "a voltage", or "a quantity in N/Pa"
-- @usage
-- local symbols = require "libration.units.symbols"
-- assert(symbols.kind(symbols.parse("MHz").signature) == "a frequency")
function M.kind(signature)
  return M.kinds[signature] or "a quantity in " .. M.base_unit(signature)
end

local function signature_of(powers)
  local parts = {}
  for _, name in ipairs(order) do
    if powers[name] and powers[name] ~= 0 then
      parts[#parts + 1] = name .. ":" .. powers[name]
    end
  end
  return table.concat(parts, " ")
end

-- One symbol, prefixed or not: factor and powers.
local function look_up(name)
  local whole = symbols[name]
  if whole then
    return fraction(whole[1]), whole[2]
  end
  if binary[name] then
    return fraction(binary[name]), {}
  end
  for prefix, factor in pairs(binary) do
    if name == prefix .. "S" then
      return fraction(factor), symbols.S[2]
    end
  end
  for prefix, factor in pairs(prefixes) do
    local rest = name:sub(1, #prefix) == prefix and symbols[name:sub(#prefix + 1)]
    if rest and rest[3] and rest[3]:find(prefix, 1, true) then
      return fraction(factor) * rest[1], rest[2]
    end
  end
end

local function unknown(name)
  return ('unknown unit "%s"; units: %% ppm ppb dB 1 Hz S/s s min h r/min V A N Pa m g strain rad '
    .. "rate rtHz, prefixes T G M k m u n p f, Ki Mi Gi"):format(name)
end

-- Multiplies result by (factor, powers)^(halves of power / 2).
local function multiply(result, factor, powers, power)
  for _ = 1, math.abs(power) do
    result.factor = power > 0 and result.factor * factor or result.factor / factor
  end
  for name, halves in pairs(powers) do
    result.powers[name] = (result.powers[name] or 0) + halves * power
  end
end

local product

-- One factor of a product at text[at]: returns the place behind it.
local function factor_at(text, at, result, sign, depth)
  if text:sub(at, at) == "(" then
    local inside = { factor = fraction(1), powers = {} }
    local stop, reason = product(text, at + 1, inside, depth + 1)
    if not stop then
      return nil, reason
    elseif text:sub(stop, stop) ~= ")" then
      return nil, "a bracket is not closed"
    end
    multiply(result, inside.factor, inside.powers, sign)
    return stop + 1
  end
  local name = text:match("^[%a\128-\255%%]+", at) or text:match("^1", at)
  if not name then
    return nil, unknown(text:sub(at))
  end
  local power = text:match("^%^%-?%d", at + #name)
  local factor, powers = look_up(name)
  if not factor then
    return nil, unknown(name)
  end
  multiply(result, factor, powers, sign * (power and tonumber(power:sub(2)) or 1))
  return at + #name + (power and #power or 0)
end

function product(text, at, result, depth)
  if depth > 4 then
    return nil, "too many brackets"
  end
  local sign = 1
  if text:sub(at, at) == "/" then
    sign, at = -1, at + 1
  end
  while true do
    local stop, reason = factor_at(text, at, result, sign, depth)
    if not stop then
      return nil, reason
    end
    local mark = text:sub(stop, stop)
    if mark ~= "*" and mark ~= "/" then
      return stop
    end
    sign, at = mark == "*" and 1 or -1, stop + 1
  end
end

local function parse(text)
  local result = { factor = fraction(1), powers = {} }
  if text == "" then
    return { factor = result.factor, signature = "" }
  end
  local stop, reason = product(text, 1, result, 1)
  if not stop then
    return nil, reason
  elseif stop <= #text then
    return nil, unknown(text:sub(stop))
  end
  return { factor = result.factor, signature = signature_of(result.powers) }
end

--- Reads a unit expression: symbols with prefixes, * / ^ and brackets.
-- @param text string: "mm/s^2", "mV/(m/s^2)", "V/rtHz", "/min", "" (a plain number)
-- @return table: factor (fraction: what one of the unit is in base units) and
-- signature (string); or nil and the reason
-- @usage
-- local unit = require("libration.units.symbols").parse "mV/g"
-- assert(tostring(unit.factor) == "20/196133")
function M.parse(text)
  if #text > 60 then
    return nil, "the unit is too long"
  end
  for _, spelling in ipairs(spellings) do
    text = text:gsub(spelling[1], spelling[2])
  end
  local ok, unit, reason = pcall(parse, text)
  if not ok then
    if tostring(unit):find("overflow", 1, true) then
      return nil, ('the unit "%s" is beyond exact arithmetic'):format(text)
    end
    error(unit, 0) -- not ours to explain: out of memory
  end
  return unit, reason
end

local function with_power(name, halves)
  return halves == 2 and name or ("%s^%d"):format(name, halves // 2)
end

--- The base unit that a signature stands for.
-- @param signature string: as unit expressions have it
-- @return string: such as "m/s^2", "V/rtHz", "Hz", "1"; parses back
-- @usage
-- local symbols = require "libration.units.symbols"
-- assert(symbols.base_unit(symbols.parse("mg/rtHz").signature) == "m/s^2/rtHz")
function M.base_unit(signature)
  if M.preferred[signature] then
    return M.preferred[signature]
  end
  local above, below, root = {}, {}, ""
  for name, halves in signature:gmatch "(%a+):(%-?%d+)" do
    halves = tonumber(halves)
    if name == "s" and halves % 2 ~= 0 then
      root, halves = "/rtHz", halves - 1
    end
    local list = halves > 0 and above or below
    list[#list + 1] = halves ~= 0 and with_power(name, math.abs(halves)) or nil
  end
  local text = #above == 0 and "1" or table.concat(above, "*")
  for _, name in ipairs(below) do
    text = text .. "/" .. name
  end
  return text .. root
end

-- What signatures are called in messages, and how they are written.
M.kinds, M.preferred = {}, { [""] = "1", ["s:-1"] = "rtHz" }
for unit, words in pairs {
  [""] = "a plain ratio", Hz = "a frequency", s = "a time", ["S/s"] = "a sample rate",
  S = "a count of samples", V = "a voltage", A = "a current", Pa = "a pressure", N = "a force",
  m = "a length", ["m/s"] = "a speed", ["m/s^2"] = "an acceleration", strain = "a strain",
  rad = "an angle", ["rad/s"] = "an angular speed", rate = "a share of the sample rate",
  ["V/rtHz"] = "a noise density", ["m/s^2/rtHz"] = "a noise density",
  ["Pa/rtHz"] = "a noise density", ["V/(m/s^2)"] = "a sensitivity", ["V/Pa"] = "a sensitivity",
  ["V/N"] = "a sensitivity", ["V/A"] = "a sensitivity", ["V/(m/s)"] = "a sensitivity",
} do
  local signature = parse(unit).signature
  M.kinds[signature] = words
  M.preferred[signature] = M.preferred[signature] or unit
end

return M
