local lb = require "libration"
local core = require "libration.core"
local scipy = require "tests.support.scipy_records"

local random = scipy.generator(77)
local shapes = { "butterworth", "chebyshev", "bessel", "elliptic" }
local bands = { "low", "high", "pass", "stop" }

local function noise(n)
  return lb.samples.make(n, function() return random(-2.385, 2.385) end)
end

local function any_filter()
  local shape = shapes[1 + math.floor(random(0, 3.9999))]
  local band, order = bands[1 + math.floor(random(0, 3.9999))], 1 + math.floor(random(0, 7.9999))
  local rate, low = 10 ^ random(0, 5), random(0.02, 0.4)
  local edge = { low * rate }
  if band == "pass" or band == "stop" then
    edge[2] = (low + random(0.02, 0.47 - low + 0.02)) * rate
  end
  local spec = { shape = shape, band = band, order = order, edge = edge, rate = rate }
  if shape == "chebyshev" or shape == "elliptic" then spec.ripple = random(0.05, 2) end
  if shape == "elliptic" then spec.stop = random(30, 90) end
  return spec, ("%s %d %.17g %.17g %s %.17g %.17g %s"):format(shape, order, spec.ripple or 1,
    spec.stop or 60, band, rate, edge[1], edge[2] and ("%.17g"):format(edge[2]) or "")
end

describe("recursive filters", function()
  -- scipy.signal 1.10.1: butter(2, 200, fs=1000), rows of oracle_values.csv
  it("have the published coefficients", function()
    local f = lb.filter.digital { shape = "butterworth", order = 2, edge = 200, rate = 1000 }
    local row = f:coefficients()[1]
    assert.near(scipy.value 'butter,"butter(2,200,fs=1000) b0"', row.b0, 1e-14)
    assert.near(scipy.value "butter,a1", row.a1, 1e-14)
    assert.near(scipy.value "butter,a2", row.a2, 1e-14)
  end)

  -- y of oracle_signal.csv is butter(2, 200 Hz) of x plus 0.05 u, |u| <= 0.5
  it("make the second channel of the test signal", function()
    local x, y = scipy.signal()
    local f = lb.filter.digital { shape = "butterworth", order = 2, edge = 200, rate = 1000 }
    local rest = lb.samples.new(y) - f:run(lb.samples.new(x))
    assert(rest:peak() <= 0.025 and rest:peak() > 0.024)
    assert.near(0.05 / math.sqrt(12), rest:rms(), 2e-4)
  end)

  it("agree with scipy.signal's sections over random designs", function()
    local x = noise(701)
    local cases, requests = {}, {}
    for i = 1, 60 do
      local spec, words = any_filter()
      cases[i] = { spec = spec, filter = lb.filter.digital(spec), words = words }
      requests[3 * i - 2] = "causal " .. words
      requests[3 * i - 1] = "gain " .. words
      requests[3 * i] = ("both %s %d %s"):format(({ "odd", "even", "constant" })[i % 3 + 1],
        40 + i, words)
    end
    local answers = scipy.ask(x, requests)
    for i, case in ipairs(cases) do
      local f, rate = case.filter, case.spec.rate
      assert(scipy.distance(f:run(x), answers[3 * i - 2]) < 1e-9, case.words)
      local gain = lb.samples.make(64, function(k) return f:gain(rate / 2 * (k - 1) / 63) end)
      assert(scipy.distance(gain, answers[3 * i - 1]) < 1e-9, case.words)
      local ends = ({ "turn", "mirror", "hold" })[i % 3 + 1]
      local both = f:both_ways(x, ends, 40 + i)
      assert(scipy.distance(both, answers[3 * i]) < 1e-9, case.words .. " " .. ends)
    end
  end)

  it("have their edges where they were asked for, at any rate", function()
    for _ = 1, 40 do
      local spec = any_filter()
      local f = lb.filter.digital(spec)
      local at = spec.ripple and 10 ^ (-spec.ripple / 20) or math.sqrt(0.5)
      for _, edge in ipairs(spec.edge) do
        assert.near(at, f:gain(edge), 1e-9)
      end
    end
  end)

  -- The law of the bilinear transformation (Oppenheim and Schafer, ch. 7): the gain at f is that
  -- of the analog low-pass at the frequency that f is moved to. Coefficients are doubles: the
  -- error grows as the inverse square of the edge.
  it("have the analog gain at the moved frequency, at edges down to 1e-4 of the rate", function()
    local function t(share) return math.tan(math.pi * share) end
    local function moved(band, low, high, at)
      if band == "low" then return t(at) / t(low) end
      if band == "high" then return t(low) / t(at) end
      local w = math.abs((t(at) ^ 2 - t(low) * t(high)) / (t(at) * (t(high) - t(low))))
      return band == "pass" and w or 1 / w
    end
    for k = 1, 320 do
      local low = 10 ^ random(-4, -0.4)
      local spec = { shape = shapes[k % 4 + 1], order = 1 + k % 16, band = bands[k // 4 % 4 + 1],
        edge = { low }, rate = 1 }
      if k // 4 % 4 > 1 then spec.edge[2] = math.min(0.49, low * random(1.1, 3)) end
      if k % 4 == 1 or k % 4 == 3 then spec.ripple = random(0.05, 1) end
      if k % 4 == 3 then spec.stop = random(40, 80) end
      local f = lb.filter.digital(spec)
      local analog = lb.filter { shape = spec.shape, order = spec.order, corner = "1 Hz",
        ripple = spec.ripple, stop = spec.stop }
      for _ = 1, 20 do
        local at = math.min(0.499, low * 10 ^ random(-1, 1))
        local want = analog:gain(moved(spec.band, low, spec.edge[2], at))
        assert.near(want, f:gain(at), 3e-15 / low ^ 2 + 1e-10, tostring(f))
      end
    end
  end)

  it("keep the gain at 0 Hz even for edges far below the rate", function()
    local f = lb.filter.digital { shape = "butterworth", order = 8, edge = 0.01, rate = 1000 }
    assert.near(1, f:gain(0), 1e-12)
  end)

  it("give the same bits for any blocks", function()
    local x = noise(2000)
    for _ = 1, 30 do
      local f = lb.filter.digital(any_filter())
      local stream, parts, at = f:stream(), {}, 1
      while at <= #x do
        local last = math.min(#x, at + math.floor(random(0, 90) ^ 1.2) - 1)
        parts[#parts + 1] = stream:run(x:slice(at, last))
        at = last + 1
      end
      assert(lb.samples.join(table.unpack(parts)) == f:run(x))
    end
  end)

  it("write where they are told, in place, too", function()
    local x, f = noise(500), lb.filter.digital(any_filter())
    local y, room, stream = f:run(x), lb.samples.new(500), f:stream()
    assert(f:run(x, nil, room) == y and room == y)
    local copy, part = x:copy(), lb.samples.new(250)
    assert(f:run(copy, "rest", copy) == y and copy == y)
    assert(stream:run(x:slice(1, 250), part) == y:slice(1, 250))
    assert(stream:run(x:slice(251), part) == y:slice(251) and part == y:slice(251))
    assert(not pcall(f.run, f, x, "rest", part))
    assert(not pcall(f.run, f, x:slice(1, 499), "rest", x:slice(2, 500)))
  end)

  it("are linear, and start settled where that is asked for", function()
    local x, y = noise(300), noise(300)
    local f = lb.filter.digital { shape = "elliptic", order = 5, edge = 100, rate = 1000,
      ripple = 0.2, stop = 50 }
    local rest = f:run(x * 2.385 + y) - (f:run(x) * 2.385 + f:run(y))
    assert(rest:peak() < 1e-13)
    assert((f:run(lb.samples.new(50):fill(3), "settled") - 3):peak() < 1e-12)
  end)

  it("square the gain and leave the phase when run both ways", function()
    local f = lb.filter.digital { shape = "chebyshev", order = 4, edge = 120, rate = 1000,
      ripple = 1 }
    local x = lb.samples.make(4000, function(i) return math.cos(2 * math.pi * 0.1 * i + 0.4) end)
    local y = f:both_ways(x)
    assert((y - x * f:gain(100) ^ 2):slice(500, 3500):peak() < 1e-9)
  end)

  it("leave a straight line alone with turned ends", function()
    local f = lb.filter.digital { shape = "butterworth", order = 3, edge = 50, rate = 1000 }
    local x = lb.samples.make(1000, function(i) return 7 - 0.02 * i end)
    assert((f:both_ways(x) - x):peak() < 1e-7)
  end)

  it("print themselves and are used by x:filter", function()
    local f = lb.filter.digital { shape = "elliptic", order = 3, band = "stop",
      edge = "48..52 Hz", rate = "51.2 kS/s", ripple = "0.1 dB", stop = "40 dB" }
    assert.equal("elliptic band-stop, order 3, 48 to 52 Hz at 51200 S/s, ripple 0.1 dB, stop band "
      .. "40 dB, 3 sections", tostring(f))
    local x = noise(40)
    assert(x:filter(f) == f:run(x) and x:filter(f, "settled") == f:run(x, "settled"))
  end)
end)

describe("what recursive filters refuse", function()
  local good = { shape = "butterworth", order = 4, edge = "100 Hz", rate = "1 kS/s" }
  local function refuses(changes, text)
    local spec = {}
    for k, v in pairs(good) do spec[k] = v end
    for k, v in pairs(changes) do spec[k] = v ~= "absent" and v or nil end
    local ok, message = pcall(lb.filter.digital, spec)
    assert(not ok and message:find(text, 1, true), tostring(message))
  end

  it("names the field, the value and what would do", function()
    refuses({ edge = "600 Hz" }, "between 0 and half the rate, 500 Hz")
    refuses({ edge = { 10, 20 } }, 'a band "low" has one edge')
    refuses({ band = "pass" }, 'a band "pass" has two edges')
    refuses({ band = "pass", edge = { 200, 100 } }, "in order")
    refuses({ shape = "elliptic" }, "ripple: missing")
    refuses({ ripple = 1 }, 'a filter "butterworth" has none')
    refuses({ orders = 4 }, 'did you mean "order"?')
    refuses({ rate = "absent" }, 'rate: missing; such as "51.2 kS/s"')
    refuses({ order = 17 }, "order: 17 is out of range")
    refuses({ shape = "elliptic", ripple = 3, stop = 2 }, "deeper than the ripple")
  end)

  it("refuses what double precision cannot hold", function()
    refuses({ order = 16, edge = 1e-9, rate = 1000 }, "double precision holds no such filter")
  end)

  it("refuses to extend a record beyond its length", function()
    local f = lb.filter.digital(good)
    local ok, message = pcall(f.both_ways, f, lb.samples.new(10))
    assert(not ok and message:find("10 samples cannot be extended by", 1, true))
    assert(#f:both_ways(lb.samples.new(10), "hold") == 10)
    assert(#f:both_ways(lb.samples.new(0), "bare") == 0)
    ok, message = pcall(f.both_ways, f, lb.samples.new(10), "wrap")
    assert(not ok and message:find("turn, mirror, hold, bare", 1, true))
    assert(not pcall(core.samples.new(3).filter, core.samples.new(3), 5))
  end)
end)
