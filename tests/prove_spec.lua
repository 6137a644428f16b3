-- Plans put on trial from Lua: verdicts, mutations of the bound, replay.
local lb = require "libration"

local function demand()
  return lb.demand {
    title = "two shafts (invented for this test)", unit = "m/s^2",
    sensitivity = "100 mV/(m/s^2)", noise = "200 um/s^2/rtHz",
    lines = {
      { name = "shaft", hz = 24.6, drift = "0.2 %", amplitude = { 0.2, 2, "m/s^2" },
        tolerance = "2 %", tolerance_hz = "0.1 Hz" },
      { name = "second", of = "shaft", times = 2, amplitude = { 0.1, 1, "m/s^2" },
        tolerance = "2 %" },
    },
    interferers = { { name = "mains", hz = 50, drift = "0.2 %", amplitude = "20 mm/s^2" } },
  }
end

local function digitizer()
  return lb.digitizer { rates = { "256 Hz", "512 Hz" }, bits = 16, range = "1 V",
                        timebase = "25 ppm" }
end

local plan = assert(lb.plan(demand(), digitizer(), { readings = "tracked" }))

-- The plan with all systematic claims multiplied; the original stays whole.
local function with_claims(factor, field)
  local claims = {}
  for i, claim in ipairs(plan.claims) do
    claims[i] = {}
    for name, value in pairs(claim) do claims[i][name] = value end
    for _, name in ipairs(field and { field } or { "own", "others" }) do
      claims[i][name] = factor * claims[i][name]
    end
  end
  return setmetatable({ claims = claims }, { __index = plan })
end

describe("a proof", function()
  local proof = plan:prove { trials = 2000, seed = 3 }

  it("holds for a plan, and its bound is nearly reached", function()
    assert.are.equal(0, proof.violations)
    assert.is_true(proof.holds)
    assert.is_true(proof.tightness >= 0.8 and proof.tightness <= 1)
    assert.are.equal(2000, proof.trials)
    assert.are.equal("shaft", proof.lines[1].name)
    assert.matches("holds: no bound passed; the worst case reached 0%.%d%d%d of it",
      tostring(proof))
    assert.matches("line +trials +high +low +hz +rms/sigma +beyond 3s", tostring(proof))
  end)

  it("finds random deviations as large as stated", function()
    for _, line in ipairs(proof.lines) do
      assert.is_true(math.abs(line.rms - 1) < 0.1)
      assert.is_true(line.exceedance < 0.012)
    end
  end)

  it("names the worst case so that it can be made again", function()
    local worst = proof.worst
    assert.are.equal(proof.tightness, worst.ratio)
    local record, particulars = plan:replay { seed = worst.seed, trial = worst.trial,
                                              line = worst.line, side = worst.side, noise = false }
    local line = particulars.lines[worst.line]
    assert.are.equal(worst.ratio, worst.of == "amplitude" and line.ratio or line.ratio_hz)
    assert.are.equal(plan.samples, record.samples)
    local again = plan:replay { seed = worst.seed, trial = worst.trial, line = worst.line,
                                side = worst.side, noise = false }
    assert.are.equal(record:identity(), again:identity())
  end)

  it("does not depend on the number of workers", function()
    local one, three = plan:prove { trials = 300, workers = 1 }, plan:prove { trials = 300,
                                                                               workers = 3 }
    one.seconds, three.seconds = nil, nil
    assert.are.same(one, three)
  end)

  it("rings when the bound is halved", function()
    local bad = with_claims(0.5):prove { trials = 500 }
    assert.is_true(bad.violations > 0)
    assert.is_false(bad.holds)
    assert.matches("FAILS: %d+ violations; worst [12]%.%d+ of the bound", tostring(bad))
    assert.is_true(with_claims(0.5):prove({ trials = 0 }).violations > 0)
    assert.is_true(with_claims(0.3, "hz"):prove({ trials = 500, adversary = false })
      .lines[1].violations_hz > 0)
  end)

  it("sees a standard deviation that is stated too small", function()
    local bad = with_claims(0.25, "sigma"):prove { trials = 300, adversary = false }
    assert.is_true(bad.lines[1].rms > 3 and bad.lines[1].exceedance > 0.3)
  end)

  it("leaves out what was not asked for", function()
    local quiet = plan:prove { trials = 20, noise_trials = 0, adversary = false }
    assert.is_nil(quiet.lines[1].rms)
    assert.is_nil(quiet.lines[1].high)
    assert.matches("adversary not asked", tostring(quiet))
  end)
end)

describe("a replayed record", function()
  it("is measured as the plan promises", function()
    for trial = 1, 20 do
      local record, particulars = plan:replay { seed = 5, trial = trial }
      local m = assert(record:measure(plan))
      for i, line in ipairs(m.lines) do
        assert.is_true(math.abs(line.amplitude - particulars.sources[i].amplitude)
          <= line.bound * 5 / 3) -- systematic bound and five sigma
        assert.is_true(math.abs(line.hz - particulars.sources[i].hz) <= 2 * line.hz_bound)
      end
    end
  end)

  it("carries the digitizer's codes", function()
    local record = plan:replay { trial = 1 }
    local channel = record.channels[1]
    assert.are.same({ 16, 10, "m/s^2" }, { channel.bits, channel.full_scale, channel.unit })
    local x = record:values()
    for i = 1, 50 do
      local code = x[i] / (20 / 2 ^ 16)
      assert.is_true(math.abs(code - math.floor(code + 0.5)) < 1e-6)
    end
  end)
end)

describe("misuse", function()
  it("is named with the valid choices", function()
    assert.has_error(function() plan:prove { trails = 1 } end, "prove: unknown option trails; "
      .. "valid are adversary, noise_trials, progress, seed, trials, workers")
    assert.has_error(function() plan:prove { trials = "many" } end,
      "prove: trials is many; it must be integer")
    assert.has_error(function() plan:prove { trials = -1 } end,
      "prove: trials is -1; it must be between 0 and 1000000000")
    assert.has_error(function() plan:prove { workers = 1000 } end,
      "prove: workers is 1000; it must be between 1 and 256, or 0 for one per core")
    assert.has_error(function() plan:replay { seed = 1 } end,
      "prove: trial is nil; it must be an integer from 0")
    assert.has_error(function() plan:replay { side = "up", line = 1 } end,
      'prove: side is "up"; it must be "high" or "low"')
    assert.has_error(function() plan:replay { side = "high", line = 3 } end,
      "prove: line is 3; it must be between 1 and 2")
  end)
end)
