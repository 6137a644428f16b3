-- Orders of a shaft and averages over its turns.
local lb = require "libration"
local core = require "libration.core"

local rate, n = 5120, 15360

-- Turns of a shaft that speeds up steadily, and the times of whole turns.
local function turns_at(t) return 20 * t + t * t end
local function pulses(first, last, per_turn)
  local out = {}
  for k = first * per_turn, last * per_turn do out[#out + 1] = (100 + k / per_turn) ^ 0.5 - 10 end
  return out
end

local function record(parts)
  return lb.samples.make(n, function(i)
    local turns, sum = turns_at((i - 1) / rate), 0.1
    for order, amplitude in pairs(parts) do
      sum = sum + amplitude * math.cos(2 * math.pi * order * turns + order)
    end
    return sum
  end)
end

local function angle_near(expected, value, tolerance)
  assert.near(0, math.sin((value - expected) / 2), tolerance)
end

describe("the angle of a shaft", function()
  it("is exact for steady speed and steady acceleration", function()
    local p = lb.samples.new(pulses(0, 68, 1)) * rate
    local angle = core.lines.turns(p, 1, 1, 15100)
    for i = 1, 15100, 97 do assert.near(turns_at((i - 1) / rate), angle[i], 1e-10) end
  end)

  it("counts pulses in a turn, and refuses samples without pulses", function()
    local p = lb.samples.new { 0, 10, 20, 30 }
    assert.near(0.25, core.lines.turns(p, 4, 11, 1)[1], 1e-15)
    assert.error_matches(function() core.lines.turns(p, 1, 1, 32) end, "outside the pulses")
    assert.error_matches(function() core.lines.turns(lb.samples.new { 0, 2, 2 }, 1, 1, 1) end,
      "rising times")
  end)
end)

describe("orders", function()
  it("are read through a speed ramp, whole or not", function()
    for _, per_turn in ipairs { 1, 2 } do
      local r = assert(lb.lines.orders(record { [1] = 2, [2.5] = 0.3, [20] = 0.01 },
        { rate = rate, pulses = pulses(0, 68, per_turn), per_turn = per_turn,
          orders = { 1, 2, 2.5, 20 } }))
      for i, amplitude in ipairs { 2, 0, 0.3, 0.01 } do
        assert.near(amplitude, r.lines[i].amplitude, 1e-9)
      end
      angle_near(1, r.lines[1].phase, 1e-9)
      angle_near(2.5, r.lines[3].phase, 1e-8)
      assert.near(0.1, r.offset, 1e-9)
      assert.is_true(r.residual_rms < 1e-8)
    end
  end)

  it("state the scatter that noise gives them", function()
    local sum, trials = 0, 60
    for seed = 1, trials do
      local x = record { [3] = 1 } + lb.synth.noise { rate = rate, samples = n, density = 0.01,
        seed = seed }
      local l = lb.lines.orders(x, { rate = rate, pulses = pulses(0, 68, 1), orders = { 3 } })
        .lines[1]
      sum = sum + ((l.amplitude - 1) / l.u_amplitude) ^ 2
    end
    assert.near(1, sum / trials, 0.6) -- a mean of 60 squares: deviation 0.18
  end)

  it("of a steady speed are a joint fit of its multiples", function()
    local x = lb.synth.tones { rate = rate, samples = n, tones = {
      { hz = 24.6, amplitude = 2 }, { hz = 7 * 24.6, amplitude = 0.5, phase = 1 } } }
    local r = lb.lines.orders(x, { rate = rate, speed_hz = 24.6, orders = "1..10" })
    assert.equal(10, #r.lines)
    assert.near(0.5, r.lines[7].amplitude, 1e-10)
    assert.is_true(r.lines[3].amplitude < 1e-10)
  end)

  it("refuse what they cannot tell apart, and misuse", function()
    local x = record { [1] = 1 }
    local _, message, code = lb.lines.orders(x, { rate = rate, pulses = pulses(0, 68, 1),
      orders = { 1, 1 } })
    assert.equal("domain", code)
    assert.matches("order number 2 ", message)
    assert.error_matches(function() lb.lines.orders(x, { rate = rate, orders = { 1 } }) end,
      "speed_hz %(a steady speed%) or pulses")
    assert.error_matches(function()
      lb.lines.orders(x, { rate = rate, orders = { 1 }, pulses = { 1, 2, 2 } })
    end, "pulse 3 comes at 2.0 s, no later")
  end)
end)

describe("a synchronous average", function()
  it("keeps orders and takes away what is not tied to the shaft", function()
    local x = record { [1] = 2, [7] = 0.5 }
    x:add(lb.synth.tones { rate = rate, samples = n, tones = { { hz = 333.3, amplitude = 1 } } })
    local r = assert(lb.lines.synchronous(x, { rate = rate, pulses = pulses(0, 68, 1) }))
    assert.near(2, r.orders[1].amplitude, 0.05)
    assert.near(0.5, r.orders[7].amplitude, 0.05)
    angle_near(7, r.orders[7].phase, 0.1)
    assert.is_true(r.orders[4].amplitude < 0.05)
    assert.near(0.5 ^ 0.5, r.deviation_rms, 0.02)
    assert.is_true(r.turns >= 66)
  end)

  it("interpolates to 1e-5 up to 0.4 of the rate", function()
    local steady = {}
    for k = 0, 100 do steady[k + 1] = k * 47.3 / rate end
    for _, order in ipairs { 1, 5, 18 } do -- 18 / 47.3 = 0.38 of the rate
      local x = lb.samples.make(4800, function(i)
        return math.cos(2 * math.pi * order * (i - 1) / 47.3)
      end)
      local r = lb.lines.synchronous(x, { rate = rate, pulses = steady, orders = { order } })
      assert.near(1, r.orders[1].amplitude, 1e-5)
      assert.is_true(r.deviation_rms < 1e-5)
    end
  end)

  -- exp(-(2 pi f sigma)^2 / 2) of the amplitude is left; half the power at f sigma = 0.1325 (the
  -- characteristic function of a normal displacement; no source needed).
  it("states what trigger jitter takes, and is not worse", function()
    local jitter, speed = 1e-3, 20
    local order = 7
    local x = lb.samples.make(200 * 256, function(i)
      return math.cos(2 * math.pi * order * speed * (i - 1) / rate)
    end)
    local shifts = lb.synth.noise { rate = 1, samples = 200, density = 2 ^ 0.5 * jitter, seed = 4 }
    local p = {}
    for k = 1, 199 do p[k] = (k - 1) / speed + 1 + shifts[k] - 1 end
    local r = lb.lines.synchronous(x, { rate = rate, pulses = p, orders = { order } })
    assert.near(jitter, r.jitter_s, 0.25 * jitter)
    assert.near(0.1325 / (r.speed_hz * r.jitter_s), r.half_power_order, 0.01 * r.half_power_order)
    local lost = -20 * math.log(r.orders[1].amplitude, 10)
    local stated = r.orders[1].jitter_loss_db
    assert.is_true(stated > 2 and lost < 1.1 * stated and lost > 0.4 * stated,
      ("%g of %g"):format(lost, stated))
    local exact = lb.lines.synchronous(x, { rate = rate, pulses = p, orders = { order },
      jitter_s = 0.1325 / (order * r.speed_hz) })
    assert.near(3.01, exact.orders[1].jitter_loss_db, 0.01)
    assert.matches("loses half its power at 7%.00", tostring(exact))
  end)

  it("refuses records without a whole turn; results read back", function()
    local _, message, code = lb.lines.synchronous(lb.samples.new(200), { rate = 1,
      pulses = { 0, 190, 380 } })
    assert.equal("domain", code)
    assert.matches("average over turns", message)
    for _, r in ipairs {
      lb.lines.synchronous(record { [1] = 1 }, { rate = rate, pulses = pulses(0, 68, 1),
        points = 16 }),
      lb.lines.orders(record { [1] = 1 }, { rate = rate, pulses = pulses(0, 68, 1),
        orders = { 1, 2 } }) } do
      local back = lb.lines.from_json(r:json())
      assert.equal(tostring(r), tostring(back))
      assert.equal(r:csv(), back:csv())
    end
  end)
end)
