-- Signals that move or ring: chirps, sweeps, multisines, ramps, modulation, decays, impacts.

local lb = require "libration"
local PI = math.pi

local function near(a, b, tolerance, what)
  assert(math.abs(a - b) <= tolerance, ("%s: %.17g for %.17g"):format(what or "", a, b))
end

-- The signal has the same bits in pieces of any size and for any number of threads.
local function piecewise(make, spec)
  local n = 40000
  local function part(first, count, workers)
    local copy = {}
    for k, v in pairs(spec) do copy[k] = v end
    copy.first, copy.samples, copy.workers = first, count, workers
    return (make(copy))
  end
  local whole = part(-700, n, 1)
  assert(part(-700, n, 3) == whole)
  for _, size in ipairs { 1, 255, 4097, 17001 } do
    for at = 1, n, math.max(size, 7919) do
      local count = math.min(size, n - at + 1)
      assert(part(-700 + at - 1, count, 1) == whole:slice(at, at + count - 1))
    end
  end
end

local modes = { { hz = 2385, damping = 0.03 }, { hz = 5123, damping = 0.011, amplitude = 0.4,
  phase = 0.7 } }

describe("any moving signal", function()
  local cases = {
    chirp = { rate = 8000, from_hz = 20, to_hz = 3000, duration_s = 2.385, amplitude = 1.3,
      law = "exponential", fade_s = 0.1, start_s = 0.31 },
    sweep = { rate = 8000, from_hz = 20, to_hz = 3000, duration_s = 0.77, amplitude = 1.3,
      back = true },
    ramp = { rate = 8000, speed = { { s = 0.5, hz = 5 }, { s = 1.7, hz = 41 }, { s = 3, hz = 12 } },
      orders = { { times = 1, amplitude = 1, power = 2 }, { times = 7.3, amplitude = 0.2 } } },
    modulated = { rate = 8000, hz = 1234.5, amplitude = 2, am = { { hz = 24.6, depth = 0.3 } },
      fm = { { hz = 3.1, deviation_hz = 40, phase = 1 } } },
    decays = { rate = 20000, modes = modes, hits = { { s = 0.1 }, { s = 0.5, strength = -2 } } },
    impacts = { rate = 20000, modes = modes, hz = 107.36, slip = 0.02, scatter = 0.2, seed = 5,
      load_hz = 29.95, load_depth = 0.5, start_s = 0.01 },
  }
  for name, spec in pairs(cases) do
    it(name .. " has the same bits in pieces and on threads", function()
      piecewise(lb.synth[name], spec)
    end)
  end
end)

describe("a chirp", function()
  local function scipy(rate, n, from, to, duration, law)
    local pipe = assert(io.popen(("env -u LD_PRELOAD /usr/bin/python3 tests/oracle/chirp.py "
      .. "%.17g %d %.17g %.17g %.17g %s"):format(rate, n, from, to, duration, law)))
    local list = {}
    for value in pipe:lines "n" do list[#list + 1] = value end
    pipe:close()
    return list
  end

  it("agrees with scipy.signal.chirp", function()
    for _, law in ipairs { "linear", "exponential" } do
      local list = scipy(8000, 8000, 23.85, 3111, 1, law)
      local x = lb.synth.chirp { rate = 8000, samples = 8000, from_hz = 23.85, to_hz = 3111,
        duration_s = 1, amplitude = 1, law = law }
      assert(#list == 8000)
      for i = 1, 8000, 13 do near(x[i], list[i], 2e-11, law) end
    end
  end)

  it("fades in and out with raised cosines, and is silent outside", function()
    local spec = { rate = 1000, samples = 1200, from_hz = 50, to_hz = 50, duration_s = 1,
      amplitude = 2, start_s = 0.1, fade_s = 0.25 }
    local x = lb.synth.chirp(spec)
    for i = 0, 1199 do
      local u, level = i - 100, 0
      if u >= 0 and u < 1000 then
        local edge = math.min(u, 1000 - u)
        level = edge >= 250 and 1 or 0.5 - 0.5 * math.cos(PI * edge / 250)
      end
      near(x[i + 1], 2 * level * math.cos(2 * PI * 0.05 * u), 1e-12, i)
    end
  end)

  it("refuses what is none", function()
    local function raises(text, fields)
      fields.rate, fields.samples, fields.amplitude = 1000, 10, 1
      local ok, message = pcall(lb.synth.chirp, fields)
      assert(not ok and message:find(text, 1, true), message)
    end
    raises("exponential law", { from_hz = 0, to_hz = 9, duration_s = 1, law = "exponential" })
    raises("fade_s", { from_hz = 1, to_hz = 9, duration_s = 1, fade_s = 0.6 })
    raises("duration_s", { from_hz = 1, to_hz = 9 })
    raises("is not one of linear, exponential", { from_hz = 1, to_hz = 9, duration_s = 1,
      law = "linea" })
  end)
end)

describe("a swept sine", function()
  it("repeats its frequency course without a jump of phase", function()
    -- Phase step between neighbours from the analytic derivative: |x'| is at most amplitude times
    -- the highest angular frequency; a jump would break that bound.
    for _, back in ipairs { false, true } do
      local x = lb.synth.sweep { rate = 10000, samples = 50000, from_hz = 11, to_hz = 97,
        duration_s = 0.7345, amplitude = 1, law = "exponential", back = back }
      local most = 2 * PI * 97 / 10000 * 1.001
      for i = 2, #x do assert(math.abs(x[i] - x[i - 1]) <= most, i) end
    end
  end)

  it("runs backwards as the mirror image of forwards", function()
    local x = lb.synth.sweep { rate = 1000, samples = 2001, from_hz = 10, to_hz = 60,
      duration_s = 1, amplitude = 1, back = true }
    -- A pass of whole cycles (35): phase is symmetric about the turning point.
    for i = 0, 1000, 7 do near(x[1001 - i], x[1001 + i], 1e-9) end
  end)
end)

describe("a multisine", function()
  it("has the crest factors of the table (Newman, Schroeder, Rudin-Shapiro)", function()
    local rows = 0
    for line in io.lines "tests/data/crest_factor.csv" do
      local v = {}
      for word in line:gmatch "[^,]+" do v[#v + 1] = tonumber(word) end
      if line:byte() ~= 35 and v[1] <= 512 then
        rows = rows + 1
        local n, columns = v[1], { equal = 2, newman = 4, schroeder = 6, rudin_shapiro = 8 }
        for phases, column in pairs(columns) do
          local x = lb.synth.tones { rate = 64 * n, samples = 64 * n,
            tones = lb.synth.multisine { hz = 1, count = n, amplitude = 1, phases = phases } }
          local crest = x:peak() / x:rms()
          -- Our grid of 64 points per shortest cycle misses at most (pi / 64)^2 / 2 of a peak, the
          -- table about as much (N = 3, Newman: 2.080532 on 2^20 points).
          assert(crest <= v[column] * (1 + 1.3e-3) and crest > v[column] * (1 - 1.3e-3),
            ("%d %s: %.7g for %.7g"):format(n, phases, crest, v[column]))
        end
      end
    end
    assert(rows >= 17)
  end)

  it("follows Schroeder's rule for powers that differ", function()
    local a = { 1, 0.3, 0.7, 0.2 }
    local sum = 0
    for _, v in ipairs(a) do sum = sum + v * v end
    local list = lb.synth.multisine { hz = 2, harmonics = { 3, 4, 5, 6 }, amplitudes = a }
    for k = 1, 4 do
      local phase = 0
      for l = 1, k - 1 do phase = phase - 2 * PI * (k - l) * a[l] ^ 2 / sum end
      near(math.cos(list[k].phase), math.cos(phase), 1e-12)
      near(math.sin(list[k].phase), math.sin(phase), 1e-12)
      assert(list[k].hz == 2 * (k + 2))
    end
  end)

  it("takes the rms of the sum, and says what it wants", function()
    local list = lb.synth.multisine { hz = 8, count = 32, rms = 2.385, phases = "random", seed = 3 }
    local x = lb.synth.tones { rate = 4096, samples = 4096, tones = list }
    near(x:rms(), 2.385, 1e-12)
    for text, spec in pairs {
      ["harmonics (a list) or count"] = { hz = 1, amplitude = 1 },
      ["must increase"] = { hz = 1, amplitude = 1, harmonics = { 2, 2 } },
      ["amplitude, amplitudes or rms"] = { hz = 1, count = 2 },
      ["3 amplitudes for 2"] = { hz = 1, count = 2, amplitudes = { 1, 1, 1 } },
    } do
      local ok, message = pcall(lb.synth.multisine, spec)
      assert(not ok and message:find(text, 1, true), message)
    end
  end)
end)

describe("a speed ramp", function()
  it("has the phase that integrates the speed", function()
    local speed = { { s = 0.2, hz = 10 }, { s = 1, hz = 30 }, { s = 1.5, hz = 30 },
      { s = 2, hz = 5 } }
    local x = lb.synth.ramp { rate = 2000, samples = 5000, first = -400, speed = speed,
      orders = { { times = 3.5, amplitude = 2, phase = 0.4, power = 1 } }, reference_hz = 20 }
    local function state(t)
      if t <= speed[1].s then return (t - speed[1].s) * 10, 10 end
      local turns = 0
      for i = 2, #speed do
        local a, b = speed[i - 1], speed[i]
        local u = math.min(t, b.s) - a.s
        local hz = a.hz + (b.hz - a.hz) * u / (b.s - a.s)
        turns = turns + u * (a.hz + hz) / 2
        if t <= b.s then return turns, hz end
      end
      return turns + (t - 2) * 5, 5
    end
    for i = 0, 4999, 3 do
      local turns, hz = state((i - 400) / 2000)
      near(x[i + 1], 2 * hz / 20 * math.cos(2 * PI * 3.5 * turns + 0.4), 1e-11, i)
    end
  end)

  it("is a steady tone where the speed is steady, and a linear chirp where it ramps", function()
    local steady = lb.synth.ramp { rate = 51200, samples = 5000, speed = { { s = 0, hz = 24.6 } },
      orders = { { times = 7, amplitude = 1, phase = 0.3 } } }
    local tone = lb.synth.tones { rate = 51200, samples = 5000,
      tones = { { hz = 24.6 * 7, amplitude = 1, phase = 0.3 } } }
    assert((steady - tone):peak() < 1e-10)
    local ramp = lb.synth.ramp { rate = 8000, samples = 8000,
      speed = { { s = 0, hz = 10 }, { s = 1, hz = 90 } },
      orders = { { times = 4, amplitude = 1 } } }
    local chirp = lb.synth.chirp { rate = 8000, samples = 8000, from_hz = 40, to_hz = 360,
      duration_s = 1, amplitude = 1 }
    assert((ramp - chirp):peak() < 1e-10)
  end)
end)

describe("a modulated carrier", function()
  it("is its carrier and sidebands: half the depth (AM), Bessel amplitudes (FM)", function()
    local n, rate = 8192, 8192
    local function amplitude(x, hz)
      local t = lb.spectrum.transform(x)
      return 2 / n * math.sqrt(t.re[hz + 1] ^ 2 + t.im[hz + 1] ^ 2)
    end
    local am = lb.synth.modulated { rate = rate, samples = n, hz = 1000, amplitude = 2, phase = 0.3,
      am = { { hz = 30, depth = 0.5, phase = 1 } } }
    near(amplitude(am, 1000), 2, 1e-12)
    near(amplitude(am, 970), 0.5, 1e-12)
    near(amplitude(am, 1030), 0.5, 1e-12)
    -- Index 60 / 30 = 2: J0..J3 of 2 (Abramowitz and Stegun 1964, table 9.1 and 9.2).
    local fm = lb.synth.modulated { rate = rate, samples = n, hz = 1000, amplitude = 1,
      fm = { { hz = 30, deviation_hz = 60 } } }
    for k, bessel in ipairs { 0.2238907791, 0.5767248078, 0.3528340286, 0.1289432495 } do
      near(amplitude(fm, 1000 + 30 * (k - 1)), bessel, 2e-10)
      near(amplitude(fm, 1000 - 30 * (k - 1)), bessel, 2e-10)
    end
  end)
end)

describe("struck modes", function()
  it("are the sum of damped sines", function()
    local hits = { { s = 0.0101, strength = 1 }, { s = 0.0337, strength = -0.7 } }
    local x = lb.synth.decays { rate = 20000, samples = 3000, modes = modes, hits = hits }
    for i = 0, 2999, 7 do
      local t, sum = i / 20000, 0
      for _, hit in ipairs(hits) do
        local d = t - hit.s
        for _, m in ipairs(d >= 0 and modes or {}) do
          local w = 2 * PI * m.hz
          sum = sum + hit.strength * (m.amplitude or 1) * math.exp(-m.damping * w * d)
            * math.sin(w * math.sqrt(1 - m.damping ^ 2) * d + (m.phase or 0))
        end
      end
      near(x[i + 1], sum, 1e-11, i)
    end
  end)

  it("fall to a thousandth in ln(1000) / (2 pi damping hz) seconds", function()
    -- 50 Hz, 1 %: 2.19881 s (closed form).
    local x = lb.synth.decays { rate = 1000, samples = 2400,
      modes = { { hz = 50, damping = 0.01 } } }
    near(2.19881, math.log(1000) / (2 * PI * 0.01 * 50), 1e-5)
    local peak = x:slice(2190, 2209):peak()
    near(peak, 1e-3, 5e-5)
  end)
end)

describe("impacts", function()
  local spec = { rate = 20000, samples = 200000, modes = modes, hz = 107.36, slip = 0.01, seed = 2 }

  it("come at slipping intervals of the stated mean and spread", function()
    local _, at = lb.synth.impacts(spec)
    local n, sum, squares = #at - 1, 0, 0
    for k = 1, n do
      local interval = (at[k + 1] - at[k]) * 107.36
      sum, squares = sum + interval, squares + (interval - 1) ^ 2
    end
    -- Normal intervals: mean within 4.5 sigma / sqrt(n), spread within 4.5 sigma / sqrt(2 n).
    near(sum / n, 1, 4.5 * 0.01 / math.sqrt(n))
    near(math.sqrt(squares / n), 0.01, 4.5 * 0.01 / math.sqrt(2 * n))
  end)

  it("differ between seeds, trials and channels and repeat for the same", function()
    local x = lb.synth.impacts(spec)
    assert(lb.synth.impacts(spec) == x)
    for _, name in ipairs { "seed", "trial", "channel" } do
      local other = {}
      for k, v in pairs(spec) do other[k] = v end
      other[name] = 9
      assert(lb.synth.impacts(other) ~= x)
    end
  end)

  it("without slip are a decay at each whole period", function()
    local plain = { rate = 20000, samples = 4000, modes = modes, hz = 100, load_hz = 25,
      load_depth = 0.5, start_s = 1e-5 }
    local hits = {}
    for k = 0, 20 do
      local s = k / 100 + 1e-5
      hits[k + 1] = { s = s, strength = 1 + 0.5 * math.cos(2 * PI * 25 * s) }
    end
    local x = lb.synth.impacts(plain)
    local y = lb.synth.decays { rate = 20000, samples = 4000, modes = modes, hits = hits }
    assert((x - y):peak() < 1e-9)
  end)
end)
