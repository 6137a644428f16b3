-- Laws of window kernels against sums over samples, sample by sample.
local lb = require "libration"

local LENGTHS = { 4, 5, 6, 7, 8, 12, 16, 17, 31, 48, 64, 65, 97, 150 }

-- A generator of our own, so that runs repeat on any Lua build.
local function generator(seed)
  local state = seed
  return function(low, high)
    state = (state * 6364136223846793005 + 1442695040888963407) & math.maxinteger
    return low + (high - low) * ((state >> 10) / (math.maxinteger >> 10))
  end
end

-- Every window, and those with a parameter at its ends too.
local function each_window(visit)
  for _, name in ipairs(lb.windows()) do
    visit(lb.window(name))
  end
  for _, case in ipairs { { "kaiser", 0 }, { "kaiser", 2.5 }, { "kaiser", 40 }, { "tukey", 0.001 },
    { "tukey", 0.1 }, { "tukey", 0.77 }, { "tukey", 1 }, { "gaussian", 0.5 }, { "gaussian", 8 },
    { "cosine_power", 2 }, { "cosine_power", 3 }, { "cosine_power", 12 }, { "prolate", 0.5 },
    { "prolate", 10 }, { "dolph_chebyshev", 30 }, { "dolph_chebyshev", 150 } } do
    visit(lb.window(case[1], case[2]))
  end
end

local function label(w, n, x)
  return ("%s %s, n %d, x %.17g"):format(w.name, tostring(w.parameter), n, x)
end

-- The transform seen from the middle of the window, over that at 0.
local function transform(samples, x)
  local n, re, im, sum = #samples, 0, 0, 0
  for i = 0, n - 1 do
    local angle, w = 2 * math.pi * math.fmod(x * (i / n - 0.5), 1), samples[i + 1]
    re, im, sum = re + w * math.cos(angle), im + w * math.sin(angle), sum + w
  end
  return re / sum, im / sum
end

local function size(samples, x)
  local re, im = transform(samples, x)
  return math.sqrt(re * re + im * im)
end

-- Distances of every kind: anywhere in three periods, near and on the poles.
local function distance(random, n)
  local x, kind = random(-1.5, 1.5) * n, random(0, 4)
  local near = math.floor(2 * x + 0.5) / 2
  return kind < 1 and near or kind < 2 and near + 10 ^ random(-9, -1) or kind < 3 and random(-6, 6)
    or x
end

describe("window kernels", function()
  it("have the gain of direct sums over the samples", function()
    local random = generator(1)
    each_window(function(w)
      for _, n in ipairs(LENGTHS) do
        local samples = w:samples(n):totable()
        for _ = 1, 10 do
          local x = distance(random, n)
          local wrong = math.abs(w:gain(x, n) - size(samples, x))
          assert.truthy(wrong < 1e-12, label(w, n, x))
        end
      end
    end)
    for _, name in ipairs { "hann", "hft248d", "kaiser", "tukey", "dolph_chebyshev", "prolate" } do
      local w, n = lb.window(name), 1021
      local samples = w:samples(n):totable()
      for _ = 1, 20 do
        local x = distance(random, n)
        assert.truthy(math.abs(w:gain(x, n) - size(samples, x)) < 1e-12, label(w, n, x))
      end
    end
  end)

  it("approach their limit as the square of the length", function()
    each_window(function(w)
      if w.name ~= "dolph_chebyshev" and not (w.name == "tukey" and w.parameter < 0.01) then
        for _, x in ipairs { 0.4, 1.7, 5.3, 12.9 } do
          local limit = w:gain(x)
          assert.truthy(math.abs(w:gain(x, 1 << 20) - limit) < 1e-6, label(w, 0, x))
        end
      end
    end)
  end)

  it("enclose the gain everywhere, tightly", function()
    local random = generator(2)
    each_window(function(w)
      for i = 1, 50 do
        local n = LENGTHS[1 + i % #LENGTHS]
        local wide = 10 ^ random(-6, 0.5)
        local x1 = distance(random, n) - random(0, 1) * wide
        local low, high = w:range(x1, x1 + wide, n)
        local steps = wide < 0.1 and 20 or 160
        local least, most = math.huge, 0
        for j = 0, steps do
          local g = w:gain(x1 + wide * j / steps, n)
          least, most = math.min(least, g), math.max(most, g)
        end
        assert.truthy(low <= least + 1e-12 and most <= high + 1e-12, label(w, n, x1))
        assert.truthy(high <= (1 + 2e-3) * most + 2e-9, label(w, n, x1))
        if wide < 0.01 then
          -- the least of 21 samples is at most half a step off the least
          assert.truthy(low >= 0.998 * least - 0.06 * (most - least) - 2e-9, label(w, n, x1))
        end
      end
    end)
  end)

  it("enclose wide intervals, and intervals far out", function()
    local random = generator(3)
    for _, name in ipairs { "rectangular", "hann", "blackman_harris4", "flat_top_77", "hft95",
      "kaiser", "tukey", "cosine_power", "dolph_chebyshev" } do
      local w, n = lb.window(name), 4099
      for i = 1, 10 do
        local wide = i <= 5 and 10 ^ random(1, 3) or 10 ^ random(-4, 0)
        local x1 = i <= 3 and random(-20, 20) or random(-2.2, 2.2) * n
        local low, high = w:range(x1, x1 + wide, n)
        local steps = math.max(100, math.ceil(32 * wide))
        local least, most = math.huge, 0
        for j = 0, steps do
          local g = w:gain(x1 + wide * j / steps, n)
          least, most = math.min(least, g), math.max(most, g)
        end
        assert.truthy(low <= least + 1e-12 and most <= high + 1e-12, label(w, n, x1))
        assert.truthy(high <= (1 + 3e-3) * most + 2e-9, label(w, n, x1))
      end
    end
  end)

  it("see the zeros of coherent records", function()
    for _, name in ipairs { "rectangular", "hann", "hft95" } do
      for _, k in ipairs { 7, 100, 1234, 2047 } do
        local _, high = lb.window(name):range(k - 1e-4, k + 1e-4, 4096)
        local _, open = lb.window(name):range(k + 0.4, k + 0.5, 4096)
        assert.truthy(high < 2e-4 / k + 1e-9 and (open > 100 * high or open < 1e-6))
      end
    end
  end)

  it("bound the slope of the transform", function()
    local random = generator(4)
    each_window(function(w)
      for i = 1, 12 do
        local n = LENGTHS[1 + i % #LENGTHS]
        local samples = w:samples(n):totable()
        local wide, step = 10 ^ random(-3, 0.3), 1e-5
        local x1 = distance(random, n)
        local bound = w.kernel:slope(x1, x1 + wide, n)
        local most = 0
        for j = 0, 10 do
          local x = x1 + wide * j / 10
          local a, b = transform(samples, x - step)
          local c, d = transform(samples, x + step)
          most = math.max(most, math.sqrt((a - c) ^ 2 + (b - d) ^ 2) / (2 * step))
        end
        assert.truthy(most <= bound + 2e-9, label(w, n, x1))
        if wide < 0.01 then
          assert.truthy(bound <= most * 1.01 + 0.02, label(w, n, x1))
        end
      end
    end)
  end)

  it("bound the curvature about the peak from below", function()
    for _, name in ipairs { "rectangular", "hann", "blackman_harris4", "kaiser", "tukey" } do
      local w = lb.window(name)
      for _, n in ipairs { 16, 65, 150 } do
        local samples = w:samples(n):totable()
        for _, radius in ipairs { 0, 0.1, 0.5 } do
          local bound, least, h = w.kernel:curvature(radius, n), math.huge, 1e-3
          for j = -10, 10 do
            local x = radius * j / 10
            local middle, up, down = transform(samples, x), transform(samples, x + h),
              transform(samples, x - h)
            least = math.min(least, (2 * middle - up - down) / (h * h))
          end
          assert.truthy(bound <= least + 1e-5 and bound >= 0.98 * least - 1e-4, label(w, n, radius))
        end
      end
    end
    assert.equal(0, lb.window("hft95").kernel:curvature(1, 64))
  end)

  it("reach a level where it is first reached", function()
    each_window(function(w)
      for _, n in ipairs { 64, 150 } do
        for _, level in ipairs { 0.9, 0.5, 0.01 } do
          local x = w.kernel:reach(level, n)
          assert.truthy(math.abs(w:gain(x, n) - level) < 1e-5, label(w, n, x))
          assert.truthy(w:gain(x, n) >= level - 1e-9, label(w, n, x))
          for j = 0, 49 do
            assert.truthy(w:gain(x * j / 50, n) >= level, label(w, n, x))
          end
        end
      end
    end)
    assert.equal(0, lb.window("hann").kernel:reach(1, 64))
    assert.truthy(math.abs(lb.window("hann").kernel:reach(0.5) - 1) < 1e-6)
  end)

  it("have the sums of their samples", function()
    each_window(function(w)
      for _, n in ipairs { 5, 16, 64, 65, 97, 150, 1000 } do
        local sum, squares, sizes = 0, 0, 0
        for _, v in ipairs(w:samples(n):totable()) do
          sum, squares, sizes = sum + v, squares + v * v, sizes + math.abs(v)
        end
        local width = n * squares / (sum * sum)
        assert.truthy(math.abs(w.kernel:noise_bandwidth(n) / width - 1) < 1e-11, label(w, n, 0))
        assert.truthy(math.abs(w.kernel:absolute(n) / (sizes / sum) - 1) < 1e-11, label(w, n, 0))
        assert.truthy(w.kernel:peak(n) >= 1 and w.kernel:peak(n) <= sizes / sum + 1e-9)
      end
    end)
    -- flat tops rise off the middle of their lobe, by their flatness
    local f = lb.window("hft95"):figures()
    assert.truthy(math.abs(lb.window("hft95").kernel:peak() - 10 ^ (f.flatness_db / 20)) < 1e-5)
  end)
end)
