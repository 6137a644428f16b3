-- Digitizers: every way to say rates, filters and limits, and to get them wrong.

local lb = require "libration"
local fraction = require("libration.core").base.fraction
local inert = require "libration.inert"

local function mistakes_of(input)
  local ok, message = pcall(lb.digitizer, input)
  assert.is_false(ok)
  return message
end

-- Fields of a digitizer at 1 kS/s, for what is not about rates.
local function with(fields)
  fields.rates = { 1000 }
  return fields
end

local function filter_of(filter)
  return lb.digitizer(with { filter = filter }).filter
end

describe("a digitizer", function()
  it("says its rates by clock and divider", function()
    local rates = lb.digitizer { clock = "12.288 MHz", divider = { 128, 65535 } }.rates
    assert.same({ "divider", 128, 65535, 1, { 1 } }, { rates.kind, rates.least, rates.most,
      rates.step, rates.decimation })
    assert.equal(fraction(12288000), rates.clock)
    rates = lb.digitizer { clock = 1e6, divider = { 2, 64, 2 }, decimation = { 4, 1, 2 } }.rates
    assert.same({ 2, 64, 2, { 1, 2, 4 } }, { rates.least, rates.most, rates.step,
      rates.decimation })
    assert.equal(7, lb.digitizer { clock = "1 MHz", divider = 7 }.rates.most)
    assert.equal(9, lb.digitizer { clock = "1 MHz", divider = "3..9" }.rates.most)
  end)

  it("says its rates by list, range and loop", function()
    local rates = lb.digitizer { rates = { "48 kS/s", 44100, "96 kHz", "100/3" } }.rates
    assert.equal("list", rates.kind)
    assert.equal("100/3 44100 48000 96000", ("%s %s %s %s"):format(table.unpack(rates.rates)))
    rates = lb.digitizer { rate = "1..100 kS/s", rate_step = "10 S/s" }.rates
    assert.equal("range 1000 100000 10", ("%s %s %s %s"):format(rates.kind, rates.least, rates.most,
      rates.step))
    rates = lb.digitizer { rate = { "1 kS/s", "2 kS/s" } }.rates
    assert.same({ "range", nil }, { rates.kind, rates.step })
    assert.equal("list", lb.digitizer { rate = "8 kS/s" }.rates.kind)
    rates = lb.digitizer { clock = "10 MHz", pll = { multiply = "8..64", divide = { 1, 4 },
      after = { 4, 2 }, vco = "200..400 MHz" } }.rates
    assert.same({ "pll", 8, 64, 1, 4, { 2, 4 } }, { rates.kind, rates.multiply.least,
      rates.multiply.most, rates.divide.least, rates.divide.most, rates.after })
    assert.equal(fraction(400000000), rates.vco.most)
    rates = lb.digitizer { clock = "10 MHz", pll = { multiply = 3 } }.rates
    assert.same({ 1, 1, { 1 } }, { rates.divide.least, rates.divide.most, rates.after })
    assert.is_nil(rates.vco)
  end)

  it("has limits, range, noise and clock in plain units", function()
    local d = lb.digitizer(with { title = "logger", channels = 4, aggregate = "200 kS/s",
      memory = "4 Mi", block = 256, samples = "1024..65536", bits = 24, range = "±5 V",
      noise = "50 nV/rtHz", timebase = "25 ppm", jitter = "2 ns", skew = "1 us",
      accuracy = "0.1 dB", price = 120 })
    assert.same({ 4, 4194304, 256, { least = 1024, most = 65536 }, 24, 5, "V", 5e-8, 25e-6, 2e-9,
      1e-6, 10 ^ (0.1 / 20) - 1, 120 }, { d.channels, d.memory, d.block, d.samples, d.bits, d.range,
      d.range_unit, d.noise, d.timebase, d.jitter_s, d.skew_s, d.accuracy, d.price })
    assert.equal(fraction(200000), d.aggregate)
    d = lb.digitizer(with { range = "50 g", noise = "1 mg/rtHz" })
    assert.equal("m/s^2", d.range_unit)
    assert.is_true(math.abs(d.range - 490.3325) < 1e-12)
    assert.is_true(math.abs(d.noise - 9.80665e-3) < 1e-17)
    d = lb.digitizer(with {})
    assert.same({ 1, nil, 1, { least = 16, most = 1 << 24 }, "V", 0, 0, "none" }, { d.channels,
      d.memory, d.block, d.samples, d.range_unit, d.noise, d.flatness or 0, d.filter.shape })
  end)

  it("has a filter of any shape", function()
    assert.same({ shape = "butterworth", order = 8, corner = 0.4, corner_of_rate = true,
      flatness = 0 }, filter_of { shape = "butterworth", order = 8, corner = "0.4 rate" })
    assert.same({ shape = "bessel", order = 4, corner = 20000, corner_of_rate = false,
      flatness = 10 ^ (0.05 / 20) - 1 },
      filter_of { shape = "bessel", order = 4, corner = "20 kHz", flatness = "0.05 dB" })
    assert.same({ shape = "elliptic", order = 7, corner = 0.45, corner_of_rate = true,
      ripple_db = 0.1, stop_db = 80, flatness = 0 }, filter_of { shape = "elliptic", order = 7,
      corner = "0.45 rate", ripple = "0.1 dB", stop = "-80 dB" })
    assert.equal(0.5, filter_of { shape = "chebyshev", order = 5, corner = "1 kHz",
      ripple = 0.5 }.ripple_db)
    local points = filter_of { shape = "points",
      points = { { "1 kHz", "-0.1 dB" }, { "20 kHz", -80 } } }
    assert.same({ { at = 1000, db = -0.1 }, { at = 20000, db = -80 } }, points.points)
    assert.is_false(points.corner_of_rate)
    assert.is_true(filter_of { shape = "points", points = { { "0.5 rate", -3 } } }.corner_of_rate)
  end)

  it("keeps what was written and prints for a quick check", function()
    local d = lb.digitizer { clock = "12.288 MHz", divider = { 128, 65535 }, decimation = { 1, 2 },
      bits = 24, range = "5 V", memory = "4 Mi", timebase = "25 ppm", price = 80,
      filter = { shape = "butterworth", order = 8, corner = "0.4 rate" } }
    local again = lb.digitizer(inert.read(inert.write { d = d.source }).d)
    assert.equal(tostring(d), tostring(again))
    assert.equal(d, lb.digitizer(d))
    for _, part in ipairs { "12288000 Hz / (128..65535) / decimation 1, 2", "24 bits, range 5 V",
      "butterworth, order 8, corner 0.4 rate", "25 ppm", "memory 4194304", "80 per hour" } do
      assert.matches(part, tostring(d), 1, true)
    end
    assert.matches("10000000 Hz * (8..64) / (1) / (1)",
      tostring(lb.digitizer { clock = 1e7, pll = { multiply = "8..64" } }), 1, true)
    assert.matches("1000..2000 S/s in steps of 5 S/s",
      tostring(lb.digitizer { rate = "1..2 kS/s", rate_step = 5 }), 1, true)
  end)
end)

describe("a wrong digitizer", function()
  it("gets all mistakes in one go", function()
    local message = mistakes_of { clock = "5 V", divider = "a..b", rates = { 1 }, bits = 99,
      range = "x", filter = { shape = "buterworth", odrer = 3 }, jitter = "2 V", foo = 1,
      memory = -1, noise = "3 V", channels = 0, timebase = "3 s", price = -1 }
    for _, part in ipairs {
      "digitizer: 14 mistakes", "rates: said by divider and rates; give exactly one of: clock =",
      'clock: "5 V" is a voltage', 'divider: "a" does not begin with a number; give "1..64"',
      "bits: 99 is out of range; give at least 1 and at most 48", 'range: "x" does not begin',
      'filter.shape: "buterworth" is not one of none, butterworth',
      'filter.odrer: no such field (did you mean "order"?)', 'jitter: "2 V" is a voltage',
      "foo: no such field; fields: accuracy, aggregate", "memory: -1 is out of range",
      'noise: "3 V" is a voltage; give a noise density such as "50 nV/rtHz"',
      "channels: 0 is out of range", 'timebase: "3 s" is a time', "price: -1 is out of range",
    } do
      assert.matches(part, message, 1, true)
    end
  end)

  it("is told each mistake", function()
    local function filter(fields)
      return with { filter = fields }
    end
    local cases = {
      { "x", '"x" is not a table' }, { {}, 'rates: missing; give clock = "12.288 MHz"' },
      { { divider = 3 }, "clock: missing; divider needs the master clock" },
      { { pll = { multiply = 3 } }, "clock: missing; pll needs" },
      { { clock = 1, pll = {} }, "pll.multiply: missing" },
      { { clock = 1, pll = { multiply = 3, vco = "2..1 MHz" } }, "in order" },
      { { clock = 1, pll = { multiply = 3, vco = { 1, 2, 3 } } }, "a range has two ends" },
      { { clock = 1, pll = { multiply = 3, after = { 2, 2 } } }, "pll.after: 2 is given twice" },
      { { clock = 1, pll = { multiply = { 1, 9, 2 } } }, "no such run" },
      { with { clock = 1 }, "clock goes with divider or pll" },
      { with { decimation = { 2 } }, "decimation goes with clock and divider" },
      { with { rate_step = 1 }, "rate_step goes with a range" },
      { { rates = { 1, "1 Hz" } }, "rates: 1 is given twice" },
      { { rates = {} }, "rates: 0 items" }, { { rates = { 0 } }, "rates[1]: 0 is out of range" },
      { { rates = { "3 V" } }, "is a voltage; give a sample rate" },
      { { rate = "0..5 kS/s" }, "above 0 and in order" },
      { { clock = 1, divider = { 9, 3 } }, "divider: these numbers are no such run" },
      { { clock = 1, divider = 0 }, "divider: 0 is out of range" },
      { { clock = 1, divider = { x = 1 } }, '"x" has no place here' },
      { { clock = "1e30 Hz", divider = 1 }, "does not fit exact arithmetic" },
      { with { bits = 8 }, "range: missing; bits need a range" },
      { with { range = 0 }, "range: 0 is out of range" }, { with { range = {} }, "range: a table" },
      { with { range = "5 V rms" }, "not a peak value" },
      { with { range = "5 dB" }, "not a peak value" }, { with { noise = -1 },
        "noise: -1 is below 0" },
      { with { noise = {} }, "noise: a table is not a quantity" },
      { with { memory = 100, channels = 9 }, "memory: 100 samples are 11 a channel" },
      { with { block = 4096, samples = "16..1000" }, "block: 4096 is more than the longest" },
      { with { accuracy = "100 %" }, "accuracy: \"100 %\" is out of range" },
      { filter {}, "filter.shape: missing" }, { filter "none", '"none" is not a table' },
      { filter { shape = "none", order = 3 }, 'filter.order: shape "none" has no such field' },
      { filter { shape = "bessel", order = 3 }, 'filter.corner: missing; shape "bessel" needs' },
      { filter { shape = "bessel", order = 3, corner = "1 Hz", stop = 3 },
        'filter.stop: shape "bessel" has only order, corner' },
      { filter { shape = "bessel", order = 17, corner = "1 Hz" }, "at most 16" },
      { filter { shape = "bessel", order = 3, corner = 3 }, 'give a share of the sample rate' },
      { filter { shape = "bessel", order = 3, corner = "3 V" }, '"3 V" is neither' },
      { filter { shape = "bessel", order = 3, corner = "0 Hz" }, "is not above 0" },
      { filter { shape = "chebyshev", order = 3, corner = "1 Hz", ripple = "0 dB" }, "ripple" },
      { filter { shape = "elliptic", order = 3, corner = "1 Hz", ripple = 3, stop = 2 },
        "filter.stop: the stop band lies deeper than the ripple" },
      { filter { shape = "points" }, "filter.points: missing" },
      { filter { shape = "points", points = { { "1 Hz" } } }, 'give a point as { "1 kHz"' },
      { filter { shape = "points", points = { { "1 Hz", 0 }, { "0.1 rate", -1 } } },
        "all points in" },
      { filter { shape = "points", points = { { "2 Hz", 0 }, { "1 Hz", -1 } } },
        "from low to high" },
      { filter { shape = "points", points = { { "1 Hz", 700 } } }, "give -600 to 600 dB" },
    }
    for _, case in ipairs(cases) do
      assert.matches(case[2], mistakes_of(case[1]), 1, true)
    end
  end)
end)
