-- Measuring records by hand-made plans: conformity, amplitudes, uncertainties.
local core = require "libration.core"
local fraction = require "libration.fraction"
local measure = require "libration.measure"
local record = require "libration.record"

local RATE, N = 1000, 1000

-- A plan as lb.plan makes it, reduced to what a measurement looks at.
local function plan(changes)
  local out = {
    rate = fraction.new(RATE), samples = N, averages = 1, identity = "0123456789abcdef",
    window = { name = "hann" },
    demand = { unit = "m/s^2", coverage = 3 },
    front = { range = 10, step = 20 / 2 ^ 16 },
    lines = { { name = "shaft", hz = fraction.new(50) },
              { name = "vane", hz = fraction.new(120) } },
    claims = {
      { own = 0.01, others = 0.002, sigma = 0.001, hz = 0.05, sigma_hz = 0.01, f_lo = 49,
        f_hi = 51, gain = 1 },
      { own = 0.02, others = 0, sigma = 0, f_lo = 120, f_hi = 120, gain = 0.5 },
    },
  }
  for key, value in pairs(changes or {}) do out[key] = value end
  return out
end

local function samples(n, change)
  local x = {}
  for i = 0, n - 1 do
    local t = (i - (N - 1) / 2) / RATE
    x[i + 1] = 2 * math.cos(2 * math.pi * 50.25 * t + 0.5) + math.cos(2 * math.pi * 120 * t)
  end
  if change then change(x) end
  return core.samples.from(x)
end

local function make(changes)
  local spec = { rate = RATE, samples = samples(N), unit = "m/s^2" }
  for key, value in pairs(changes or {}) do spec[key] = value end
  return record.new(spec)
end

describe("a measurement", function()
  it("reads every line by the plan", function()
    local m = assert(make():measure(plan()))
    local shaft, vane = m.lines[1], m.lines[2]
    assert.is_true(math.abs(shaft.amplitude - 2) < 1e-5)
    assert.is_true(math.abs(shaft.hz - 50.25) < 1e-4)
    assert.is_true(math.abs(shaft.phase - 0.5) < 1e-4)
    assert.is_true(math.abs(vane.amplitude - 1 / 0.5) < 1e-5)
    assert.are.equal(120, vane.hz)
    assert.is_nil(vane.hz_bound)
    assert.are.equal("m/s^2", m.unit)
    assert.is_true(shaft.tracked and not vane.tracked)
  end)

  it("states the worst case and a budget in the manner of JCGM 100:2008", function()
    local shaft = make():measure(plan()).lines[1]
    -- The largest true amplitude that can read a is (a + others) / (1 - own).
    local own = 0.01 * (shaft.amplitude + 0.002) / 0.99
    assert.is_true(math.abs(shaft.systematic - own - 0.002) < 1e-15)
    assert.is_true(math.abs(shaft.bound - own - 0.002 - 3 * 0.001) < 1e-15)
    -- 4.3.7: a rectangular distribution of half-width a has a^2 / 3; 5.1.2: sum of squares.
    local standard = (own ^ 2 / 3 + 0.002 ^ 2 / 3 + 0.001 ^ 2) ^ 0.5
    assert.is_true(math.abs(shaft.standard - standard) < 1e-15)
    assert.are.equal(2 * shaft.standard, shaft.expanded)
    assert.is_true(math.abs(shaft.hz_bound - 0.08) < 1e-15)
  end)

  it("averages consecutive records", function()
    local x, sum = samples(4 * N), 0
    local long = make { samples = x }
    local one, four = plan(), plan { averages = 4 }
    for k = 0, 3 do
      local part = {}
      for i = 1, N do part[i] = x[k * N + i] end
      sum = sum + make({ samples = core.samples.from(part) }):measure(one).lines[1].amplitude
    end
    local m = long:measure(four)
    assert.is_true(math.abs(m.lines[1].amplitude - sum / 4) < 1e-14)
    assert.are.equal(0.0005, m.lines[1].random)
  end)

  it("reads calibrated codes and a chosen channel", function()
    local codes, silence = {}, {}
    for i = 1, N do
      codes[i] = math.floor(6553.6 * math.cos(2 * math.pi * 50 * (i - 1) / RATE) + 0.5)
      silence[i] = 0
    end
    local both = record.new { rate = RATE, channels = {
      { codes = silence, bits = 16, full_scale = "10 m/s^2", unit = "m/s^2" },
      { codes = codes, bits = 16, full_scale = "10 m/s^2", unit = "m/s^2" },
    } }
    local m = assert(both:measure(plan(), { channel = 2 }))
    assert.is_true(math.abs(m.lines[1].amplitude - 2) < 1e-4)
    assert.are.equal(2, m.channel)
    local none, message, code = both:measure(plan())
    assert.is_nil(none)
    assert.are.equal("which_channel", code)
    assert.matches("it has 2 channels; say which", message)
  end)

  it("prints as a table", function()
    local text = tostring(make():measure(plan()))
    local head = "Measured by plan 0123456789ab: 1000 S/s, 1000 samples, 1 average, unit m/s"
    assert.matches(head, text)
    assert.matches("shaft +2%.000 +0%.025 +0%.012 +0%.024", text)
    assert.matches("50%.250 %+%- 0%.08", text)
    assert.matches("120 %(bin%)", text)
  end)
end)

describe("a record that breaks its plan", function()
  local function refused(code, rec, given, options)
    local m, message, got = rec:measure(given or plan(), options)
    assert.is_nil(m)
    assert.are.equal(code, got)
    assert.matches("^the record breaks its plan: ", message)
    return message
  end

  it("is refused with the reason", function()
    assert.matches("sampled at 8000 S/s, the plan says 1000",
      refused("wrong_rate", make { rate = 8000 }))
    assert.matches("has 1000 samples, the plan needs 2000",
      refused("too_short", make(), plan { averages = 2 }))
    assert.matches("unit is V, the demand's is m/s", refused("wrong_unit", make { unit = "V" }))
    refused("wrong_channel", make(), nil, { channel = 2 })
  end)

  it("is refused when clipped, by its own full scale or the digitizer's range", function()
    local function clip(x) x[500] = 10 end
    assert.matches("1 samples stand at the rails, the first is number 500",
      refused("clipped", make { samples = samples(N, clip) }))
    refused("clipped", make { samples = samples(N), full_scale = "2 m/s^2" })
    assert.is_truthy(make({ samples = samples(N) }):measure(plan { front = {} }))
  end)

  it("is refused when a sample is no number", function()
    for _, bad in ipairs { 0 / 0, math.huge, -math.huge } do
      local rec = make { samples = samples(N, function(x) x[7] = bad end) }
      assert.matches("1 samples are not finite", refused("not_finite", rec))
    end
  end)

  it("does not stop misuse from raising", function()
    assert.has_error(function() make():measure(plan(), { chanel = 1 }) end,
      "measure: unknown option chanel; valid are channel, first")
    for _, bad in ipairs { 0, 1.5, "x" } do
      assert.has_error(function() make():measure(plan(), { first = bad }) end,
        "measure: first is " .. tostring(bad) .. "; it is a sample number, 1 or more")
    end
  end)
end)

describe("a longer record", function()
  -- Silence, then the lines, then a sample at the rails.
  local function long()
    local x, lines = {}, samples(N)
    for i = 1, 300 do x[i] = 0 end
    for i = 1, N do x[300 + i] = lines[i] end
    x[N + 301] = 10
    return make { samples = core.samples.from(x) }
  end

  it("is read from the sample asked for, and says which were read", function()
    local m, alone = assert(long():measure(plan(), { first = 301 })), make():measure(plan())
    assert.are.equal(alone.lines[1].amplitude, m.lines[1].amplitude)
    assert.are.equal(alone.lines[1].hz, m.lines[1].hz)
    assert.are.same({ 301, N + 300, N + 301 }, { m.first, m.last, m.recorded })
    assert.matches("Read: samples 301..1300 of 1301\n", tostring(m))
    assert.matches("Read: samples 1..1000 of 1301\n", tostring(long():measure(plan())))
  end)

  it("is refused where too few samples follow, or those that follow are clipped", function()
    local none, message, code = long():measure(plan(), { first = 303 })
    assert.are.equal("too_short", code)
    assert.is_nil(none)
    assert.matches("has 1301 samples, 999 of them from number 303 on, the plan needs 1000", message)
    none, message, code = long():measure(plan(), { first = 302 })
    assert.are.equal("clipped", code)
    assert.is_nil(none)
    assert.matches("the first is number 1301", message)
    assert.are.equal("too_short", select(3, long():measure(plan(), { first = 5000 })))
  end)
end)

describe("a record without its line", function()
  local function demanded()
    local out = plan()
    out.lines[1].least, out.lines[1].most = 1, 3
    return out
  end

  it("is marked: outside the demand, and at the edge of the interval searched", function()
    local silence = samples(N) * 0
    local m = assert(make({ samples = silence }):measure(demanded()))
    assert.is_true(m.lines[1].outside and m.lines[1].at_edge)
    assert.is_false(m.holds)
    assert.matches("shaft[^\n]*%(edge%)  %(%*%)", tostring(m))
    assert.matches("there may be no line", tostring(m))
    -- The skirt of a line beyond the interval rises towards its end.
    local beside = plan()
    beside.claims[1].f_lo, beside.claims[1].f_hi = 47, 50.2
    m = assert(make():measure(beside))
    assert.is_true(m.lines[1].at_edge)
    assert.are.equal(50.2, m.lines[1].hz)
  end)

  it("is not what a record with its line is", function()
    local m = assert(make():measure(demanded()))
    assert.is_true(m.holds)
    assert.is_false(m.lines[1].outside or m.lines[1].at_edge or m.lines[2].at_edge)
    assert.is_nil(tostring(m):find("edge", 1, true))
  end)
end)

describe("the check of a record", function()
  it("gives channel and values", function()
    local channel, values = measure.check(make(), plan())
    assert.are.equal(1, channel)
    assert.are.equal(N, #values)
  end)
end)
