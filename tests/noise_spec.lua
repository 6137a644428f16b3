-- Noise of a stated density, white and shaped.

local core = require "libration.core"
local lb = require "libration"

describe("white noise", function()
  it("has variance density^2 rate / 2, within its confidence limits", function()
    -- Variance of a sample variance of N normal values: 2 sigma^4 / N.
    for _, case in ipairs { { 1e-3, 51200 }, { 2.385, 100 }, { 60e-6, 8000 } } do
      local density, rate, n = case[1], case[2], 400000
      local x = lb.synth.noise { density = density, rate = rate, samples = n, seed = 11 }
      local variance = x:dot(x) / n
      local expected = density ^ 2 * rate / 2
      local z = (variance / expected - 1) / math.sqrt(2 / n)
      assert(math.abs(z) < 4.5, z)
    end
  end)

  it("differs between trials, channels and purposes, and repeats for the same", function()
    local function noise(fields)
      fields.density, fields.rate, fields.samples = 1, 2, 1000
      return lb.synth.noise(fields)
    end
    local one = noise {}
    assert(one == noise {})
    for _, name in ipairs { "seed", "trial", "channel", "purpose" } do
      local other = noise { [name] = 1 }
      assert(other ~= one)
      assert(math.abs(other:dot(one)) / 1000 < 4.5 / math.sqrt(1000))
    end
  end)
end)

describe("a shape", function()
  local from = core.samples.from

  it("is even, and its response follows the wanted curve between its points", function()
    local taps = core.synth.shape(from { 0.05, 0.1, 0.4 }, from { 4, 1, 2 }, 400)
    for _, f in ipairs { 0.01, 0.03, 0.07, 0.15, 0.25, 0.37, 0.45 } do
      local wanted
      if f <= 0.05 then
        wanted = 4
      elseif f <= 0.1 then
        wanted = 4 * (f / 0.05) ^ (math.log(1 / 4) / math.log(2))
      elseif f <= 0.4 then
        wanted = (f / 0.1) ^ (math.log(2) / math.log(4))
      else
        wanted = 2
      end
      local got = core.synth.shape_response(taps, f)
      assert(math.abs(got / wanted - 1) < 0.01, ("%g: %g for %g"):format(f, got, wanted))
      assert.near(got, core.synth.shape_response(taps, -f), 1e-12)
    end
  end)

  it("makes noise by direct convolution of the keyed normal numbers", function()
    local taps = core.synth.shape(from { 0.1, 0.2 }, from { 1, 0.1 }, 5)
    local x = core.synth.fill(core.samples.new(50),
      { sigma = 2, taps = taps, seed = 3, trial = 4, channel = 5, purpose = 6 })
    local g = core.synth.gaussian(core.samples.new(60), 3, { 4, 5, 6 }, -5)
    for i = 1, 50 do
      local sum = 0
      for k = -5, 5 do
        sum = sum + taps[math.abs(k) + 1] * g[i + 5 + k]
      end
      assert.near(2 * sum, x[i], 1e-14)
    end
  end)

  it("refuses curves that are none", function()
    local function raises(text, ...)
      local ok, message = pcall(core.synth.shape, ...)
      assert(not ok and message:find(text, 1, true), message)
    end
    raises("no points", from {}, from {}, 3)
    raises("not as many", from { 0.1 }, from {}, 3)
    raises("increase", from { 0.2, 0.1 }, from { 1, 1 }, 3)
    raises("above 0", from { 0.1 }, from { 0 }, 3)
    raises("between 0 and 2048", from { 0.1 }, from { 1 }, 2049)
  end)
end)

describe("the spectrum of shaped noise, by scipy.signal.welch,", function()
  -- What welch finds in bands (mean over the band) divided by the square of
  -- the wanted density there. About 1000 independent averages times at least 10
  -- bins: a standard deviation of at most 1 %.
  local function bands(x, rate, edges)
    local path = os.tmpname()
    local file = assert(io.open(path, "wb"))
    file:write(x:pack())
    file:close()
    local command = "env -u LD_PRELOAD /usr/bin/python3 tests/oracle/welch.py %s %.17g %s"
    local pipe = assert(io.popen(command:format(path, rate, table.concat(edges, " "))))
    local found = {}
    for i = 1, #edges // 2 do
      found[i] = pipe:read "n"
    end
    pipe:close()
    os.remove(path)
    return found
  end

  it("follows a table of points", function()
    local rate = 1000
    local x = lb.synth.noise { rate = rate, samples = 1 << 20, seed = 2, noise_taps = 400,
      density = { { hz = 50, density = 0.4 }, { hz = 100, density = 0.1 } } }
    local found = bands(x, rate, { 5, 35, 150, 400 })
    assert.near(1, found[1] / 0.4 ^ 2, 0.03)
    assert.near(1, found[2] / 0.1 ^ 2, 0.03)
  end)

  it("follows a Butterworth filter and its folds", function()
    -- Closed form: |F|^2 = 1 / (1 + (f/fc)^(2n)); order 1 folds visibly.
    local rate, corner = 1000, 300
    local x = lb.synth.record { rate = rate, samples = 1 << 20, seed = 4, input_noise = 1,
      filter = { shape = "butterworth", order = 1, corner = corner .. " Hz" } }
    local edges = { 5, 15, 240, 260, 480, 495 }
    local found = bands(x, rate, edges)
    for i, f in ipairs { 10, 250, 487.5 } do
      local sum = 0
      for k = -4000, 4000 do
        sum = sum + 1 / (1 + ((f + k * rate) / corner) ^ 2)
      end
      assert.near(1, found[i] / sum, 0.04)
    end
  end)
end)
