-- The search against judging every length of every rate of tiny problems, with
-- filters that do not fall steadily, wander, offsets and time bases. Invented.
local core = require "libration.core"

local PROBLEMS = 600

local state = 11072026
local function unit() -- MINSTD: Park & Miller 1988, CACM 31(10)
  state = state * 16807 % 2147483647
  return state / 2147483647
end
local function even(low, high) return low + (high - low) * unit() end
local function ratio(low, high) return low * (high / low) ^ unit() end
local function whole(low, high) return math.floor(even(low, high + 1)) end
local function one_in(n) return whole(1, n) == 1 end

-- Windows and the fewest samples they are used with: four a term and a lobe.
local WINDOWS = { { "rectangular", 16 }, { "hann", 16 }, { "nuttall3b", 16 },
  { "blackman_harris4", 20 }, { "hft70", 20 }, { "hft248d", 48 }, { "kaiser", 16 },
  { "gaussian", 16 } }

local filters = {
  function() return { shape = "none" } end,
  function()
    return { shape = "elliptic", order = whole(3, 8), corner = even(0.3, 0.45),
      corner_of_rate = true, ripple_db = 0.5, stop_db = 40 }
  end,
  function()
    return { shape = "points", corner_of_rate = true, points = { { at = 0.02, db = -30 },
      { at = 0.1, db = 0 }, { at = 0.4, db = 3 }, { at = 0.6, db = -40 } } }
  end,
  function() return { shape = "butterworth", order = whole(1, 8), corner = even(200, 800) } end,
}

local function sources_of(lines, drivers)
  local list = {}
  for i = 1, lines + whole(0, 3) do
    local hz = i <= lines and even(20, 350) or even(20, 1500)
    local least = i <= lines and ratio(0.1, 1) or ratio(1e-3, 3)
    list[i] = { hz = hz, lock_hz = hz, free_hz = one_in(6) and even(0, 1) or 0,
      wander = one_in(5) and ratio(1e-4, 1e-2) or 0, least = least,
      most = least * (one_in(2) and 1 or even(1, 50)), driver = whole(1, drivers) }
  end
  return list
end

local function problem_of(window)
  local rates, spread, lines = {}, {}, {}
  for i = 1, whole(1, 4) do rates[i] = even(800, 3600) end
  for i = 1, whole(1, 3) do spread[i] = one_in(2) and 0 or ratio(1e-4, 2e-2) end
  for i = 1, whole(1, 2) do
    lines[i] = { tolerance = ratio(0.005, 0.4), tolerance_hz = one_in(4) and ratio(0.01, 10)
      or nil }
  end
  return { spread = spread, lines = lines, sources = sources_of(#lines, #spread),
    offset = one_in(3) and ratio(1e-3, 1) or 0, noise = one_in(3) and ratio(1e-4, 1e-2) or 0,
    front = { accuracy = one_in(4) and 0.002 or 0, timebase = one_in(3) and ratio(1e-6, 1e-2) or 0,
      filter = filters[whole(1, #filters)]() },
    rates = { kind = "list", list = rates }, least_samples = window[2],
    most_samples = whole(60, 220),
    modes = { { window = window[1], reading = one_in(2) and "tracked" or "bin" } } }
end

local function holds(problem, rate, samples)
  for _, row in ipairs(core.plan.judge(problem, rate, 1, samples)) do
    if not (row.ratio <= 1) then return false end
  end
  return true
end

local function shortest(problem, t)
  local best
  for _, rate in ipairs(t.rates.list) do
    for samples = t.least_samples, t.most_samples do
      if (not best or samples / rate < best) and holds(problem, rate, samples) then
        best = samples / rate
      end
    end
  end
  return best
end

describe("the search", function()
  it("finds the shortest of all records of tiny problems", function()
    local feasible = 0
    for number = 1, PROBLEMS do
      local t = problem_of(WINDOWS[whole(1, #WINDOWS)])
      local problem <close> = core.plan.problem(t)
      local choice = core.plan.search(problem, { care_work = 1e9, most_work = 1e9 })
      local best = shortest(problem, t)
      local found = choice and choice.samples / choice.rate
      feasible = feasible + (best and 1 or 0)
      assert.are.equal(best ~= nil, found ~= nil, "problem " .. number)
      assert.is_true(not best or math.abs(found / best - 1) < 1e-9,
        ("problem %d: %s instead of %s"):format(number, tostring(found), tostring(best)))
    end
    assert.is_true(feasible > PROBLEMS / 5, feasible .. " were feasible")
  end)
end)
