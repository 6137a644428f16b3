local lb = require "libration"
local scipy = require "tests.support.scipy_records"

local random = scipy.generator(5)

describe("integration and differentiation", function()
  local rate = 1000

  -- A few tones with whole periods, their integral and their derivative.
  local function tones(n)
    local list = {}
    for i = 1, 5 do
      list[i] = { k = math.floor(random(3, n / 2 - 1)), a = random(0.5, 2), p = random(0, 6) }
    end
    return function(times)
      return lb.samples.make(n, function(i)
        local sum = 0
        for _, t in ipairs(list) do
          local w = 2 * math.pi * t.k / n * rate
          sum = sum + t.a * w ^ times * math.cos(w * (i - 1) / rate + t.p + times * math.pi / 2)
        end
        return sum
      end)
    end
  end

  it("are exact for whole periods, at odd and prime lengths, too", function()
    for _, n in ipairs { 64, 81, 101, 256, 1009 } do
      local make = tones(n)
      local x = make(0)
      for times = 1, 4 do
        local up, down = make(times), make(-times)
        local y = x:differentiate { rate = rate, times = times }
        -- rounding at the highest bin is amplified most
        assert((y - up):peak() < 1e-14 * (n / 6) ^ times * up:peak())
        y = (x + 7):integrate { rate = rate, low_hz = 2 * rate / n, times = times }
        assert((y - down):peak() < 1e-14 * (n / 6) ^ times * down:peak())
      end
    end
  end)

  it("undo each other above the cut-off", function()
    local x = lb.samples.make(999, function() return random(-1, 1) end)
    local y = x:integrate { rate = rate, low_hz = 40 }:differentiate { rate = rate }
    local z = y:integrate { rate = rate, low_hz = 40 }:differentiate { rate = rate }
    assert((y - z):peak() < 1e-13)
  end)

  it("cut off below, at once or by a cosine, and above", function()
    local function tone(hz)
      return lb.samples.make(1000, function(i) return math.cos(2 * math.pi * hz * i / 1000) end)
    end
    local function gain(hz, options)
      options.rate = 1000
      return tone(hz):integrate(options):peak() * 2 * math.pi * hz
    end
    assert(gain(20, { low_hz = 20 }) < 1e-12)
    assert.near(1, gain(21, { low_hz = 20 }), 1e-2)
    assert.near(0.5, gain(30, { low_hz = 20, full_hz = 40 }), 1e-2)
    assert.near(1, gain(40, { low_hz = 20, full_hz = 40 }), 1e-2)
    local above = tone(101):differentiate { rate = 1000, high_hz = 100 }
    assert(above:peak() < 1e-9, above:peak())
    assert(tone(100):differentiate({ rate = 1000, high_hz = 100 }):peak() > 590)
  end)

  it("refuse what has no meaning", function()
    local x = lb.samples.new(8)
    local function refuses(method, options, text)
      local ok, message = pcall(x[method], x, options)
      assert(not ok and message:find(text, 1, true), tostring(message))
    end
    refuses("integrate", { rate = 1 }, "low_hz is nil")
    refuses("integrate", { rate = 1, low_hz = 0 }, "low_hz is 0; it must be a frequency")
    refuses("integrate", { rate = 1, low_hz = 0.1, full_hz = 0.05 }, "full_hz")
    refuses("integrate", { low_hz = 1 }, "rate is nil")
    refuses("integrate", { rate = 1, low = 1 }, "no such field: low; fields: rate, low_hz")
    refuses("differentiate", { rate = 1, times = 1.5 }, "times must be 1, 2, 3 or 4")
    refuses("differentiate", { rate = "1" }, "rate is 1; it must be")
    refuses("differentiate", { rate = 1, [1] = 2 }, "no such field: 1")
  end)
end)

describe("crossings", function()
  it("are the zeros of a tone", function()
    local x = lb.samples.make(1000, function(i) return math.sin(2 * math.pi * (i - 4.3) / 50) end)
    local up, down = x:crossings(0), x:crossings(0, 0, true)
    for i = 1, #up do assert.near(3.3 + 50 * (i - 1), up[i], 2e-3) end
    for i = 1, #down do assert.near(28.3 + 50 * (i - 1), down[i], 2e-3) end
    assert(#up == 20 and #down == 20)
    up, down = x:crossings(0, 0.2, false, "cubic"), x:crossings(0, 0.2, true, "cubic")
    for i = 2, 19 do
      assert.near(3.3 + 50 * (i - 1), up[i], 5e-6)
      assert.near(28.3 + 50 * (i - 1), down[i], 5e-6)
    end
    local ok, message = pcall(x.crossings, x, 0, 0, false, "spline")
    assert(not ok and message:find("choose line or cubic", 1, true))
  end)

  it("count a noisy edge once, with hysteresis", function()
    local x = lb.samples.make(20000, function(i)
      return (i % 400 < 200 and 0 or 5) + random(-1, 1)
    end)
    assert.equal(50, #x:crossings(2.5, 1))
    local slow = lb.samples.make(4000, function(i)
      return 3 * math.sin(2 * math.pi * i / 1000) + random(-0.3, 0.3)
    end)
    assert(#slow:crossings(0) > 8)
    assert(#slow:crossings(0, 1) <= 4)
  end)

  it("need a beginning on the other side, and take steps and gaps", function()
    assert.equal(0, #lb.samples.new { 1, 2, 3 }:crossings(0))
    local x = lb.samples.new { -1, 0 / 0, 1, -1, 1 }
    local at = x:crossings(0)
    assert(#at == 1 and at[1] == 3.5)
    at = lb.samples.new { 0 / 0, -1, 1, 2 }:crossings(0, 0, false, "cubic")
    assert(#at == 1 and at[1] == 1.5)
    assert.equal(0, #lb.samples.new(0):crossings(1))
    assert(not pcall(x.crossings, x, 0, -1))
  end)
end)

describe("values between samples", function()
  it("keep tones to the stated error up to the stated share", function()
    for _, case in ipairs { { 0.4, 100 }, { 0.45, 80 }, { 0.3, 120 } } do
      local keep, decibel = case[1], case[2]
      for _ = 1, 10 do
        local share, phase = random(0, keep), random(0, 6)
        local function at(place) return math.cos(2 * math.pi * share * place + phase) end
        local x = lb.samples.make(2000, function(i) return at(i - 1) end)
        local places = lb.samples.make(300, function() return random(300, 1700) end)
        local y = x:values_at(places, keep, 1, decibel)
        for i = 1, 300 do
          assert(math.abs(y[i] - at(places[i])) < 10 ^ (-decibel / 20), share)
        end
      end
    end
  end)

  it("take away what would fold where fewer are taken", function()
    local x = lb.samples.make(4000, function(i) return math.cos(2 * math.pi * 0.2 * i) end)
    local places = lb.samples.make(300, function(i) return 500 + 10 * i end)
    assert(x:values_at(places, 0.4, 0.1, 80):peak() < 1.5e-4)
    assert(x:values_at(places, 0.4, 1, 80):peak() > 0.3)
  end)

  it("are the samples at whole places, up to the ends", function()
    local x = lb.samples.make(50, function(i) return 2 * i end)
    local y = x:values_at(lb.samples.make(50, function(i) return i - 1 end))
    assert((y - x):peak() < 1e-3)
    local ok, message = pcall(x.values_at, x, lb.samples.new { 49.5 })
    assert(not ok and message:find("outside 0 .. 49", 1, true))
    ok, message = pcall(x.values_at, x, lb.samples.new(1), 0.4, 1e-5)
    assert(not ok and message:find("raise the ratio or lower keep", 1, true))
    assert(#x:values_at(lb.samples.new(0)) == 0)
    assert(#lb.samples.new(1):values_at(lb.samples.new(1)) == 1)
  end)

  it("refine a table exactly where it is a cubic", function()
    local function cubic(t) return 0.3 * t ^ 3 - 2 * t ^ 2 + 5 * t - 1 end
    local x = lb.samples.make(9, function(i) return cubic(i - 1) end)
    local y = x:refine(7)
    assert.equal(57, #y)
    for i = 1, #y do assert.near(cubic((i - 1) / 7), y[i], 1e-12) end
    assert(not pcall(x.refine, lb.samples.new(3), 2))
  end)
end)

describe("samples by angle", function()
  -- A shaft that speeds up; its angle in turns at a time in samples.
  local function turns(t) return t / 120 + 2.2e-7 * t * t end

  it("make an order of a speeding shaft a steady tone", function()
    local function pulse(i) return math.sin(2 * math.pi * turns(i - 1)) end
    local tacho = lb.samples.make(20000, pulse)
    local pulses = tacho:crossings(0, 0.2, false, "cubic")
    local x = lb.samples.make(20000, function(i)
      return 1.7 * math.cos(2 * math.pi * 5 * turns(i - 1) + 0.4)
    end)
    local y, about = lb.samples.by_angle(x, pulses, { per_turn = 64 })
    assert.equal(64 * about.turns + 1, #y)
    assert(about.orders > 5 and about.fastest > 1.5 * about.slowest)
    local worst = 0
    for i = 64 * 3, #y - 64 * 3 do
      local want = 1.7 * math.cos(2 * math.pi * 5 * (i - 1) / 64 + 0.4)
      worst = math.max(worst, math.abs(y[i] - want))
    end
    assert(worst < 1.7e-4, worst) -- 80 dB below the amplitude
  end)

  it("take one pulse a turn of many", function()
    local list = {}
    for k = 0, 79 do -- unevenly cut marks, four a turn
      list[k + 1] = 10 + 25 * k + ({ 0, 1.3, -0.7, 0.4 })[k % 4 + 1]
    end
    local x = lb.samples.make(2100, function(i) return math.cos(2 * math.pi * (i - 11) / 100) end)
    local y, about = lb.samples.by_angle(x, lb.samples.new(list), { per_turn = 16,
      pulses_per_turn = 4 })
    assert.equal(19, about.turns)
    for i = 1, #y do assert.near(math.cos(2 * math.pi * (i - 1) / 16), y[i], 2e-3) end
  end)

  it("refuse pulses that are none", function()
    local x = lb.samples.new(100)
    local function refuses(pulses, options, text)
      local ok, message = pcall(lb.samples.by_angle, x, lb.samples.new(pulses), options)
      assert(not ok and message:find(text, 1, true), tostring(message))
    end
    refuses({ 1, 2 }, { per_turn = 8 }, "fewer than three turns")
    refuses({ 1, 3, 2, 4 }, { per_turn = 8 }, "places that increase")
    refuses({ 1, 2, 3, 4 }, {}, "per_turn: missing")
    refuses({ 1, 2, 3, 4, 200 }, { per_turn = 8 }, "outside 0 .. 99")
  end)
end)
