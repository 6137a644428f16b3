-- Planted failures: each leaves the signature that it is known by. Where a number has no other
-- source it was computed for the project's catalogue of failures (N = 16384).

local core = require "libration.core"
local lb = require "libration"
local PI = math.pi
local plant = lb.synth.plant

local function near(a, b, tolerance, what)
  assert(math.abs(a - b) <= tolerance, ("%s: %.10g for %.10g"):format(what or "", a, b))
end

local N, RATE = 16384, 16384

local function tones(list, n, rate, noise)
  return lb.synth.tones { rate = rate or RATE, samples = n or N, tones = list, noise = noise,
    seed = 4 }
end

local function of(x, fields)
  local spec = fields or {}
  spec.rate, spec.samples = spec.rate or RATE, x
  return lb.record.new(spec)
end

-- A record of 16-bit codes over +- 1.
local function coded(x, bits)
  bits = bits or 16
  local codes = core.synth.coarsen(x * 2.0 ^ (bits - 1), 1)
  core.synth.clip(codes, -2.0 ^ (bits - 1), 2.0 ^ (bits - 1) - 1)
  return lb.record.new { rate = RATE, codes = codes, bits = bits, full_scale = 1, unit = "V" }
end

-- Peak amplitude at a whole line; complex with phase.
local function line(x, k, window)
  local n = #x
  local re, im = core.spectrum.windowed(x, window or core.samples.new(n):fill(1))
  local sum = window and window:sum() or n
  return 2 / sum * math.sqrt(re[k + 1] ^ 2 + im[k + 1] ^ 2), math.atan(im[k + 1], re[k + 1])
end

local function dbc(x, k, carrier)
  return 20 * math.log(line(x, k) / line(x, carrier), 10)
end

-- Signal to noise and distortion of a coherent line, by the whole spectrum, dB.
local function sinad(x, k)
  local power = core.bands.line_powers(x - x:mean())
  local signal = power[k + 1]
  return 10 * math.log(signal / (power:sum() - signal), 10)
end

local sine = { { hz = 1021, amplitude = 1 } }

local function options_for(row, hz)
  local o = {}
  for _, option in ipairs(row.options) do
    if option.required then o[option.name] = hz end
  end
  return o
end

describe("the table of failures", function()
  it("accounts for every row of the catalogue", function()
    local rows, elsewhere = lb.synth.failures()
    local seen = {}
    for _, row in ipairs(rows) do
      seen[row.row] = true
      assert(#row.does > 10 and #row.options > 0, row.name)
      for _, option in ipairs(row.options) do
        assert(option.unit and option.text, row.name .. "." .. option.name)
      end
    end
    for _, row in ipairs(elsewhere) do
      assert(not seen[row.row] and row.why, row.row)
      seen[row.row] = true
    end
    for k = 1, 53 do assert(seen[k], k) end
  end)

  it("spoils a record in each way, the same way each time, and never the original", function()
    local x = tones({ { hz = 100, amplitude = 0.7 }, { hz = 1000, amplitude = 0.1 } }, 4096, 4096,
      1e-4)
    local codes = core.synth.coarsen(x * 32768, 1)
    local record = lb.record.new { rate = 4096, title = "pump, invented", channels = {
      { codes = codes, bits = 16, full_scale = 1, unit = "V", name = "a" },
      { codes = core.synth.coarsen(x * 12345, 1), bits = 16, full_scale = 1, unit = "V" } } }
    local before = record:identity()
    for _, row in ipairs((lb.synth.failures())) do
      local o = options_for(row, 100)
      local lying, facts = plant(record, row.name, o)
      assert(lying:identity() ~= before, row.name)
      assert(plant(record, row.name, o):identity() == lying:identity(), row.name)
      assert(facts.failure == row.name and facts.row == row.row and facts.options)
      assert(lying.title == record.title and lying.channels[1].name == "a")
      for k = 1, 2 do -- integer channels hold codes again
        local c = lying.channels[k]
        assert(c.integer and c.bits == 16)
        local back = lying:values(k) / c.factor
        assert((core.synth.coarsen(back:copy(), 1) - back):peak() < 1e-6, row.name)
        assert(back:min() >= -32768 and back:max() <= 32767)
      end
      for _, option in ipairs(row.options) do
        if option.name == "seed" then
          o.seed = 1
          assert(plant(record, row.name, o):identity() ~= lying:identity(), row.name)
        end
      end
    end
    assert(record:identity() == before)
  end)

  it("says what is wrong with an order", function()
    local record = of(tones(sine))
    for text, call in pairs {
      ['did you mean "lost_samples"'] = { record, "lost_sample" },
      ["is no record"] = { {}, "lost_samples" },
      ['did you mean "count"'] = { record, "lost_samples", { coutn = 3 } },
      ["leaves 1 .. 16384"] = { record, "lost_samples", { at = 16000, count = 1000 } },
      ["needs integer codes"] = { record, "stuck_bit" },
      ["30 is too many for a converter of 16 bits"] = { coded(tones(sine)), "stuck_bit",
        { bit = 30 } },
      ["channel 2 does not exist"] = { record, "polarity", { channel = 2 } },
      ["from above half the rate"] = { record, "alias", { hz = 100 } },
      ["hz: missing"] = { record, "close_line" },
    } do
      local ok, message = pcall(plant, call[1], call[2], call[3])
      assert(not ok and message:find(text, 1, true), message)
    end
  end)
end)

describe("planted in the converter", function()
  it("clipping leaves codes at the rails and odd harmonics", function()
    for _, row in ipairs { { 1.001, 2.9, -88 }, { 1.01, 8.9, -59 }, { 1.1, 27, -31 } } do
      local record = of(tones(sine), { full_scale = 1 })
      local lying, facts = plant(record, "adc_clipping", { drive = row[1] })
      local x = lying:values()
      near(100 * facts.clipped / N, row[2], 0.06 * row[2], row[1])
      near(dbc(x, 3063, 1021), row[3], 1, row[1])
      if row[1] == 1.1 then near(line(x, 1021) / 1.1, 1 - 0.032, 1e-3) end
    end
    local rails = plant(coded(tones(sine)), "adc_clipping"):rails()
    assert(rails.low > 500 and rails.high > 500)
  end)

  it("soft clipping flattens below full scale, one side more", function()
    local x = plant(of(tones(sine)), "soft_clipping"):values()
    assert(x:max() < 0.8 and x:max() > 0.78 and x:min() > -0.72 and x:min() < -0.7)
    assert(dbc(x, 2042, 1021) > -60 and dbc(x, 3063, 1021) > -40)
  end)

  it("an overload holds the rail and decays with its time constant", function()
    local quiet = of(core.samples.new(N), { full_scale = 5 })
    local x = plant(quiet, "overload_recovery", { at = 1001, held = 50, amplitude = 2,
      tau_s = 0.1 }):values()
    assert(x[1000] == 0 and x[1001] == 5 and x[1050] == 5)
    for i = 0, 8000, 777 do near(x[1051 + i], 2 * math.exp(-i / (0.1 * RATE)), 1e-12) end
  end)

  it("a gap of 256 zeros costs a Hann-read line 3.1 % and gives skirts", function()
    local x = plant(of(tones(sine)), "zero_gap", { at = N // 2 - 127 }):values()
    assert(x:slice(N // 2 - 127, N // 2 + 128):peak() == 0 and x[N // 2 - 128] ~= 0)
    near(line(x, 1021, lb.window "hann":samples(N)), 1 - 0.031, 5e-4)
    -- 256 of 16384 samples missing: each line beside it about 2 * 256 / 16384 = -30 dB under Hann.
    near(20 * math.log(line(x, 1031, lb.window "hann":samples(N)), 10), -30, 2)
  end)

  it("a spike of height h raises every line to 2 h / N", function()
    local lying, facts = plant(of(tones(sine)), "spikes", { seed = 3 })
    local height = (lying:values() - tones(sine)):peak()
    near(height, 10 / math.sqrt(2), 1e-9)
    for _, k in ipairs { 17, 2385, 8000 } do near(line(lying:values(), k), 2 * height / N, 1e-9) end
    assert(#facts.at == 1)
    assert(#select(2, plant(of(tones(sine)), "spikes", { count = 40 })).at == 40)
  end)

  it("bit 8 of 16 stuck high: SINAD from 97 to 44 dB, 128 codes of offset", function()
    local record = coded(tones { { hz = 1021, amplitude = 0.9 } })
    near(sinad(record:values(), 1021), 97, 1)
    local lying, facts = plant(record, "stuck_bit")
    near(sinad(lying:values(), 1021), 44, 1.5)
    near(lying:values():mean() * 32768, 128, 2)
    near(facts.changed / N, 0.5, 0.02)
    local low = plant(record, "stuck_bit", { high = false }):values()
    near(low:mean() * 32768, -128, 2)
  end)

  it("missing codes, lost and wrapped bits show in the codes", function()
    local record = coded(tones { { hz = 1021, amplitude = 0.9 } })
    local function codes(name, o)
      return plant(record, name, o):values() * 32768
    end
    local x = codes("missing_codes", { every = 16 })
    for i = 1, N, 5 do assert(x[i] % 16 ~= 8) end
    x = codes("truncated_bits", { lost = 4 })
    for i = 1, N, 5 do assert(x[i] % 16 == 0) end
    x = codes "wrapped_codes" -- 0.9 * 32768 needs 15 bits and a sign: one less wraps
    assert(x:peak() <= 16384)
    local jumps, y = 0, codes("missing_codes", { every = 1 << 20 })
    for i = 2, N do
      if math.abs(x[i] - x[i - 1]) > 16384 then jumps = jumps + 1 end
      assert((x[i] - y[i]) % 32768 == 0)
    end
    assert(jumps > 1000)
  end)

  it("a bent converter gives the harmonics of its polynomial", function()
    -- x + b x^2 + c x^3 with x = cos: H2 = b / 2, H3 = c / 4, H1 = 1 + 3 c / 4.
    local x = plant(of(tones(sine), { full_scale = 1 }), "bent_converter",
      { second = 0.02, third = 0.01 }):values()
    near(line(x, 2042), 0.01, 1e-12)
    near(line(x, 3063), 0.0025, 1e-12)
    near(line(x, 1021), 1.0075, 1e-12)
    x = plant(of(tones { { hz = 1000, amplitude = 0.5 }, { hz = 1300, amplitude = 0.5 } }),
      "intermodulation", { second = 0.1, third = 0 }):values()
    assert(line(x, 300) > 0.02 and line(x, 2300) > 0.02 and line(x, 700) < 1e-9)
  end)

  it("wrong scale, unit and too few codes change values as they should", function()
    local record = coded(tones { { hz = 1021, amplitude = 0.9 } })
    local more = plant(record, "wrong_full_scale"):values()
    near(more:rms() / record:values():rms() - 1, 1 / 32767, 1e-9)
    local lying = plant(record, "wrong_sensitivity")
    near(lying:values():rms() / record:values():rms(), 9.80665, 1e-9)
    near(lying.channels[1].full_scale, 9.80665, 1e-9)
    local codes = plant(of(tones(sine), { full_scale = 1 }), "too_few_codes", { bits = 8 }):values()
    -- 6.02 * 8 + 1.76 dB; a simulated quantiser is within 0.2 dB of it (IEEE Std 1241).
    near(sinad(codes, 1021), 49.9, 0.3)
  end)
end)

describe("planted in the instants", function()
  it("lost samples close up and turn the phase behind them", function()
    local x = tones(sine)
    local y = plant(of(x), "lost_samples", { at = 5001, count = 3 }):values()
    assert(#y == N - 3 and y:slice(1, 5000) == x:slice(1, 5000) and y:slice(5001) == x:slice(5004))
    assert(plant(of(x), "lost_samples", { at = 1 }):values() == x:slice(2))
    assert(plant(of(x), "lost_samples", { at = N }):values() == x:slice(1, N - 1))
    -- A quarter of a cycle per sample: one sample lost turns the phase by 90 degrees.
    local z = plant(of(tones { { hz = 4096, amplitude = 1 } }), "lost_samples"):values()
    local before, after = z:slice(1, 4096), z:slice(9001, 9000 + 4096)
    local _, a = line(before, 1024)
    local _, b = line(after, 1024)
    near((b - a - 2 * PI * 0.25 * 9000) % (2 * PI), PI / 2, 1e-9)
  end)

  it("a repeated block repeats exactly", function()
    local x = tones(sine)
    local y = plant(of(x), "repeated_block", { at = 5001, count = 256 }):values()
    assert(y:slice(5001, 5256) == x:slice(4745, 5000) and y:slice(5257) == x:slice(5257))
    local ok, message = pcall(plant, of(x), "repeated_block", { at = 100, count = 256 })
    assert(not ok and message:find "as many samples before it", message)
  end)

  it("decimation folds what it does not filter", function()
    local lying = plant(of(tones { { hz = 7000, amplitude = 1 } }), "unfiltered_decimation")
    assert(tostring(lying.rate) == "4096" and lying.samples == 4096)
    near(line(lying:values(), 4096 * 2 - 7000), 1, 1e-12)
  end)

  it("a wrong rate moves all lines by its ratio, 44.1 for 48 by 8.8 %", function()
    local lying = plant(of(tones(sine, N, 44100), { rate = 44100 }), "wrong_rate")
    assert(lying.rate == lb.fraction.new(48000))
  end)

  it("delays, skews and clocks shift by what they say", function()
    local function two(name, o, list)
      local x = tones(list or sine)
      local record = lb.record.new { rate = RATE, channels = { { samples = x },
        { samples = x } } }
      local lying = plant(record, name, o)
      assert(lying:values(1) == x:slice(1, lying.samples))
      return lying:values(1), lying:values(2), x
    end
    local _, y, x = two("ignored_delay", { delay = 24 })
    assert(y:slice(101) == x:slice(77, N - 24))
    _, y = two("ignored_delay", { delay = 2.385 })
    for i = 101, N - 100, 97 do
      near(y[i], math.cos(2 * PI * 1021 / RATE * (i - 1 - 2.385)), 1e-4)
    end
    local a, b = two("channel_skew", { delay_s = 10e-6 }, { { hz = 1000, amplitude = 1 } })
    local function phase(z) return select(2, line(z:slice(1025, 1024 + 8192), 500)) end
    near((phase(b) - phase(a)) * 180 / PI, 3.6, 0.01) -- 10 us at 1 kHz
    a, b = two("clock_mismatch", { error = 1e-4 })
    assert(#a == #b and #a >= N - 3)
    for _, i in ipairs { 1000, 8000, 16000 } do
      near(b[i], math.cos(2 * PI * 1021 / RATE * (i - 1) * (1 + 1e-4)), 1e-4)
    end
  end)

  it("jitter raises the floor by -20 log10(2 pi f sigma)", function()
    for _, hz in ipairs { 1021, 4091 } do
      local lying = plant(of(tones { { hz = hz, amplitude = 1 } }), "clock_jitter",
        { jitter_s = 1e-7, seed = 2 })
      -- The interpolation is good to 1e-4 at worst, far better for these lines.
      near(sinad(lying:values():slice(1, 16384), hz), -20 * math.log(2 * PI * hz * 1e-7, 10), 0.5)
    end
  end)

  it("trigger jitter shrinks an average by exp(-(2 pi f sigma)^2 / 2)", function()
    -- -3 dB where f sigma = 0.1325; synchronous stretches of 64 samples.
    local n, period, hz = 64 * 1024, 64, 1024
    local sigma = 0.1325 / hz
    local lying = plant(of(tones({ { hz = hz, amplitude = 1 } }, n)), "trigger_jitter",
      { period = period, jitter_s = sigma, seed = 8 })
    local x, mean = lying:values(), core.samples.new(period)
    local stretches = #x // period
    for k = 0, stretches - 1 do
      mean:add(x:slice(k * period + 1, (k + 1) * period), 1 / stretches)
    end
    near(20 * math.log(line(mean, 4), 10), -3.01, 0.4)
  end)

  it("speed drift widens lines and keeps their middle", function()
    local y = plant(of(tones { { hz = 1000, amplitude = 1 } }), "speed_drift",
      { change = 0.02 }):values()
    for i = 200, #y - 200, 501 do
      local t = i - 1
      near(y[i], math.cos(2 * PI * 1000 / RATE * (t - 0.01 * t + 0.02 * t * t / (2 * N))), 1e-4)
    end
    assert(line(y, 1000) < 0.5)
  end)

  it("cuts end where they say", function()
    assert(plant(of(tones(sine)), "half_record", { share = 0.25 }).samples == N // 4)
    local lying, facts = plant(of(tones(sine)), "half_cycle_cut", { hz = 24.6 })
    near(facts.cycles % 1, 0.5, 24.6 / RATE)
    assert(lying.samples > N - RATE / 24.6 - 1)
  end)
end)

describe("planted in the signal", function()
  local quiet = of(core.samples.new(N))

  it("aliases appear where they fold", function()
    local lying, facts = plant(quiet, "alias", { hz = RATE - 1300, amplitude = 0.2 })
    assert(facts.seen_hz == 1300)
    near(line(lying:values(), 1300), 0.2, 1e-12)
    -- The half sum of two rates is seen at half their difference with both.
    lying, facts = plant(quiet, "hidden_alias", { other_rate = 12384, amplitude = 0.2 })
    near(line(lying:values(), (RATE - 12384) // 2), 0.2, 1e-12)
    near(facts.hz - 12384, 2000, 1e-9)
    local other = plant(of(core.samples.new(12384), { rate = 12384 }), "alias",
      { hz = facts.hz, amplitude = 0.2 })
    near(line(other:values(), 2000), 0.2, 1e-12)
    lying = plant(quiet, "folded_harmonics", { hz = 4096, orders = 5, amplitude = 0.2, phase = 0 })
    near(line(lying:values(), 4096), 0.2 / 3 + 0.2 / 5, 1e-12) -- orders 3 and 5 fall on the line
  end)

  it("mains comes with its harmonics, a neighbour with its distance", function()
    local x = plant(quiet, "mains", { deviation_hz = 0, amplitude = 0.1, orders = 200 }):values()
    for _, h in ipairs { 1, 2, 7, 100 } do near(line(x, 50 * h), 0.1 / h, 1e-12) end
    near(line(x, RATE - 50 * 200), 0.1 / 200, 1e-12) -- 10 kHz folds to 6384 Hz
    x = plant(quiet, "close_line", { hz = 1000, apart_hz = 3, amplitude = 0.4 }):values()
    near(line(x, 1003), 0.4, 1e-12)
  end)

  it("a sensor's resonance: gain 1 / (1 - (f / fr)^2) below, q at it", function()
    -- +10 % at 0.3 fr for a mount without much damping (ISO 5348).
    local record = of(tones { { hz = 300, amplitude = 1 }, { hz = 1000, amplitude = 1 } })
    local x = plant(record, "mount_resonance", { hz = 1000, q = 20 }):values()
    x = x:slice(N // 2 + 1)
    near(line(x, 150), 1 / (1 - 0.09), 3e-3)
    near(line(x, 500), 20, 0.02)
    x = plant(of(tones { { hz = 2000, amplitude = 1 } }), "droop", { corner_hz = 2000 }):values()
    near(line(x:slice(N // 2 + 1), 1000) ^ 2, 0.5, 1e-9)
  end)

  it("offsets, warm-up, lost bias and cable bursts sit at low frequencies", function()
    near(plant(quiet, "offset", { amplitude = 0.25 }):values():mean(), 0.25, 1e-15)
    local x = plant(quiet, "warm_up", { amplitude = 3, tau_s = 0.2 }):values()
    for i = 0, N - 1, 999 do near(x[i + 1], 3 * math.exp(-i / (0.2 * RATE)), 1e-12) end
    x = plant(of(tones(sine)), "lost_bias", { at = 9001, level = 0.1 }):values()
    assert(x[9001] == 0.1 and x:slice(9001):max() == 0.1 and x:slice(1, 9000):peak() > 0.99)
    local lying, facts = plant(quiet, "cable_bursts", { count = 3, size = 2 })
    x = lying:values()
    assert(#facts.at == 3 and x:peak() > 0.5)
    local power = core.bands.line_powers(x)
    assert(power:slice(1, 41):sum() > 0.99 * power:sum())
  end)
end)

describe("a spoilt record", function()
  it("keeps its start, and hides its gaps", function()
    local record = lb.record.new { rate = 100, samples = tones(sine, 200, 100),
      start = "2026-03-01T12:00:00Z", gaps = { { after = 100, lost = 7 } } }
    local lying = plant(record, "polarity")
    assert(lying.start_ns == record.start_ns and lying:counter(150) < record:counter(150))
  end)
end)

describe("planted between channels", function()
  local x, y = tones(sine), tones { { hz = 333, amplitude = 0.5 } }
  local record = lb.record.new { rate = RATE, channels = {
    { samples = x, unit = "V", name = "a" }, { samples = y, unit = "Pa", name = "b" } } }

  it("ghosts, swaps and polarity change what belongs to whom", function()
    local ghost = plant(record, "ghost", { share = 0.02 })
    near(line(ghost:values(2), 1021), 0.02, 1e-12)
    assert(ghost:values(1) == x)
    local swap = plant(record, "channel_swap")
    assert(swap:values(1) == y and swap:values(2) == x)
    assert(swap.channels[1].name == "a" and swap.channels[1].unit == "V")
    local turned = plant(record, "polarity", { channel = 2 })
    assert(turned:values(2) == -y and turned:values(1) == x)
  end)
end)

describe("interpolation at other instants", function()
  it("keeps tones up to 0.4 of the rate to 1e-4, whole instants exactly", function()
    for _, cycles in ipairs { 0.003, 0.11, 0.2385, 0.33, 0.4 } do
      local x = core.synth.fill(core.samples.new(2000),
        { tones = { { amplitude = 1, cycles = cycles, phase = 0.3 } } })
      for _, shift in ipairs { 0.5, 0.2385, 0.9 } do
        local y = core.synth.warp(x, { shift = shift })
        for i = 100, 1900, 7 do
          near(y[i], math.cos(2 * PI * cycles * (i - 1 + shift) + 0.3), 1e-4, cycles)
        end
      end
      assert(core.synth.warp(x, { shift = 3 }):slice(1, 1900) == x:slice(4, 1903))
    end
  end)
end)
