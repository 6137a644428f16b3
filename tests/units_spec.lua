-- Quantities: exact values, conversions, and reasons that name what was given
-- and what was expected.

local base = require("libration.core").base
local units = require "libration.units"
local symbols = require "libration.units.symbols"

-- Every reader that refuses gives a reason; returns it.
local function reason_of(reader, ...)
  local value, reason = reader(...)
  assert.is_nil(value)
  assert.is_string(reason)
  return reason
end

describe("quantities", function()
  it("are exact", function()
    local cases = {
      { "12.288 MHz", "Hz", "12288000" }, { "1/3 Hz", "Hz", "1/3" }, { "1500 /min", "Hz", "25" },
      { "1500 r/min", "Hz", "25" }, { "1490 rpm", "Hz", "149/6" }, { "25 ppm", "1", "1/40000" },
      { "2 %", "1", "1/50" }, { "2%", "1", "1/50" }, { "100 mV/g", "V/g", "1/10" },
      { "100 mV/g", "V/(m/s^2)", "2000/196133" }, { "1 g", "m/s^2", "196133/20000" },
      { "60 um/s^2/rtHz", "m/s^2/rtHz", "3/50000" }, { "60 µm/s²/√Hz", "m/s^2/rtHz", "3/50000" },
      { "60 μm/s^2/sqrt(Hz)", "m/s^2/rtHz", "3/50000" }, { "20 mm/s^2", "m/s^2", "1/50" },
      { "0.4 rate", "rate", "2/5" }, { "60 s", "s", "60" }, { "2 ns", "s", "1/500000000" },
      { "1.5 h", "min", "90" }, { "5 V", "mV", "5000" }, { "−3 kPa", "Pa", "-3000" },
      { "51.2 kS/s", "S/s", "51200" }, { "200 ustrain", "strain", "1/5000" },
      { "3 mrad/s", "rad/s", "3/1000" }, { "7/2", "1", "7/2" }, { ".5 mm", "m", "1/2000" },
      { "1e-3 kN", "N", "1" }, { "10 nA/rtHz", "A/rtHz", "1/100000000" }, { "5. V", "V", "5" },
    }
    for _, case in ipairs(cases) do
      local value, reason = units.exact(case[1], case[2])
      assert.equal(case[3], tostring(value or reason), case[1])
      assert.equal(value:number(), units.number(case[1], case[2]))
    end
  end)

  it("are numbers of the unit asked for when they are bare", function()
    assert.equal("123/5", tostring(units.hz(24.6)))
    assert.equal("123/5", tostring(units.hz "24.6"))
    assert.equal("1/3", tostring(units.hz(base.fraction(1, 3))))
    assert.equal(5.0, units.number("5", "mV"))
    assert.equal(1e-300, units.number(1e-300, "V"))
    assert.equal(1e-15, units.number("1 fV", "V"))
  end)

  it("keep a double where a fraction does not fit", function()
    assert.is_true(math.abs(units.number("1e-20 uV", "V") / 1e-26 - 1) < 4e-16)
    assert.matches("exact arithmetic", reason_of(units.exact, "1e-20 uV", "V"))
    assert.matches("beyond the range", reason_of(units.number, "1e308 GV", "V"))
  end)

  it("say what was given and what was expected", function()
    assert.equal('"25 mV" is a voltage; give a frequency such as "24.6 Hz"',
      reason_of(units.hz, "25 mV"))
    local cases = {
      { units.hz, "24,6 Hz", "decimal comma; write a decimal point" },
      { units.hz, "fast", "does not begin with a number; give a frequency" },
      { units.hz, {}, "a table is not a quantity" }, { units.hz, true, "true is not a quantity" },
      { units.hz, "12 foo", 'unknown unit "foo"' }, { units.hz, "1 kg", 'unknown unit "kg"' },
      { units.hz, 0 / 0, "nan is not finite" }, { units.hz, math.huge, "inf is not finite" },
      { units.hz, "1/0 Hz", "not finite" }, { units.hz, "1 Hz rms", 'only an amplitude is "rms"' },
      { units.hz, "-3 dB", "is a level in dB; give a frequency" },
      { units.hz, "1 (Hz", "bracket is not closed" }, { units.hz, "1 ((((((Hz))))))", "brackets" },
      { units.hz, "1 Tm^9", "beyond exact arithmetic" }, { units.hz, "1 Hz^", "unknown unit" },
      { units.hz, "1 " .. ("m*"):rep(50) .. "m", "the unit is too long" },
      { units.seconds, "3 m", "is a length; give a time" }, { units.rate, "3 V", "a sample rate" },
      { units.relative, "1 m", "is a length; give a ratio" },
      { units.db, "-80 V", "is a voltage; give a level" }, { units.db, "x", "give a level" },
      { units.db, {}, "a table is not a level" }, { units.db, 0 / 0, "not finite" },
      { units.count, "4.5", "not whole" }, { units.count, 4.5, "9/2 is not whole" },
      { units.count, "4 V", "is a voltage; give a whole number" },
      { units.count, "300 %", "not whole" },
      { units.orders, "0..3", "positive" }, { units.orders, "20..1", "not a range" },
      { units.orders, "1..99999999999", "not a range" }, { units.orders, {}, "no orders" },
      { units.orders, "1..2, 2", "given once" }, { units.orders, "one", "begin with a number" },
      { units.orders, { "1..900", "901..1800" }, "too many orders" },
      { units.orders, "-1", "positive" }, { units.base, "foo", "unknown unit" },
    }
    for _, case in ipairs(cases) do
      assert.matches(case[3], reason_of(case[1], case[2]), 1, true)
    end
    assert.matches("give an acceleration", reason_of(units.amplitude, "20 V", "m/s^2"))
  end)

  it("take amplitudes as peak unless they say rms", function()
    assert.equal(0.02, units.amplitude("20 mm/s^2", "m/s^2"))
    assert.equal(0.02, units.amplitude("20 mm/s^2 peak", "m/s^2"))
    assert.equal(2 * math.sqrt(2), units.amplitude("2 m/s^2 rms", "m/s^2"))
    assert.equal(0.3, units.amplitude(0.3, "m/s^2"))
    assert.equal(9.80665, units.amplitude("1 g", "m/s^2"))
  end)

  it("turn decibels into the side that is safe", function()
    -- by the definition of the level, 20 lg (1 + x)
    local inside, outside = units.relative "0.1 dB", units.relative("0.1 dB", "outside")
    assert.is_true(math.abs(20 * math.log(1 - inside, 10) + 0.1) < 1e-12)
    assert.is_true(math.abs(20 * math.log(1 + outside, 10) - 0.1) < 1e-12)
    assert.is_true(inside < outside)
    assert.equal(0.02, units.relative "± 2 %")
    assert.equal(-80.0, units.db "-80 dB")
    assert.equal(-80.0, units.db(-80))
  end)

  it("count, with binary prefixes", function()
    assert.equal(4194304, units.count "4 Mi")
    assert.equal(65536, units.count "64 KiS")
    assert.equal(2 ^ 20 // 1 | 0, units.count(2.0 ^ 20))
    assert.equal("integer", math.type(units.count "1e3"))
  end)

  it("split ranges and orders", function()
    assert.same({ "0.05 m/s^2", "2 m/s^2" }, { units.range "0.05..2 m/s^2" })
    assert.same({ "1 Hz", "2 kHz" }, { units.range " 1 Hz .. 2 kHz " })
    assert.same({ "0.05 V rms", "2 V rms" }, { units.range "0.05..2 V rms" })
    assert.is_nil(units.range "5 V")
    local texts = {}
    for i, order in ipairs(units.orders "1..3, 7/2, 0.5") do
      texts[i] = tostring(order)
    end
    assert.equal("1 2 3 7/2 1/2", table.concat(texts, " "))
    assert.equal(20, #units.orders "1..20")
    assert.equal("4", tostring(units.orders({ 1, "3..4" })[3]))
    assert.equal(1, #units.orders(7))
  end)

  it("have base units that read back as themselves", function()
    for _, text in ipairs { "Hz", "mV/g", "m/s^2/rtHz", "rtHz", "V*s/m^2", "N/rad", "1", "S/s",
      "A^3/V/rtHz", "rate", "1/m", "strain*Pa" } do
      local unit = assert(symbols.parse(text))
      local again = assert(symbols.parse(symbols.base_unit(unit.signature)))
      assert.equal(unit.signature, again.signature, text)
      assert.equal("1", tostring(again.factor))
      assert.is_string(symbols.kind(unit.signature))
    end
  end)

  it("are those that the README lists", function()
    local file = assert(io.open("README.md"))
    local list, ratios = file:read("a"):match("\nUnits: (.-), their products"
      .. ".-\nratios are in (.-)%. An")
    file:close()
    local count = 0
    for name in (list:gsub("%b()", "") .. ", " .. ratios:gsub(" or ", ", ")):gmatch "[^,%s]+" do
      assert(units.parse("1 " .. name), name)
      count = count + 1
    end
    assert.is_true(count > 15)
  end)
end)
