-- Demands: what the engineer's words mean, and every way to get them wrong.

local lb = require "libration"
local fraction = require("libration.core").base.fraction
local inert = require "libration.inert"

local function line_named(demand, name)
  for _, list in ipairs { demand.lines, demand.interferers } do
    for _, line in ipairs(list) do
      if line.name == name then
        return line, demand.drivers[line.driver]
      end
    end
  end
  error("no line " .. name)
end

-- A demand in volts whose lines need no more than a place.
local function brief(...)
  return { unit = "V", defaults = { amplitude = "1 V", tolerance = "1 %" }, lines = { ... } }
end

local function mistakes_of(input)
  local ok, message = pcall(lb.demand, input)
  assert.is_false(ok)
  return message
end

-- The scenario is invented for the demo.
local function skid()
  return {
    title = "Coolant pump skid, cell 4",
    lines = {
      { name = "shaft", hz = 24.6, drift = "0.1 %", amplitude = { 0.05, 2, "m/s^2" },
        tolerance = "1 %", wander = "0.02 %" },
      { name = "vane pass", of = "shaft", times = 7,
        sidebands = { by = "shaft", orders = "1..2", amplitude = "10..100 mm/s^2" } },
      { name = "rotor bar", hz = "1377.6 Hz", drift = "0.2 Hz", amplitude = "0.01..0.3 m/s^2" },
      { name = "bearing", of = "shaft", times = "7/2", drift = "0.5 %", wander = "0.1 %",
        tolerance = "5 mm/s^2", tolerance_hz = "50 ppm" },
    },
    defaults = { amplitude = "0.1..1 m/s^2", tolerance = "0.1 dB", tolerance_hz = "0.1 Hz" },
    interferers = { { name = "mains", hz = 50, drift = "0.4 %", orders = "1..20",
      amplitude = "20 mm/s^2" } },
    noise = "60 um/s^2/rtHz", sensitivity = "100 mV/g", offset = "-1 mm/s^2", averages = 4,
    coverage = 2,
  }
end

describe("a demand", function()
  it("says where lines stand and what they move with", function()
    local demand = lb.demand(skid())
    assert.equal(8, #demand.lines)
    assert.equal(20, #demand.interferers)
    assert.same({ { name = "shaft", spread = 0.001 }, { name = "rotor bar", spread = 0.2 / 1377.6 },
      { name = "mains", spread = 0.004 } }, demand.drivers)
    local expected = { -- name, Hz, driver, lock, free, wander
      { "shaft", "24.6", "shaft", 24.6, 0, 2e-4 }, { "vane pass", "172.2", "shaft", 172.2, 0,
        2e-4 },
      { "vane pass -1", "147.6", "shaft", 147.6, 0, 2e-4 },
      { "vane pass +2", "221.4", "shaft", 221.4, 0, 2e-4 },
      { "rotor bar", "1377.6", "rotor bar", 1377.6, 0, 0 },
      { "bearing", "86.1", "shaft", 86.1, 0.005 * 86.1, 0.001 },
      { "mains 20", "1000", "mains", 1000, 0, 0 },
    }
    for _, row in ipairs(expected) do
      local line, driver = line_named(demand, row[1])
      assert.equal(fraction(row[2]), line.hz)
      assert.equal(row[3], driver.name)
      assert.same({ row[4], row[5], row[6] }, { line.lock_hz, line.free_hz, line.wander })
    end
  end)

  it("turns amplitudes and tolerances into its unit", function()
    local demand = lb.demand(skid())
    assert.equal("m/s^2", demand.unit)
    local shaft, vane = line_named(demand, "shaft"), line_named(demand, "vane pass")
    local side, bearing = line_named(demand, "vane pass +1"), line_named(demand, "bearing")
    assert.same({ 0.05, 2, 0.01, 0.1 }, { shaft.least, shaft.most, shaft.tolerance,
      shaft.tolerance_hz })
    assert.equal(1 - 10 ^ (-0.1 / 20), vane.tolerance)
    assert.same({ 0.1, 1 }, { vane.least, vane.most })
    assert.same({ 0.01, 0.1 }, { side.least, side.most })
    assert.same({ nil, 0.005, 86.1 * 5e-5 }, { bearing.tolerance, bearing.tolerance_abs,
      bearing.tolerance_hz })
    local mains = line_named(demand, "mains 3")
    assert.same({ 0, 0.02 }, { mains.least, mains.most })
    assert.is_nil(mains.tolerance)
    assert.same({ 6e-5, -0.001, 4, 2 }, { demand.noise, demand.offset, demand.averages,
      demand.coverage })
    assert.is_true(math.abs(demand.sensitivity * 9.80665 - 0.1) < 1e-15)
  end)

  it("reads amplitudes in every form", function()
    local forms = {
      { { 0.05, 2, "m/s^2" }, 0.05, 2 }, { "0.05..2 m/s^2", 0.05, 2 }, { "50 mm/s^2..2 m/s^2",
        0.05, 2 },
      { { "50 mm/s^2", "2 m/s^2" }, 0.05, 2 }, { { 0.05, 2 }, 0.05, 2 }, { 0.3, 0.3, 0.3 },
      { "1 g", 9.80665, 9.80665 }, { "1..2 m/s^2 rms", math.sqrt(2), 2 * math.sqrt(2) },
      { fraction(1, 4), 0.25, 0.25 },
    }
    for _, form in ipairs(forms) do
      local demand = lb.demand { unit = "m/s^2",
        lines = { { name = "a", hz = 1, amplitude = form[1], tolerance = 0.01 } } }
      assert.same({ form[2], form[3] }, { demand.lines[1].least, demand.lines[1].most })
    end
    local in_g = lb.demand { unit = "g",
      lines = { { name = "a", hz = 1, amplitude = "9.80665 m/s^2", tolerance = "0.1 g" } } }
    assert.same({ 1, 0.1, "g" }, { in_g.lines[1].most, in_g.lines[1].tolerance_abs, in_g.unit })
  end)

  it("adds what moves independently and couples what moves together", function()
    local demand = lb.demand(brief(
      { name = "mesh", hz = 100, drift = "1 %", wander = "0.1 %",
        sidebands = { by = "cage", orders = { 2 } } },
      { name = "cage", hz = 4, drift = "5 %", wander = "1 %" },
      { name = "own", of = "mesh", times = 3, sidebands = { by = "mesh", orders = "1" } }))
    local low, high = line_named(demand, "mesh -2"), line_named(demand, "mesh +2")
    assert.equal(fraction(92), low.hz)
    assert.same({ 100, 2 * 4 * 0.05 }, { low.lock_hz, low.free_hz })
    assert.is_true(math.abs(low.wander - (100 * 0.001 + 2 * 4 * 0.01) / 92) < 1e-15)
    assert.equal(fraction(108), high.hz)
    local own = line_named(demand, "own -1")
    assert.same({ 200, 0, 0.001 }, { own.lock_hz, own.free_hz, own.wander })
  end)

  it("locks to orders, sidebands, interferers and chains, in any order", function()
    local demand = lb.demand {
      unit = "V", defaults = { amplitude = 1, tolerance = 0.01, drift = "1 %" },
      lines = {
        { name = "z", of = "y", times = "1/3" }, { name = "y", of = "x 3", times = 2 },
        { name = "x", hz = 10, orders = "1..3", sidebands = { by = "hum", orders = { 0.5 } } },
        { name = "w", of = "x 2 -0.5", times = 10 }, { name = "v", of = "hum", orders = { 1,
          "3/2" } },
        { name = "u", of = "x", times = "1/10" },
      },
      interferers = { { name = "hum", hz = 2, amplitude = "1 V" } },
    }
    local expected = { z = 20, y = 60, ["x 3"] = 30, ["x 3 +0.5"] = 31, w = 190, ["v 1"] = 2,
      ["v 1.5"] = 3, u = 1 }
    for name, hz in pairs(expected) do
      assert.equal(fraction(hz), line_named(demand, name).hz, name)
    end
    assert.equal(0.01, select(2, line_named(demand, "z")).spread)
    assert.equal(0, select(2, line_named(demand, "v 1")).spread)
  end)

  it("is exact, and says when it cannot be", function()
    local demand = lb.demand(brief({ name = "a", hz = "1/3 Hz" },
      { name = "b", of = "a", times = "0.1" }))
    assert.equal(fraction(1, 30), demand.lines[2].hz)
    assert.matches('lines[1].orders: 1000000000000000000 * 10 overflow',
      mistakes_of(brief { name = "a", hz = "1e18 Hz", orders = "1..20" }), 1, true)
  end)

  it("keeps what was written, so that it can be saved and read again", function()
    local input = skid()
    input.lines[1].hz = fraction(123, 5)
    local demand = lb.demand(input)
    local text = inert.write { demand = demand.source }
    local again = lb.demand(inert.read(text).demand)
    assert.same(demand.lines, again.lines)
    assert.equal(tostring(demand), tostring(again))
    assert.equal(text, inert.write { demand = again.source })
    assert.equal(demand, lb.demand(demand))
    input.lines[1].name = "changed"
    assert.equal("shaft", demand.source.lines[1].name)
  end)

  it("prints as a table", function()
    local text = tostring(lb.demand(skid()))
    for _, part in ipairs { "Coolant pump skid, cell 4", "vane pass -2", "0.05..2", "interferer",
      "1377.6", "1 %", "noise 6e-05 m/s^2/rtHz" } do
      assert.matches(part, text, 1, true)
    end
    for row in text:gmatch "[^\n]+" do
      assert.is_true(utf8.len(row) <= 110, row)
    end
  end)
end)

describe("a wrong demand", function()
  it("gets all mistakes in one go, with paths, values and choices", function()
    local message = mistakes_of {
      unit = "m/s^2", noise = "3 V", averages = 0, titel = "x",
      lines = {
        { name = "a", hz = "25 mV", amplitude = "2..1 m/s^2", tolerance = "1 m" },
        { name = "b", hz = 5, drift = "3 s", wander = "-1 %", amplitude = { 1, 2, "V" } },
        { hz = 5, of = "a", amplitude = 1, tolerance = 2 },
        { name = "a", of = "b", amplitude = 0, tolerance = 0.01 }, 7,
      },
      interferers = { { name = "i", hz = 5, tolerance = "1 %" } },
    }
    for _, part in ipairs {
      "demand: 19 mistakes", 'titel: no such field (did you mean "title"?)',
      "averages: 0 is out of range; give at least 1",
      'noise: "3 V" is a voltage; give a noise density',
      'lines[1].hz: "25 mV" is a voltage; give a frequency such as "24.6 Hz"',
      'lines[1].amplitude: "2..1 m/s^2": give 0 <= lo <= hi',
      'lines[1].tolerance: "1 m" is a length; give a ratio ("1 %"), decibels ("0.1 dB") or an',
      'lines[2].drift: "3 s" is a time; give a ratio', 'lines[2].wander: "-1 %": at least 0',
      'lines[2].amplitude: "1 V" is a voltage; give an acceleration',
      "lines[2]: no tolerance", "lines[3].name: missing", "lines[3].tolerance: 2 is 200 %",
      "lines[3]: give either hz", "lines[4].amplitude: 0: give 0 <= lo",
      "lines[4]: of needs times or orders", 'lines[4].name: the name "a" is taken',
      "lines[5]: 7 is not a table; fields: amplitude, drift, hz",
      "interferers[1].tolerance: no such field", "interferers[1]: no amplitude",
    } do
      assert.matches(part, message, 1, true)
    end
  end)

  it("is told each structural mistake", function()
    local cases = {
      { 5, "5 is not a table" }, { {}, "lines: missing; list the lines" },
      { { lines = {} }, "lines: 0 items" },
      { { lines = { { name = "a", hz = 1, amplitude = 1, tolerance = "1 %" } } },
        'unit: missing, and no amplitude has one; give the unit of the amplitudes, such as' },
      { { unit = "furlong", lines = { { name = "a" } } }, 'unit: unknown unit "furlong"' },
      { { unit = 5, lines = { { name = "a" } } }, "unit: 5 is not a unit" },
      { brief { name = "a", hz = 0 }, "lines[1].hz: 0 is out of range; give more than 0 Hz" },
      { brief { name = "a", hz = -3 }, "lines[1].hz: -3 is out of range" },
      { brief { name = "a", of = "b", times = 2 }, 'lines[1].of: "b" is no line or interferer' },
      { brief({ name = "shaft", hz = 1 }, { name = "a", of = "shafd", times = 2 }),
        'did you mean "shaft"?' },
      { brief { name = "a", of = "a", times = 2 }, "in a circle: a -> a" },
      { brief({ name = "a", of = "c", times = 2 }, { name = "b", of = "a", times = 2 },
        { name = "c", of = "b", orders = "1..3" }), 'lines[1].of: "c 1"' and "a -> c -> b -> a" },
      { brief({ name = "a", hz = 9, sidebands = { by = "b", orders = 1 } },
        { name = "b", of = "a +1", times = "1/9" }), "in a circle" },
      { brief({ name = "a", hz = 10, sidebands = { by = "b", orders = "1..2" } },
        { name = "b", hz = 6 }), "order -2 puts a sideband at -2 Hz" },
      { brief({ name = "a", hz = 10, sidebands = { by = "b", orders = 1 } },
        { name = "b", hz = 10 }), "at 0 Hz" },
      { brief { name = "a", hz = 10, sidebands = { by = "q", orders = 1 } },
        'lines[1].sidebands.by: "q" is no line' },
      { brief { name = "a", hz = 10, sidebands = { orders = 1 } },
        "lines[1].sidebands.by: missing" },
      { brief { name = "a", hz = 10, sidebands = { by = "a" } }, "sidebands.orders: missing" },
      { brief { name = "a", hz = 10, drift = "60 %", wander = "90 %" }, "reaches 0 Hz" },
      { brief { name = "a", hz = 10, drift = "11 Hz" }, "reaches 0 Hz" },
      { brief { name = "a", hz = 10, drift = 1 },
        "lines[1].drift: 1: at least 0, and below 100 %" },
      { brief { name = "a", hz = 10, drift = "0.1 dB" }, "drift: \"0.1 dB\" is a level in dB" },
      { brief { name = "a", hz = 10, times = 2 }, "times goes with of" },
      { brief({ name = "a", hz = 10 }, { name = "b", of = "a", times = 2, orders = "1..2" }),
        "give times or orders, not both" },
      { brief { name = "a", hz = 10, orders = { x = 1 } }, "a list of orders is" },
      { brief { name = "a", hz = 10, amplitude = { 1, 2, "V", 4 } }, "4 has no place here" },
      { brief { name = "a", hz = 10, amplitude = { 1 } }, 'give { lo, hi, "unit" }' },
      { brief { name = "a", hz = 10, amplitude = { 1, 2, 3 } }, 'give { lo, hi, "unit" }' },
      { brief { name = "a", hz = 10, amplitude = { 0, 2 } }, "least amplitude of a line" },
      { brief { name = "a", hz = 10, amplitude = 0 / 0 }, "nan is not finite" },
      { brief { name = "a", hz = 10, tolerance = "0 V" }, "a tolerance is more than 0" },
      { brief { name = "a", hz = 10, tolerance_hz = 0 }, "a tolerance is more than 0" },
      { brief { name = "a", hz = 10, tolerance_hz = "1 V" }, "is a voltage" },
      { brief { name = "a", hz = 10, tolerance = {} }, "a table is not a quantity" },
      { brief({ name = "a", hz = 10, orders = "1..1000", sidebands = { by = "a 1",
        orders = "1..1000" } }), "more than 5000 lines after expansion" },
      { brief({ name = "a", hz = 10, orders = "1..2" }, { name = "a 2", hz = 3 }),
        'the name "a 2" is taken' },
    }
    for _, case in ipairs(cases) do
      assert.matches(case[2], mistakes_of(case[1]), 1, true)
    end
  end)

  it("does not hang or crash on tables in circles or with metatables", function()
    local loop = { name = "a", hz = 1 }
    loop.lines, loop.amplitude, loop.sidebands, loop.orders = loop, loop, loop, loop
    local looped = { unit = "V", lines = { loop, loop } }
    looped.interferers, looped.defaults = looped.lines, loop
    assert.matches("lines[1].lines: no such field", mistakes_of(looped), 1, true)
    local trap = setmetatable({}, { __index = function() error "ran" end,
      __len = function() error "ran" end, __pairs = function() error "ran" end })
    assert.matches("lines: missing", mistakes_of(trap), 1, true)
    assert.matches("lines[1].name: missing", mistakes_of { unit = "V", lines = { trap } }, 1, true)
  end)
end)
