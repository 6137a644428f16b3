-- Sine fits: laws, bounds of estimation theory, and scipy on the same samples.
local lb = require "libration"
local core = require "libration.core"

local function tones(n, list, sigma, seed)
  local x = lb.synth.tones { rate = 1, samples = n, tones = list }
  if sigma then
    x:add(lb.synth.noise { rate = 1, samples = n, seed = seed or 1, density = sigma * 2 ^ 0.5 })
  end
  return x
end

local function ratio_near(expected, value, share)
  assert.near(1, value / expected, share)
end

describe("a sine fit", function()
  it("finds a clean sine exactly, from very few cycles on and at any length", function()
    for _, n in ipairs { 16, 64, 100, 127, 1000, 4096, 4099 } do
      for _, cycles in ipairs { 1.3, 2.385, 5.5, n / 5.123 } do
        local f = cycles / n
        local x = tones(n, { { hz = f, amplitude = 2.385, phase = 0.7 } }) + 0.3
        local fit = assert(lb.lines.sine(x, { rate = 1 }))
        assert.near(f, fit.hz, 1e-12)
        assert.near(2.385, fit.amplitude, 1e-10)
        assert.near(0.3, fit.offset, 1e-10)
        assert.near(0, math.sin((fit.start_phase - 0.7) / 2), 1e-9)
        assert.is_true(fit.residual_rms < 1e-10 and fit.rounds < 20)
      end
    end
  end)

  it("with a known frequency is linear in the samples, offset apart", function()
    local n, f = 777, 0.0837
    local x = tones(n, { { hz = f, amplitude = 1.5, phase = 1 } }, 0.1)
    local one = lb.lines.sine(x, { rate = 1, hz = f })
    local two = lb.lines.sine(x * -3 + 5, { rate = 1, hz = f })
    assert.near(3 * one.amplitude, two.amplitude, 1e-12)
    assert.near(5 - 3 * one.offset, two.offset, 1e-12)
    assert.near(3 * one.u_amplitude, two.u_amplitude, 1e-13)
    assert.equal(0, one.u_hz)
    assert.equal(3, one.parameters)
  end)

  it("reads a line beyond half the rate at its true frequency", function()
    local x = tones(1000, { { hz = 0.8123, amplitude = 1, phase = 0.3 } })
    local fit = lb.lines.sine(x, { rate = 1, near_hz = 0.8122 })
    assert.near(0.8123, fit.hz, 1e-12)
    assert.near(0.3, fit.start_phase, 1e-9)
  end)

  -- D. C. Rife and R. R. Boorstyn 1974 (IEEE Trans. Inf. Theory 20(5), 591-598) and S. M. Kay
  -- 1993 (eq. 3.41), for a real tone: var w = 24 s^2 / (A^2 N (N^2 - 1)), var A = 2 s^2 / N,
  -- var phase = 4 s^2 (2 N - 1) / (A^2 N (N + 1)) at the first sample, 2 s^2 / (A^2 N) at the
  -- centre; the figures are these for 51200 S/s, N = 4096, A = 1, s = 0.01.
  it("states the uncertainties that theory allows at least", function()
    local rate, n = 51200, 4096
    local x = lb.synth.tones { rate = rate, samples = n,
      tones = { { hz = 6123.4, amplitude = 1 } } }
    x:add(lb.synth.noise { rate = rate, samples = n, seed = 11, density = 0.01 / 25600 ^ 0.5 })
    local fit = assert(lb.lines.sine(x, { rate = rate }))
    ratio_near(0.01, fit.residual_rms, 0.04)
    local scale = fit.residual_rms / 0.01
    ratio_near(1.52285e-3 * scale, fit.u_hz, 2e-3)
    ratio_near(2.20971e-4 * scale, fit.u_amplitude, 2e-3)
    ratio_near(4.41861e-4 * scale, fit.u_start_phase, 2e-3)
    ratio_near(2.20971e-4 * scale, fit.u_phase, 2e-3)
  end)

  it("scatters as much as it states", function()
    local n, records, sigma, f = 256, 1000, 0.2, 0.1234
    local x = lb.samples.new(n * records)
    for i = 0, records - 1 do
      x:slice(i * n + 1, (i + 1) * n):add(tones(n, { { hz = f, amplitude = 1, phase = i } }, sigma,
        i + 1))
    end
    local fits = core.lines.sine_batch(x, n)
    local sums = { 0, 0, 0 }
    for i = 0, records - 1 do
      sums[1] = sums[1] + ((fits[12 * i + 1] - 1) / fits[12 * i + 7]) ^ 2
      sums[2] = sums[2] + ((fits[12 * i + 2] - f) / fits[12 * i + 8]) ^ 2
      sums[3] = sums[3] + (2 * math.sin((fits[12 * i + 4] - i) / 2) / fits[12 * i + 10]) ^ 2
    end
    -- Each is a mean of 1000 squares of about unit variance: deviation 0.045.
    for k = 1, 3 do assert.near(1, sums[k] / records, 0.2) end
  end)

  it("is the same in a batch, for any number of workers", function()
    local n, records = 640, 300
    local x = tones(n * records, { { hz = 0.0712, amplitude = 1 } }, 0.05, 5)
    local one, two = core.lines.sine_batch(x, n, nil, 1), core.lines.sine_batch(x, n, nil, 2)
    assert.is_true(one == two)
    local third = core.lines.sine4(x:slice(2 * n + 1, 3 * n))
    assert.equal(third.amplitude, one[25])
    assert.equal(third.u_offset, one[35])
  end)

  it("refuses what has no sine", function()
    local _, message, code = lb.lines.sine(lb.samples.new(100), { rate = 1 })
    assert.is_true(code == "domain" or code == "no_converge")
    assert.matches("four%-parameter fit", message)
    assert.equal("domain", select(3, lb.lines.sine(lb.samples.make(64, function(i)
      return i == 7 and 0 / 0 or i
    end), { rate = 1, hz = 0.2 })))
    assert.has_error(function() lb.lines.sine(lb.samples.new(100), {}) end,
      "sine: rate is missing; samples alone do not have one")
    assert.error_matches(function() lb.lines.sine(lb.samples.new(7), { rate = 1 }) end,
      "7 samples; a fit needs 8")
    assert.error_matches(function() lb.lines.sine(lb.samples.new(9), { rate = 1, hz = 0.5 }) end,
      "not a frequency between")
  end)

  it("marks the records of a batch that have no fit and fits the others", function()
    local x = lb.samples.new(2 * 64)
    x:slice(65):add(tones(64, { { hz = 0.2, amplitude = 1 } }))
    local fits = core.lines.sine_batch(x, 64)
    assert.is_true(fits[1] ~= fits[1] and fits[12] ~= fits[12])
    assert.near(1, fits[13], 1e-12)
  end)
end)

describe("a joint fit", function()
  it("separates lines less than a bin apart", function()
    local n = 2000
    local x = tones(n, { { hz = 0.1, amplitude = 1, phase = 0.2 },
      { hz = 0.1 + 0.6 / n, amplitude = 0.25, phase = 2 }, { hz = 0.3, amplitude = 1e-4 } })
    local fit = assert(lb.lines.joint(x - 2, { rate = 1, lines = { 0.1, 0.1 + 0.6 / n, 0.3 } }))
    assert.near(1, fit.lines[1].amplitude, 1e-11)
    assert.near(0.25, fit.lines[2].amplitude, 1e-11)
    assert.near(1e-4, fit.lines[3].amplitude, 1e-12)
    assert.near(-2, fit.offset, 1e-12)
    assert.is_true(fit.residual_rms < 1e-12)
  end)

  it("with one line is the three-parameter fit", function()
    local x = tones(500, { { hz = 0.0123, amplitude = 1, phase = 1 } }, 0.3)
    local one = lb.lines.sine(x, { rate = 1, hz = 0.0123 })
    local all = lb.lines.joint(x, { rate = 1, lines = { 0.0123 } })
    for _, key in ipairs { "amplitude", "phase", "u_amplitude", "u_phase" } do
      assert.near(one[key], all.lines[1][key], 1e-12)
    end
    assert.near(one.residual_rms, all.residual_rms, 1e-12)
    assert.near(one.u_offset, all.u_offset, 1e-12)
  end)

  it("is the same in a batch, lines shared or each record's own", function()
    local n, records, f = 1000, 140, { 0.0501, 0.1113, 0.1131, 0.4 }
    local x = tones(n * records, { { hz = 0.0501, amplitude = 1 } }, 0.1)
    local own = lb.samples.make(4 * records, function(i) return f[(i - 1) % 4 + 1] end)
    local a, rest = core.lines.joint_batch(x, n, lb.samples.new(f), 4, 1)
    local b, rest_b = core.lines.joint_batch(x, n, own, 4, 2)
    assert.is_true(a == b and rest == rest_b)
    local fit <close> = core.lines.joint(n, f)
    local flat, one = fit:run(x, 1 + 7 * n)
    for k = 1, 16 do assert.equal(flat[k], a[16 * 7 + k]) end
    assert.equal(one.rms, rest[3 * 7 + 3])
  end)

  it("refuses lines that cannot be told apart, by number", function()
    local _, message, code = lb.lines.joint(lb.samples.new(1000), { rate = 1,
      lines = { 0.1, 0.2, 0.1 + 1e-9 } })
    assert.equal("domain", code)
    assert.matches("line 3 ", message)
    assert.matches("line 2 ", select(2, core.lines.joint(100, { 0.1, 0.5 })))
    assert.matches("need 10", select(2, lb.lines.joint(lb.samples.new(9), { rate = 1,
      lines = { 0.1, 0.2, 0.3, 0.4 } })))
  end)
end)

describe("fits beside scipy", function()
  local function numbers(text)
    local out = {}
    for word in text:gmatch "%S+" do out[#out + 1] = tonumber(word) end
    return out
  end

  local function oracle(x, f0, lines)
    local path = os.tmpname()
    local file = assert(io.open(path, "wb"))
    file:write(x:pack())
    file:close()
    local words = { ("%.17g"):format(f0) }
    for _, f in ipairs(lines) do words[#words + 1] = ("%.17g"):format(f) end
    local pipe = assert(io.popen(("env -u LD_PRELOAD /usr/bin/python3 tests/oracle/sines.py %s %s")
      :format(path, table.concat(words, " "))))
    local out = numbers(pipe:read "a")
    pipe:close()
    os.remove(path)
    return out
  end

  it("agree to 1e-9 on noisy records of odd, even and prime length #slow", function()
    for case, n in ipairs { 501, 1024, 2003 } do
      local lines = { 0.0613 + 0.01 * case, 0.1817, 0.1817 + 1.3 / n, 0.4441 }
      local x = tones(n, { { hz = lines[1], amplitude = 1.7, phase = case },
        { hz = lines[2], amplitude = 0.04 } }, 0.02, case) + 0.7
      local o = oracle(x, lines[1] + 0.2 / n, lines)
      local fit = assert(lb.lines.sine(x, { rate = 1 }))
      local mine = { fit.hz, fit.amplitude, fit.offset, fit.u_hz, fit.u_amplitude, fit.u_offset }
      local joint = lb.lines.joint(x, { rate = 1, lines = lines })
      mine[7] = joint.offset
      for _, l in ipairs(joint.lines) do
        table.move({ l.amplitude, l.phase, l.u_amplitude, l.u_phase }, 1, 4, #mine + 1, mine)
      end
      assert.equal(#o, #mine)
      for k = 1, #o do
        assert.near(1, mine[k] / o[k], 1e-9, ("value %d of case %d"):format(k, case))
      end
    end
  end)
end)

describe("a deterministic signal with a second line", function()
  -- 100 Hz and 250.3 Hz with noise of the MINSTD generator (S. K. Park, K. W. Miller 1988) at 1000
  -- S/s; values: scipy 1.10.1, optimize.curve_fit of sine and offset, as tabled for this project.
  it("has the frequency and amplitude that scipy finds, to 1e-9", function()
    local seed = 1
    local x = lb.samples.make(4096, function(i)
      seed = 16807 * seed % 2147483647
      local t = (i - 1) / 1000
      return math.sin(2 * math.pi * 100 * t) + 0.5 * math.cos(2 * math.pi * 250.3 * t + 0.3)
        + 0.1 * (seed / 2147483647 - 0.5)
    end)
    assert.near(2.75613951664944, x:sum(), 1e-11)
    local fit = lb.lines.sine(x, { rate = 1000 })
    assert.near(1, fit.hz / 99.9998340451686, 1e-9)
    assert.near(1, fit.amplitude / 0.998902971225192, 1e-9)
  end)
end)

describe("a result", function()
  local x = tones(300, { { hz = 0.11, amplitude = 1 } }, 0.1)

  it("reads back from JSON as it was", function()
    for _, r in ipairs { lb.lines.sine(x, { rate = "44.1 kS/s", unit = "V" }),
                         lb.lines.joint(x, { rate = "1/3 Hz", unit = "V", lines = { 0.03 } }) } do
      local back = assert(lb.lines.from_json(r:json()))
      assert.equal(tostring(r), tostring(back))
      assert.equal(r:json(), back:json())
      assert.equal(r:csv(), back:csv())
    end
  end)

  it("is refused, never half read, when its JSON was damaged", function()
    local text = lb.lines.joint(x, { rate = "1/3 Hz", unit = "V", lines = { 0.03, 0.05 } }):json()
    local seed = 1
    local function draw(most)
      seed = (seed * 16807) % 2147483647
      return seed % most + 1
    end
    local refused = 0
    for _ = 1, 1000 do
      local at, kind = draw(#text), draw(3)
      local damaged = kind == 1 and text:sub(1, at)
        or kind == 2 and text:sub(1, at - 1) .. string.char(draw(255)) .. text:sub(at + 1)
        or text:sub(1, at - 1) .. text:sub(at + draw(40))
      local r, message, code = lb.lines.from_json(damaged)
      if r then
        assert.is_true(#tostring(r) > 0 and #r:csv() > 0)
      else
        refused = refused + 1
        assert.equal("format", code)
        assert.matches("^lines: ", message)
      end
    end
    assert.is_true(refused > 500)
  end)

  it("has numbers in its CSV that read back bit for bit", function()
    local r = lb.lines.joint(x, { rate = 1, lines = { { hz = 0.11, name = "a, b" } } })
    local cells = {}
    for cell in r:csv():match('\r\n"a, b",(.-)\r\n'):gmatch "[^,]+" do
      cells[#cells + 1] = tonumber(cell)
    end
    local l = r.lines[1]
    local unit = 1 -- the last cell: no unit was stated
    assert.same({ 0.11, l.amplitude, l.u_amplitude, l.phase, l.u_phase, unit }, cells)
  end)

  it("prints units and two digits of uncertainty", function()
    local text = tostring(lb.lines.sine(x, { rate = 1000, unit = "m/s^2" }))
    assert.matches("amplitude %(peak%)%s+0%.9%d%d%d?%s+0%.00%d+%s+m/s%^2", text)
    assert.matches("1000 S/s, 300 samples", text)
  end)
end)
