-- Transforms against compensated direct sums and against their own laws.
local core = require "libration.core"
local spectrum = core.spectrum

local EPSILON = 2 ^ -52

-- Entropic values in (-1, 1): the fractional parts of n^2 times an irrational.
local function values(n, step)
  local out = {}
  for i = 1, n do out[i] = 2 * ((i * i * step + 0.137) % 1) - 1 end
  return out
end

-- Direct sum with Neumaier's compensated summation and exactly reduced phases.
local function direct(x, k)
  local n = #x
  local re, im, re_rest, im_rest = 0, 0, 0, 0
  local function add(sum, rest, term)
    local new = sum + term
    if math.abs(sum) >= math.abs(term) then
      return new, rest + ((sum - new) + term)
    end
    return new, rest + ((term - new) + sum)
  end
  for i = 0, n - 1 do
    local angle = 2 * math.pi * (i * k % n) / n
    re, re_rest = add(re, re_rest, x[i + 1] * math.cos(angle))
    im, im_rest = add(im, im_rest, -x[i + 1] * math.sin(angle))
  end
  return re + re_rest, im + im_rest
end

-- Relative error in the 2-norm over at most some 60 bins, spread evenly.
local function error_against_direct(x)
  local re, im = spectrum.forward(core.samples.from(x))
  local wrong, size = 0, 0
  for k = 0, #x // 2, #x // 120 + 1 do
    local a, b = direct(x, k)
    wrong = wrong + (re[k + 1] - a) ^ 2 + (im[k + 1] - b) ^ 2
    size = size + a ^ 2 + b ^ 2
  end
  return (wrong / size) ^ 0.5
end

describe("the transform", function()
  -- Limit: fftw.org/accuracy/method.html, "L2 forward error of a well-implemented
  -- FFT grows as O(sqrt(log N))"; the factor 1 is common practice, measured 0.2 to
  -- 0.3 for double precision.
  for _, n in ipairs { 16, 64, 256, 1024 } do
    it(("is within one epsilon sqrt(log2 N) of direct sums, N = %d"):format(n), function()
      assert.is_true(error_against_direct(values(n, 0.6180339887)) < EPSILON * math.log(n, 2) ^ 0.5)
    end)
  end

  for _, n in ipairs { 1, 2, 3, 17, 45, 101, 225, 1009 } do
    it(("agrees with direct sums at odd, prime and tiny lengths, N = %d"):format(n), function()
      assert.is_true(error_against_direct(values(n, 2.385)) < 8 * EPSILON)
    end)
  end

  it("makes ones of an impulse and one line of a constant", function()
    local impulse, constant = {}, {}
    for i = 1, 12 do impulse[i], constant[i] = i == 1 and 1 or 0, 1 end
    local re, im = spectrum.forward(core.samples.from(impulse))
    for k = 1, 7 do assert.are.same({ 1, 0 }, { re[k], math.abs(im[k]) }) end
    re, im = spectrum.forward(core.samples.from(constant))
    assert.are.equal(12, re[1])
    for k = 2, 7 do assert.is_true(math.abs(re[k]) + math.abs(im[k]) < 1e-14) end
  end)

  it("is linear", function()
    local a, b, sum = values(90, 0.577), values(90, 0.301), {}
    for i = 1, 90 do sum[i] = 2.5 * a[i] - 0.75 * b[i] end
    local ra, ia = spectrum.forward(core.samples.from(a))
    local rb, ib = spectrum.forward(core.samples.from(b))
    local rs, is = spectrum.forward(core.samples.from(sum))
    for k = 1, 46 do
      assert.is_true(math.abs(rs[k] - 2.5 * ra[k] + 0.75 * rb[k]) < 1e-13)
      assert.is_true(math.abs(is[k] - 2.5 * ia[k] + 0.75 * ib[k]) < 1e-13)
    end
  end)

  it("keeps the energy (Parseval), even and odd lengths", function()
    for _, n in ipairs { 120, 121 } do
      local x, energy, power = values(n, 0.7071), 0, 0
      for i = 1, n do energy = energy + x[i] ^ 2 end
      local re, im = spectrum.forward(core.samples.from(x))
      for k = 0, n // 2 do
        local sides = (k == 0 or 2 * k == n) and 1 or 2
        power = power + sides * (re[k + 1] ^ 2 + im[k + 1] ^ 2)
      end
      assert.is_true(math.abs(power / n / energy - 1) < 1e-14)
    end
  end)

  it("turns phases by the shift", function()
    local n, shift, x, y = 48, 7, values(48, 0.5772), {}
    for i = 0, n - 1 do y[i + 1] = x[(i - shift) % n + 1] end
    local rx, ix = spectrum.forward(core.samples.from(x))
    local ry, iy = spectrum.forward(core.samples.from(y))
    for k = 0, n // 2 do
      local c, s = math.cos(2 * math.pi * k * shift / n), math.sin(2 * math.pi * k * shift / n)
      assert.is_true(math.abs(ry[k + 1] - rx[k + 1] * c - ix[k + 1] * s) < 1e-13)
      assert.is_true(math.abs(iy[k + 1] - ix[k + 1] * c + rx[k + 1] * s) < 1e-13)
    end
  end)

  it("comes back", function()
    for _, n in ipairs { 1, 2, 15, 64, 97 } do
      local x = values(n, 1.4142)
      local re, im = spectrum.forward(core.samples.from(x))
      local y = spectrum.back(re, im, n)
      for i = 1, n do assert.is_true(math.abs(y[i] - x[i]) < 1e-14) end
    end
  end)

  it("multiplies by the window and pads with zeros", function()
    local x, w, padded = values(10, 0.31), values(10, 0.77), {}
    for i = 1, 24 do padded[i] = i <= 10 and x[i] * w[i] or 0 end
    local re, im = spectrum.windowed(core.samples.from(x), core.samples.from(w), 24)
    local r2, i2 = spectrum.forward(core.samples.from(padded))
    assert.are.equal(13, #re)
    for k = 1, 13 do assert.are.same({ r2[k], i2[k] }, { re[k], im[k] }) end
  end)

  it("gives the same bits from a fresh plan", function()
    local x = core.samples.from(values(360, 0.123))
    local re = spectrum.forward(x)
    spectrum.forget()
    local again = spectrum.forward(x)
    for k = 1, #re do assert.are.equal(re[k], again[k]) end
  end)

  it("survives more lengths than it keeps plans for", function()
    for n = 20, 90 do
      assert.are.equal(n // 2 + 1, #spectrum.forward(core.samples.from(values(n, 0.3))))
    end
  end)

  it("finds the next fast length", function()
    local fast = {}
    for n = 1, 30 do fast[spectrum.fast_length(n)] = true end
    local list = {}
    for n in pairs(fast) do list[#list + 1] = n end
    table.sort(list)
    assert.are.same({ 1, 2, 3, 4, 5, 6, 8, 9, 10, 12, 15, 16, 18, 20, 24, 25, 27, 30 }, list)
  end)
end)

describe("lb.spectrum", function()
  local lb = require "libration"

  it("transforms, pads, windows and comes back", function()
    local x, w = core.samples.from(values(20, 0.37)), core.samples.from(values(20, 0.91))
    local t = lb.spectrum.transform(x, { window = w, points = 32 })
    local re, im = spectrum.windowed(x, w, 32)
    assert.are.same({ 17, 32, 20 }, { #t.re, t.points, t.samples })
    for k = 1, 17 do assert.are.same({ re[k], im[k] }, { t.re[k], t.im[k] }) end
    local y = t:inverse()
    for i = 1, 32 do
      assert.is_true(math.abs(y[i] - (i <= 20 and x[i] * w[i] or 0)) < 1e-15)
    end
    assert.are.equal(spectrum.fast_length(77), lb.spectrum.fast_length(77))
    assert.has_error(function() lb.spectrum.transform(x, { pionts = 1 }) end,
      "transform: unknown option pionts; valid are points, window")
  end)
end)

describe("misuse of the transform", function()
  local x = core.samples.from { 1, 2, 3, 4 }

  it("names the argument", function()
    assert.has_error(function() spectrum.forward(x, 3) end,
      "bad argument #2 to 'forward' (3 is not a count between 4 and 134217728)")
    assert.has_error(function() spectrum.windowed(x, core.samples.from { 1, 2 }) end,
      "bad argument #2 to 'windowed' (2 window samples for 4 samples)")
    assert.has_error(function() spectrum.back(x, x, 4) end,
      "bad argument #1 to 'back' (not points // 2 + 1 values)")
    assert.has_error(function() spectrum.forward(core.samples.new(0)) end,
      "bad argument #1 to 'forward' (no samples to transform)")
    assert.has_error(function() spectrum.fast_length(0) end,
      "bad argument #1 to 'fast_length' (0 is not a count between 1 and 134217728)")
  end)
end)
