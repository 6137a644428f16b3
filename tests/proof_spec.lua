-- Trials and the adversary: closed cases, mutations of the claim, replay.
local core = require "libration.core"

local RATE, N = 256, 512 -- two seconds: half a hertz a bin

local function hann()
  local w = {}
  for i = 0, N - 1 do w[i + 1] = 0.5 - 0.5 * math.cos(2 * math.pi * i / N) end
  return core.samples.from(w)
end

-- Closed form of the Hann window's response at x bins, long records.
local function response(x)
  if x == 0 then return 1 end
  return math.sin(math.pi * x) / (math.pi * x * (1 - x ^ 2))
end

-- One line, 20.25 Hz +- 0.5 %, read at the bin of 20 Hz: the reading falls by
-- the response between 0.29 and 0.70 bins. Images are below 2e-6.
local LOW, HIGH = 2 * (20.25 * 0.995 - 20), 2 * (20.25 * 1.005 - 20)
local OWN = 1 - response(HIGH) + 4e-6

local function setup(changes)
  local out = {
    rate = RATE, window = hann(), spread = { 0.005 }, front = {},
    sources = { { hz = 20.25, lock_hz = 20.25, least = 0.5, most = 2, driver = 1 } },
    claims = { { own = OWN, others = 0, f_lo = 20, f_hi = 20, gain = 1 } },
  }
  for key, value in pairs(changes or {}) do out[key] = value end
  return out
end

-- Two tracked lines and an interferer that is not locked to them.
local function crowd(changes)
  return setup {
    spread = { 0.002, 0.01, 0 }, offset = 0.01, noise = changes and changes.noise,
    sources = {
      { hz = 20.3, lock_hz = 20.3, free_hz = 0.01, least = 0.5, most = 2, driver = 1 },
      { hz = 60.9, lock_hz = 60.9, least = 0.5, most = 2, driver = 1, wander = 1e-3 },
      { hz = 33, lock_hz = 33, least = 0, most = 1, driver = 2 },
    },
    front = changes and changes.front or { accuracy = 1e-3, flatness = 1e-3, timebase = 1e-5 },
    claims = {
      { own = 0.01, others = 0.01, f_lo = 20.2, f_hi = 20.4, gain = 1, hz = 0.02,
        sigma = changes and changes.sigma },
      { own = 0.01, others = 0.01, f_lo = 60.7, f_hi = 61.1, gain = 1, hz = 0.02,
        sigma = changes and changes.sigma },
    },
  }
end

local function tallies(given, trials, options)
  options = options or {}
  local proof <close> = core.proof.new(given, options.workers or 0)
  local done, chunk = 0, options.chunk or 4096
  local out
  repeat
    local count = math.min(chunk, trials - done)
    out = proof:run(options.seed or 1, done, count, options.noise or false)
    done = done + count
  until done == trials
  return out
end

describe("random trials", function()
  it("never pass a true bound, and come close to it", function()
    local t = tallies(setup(), 2000)[1]
    assert.are.equal(2000, t.trials)
    assert.are.equal(0, t.violations)
    assert.is_true(t.worst > 0.99 and t.worst <= 1)
  end)

  it("pass a bound that is a little too small", function()
    local claim = { own = 0.98 * OWN, others = 0, f_lo = 20, f_hi = 20, gain = 1 }
    local t = tallies(setup { claims = { claim } }, 2000)[1]
    assert.is_true(t.violations > 100)
  end)

  it("notice a gain that is not divided out", function()
    local claim = { own = OWN, others = 0, f_lo = 20, f_hi = 20, gain = 0.9 }
    local filter = { shape = "butterworth", order = 2, corner = 20 }
    assert.is_true(tallies(setup { front = { filter = filter }, claims = { claim } },
      500)[1].violations > 100)
  end)

  it("hold tracked frequencies against their bound", function()
    local good = tallies(crowd(), 1000)
    assert.are.equal(0, good[1].violations_hz + good[2].violations_hz)
    local bad = crowd()
    bad.claims[1].hz = good[1].worst_hz * 0.02 / 2
    assert.is_true(tallies(bad, 1000)[1].violations_hz > 0)
  end)

  it("do not depend on workers or on how they are cut", function()
    local options = { noise = true, seed = 42 }
    local given = crowd { noise = 1e-3, sigma = 1e-3, front = { jitter_s = 1e-6 } }
    local one = tallies(given, 300, { noise = true, seed = 42, workers = 1 })
    assert.are.same(one, tallies(given, 300, { noise = true, seed = 42, workers = 3 }))
    assert.are.same(one, tallies(given, 300, { noise = true, seed = 42, chunk = 7 }))
    options.seed = 43
    assert.are_not.same(one, tallies(given, 300, options))
  end)

  it("deviate at random as the noise bandwidth says", function()
    -- G. Heinzel, A. Ruediger, R. Schilling 2002, section 9: a density d gives an
    -- amplitude spectrum of d sqrt(ENBW) rms; the peak amplitude of a line then has
    -- the standard deviation d sqrt(ENBW / T); ENBW of Hann is 1.5 bins.
    local density, duration = 1e-3, N / RATE
    local sigma = density * (1.5 / duration) ^ 0.5
    local given = crowd { noise = density, sigma = sigma, front = {} }
    for _, t in ipairs(tallies(given, 2000, { noise = true })) do
      assert.is_true(math.abs((t.squares / t.trials) ^ 0.5 - 1) < 0.06) -- 4 sigma of 2000
      assert.is_true(t.beyond / t.trials < 0.008)
    end
  end)

  it("see codes and jitter", function()
    -- Uniform quantisation noise step^2 / 12 over half the rate (W. R. Bennett 1948,
    -- Bell Syst. Tech. J. 27, 446-472).
    local step = 16 / 2 ^ 8
    local sigma = (step ^ 2 / 12 / (RATE / 2) * 1.5 / (N / RATE)) ^ 0.5
    local given = crowd { sigma = sigma, front = { range = 8, step = step } }
    for _, t in ipairs(tallies(given, 400, { noise = true })) do
      assert.is_true(math.abs((t.squares / t.trials) ^ 0.5 - 1) < 0.3)
    end
    given = crowd { sigma = sigma, front = { jitter_s = 1e-5 } }
    assert.is_true(tallies(given, 50, { noise = true })[1].squares > 0)
  end)
end)

describe("a replay", function()
  it("is the same record bit for bit", function()
    local given = crowd { noise = 1e-3, sigma = 1e-3, front = { timebase = 1e-4, jitter_s = 1e-6 } }
    local first <close> = core.proof.new(given)
    local second <close> = core.proof.new(given)
    second:replay(9, 1, true)
    local a, particulars, lines = first:replay(9, 123, true)
    local b, again, lines_again = second:replay(9, 123, true)
    for i = 1, N do assert.are.equal(a[i], b[i]) end
    assert.are.same(particulars, again)
    assert.are.same(lines, lines_again)
  end)

  it("shows what the tally found worst", function()
    local proof <close> = core.proof.new(crowd())
    local t = proof:run(5, 0, 500, false)[2]
    local _, _, lines = proof:replay(5, t.worst_trial, false)
    assert.are.equal(t.worst, lines[2].ratio)
  end)

  it("is made of its particulars", function()
    local proof <close> = core.proof.new(crowd())
    for trial = 1, 20 do
      local x, p = proof:replay(3, trial, false)
      for _, i in ipairs { 1, 100, N } do
        local t, value = (i - 1 - (N - 1) / 2) / (RATE * (1 + p.timebase)), p.offset
          * (1 + p.accuracy)
        for _, s in ipairs(p.sources) do
          local swing = s.hz * N / (RATE * (1 + p.timebase)) * s.wander / 2
          value = value + s.amplitude * s.gain * math.cos(2 * math.pi * s.hz * t + s.phase
            - swing * math.cos(2 * math.pi * (i - 1 - (N - 1) / 2) / N + s.wander_phase))
        end
        assert.is_true(math.abs(x[i] - value) < 1e-11)
      end
    end
  end)

  it("stays inside what the scene allows, ends included", function()
    local given = crowd()
    local proof <close> = core.proof.new(given)
    local ends = 0
    for trial = 1, 200 do
      local _, p = proof:replay(8, trial, false)
      assert.is_true(math.abs(p.timebase) <= 1e-5 and math.abs(p.deviation[1]) <= 0.002)
      for i, s in ipairs(p.sources) do
        local source = given.sources[i]
        assert.is_true(s.amplitude >= source.least and s.amplitude <= source.most)
        assert.is_true(math.abs(s.hz - source.hz) <= source.lock_hz * given.spread[source.driver]
          + (source.free_hz or 0) + 1e-9)
        ends = ends + ((s.amplitude == source.least or s.amplitude == source.most) and 1 or 0)
      end
    end
    assert.is_true(math.abs(ends / 600 - 0.25) < 0.07)
  end)

  it("without noise, limits and codes is what the digitizer model gives", function()
    local given = crowd { front = { filter = { shape = "butterworth", order = 4, corner = 80 },
                                    accuracy = 1e-3, flatness = 1e-3, timebase = 1e-4 } }
    local proof <close> = core.proof.new(given)
    for trial = 0, 9 do
      local clean, ideal = proof:replay(4, trial, false), proof:replay(4, trial, true)
      for i = 1, N do assert.is_true(math.abs(clean[i] - ideal[i]) < 1e-10) end
    end
  end)
end)

describe("the adversary", function()
  it("reaches the closed form of the worst case", function()
    local proof <close> = core.proof.new(setup())
    local attacks = proof:attack(1)
    assert.are.equal("low", attacks[2].side)
    assert.is_true(attacks[2].reached > 0.9999 and attacks[2].reached <= 1)
    assert.is_true(math.abs(attacks[2].predicted - attacks[2].reached) < 1e-5)
    -- The other side can only be LOW bins off: still too low.
    local _, p = proof:replay_attack(1, 1, "high")
    assert.is_true(math.abs(2 * (p.sources[1].hz - 20) - LOW) < 1e-6)
  end)

  it("adds up interferers in phase", function()
    -- Both coherent: each adds its own response exactly, and the bound is their sum.
    local reach = response(1.5) * 0.5 + response(2.5) * 0.25
    local given = setup {
      spread = { 0 },
      sources = {
        { hz = 40, least = 1, most = 1, driver = 1 },
        { hz = 40.75, least = 0, most = 0.5, driver = 1 },
        { hz = 38.75, least = 0, most = 0.25, driver = 1 },
      },
      claims = { { own = 0, others = math.abs(response(1.5)) * 0.5 + math.abs(response(2.5)) * 0.25,
                   f_lo = 40, f_hi = 40, gain = 1 } },
    }
    assert.is_true(reach > 0)
    local proof <close> = core.proof.new(given)
    for _, attack in ipairs(proof:attack(1)) do
      assert.is_true(math.abs(attack.reached - 1) < 2e-4)
    end
  end)

  it("predicts what is then measured, tracked lines in a crowd", function()
    local proof <close> = core.proof.new(crowd())
    for _, attack in ipairs(proof:attack(7)) do
      assert.is_true(attack.reached > 0.05)
      assert.is_true(attack.reached >= 0.97 * attack.predicted)
    end
  end)

  it("does worse things than random trials do", function()
    local proof <close> = core.proof.new(crowd())
    local random, attacks = proof:run(1, 0, 500, false), proof:attack(1)
    for i = 1, 2 do
      assert.is_true(math.max(attacks[2 * i - 1].reached, attacks[2 * i].reached)
        >= 0.99 * random[i].worst)
    end
  end)

  it("depends on neither workers nor what was attacked before", function()
    local one <close> = core.proof.new(crowd(), 1)
    local many <close> = core.proof.new(crowd(), 3)
    assert.are.same(one:attack(3), many:attack(3))
    local _, _, lines = many:replay_attack(3, 2, "low")
    assert.are.equal(one:attack(3)[4].reached, lines[2].ratio)
  end)
end)

describe("misuse of a proof", function()
  local function message(changes)
    local ok, text = pcall(core.proof.new, setup(changes))
    assert.is_false(ok)
    return text
  end

  it("names the path of the field", function()
    assert.matches("rate is missing", pcall(core.proof.new, {}) or select(2,
      pcall(core.proof.new, {})))
    assert.matches("sources%[1%]%.hz is missing", message { sources = { { least = 0, most = 1 } } })
    assert.matches("claims%[1%]%.gain is missing",
      message { claims = { { own = 0, others = 0, f_lo = 1, f_hi = 2 } } })
    assert.matches("claims%[1%]%.f_hi is out of its range",
      message { claims = { { own = 0, others = 0, f_lo = 2, f_hi = 1, gain = 1 } } })
    assert.matches("spread%[1%] is not a number from 0 to below 1", message { spread = { 1 } })
    assert.matches("driver is not an index into spread",
      message { sources = { { hz = 1, least = 0, most = 1, driver = 2 } } })
    assert.matches("front%.jitter_s is not a number", message { front = { jitter_s = "x" } })
    assert.matches("claims is empty", message { claims = {} })
    assert.matches("claims has more items than sources", message { sources = {} })
    assert.matches("offset is out of its range", message { offset = -1 })
  end)

  it("refuses closed handles and wrong counts", function()
    local proof = core.proof.new(setup())
    assert.has_error(function() proof:run(1, 0, 5000, false) end)
    assert.has_error(function() proof:replay_attack(1, 2, "high") end)
    assert.has_error(function() proof:replay_attack(1, 1, "sideways") end)
    proof:close()
    proof:close()
    assert.has_error(function() proof:run(1, 0, 1, false) end)
  end)
end)
