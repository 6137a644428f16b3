local lb = require "libration"
local core = require "libration.core"
local scipy = require "tests.support.scipy_records"

local random = scipy.generator(4321)

local function noise(n)
  return lb.samples.make(n, function() return random(-2.385, 2.385) end)
end

local function refuses(make, spec, text)
  local ok, message = pcall(make, spec)
  assert(not ok and message:find(text, 1, true), tostring(message))
end

describe("Kaiser's design", function()
  -- Kaiser, ISCAS 1974; check values of design table section 10: 80 dB over 0.1 of half the rate
  -- takes 102 taps, 60 dB over 0.05 takes 147 (scipy.signal.kaiserord)
  it("has his estimates", function()
    local taps, beta = core.filter.kaiser(80, 0.05)
    assert.equal(102, taps)
    assert.near(7.85726, beta, 1e-12)
    taps, beta = core.filter.kaiser(60, 0.025)
    assert.equal(147, taps)
    assert.near(5.65326, beta, 1e-12)
  end)

  -- row firwin of oracle_values.csv: 101 taps, 100 Hz at 1 kS/s, Hamming
  it("takes weights of one's own", function()
    local hamming = lb.samples.make(101, function(i)
      return 0.54 - 0.46 * math.cos(2 * math.pi * (i - 1) / 100)
    end)
    local h = core.filter.window_taps("low", 0.1, nil, 101, hamming)
    assert.near(scipy.value "firwin,", h[51], 1e-14)
  end)

  it("agrees with scipy.signal.firwin over random designs", function()
    local bands, requests, made = { "low", "high", "pass", "stop" }, {}, {}
    for i = 1, 60 do
      local band, taps = bands[i % 4 + 1], 3 + math.floor(random(0, 200))
      if band == "high" or band == "stop" then taps = taps | 1 end
      local beta, low = random(0, 14), random(0.02, 0.3)
      local high = i % 4 > 1 and random(low + 0.02, 0.48) or nil
      made[i] = core.filter.window_taps(band, low, high, taps, beta)
      requests[i] = ("window %s %d %.17g %.17g %s"):format(band, taps, beta, low,
        high and ("%.17g"):format(high) or "")
    end
    for i, list in ipairs(scipy.ask(noise(9), requests)) do
      assert(scipy.distance(made[i], list) < 1e-11, requests[i])
    end
  end)

  it("holds what it says, between the points of its grid, too", function()
    for _, decibel in ipairs { 25, 60, 100, 140 } do
      for _, band in ipairs { "low", "high", "pass", "stop" } do
        local two = band == "pass" or band == "stop"
        local f = lb.filter.linear { band = band, edge = two and { 100, 300 } or 180,
          transition = 60, rate = 1000, rejection = decibel }
        assert(f.rejection_db >= decibel and f.flatness <= 10 ^ (-decibel / 20))
        local limit = 10 ^ (-f.rejection_db / 20)
        for _ = 1, 200 do
          local hz = random(0, 500)
          local inside = two and hz > 100 and hz < 300 or not two and hz > 180
          local near = math.min(math.abs(hz - (two and 100 or 180)),
            two and math.abs(hz - 300) or math.huge)
          local passes = inside == (band == "pass" or band == "high")
          if near >= 30 then
            local off = passes and math.abs(f:gain(hz) - 1) or math.abs(f:gain(hz))
            local most = passes and f.flatness or limit
            assert(off <= 1.002 * most + 1e-15, ("%s, %g dB, %g Hz: %g, not %g"):format(band,
              decibel, hz, off, most))
          end
        end
      end
    end
  end)
end)

-- The definition, written out.
local function slow(x, h, up, down, centre)
  local out = {}
  for j = 0, (#x * up + down - 1) // down - 1 do
    local sum = 0
    for i = 0, #x - 1 do
      local k = centre + j * down - i * up
      if k >= 0 and k < #h then sum = sum + h[k + 1] * x[i + 1] end
    end
    out[j + 1] = sum
  end
  return out
end

describe("taps on records", function()
  it("are the sum that they are defined by", function()
    for _ = 1, 60 do
      local x, h = noise(1 + math.floor(random(0, 60))), noise(1 + math.floor(random(0, 40)))
      local up, down = 1 + math.floor(random(0, 7)), 1 + math.floor(random(0, 7))
      local centre = math.floor(random(0, #h - 0.001))
      local y = core.filter.taps(h, up, down, centre):run(x)
      local list = slow(x, h, up, down, centre)
      assert.equal(#list, #y)
      for j, value in ipairs(list) do assert.near(value, y[j], 1e-12) end
    end
  end)

  it("give the same bits for any blocks", function()
    local x = noise(3001)
    local makers = {
      lb.filter.linear { edge = 100, transition = 30, rate = 1000 },
      lb.filter.decimator { factor = 60 }, lb.filter.decimator { factor = 7 },
      lb.filter.resampler { up = 147, down = 160 }, lb.filter.resampler { up = 7, down = 2 },
      lb.filter.taps { taps = lb.samples.new { 2.385 } },
    }
    for _, f in ipairs(makers) do
      local whole = f:run(x)
      assert.equal(f:count(#x), #whole)
      for _ = 1, 5 do
        local stream, parts, at = f:stream(), {}, 1
        while at <= #x do
          local last = math.min(#x, at + math.floor(random(0, 20) ^ 2) - 1)
          parts[#parts + 1] = stream:run(x:slice(at, last))
          at = last + 1
        end
        parts[#parts + 1] = stream:finish()
        assert(lb.samples.join(table.unpack(parts)) == whole)
        assert(not pcall(stream.run, stream, x))
      end
    end
  end)

  it("go on beyond the ends as they are told", function()
    local x, h = noise(80), noise(21)
    local function beyond(rule)
      return lb.samples.make(160, function(i)
        local at = i - 41
        if at >= 0 and at <= 79 then return x[at + 1] end
        local inside, last = at < 0 and -at or 158 - at, at < 0 and x[1] or x[80]
        if rule == "hold" then return last end
        return rule == "mirror" and x[inside + 1] or 2 * last - x[inside + 1]
      end)
    end
    for _, rule in ipairs { "hold", "mirror", "turn" } do
      local f = core.filter.taps(h)
      assert((f:run(x, rule) - f:run(beyond(rule)):slice(41, 120)):peak() < 1e-13)
    end
    local ok, message = pcall(lb.filter.decimator({ factor = 50 }).run,
      lb.filter.decimator { factor = 50 }, x, "turn")
    assert(not ok and message:find("cannot be extended", 1, true))
  end)
end)

describe("resampling", function()
  -- rows resample_poly of oracle_values.csv; its taps are firwin(3201, 1/160, kaiser 5)
  it("agrees with the published values", function()
    local x = lb.samples.new(scipy.signal())
    local h = core.filter.window_taps("low", 0.5 / 160, nil, 3201, 5) * 147
    local y = core.filter.taps(h, 147, 160):run(x)
    assert.equal(scipy.value "resample_poly,\"resample_poly(x,147", #y)
    assert.near(scipy.value 'resample_poly,"""",r[1000]', y[1001], 1e-12)
  end)

  -- row decimate: taps firwin(81, 1/4, hamming), every fourth output, no delay
  it("decimates to the published value", function()
    local x = lb.samples.new(scipy.signal())
    local hamming = lb.samples.make(81, function(i)
      return 0.54 - 0.46 * math.cos(2 * math.pi * (i - 1) / 80)
    end)
    local h = core.filter.window_taps("low", 0.125, nil, 81, hamming)
    local y = core.filter.taps(h, 1, 4):run(x)
    assert.near(scipy.value "decimate,", y[301], 1e-14)
  end)

  it("agrees with scipy.signal.resample_poly over random factors", function()
    local x, requests, made = noise(503), {}, {}
    for i = 1, 30 do
      local up, down = 1 + math.floor(random(0, 12)), 1 + math.floor(random(0, 12))
      local a, b = up, down
      while b > 0 do a, b = b, a % b end
      up, down = up // a, down // a
      if up == 1 and down == 1 then up = 2 end
      local taps = 20 * math.max(up, down) + 1
      local h = core.filter.window_taps("low", 0.5 / math.max(up, down), nil, taps, 6)
      made[i] = core.filter.taps(h * up, up, down):run(x)
      requests[i] = ("resample %d %d %d 6"):format(up, down, taps)
    end
    for i, list in ipairs(scipy.ask(x, requests)) do
      assert(scipy.distance(made[i], list) < 1e-11, requests[i])
    end
  end)

  it("keeps a tone where it is, in time and amplitude", function()
    for _, pair in ipairs { { 147, 160 }, { 5, 2 }, { 2, 5 }, { 1, 3 }, { 64, 1 } } do
      local r = lb.filter.resampler { up = pair[1], down = pair[2], rejection = 100 }
      local share = 0.37 * math.min(1, pair[1] / pair[2])
      local x = lb.samples.make(3000, function(i)
        return 2.385 * math.cos(2 * math.pi * share * (i - 1) + 0.3)
      end)
      local y = r:run(x)
      local want = lb.samples.make(#y, function(j)
        return 2.385 * math.cos(2 * math.pi * share * (j - 1) * r.down / r.up + 0.3)
      end)
      local edge = #y // 4
      assert((y - want):slice(edge, -edge):peak() < 2.385 * 2e-5)
    end
  end)

  it("takes exact rates, and refuses other ratios", function()
    local r = lb.filter.resampler { from = "51.2 kS/s", to = "48 kS/s" }
    assert(r.up == 15 and r.down == 16)
    assert(tostring(r):find("resampler by 15/16", 1, true))
    refuses(lb.filter.resampler, { from = "51.2 kS/s", to = "48000.01 S/s" }, "too fine")
    refuses(lb.filter.resampler, { from = "51.2 kS/s" }, "give from and to")
    refuses(lb.filter.resampler, { up = 2, down = 3, from = 9 }, "give from and to")
    local same = lb.filter.resampler { up = 3, down = 3 }
    local x = noise(20)
    assert(same:run(x) == x)
  end)
end)

describe("decimators", function()
  it("hold flatness and rejection on tones, whatever the stages", function()
    for _, factor in ipairs { 2, 5, 12, 64, 97, 210 } do
      local d = lb.filter.decimator { factor = factor, rejection = 90, keep = 0.38 }
      assert(d.rejection_db >= 90 and d.flatness <= 1e-4)
      local n = factor * 300
      for k = 1, 4 do
        local image = k == 1 and 0 or math.floor(random(1, factor / 2 + 0.999))
        local share = math.abs(image + random(-0.38, 0.38)) / factor
        share = math.min(share, 0.5)
        local x = lb.samples.make(n, function(i) return math.cos(2 * math.pi * share * i) end)
        local y = d:run(x):slice(120, 180)
        local kept = share <= 0.38 / factor
        local want = lb.samples.make(#y, function(j)
          return kept and math.cos(2 * math.pi * share * ((j + 118) * factor + 1)) or 0
        end)
        local limit = kept and d.flatness or 10 ^ (-d.rejection_db / 20)
        assert((y - want):peak() <= 1.002 * limit + 1e-12, ("%d at %g"):format(factor, share))
      end
    end
  end)

  it("state the gain of all their stages together", function()
    local d = lb.filter.decimator { factor = 60 }
    local impulse = lb.samples.new(1):fill(1)
    local h = impulse
    for i = #d.design, 1, -1 do
      local spread = h
      if i < #d.design then
        local factor = d.factors[i]
        spread = core.samples.new((#h - 1) * factor + 1)
        for k = 1, #h do spread[(k - 1) * factor + 1] = h[k] end
      end
      local taps = d.design[i].taps
      local padded = core.samples.new(#spread + #taps - 1)
      padded:slice(1, #spread):fill(spread)
      h = core.filter.taps(taps, 1, 1, 0):run(padded)
    end
    for _, share in ipairs { 0, 0.003, 0.0066, 0.01, 0.1, 0.31 } do
      assert.near(core.filter.taps_gain(h, share), d:gain(share), 1e-12)
    end
  end)

  it("refuse what cannot be", function()
    refuses(lb.filter.decimator, { factor = 1 }, "factor: 1 is out of range")
    refuses(lb.filter.decimator, { factor = 8, keep = 0.5 }, "keep: 0.5 is out of range")
    refuses(lb.filter.decimator, { factr = 8 }, 'did you mean "factor"?')
    refuses(lb.filter.linear, { edge = 5, rate = 1000, transition = 20 }, "reach over 0")
    refuses(lb.filter.taps, { taps = {} }, "is not samples")
  end)
end)
