-- What a digitizer can do: rates of every kind, lengths, memory, channels; and
-- deliberate undersampling. Digitizers and demands here are invented.
local lb = require "libration"
local fraction = lb.fraction

local function demand(lines, more)
  local t = { unit = "V", lines = {} }
  for i, hz in ipairs(lines) do
    t.lines[i] = { name = "line " .. i, hz = hz, amplitude = "1 V", tolerance = "1 %" }
  end
  for key, value in pairs(more or {}) do t[key] = value end
  return lb.demand(t)
end

local tone = demand { 99.7 }
local noisy = demand({ 99.7 }, { noise = "5 mV/rtHz" })

local function plan(digitizer, options, what)
  return assert(lb.plan(what or tone, lb.digitizer(digitizer), options))
end

describe("a rate", function()
  it("of a divided clock is clock / divider, exactly", function()
    local p = plan { clock = "1 MHz", divider = { 30, 900 } }
    assert.are.equal(fraction.new(1000000) / p.setting.divider, p.rate)
    assert.is_true(p.setting.divider >= 30 and p.setting.divider <= 900)
  end)

  it("keeps to the step of the dividers", function()
    local p = plan({ clock = "1 MHz", divider = { 300, 900, 250 } }, nil, noisy)
    assert.is_true(({ [300] = true, [550] = true, [800] = true })[p.setting.divider])
  end)

  it("is decimated by one of the steps", function()
    local p = plan { clock = "1 MHz", divider = "10..20", decimation = { 16, 64 } }
    assert.is_true(p.setting.decimation == 16 or p.setting.decimation == 64)
    assert.are.equal(fraction.new(1000000) / (p.setting.divider * p.setting.decimation), p.rate)
  end)

  it("of a list is one of the list", function()
    local p = plan { rates = { "1 kS/s", "44.1 kS/s", fraction.new(8000, 3) } }
    local found = false
    for _, rate in ipairs(p.digitizer.rates.rates) do
      found = found or rate == p.rate
    end
    assert.is_true(found and next(p.setting) == nil)
  end)

  it("of a range with a step stands on a step", function()
    local p = plan { rate = "1..2 kS/s", rate_step = "7 S/s" }
    assert.are.equal(1, ((p.rate - fraction.new(1000)) / 7).denominator)
    assert.is_true(p.rate <= fraction.new(2000))
  end)

  it("of a range without a step lies within it", function()
    local p = plan { rate = "1..2 kS/s" }
    assert.is_true(p.rate >= fraction.new(1000) and p.rate <= fraction.new(2000))
  end)

  it("of a range without a step may be coherent where no round one is", function()
    local two = lb.demand { unit = "V", lines = {
      { name = "a", hz = 97, amplitude = "1 V", tolerance = "1 ppm" },
      { name = "b", hz = 131, amplitude = "1 V", tolerance = "1 ppm" } } }
    local p = plan({ rate = "1..2 kS/s" }, { windows = "rectangular", readings = "bin" }, two)
    assert.are.equal("1", tostring(fraction.new(p.samples) / p.rate))
  end)

  it("of a multiplied clock keeps the oscillator inside its limits", function()
    local pll = { clock = "10 MHz", pll = { multiply = "8..64", divide = "1..4",
      after = { 1000, 2000 }, vco = "100..300 MHz" } }
    for _, options in ipairs { {}, { share = "20 %" }, { windows = "hann" } } do
      local p = plan(pll, options)
      local s = p.setting
      local vco = fraction.new(10000000) * s.multiply / s.divide
      assert.is_true(vco >= 100000000 and vco <= 300000000)
      assert.are.equal(vco / s.after, p.rate)
      assert.is_true(s.after == 1000 or s.after == 2000)
    end
  end)

  it("of a multiplied clock is refused where no oscillator setting exists", function()
    local none, refusal, code = lb.plan(tone, lb.digitizer { clock = "10 MHz",
      pll = { multiply = "8..9", divide = "1..2", after = { 1000 }, vco = "200..300 MHz" } })
    assert.are.same({ nil, "infeasible" }, { none, code })
    assert.are.equal("sample rate", refusal.binding.term)
  end)

  it("shared by channels keeps to the limit of all together", function()
    local digitizer = { rates = { "1 kS/s", "4 kS/s", "16 kS/s" }, channels = 8,
      aggregate = "40 kS/s" }
    for _, p in ipairs { plan(digitizer), plan(digitizer, nil, noisy) } do
      assert.is_true(p.rate * 8 <= fraction.new(40000))
    end
    digitizer.channels = 64
    local _, refusal, code = lb.plan(tone, lb.digitizer(digitizer))
    assert.are.equal("infeasible", code)
    assert.are.equal("sample rate", refusal.binding.term)
  end)

  it("stays within least_rate and most_rate", function()
    for _, digitizer in ipairs { { rates = { 500, 1000, 2000, 4000 } }, { rate = "500..4000 S/s" },
        { rate = "500..4000 S/s", rate_step = 10 }, { clock = "1 MHz", divider = "250..2000" } } do
      local p = plan(digitizer, { least_rate = "900 S/s", most_rate = "1.6 kS/s" })
      assert.is_true(p.rate >= 900 and p.rate <= 1600, tostring(p.rate))
    end
  end)

  it("is never below twice the highest line, time base and drift in", function()
    local digitizer = { rates = { 200, "203" }, timebase = "0.1 %" }
    local p = plan(digitizer, nil, demand { 100 })
    assert.are.equal(fraction.new(203), p.rate)
    digitizer.timebase = "2 %"
    local _, refusal = lb.plan(demand { 100 }, lb.digitizer(digitizer), { effort_s = 0.01 })
    assert.are.equal("sample rate", refusal.binding.term)
  end)
end)

describe("a record's length", function()
  it("is a multiple of the block", function()
    local options = { windows = "hann", readings = "tracked" }
    local free = plan({ rates = { "1 kS/s" } }, options, noisy)
    for _, block in ipairs { 7, 64, 250, 1024 } do
      local p = plan({ rates = { "1 kS/s" }, block = block }, options, noisy)
      assert.are.equal(0, p.samples % block)
      assert.is_true(p.samples >= free.samples and p.samples < free.samples + 2 * block)
    end
  end)

  it("keeps to the limits of length", function()
    local p = plan { rates = { "1 kS/s" }, samples = "777..100000" }
    assert.is_true(p.samples >= 777)
    local _, refusal = lb.plan(noisy, lb.digitizer { rates = { "1 kS/s" }, samples = "16..500" })
    assert.are.equal("noise", refusal.binding.term)
    assert.matches("records of 500 samples", refusal.binding.limit)
  end)

  it("fits the memory that channels share", function()
    local p = plan({ rates = { "1 kS/s" }, memory = 9000 }, nil, noisy)
    assert.is_true(p.samples <= 9000)
    local _, refusal = lb.plan(noisy, lb.digitizer { rates = { "1 kS/s" }, memory = 9000,
      channels = 8 })
    assert.matches("memory for 1125 samples a channel", refusal.binding.limit)
  end)

  it("times the averages stays within the time that is allowed", function()
    local averaged = demand({ 99.7 }, { noise = "5 mV/rtHz", averages = 8 })
    local p = plan({ rates = { "1 kS/s" } }, { within = "3 s" }, averaged)
    assert.is_true(p.duration_s * p.averages <= 3)
  end)
end)

describe("undersampling", function()
  -- 10-11: two lines at the edges of a band 1 MHz wide; the rates that fold it
  -- into one zone are those of Vaughan, Scott & White 1991, eq. 4-5 (1 % inside
  -- for the lines to stand off the edges).
  local band = demand { 10.1e6, 10.9e6 }
  local zones = { { 5.5, 6.667 }, { 4.4, 5 }, { 3.667, 4 }, { 3.143, 3.333 }, { 2.75, 2.857 },
    { 2.444, 2.5 }, { 2.2, 2.222 } }

  for i, zone in ipairs(zones) do
    it(("plans a band at %g to %g of its rates"):format(zone[1], zone[2]), function()
      local p = plan({ rate = { zone[1] .. " MS/s", zone[2] .. " MS/s" } },
        { undersample = true }, band)
      local rows = p:fold_map()
      assert.are.same({ i + 3, i + 3 }, { rows[1].zone, rows[2].zone })
      assert.are.equal((i + 3) % 2 == 0, rows[1].inverted)
      assert.are.equal(rows[1].inverted, rows[1].shown_hz > rows[2].shown_hz)
      local record = p:replay { trial = 1, noise = false }
      for k, l in ipairs(assert(record:measure(p)).lines) do
        assert.is_true(math.abs(l.amplitude - 1) <= p.lines[k].tolerance)
      end
    end)
  end

  it("is refused unless it is asked for", function()
    local digitizer = lb.digitizer { rates = { "2.25 MS/s" } }
    local none, refusal, code = lb.plan(band, digitizer)
    assert.are.same({ nil, "infeasible" }, { none, code })
    assert.are.equal("sample rate", refusal.binding.term)
    local offered
    for _, r in ipairs(refusal.relaxations) do
      offered = offered or r.change.undersample and r
    end
    assert.is_truthy(offered)
    local p = assert(lb.plan(band, digitizer, { undersample = true }))
    assert.are.equal(offered.plan.samples, p.samples)
  end)

  it("has no rate that folds both lines onto one place", function()
    -- 10.1 and 10.9 MHz meet where rate k = 21: 21 / 6 = 3.5 MS/s.
    local none, _, code = lb.plan(band, lb.digitizer { rates = { "3.5 MS/s" },
      samples = "16..4096" }, { undersample = true, effort_s = 0.2 })
    assert.are.same({ nil, "infeasible" }, { none, code })
  end)
end)
