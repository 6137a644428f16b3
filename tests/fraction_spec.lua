-- Exact fractions: laws, refusals, and comparison with the rationals and
-- floats of Python (unbounded integers, correctly rounded repr and division).

local base = require("libration.core").base
local fraction = require "libration.fraction"

local f = base.fraction
local MOST, LEAST = math.maxinteger, math.mininteger

-- Integers of every size, extremes included, from a fixed seed.
local function entropic_integers(seed)
  math.randomseed(seed)
  local extremes = { 0, 1, -1, 2, 10, MOST, MOST - 1, LEAST + 1, LEAST, 2 ^ 32 // 1 | 0 }
  return function()
    if math.random() < 0.1 then
      return extremes[math.random(#extremes)]
    end
    local value = math.random(0) >> math.random(0, 63)
    return math.random() < 0.5 and value or -value
  end
end

-- Runs a Python program over input lines and returns its output lines.
local function python(program, input)
  local names = { os.tmpname(), os.tmpname() }
  for i, text in ipairs { program, table.concat(input, "\n") .. "\n" } do
    local file = assert(io.open(names[i], "w"))
    assert(file:write(text))
    assert(file:close())
  end
  local pipe = assert(io.popen("/usr/bin/python3 " .. names[1] .. " < " .. names[2]))
  local lines = {}
  for line in pipe:lines() do
    lines[#lines + 1] = line
  end
  assert(pipe:close())
  os.remove(names[1])
  os.remove(names[2])
  return lines
end

local function attempt(operation, a, b)
  local ok, result = pcall(operation, a, b)
  if not ok then
    assert(result:find "overflow" or result:find "division by zero", result)
    return "refused"
  end
  return tostring(result)
end

local operations = {
  add = function(a, b) return a + b end,
  sub = function(a, b) return a - b end,
  mul = function(a, b) return a * b end,
  div = function(a, b) return a / b end,
  gcd = base.fraction_gcd,
  less = function(a, b) return a < b end,
  equal = function(a, b) return a == b end,
}

describe("fractions", function()
  it("mean the shortest decimal of a number", function()
    assert.equal("3/10", tostring(f(0.3)))
    assert.equal("123/5", tostring(f(24.6)))
    assert.equal("1/10000000", tostring(f(1e-7)))
    assert.equal(tostring(MOST), tostring(f(MOST)))
    assert.equal("7500000000000001/25000000000000000", tostring(f(0.1 + 0.2) / 1))
  end)

  it("read text exactly", function()
    local cases = {
      ["1/3"] = "1/3", ["12.288e6"] = "12288000", ["0.1"] = "1/10", ["-.5"] = "-1/2",
      ["5."] = "5", ["1.5/3"] = "1/2", ["+7/2"] = "7/2", ["1e-18"] = "1/1000000000000000000",
      ["0.10000000000000000000000000000000000000000000000000"] = "1/10",
      ["0.000000000001818989403545856475830078125"] = "1/549755813888", -- 2^-39
      ["000123"] = "123", ["-9223372036854775808"] = "-9223372036854775808", ["0e99999"] = "0",
    }
    for text, expected in pairs(cases) do
      assert.equal(expected, tostring(f(text)), text)
    end
  end)

  it("refuse what is no number, does not fit or is not finite", function()
    local cases = {
      { "", "format" }, { "1,5", "format" }, { "0x10", "format" }, { "1/2/3", "format" },
      { "1/", "format" }, { "/2", "format" }, { " 1", "format" }, { "1e", "format" },
      { ".", "format" }, { "nan", "format" }, { "inf", "format" }, { "1\0", "format" },
      { {}, "format" }, { true, "format" }, { print, "format" },
      { "1e19", "overflow" }, { "1e-19", "overflow" }, { "1e999999999999", "overflow" },
      { "1e-999999999999", "overflow" }, { 1e19, "overflow" }, { 5e-324, "overflow" },
      { ("7"):rep(4000), "overflow" }, { "0." .. ("3"):rep(60), "overflow" },
      { "1/0", "domain" }, { 1 / 0, "domain" }, { 0 / 0, "domain" }, { -1 / 0, "domain" },
    }
    for _, case in ipairs(cases) do
      local value, message, code = base.try_fraction(case[1])
      assert.is_nil(value)
      assert.equal(case[2], code, tostring(case[1]))
      assert.is_string(message)
      assert.has_error(function() f(case[1]) end)
    end
  end)

  it("say what overflowed or was divided by zero", function()
    local _, message = pcall(function() return f(MOST) + 1 end)
    assert.matches("overflow: 9223372036854775807 %+ 1 ", message)
    _, message = pcall(function() return f(7, 2) / 0 end)
    assert.matches("division by zero: 7/2 / 0", message)
    assert.has_error(function() return -f(LEAST) end)
    assert.has_error(function() return f(1) + {} end)
  end)

  it("report overflow only when the reduced result does not fit", function()
    assert.equal("1", tostring(f(MOST, 3) * f(3, MOST)))
    assert.equal(tostring(MOST), tostring(f(MOST, 2) + f(MOST, 2)))
    assert.equal("1", tostring(f(LEAST) / f(LEAST)))
    assert.equal(tostring(LEAST), tostring(f(LEAST, 3) * 3))
  end)

  it("agree with unbounded integers on random operands", function()
    local draw = entropic_integers(20260512)
    local names, input, mine = { "add", "sub", "mul", "div", "gcd", "less", "equal" }, {}, {}
    for i = 1, 4000 do
      local numbers = { draw(), draw(), draw(), draw() }
      local ok, a, b = pcall(function()
        return f(numbers[1], numbers[2]), f(numbers[3], numbers[4])
      end)
      if ok then
        local name = names[i % #names + 1]
        input[#input + 1] = name .. " " .. tostring(a) .. " " .. tostring(b)
        mine[#mine + 1] = attempt(operations[name], a, b)
      end
    end
    local theirs = python([[
import sys
from fractions import Fraction
from math import gcd
for line in sys.stdin:
    name, a, b = line.split()
    a, b = Fraction(a), Fraction(b)
    if name in ("less", "equal"):
        print(str(a < b if name == "less" else a == b).lower()); continue
    if name == "div" and b == 0:
        print("refused"); continue
    r = {"add": lambda: a + b, "sub": lambda: a - b, "mul": lambda: a * b, "div": lambda: a / b,
         "gcd": lambda: Fraction(gcd(a.numerator * b.denominator, b.numerator * a.denominator),
                                 a.denominator * b.denominator)}[name]()
    fits = -2**63 <= r.numerator < 2**63 and r.denominator < 2**63
    print(r if fits else "refused")
]], input)
    assert.is_true(#mine > 3000)
    for i, line in ipairs(theirs) do
      assert.equal(line, mine[i], input[i])
    end
  end)

  it("round to the nearest double, floor and round like unbounded integers", function()
    local draw = entropic_integers(77)
    local input, mine = {}, {}
    for _ = 1, 2000 do
      local ok, a = pcall(f, draw(), draw())
      if ok then
        input[#input + 1] = tostring(a)
        mine[#mine + 1] = ("%a %d %d"):format(a:number(), a:floor(), a:round())
      end
    end
    local theirs = python([[
import sys
from fractions import Fraction
from math import floor
for line in sys.stdin:
    a = Fraction(line)
    r = floor(abs(a) + Fraction(1, 2))
    print(float(a).hex(), floor(a), r if a > 0 else -r)
]], input)
    for i, line in ipairs(theirs) do
      local hex, floor, round = line:match "(%S+) (%S+) (%S+)"
      local expected = ("%a %s %s"):format(tonumber(hex), floor, round)
      assert.equal(expected, mine[i], input[i])
    end
  end)

  it("add and multiply lawfully", function()
    math.randomseed(5)
    local function draw()
      return f(math.random(-10000, 10000), math.random(1, 999))
    end
    for _ = 1, 300 do
      local a, b, c = draw(), draw(), draw()
      assert.equal(a + b, b + a)
      assert.equal((a + b) + c, a + (b + c))
      assert.equal(a * (b + c), a * b + a * c)
      assert.equal(f(0), a - a)
      assert.equal(a < b, not (b <= a))
    end
  end)

  it("compare with numbers and texts, but equal only fractions", function()
    assert.is_true(f(7, 2) < 3.6 and 3.4 < f(7, 2) and f(7, 2) <= "7/2" and f(1, 3) > 0.3333)
    assert.is_false(f(1, 2) == 0.5)
    assert.equal(f(5, 6), f(1, 2) + "1/3")
    assert.equal(f(3, 2), 0.5 + f(1))
    assert.is_true(base.is_fraction(f(1)) and not base.is_fraction {})
    assert.has_error(function() return f(1) < {} end)
    assert.has_error(function() return f(1).number(5, 6) < "x" end)
  end)

  it("write decimals that read back", function()
    assert.equal("24.6", fraction.decimal "123/5")
    assert.equal("-0.5", fraction.decimal(f(-1, 2)))
    assert.equal("-9223372036854775808", fraction.decimal(f(LEAST)))
    assert.is_nil(fraction.decimal "1/3")
    for _, text in ipairs { "-7/8", "1/3", "12288000", "1/1000000000000000000", "-3" } do
      assert.equal(f(text), f(fraction.text(text)))
    end
    assert.equal(f(1, 5), fraction.gcd { 24.6, 172.2, 50 })
  end)
end)

describe("numbers as text", function()
  it("are the shortest that read back bit for bit", function()
    math.randomseed(99)
    local input, mine = {}, {}
    for i = 1, 3000 do
      local x = ("d"):unpack(("j"):pack(math.random(0)))
      if i % 5 == 0 then
        x = 2.0 ^ (i % 1000 - 500)
      end
      if x == x and x ~= math.huge and x ~= -math.huge then
        local text = base.number_text(x)
        assert.equal(("%a"):format(x), ("%a"):format(base.number_read(text)))
        input[#input + 1] = ("%a"):format(x)
        mine[#mine + 1] = text
      end
    end
    local theirs = python([[
import sys
for line in sys.stdin:
    digits = repr(float.fromhex(line)).split("e")[0]
    print(len("".join(c for c in digits if c.isdigit()).strip("0")))
]], input)
    for i, line in ipairs(theirs) do
      local digits = mine[i]:gsub("e.*", ""):gsub("%D", ""):gsub("^0+", ""):gsub("0+$", "")
      assert.equal(tonumber(line), #digits, mine[i])
    end
  end)

  it("do not mistake long floats for integers", function()
    assert.equal("3.602879701896397e+16", base.number_text(2.0 ^ 55))
    assert.equal("-0", base.number_text(-0.0))
    assert.equal("9007199254740993", base.number_text(9007199254740993))
  end)

  it("refuse what is not a plain decimal", function()
    for _, text in ipairs { "", "1,5", "0x1p3", "inf", "nan", " 1", "1 ", "1e", "--1", "1\0" } do
      local value, _, code = base.number_read(text)
      assert.is_nil(value)
      assert.equal("format", code)
    end
    assert.equal("overflow", select(3, base.number_read "1e999"))
    assert.equal("overflow", select(3, base.number_read(("1"):rep(500))))
    assert.equal(0, base.number_read "1e-999")
  end)

  it("are the same under a locale with a decimal comma", function()
    -- built from the system's own locale sources into a directory that goes away
    local dir = os.tmpname()
    os.remove(dir)
    local script = os.tmpname()
    local file = assert(io.open(script, "w"))
    assert(file:write [[
assert(os.setlocale "de_DE.UTF-8", "the locale is not there")
assert(string.format("%.1f", 0.5) == "0,5", "the locale has no comma")
local base = require("libration.core").base
assert(base.number_text(0.1) == "0.1" and base.number_text(1.5e-300) == "1.5e-300")
assert(base.number_read "1.5" == 1.5 and base.number_read "1,5" == nil)
assert(tostring(base.fraction(24.6)) == "123/5")
assert(tostring(base.fraction "0.3") == "3/10" and base.fraction(1, 3):number() == 1 / 3)
local lb, inert = require "libration", require "libration.inert"
assert(tostring(lb.units.hz "24.6 Hz") == "123/5" and lb.units.text(0.25) == "0.25")
assert(inert.read("x = 1.5").x == 1.5 and inert.write { x = 1.5 } == "x = 1.5\n")
local demand = lb.demand { unit = "V", lines = { { name = "a", hz = 24.6, drift = "0.1 %",
  amplitude = { 0.5, 1.5 }, tolerance = 0.015 } } }
assert(not tostring(demand):find "%d,%d" and tostring(demand):find("0.5..1.5", 1, true))
print "same"
]])
    assert(file:close())
    local command = ("mkdir -p %s && localedef -i de_DE -f UTF-8 %s/de_DE.UTF-8 2>/dev/null; "
      .. "LOCPATH=%s lua5.4 %s 2>&1; rm -rf %s %s"):format(dir, dir, dir, script, dir, script)
    local pipe = assert(io.popen(command))
    local said = pipe:read "a"
    pipe:close()
    assert.equal("same\n", said)
  end)
end)

describe("the content hash", function()
  -- FIPS PUB 180-4 example messages (NIST, "Examples with Intermediate Values",
  -- SHA-256): one block, two blocks; and the empty message.
  it("gives the published digests", function()
    assert.equal("ba7816bf8f01cfea414140de5dae2223b00361a396177a9cb410ff61f20015ad",
      base.sha256 "abc")
    assert.equal("248d6a61d20638b8e5c026930c3e6039a33ce45964ff2167f6ecedd419db06c1",
      base.sha256 "abcdbcdecdefdefgefghfghighijhijkijkljklmklmnlmnomnopnopq")
    assert.equal("e3b0c44298fc1c149afbf4c8996fb92427ae41e4649b934ca495991b7852b855",
      base.sha256 "")
  end)

  it("agrees with another implementation at every length around a block", function()
    local input, mine = {}, {}
    for n = 1, 200 do
      input[n] = ("%d"):format(n)
      mine[n] = base.sha256(("a\200"):rep(n):sub(1, n))
    end
    local theirs = python([[
import sys, hashlib
for line in sys.stdin:
    n = int(line)
    print(hashlib.sha256((b"a\xc8" * n)[:n]).hexdigest())
]], input)
    assert.same(theirs, mine)
  end)
end)
