local lb = require "libration"
local core = require "libration.core"
local scipy = require "tests.support.scipy_records"

local random = scipy.generator(99)

local function noise(n, offset)
  return lb.samples.make(n, function() return random(-2.385, 2.385) + (offset or 0) end)
end

describe("figures of samples", function()
  -- rows of oracle_values.csv
  it("are the published ones for the test signal", function()
    local x = lb.samples.new(scipy.signal())
    assert.near(scipy.value "kurtosis (Pearson)", x:kurtosis(), 1e-14)
    assert.near(scipy.value "crest,", x:crest(), 1e-14)
    local d = lb.samples.make(#x, function(i) return x[i] + 3 + 0.01 * (i - 1) end)
      :detrend "linear"
    assert.near(scipy.value "detrend linear", d[1], 1e-13)
    assert.near(scipy.value 'detrend,"""",sumsq', d:dot(d), 1e-10)
  end)

  it("agree with NumPy and SciPy at any length", function()
    local whole, lengths = noise(5000, 1.5):square(), { 2, 3, 7, 8, 9, 127, 128, 129, 1009, 5000 }
    local requests = {}
    for _, n in ipairs(lengths) do
      for _, request in ipairs { "first " .. n, "moments", "percentile 0 12.5 50 77.7 99 100",
        "trend mean", "trend linear", "cumsum", "diff" } do
        requests[#requests + 1] = request
      end
    end
    local answers = scipy.ask(whole, requests)
    for i, n in ipairs(lengths) do
      local x, list = whole:slice(1, n), table.move(answers, 7 * i - 5, 7 * i, 1, {})
      local m = list[1]
      assert.near(m[1], x:variance(), 1e-12 * m[1])
      assert.near(math.sqrt(m[1]), x:deviation(), 1e-12 * m[1])
      assert.near(m[2], x:skewness(), 1e-11)
      assert.near(m[3], x:kurtosis(), 1e-11)
      local p = { x:percentile(0, 12.5, 50, 77.7, 99, 100) }
      for k = 1, 6 do assert.near(list[2][k], p[k], 1e-13) end
      assert((x:detrend "mean" - lb.samples.new(list[3])):peak() < 1e-12)
      assert((x:detrend "linear" - lb.samples.new(list[4])):peak() < 1e-12)
      assert((x:cumulative() - lb.samples.new(list[5])):peak() < 1e-10)
      assert((x:differences() - lb.samples.new(list[6])):peak() == 0)
      assert(x:detrend "none" == x)
    end
  end)

  -- rows of crest_factor.csv would need multisines; a sine has sqrt(2) and 3/2
  it("are those of a sine", function()
    local x = lb.samples.make(10000, function(i) return 3 * math.sin(2 * math.pi * i / 40) end)
    assert.near(math.sqrt(2), x:crest(), 1e-12)
    assert.near(1.5, x:kurtosis(), 1e-12)
    assert.near(0, x:skewness(), 1e-12)
  end)

  it("lose no digits to a large mean", function()
    local x = noise(1000)
    local y = x + 2 ^ 30
    local exact = (y - 2 ^ 30):variance()
    assert.near(exact, y:variance(), 1e-12)
    assert.near((y - 2 ^ 30):kurtosis(), y:kurtosis(), 1e-9)
  end)

  it("are no numbers where a sample is none, and raise without samples", function()
    local x = noise(20)
    x[7] = 0 / 0
    for _, name in ipairs { "variance", "skewness", "kurtosis", "crest" } do
      local value = x[name](x)
      assert(value ~= value, name)
      assert(not pcall(x[name], lb.samples.new(0)), name)
    end
    local median = x:percentile(50)
    assert(median ~= median)
    assert(not pcall(x.percentile, x, 101) and not pcall(x.percentile, x))
    assert(not pcall(x.variance, lb.samples.new(1)))
  end)
end)

describe("percentiles", function()
  it("are the sorted samples, with ties and in any order, and leave them as they are", function()
    for n = 1, 200 do
      local list = {}
      for i = 1, n do list[i] = math.floor(random(0, n % 3 == 0 and 4 or 1000)) end
      local x = lb.samples.new(list)
      table.sort(list)
      local copy = x:copy()
      for _, rank in ipairs { 0, n // 3, n // 2, n - 1 } do
        local percent = n > 1 and 100 * rank / (n - 1) or 0
        assert.near(list[rank + 1], x:percentile(percent), 1e-9)
      end
      assert(x == copy)
    end
  end)

  it("take infinite samples", function()
    local x = lb.samples.new { -math.huge, 1, math.huge, math.huge }
    assert.equal(math.huge, x:percentile(90))
    assert.equal(-math.huge, x:percentile(0))
  end)
end)

describe("histograms", function()
  it("count every sample once", function()
    local x = noise(5000)
    x[9], x[10] = 0 / 0, math.huge
    local count, below, above, odd = x:histogram(-2, 2, 37)
    assert.equal(5000, math.floor(count:sum()) + below + above + odd)
    assert.equal(1, odd)
    for i = 1, 37 do
      local low, high, n = -2 + 4 * (i - 1) / 37, -2 + 4 * i / 37, 0
      for k = 1, 5000 do
        if x[k] >= low and x[k] < high then n = n + 1 end
      end
      assert.equal(n, count[i])
    end
  end)

  it("count codes", function()
    local codes, list = {}, {}
    for i = 1, 3000 do
      codes[i] = math.floor(random(-40, 40))
      list[codes[i]] = (list[codes[i]] or 0) + 1
    end
    local bytes = {}
    for i, code in ipairs(codes) do bytes[i] = string.pack("<i3", code) end
    local r = lb.samples.raw(table.concat(bytes), "int24")
    local count, below, above = r:codes(-30, 30)
    for code = -30, 30 do assert.equal(list[code] or 0, count[code + 31]) end
    assert(below > 0 and above > 0)
    assert.equal(3000, math.floor(count:sum()) + below + above)
    assert.equal(65536, #lb.samples.raw("\0\0", "int16"):codes())
    assert(not pcall(r.codes, r) and not pcall(r.codes, r, 5, 4))
    assert(not pcall(r.codes, lb.samples.raw("", "float32")))
  end)

  it("refuse edges that are none", function()
    local x = noise(5)
    assert(not pcall(x.histogram, x, 1, 1, 5) and not pcall(x.histogram, x, 0, math.huge, 5))
    assert(not pcall(x.histogram, x, 0, 5e-324, 5)) -- bins per unit would be infinite
    assert(not pcall(x.histogram, x, -1.7e308, 1.7e308, 5) and not pcall(x.histogram, x, 0, 1, 0))
  end)
end)

describe("functions of samples", function()
  it("are those of Lua, sample by sample", function()
    local x = noise(333)
    local pairs_ = { abs = math.abs, exp = math.exp, ln = math.log,
      square = function(v) return v * v end, sqrt = math.sqrt,
      log10 = function(v) return math.log(v, 10) end,
      clip = function(v) return math.max(-1, math.min(0.5, v)) end,
      round = function(v) return v < 0 and -math.floor(0.5 - v) or math.floor(v + 0.5) end }
    for name, f in pairs(pairs_) do
      local y = x[name](x, -1, 0.5)
      for i = 1, #x do
        local want = f(x[i])
        assert(want ~= want and y[i] ~= y[i] or math.abs(want - y[i]) < 1e-13, name)
      end
    end
    assert(not pcall(x.clip, x, 1, -1))
  end)

  it("sum as they go without growing error", function()
    local x = lb.samples.new(1000000):fill(0.1)
    local y = x:cumulative()
    assert.near(100000, y[1000000], 2e-11)
    assert.equal(math.huge, lb.samples.new { 1, math.huge, 1 }:cumulative()[3])
  end)

  it("join", function()
    local x, y = noise(5), noise(7)
    local z = x .. y .. x
    assert(#z == 17 and z:slice(6, 12) == y and z:slice(13) == x)
    assert(#lb.samples.join() == 0)
    assert(not pcall(function() return x .. "a" end))
  end)

  it("say which trends there are", function()
    local ok, message = pcall(core.samples.new(3).detrend, core.samples.new(3), "line")
    assert(not ok and message:find('"line" is no trend; choose none, mean or linear', 1, true))
  end)
end)
