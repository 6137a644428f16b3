-- Sums of tones: exact phases far out, and the same bits however asked for.

local core = require "libration.core"
local fill, new = core.synth.fill, core.samples.new

local function signal(n, fields)
  return fill(new(n), fields)
end

local function turns_cos(turns)
  return math.cos(2 * math.pi * turns)
end

-- A frequency of p / 2^60 cycles per sample: p n modulo 2^60 is exact in
-- wrapping 64-bit integers, so the phase below is exact at any n.
local MASK60 = (1 << 60) - 1
local function exact(p, n, phase)
  return math.cos(2 * math.pi * (((p * n) & MASK60) / 2.0 ^ 60) + phase)
end

-- p < 2^53, so that p / 2^60 is a double; the last two lie above 1/2 and 1.
local steps = { 3, (1 << 53) - 1, 0x12345678901234, 0x1fedcba9876543, 1 << 59, 1 << 60,
                0x1b << 55, 0x2d << 55 }

describe("a steady tone", function()
  it("is within 1e-12 of its exact value at samples up to 2^40", function()
    for _, p in ipairs(steps) do
      for _, first in ipairs { 0, 255, 99991, (1 << 31) - 300, (1 << 40) - 2000, -700 } do
        local x = signal(1500, { first = first,
          tones = { { amplitude = 1, cycles = p / 2.0 ^ 60, phase = 2.385 } } })
        for i = 1, 1500, 7 do
          assert.near(exact(p, first + i - 1, 2.385), x[i], 1e-12)
        end
      end
    end
  end)

  it("keeps phases of many turns, frequencies below 2^-75, and folds", function()
    local function one(tone, first)
      return signal(1, { first = first, tones = { tone } })[1]
    end
    assert.near(math.cos(12345.678), one { amplitude = 1, cycles = 0.1, phase = 12345.678 }, 1e-12)
    local slow = { amplitude = 1, cycles = 2.0 ^ -80, phase = 0 }
    assert.near(turns_cos(2.0 ^ -40), one(slow, 1 << 40), 1e-15)
    local x = signal(300, { tones = { { amplitude = 1, cycles = 7.25 } } })
    assert.near(0, (x - signal(300, { tones = { { amplitude = 1, cycles = 0.25 } } })):peak(),
      1e-15)
    assert.near(0, (x - signal(300, { tones = { { amplitude = 1, cycles = -0.25 } } })):peak(),
      1e-15)
  end)

  it("adds up: a sum of tones is the sum of its parts", function()
    local tones, parts = {}, new(3000)
    for k = 1, 131 do
      tones[k] = { amplitude = 1 / k, cycles = 0.00231 * k ^ 1.1, phase = k * k }
      parts:add(signal(3000, { first = 777, tones = { tones[k] } }))
    end
    local whole = signal(3000, { first = 777, tones = tones, offset = 0.5 })
    assert.near(0, (whole - parts - 0.5):peak(), 1e-14)
  end)
end)

describe("a moving tone", function()
  it("ramps with exact phase far out", function()
    -- cycles p/2^60, ramp q/2^62: phase (p n)/2^60 + q n^2 / 2^63, exact in
    -- wrapping integers.
    local p, q = 0x0123456789abcd, 12345
    for _, first in ipairs { 0, 1000, 1 << 30, (1 << 40) - 900 } do
      local x = signal(800, { first = first, tones = {
        { amplitude = 1, cycles = p / 2.0 ^ 60, ramp = q / 2.0 ^ 62, phase = 1 } } })
      for i = 1, 800, 3 do
        local n = first + i - 1
        local turns = ((p * n) & MASK60) / 2.0 ^ 60 + ((q * n * n) & math.maxinteger) / 2.0 ^ 63
        assert.near(turns_cos(turns + 1 / (2 * math.pi)), x[i], 1e-12)
      end
    end
  end)

  it("swings: the integral of f + s sin(2 pi b n + q)", function()
    local f, s, b, q = 0.1237, 0.0004, 1 / 4096, 0.77
    local x = signal(5000, { tones = {
      { amplitude = 3, cycles = f, phase = 0.4, swing = s, beat = b, swing_phase = q } } })
    for n = 0, 4999, 11 do
      local depth = s / (2 * math.pi * b)
      local turns = f * n + depth * (math.cos(q) - math.cos(2 * math.pi * b * n + q))
      assert.near(3 * turns_cos(turns + 0.4 / (2 * math.pi)), x[n + 1], 1e-10)
    end
  end)
end)

describe("a signal", function()
  local tones = {}
  for k = 1, 9 do
    tones[k] = { amplitude = 1 + k, cycles = 0.0471 * k, phase = k,
                 ramp = k == 4 and 1e-7 or nil, swing = k == 6 and 1e-3 or nil,
                 beat = k == 6 and 1e-4 or nil }
  end
  local taps = core.synth.shape(core.samples.from { 0.01, 0.2 }, core.samples.from { 1, 3 }, 40)
  local function spec(first, workers)
    return { tones = tones, sigma = 0.1, taps = taps, seed = 5, first = first, offset = 1,
             workers = workers }
  end
  local whole = signal(60000, spec(-9000, 1))

  it("has the same bits on any number of threads", function()
    for _, workers in ipairs { 0, 2, 3, 8 } do
      assert(signal(60000, spec(-9000, workers)) == whole)
    end
  end)

  it("has the same bits in pieces of any size from any start", function()
    for _, size in ipairs { 1, 3, 255, 256, 257, 1024, 4097, 20011 } do
      for at = 1, 60000, math.max(size, 5003) do
        local n = math.min(size, 60000 - at + 1)
        assert(signal(n, spec(-9000 + at - 1, 1)) == whole:slice(at, at + n - 1))
      end
    end
  end)

  it("refuses tones that are none", function()
    local function raises(text, fields)
      local ok, message = pcall(signal, 4, fields)
      assert(not ok and message:find(text, 1, true), message)
    end
    raises("cycles is not finite", { tones = { { amplitude = 1, cycles = 1 / 0 } } })
    raises("amplitude is not a number", { tones = { { amplitude = "1", cycles = 0 } } })
    raises("domain", { tones = { { amplitude = 1, cycles = 0, phase = 1e10 } } })
    raises("domain", { tones = { { amplitude = 1, cycles = 0, swing = 1 } } })
    raises("tones[2] is not a table", { tones = { {}, 3 } })
    raises("tones is not a list", { tones = 3 })
    raises("workers is outside", { workers = 1000 })
    raises("seed is not a whole number", { seed = 1.5 })
    raises("taps is not samples", { taps = core.samples.new(0) })
  end)
end)
