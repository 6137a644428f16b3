-- The digitizer model: filter, time base, delay, jitter, noise, quantiser.

local core = require "libration.core"
local lb = require "libration"
local TAU = 2 * math.pi

local function record(fields)
  return lb.synth.record(fields)
end

-- cos and sin of a whole number of cycles in n samples, exactly periodic.
local function pair(n, cycles)
  local c, s = {}, {}
  for i = 0, n - 1 do
    local angle = TAU * (cycles * i % n) / n
    c[i + 1], s[i + 1] = math.cos(angle), math.sin(angle)
  end
  return core.samples.from(c), core.samples.from(s)
end

-- SINAD in dB by the three-parameter sine fit of IEEE Std 1057 (from memory);
-- at a whole number of cycles its three columns are orthogonal.
local function sinad(x, cycles)
  local n = #x
  local c, s = pair(n, cycles)
  local a, b = 2 / n * x:dot(c), 2 / n * x:dot(s)
  local rest = x - c * a - s * b - x:mean()
  return 10 * math.log((a * a + b * b) / 2 / (rest:dot(rest) / n), 10)
end

describe("the quantiser", function()
  -- Ideal quantiser, coherent full-scale sine: recomputed figures for a
  -- mid-rise converter, which a mid-tread one is after half a step of offset.
  -- Its phase is not stated; over phases the figures move by 0.02 dB (8 bits)
  -- to 0.1 dB (16 bits), and 0.33 rad is one that shows all three.
  -- The formula 6.0206 N + 1.7609 dB (IEEE Std 1241, from memory) gives
  -- 49.926, 74.008 and 98.091; 8 bits really are 0.11 dB away from it.
  for _, case in ipairs { { 8, 49.812 }, { 12, 73.978 }, { 16, 98.101 } } do
    local bits, expected = case[1], case[2]
    it(("of %d bits has a SINAD of %.3f dB"):format(bits, expected), function()
      local n, cycles, step = 4096, 1021, 2 / 2 ^ bits
      local x = record { rate = n, samples = n, bits = bits, range = 1, offset = -step / 2,
        tones = { { hz = cycles, amplitude = 1, phase = 0.33 - math.pi / 2 } } }
      assert.near(expected, sinad(x, cycles), 0.03)
      assert(math.abs(sinad(x, cycles) - (6.0206 * bits + 1.7609)) < 0.15)
    end)
  end

  it("is mid-tread, rounds half to even, and clips at both ends", function()
    local values = { 0, 0.4, 0.5, 0.6, 1.5, 2.5, -0.5, -1.5, 3.4, 3.5, 100, -3.5, -4.4, -4.6, -99 }
    local codes = { 0, 0, 0, 1, 2, 2, 0, -2, 3, 3, 3, -4, -4, -4, -4 }
    for i, value in ipairs(values) do
      local x, clipped = record { rate = 1, samples = 1, bits = 3, range = 4, offset = value }
      assert.equal(codes[i], x[1])
      local beyond = value > 3.4 or value < -4.5
      assert.equal(beyond and 1 or 0, clipped)
    end
  end)

  it("gives the codes on request: value = code * step, ends included", function()
    for _, bits in ipairs { 1, 3, 12, 24, 32 } do
      local x, _, codes = record { rate = 1000, samples = 3000, bits = bits, range = 1.7,
        codes = true, tones = { { hz = 33.3, amplitude = 1.9 } } }
      local step, most = 1.7 / 2 ^ (bits - 1), 2 ^ (bits - 1)
      assert(x == codes * step and codes:max() == most - 1 and codes:min() == -most)
      for i = 1, 3000, 17 do
        local v = 1.9 * math.cos(TAU * 33.3 * (i - 1) / 1000)
        local held = math.max(-most, math.min(most - 1, v / step))
        assert(codes[i] == math.floor(codes[i]) and math.abs(codes[i] - held) <= 0.5 + 1e-5)
      end
    end
  end)

  it("counts what the rails changed: 1 % over-drive, 9 % of the samples", function()
    -- Share of a sine above 1 / 1.01 of its peak, both sides: 2 acos(1/1.01) / pi.
    local n = 100000
    local _, clipped = record { rate = n, samples = n, bits = 24, range = 1,
      tones = { { hz = 4321, amplitude = 1.01 } } }
    assert.near(2 / math.pi * math.acos(1 / 1.01), clipped / n, 2e-4)
    local x, limited = record { rate = n, samples = n, range = 1,
      tones = { { hz = 4321, amplitude = 1.01 } } }
    assert(x:max() == 1 and x:min() == -1)
    assert.near(clipped, limited, 4)
  end)
end)

describe("aperture jitter", function()
  -- Displacements are the keyed normal numbers of (trial, channel, purpose 3).
  local function displaced(fields, n)
    local g = core.synth.gaussian(core.samples.new(n), fields.seed, { fields.trial, 0, 3 })
    local tone, list = fields.tones[1], {}
    for i = 1, n do
      local t = (i - 1) / fields.rate + fields.jitter_s * g[i]
      local turns = tone.hz * t + (tone.ramp or 0) * t * t / 2
      list[i] = tone.amplitude * math.cos(TAU * turns + (tone.phase or 0))
    end
    return core.samples.from(list)
  end

  it("moves every sampling instant, by series or exactly", function()
    for _, case in ipairs { { 1e-4, 0 }, { 0.9e-3, 0 }, { 2e-2, 0 }, { 0.5, 0 }, { 1e-3, 1e6 } } do
      local fields = { rate = 1e5, samples = 3000, seed = 9, trial = 2,
        jitter_s = case[1] / (TAU * 1234), tones = {
          { hz = 1234, amplitude = 2, phase = 0.7, ramp = case[2] } } }
      local difference = (record(fields) - displaced(fields, 3000)):peak()
      -- largest of 3000 displacements: about 4 sigma; third-order term left out
      local left_out = case[1] <= 1e-3 and case[2] == 0 and 2 * (4 * case[1]) ^ 3 / 6 or 0
      assert(difference < 2e-11 + left_out, ("%g: %g"):format(case[1], difference))
    end
  end)

  -- SNR = -20 lg(2 pi f tj): recomputed figures; the first, and its effective
  -- bits, also published in application notes on clock jitter.
  for _, case in ipairs { { 100e6, 100e-15, 84.036 }, { 1e9, 100e-15, 64.036 },
    { 10e6, 1e-12, 84.036 }, { 70e6, 1e-12, 67.134 }, { 20e3, 1e-9, 78.016 } } do
    local hz, jitter, expected = case[1], case[2], case[3]
    it(("of %g s at %g Hz leaves %.3f dB"):format(jitter, hz, expected), function()
      local n, cycles = 1 << 16, 20011
      local x = record { rate = hz * n / cycles, samples = n, seed = 6, jitter_s = jitter,
        tones = { { hz = hz, amplitude = 1 } } }
      -- relative deviation of a noise power from n values: sqrt(2/n), and the
      -- slope's square has mean 1/2 with some spread of its own: 4.5 sigma
      assert.near(expected, sinad(x, cycles), 4.5 * 10 / math.log(10) * math.sqrt(3 / n))
    end)
  end
end)

describe("time and level", function()
  it("true rate is the nominal one times 1 + timebase; a delay shifts time", function()
    local fields = { rate = 8000, samples = 2000, timebase = 2e-3, delay_s = 3.3e-4,
      tones = { { hz = 425, amplitude = 1, phase = 0.2 },
                { hz = 700, amplitude = 0.5, ramp = 300 },
                { hz = 900, amplitude = 0.3, swing_hz = 20, swing_s = 0.1, swing_phase = 1 } } }
    local x = record(fields)
    for i = 1, 2000, 3 do
      local t = (i - 1) / (8000 * 1.002) + 3.3e-4
      local swing = 20 * 0.1 / TAU * (math.cos(1) - math.cos(TAU * t / 0.1 + 1))
      assert.near(math.cos(TAU * 425 * t + 0.2) + 0.5 * math.cos(TAU * (700 * t + 150 * t * t))
        + 0.3 * math.cos(TAU * (900 * t + swing)), x[i], 1e-11)
    end
  end)

  it("the filter's complex response acts at each tone's true frequency", function()
    local filter = { shape = "chebyshev", order = 5, corner = "900 Hz", ripple = "0.5 dB" }
    local f = lb.filter(filter)
    for _, hz in ipairs { 17.3, 850, 1500, 7600 } do
      local re, im = f:response(hz, 4000)
      local x = record { rate = 4000, samples = 300, filter = filter,
        tones = { { hz = hz, amplitude = 2, phase = 0.9 } } }
      for i = 1, 300, 7 do
        local angle = TAU * hz * (i - 1) / 4000 + 0.9
        assert.near(2 * (re * math.cos(angle) - im * math.sin(angle)), x[i], 1e-12)
      end
    end
  end)

  it("offset passes the filter, gain error comes behind it", function()
    local even = { shape = "chebyshev", order = 4, corner = "100 Hz", ripple = "1 dB" }
    local x = record { rate = 1000, samples = 2, offset = 3, gain_error = 0.01, filter = even }
    assert.near(3 * 10 ^ (-1 / 20) * 1.01, x[1], 1e-12)
  end)

  it("both noises have their densities", function()
    for _, name in ipairs { "input_noise", "own_noise" } do
      local n = 200000
      local x = record { rate = 5000, samples = n, [name] = 0.01, seed = 3, timebase = 1e-6 }
      local z = (x:dot(x) / n / (0.01 ^ 2 * 2500) - 1) / math.sqrt(2 / n)
      assert(math.abs(z) < 4.5, z)
    end
    local function noise(name, channel)
      return record { rate = 2, samples = 1000, [name] = 1, channel = channel }
    end
    assert(noise("input_noise", 0) ~= noise("own_noise", 0))
    assert(noise("own_noise", 1) ~= noise("own_noise", 0))
  end)

  it("a record has the same bits in pieces from any start", function()
    local fields = { rate = 1000, seed = 8, trial = 3, jitter_s = 1e-7, input_noise = 1e-3,
      own_noise = 1e-3, bits = 16, range = 4, first = -1000, samples = 5000, timebase = 1e-5,
      filter = { shape = "butterworth", order = 3, corner = "300 Hz" }, noise_taps = 20,
      tones = { { hz = 50, amplitude = 1 }, { hz = 60, amplitude = 1, ramp = 3 } } }
    local whole = record(fields)
    for _, size in ipairs { 1, 100, 1023, 1025, 3000 } do
      for at = 1, 5000, math.max(size, 499) do
        fields.first, fields.samples = -1000 + at - 1, math.min(size, 5000 - at + 1)
        assert(record(fields) == whole:slice(at, at + fields.samples - 1))
      end
    end
  end)
end)

describe("a model", function()
  local function raises(text, f, ...)
    local ok, message = pcall(f, ...)
    assert(not ok and message:find(text, 1, true), message)
  end

  it("with mistakes is refused, each mistake named with its path", function()
    raises("rate: missing", record, { samples = 1 })
    raises("jitter: no such field", record, { rate = 1, samples = 1, jitter = 2 })
    raises("tones[1].amplitude: missing", record, { rate = 1, samples = 1, tones = { { hz = 1 } } })
    raises("tones[1].hz", record, { rate = 1, samples = 1, tones = { { hz = -1, amplitude = 1 } } })
    raises("range is missing; bits = 8 needs it", record, { rate = 1, samples = 1, bits = 8 })
    raises("give samples (how many) or into", record, { rate = 1 })
    raises("bits", record, { rate = 1, samples = 1, bits = 33, range = 1 })
    raises("bits is missing", record, { rate = 1, samples = 1, codes = true })
    raises("shape", record, { rate = 1, samples = 1, filter = { shape = "brick" } })
  end)

  it("takes units, and fills samples that are there", function()
    local x = lb.samples.new(100)
    local y = record { rate = "51.2 kS/s", into = x, jitter_s = "2 ns", delay_s = "1 us",
      tones = { { hz = "1.2 kHz", amplitude = 1 } } }
    assert(rawequal(x, y) and x:peak() > 0.99)
  end)

  it("out of the core's range is refused there too", function()
    local x = core.samples.new(4)
    raises("domain", core.synth.record, x, { rate = 0 })
    raises("domain", core.synth.record, x, { rate = 1, timebase = -1 })
    raises("domain", core.synth.record, x, { rate = 1, bits = 8 })
    raises("domain", core.synth.record, x, { rate = 1, jitter_s = -1 })
    raises("domain", core.synth.record, x, { rate = 1, tones = { { hz = -1 } } })
    raises("domain", core.synth.record, x, { rate = 1, tones = { { hz = 1, swing_hz = 1 } } })
    raises("codes is not samples", core.synth.record, x, { rate = 1, codes = core.samples.new(3) })
    raises("bits is outside", core.synth.record, x, { rate = 1, bits = 64 })
    raises("rate is not finite", core.synth.record, x, { rate = 1 / 0 })
  end)
end)

describe("orders", function()
  it("are multiples of their driver, in frequency and in ramp", function()
    local tones = lb.synth.orders { hz = 24.6, ramp = 2, list = {
      { times = 1, amplitude = 1 }, { times = 3.5, amplitude = 2, phase = 1 } } }
    local x = lb.synth.tones { rate = 1000, samples = 2000, tones = tones }
    for i = 1, 2000, 9 do
      local t = (i - 1) / 1000
      local turns = 24.6 * t + t * t
      assert.near(math.cos(TAU * turns) + 2 * math.cos(TAU * 3.5 * turns + 1), x[i], 1e-10)
    end
  end)
end)
