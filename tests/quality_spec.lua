-- Distortion, noise, effective bits and spurs beside one sine.
local lb = require "libration"

-- A converter of 2^bits codes and full scale 1, codes in the middle of their steps; `amplitude` of
-- the sine, `cycles` in n samples.
local function converted(bits, n, cycles, amplitude, phase)
  local step, top = 2 / 2 ^ bits, 2 ^ (bits - 1) - 1
  return lb.samples.make(n, function(i)
    local v = amplitude * math.sin(2 * math.pi * ((cycles * (i - 1)) % n) / n + phase)
    return (math.max(-top - 1, math.min(top, math.floor(v / step))) + 0.5) * step
  end)
end

describe("an ideal converter", function()
  -- SNR = 20 log10(2^bits sqrt 1.5): 49.9257, 74.0081, 98.0905 dB for 8, 12, 16 bits (W. R. Bennett
  -- 1948, Bell Syst. Tech. J. 27, 446-472); single records of few codes differ by tenths of a dB.
  it("has the signal-to-noise ratio of its bits", function()
    for bits, expected in pairs { [8] = 49.9257, [12] = 74.0081, [16] = 98.0905 } do
      local q = lb.lines.quality(converted(bits, 4096, 1021, 1, 0.3), { rate = 4096,
        full_scale = 1 })
      assert.near(expected, q.sinad_db, 0.2)
      assert.near(bits, q.effective_bits.of_full_scale, 0.04)
      assert.near(bits, q.effective_bits.of_sinad, 0.04)
      assert.near(expected, q.snr_db, 0.2)
    end
  end)

  -- IEEE Std 1241: below full scale the two conventions differ by 20 log10(FS / 2 A) / 6.02.
  it("has other bits by the other convention below full scale", function()
    local q = lb.lines.quality(converted(12, 4096, 1021, 0.25, 0.3), { rate = 4096,
      full_scale = 1 })
    assert.near(12, q.effective_bits.of_full_scale, 0.1)
    assert.near(math.log(1 / q.amplitude, 2), q.effective_bits.of_full_scale
      - q.effective_bits.of_sinad, 1e-6)
  end)

  it("takes the full scale from a record", function()
    local codes = converted(8, 1024, 255, 1, 0.1) * 128 - 0.5
    local q = lb.lines.quality(lb.record.new { rate = 1000, codes = codes, bits = 8,
      range = "10 V" })
    assert.equal(10, q.full_scale)
    assert.near(8, q.effective_bits.of_full_scale, 0.05)
    assert.is_nil(lb.lines.quality(converted(8, 1024, 255, 1, 0), { rate = 1 }).effective_bits
      .of_full_scale)
  end)
end)

describe("distortion", function()
  local n, rate = 8192, 51200

  local function record(f, parts, density)
    local tones = { { hz = f, amplitude = 2 } }
    for h, amplitude in pairs(parts) do
      tones[#tones + 1] = { hz = h * f, amplitude = amplitude, phase = h }
    end
    return lb.synth.tones { rate = rate, samples = n, tones = tones }
      + lb.synth.noise { rate = rate, samples = n, density = density or 1e-7, seed = 3 } + 0.2
  end

  it("is the root of the sum of squares of the harmonics, in any place", function()
    for _, f in ipairs { 997.3, 6123.4, 11000.7, 24000.3 } do
      local q = assert(lb.lines.quality(record(f, { [2] = 3e-3, [3] = 4e-3, [7] = 1e-4 }),
        { rate = rate }))
      assert.near((9e-6 + 16e-6 + 1e-8) ^ 0.5 / 2, q.thd, 4e-7)
      assert.near(5.001e-3 / 2, q.thd_plus_noise, 1e-5)
      assert.near(-20 * math.log(q.thd_plus_noise, 10), q.sinad_db, 1e-9)
      assert.equal(3, q.spur.harmonic)
      assert.near(-20 * math.log(2e-3, 10), q.spurious_free_db, 5e-3)
      assert.same({}, q.warnings)
    end
  end)

  -- Folded by hand: 3 x 24000.3 = 72000.9 Hz at 51200 S/s appears at 20800.9 Hz; 2 x 24000.3
  -- = 48000.6 Hz at 3199.4 Hz, inverted.
  it("is read where the harmonics appear", function()
    local q = lb.lines.quality(record(24000.3, { [2] = 1e-2, [3] = 1e-3 }), { rate = rate })
    assert.near(3199.4, q.harmonics[1].appears_hz, 1e-3)
    assert.near(20800.9, q.harmonics[2].appears_hz, 1e-3)
    assert.near(1e-2, q.harmonics[1].amplitude, 1e-6)
    assert.near(1e-3, q.harmonics[2].amplitude, 1e-6)
    assert.near(3199.4, q.spur.hz, 0.1)
  end)

  it("says which harmonics it cannot see", function()
    local q = lb.lines.quality(record(rate / 4 + 0.01, { [2] = 1e-3 }, 1e-5), { rate = rate })
    assert.equal("half the rate", q.harmonics[1].hidden_by)
    assert.equal("the fundamental", q.harmonics[2].hidden_by)
    assert.equal("0 Hz", q.harmonics[3].hidden_by)
    assert.is_nil(q.harmonics[1].amplitude)
    assert.matches("warning: harmonic 3 falls on the fundamental and is not in the distortion",
      tostring(q))
  end)

  it("finds a spur that is no harmonic", function()
    local x = record(997.3, { [2] = 1e-4 })
    x:add(lb.synth.tones { rate = rate, samples = n, tones = { { hz = 7777, amplitude = 1e-3 } } })
    local q = lb.lines.quality(x, { rate = rate })
    assert.near(7777, q.spur.hz, 0.01)
    assert.is_nil(q.spur.harmonic)
    assert.near(20 * math.log(2e3, 10), q.spurious_free_db, 0.01)
  end)

  it("warns where a fundamental that moves leaks into the residual", function()
    local x = lb.synth.tones { rate = rate, samples = n, tones = { { hz = 997.3, amplitude = 2,
      ramp = 5 } } } + lb.synth.noise { rate = rate, samples = n, density = 1e-6, seed = 1 }
    local q = lb.lines.quality(x, { rate = rate })
    assert.matches("limited by leakage", q.warnings[1])
    assert.matches("warning: limited by leakage", tostring(q))
  end)

  it("warns of few cycles, and of records that repeat themselves", function()
    local few = lb.lines.quality(record(20, {}, 1e-5), { rate = rate })
    assert.matches("only 3.2 cycles", few.warnings[1])
    local twice = lb.lines.quality(record(rate * 1024 / n, {}, 1e-5), { rate = rate })
    assert.matches("1024 cycles in 8192 samples repeat 1024 times: only 8 different samples",
      twice.warnings[1])
  end)

  it("refuses short records, and prints and reads back", function()
    assert.equal("domain", select(3, lb.lines.quality(lb.samples.new(100), { rate = 1 })))
    local q = lb.lines.quality(record(997.3, { [2] = 3e-3 }), { rate = rate, unit = "V" })
    assert.equal(tostring(q), tostring(lb.lines.from_json(q:json())))
    assert.matches("SINAD%s+56%.%d+%s+0%.%d+%s+dB", tostring(q))
    assert.matches("\r\nTHD,%-56%.%d+,,dB\r\n", q:csv())
  end)
end)
