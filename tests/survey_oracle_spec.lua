-- Averaged spectra against SciPy 1.10.1: stored values, and live over random inputs.
local core = require "libration.core"
local lb = require "libration"
local oracle = require "tests.support.oracle"

local x, y = oracle.signals()

local function near(expected, got, tolerance)
  local off = math.abs(got - expected)
  assert(off <= (tolerance or 1e-9) * math.abs(expected), ("expected %.15g, got %.15g"):format(
    expected, got))
end

local function options(with)
  local out = { rate = 1000, segment = 512, unit = "V" }
  for key, value in pairs(with or {}) do out[key] = value end
  return out
end

describe("the test signals", function()
  it("are the ones whose sums are published", function()
    near(oracle.value("x.sum()", "sum"), x:sum(), 1e-12)
    near(oracle.value("(x**2).sum()", "sumsq"), x:dot(x), 1e-13)
    near(oracle.value("y.sum()", "sum"), y:sum(), 1e-12)
    near(oracle.value("(y**2).sum()", "sumsq"), y:dot(y), 1e-13)
  end)
end)

describe("line spectra agree with SciPy's periodogram", function()
  for _, case in ipairs {
    { "boxcar", "rectangular" }, { "hann", "hann" }, { "flattop", "flat_top_93" },
    { "blackmanharris", "blackman_harris4" },
  } do
    it(case[1], function()
      local s = lb.survey.lines(x, options { segment = 4096, window = case[2] })
      local call = ("periodogram(x,fs,window='%s'"):format(case[1])
      near(oracle.value(call, "P[1025]"), s.values[1026])
      near(oracle.value(call, "P[410]"), s.values[411])
    end)
  end
end)

describe("density spectra agree with SciPy's welch", function()
  for _, case in ipairs {
    { "hann", 512, 256, "hann", 51 }, { "hann", 1024, 768, "hann", 102 },
    { "boxcar", 256, 0, "rectangular", 26 },
    { "hamming", 500, 250, "hamming", 50 },
    { "flattop", 1024, 512, "flat_top_93", 102 },
  } do
    it(("%s, %d samples, %d shared"):format(table.unpack(case)), function()
      local s = lb.survey.density(x, options { segment = case[2], step = case[2] - case[3],
        window = case[4] })
      local call = ("welch(x,fs,window='%s',nperseg=%d,noverlap=%d"):format(table.unpack(case))
      near(oracle.value(call, "argmax"), s.values[case[5] + 1])
      near(oracle.value(call, "P[0]"), s.values[1])
      near(oracle.value(call, "P[-1]"), s.values[#s.values])
      near(oracle.value(call, "sum(P)*df"), s:mean_square(0, 500))
    end)
  end

  it("with the mean taken from every segment", function()
    local s = lb.survey.density(x, options { detrend = "mean" })
    near(oracle.value("welch(x,fs,nperseg=512)", "P[51]"), s.values[52])
    near(oracle.value("welch(x,fs,nperseg=512)", "P[0]"), s.values[1], 1e-8)
  end)

  -- SciPy takes the bias of the median for the number of segments, here 15; ours
  -- is that of the effective averages, and said in the result.
  it("with the median", function()
    local s = lb.survey.density(x, options { averaging = "median" })
    local count, by_count = s.segments, 0
    for l = 1, count do by_count = by_count - (-1) ^ l / l end
    assert.are.equal(15, count)
    near(oracle.value("average='median'", "P[51]"), s.values[52] * s.median_bias / by_count)
    near(core.spectrum.median_bias(count), by_count, 1e-14)
  end)
end)

describe("two channels agree with SciPy", function()
  local a = lb.survey.averages({ x, y }, options { cross = true })

  it("in csd, with the sign of conj(X) Y", function()
    local c = a:cross_density(1, 2)
    near(oracle.value("csd(x,y", "Re C[51]"), c.re[52])
    near(oracle.value("csd(x,y", "Im C[51]"), c.im[52])
    local back = a:cross_density(2, 1)
    assert.are.equal(-c.im[52], back.im[52])
  end)

  it("in coherence", function()
    local g = assert(a:coherence(1, 2))
    for _, k in ipairs { 51, 100, 200 } do
      near(oracle.value("coherence(x,y", ("G[%d]"):format(k)), g.values[k + 1])
    end
  end)

  it("in responses", function()
    local h1 = a:response(1, 2, { estimate = "h1" })
    near(oracle.value("csd/welch", "|H1[100]|"), h1:gain()[101])
    near(oracle.value("csd/welch", "arg H1[100]"), h1:phase()[101])
    -- The H2 row has no call; 0.98636386977293 is SciPy's welch(y) over conj(csd).
    local h2 = a:response(1, 2, { estimate = "h2" })
    near(0.98636386977293, h2:gain()[101])
    near(h1:phase()[101], h2:phase()[101])
  end)
end)

-- Lines of numbers that a script answered, one list per line.
local function run(script, arguments, blocks)
  local names = {}
  for i, block in ipairs(blocks) do
    names[i] = os.tmpname()
    local file = assert(io.open(names[i], "wb"))
    file:write(block:pack())
    file:close()
  end
  local pipe = assert(io.popen(("/usr/bin/python3 -B tests/oracle/%s %s %s"):format(script,
    arguments, table.concat(names, " "))))
  local out = {}
  for line in pipe:lines() do
    out[#out + 1] = {}
    for number in line:gmatch "%S+" do table.insert(out[#out], tonumber(number)) end
  end
  assert(pipe:close(), script .. " failed")
  for _, name in ipairs(names) do os.remove(name) end
  return out
end

local function random_block(n, seed)
  local state = seed
  return lb.samples.make(n, function(i)
    state = (state * 16807) % 2147483647
    return state / 2147483647 - 0.5 + math.sin(0.3 * i) + 2.385
  end)
end

local function compare(expected, got, what)
  local wrong, size = 0, 0
  assert.are.equal(#expected, #got, what)
  for k = 1, #expected do
    wrong, size = math.max(wrong, math.abs(expected[k] - got[k])),
      math.max(size, math.abs(expected[k]))
  end
  assert(wrong <= 1e-12 * size, ("%s: off by %.3g of %.3g"):format(what, wrong, size))
end

-- Segment, step, points, detrend as SciPy calls it and as we do: even, odd, prime.
local live = {
  { 64, 32, 64, "False", "none" }, { 63, 21, 63, "constant", "mean" },
  { 101, 50, 101, "linear", "line" }, { 127, 127, 200, "constant", "mean" },
  { 97, 10, 131, "linear", "line" }, { 1, 1, 1, "False", "none" }, { 2, 1, 3, "False", "none" },
}

describe("live, over random inputs,", function()
  local a, b = random_block(1009, 71), random_block(1009, 913)
  for _, c in ipairs(live) do
    it(("segments of %d every %d in %d points, detrend %s"):format(c[1], c[2], c[3], c[5]),
      function()
        local out = run("segments.py", ("%d %d %d %s"):format(c[1], c[2], c[3], c[4]), { a, b })
        local o = { rate = 48000, segment = c[1], step = c[2], points = c[3], detrend = c[5],
                    window = c[1] > 2 and "hann" or "rectangular", cross = true }
        local averages = lb.survey.averages({ a, b }, o)
        local cross = averages:cross_density(1, 2)
        compare(out[1], averages:density(1).values, "density")
        compare(out[2], averages:lines(2).values, "lines")
        compare(out[3], cross.re, "real part")
        compare(out[4], cross.im, "imaginary part")
      end)
  end
end)
