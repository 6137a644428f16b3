-- The planner against an independent brute force over all (divider, length)
-- pairs: tests/peers/brute_plan.py, NumPy, dense sampling, no shortcuts.
local lb = require "libration"
local json = require "cjson"

local WINDOWS = { "rectangular", "hann", "hft70" }

local state = 20261201
local function random(low, high) -- MINSTD: Park & Miller 1988, CACM 31(10)
  state = state * 16807 % 2147483647
  return low + (high - low) * (state / 2147483647)
end

local function whole(low, high)
  return math.floor(random(low, high + 1))
end

-- Frequencies with few digits, so that they are exact decimals.
local function hz(low, high, step)
  return math.floor(random(low, high) / step + 0.5) * step
end

local function source(drifting, low, high)
  local amplitude = 10 ^ random(-2, 1)
  return { hz = hz(low, high, 0.5), drift = drifting and 10 ^ random(-4, -2.5) or 0,
    least = amplitude, most = amplitude * random(1, 4), tolerance = 10 ^ random(-2.5, -1) }
end

local function random_problem(i)
  local drifting = i % 2 == 0
  local clock = hz(2000, 20000, 100)
  local first = whole(2, 6)
  local fastest = clock / first
  local sources, lines = {}, whole(1, 3)
  for k = 1, lines + whole(0, 3) do
    sources[k] = source(drifting, fastest * 0.02, fastest * (k <= lines and 0.3 or 0.8))
  end
  return { clock = clock, dividers = { first, first + whole(3, 8) }, block = whole(1, 8),
    samples = { 16, whole(80, 240) }, sources = sources, lines = lines, noise = i % 3 == 0 and
    10 ^ random(-4, -2) or 0, order = i % 4 == 0 and 8 or 0, corner = 0.45, windows = WINDOWS,
    readings = { "tracked", "bin" } }
end

local function demand_of(problem)
  local lines, interferers = {}, {}
  for k, s in ipairs(problem.sources) do
    local is_line = k <= problem.lines
    table.insert(is_line and lines or interferers, { name = "s" .. k, hz = s.hz, drift = s.drift,
      amplitude = { s.least, s.most, "V" }, tolerance = is_line and s.tolerance or nil })
  end
  return lb.demand { unit = "V", lines = lines, interferers = interferers, noise = problem.noise }
end

local function digitizer_of(problem)
  return lb.digitizer { clock = problem.clock, divider = problem.dividers, block = problem.block,
    samples = problem.samples, filter = problem.order > 0 and
    { shape = "butterworth", order = problem.order, corner = problem.corner .. " rate" } or nil }
end

local function ask_brute_force(problems)
  local asked, answered = os.tmpname(), os.tmpname()
  local file = assert(io.open(asked, "w"))
  file:write(json.encode(problems))
  file:close()
  assert(os.execute(("/usr/bin/python3 tests/peers/brute_plan.py <%s >%s"):format(asked, answered)))
  file = assert(io.open(answered))
  local result = json.decode(file:read "a")
  file:close()
  os.remove(asked)
  os.remove(answered)
  return result
end

-- Shortest duration, in clock periods, among rows no worse than `most`.
local function shortest(rows, most)
  local best
  for _, row in ipairs(rows) do
    local periods = row[1] * row[2]
    if row[5] <= most and (not best or periods < best) then
      best = periods
    end
  end
  return best
end

local function row_of(rows, plan)
  for _, row in ipairs(rows) do
    if row[1] == plan.setting.divider and row[2] == plan.samples
      and row[3] == plan.window.name and row[4] == plan.reading then
      return row
    end
  end
end

describe("the shortest plan against brute force", function()
  local problems, answers = {}, nil
  local COUNT = 240

  setup(function()
    for i = 1, COUNT do
      problems[i] = random_problem(i)
    end
    answers = ask_brute_force(problems)
  end)

  it("is as good on every random demand, and never one that is rejected", function()
    local feasible, refused = 0, 0
    for i, problem in ipairs(problems) do
      local plan = lb.plan(demand_of(problem), digitizer_of(problem), { windows = WINDOWS,
        effort_s = 1 })
      local rows = answers[i]
      -- Dense sampling lies below true suprema; with drift the library's sums of
      -- suprema are looser than the jointly sampled ones.
      local sure = shortest(rows, i % 2 == 0 and 0.8 or 0.995)
      if plan then
        feasible = feasible + 1
        local row = row_of(rows, plan)
        assert.is_truthy(row, ("problem %d: brute force rejects the plan"):format(i))
        assert.is_true(row[5] <= plan.worst * (1 + 1e-9) + 1e-9,
          ("problem %d: bound %g, brute force %g"):format(i, plan.worst, row[5]))
        local periods = plan.setting.divider * plan.samples
        assert.is_true(not sure or periods <= sure,
          ("problem %d: %d clock periods, brute force %s"):format(i, periods, sure))
      else
        refused = refused + 1
        assert.is_nil(sure, ("problem %d: refused, brute force has a plan"):format(i))
      end
    end
    assert.is_true(feasible >= 80 and refused >= 20,
      ("%d feasible, %d refused: the random demands are one-sided"):format(feasible, refused))
  end)
end)
