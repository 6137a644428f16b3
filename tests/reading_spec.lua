-- Laws of the error bound, and the search against judging every combination.
local core = require "libration.core"

local state = 4242
local function draw(low, high) -- MINSTD: Park & Miller 1988, CACM 31(10)
  state = state * 16807 % 2147483647
  return low + (high - low) * (state / 2147483647)
end

local function whole(low, high)
  return math.floor(draw(low, high + 1))
end

-- A scene of two locked lines and two interferers, all things on. Numbers with
-- entropy, invented.
local function scene(change)
  local t = {
    spread = { 0.0013, 0.0021, 0.0004 },
    sources = {
      { hz = 23.85, lock_hz = 23.85, free_hz = 0.011, wander = 1.7e-4, least = 0.57, most = 1.31,
        driver = 1 },
      { hz = 83.475, lock_hz = 83.475, free_hz = 0, wander = 1.7e-4, least = 0.23, most = 0.91,
        driver = 1 },
      { hz = 50, lock_hz = 50, free_hz = 0, wander = 0, least = 0, most = 0.19, driver = 2 },
      { hz = 613.7, lock_hz = 613.7, free_hz = 0.3, wander = 1e-5, least = 0, most = 0.34,
        driver = 3 },
    },
    lines = { { tolerance = 0.031, tolerance_hz = 0.2 }, { tolerance = 0.043 } },
    offset = 0.021, noise = 2.3e-4,
    front = { flatness = 0.0007, accuracy = 0.0011, timebase = 2.3e-5, jitter_s = 1.9e-6,
      range = 5, step = 10 / 4096, noise = 1.1e-5, skew_s = 0,
      filter = { shape = "butterworth", order = 5, corner = 0.41, corner_of_rate = true } },
    rates = { kind = "list", list = { 500 } },
    modes = { { window = "hann", reading = "tracked" }, { window = "hann", reading = "bin" },
      { window = "hft70", reading = "tracked" }, { window = "hft70", reading = "bin" },
      { window = "rectangular", reading = "tracked" }, { window = "nuttall3b", reading = "bin" } },
    least_samples = 16, most_samples = 4096, block = 1, averages = 1, coverage = 3,
  }
  if change then change(t) end
  return t
end

local LENGTHS = { 97, 400, 1503 }

-- All bounds of a scene: a list of rows in the order of modes, lengths, lines.
local function judged(t, rate)
  local problem <close> = core.plan.problem(t)
  local rows = {}
  for mode = 1, #t.modes do
    for _, n in ipairs(LENGTHS) do
      for _, row in ipairs(core.plan.judge(problem, rate or 500, mode, n)) do
        rows[#rows + 1] = row
      end
    end
  end
  return rows
end

local function each(a, b, work)
  assert.are.equal(#a, #b)
  for i = 1, #a do work(a[i], b[i]) end
end

local function close(a, b, relative, what)
  if a ~= b then
    assert.is_true(math.abs(a - b) <= relative * math.max(math.abs(a), math.abs(b)),
      ("%s: %.15g and %.15g"):format(what, a, b))
  end
end

-- No filter, and only the lines move: then an interferer can be anywhere.
local function moved(hz)
  return scene(function(t)
    t.front = { filter = { shape = "none" } }
    for i = 3, 4 do
      local s = t.sources[i]
      s.lock_hz, s.free_hz, s.wander = 0, 0, 0
    end
    t.sources[4].hz = hz
  end)
end

local plain = moved(613.7)

describe("a bound", function()
  it("has the rate as its period: aliases are no special case", function()
    local base = judged(plain)
    for _, hz in ipairs { 613.7 + 500, 613.7 + 4 * 500, 613.7 - 500 } do
      each(base, judged(moved(hz)), function(a, b)
        close(a.others, b.others, 1e-7, "others")
        close(a.ratio, b.ratio, 1e-7, "ratio")
      end)
    end
  end)

  it("sees a frequency and its mirror image alike", function()
    local base = judged(plain)
    for _, hz in ipairs { 1000 - 613.7, 3000 - 613.7 } do
      each(base, judged(moved(hz)), function(a, b)
        close(a.others, b.others, 1e-7, "others")
      end)
    end
  end)

  it("grows with the scale of everything, and not at all in proportion", function()
    for _, times in ipairs { 0.001, 3.7, 1e6 } do
      local scaled = scene(function(t)
        for _, s in ipairs(t.sources) do s.least, s.most = s.least * times, s.most * times end
        for _, field in ipairs { "range", "step", "noise" } do
          t.front[field] = t.front[field] * times
        end
        t.offset, t.noise = t.offset * times, t.noise * times
      end)
      each(judged(scene()), judged(scaled), function(a, b)
        close(a.error * times, b.error, 1e-9, "error")
        close(a.sigma * times, b.sigma, 1e-9, "sigma")
        close(a.ratio, b.ratio, 1e-9, "ratio")
        close(a.own, b.own, 1e-9, "own")
        close(a.hz_bound, b.hz_bound, 1e-9, "hz_bound")
      end)
    end
  end)

  it("does not care about the order of interferers", function()
    local turned = scene(function(t)
      t.sources[3], t.sources[4] = t.sources[4], t.sources[3]
    end)
    each(judged(scene()), judged(turned), function(a, b)
      close(a.error, b.error, 1e-9, "error")
    end)
  end)

  it("is that without an interferer when the interferer is silent", function()
    local silent = scene(function(t) t.sources[3].most = 0 end)
    local without = scene(function(t) table.remove(t.sources, 3) end)
    each(judged(silent), judged(without), function(a, b)
      close(a.error, b.error, 1e-9, "error")
    end)
  end)

  -- Each change makes the world worse; no bound may fall, but for the 2e-3 of the
  -- tolerance to which joint suprema are made tight.
  local worse = {
    ["the drift of a driver"] = function(t, x) t.spread[1] = t.spread[1] * x end,
    ["the drift of an interferer"] = function(t, x) t.spread[2] = t.spread[2] * x end,
    ["a movement of its own"] = function(t, x) t.sources[1].free_hz = 0.011 * x end,
    ["the level of an interferer"] = function(t, x) t.sources[3].most = 0.19 * x end,
    ["the level of an alias"] = function(t, x) t.sources[4].most = 0.34 * x end,
    ["the level of another line"] = function(t, x) t.sources[2].most = 0.91 * (1 + x) end,
    ["the time base"] = function(t, x) t.front.timebase = 2.3e-5 * x end,
    ["jitter"] = function(t, x) t.front.jitter_s = 1.9e-6 * x end,
    ["the gain error"] = function(t, x) t.front.accuracy = 0.0011 * x end,
    ["the flatness"] = function(t, x) t.front.flatness = 0.0007 * x end,
    ["the step of a code"] = function(t, x) t.front.step = 10 / 4096 * x end,
    ["the digitizer's noise"] = function(t, x) t.front.noise = 1.1e-5 * x end,
    ["the noise"] = function(t, x) t.noise = 2.3e-4 * x end,
    ["the offset"] = function(t, x) t.offset = 0.021 * x end,
    ["wander"] = function(t, x) t.sources[1].wander = 1.7e-4 * x end,
    ["the coverage"] = function(t, x) t.coverage = 3 * x end,
  }
  for name, change in pairs(worse) do
    it("never falls when " .. name .. " grows", function()
      local before, grew = judged(scene(function(t) change(t, 0) end)), false
      for _, times in ipairs { 0.3, 1, 1.7, 6 } do
        local after = judged(scene(function(t) change(t, times) end))
        each(before, after, function(a, b)
          assert.is_true(b.ratio >= a.ratio - 2e-3, ("%.12g after %.12g"):format(b.ratio,
            a.ratio))
          grew = grew or b.ratio > a.ratio * (1 + 1e-9)
        end)
        before = after
      end
      assert.is_true(grew, "nothing depends on it")
    end)
  end

  it("falls with the square root of the averages, as far as it is random", function()
    local one, four = judged(scene()), judged(scene(function(t) t.averages = 4 end))
    each(one, four, function(a, b)
      close(a.sigma, b.sigma, 1e-12, "sigma of one record")
      local systematic = a.own * a.amplitude + a.others
      if a.amplitude == b.amplitude and a.ratio > a.ratio_hz then
        close((a.error - systematic) / 2, b.error - systematic, 1e-6, "random part")
      end
    end)
  end)

  it("is the budget summed up: systematic plainly, random in quadrature", function()
    local t = scene()
    local problem <close> = core.plan.problem(t)
    for mode = 1, #t.modes do
      for _, n in ipairs(LENGTHS) do
        for i, row in ipairs(core.plan.judge(problem, 500, mode, n)) do
          local plainly, squares = 0, 0
          for _, term in ipairs(core.plan.budget(problem, 500, mode, n, i)) do
            plainly = plainly + (term.random and 0 or term.value)
            squares = squares + (term.random and term.value ^ 2 or 0)
          end
          close(plainly, row.own * row.amplitude + row.others, 1e-9, "systematic")
          close(plainly + squares ^ 0.5, row.error, 1e-9, "error")
          close(squares ^ 0.5, 3 * row.sigma, 1e-9, "random")
        end
      end
    end
  end)

  it("of a line alone on its bin is its filter, gain and noise only", function()
    local t = { spread = { 0 }, sources = { { hz = 50, least = 1, most = 1, driver = 1 } },
      lines = { { tolerance = 0.01 } }, noise = 0.001,
      front = { accuracy = 0.002, filter = { shape = "none" } },
      rates = { kind = "list", list = { 1000 } },
      modes = { { window = "rectangular", reading = "bin" } } }
    local problem <close> = core.plan.problem(t)
    local row = core.plan.judge(problem, 1000, 1, 200)[1]
    assert.is_true(math.abs(row.own - 0.002) < 1e-9)
    assert.is_true(row.others < 1e-9)
    -- S sqrt(1 / T), T = 0.2 s (Rife & Boorstyn 1974: variance 2 s^2 / N).
    close(row.sigma, 0.001 / 0.2 ^ 0.5, 1e-9, "sigma")
    close(row.ratio, (0.002 + 3 * 0.001 / 0.2 ^ 0.5) / 0.01, 1e-6, "ratio")
  end)
end)

-- Tiny problems of all kinds, and the fewest samples a window may have.
local TERMS = { rectangular = 1, hann = 2, hft70 = 4, nuttall3b = 3 }

local function random_source(drivers, low, high, is_line)
  local hz, most = draw(low, high), 10 ^ draw(-1, 0.5)
  return { hz = hz, lock_hz = hz * whole(0, 1), free_hz = whole(0, 2) == 0 and draw(0, 0.5) or 0,
    wander = whole(0, 4) == 0 and draw(0, 1e-3) or 0,
    least = is_line and most * draw(0.2, 1) or 0, most = most, driver = whole(1, drivers) }
end

local function random_problem()
  local t = { spread = {}, sources = {}, lines = {}, rates = { kind = "list", list = {} },
    modes = {}, least_samples = 16, most_samples = whole(30, 64), block = whole(1, 4),
    averages = whole(1, 3), coverage = 3, offset = whole(0, 2) == 0 and draw(0, 0.1) or 0,
    noise = whole(0, 1) * 10 ^ draw(-4, -2) }
  for i = 1, whole(1, 2) do t.spread[i] = whole(0, 1) * 10 ^ draw(-4, -2) end
  for i = 1, whole(1, 4) do t.rates.list[i] = draw(200, 900) end
  table.sort(t.rates.list)
  local lines = whole(1, 3)
  for i = 1, lines + whole(0, 2) do
    t.sources[i] = random_source(#t.spread, 10, i <= lines and 90 or 600, i <= lines)
    t.lines[i] = i <= lines and { tolerance = 10 ^ draw(-2, -0.6),
      tolerance_hz = whole(0, 3) == 0 and draw(0.1, 4) or nil } or nil
  end
  local order = whole(0, 1) * 4
  t.front = { timebase = whole(0, 1) * 1e-4, accuracy = whole(0, 1) * 1e-3,
    filter = order > 0 and { shape = "butterworth", order = order, corner = 0.4,
      corner_of_rate = true } or { shape = "none" } }
  for window in pairs(TERMS) do
    for _, reading in ipairs { "bin", "tracked" } do
      t.modes[#t.modes + 1] = { window = window, reading = reading }
    end
  end
  table.sort(t.modes, function(a, b) return a.window .. a.reading < b.window .. b.reading end)
  return t
end

local function worst_of(problem, rate, mode, n)
  local worst = 0
  for _, row in ipairs(core.plan.judge(problem, rate, mode, n)) do
    worst = math.max(worst, row.ratio)
  end
  return worst
end

-- Shortest duration, and fewest samples with it, over every combination.
local function exhaustive(t, problem)
  local best
  for _, rate in ipairs(t.rates.list) do
    for n = t.least_samples, t.most_samples do
      local duration = n / rate
      local shorter = not best or duration < best.duration * (1 - 1e-12)
        or duration < best.duration * (1 + 1e-12) and n < best.n
      for mode = 1, n % t.block == 0 and shorter and #t.modes or 0 do
        local least = 4 * (TERMS[t.modes[mode].window] + 1)
        if n >= least and worst_of(problem, rate, mode, n) <= 1 then
          best = { duration = duration, n = n, rate = rate }
          break
        end
      end
    end
  end
  return best
end

describe("the search", function()
  it("equals the best of every combination on random problems", function()
    local feasible, refused = 0, 0
    for i = 1, 80 do
      local t = random_problem()
      local problem <close> = core.plan.problem(t)
      local best = exhaustive(t, problem)
      local choice, _, code = core.plan.search(problem, {})
      if best then
        feasible = feasible + 1
        assert.is_truthy(choice, ("problem %d: refused; %g S/s, %d samples would do")
          :format(i, best.rate, best.n))
        close(choice.samples / choice.rate, best.duration, 1e-12,
          ("problem %d: duration"):format(i))
        assert.are.equal(best.n, choice.samples)
        assert.is_true(worst_of(problem, choice.rate, choice.mode, choice.samples) <= 1)
      else
        refused = refused + 1
        assert.is_nil(choice)
        assert.are.equal("infeasible", code)
      end
    end
    assert.is_true(feasible >= 20 and refused >= 10,
      ("%d feasible, %d refused: one-sided"):format(feasible, refused))
  end)

  it("keeps to a share, and to a longest duration", function()
    for _ = 1, 15 do
      local t = random_problem()
      local problem <close> = core.plan.problem(t)
      local full = core.plan.search(problem, {})
      local half = core.plan.search(problem, { share = 0.5 })
      if half then
        assert.is_true(worst_of(problem, half.rate, half.mode, half.samples) <= 0.5)
        assert.is_true(half.samples / half.rate >= full.samples / full.rate * (1 - 1e-12))
      end
      if full then
        local most = full.samples / full.rate
        assert.is_truthy((core.plan.search(problem, { most_duration = most * (1 + 1e-9) })))
        assert.is_nil((core.plan.search(problem, { most_duration = most * 0.999 })))
      end
    end
  end)

  it("counts its effort, and gives up when it is told to", function()
    local t = random_problem()
    t.most_samples = 4096
    local problem <close> = core.plan.problem(t)
    local choice, _, code = core.plan.search(problem, { most_work = 1e-9 })
    assert.is_true(choice ~= nil or code == "stopped" or code == "infeasible")
  end)
end)
