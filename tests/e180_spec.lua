-- The 425 Hz tone of ITU-T E.180/Q.35 (03/98), clause 2: planned for a digitizer
-- of 8 kS/s and measured on recordings packaged in sound-theme-freedesktop.
local lb = require "libration"
local sounds = require "tests.support.sounds"

-- The level of the recordings is near 0.25 of full scale; their noise is that
-- of lossy coding, taken generously. E.180 lets the tone stand within 15 Hz.
local function tone(more)
  local t = { unit = "V", noise = "0.2 mV/rtHz", lines = {
    { name = "425 Hz tone", hz = 425, drift = "15 Hz", amplitude = "0.1..0.4 V",
      tolerance = "2 %", tolerance_hz = "0.5 Hz" } } }
  for key, value in pairs(more or {}) do t[key] = value end
  return lb.demand(t)
end

local digitizer = lb.digitizer { rates = { "8 kS/s" }, bits = 16, range = "1 V",
  timebase = "50 ppm" }
local plan = assert(lb.plan(tone(), digitizer, { within = "0.45 s" }))

local function recording(name, first, count)
  return assert(lb.record.read(sounds.of_package("sound-theme-freedesktop",
    "/phone-outgoing-" .. name .. ".oga"), { range = "1 V", first = first, count = count }))
end

describe("the tone of ITU-T E.180", function()
  it("is planned for 8 kS/s", function()
    assert.are.equal("8000", tostring(plan.rate))
    assert.are.equal("tracked", plan.reading)
    assert.is_true(plan.lines[1].hz_error <= 0.5)
  end)

  -- Where the tone is steady: whole recordings, with their gaps and edges, give
  -- 425.04 and 424.65 Hz; the tone itself is 425 Hz.
  local steady = { calling = { 401, 5700 }, busy = { 1201, 3300 } }
  for name, range in pairs(steady) do
    it("is 425 Hz all along " .. name, function()
      for first = range[1], range[2], 523 do
        local l = assert(recording(name, first):measure(plan)).lines[1]
        assert.is_true(math.abs(l.hz - 425) <= l.hz_bound,
          ("from %d: %.3f +- %.3f Hz"):format(first, l.hz, l.hz_bound))
        assert.is_true(l.hz_bound <= 0.5)
        assert.is_true(l.amplitude > 0.23 and l.amplitude < 0.26)
        assert.is_true(l.bound <= 0.02 * l.amplitude * 1.02)
      end
    end)
  end

  it("is known better from a longer record", function()
    local fine = assert(lb.plan(tone { lines = { { name = "425 Hz tone", hz = 425, drift = "15 Hz",
      amplitude = "0.1..0.4 V", tolerance = "2 %", tolerance_hz = "0.06 Hz" } } }, digitizer,
      { within = "0.8 s" }))
    assert.is_true(fine.samples > plan.samples)
    local l = assert(recording("calling", 801):measure(fine)).lines[1]
    assert.is_true(l.hz_bound < 0.12)
    assert.is_true(math.abs(l.hz - 425) <= l.hz_bound, ("%.4f +- %.4f"):format(l.hz, l.hz_bound))
  end)

  it("reads the same in both parts of a recording within the uncertainty", function()
    local early = assert(recording("calling", 401):measure(plan)).lines[1]
    local late = assert(recording("calling", 3000):measure(plan)).lines[1]
    assert.is_true(math.abs(early.hz - late.hz) <= early.hz_bound + late.hz_bound)
  end)
end)

-- A record of the plan with changes, as a person might bring it.
local function brought(changes)
  local given = recording("calling", 1)
  local spec = { rate = given.rate, samples = given:values(1), unit = "V", full_scale = 1,
    bits = 16 }
  for key, value in pairs(changes) do spec[key] = value end
  return lb.record.new(spec)
end

local function refused(record, options)
  local m, message, code = record:measure(plan, options)
  assert.is_nil(m)
  assert.matches("^the record breaks its plan: ", message)
  return code, message
end

describe("a record that breaks its plan", function()
  it("measures when it is what was planned", function()
    assert.is_truthy(brought {}:measure(plan))
  end)

  it("at another rate is refused, however near", function()
    for _, rate in ipairs { 8001, "7999.999", 44100 } do
      local code, message = refused(brought { rate = rate })
      assert.are.equal("wrong_rate", code)
      assert.matches("the plan says 8000 S/s", message)
    end
  end)

  it("that is too short is refused by one sample", function()
    local code, message = refused(recording("calling", 1, plan.samples - 1))
    assert.are.equal("too_short", code)
    assert.matches(("has %d samples, the plan needs %d"):format(plan.samples - 1, plan.samples),
      message)
    assert.is_truthy(recording("calling", 1, plan.samples):measure(plan))
  end)

  it("that clips is refused, with the first sample at the rails", function()
    local values = recording("calling", 1):values(1):totable()
    for i, value in ipairs(values) do
      values[i] = math.max(-1, math.min(1 - 2 / 65536, value * 5))
    end
    local code, message = refused(brought { samples = values })
    assert.are.equal("clipped", code)
    assert.matches("samples stand at the rails, the first is number %d+", message)
  end)

  it("in another unit is refused", function()
    assert.are.equal("wrong_unit", (refused(brought { unit = "Pa" })))
    assert.are.equal("wrong_unit", (refused(lb.record.read(sounds.of_package(
      "sound-theme-freedesktop", "/phone-outgoing-calling.oga")))))
  end)

  it("with values that are no numbers is refused", function()
    local values = recording("calling", 1):values(1):totable()
    values[77] = 0 / 0
    assert.are.equal("not_finite", (refused(brought { samples = values })))
  end)

  it("of a channel that is not there is refused", function()
    assert.are.equal("wrong_channel", (refused(brought {}, { channel = 2 })))
  end)
end)
