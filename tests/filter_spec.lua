local lb = require "libration"
local core = require "libration.core"

local shapes = { "butterworth", "chebyshev", "bessel", "elliptic" }

local function make(shape, order, ripple, stop)
  local spec = { shape = shape, order = order, corner = "1 Hz" }
  if shape == "chebyshev" or shape == "elliptic" then spec.ripple = ripple end
  if shape == "elliptic" then spec.stop = stop end
  return lb.filter(spec)
end

-- A generator of our own, so that runs repeat on any Lua build.
local function generator(seed)
  local state = seed
  return function(low, high)
    state = (state * 6364136223846793005 + 1442695040888963407) & math.maxinteger
    return low + (high - low) * ((state >> 10) / (math.maxinteger >> 10))
  end
end

-- Shape, order, ripple and stop band of a filter that double precision can design.
local function random_filter(random)
  local shape = shapes[1 + math.floor(random(0, 3.9999))]
  local order, ripple, stop = 1 + math.floor(random(0, 15.999)), 10 ^ random(-2, 0.5),
    random(20, 120)
  local made, message = pcall(make, shape, order, ripple, stop)
  if made then
    return shape, order, ripple, stop
  end
  assert(shape == "elliptic" and message:find "too narrow", message)
  return random_filter(random)
end

describe("attenuation tables", function()
  local rows = {}
  for line in io.lines("tests/data/filter_attenuation.csv") do
    local name, order, rest = line:match('^"?(%a+[^"]-)"?,(%d+),(.*)$')
    if name then rows[#rows + 1] = { name = name, order = tonumber(order), rest = rest } end
  end
  local at = { 1.25, 1.5, 2, 2.56, 3, 4, 5, 8, 10 }

  it("agrees with every row to the last printed digit", function()
    local checked = 0
    for _, row in ipairs(rows) do
      local shape = row.name:match("^%a+")
      local ripple = tonumber(row.name:match("([%d.]+) dB"))
      local f = make(shape, row.order, ripple, 80)
      local i = 0
      for cell in row.rest:gmatch("[^,]+") do
        i = i + 1
        assert.near(tonumber(cell), -f:gain_db(at[i]), 1.1e-5, row.name .. " " .. row.order)
        checked = checked + 1
      end
    end
    assert.equal(74 * 9, checked)
  end)

  -- Bessel poles: the magnitude-normalised tables reprinted in SciPy's documentation tests.
  it("has the published Bessel poles", function()
    local published = {
      [2] = { { -1.1016013, 0.6360098 } },
      [3] = { { -1.0474092, 0.9992644 }, { -1.3226758, 0 } },
      [4] = { { -0.9952088, 1.2571058 }, { -1.3700678, 0.4102497 } },
    }
    for order, list in pairs(published) do
      local poles = core.filter.roots { shape = "bessel", order = order, corner = 1 }
      for i, p in ipairs(list) do
        local mine = poles[2 * i - 1]
        assert.near(p[1], mine.re, 6e-8)
        assert.near(p[2], math.abs(mine.im), 1.1e-7)
      end
    end
  end)

  -- Order estimates of scipy.signal 1.10.1: buttord(1k, 2.56k, 3, 80) = 10,
  -- cheb1ord(1k, 1.56k, 0.1, 80) = 12, ellipord(1k, 1.56k, 0.1, 80) = 8.
  it("needs the orders that the order formulas give", function()
    local function butterworth(order)
      local corner = 1000 / (10 ^ 0.3 - 1) ^ (1 / (2 * order))
      local f = lb.filter { shape = "butterworth", order = order, corner = corner .. " Hz" }
      return -f:gain_db(2560)
    end
    assert.is_true(butterworth(9) < 80 and butterworth(10) >= 80)
    assert.is_true(make("chebyshev", 11, 0.1):edge(1e-4) > 1.56)
    assert.is_true(make("chebyshev", 12, 0.1):edge(1e-4) <= 1.56)
    assert.is_true(make("elliptic", 7, 0.1, 80):edge(1e-4) > 1.56)
    assert.is_true(make("elliptic", 8, 0.1, 80):edge(1e-4) <= 1.56)
  end)

  -- Closed form (1 + (f/fc)^2n = 10^(A/10)); the values of the design table.
  it("finds the frequency of an attenuation", function()
    local want = { [4] = { 3.162, 5.623, 10.0 }, [8] = { 1.778, 2.371, 3.162 } }
    for order, list in pairs(want) do
      local f = make("butterworth", order)
      for i, db in ipairs { 40, 60, 80 } do
        assert.near(list[i], f:edge(10 ^ (-db / 20)), 6e-4)
      end
    end
  end)
end)

describe("against SciPy", function()
  local random = generator(20250)
  local path = os.tmpname()
  local cases, out = {}, assert(io.open(path, "w"))
  for i = 1, 150 do
    local shape, order, ripple, stop = random_filter(random)
    local case = { shape = shape, order = order, filter = make(shape, order, ripple, stop) }
    local words = { shape, order, ("%.17g %.17g"):format(ripple, stop) }
    for k = 1, 40 do
      case[k] = k == 1 and 0 or 10 ^ random(-1.5, 1)
      words[#words + 1] = ("%.17g"):format(case[k])
    end
    cases[i] = case
    out:write(table.concat(words, " "), "\n")
  end
  out:close()

  it("agrees to 1e-9 in gain and phase", function()
    local pipe = assert(io.popen(
      "env -u LD_PRELOAD /usr/bin/python3 tests/oracle/filters.py " .. path))
    for _, case in ipairs(cases) do
      local re, im = {}, {}
      for word in assert(pipe:read("l"), "SciPy gave no answer"):gmatch("%S+") do
        re[#re + 1] = tonumber(word)
      end
      for word in pipe:read("l"):gmatch("%S+") do im[#im + 1] = tonumber(word) end
      for k = 1, #re do
        local gain = case.filter:gain(case[k])
        local a, b = case.filter:response(case[k])
        local abs = math.sqrt(re[k] ^ 2 + im[k] ^ 2)
        local what = ("%s %d at %.9g: %.12g, SciPy %.12g"):format(case.shape, case.order,
          case[k], gain, abs)
        -- next to a zero of an elliptic response only the absolute error means something
        local tolerance = 1e-9 * math.max(abs, case.shape == "elliptic" and 1e-4 or 0)
        assert.is_true(math.abs(gain - abs) <= tolerance, what)
        assert.is_true(math.abs(a - re[k]) <= tolerance and math.abs(b - im[k]) <= tolerance, what)
      end
    end
    pipe:close()
    os.remove(path)
  end)
end)

describe("laws", function()
  it("holds the least and largest gain of any interval", function()
    local random = generator(7)
    for _ = 1, 1500 do
      local shape, order, ripple, stop = random_filter(random)
      local f = make(shape, order, ripple, stop)
      local a = 10 ^ random(-1.5, 0.7)
      local b = a * (1 + 10 ^ random(-5, 0.5))
      local low, high = f:range(a, b)
      local seen_low, seen_high = math.huge, 0
      for k = 0, 24 do
        local gain = f:gain(a + (b - a) * (k < 2 and k or random(0, 1)))
        seen_low, seen_high = math.min(seen_low, gain), math.max(seen_high, gain)
      end
      local what = ("%s %d [%.9g, %.9g]"):format(shape, order, a, b)
      assert.is_true(low <= seen_low and seen_high <= high, what)
    end
  end)

  it("is tight: a dense scan comes within 1 % of both bounds", function()
    local random = generator(11)
    for _ = 1, 60 do
      local shape, order, ripple, stop = random_filter(random)
      local f = make(shape, order, ripple, stop)
      local a = 10 ^ random(-1, 0.4)
      local b = a * (1 + 10 ^ random(-2, 0))
      local low, high = f:range(a, b)
      local seen_low, seen_high = math.huge, 0
      for k = 0, 4000 do
        local gain = f:gain(a + (b - a) * k / 4000)
        seen_low, seen_high = math.min(seen_low, gain), math.max(seen_high, gain)
      end
      assert.is_true(high <= seen_high * 1.01)
      -- a zero inside is met only approximately by a scan
      assert.is_true(low >= seen_low * 0.99 or low < 0.02 * high, shape)
    end
  end)

  it("stays below the level beyond the edge, and reaches it there", function()
    local random = generator(13)
    for _ = 1, 600 do
      local shape, order, ripple, stop = random_filter(random)
      local f = make(shape, order, ripple, stop)
      local level = 10 ^ random(-4.9, -0.001)
      local edge = f:edge(level)
      if edge < math.huge then
        local _, high = f:range(edge, edge * 1e3)
        assert.is_true(high <= level * (1 + 1e-9) + 1e-13, shape .. order)
        local _, above = f:range(edge * (1 - 1e-6), edge)
        assert.is_true(above >= level * (1 - 1e-9), shape .. order)
      else
        assert.equal("elliptic", shape)
        assert.is_true(order % 2 == 0 and level < 10 ^ (-stop / 20))
      end
    end
  end)

  it("scales with the corner, and with the rate where the corner is a share", function()
    local a = lb.filter { shape = "elliptic", order = 7, corner = "1 Hz", ripple = 0.2, stop = 70 }
    local b = lb.filter { shape = "elliptic", order = 7, corner = "0.4 rate",
                          ripple = "0.2 dB", stop = "70 dB" }
    for _, w in ipairs { 0, 0.3, 0.999, 1.17, 2.385, 40 } do
      assert.near(a:gain(w), b:gain(w * 0.4 * 51200, 51200), 1e-13)
    end
  end)

  it("touches floor and full gain, and the stop level, at the ripples", function()
    for order = 1, 16 do
      local f = make("elliptic", order, 0.5, 40)
      local low, high = f:range(0, 1)
      assert.near(10 ^ (-0.5 / 20), low, 1e-11)
      assert.near(1, high, 1e-11)
      local edge = f:edge(10 ^ (-40 / 20))
      local _, worst = f:range(edge, 1e6)
      assert.near(0.01, worst, 1e-10)
    end
  end)

  it("is a table of points in dB over log frequency", function()
    local f = lb.filter { shape = "points", points = {
      { "100 Hz", 0 }, { "1 kHz", "-40 dB" }, { "2 kHz", -30 }, { "10 kHz", -80 } } }
    assert.equal(1, f:gain(3))
    assert.near(-20, f:gain_db(math.sqrt(100 * 1000)), 1e-12)
    assert.near(-80, f:gain_db(1e6), 1e-12)
    local low, high = f:range(500, 5000)
    assert.near(f:gain(5000), low, 1e-14)
    assert.near(f:gain(500), high, 1e-12)
    low = f:range(900, 1100)
    assert.near(0.01, low, 1e-13)
    assert.near(2000 * 5 ^ 0.2, f:edge(10 ^ (-40 / 20)), 1e-6)
    assert.equal(math.huge, f:edge(1e-5))
  end)

  it("prints what it is", function()
    assert.equal("elliptic low-pass, order 6, corner 0.4 of the rate, "
      .. "ripple 0.1 dB, stop band 80 dB",
      tostring(lb.filter { shape = "elliptic", order = 6, corner = "0.4 rate",
                           ripple = 0.1, stop = 80 }))
    assert.equal("no filter", tostring(lb.filter { shape = "none" }))
  end)
end)

describe("refusals", function()
  it("names the field, the value and the choices", function()
    for pattern, spec in pairs {
      ['shape: "brick" is not one of none, butter'] = { shape = "brick" },
      ["order: 17"] = { shape = "bessel", order = 17, corner = "1 Hz" },
      ["order: 7/2 is not whole"] = { shape = "bessel", order = 3.5, corner = "1 Hz" },
      ["corner: missing"] = { shape = "bessel", order = 3 },
      ["corner: \"%-1 Hz\" is not above 0"] = { shape = "bessel", order = 3, corner = "-1 Hz" },
      ["ripple: missing"] = { shape = "chebyshev", order = 3, corner = "1 Hz" },
      ["stop: shape"] = { shape = "bessel", order = 3, corner = "1 Hz", stop = 1 },
      ["ordr"] = { shape = "bessel", ordr = 3, corner = "1 Hz" },
      ["points"] = { shape = "points", points = {} },
      ["from low to high"] = { shape = "points", points = { { "2 Hz", 0 }, { "1 Hz", 0 } } },
      ["deeper than the ripple"] = { shape = "elliptic", order = 3, corner = "1 Hz",
        ripple = 1, stop = 1 },
      ["too narrow"] = { shape = "elliptic", order = 16, corner = "1 Hz", ripple = 3, stop = 5 },
    } do
      local ok, message = pcall(lb.filter, spec)
      assert.is_false(ok)
      assert.truthy(message:find(pattern), message)
    end
    assert.is_false(pcall(lb.filter, "butterworth"))
  end)

  -- The core checks tables of its own accord: other rooms hand theirs to it directly.
  it("is checked by the core as well", function()
    for pattern, spec in pairs {
      ["shape is brick; it must be none, butterworth"] = { shape = "brick" },
      ["order is 17; it must be an integer"] = { shape = "bessel", order = 17, corner = 1 },
      ["corner is nil; it must be a positive number"] = { shape = "bessel", order = 3 },
      ["corner is %-?nan"] = { shape = "bessel", order = 3, corner = 0 / 0 },
      ["ripple_db is nil"] = { shape = "chebyshev", order = 3, corner = 1 },
      ["stop_db is 1"] = { shape = "elliptic", order = 3, corner = 1, ripple_db = 1, stop_db = 1 },
      ["points is table"] = { shape = "points", points = {} },
      ["points%[1%] is not"] = { shape = "points", points = { 3 } },
      ["points%[2%] must have at > 2"] = { shape = "points",
        points = { { at = 2, db = 0 }, { at = 1, db = 0 } } },
    } do
      local ok, message = pcall(core.filter.gain, spec, 1)
      assert.is_false(ok)
      assert.truthy(message:find(pattern), message)
    end
  end)

  it("takes the filter of a digitizer", function()
    local digitizer = lb.digitizer { rates = { "48 kS/s" }, bits = 16, range = "5 V",
      filter = { shape = "bessel", order = 4, corner = "0.3 rate" } }
    assert.near(math.sqrt(0.5), lb.filter(digitizer.filter):gain(14400, 48000), 1e-12)
  end)

  it("asks for the rate where the corner is a share of it", function()
    local f = lb.filter { shape = "butterworth", order = 2, corner = "0.4 rate" }
    assert.is_false(pcall(f.gain, f, 10))
    assert.is_false(pcall(f.gain, f, 10, -1))
    assert.is_false(pcall(f.gain, f, -10, 100))
  end)
end)
