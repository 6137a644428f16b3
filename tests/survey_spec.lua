-- Averages, their statistics and what is made of pairs of channels: laws first,
-- then published values.
local core = require "libration.core"
local lb = require "libration"

local spectrum = core.spectrum

-- Entropic values in (-1, 1).
local function values(n, seed)
  local state = seed
  return lb.samples.make(n, function()
    state = (state * 16807) % 2147483647
    return 2 * state / 2147483647 - 1
  end)
end

-- White normal noise of variance 1: one-sided density 2 at one sample a second.
local function noise(n, seed)
  return lb.synth.noise { rate = 1, samples = n, seed = seed, density = 2 ^ 0.5 }
end

local function rows_of(path)
  local out = {}
  for line in io.lines(path) do
    if not line:find "^#" and not line:find "^%a" or line:find "^%a[%w_()]*,%d" then
      local row = {}
      for field in line:gmatch "[^,]+" do row[#row + 1] = tonumber(field) or field end
      out[#out + 1] = row
    end
  end
  return out
end

local function near(expected, got, tolerance)
  assert(math.abs(got - expected) <= tolerance * math.abs(expected),
    ("expected %.15g, got %.15g"):format(expected, got))
end

describe("averages come out the same to the last bit", function()
  local x, y = values(30011, 7), values(30011, 8)

  -- Fed in blocks whose sizes come in turn from a list.
  local function fed(sizes, workers, averaging, segment)
    local a = lb.survey.accumulate { rate = 1, segment = segment, step = segment // 3 + 1,
      channels = 2, cross = averaging == "mean", averaging = averaging, detrend = "mean",
      workers = workers }
    local at, turn = 1, 0
    while at <= #x do
      turn = turn % #sizes + 1
      local last = math.min(#x, at + sizes[turn] - 1)
      assert(a:feed { x:slice(at, last), y:slice(at, last) })
      at = last + 1
    end
    return a
  end

  for _, averaging in ipairs { "mean", "median", "peak" } do
    for _, segment in ipairs { 2, 64, 1000, 9001 } do
      it(("%s, segments of %d"):format(averaging, segment), function()
        local whole = fed({ #x }, 1, averaging, segment)
        for _, sizes in ipairs { { 1013 }, { 1, 70, 5000, 0 }, { 9000, 1 }, { #x } } do
          for _, workers in ipairs { 1, 2, 3 } do
            local parts = fed(sizes, workers, averaging, segment)
            assert.are.equal(whole:density(2).values, parts:density(2).values)
            assert.are.equal(whole.segments, parts.segments)
            if averaging == "mean" then
              assert.are.equal(whole:cross_density(1, 2).im, parts:cross_density(1, 2).im)
            end
          end
        end
      end)
    end
  end

  it("when results are looked at between blocks", function()
    local whole, parts = fed({ #x }, 2, "mean", 500), fed({ 700 }, 2, "mean", 500)
    local looked = lb.survey.accumulate { rate = 1, segment = 500, step = 167, channels = 2,
      cross = true, detrend = "mean" }
    for at = 1, #x, 1000 do
      local last = math.min(#x, at + 999)
      looked:feed { x:slice(at, last), y:slice(at, last) }
      assert(looked:density(1))
    end
    assert.are.equal(whole:density(1).values, looked:density(1).values)
    assert.are.equal(parts:density(1).values, looked:density(1).values)
  end)

  it("from feeds, raw integers and any order of channels", function()
    local bytes, codes = {}, {}
    for i = 1, 5000 do
      codes[i] = (i * i * 7919) % 65536 - 32768
      bytes[i] = string.pack("<i2", codes[i])
    end
    local raw = lb.samples.raw(table.concat(bytes), "int16")
    local w = lb.window("hann"):samples(300)
    local function average() return spectrum.average(w, 100, 300, 1, "line", "mean", false, 2) end
    local a = average():feed(core.store.feed { raw })
    local b = average():feed(lb.samples.new(codes))
    assert.are.equal(b:power(1, 1), a:power(1, 1))
    local turned = lb.survey.averages({ y, x }, { rate = 1, segment = 64, cross = true })
    local straight = lb.survey.averages({ x, y }, { rate = 1, segment = 64, cross = true })
    assert.are.equal(straight:cross_density(1, 2).re, turned:cross_density(2, 1).re)
    assert.are.equal(straight:cross_density(1, 2).im, turned:cross_density(2, 1).im)
    assert.are.equal(straight:density(1).values, turned:density(2).values)
  end)
end)

describe("laws of averaged spectra", function()
  it("keep the mean square (Parseval), without a window", function()
    for _, n in ipairs { 64, 63, 97 } do
      local x = values(n * 8, 5)
      local s = lb.survey.density(x, { rate = 123, segment = n, overlap = 0,
        window = "rectangular" })
      near(x:dot(x) / #x, s:mean_square(0, 61.5), 1e-13)
    end
  end)

  it("scale with the square, and keep nothing of a mean or a line that is taken off", function()
    local x = values(4000, 11)
    local o = { rate = 1, segment = 250, detrend = "line" }
    local a = lb.survey.density(x, o)
    local b = lb.survey.density(x * 4, o)
    local ramp = lb.samples.make(4000, function(i) return 100 + 0.01 * i end)
    local c = lb.survey.density(x + ramp, o)
    for k = 1, #a.values do
      assert.are.equal(16 * a.values[k], b.values[k])
      assert(math.abs(a.values[k] - c.values[k]) < 1e-10)
    end
  end)

  it("read a sine the same at any length, noise the same at any bandwidth", function()
    local tone = lb.samples.make(32768, function(i) return 2.385 * math.cos(math.pi / 16 * i) end)
    local x = noise(32768, 3)
    for _, n in ipairs { 256, 1024, 4096 } do
      for _, w in ipairs { "hann", "hft95", "blackman_harris4" } do
        local s = lb.survey.lines(tone, { rate = 3200, segment = n, window = w }):to_peak()
        near(2.385, s.values[s:bin(100)], 1e-12)
        local d = lb.survey.density(x, { rate = 3200, segment = n, window = w })
        near(x:dot(x) / #x, d:mean_square(0, 1600), 0.02)
      end
    end
  end)

  it("hold peaks and take medians of the very segments", function()
    local x = values(640, 21)
    local o = { rate = 1, segment = 64, overlap = 0 }
    local powers = {}
    for i = 1, 10 do powers[i] = lb.survey.lines(x:slice(64 * i - 63, 64 * i), o).values end
    o.averaging = "peak"
    local peak = lb.survey.lines(x, o)
    o.averaging = "median"
    local median = lb.survey.lines(x, o)
    for k = 1, 33 do
      local list = {}
      for i = 1, 10 do list[i] = powers[i][k] end
      table.sort(list)
      near(list[10], peak.values[k], 1e-14)
      near((list[5] + list[6]) / 2, median.values[k] * median.median_bias, 1e-14)
    end
    assert.is_nil(peak.averages)
    assert.is_nil((peak:limits(0.95)))
  end)

  it("convert and come back", function()
    local s = lb.survey.density(values(512, 2), { rate = 48, segment = 64, unit = "m/s^2" })
    assert.are.equal("(m/s^2)^2/Hz", s.unit)
    assert.are.equal("m/s^2/sqrt(Hz)", s:to_rms().unit)
    local there = s:to_lines():to_peak()
    assert.are.equal("m/s^2", there.unit)
    local back = there:to_density()
    near(48 * 1.5 / 64, s.bandwidth_hz, 1e-14)
    assert.are.equal(0.75, s.spacing_hz)
    for k = 1, 33 do near(s.values[k], back.values[k], 1e-14) end
    assert.has_error(function() s:to_peak() end,
      "survey: to_peak needs a kind of line; this is one of density")
    local padded = lb.survey.density(values(512, 2), { rate = 48, segment = 64, points = 256 })
    assert.are.same({ 0.1875, s.bandwidth_hz }, { padded.spacing_hz, padded.bandwidth_hz })
    near(s.values[9], padded.values[33], 1e-12)
  end)
end)

describe("a record's survey", function()
  it("uses its rate, units and factors, and leaves codes as they are", function()
    local codes = lb.samples.make(600, function(i) return (i * i * 31) % 255 - 127 end)
    local rec = lb.record.new { rate = "51.2 kHz", channels = {
      { codes = codes, bits = 8, range = "10 V", sensitivity = "100 mV/(m/s^2)", unit = "m/s^2" },
      { samples = codes, unit = "Pa", name = "room" } } }
    local s = lb.survey.density(rec, { segment = 100, channels = 1 })
    local t = lb.survey.density(rec:values(1), { segment = 100, rate = 51200 })
    for k = 1, 51 do near(t.values[k], s.values[k], 1e-13) end
    assert.are.same({ "(m/s^2)^2/Hz", 512 }, { s.unit, s.spacing_hz })
    local a = lb.survey.averages(rec, { segment = 100, cross = true })
    assert.are.equal("(m/s^2) (Pa)/Hz", a:cross_density(1, 2).unit)
    assert.is_truthy(tostring(a:density(2)):find("room", 1, true))
  end)

  it("reads files in blocks, raw integers as well", function()
    local codes = lb.samples.make(20000, function(i) return (i * i * 7919) % 65535 - 32767 end)
    local rec = lb.record.new { rate = 48000, channels = {
      { codes = codes, bits = 16, range = "10 V" },
      { codes = codes * -1, bits = 16, range = "10 V" } } }
    local path = os.tmpname()
    assert(rec:write(path, { format = "wav" }))
    local open = assert(lb.record.open(path, { range = "10 V" }))
    local o = { segment = 512, cross = true }
    local a, b = lb.survey.averages(open, o), lb.survey.averages(rec, o)
    assert.are.equal(b:density(2).values, a:density(2).values)
    assert.are.equal(b:cross_density(1, 2).re, a:cross_density(1, 2).re)
    local one = lb.survey.density(open, { segment = 512, channels = { 2 } })
    assert.are.equal(b:density(2).values, one.values)
    open:close()
    os.remove(path)
  end)

  it("never reaches across a gap", function()
    local x = noise(1000, 5)
    local rec = lb.record.new { rate = 1, samples = x, gaps = { { after = 450, lost = 3 } } }
    for _, averaging in ipairs { "mean", "median", "peak" } do
      local o = { segment = 100, averaging = averaging }
      local s = lb.survey.density(rec, o)
      assert.are.equal(8 + 10, s.segments)
      if averaging == "mean" then
        o.rate = 1
        local a = lb.survey.density(x:slice(1, 450), o)
        local b = lb.survey.density(x:slice(451, 1000), o)
        for k = 1, 51 do
          near((8 * a.values[k] + 10 * b.values[k]) / 18, s.values[k], 1e-13)
        end
        near(18 ^ 2 / (64 / a.averages + 100 / b.averages), s.averages, 1e-13)
      elseif averaging == "peak" then
        o.rate = 1
        near(math.max(lb.survey.density(x:slice(1, 450), o).values[9],
          lb.survey.density(x:slice(451, 1000), o).values[9]), s.values[9], 1e-14)
      end
    end
  end)

  it("is refused when it is shorter than a segment", function()
    local s, message, code = lb.survey.density(values(10, 1), { rate = 1, segment = 11, step = 5 })
    assert.are.same({ "10 samples are less than a segment of 11", "infeasible" },
      { message, code })
    assert.is_nil(s)
  end)

  it("says what is wrong with options", function()
    local x = values(100, 1)
    for text, o in pairs {
      ["unknown field overlp; valid are averaging, channels, cross"] = { overlp = 1 },
      ["segment is missing"] = { segment = false },
      ["segment is 2.5; it must be an integer from 1"] = { segment = 2.5 },
      ["overlap 0.3 of 64 samples is 19.2 samples, no whole number; give step, such as 45"] =
        { overlap = 0.3 },
      ["detrend is slope; valid are none, mean, line"] = { detrend = "slope" },
      ["averaging is max; valid are mean, median, peak"] = { averaging = "max" },
      ["cross spectra are averaged by the mean alone"] = { averaging = "peak", cross = true },
      ["points is 10; it must be an integer from 64"] = { points = 10 },
      ["rate: samples need their rate, S/s"] = { rate = false },
      ["give overlap or step, not both"] = { overlap = 0.5, step = 2 },
    } do
      local given = { rate = 1, segment = 64 }
      for key, value in pairs(o) do given[key] = value or nil end
      local done, message = pcall(lb.survey.density, x, given)
      assert(not done and message:find(text, 1, true), message)
    end
  end)
end)

describe("effective averages", function()
  local names = { rect = "rectangular", hann = "hann", hamming = "hamming",
                  blackman = "blackman", blackmanharris = "blackman_harris4" }

  -- welch_effective_averages.csv: Welch 1967 and Harris 1978, computed with NumPy.
  it("are those of the table", function()
    local seen = 0
    local windows = {}
    for _, row in ipairs(rows_of "tests/data/welch_effective_averages.csv") do
      local name = names[row[1]]
      if name then
        windows[name] = windows[name] or lb.window(name):samples(row[2])
        near(row[6], spectrum.effective_averages(windows[name], row[3], row[5]), 2e-9)
        seen = seen + 1
      end
    end
    assert.are.equal(5 * 72, seen)
  end)
end)

describe("confidence limits", function()
  -- psd_confidence.csv: scipy.stats.chi2.
  it("are those of the table", function()
    local seen = 0
    for _, row in ipairs(rows_of "tests/data/psd_confidence.csv") do
      local tail = (1 - row[3] / 100) / 2
      near(row[4], row[2] / spectrum.chi_square(row[2], 1 - tail), 1e-9)
      near(row[5], row[2] / spectrum.chi_square(row[2], tail), 1e-9)
      seen = seen + 1
    end
    assert(seen > 50)
  end)

  it("are SciPy's for any degrees of freedom and probability", function()
    local pipe = assert(io.popen("/usr/bin/python3 -B tests/oracle/chi_square.py"))
    local seen = 0
    for line in pipe:lines() do
      local dof, p, x = line:match "^(%S+) (%S+) (%S+)$"
      near(tonumber(x), spectrum.chi_square(tonumber(dof), tonumber(p)), 1e-10)
      seen = seen + 1
    end
    assert(pipe:close())
    assert.are.equal(76, seen)
  end)

  it("hold for noise as often as they say", function()
    local inside, all = 0, 0
    for seed = 1, 8 do
      local s = lb.survey.density(noise(5120, seed), { rate = 1, segment = 512 })
      local low, high = s:limits(0.9)
      for k = 3, 255 do
        if s.values[k] * low < 2 and 2 < s.values[k] * high then inside = inside + 1 end
        all = all + 1
      end
    end
    near(0.9, inside / all, 0.03)
  end)
end)

describe("the median", function()
  it("is corrected by the effective averages: noise reads the same as by the mean", function()
    for _, case in ipairs { { "hann", 128 }, { "hft95", 64 }, { "rectangular", 256 } } do
      local sum, count = 0, 0
      for seed = 1, 12 do
        local s = lb.survey.density(noise(256 * 6, seed), { rate = 1, segment = 256,
          window = case[1], step = case[2], averaging = "median" })
        sum, count = sum + s.values:slice(5, 124):sum(), count + 120
      end
      near(2, sum / count, 0.06)
    end
  end)

  it("sorts nothing wrong", function()
    for n = 1, 60 do
      local x, list = values(n, n + 100), {}
      for i = 1, n do
        x[i] = math.floor(x[i] * (n % 7 + 1))
        list[i] = x[i]
      end
      table.sort(list)
      assert.are.equal((list[(n + 1) // 2] + list[n // 2 + 1]) / 2, spectrum.median(x))
    end
  end)
end)

describe("two channels", function()
  local x = noise(65536, 77)

  it("with a known delay have a response of falling phase", function()
    local d = 5
    local y = lb.samples.make(#x, function(i) return i > d and 2 * x[i - d] or 0 end)
    local a = lb.survey.averages({ x, y }, { rate = 1000, segment = 1024, cross = true })
    for _, how in ipairs { { estimate = "h1" }, { estimate = "h2" },
                           { estimate = "total", noise_ratio = 4 } } do
      local h = a:response(1, 2, how)
      local phase, gain = h:phase(), h:gain()
      for _, k in ipairs { 5, 40, 80 } do
        near(-2 * math.pi * h:hz(k) * d / 1000, phase[k], 0.02)
        near(2, gain[k], 0.02)
      end
    end
  end)

  it("give the true response by the estimate that fits the noise", function()
    local clean = x * 3
    local on_x, on_y = noise(#x, 5) * 0.7, noise(#x, 6) * 2
    local function gain(input, output, how)
      local a = lb.survey.averages({ input, output },
        { rate = 1, segment = 256, cross = true })
      return a:response(1, 2, how):gain():slice(3, 126):mean()
    end
    near(3, gain(x, clean + on_y, { estimate = "h1" }), 0.01)
    near(3, gain(x + on_x, clean, { estimate = "h2" }), 0.01)
    near(3, gain(x + on_x, clean + on_y, { estimate = "total", noise_ratio = (2 / 0.7) ^ 2 }), 0.01)
    -- H1 is low and H2 high by the noise that each takes to be elsewhere.
    near(3 / (1 + 0.49), gain(x + on_x, clean, { estimate = "h1" }), 0.02)
    near(3 * (1 + 4 / 9), gain(x, clean + on_y, { estimate = "h2" }), 0.02)
  end)

  it("of total least squares lie between H1 and H2, and reach them", function()
    local y = x * 3 + noise(#x, 9) * 3
    local a = lb.survey.averages({ x, y }, { rate = 1, segment = 4096, cross = true })
    local h1, h2 = a:response(1, 2, { estimate = "h1" }), a:response(1, 2, { estimate = "h2" })
    local low = a:response(1, 2, { estimate = "total", noise_ratio = 1e-12 }):gain()
    local high = a:response(1, 2, { estimate = "total", noise_ratio = 1e12 }):gain()
    local mid = a:response(1, 2, { estimate = "total", noise_ratio = 9 }):gain()
    for k = 2, 2048, 97 do
      near(h2:gain()[k], low[k], 1e-6)
      near(h1:gain()[k], high[k], 1e-6)
      assert(h1:gain()[k] <= mid[k] and mid[k] <= h2:gain()[k])
    end
  end)

  it("scatter as the table of Bendat and Piersol says", function()
    for _, row in ipairs(rows_of "tests/data/bendat_piersol_errors.csv") do
      local e = spectrum.response_error(lb.samples.new { row[1] }, row[2])
      near(row[6], e[1], 1e-7)
    end
    -- And so they do: the spread of |H| over bins of the same true coherence, 0.5.
    local y = x + noise(#x, 12)
    local a = lb.survey.averages({ x, y }, { rate = 1, segment = 1024, overlap = 0,
      cross = true })
    local gain = a:response(1, 2, { estimate = "h1" }):gain():slice(3, 510)
    local mean = gain:mean()
    local off = gain - mean
    near(((1 - 0.5) / (2 * 64 * 0.5)) ^ 0.5, (off:dot(off) / #off) ^ 0.5 / mean, 0.1)
  end)

  it("without anything in common stay below the level of zero coherence", function()
    local a = lb.survey.averages({ x, noise(#x, 1234) }, { rate = 1, segment = 1024,
      cross = true })
    local g = a:coherence(1, 2)
    local below, level = 0, g:zero_level()
    for k = 2, 512 do if g.values[k] < level then below = below + 1 end end
    near(0.95, below / 511, 0.03)
    -- Levels for independent averages: check values computed from the formula.
    for n, expected in pairs { [8] = 0.34816, [16] = 0.18104, [64] = 0.04644, [100] = 0.02981 } do
      local whole = lb.survey.averages({ x:slice(1, 64 * n), x:slice(1, 64 * n) },
        { rate = 1, segment = 64, overlap = 0, cross = true })
      assert(math.abs(whole:coherence(1, 2):zero_level() - expected) < 1e-5)
    end
  end)

  it("refuse a coherence of one average", function()
    local a = lb.survey.averages({ x, x }, { rate = 1, segment = #x, cross = true })
    local g, message, code = a:coherence(1, 2)
    assert.is_nil(g)
    assert.are.equal("one_average", code)
    assert.is_truthy(message:find("whatever is in it", 1, true))
    assert.is_nil((a:response(1, 2, { estimate = "h1" })))
  end)

  it("warn of a resonance too narrow for the resolution", function()
    -- A resonator of 2 % half-power width, rung by noise, with two resolutions.
    local r, f = 0.998, 0.1
    local y, a1, a2 = lb.samples.new(#x), 2 * r * math.cos(2 * math.pi * f), -r * r
    for i = 3, #x do y[i] = x[i] + a1 * y[i - 1] + a2 * y[i - 2] end
    local function narrow(segment)
      local a = lb.survey.averages({ x, y }, { rate = 1, segment = segment, cross = true })
      local h = a:response(1, 2, { estimate = "h1" })
      local list = h:narrow()
      for _, peak in ipairs(list) do
        if math.abs(peak.hz - f) < 2 / segment then return peak, tostring(h) end
      end
    end
    local peak, text = narrow(1024)
    assert(peak and peak.bias < -0.02)
    assert.is_truthy(text:find("longer segments are needed", 1, true))
    assert.is_nil((narrow(16384)))
  end)
end)
