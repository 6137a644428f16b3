--- Calls the functions on records with arguments that fit and that do not: none may bring the
-- host down, and what raises must say which argument it is about.

local core = require "libration.core"
local scipy = require "tests.support.scipy_records"

local M = {}

local numbers = { 0, 1, -1, 2, 3, 0.5, 0.1, 1e-300, 1e300, -0.0, math.huge, -math.huge, 0 / 0,
  5e-324, 100, 1000, 0.4999, 0.25, 7 }
local words = { "low", "high", "pass", "stop", "turn", "mirror", "hold", "bare", "rest", "settled",
  "linear", "mean", "none", "cubic", "line", "x" }
local shapes = { "butterworth", "chebyshev", "bessel", "elliptic" }
local methods = { "variance", "deviation", "skewness", "kurtosis", "crest", "percentile",
  "histogram", "abs", "square", "sqrt", "log10", "ln", "exp", "round", "clip", "detrend",
  "differences", "cumulative", "crossings", "values_at", "refine" }

--- Makes about six times `rounds` calls.
-- Returns how many gave something, how many raised, and the messages that name no argument.
function M.try(rounds, seed)
  local random = scipy.generator(seed)
  local done, raised, odd = 0, 0, {}
  local function int(low, high) return low + math.floor(random(0, high - low + 0.9999)) end
  local function pick(list) return list[int(1, #list)] end

  local function samples()
    local x = core.samples.new(pick { 0, 1, 2, 3, 4, 5, 9, 33, 200 })
    for i = 1, #x do
      x[i] = int(1, 12) == 1 and pick(numbers) or random(-0.5, 0.5)
    end
    return x
  end

  local function any()
    local kind = int(1, 7)
    return kind <= 3 and pick(numbers) or kind == 4 and pick(words) or kind == 5 and samples()
      or kind == 6 and int(-3, 40) or nil
  end

  local function try(f, ...)
    local ok, value = pcall(f, ...)
    if ok then
      done = done + 1
      return value
    end
    raised = raised + 1
    if not tostring(value):find "bad argument" and not tostring(value):find "bad self" then
      odd[#odd + 1] = value
    end
  end

  local function sections()
    local spec = { shape = pick(shapes), order = int(1, 16), corner = 1, ripple_db = random(0, 1),
      stop_db = random(20, 90) }
    local f = try(core.filter.sections, spec, words[int(1, 4)], random(0, 0.5), 1,
      int(1, 2) == 1 and random(0, 0.5) or any())
    if f then
      try(f.run, f, samples(), any())
      try(f.both_ways, f, samples(), words[int(1, 8)], int(0, 30))
      try(f.both_ways, f, samples(), any(), any())
      try(f.gain, f, any())
      try(f.settling, f, any())
      local stream = f:stream()
      try(stream.run, stream, samples())
    end
  end

  local function taps()
    local f = try(core.filter.taps, samples(), int(1, 9), int(1, 9),
      int(1, 3) == 1 and int(0, 40) or nil)
    if f then
      try(f.run, f, samples(), words[4 + int(1, 4)])
      try(f.count, f, any())
      local stream = f:stream()
      for _ = 1, 3 do try(stream.run, stream, samples()) end
      try(stream.finish, stream)
      try(stream.run, stream, samples())
    end
    try(core.filter.window_taps, words[int(1, 4)], random(0, 0.6), any(), int(0, 50), any())
    try(core.filter.kaiser, any(), any())
    try(core.filter.taps_gain, samples(), any())
  end

  local function calculus(x)
    try(x.integrate, x, { rate = any(), low_hz = any(), full_hz = any(), times = any() })
    try(x.integrate, x, { rate = 1000, low_hz = random(0, 400), times = int(1, 4) })
    try(x.differentiate, x, { rate = any(), high_hz = any(), times = any() })
  end

  for i = 1, rounds do
    local x = samples()
    try(x[pick(methods)], x, any(), any(), any(), any())
    if i % 4 == 0 then
      sections()
      taps()
      calculus(x)
      try(core.samples.join, any(), any())
      local places = core.samples.new(int(0, 9))
      for k = 1, #places do places[k] = random(0, #x) end
      try(x.values_at, x, places, random(0, 0.5), random(0, 1), random(8, 140))
    end
  end
  return done, raised, odd
end

return M
