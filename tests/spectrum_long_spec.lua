-- Transforms of long and awkward records, zooms and quadratures: laws, direct
-- sums, and SciPy's values.
local core = require "libration.core"
local lb = require "libration"
local oracle = require "tests.support.oracle"

local spectrum = core.spectrum
local EPSILON = 2 ^ -52

local function noise(n, seed)
  return lb.synth.noise { rate = 1, samples = n, seed = seed, density = 2 ^ 0.5 }
end

local function near(expected, got, tolerance)
  assert(math.abs(got - expected) <= tolerance * math.abs(expected),
    ("expected %.17g, got %.17g"):format(expected, got))
end

-- The bin k of n points by a direct sum of exactly reduced phases, summed in
-- runs so that rounding stays small.
local function direct(x, k, n)
  local re, im = 0, 0
  for from = 1, #x, 1024 do
    local a, b = 0, 0
    for i = from, math.min(#x, from + 1023) do
      local angle = 2 * math.pi * ((i - 1) * k % n) / n
      a, b = a + x[i] * math.cos(angle), b - x[i] * math.sin(angle)
    end
    re, im = re + a, im + b
  end
  return re, im
end

-- Error of some bins over their size, in the 2-norm.
local function error_of(x, n, re, im)
  local wrong, size = 0, 0
  for i = 1, n > 20000 and 2 or 6 do
    local k = (i * i * 7919 + i) % (n // 2 + 1)
    local a, b = direct(x, k, n)
    wrong = wrong + (re[k + 1] - a) ^ 2 + (im[k + 1] - b) ^ 2
    size = size + a ^ 2 + b ^ 2
  end
  return (wrong / size) ^ 0.5
end

describe("a single transform", function()
  -- Even and odd, smooth, prime, twice a prime, in one piece, in pieces, by a chirp.
  for _, n in ipairs { 1, 2, 7, 1009, 4999, 2 * 3001, 10007, 50000, 135000, 262144 } do
    it(("of %d points agrees with direct sums"):format(n), function()
      local x = noise(n, n)
      local re, im = spectrum.single(n, 2):run(x)
      assert.are.equal(n // 2 + 1, #re)
      -- The sums above err themselves; the limit is one epsilon sqrt(log2 N) and theirs.
      local limit = (1 + (n > 2 and math.log(n, 2) ^ 0.5 or 1)) * EPSILON
      assert(error_of(x, n, re, im) < 4 * limit, n)
    end)
  end

  it("stays below one epsilon sqrt(log2 N), against its own inverse and Parseval", function()
    for _, n in ipairs { 262144, 10007, 100003 } do
      local x = noise(n, 3)
      local re, im = spectrum.single(n):run(x)
      local back = spectrum.back(re, im, n)
      local off = back - x
      local limit = EPSILON * math.log(n, 2) ^ 0.5
      -- There and back: two transforms, each within the limit.
      assert(off:rms() / x:rms() < 2 * limit, n)
      local power = 2 * (re:dot(re) + im:dot(im)) - re[1] ^ 2
      if n % 2 == 0 then power = power - re[#re] ^ 2 end
      near(x:dot(x), power / n, 1e-14)
    end
  end)

  it("does not lose its low bins: 8192 lines alone", function()
    -- fft_accuracy.csv of the project's check values: a recurrence loses 5e-11 here.
    local n = 8192
    local x = noise(n, 9)
    local re, im = spectrum.single(n):run(x)
    for _, k in ipairs { 1, 2, 3, n // 4 + 1 } do
      local a, b = direct(x, k, n)
      assert(math.abs(re[k + 1] - a) + math.abs(im[k + 1] - b) < 1e-15 * n ^ 0.5 * 40)
    end
  end)

  it("takes a window and pads, in pieces as in one", function()
    for _, n in ipairs { 4096, 262144, 10007 } do
      local m = n - n // 5
      local x, w = noise(m, 5), lb.window("hann"):samples(m)
      local padded = lb.samples.new(n)
      padded:slice(1, m):fill(x * w)
      local t = spectrum.single(n)
      local re, im = t:run(x, w)
      local re2, im2 = t:run(padded)
      assert((re - re2):rms() + (im - im2):rms() < 1e-13 * n ^ 0.5)
      local re3 = spectrum.windowed(x, w, n)
      assert.are.equal(re, re3)
    end
  end)

  it("has the same bits for any number of workers", function()
    for _, n in ipairs { 262144, 200003 } do
      local x = noise(n, 6)
      local re, im = spectrum.single(n, 1):run(x)
      for _, workers in ipairs { 2, 3 } do
        local re2, im2 = spectrum.single(n, workers):run(x)
        assert.are.equal(re, re2)
        assert.are.equal(im, im2)
      end
    end
  end)

  -- Symptom: a crash when an object was freed. Cause: forgetting twice gave back what the
  -- planner keeps although a plan that the first time had left alone was still in use.
  it("outlives plans being forgotten, twice", function()
    local x = noise(2048, 2)
    local t = spectrum.single(2048)
    local re = t:run(x)
    spectrum.forget()
    spectrum.forget()
    assert.are.equal(re, (t:run(x)))
    t:close()
    assert.are.equal(re, (spectrum.single(2048):run(x)))
  end)

  it("is the same to rounding after tuning, plans in use included", function()
    local x = noise(360, 2)
    local t = spectrum.single(360)
    local re = t:run(x)
    spectrum.tune(360)
    assert((t:run(x) - re):peak() == 0)
    assert((spectrum.forward(x) - re):rms() < 1e-15 * re:rms())
    spectrum.forget()
    assert.are.equal(re, (spectrum.single(360):run(x)))
  end)

  it("writes into blocks that are there, small ones too", function()
    local x, w = noise(64, 1), lb.window("hann"):samples(64)
    local re, im = lb.samples.new(33), lb.samples.new(33)
    local a, b = spectrum.windowed(x, w, 64, re, im)
    assert(rawequal(a, re) and rawequal(b, im))
    local c = spectrum.windowed(x, w)
    assert.are.equal(c, re)
    assert.has_error(function() spectrum.windowed(x, w, 64, re, re) end,
      "bad argument #5 to 'windowed' (the same block twice)")
    assert.has_error(function() spectrum.forward(x, 64, lb.samples.new(3), im) end,
      "bad argument #3 to 'forward' (not points // 2 + 1 values)")
  end)
end)

describe("a zoom", function()
  local x, y = oracle.signals()

  it("gives SciPy's values", function()
    local re, im = lb.spectrum.zoom(x, { rate = 1000, first_hz = 245, step_hz = 10 / 101,
      points = 101 })
    near(oracle.value("zoom_fft(x", "|Z[53]|"), (re[54] ^ 2 + im[54] ^ 2) ^ 0.5 * 2 / 4096, 1e-9)
    re, im = lb.spectrum.zoom(x, { rate = 1000, first_hz = 250, step_hz = 0.1, points = 8 })
    near(oracle.value("czt(x", "|cz[3]|"), (re[4] ^ 2 + im[4] ^ 2) ^ 0.5 * 2 / 4096, 1e-9)
    near(oracle.value("sum(x exp(-2i pi f n/fs))", "abs*2/N"),
      (re[4] ^ 2 + im[4] ^ 2) ^ 0.5 * 2 / 4096, 1e-11)
    assert.are.equal(4096, #y)
  end)

  it("is the transform where its frequencies are bins", function()
    for _, n in ipairs { 1, 5, 100, 101, 5000 } do
      local v = noise(n, 8)
      local a, b = spectrum.forward(v)
      local re, im = spectrum.zoom(n, 0, 1 / n, n // 2 + 1):run(v)
      for k = 1, n // 2 + 1 do
        -- 1 / n is rounded: phases at the end are off by up to n EPSILON.
        assert(math.abs(a[k] - re[k]) + math.abs(b[k] - im[k]) < 4 * EPSILON * n ^ 1.5 + 1e-14)
      end
    end
  end)

  -- Frequencies that are exact in binary, so that direct sums see the same ones.
  for _, case in ipairs { { 32768, 0.125, 2 ^ -26, 300 }, { 16384, 0, 2 ^ -30, 50 },
                          { 40001, 0.25, 2 ^ -20, 200 }, { 16385, 0.499755859375, 2 ^ -22, 64 },
                          { 30000, 0.125, -2 ^ -24, 100 }, { 9000, 0.3125, 0, 1 } } do
    it(("of %d samples, %g + k %g, agrees with direct sums after thinning out"):format(
      table.unpack(case)), function()
      local n, first, step, points = table.unpack(case)
      local v = noise(n, 4)
      local z = spectrum.zoom(n, first, step, points, 2)
      assert(z:decimation() > 8)
      local re, im = z:run(v)
      local wrong, size = 0, 0
      for k = 0, points - 1, math.max(1, points // 2) do
        local a, b = direct(v, (first + k * step) * 2 ^ 30, 2 ^ 30)
        wrong = math.max(wrong, math.abs(re[k + 1] - a), math.abs(im[k + 1] - b))
        size = math.max(size, math.abs(a), math.abs(b))
      end
      assert(wrong < 1e-11 * size, ("%g of %g"):format(wrong, size))
    end)
  end

  it("lets nothing fold in: a strong line far away, a weak one in the band", function()
    local n = 32768
    local function line(f, a)
      return lb.samples.make(n, function(i) return a * math.cos(2 * math.pi * (f * i % 1)) end)
    end
    local weak = line(0.125, 1e-6)
    local function at(v) return spectrum.zoom(n, 0.125, 2 ^ -26, 9):run(v) end
    local quiet = at(weak)
    for _, f in ipairs { 5 / 16, 3 / 32, 0.375, 0.25 } do
      local both = at(weak + line(f, 1))
      assert(math.abs(both[1] - quiet[1]) < 1e-9 * math.abs(quiet[1]))
    end
  end)

  it("says what is wrong", function()
    for text, o in pairs {
      ["unknown field stp_hz; valid are first_hz, points, rate, step_hz, window, workers"] =
        { stp_hz = 1 },
      ["first_hz is nil; it must be a number of Hz within the rate"] = { first_hz = false },
      ["points is 0; it must be an integer from 1"] = { points = 0 },
    } do
      local given = { rate = 1000, first_hz = 1, step_hz = 1, points = 3 }
      for key, value in pairs(o) do given[key] = value or nil end
      local done, message = pcall(lb.spectrum.zoom, x, given)
      assert(not done and message:find(text, 1, true), message)
    end
  end)
end)

describe("the quadrature", function()
  it("gives SciPy's hilbert", function()
    local x = oracle.signals()
    local q = lb.spectrum.quadrature(x)
    near(oracle.value("hilbert(x)", "imag[2000]"), q[2001], 1e-9)
    near(oracle.value("hilbert(x)", "abs[2000]"), (x[2001] ^ 2 + q[2001] ^ 2) ^ 0.5, 1e-9)
  end)

  it("turns cosines into sines, twice into their negative", function()
    for _, n in ipairs { 64, 63, 1 } do
      local c = lb.samples.make(n, function(i) return math.cos(2 * math.pi * 5 * i / n + 0.3) end)
      local s = lb.samples.make(n, function(i) return math.sin(2 * math.pi * 5 * i / n + 0.3) end)
      local q = spectrum.quadrature(c)
      if n > 1 then
        assert((q - s):peak() < 1e-14)
        assert((spectrum.quadrature(q) + c):peak() < 1e-14)
      else
        assert.are.equal(0, q[1])
      end
    end
  end)
end)
