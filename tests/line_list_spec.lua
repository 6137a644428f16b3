-- Lists of lines: the law of noise, false alarms as stated, lines where they are; frequency
-- estimators; known lines in recordings of packages.
local lb = require "libration"
local core = require "libration.core"
local sounds = dofile "tests/support/sounds.lua"

after_each(sounds.clean)

local function noise(n, rate, density, seed)
  return lb.synth.noise { rate = rate, samples = n, density = density, seed = seed }
end

describe("the law of noise", function()
  it("is exponential for two degrees of freedom", function()
    for _, y in ipairs { 0, 1e-3, 0.5, 1, 2.385, 30, 300 } do
      assert.near(1, core.lines.chance(2, y) / math.exp(-y), 1e-12)
    end
  end)

  -- Closed form for even degrees of freedom: a Poisson sum (Abramowitz and Stegun 1964, 26.4.21).
  it("is a Poisson sum for even degrees of freedom", function()
    for _, half in ipairs { 2, 5, 20, 60 } do
      for _, y in ipairs { 0.3, 0.9, 1.1, 2, 4 } do
        local term = math.exp(-half * y)
        local sum = term
        for k = 1, half - 1 do
          term = term * half * y / k
          sum = sum + term
        end
        assert.near(1, core.lines.chance(2 * half, y) / sum, 1e-11)
      end
    end
  end)

  -- Factors nu / chi-square of 95 % limits (J. S. Bendat, A. G. Piersol, Random Data, confidence
  -- limits of spectra), computed with scipy.stats.chi2: 10 and 100 averages.
  it("has the published limits", function()
    assert.near(0.58532, 1 / core.lines.level(20, 0.025), 5e-6)
    assert.near(2.08534, 1 / core.lines.level(20, 0.975), 5e-6)
    assert.near(0.82968, 1 / core.lines.level(200, 0.025), 5e-6)
    assert.near(1.22904, 1 / core.lines.level(200, 0.975), 5e-6)
  end)

  it("has a level for every chance", function()
    for _, freedom in ipairs { 1, 2, 5.7, 40, 1000 } do
      for _, p in ipairs { 0.9, 0.5, 0.01, 1e-6, 1e-12 } do
        assert.near(1, core.lines.chance(freedom, core.lines.level(freedom, p)) / p, 1e-9)
      end
    end
  end)

  -- H. Rohling 1983 (IEEE Trans. Aerosp. Electron. Syst. 19(4), 608-621): the chance of an alarm
  -- over a times the r-th smallest of m exponential cells is the product of (m - i) / (m - i + a)
  -- for i = 0 .. r - 1.
  it("over a median floor is that of an order statistic", function()
    for _, m in ipairs { 11, 25, 101 } do
      for _, p in ipairs { 1e-2, 1e-5, 1e-9 } do
        local a, chance = core.lines.level(2, p, m) / math.log(2), 1
        for i = 0, (m - 1) // 2 do chance = chance * (m - i) / (m - i + a) end
        assert.near(1, chance / p, 1e-6)
      end
    end
    assert.near(core.lines.level(2, 1e-4), core.lines.level(2, 1e-4, 1e6), 1e-3)
  end)
end)

describe("a list of lines", function()
  it("holds noise alone no oftener than stated, but not much less often #slow", function()
    local cases = { { "hann", nil, 0.2 }, { "blackman_harris4", 256, 0.2 } }
    for _, case in ipairs(cases) do
      local hits, trials = 0, 300
      for seed = 1, trials do
        local found = lb.lines.list(noise(1024, 1, 1, seed), { rate = 1, window = case[1],
          segment = case[2], floor_bins = 41, false_alarm = case[3] })
        if #found.lines > 0 then hits = hits + 1 end
      end
      -- 0.2 of 300: 60 with a deviation of 7.
      assert.is_true(hits < 60 + 21 and hits > 15, case[1] .. ": " .. hits)
    end
  end)

  it("has the floor of the noise that was put in, lines or not", function()
    local n, rate = 32768, 10000
    local x = noise(n, rate, 2e-3, 7)
    for k = 1, 40 do
      x:add(lb.synth.tones { rate = rate, samples = n, tones = { { hz = 113.7 * k,
        amplitude = 1 / k } } })
    end
    local found = lb.lines.list(x, { rate = rate, unit = "V", segment = 4096 })
    assert.equal(40, #found.lines)
    for k, line in ipairs(found.lines) do
      assert.near(113.7 * k, line.hz, 6 * line.u_hz + 1e-3)
      assert.near(1 / k, line.amplitude, 6 * line.u_amplitude + line.leak)
      assert.near(1, line.floor_density / 2e-3, 0.2)
    end
  end)

  it("scatters as much as it states", function()
    local n, sums, trials = 2048, { 0, 0 }, 200
    for seed = 1, trials do
      local x = noise(n, 1, 0.1, seed)
      x:add(lb.synth.tones { rate = 1, samples = n, tones = { { hz = 0.2123, amplitude = 1,
        phase = seed } } })
      local line = lb.lines.list(x, { rate = 1 }).lines[1]
      sums[1] = sums[1] + ((line.amplitude - 1) / line.u_amplitude) ^ 2
      sums[2] = sums[2] + ((line.hz - 0.2123) / line.u_hz) ^ 2
    end
    -- Means of 200 squares of unit variance: deviation 0.1; the floor scatters too.
    assert.near(1, sums[1] / trials, 0.4)
    assert.near(1, sums[2] / trials, 0.4)
  end)

  it("finds a small line beside a large one, and counts leaks apart", function()
    local n, rate = 16384, 51200
    local x = noise(n, rate, 1e-4, 5)
    x:add(lb.synth.tones { rate = rate, samples = n, tones = { { hz = 1000.7, amplitude = 10 },
      { hz = 1022, amplitude = 0.01 } } })
    local good = lb.lines.list(x, { rate = rate })
    assert.equal(2, #good.lines)
    assert.near(1022, good.lines[2].hz, 1)
    local poor = lb.lines.list(x, { rate = rate, window = "hann" })
    assert.equal(1, #poor.lines)
    assert.is_true(poor.leaks > 0)
    assert.matches("peaks left out: no more than stronger lines leak", tostring(poor))
  end)

  it("prints, and reads back", function()
    local x = noise(4096, 1000, 1e-3, 1)
    x:add(lb.synth.tones { rate = 1000, samples = 4096, tones = { { hz = 50, amplitude = 1 } } })
    local r = lb.lines.list(x, { rate = 1000, unit = "V" })
    assert.equal(tostring(r), tostring(lb.lines.from_json(r:json())))
    assert.matches("1 lines above the floor: 1000 S/s, 4096 samples", tostring(r))
    assert.matches("chance of at most 0%.010", tostring(r))
    assert.matches("\n50%.0002771", r:csv())
  end)

  it("tracks wanted lines, folded ones too, and says which are not there", function()
    local n, rate = 8192, 1000
    local x = noise(n, rate, 1e-3, 3)
    x:add(lb.synth.tones { rate = rate, samples = n, tones = { { hz = 123.4, amplitude = 1 },
      { hz = 1310.25, amplitude = 0.2 } } })
    local r = assert(lb.lines.track(x, { rate = rate, unit = "V", segment = 2048, lines = {
      { name = "shaft", from_hz = 122, to_hz = 125 },
      { name = "high", from_hz = 1308, to_hz = 1312 },
      { name = "absent", from_hz = 400, to_hz = 401 },
      { name = "slope", from_hz = 124, to_hz = 125 },
    } }))
    local shaft, high, absent, slope = table.unpack(r.lines)
    assert.near(123.4, shaft.hz, 5 * shaft.u_hz)
    assert.near(1, shaft.amplitude, 5 * shaft.u_amplitude)
    assert.near(1310.25, high.hz, 5 * high.u_hz)
    assert.near(0.2, high.amplitude, 5 * high.u_amplitude)
    assert.is_true(shaft.found and high.found)
    assert.is_false(absent.found or slope.found)
    assert.is_true(slope.at_edge)
    assert.matches("absent .* not above the noise", tostring(r))
    assert.equal(tostring(r), tostring(lb.lines.from_json(r:json())))
    assert.error_matches(function()
      lb.lines.track(x, { rate = rate, lines = { { from_hz = 2, to_hz = 1 } } })
    end, "lines%[1%] from 2.0 to 1.0 Hz")
  end)

  it("refuses samples that are not numbers, and silence", function()
    local x = noise(1024, 1, 1, 1)
    x[477] = 0 / 0
    local tracked = { rate = 1, lines = { { from_hz = 0.1, to_hz = 0.11 } } }
    assert.equal("domain", select(3, lb.lines.list(x, { rate = 1 })))
    assert.equal("domain", select(3, lb.lines.track(x, tracked)))
    assert.equal("domain", select(3, lb.lines.joint(x, { rate = 1, lines = { 0.1 } })))
    assert.equal("domain", select(3, lb.lines.orders(x, { rate = 1, pulses = { 0, 500, 1000 },
      orders = { 1 } })))
    assert.equal("domain", select(3, lb.lines.synchronous(x, { rate = 1,
      pulses = { 0, 300, 600, 900 } })))
    assert.equal("domain", select(3, lb.lines.quality(x, { rate = 1 })))
    local silence = lb.samples.new(1024)
    assert.same({}, lb.lines.list(silence, { rate = 1 }).lines)
    assert.matches("no noise to judge by", select(2, lb.lines.track(silence, tracked)))
  end)

  it("refuses records too short for the floor and misspelt options", function()
    local _, message, code = lb.lines.list(noise(100, 1, 1, 1), { rate = 1 })
    assert.equal("domain", code)
    assert.matches("100 samples are too few for a floor of 101 bins", message)
    assert.error_matches(function()
      lb.lines.list(noise(100, 1, 1, 1), { rate = 1, windows = 1 })
    end, 'did you mean "window"')
    assert.error_matches(function() lb.lines.list(noise(999, 1, 1, 1), { rate = 1,
      floor_bins = 40 }) end, "must be odd")
  end)
end)

describe("a frequency estimator", function()
  local names = { grandke1983_hann = "grandke1983",
                  aboutanios_mulgrew_Q2 = "aboutanios_mulgrew2005" }

  it("gives the value of its published formula", function()
    local count = 0
    for line in io.lines "tests/data/freq_estimators.csv" do
      local n, k, d, kind, name, value =
        line:match '^(%d+),(%d+),([^,]+),"(%a+).-",([^,]+),([^,]+),'
      if n then
        count = count + 1
        local w = 2 * math.pi * (k + d) / n
        local re = lb.samples.make(n // 1 | 0, function(i) return math.cos(w * (i - 1) + 0.7) end)
        local im = lb.samples.make(n // 1 | 0, function(i) return math.sin(w * (i - 1) + 0.7) end)
        local found = lb.lines.estimate(names[name] or name, re, k // 1 | 0,
          kind == "complex" and im or nil)
        assert.near(tonumber(value), found, 2e-13, line)
      end
    end
    assert.equal(90, count)
  end)

  it("that is exact by its paper is exact", function()
    for seed = 1, 20 do
      local d, n = (seed * 0.6180339887) % 1 - 0.5, 17 + 3 * seed
      local w = 2 * math.pi * (5 + d) / n
      local re = lb.samples.make(n, function(i) return math.cos(w * i + seed) end)
      local im = lb.samples.make(n, function(i) return math.sin(w * i + seed) end)
      assert.near(d, lb.lines.estimate("candan2013", re, 5, im), 1e-12)
    end
  end)

  it("names its source, and the valid names when asked for another", function()
    for _, row in ipairs(lb.lines.estimators()) do assert.matches("%d%d%d%d", row.source) end
    assert.error_matches(function() lb.lines.estimate("parabola", lb.samples.new(8), 1) end,
      "valid are aboutanios_mulgrew2005, candan2013, grandke1983, macleod1998, quinn1997")
    assert.equal("domain", select(3, lb.lines.estimate("quinn1997", lb.samples.new(8), 1)))
  end)
end)

describe("a packaged recording", function()
  -- ITU-T E.180 (1998) recommends 425 Hz for these tones; the files are the package's own.
  it("holds the telephone tone that the standard asks for", function()
    local function file(name)
      return assert(lb.record.read(sounds.of_package("sound-theme-freedesktop", name)))
    end
    local calling = file "/phone-outgoing-calling.oga"
    local fit = assert(lb.lines.sine(calling, { near_hz = 425, channel = 1 }))
    assert.near(425.04, fit.hz, 0.1)
    local busy = file "/phone-outgoing-busy.oga"
    local found = assert(lb.lines.list(busy, { segment = 2048, channel = 1, floor_bins = 51 }))
    local top = found.lines[1]
    for _, line in ipairs(found.lines) do
      if line.amplitude > top.amplitude then top = line end
    end
    assert.near(424.65, top.hz, 1)
  end)

  -- The electrocardiogram of scipy was recorded on a 60 Hz mains.
  it("holds the mains line of where it was made, and no other mains #slow", function()
    local path = sounds.temporary ".f8"
    assert(os.execute("env -u LD_PRELOAD /usr/bin/python3 tests/oracle/heart.py " .. path))
    local x = lb.samples.new(sounds.bytes(path))
    assert.equal(108000, #x)
    local found = assert(lb.lines.list(x, { rate = 360, unit = "mV", segment = 8192,
      false_alarm = 1e-3 }))
    local near60, near50
    for _, line in ipairs(found.lines) do
      if math.abs(line.hz - 60) < 0.1 then near60 = line end
      if math.abs(line.hz - 50) < 0.5 then near50 = line end
    end
    assert.near(59.99, near60.hz, 0.02)
    assert.is_true(near60.over_floor_db > 18)
    assert.is_nil(near50)
  end)
end)
