-- Both readings of a line against direct sums, closed cases and laws.
local core = require "libration.core"
local lines = core.lines

local function hann(n)
  local w = {}
  for i = 0, n - 1 do w[i + 1] = 0.5 - 0.5 * math.cos(2 * math.pi * i / n) end
  return w
end

-- The sixth power of a sine (F. J. Harris 1978, Proc. IEEE 66(1), 51-83, cos^a
-- family): side lobes fall with the seventh power of the distance, so that
-- images stay out of the closed cases.
local function sine6(n)
  local w = {}
  for i = 0, n - 1 do w[i + 1] = math.sin(math.pi * i / n) ^ 6 end
  return w
end

-- A sum of cosines { amplitude, cycles per sample, phase at the centre }.
local function record(n, tones)
  local x = {}
  for i = 0, n - 1 do
    local t, value = i - (n - 1) / 2, 0
    for _, tone in ipairs(tones) do
      value = value + tone[1] * math.cos(2 * math.pi * ((tone[2] * t) % 1) + tone[3])
    end
    x[i + 1] = value
  end
  return x
end

local function direct(x, w, f)
  local n, re, im, sum = #x, 0, 0, 0
  for i = 0, n - 1 do
    local angle = 2 * math.pi * ((f * (i - (n - 1) / 2)) % 1)
    re = re + w[i + 1] * x[i + 1] * math.cos(angle)
    im = im - w[i + 1] * x[i + 1] * math.sin(angle)
    sum = sum + w[i + 1]
  end
  return 2 * (re ^ 2 + im ^ 2) ^ 0.5 / sum, math.atan(im, re)
end

local from = core.samples.from

local function read(x, w, searches)
  return lines.tracker(from(w), searches):run(from(x))
end

describe("the reading at a fixed frequency", function()
  it("is the direct sum to 1e-13 of the record's peak, at low bins too", function()
    for _, n in ipairs { 64, 100, 1000, 4099 } do
      local x, w = record(n, { { 1, 3.3 / n, 0.4 }, { 0.5, 0.31, 2 }, { 1e-3, 0.123, 1 } }), hann(n)
      for _, f in ipairs { 1 / n, 2.5 / n, 0.123, 0.31, 0.5, 0.9 } do
        local amplitude, phase = direct(x, w, f)
        local flat = read(x, w, { f, f })
        assert.is_true(math.abs(flat[1] - amplitude) < 1e-13)
        assert.are.equal(f, flat[2])
        if amplitude > 1e-3 then assert.is_true(math.abs(flat[3] - phase) < 1e-10) end
      end
    end
  end)

  it("is exact for a coherent tone and blind to other bins", function()
    local n = 512
    local x = record(n, { { 2.385, 37 / n, 0.7 }, { 5, 90 / n, 1.1 } })
    local flat = read(x, hann(n), { 37 / n, 37 / n, 90 / n, 90 / n, 60 / n, 60 / n })
    assert.is_true(math.abs(flat[1] - 2.385) < 1e-13)
    assert.is_true(math.abs(flat[3] - 0.7) < 1e-12)
    assert.is_true(math.abs(flat[4] - 5) < 1e-13)
    assert.is_true(flat[7] < 1e-13)
  end)

  it("does not lose digits with the record's length", function()
    local n = 2 ^ 18
    local f = 12345 / n
    local w = {}
    for i = 1, n do w[i] = 1 end
    local flat = read(record(n, { { 1, f, 0.25 } }), w, { f, f })
    assert.is_true(math.abs(flat[1] - 1) < 1e-13)
  end)
end)

describe("the tracked reading", function()
  it("finds an off-bin tone in a wide interval to 1e-9 of its amplitude", function()
    local n = 2048
    local w = sine6(n)
    for k = 1, 12 do
      local f = 0.06 + 0.035 * k + 0.0007 * (k * 0.6180339887 % 1)
      local flat = read(record(n, { { 3, f, k } }), w, { 0.03, 0.49 })
      assert.is_true(math.abs(flat[1] / 3 - 1) < 1e-9)
      assert.is_true(math.abs(flat[2] - f) * n < 1e-7)
      assert.is_true(math.abs((flat[3] - k + math.pi) % (2 * math.pi) - math.pi) < 1e-6)
    end
  end)

  it("gives the same from a narrow interval by direct sums as from a wide one", function()
    local n, w = 1000, sine6(1000)
    local x = record(n, { { 1, 0.2123, 0.3 }, { 0.2, 0.2301, 1 } })
    local narrow = read(x, w, { 0.2123 - 0.7 / n, 0.2123 + 0.4 / n })
    local wide = read(x, w, { 0.1, 0.4 })
    assert.is_true(math.abs(narrow[1] - wide[1]) < 1e-13)
    assert.is_true(math.abs(narrow[2] - wide[2]) * n < 1e-9)
  end)

  it("is the highest point: nothing on a fine grid stands above it", function()
    local n, w = 240, hann(240)
    local x = record(n, { { 1, 0.1, 0 }, { 0.9, 0.113, 2 }, { 0.7, 0.09, 4 }, { 1, 0.3, 1 } })
    local intervals = { { 0.08, 0.12 }, { 0.102, 0.108 }, { 0.2, 0.5 }, { 0.09, 0.0901 } }
    for _, interval in ipairs(intervals) do
      local flat = read(x, w, interval)
      for i = 0, 500 do
        local f = interval[1] + (interval[2] - interval[1]) * i / 500
        assert.is_true(direct(x, w, f) <= flat[1] + 1e-13)
      end
      assert.is_true(math.abs(direct(x, w, flat[2]) - flat[1]) < 1e-13)
    end
  end)

  -- Symptom: 63.0 Hz was read where 62.95 Hz was highest. Cause: block sums, which
  -- find the neighbourhood, had two nearly equal points in the wrong order, and the
  -- climb ended at the next grid point. Fix: it ends at the interval's ends only.
  it("climbs past grid points in a narrow interval beside strong lines", function()
    local n, fs = 1103, 4096
    local w = hann(n)
    local x = record(n, { { 0.719, 62.95 / fs, 1 }, { 0.742, 107.15 / fs, 2.3 },
                          { 0.3, 21.05 / fs, 0.2 }, { 3, 80.1 / fs, 1.9 } })
    for i = 0, 30 do
      local low = (62.9 + 0.004 * i) / fs
      for _, width in ipairs { 0.02, 0.1, 0.4 } do
        local high, top = low + width / fs, 0
        local flat = read(x, w, { low, high })
        for k = 0, 10 do top = math.max(top, (direct(x, w, low + (high - low) * k / 10))) end
        assert.is_true(flat[1] >= top - 1e-13)
      end
    end
  end)

  it("takes an end of the interval when the transform rises towards it", function()
    local n, w = 256, hann(256)
    local x = record(n, { { 1, 0.2, 0.5 } })
    local flat = read(x, w, { 0.2 + 0.3 / n, 0.2 + 0.9 / n, 0.2 - 0.9 / n, 0.2 - 0.3 / n })
    assert.are.equal(0.2 + 0.3 / n, flat[2])
    assert.are.equal(0.2 - 0.3 / n, flat[5])
  end)

  it("reads an undersampled line at its true frequency", function()
    local n, w = 512, sine6(512)
    local x = record(n, { { 1.5, 0.2345, 0.5 } })
    local flat = read(x, w, { 2.2, 2.27, 2.2345 - 1 / n, 2.2345 + 1 / n })
    assert.is_true(math.abs(flat[2] - 2.2345) * n < 1e-8)
    assert.is_true(math.abs(flat[5] - 2.2345) * n < 1e-8)
    assert.is_true(math.abs(flat[1] - 1.5) < 1e-8)
    -- 1 - 0.2345, an inverted zone: cos(2 pi 0.7655 t + p) is -cos(2 pi 0.2345 t - p)
    -- at the half-integer t of an even length.
    local mirrored = read(x, w, { 0.72, 0.8 })
    assert.is_true(math.abs(mirrored[2] - 0.7655) * n < 1e-8)
    assert.is_true(math.abs(mirrored[3] - (math.pi - 0.5)) < 1e-6)
  end)

  it("obeys the shift law", function()
    local n, w, f, shift = 600, sine6(600), 0.1377, 23
    local long = from(record(n + 2 * shift, { { 1, f, 0 } }))
    local tracker = lines.tracker(from(w), { f - 1 / n, f + 1 / n })
    local a, b = tracker:run(long, 1), tracker:run(long, 1 + shift)
    assert.is_true(math.abs(a[1] - b[1]) < 1e-7)
    local turn = (b[3] - a[3] - 2 * math.pi * f * shift + math.pi) % (2 * math.pi) - math.pi
    assert.is_true(math.abs(turn) < 1e-6)
  end)

  it("scales with the record, and is zero for silence", function()
    local n, w = 128, hann(128)
    local x, double = record(n, { { 1, 0.21, 0.1 } }), {}
    for i = 1, n do double[i] = 2 * x[i] end
    local a, b = read(x, w, { 0.15, 0.3 }), read(double, w, { 0.15, 0.3 })
    assert.are.equal(2 * a[1], b[1])
    assert.are.equal(a[2], b[2])
    local none = core.samples.new(n)
    assert.are.equal(0, lines.tracker(from(w), { 0.15, 0.3 }):run(none)[1])
  end)
end)

describe("misuse of a tracker", function()
  local w = from { 1, 1, 1, 1 }

  it("is named", function()
    assert.has_error(function() lines.tracker(w, { 0.1 }) end,
      "bad argument #2 to 'tracker' (not pairs of low and high, or more than 4096 of them)")
    assert.has_error(function() lines.tracker(w, { 0.1, "x" }) end,
      "bad argument #2 to 'tracker' ([2] is not a number)")
    for _, searches in ipairs { { 0.2, 0.1 }, { 0, 1.5 }, { 0 / 0, 1 }, { -math.huge, 0 } } do
      assert.has_error(function() lines.tracker(w, searches) end,
        "tracker: an argument is outside its domain")
    end
    assert.has_error(function() lines.tracker(from { 1, -1, 1, -1 }, {}) end,
      "tracker: an argument is outside its domain")
    local tracker = lines.tracker(w, { 0.1, 0.2 })
    assert.has_error(function() tracker:run(from { 1, 2 }) end,
      "bad argument #1 to 'run' (2 samples, the window has 4)")
    tracker:close()
    assert.has_error(function() tracker:run(w) end,
      "calling 'run' on bad self (the tracker is closed)")
  end)
end)
