-- Folding, band-pass rates and coherent sampling against published cases.
local core = require "libration.core"
local fraction = core.base.fraction
local plan = core.plan

local function near(expected, got, relative, what)
  assert.is_true(math.abs(got - expected) <= relative * math.abs(expected),
    ("%s: %.12g instead of %.12g"):format(what or "value", got, expected))
end

local function random(seed) -- MINSTD: Park & Miller 1988, CACM 31(10)
  return function(low, high)
    seed = seed * 16807 % 2147483647
    return low + (high - low) * (seed / 2147483647)
  end
end

describe("folding", function()
  -- Recomputed from r = f - fs round(f / fs), common practice, no source: true
  -- Hz, rate, shown Hz, zone, inverted.
  local cases = {
    { 60, 100, 40, 2, true }, { 110, 100, 10, 3, false }, { 160, 100, 40, 4, true },
    { 1300, 1000, 300, 3, false }, { 25e6, 20e6, 5e6, 3, false }, { 999, 1000, 1, 2, true },
    { 7, 3, 1, 5, false }, { 10, 100, 10, 1, false }, { 0, 100, 0, 1, false },
  }
  for _, case in ipairs(cases) do
    it(("%g Hz at %g S/s shows at %g Hz"):format(case[1], case[2], case[3]), function()
      assert.are.same({ case[3], case[4], case[5] }, { plan.fold(case[1], case[2]) })
    end)
  end

  -- At an edge between two zones the frequency belongs to the upper one.
  for _, case in ipairs { { 50, 100, 50 }, { 2500, 1000, 500 }, { 100, 100, 0 } } do
    it(("%g Hz at %g S/s stands on an edge, at %g Hz"):format(table.unpack(case)), function()
      local shown, zone = plan.fold(case[1], case[2])
      assert.are.equal(case[3], shown)
      assert.are.equal(case[1] // (case[2] / 2) + 1, zone)
    end)
  end

  it("is even around multiples of the rate, periodic, and never above half of it", function()
    local draw = random(8231)
    for _ = 1, 500 do
      local rate = 10 ^ draw(0, 6)
      local hz, turns = rate * draw(0, 0.5), math.floor(draw(1, 400))
      for _, side in ipairs { -1, 1 } do
        local shown, zone, inverted = plan.fold(turns * rate + side * hz, rate)
        assert.is_true(shown >= 0 and shown <= rate / 2)
        assert.is_true(math.abs(shown - hz) <= 4e-16 * turns * rate * 2)
        assert.are.equal(side < 0, inverted)
        assert.are.equal(2 * turns + (side < 0 and 0 or 1), zone)
      end
    end
  end)

  it("inverts in even zones: a rising frequency shows as a falling one", function()
    local draw = random(77)
    for _ = 1, 200 do
      local rate, hz = draw(1, 10), draw(0, 80)
      local shown, zone, inverted = plan.fold(hz, rate)
      local moved, same = plan.fold(hz + rate * 1e-6, rate)
      if zone == same then
        assert.are.equal(zone % 2 == 0, inverted)
        assert.are.equal(inverted, moved < shown)
      end
    end
  end)

  it("refuses what is no frequency or no rate", function()
    assert.has_error(function() plan.fold(-1, 10) end)
    assert.has_error(function() plan.fold(1, 0) end)
    assert.has_error(function() plan.fold(1, -5) end)
    assert.has_error(function() plan.fold(1 / 0, 10) end)
    assert.has_error(function() plan.fold(0 / 0, 10) end)
  end)
end)

-- Rates of uniform band-pass sampling: R. G. Vaughan, N. L. Scott, D. R. White
-- 1991, IEEE Trans. Signal Processing 39(9), eq. 4-5. Rows: zone, lowest,
-- highest rate, as far as they are printed.
local bands = {
  { "FM radio, 88-108 MHz (Wikipedia, Undersampling)", 88, 108, 5, {
    { 1, 216, math.huge }, { 2, 108, 176 }, { 3, 72, 88 }, { 4, 54, 58.667 },
    { 5, 43.2, 44 } } },
  -- R. G. Lyons, Understanding Digital Signal Processing, 2.3 (from memory); its
  -- m is the zone less one.
  { "20 MHz carrier, 5 MHz wide (Lyons)", 17.5, 22.5, 4, {
    { 1, 45, math.huge }, { 2, 22.5, 35 }, { 3, 15, 17.5 }, { 4, 11.25, 11.667 } } },
  { "integer band 20-25 (recomputed)", 20, 25, 5, { { 5, 10, 10 } } },
  { "10-11 (recomputed)", 10, 11, 11, {
    { 2, 11, 20 }, { 3, 7.333, 10 }, { 4, 5.5, 6.667 }, { 5, 4.4, 5 }, { 6, 3.667, 4 },
    { 7, 3.143, 3.333 }, { 8, 2.75, 2.857 }, { 9, 2.444, 2.5 }, { 10, 2.2, 2.222 },
    { 11, 2, 2 } } },
  { "70-80 (recomputed)", 70, 80, 8, {
    { 2, 80, 140 }, { 3, 53.33, 70 }, { 4, 40, 46.67 }, { 5, 32, 35 }, { 6, 26.67, 28 },
    { 7, 22.857, 23.333 }, { 8, 20, 20 } } },
}

describe("band-pass rates", function()
  for _, band in ipairs(bands) do
    local name, low, high, last, rows = table.unpack(band)
    for _, row in ipairs(rows) do
      it(("%s, zone %d: %g to %g"):format(name, table.unpack(row)), function()
        local least, most = plan.fold_band(low, high, row[1])
        near(row[2], least, 2e-4, "lowest")
        if row[3] == math.huge then
          assert.are.equal(math.huge, most)
        else
          near(row[3], most, 2e-4, "highest")
        end
      end)
    end
    it(name .. ": no zone after the last", function()
      for zone = last + 1, last + 5 do
        assert.is_nil((plan.fold_band(low, high, zone)))
      end
    end)
  end

  it("fold the band into one zone, and beyond the edges do not", function()
    local draw = random(19)
    for _ = 1, 300 do
      local low = draw(1, 100)
      local high = low * (1 + draw(0.01, 0.3))
      local zone = math.floor(draw(1, 1 + high / (high - low)))
      local least, most = plan.fold_band(low, high, zone)
      if least and zone > 1 then
        for _, rate in ipairs { least * (1 + 1e-9), (least + most) / 2, most * (1 - 1e-9) } do
          local _, first = plan.fold(low, rate)
          local _, second = plan.fold(high, rate)
          assert.are.same(zone, first)
          assert.are.same(zone, second)
        end
        local _, below = plan.fold(high, least * (1 - 1e-9))
        local _, above = plan.fold(low, most * (1 + 1e-9))
        assert.are.same({ zone + 1, zone - 1 }, { below, above })
      end
    end
  end)

  it("show the FM band upside down near 56 MHz (Wikipedia, Undersampling)", function()
    local low, zone, inverted = plan.fold(88e6, 56e6)
    local high = plan.fold(108e6, 56e6)
    assert.are.same({ 24e6, 4, true, 4e6 }, { low, zone, inverted, high })
  end)

  it("refuse an upper edge that is not above the lower, and no zone", function()
    assert.has_error(function() plan.fold_band(2, 2, 1) end)
    assert.has_error(function() plan.fold_band(3, 2, 1) end)
    assert.has_error(function() plan.fold_band(1, 2, 0) end)
    assert.has_error(function() plan.fold_band(0, 2, 1) end)
  end)
end)

describe("the coherent period", function()
  -- 1 / gcd of the frequencies, exactly (arithmetic, no source).
  local cases = {
    { { 50 }, "1/50" }, { { 50, "24.6" }, "5" }, { { "0.3", "0.1" }, "10" },
    { { 425 }, "1/425" }, { { "1/3", "1/2" }, "6" }, { { "24.6", "172.2" }, "5/123" },
    { { 60, 50 }, "1/10" }, { { "1377.6", 50, "24.6" }, "5" }, { { "1e-6", 1000000 }, "1000000" },
  }
  for _, case in ipairs(cases) do
    local words = {}
    for i, hz in ipairs(case[1]) do words[i] = tostring(hz) end
    it("of " .. table.concat(words, ", ") .. " Hz is " .. case[2] .. " s", function()
      local list = {}
      for i, hz in ipairs(case[1]) do list[i] = fraction(hz) end
      assert.are.equal(case[2], tostring(plan.coherent_period(list)))
    end)
  end

  it("makes whole cycles of all, and no shorter one does", function()
    local draw = random(4711)
    for _ = 1, 200 do
      local list = {}
      for i = 1, math.floor(draw(1, 6)) do
        list[i] = fraction(math.floor(draw(1, 5000)), math.floor(draw(1, 40)))
      end
      local period = plan.coherent_period(list)
      local cycles = 0
      for _, hz in ipairs(list) do
        local turns = hz * period
        assert.are.equal(1, turns.denominator)
        local a, b = turns.numerator, cycles
        while b ~= 0 do a, b = b, a % b end
        cycles = a
      end
      assert.are.equal(1, cycles) -- cycles without a common factor: none is shorter
    end
  end)

  it("is refused where 64 bits do not hold it", function()
    local period, message, code = plan.coherent_period { fraction("1/9223372036854775807"),
      fraction("1/9223372036854775783") }
    assert.is_nil(period)
    assert.is_string(message)
    assert.are.equal("overflow", code)
  end)

  it("needs positive frequencies", function()
    assert.has_error(function() plan.coherent_period {} end)
    assert.has_error(function() plan.coherent_period { fraction(0) } end)
    assert.has_error(function() plan.coherent_period { fraction(-3) } end)
    assert.has_error(function() plan.coherent_period "50" end)
  end)
end)

local function gcd(a, b)
  while b ~= 0 do a, b = b, a % b end
  return a
end

-- Every (divider, samples) by trying them all.
local function exhaustive(t)
  local rows = {}
  for divider = t.divider_least, t.divider_most do
    local rate = t.clock / divider
    for samples = t.samples_least, t.samples_most do
      local seconds, fits = samples / rate, true
      for _, hz in ipairs(t.lines) do
        local turns = hz * seconds
        fits = fits and 2 * hz < rate and math.abs(turns - math.floor(turns + 0.5)) <= t.off
      end
      for _, away in ipairs(fits and t.away or {}) do
        for _, hz in ipairs(t.lines) do
          local apart = (core.plan.fold(away, rate) - hz) * seconds
          fits = fits and math.abs(apart) > t.bins
        end
      end
      if fits then rows[#rows + 1] = ("%d x %d"):format(divider, samples) end
    end
  end
  table.sort(rows)
  return rows
end

local function found(t)
  local rows, count = plan.coherent(t)
  assert.are.equal(#rows, count)
  local list = {}
  for i, row in ipairs(rows) do list[i] = ("%d x %d"):format(row.divider, row.samples) end
  table.sort(list)
  return list, rows
end

describe("coherent settings", function()
  it("are f / fs = J / M with J and M coprime (IEEE Std 1057; the ratio form)", function()
    -- Wikipedia, Coherent sampling: 2048 samples at 100 MS/s, 44 MHz wished:
    -- 901.12 cycles, so 901 (17 x 53, coprime with 2048): 43.994140625 MHz.
    assert.are.equal(901, math.floor(44e6 * 2048 / 100e6))
    assert.are.equal(1, gcd(901, 2048))
    local hz = fraction(901) * 100000000 / 2048
    assert.are.equal(43994140.625, hz:number())
    assert.are.equal("2048/90100000000", ("%d/%d"):format(2048, 901 * 100000000))
    assert.are.equal(fraction(512, 25) / 1000000 / 901, plan.coherent_period { hz })
    local rows = plan.coherent { clock = 100e6, divider_least = 1, divider_most = 1,
      samples_least = 16, samples_most = 4096, lines = { 43994140.625 }, off = 1e-6 }
    assert.are.same({ { divider = 1, samples = 2048 }, { divider = 1, samples = 4096 } }, rows)
  end)

  it("13 cycles in 64 points (AN3190), and nothing shorter", function()
    local rows = plan.coherent { clock = 6400, divider_least = 1, divider_most = 1,
      samples_least = 2, samples_most = 128, lines = { 1300 }, off = 1e-6 }
    assert.are.same({ { divider = 1, samples = 64 }, { divider = 1, samples = 128 } }, rows)
  end)

  it("6 cycles in 32 points are 3 in 16: only 16 distinct samples", function()
    local rows = plan.coherent { clock = 3200, divider_least = 1, divider_most = 1,
      samples_least = 2, samples_most = 32, lines = { 600 }, off = 1e-6 }
    assert.are.same({ { divider = 1, samples = 16 }, { divider = 1, samples = 32 } }, rows)
  end)

  it("equal a search that tries every pair", function()
    local draw = random(31337)
    local some = 0
    for _ = 1, 40 do
      local t = { clock = math.floor(draw(1000, 9000)), divider_least = math.floor(draw(1, 4)),
        samples_least = math.floor(draw(4, 40)), lines = {}, away = {}, off = draw(0.002, 0.2),
        bins = draw(0.3, 3.2), most = 1e6 }
      t.divider_most = t.divider_least + math.floor(draw(0, 12))
      t.samples_most = t.samples_least + math.floor(draw(50, 300))
      for i = 1, math.floor(draw(1, 4)) do t.lines[i] = math.floor(draw(100, 2000)) / 10 end
      for i = 1, math.floor(draw(0, 4)) do t.away[i] = math.floor(draw(100, 9000)) / 7 end
      table.sort(t.lines)
      table.sort(t.away)
      local list = found(t)
      some = some + #list
      assert.are.same(exhaustive(t), list)
    end
    assert.is_true(some > 500)
  end)

  it("come shortest first, and as many as were asked for", function()
    local t = { clock = 12.288e6, divider_least = 64, divider_most = 512, samples_least = 16,
      samples_most = 65536, lines = { 24.6, 50 }, off = 0.01, most = 50 }
    local rows, count = plan.coherent(t)
    assert.are.equal(50, #rows)
    assert.is_true(count > 50)
    for i = 2, #rows do
      assert.is_true(rows[i - 1].divider * rows[i - 1].samples <= rows[i].divider * rows[i].samples)
    end
  end)

  it("do not depend on the number of workers", function()
    local t = { clock = 12.288e6, divider_least = 64, divider_most = 2048, samples_least = 16,
      samples_most = 65536, lines = { 24.6, 50 }, off = 0.01, away = { 9000 }, bins = 3,
      most = 1000 }
    t.workers = 1
    local one, count = plan.coherent(t)
    for _, workers in ipairs { 2, 3, 8 } do
      t.workers = workers
      local rows, again = plan.coherent(t)
      assert.are.equal(count, again)
      assert.are.same(one, rows)
    end
  end)

  it("respect a longest duration", function()
    local t = { clock = 1000, divider_least = 1, divider_most = 10, samples_least = 16,
      samples_most = 4000, lines = { 20 }, off = 0.01, most_duration = 1.0 }
    for _, row in ipairs((plan.coherent(t))) do
      assert.is_true(row.divider * row.samples <= 1000)
    end
  end)

  it("name what is wrong", function()
    local function with(field, value)
      local t = { clock = 1000, divider_least = 1, divider_most = 10, samples_least = 16,
        samples_most = 100, lines = { 50 }, off = 0.01 }
      t[field] = value
      return function() plan.coherent(t) end
    end
    assert.error_matches(with("lines", { 50, 20 }), "lines: positive frequencies in ascending")
    assert.error_matches(with("lines", {}), "lines: at least one")
    assert.error_matches(with("off", 0.5), "off: between 0 and 0%.5")
    assert.error_matches(with("clock", -1), "clock: a positive frequency")
    assert.error_matches(with("divider_least", 0), "divider_least: a whole number")
    assert.error_matches(with("samples_most", 2 ^ 33), "samples_most: a whole number")
    assert.error_matches(with("workers", 1000), "workers: 0 to 256")
    assert.error_matches(with("most", -1), "most: 0 to 1e6 rows")
  end)
end)
