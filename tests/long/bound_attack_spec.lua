-- Bounds attacked: short records, wander, drift, folds, neighbours a bin or two
-- away, lines next to 0 Hz and to half the rate, gains, offsets, time bases.
-- Scenes are drawn at random (invented); no record may pass its bound.
local lb = require "libration"

local SCENES = 700

local state = 20260711
local function unit() -- MINSTD: Park & Miller 1988, CACM 31(10)
  state = state * 16807 % 2147483647
  return state / 2147483647
end
local function even(low, high) return low + (high - low) * unit() end
local function ratio(low, high) return low * (high / low) ^ unit() end
local function whole(low, high) return math.floor(even(low, high + 1)) end
local function one_in(n) return whole(1, n) == 1 end
local function hz(value) return tonumber(("%.4f"):format(value)) end
local function percent(low, high) return ("%.6f %%"):format(100 * ratio(low, high)) end

local WINDOWS = { "rectangular", "hann", "hamming", "nuttall3b", "blackman_harris4", "hft70",
  "hft95", "hft248d", "kaiser", "gaussian", "tukey" }

local function source(name, place)
  return { name = name, hz = hz(place), drift = one_in(2) and percent(1e-5, 3e-2) or nil,
    wander = one_in(3) and percent(1e-4, 2e-2) or nil }
end

local function lines_of(bin)
  local list = {}
  for i = 1, whole(1, 3) do
    local place = one_in(3) and even(0.9, 8) * bin or even(20, 490)
    if one_in(4) then place = even(400, 499.9) end
    if i > 1 and one_in(3) then place = list[1].hz + even(1.2, 5) * bin end
    list[i] = source("line " .. i, place)
    list[i].amplitude, list[i].tolerance = { ratio(0.05, 1), ratio(1, 3), "V" }, "3 V"
  end
  if one_in(3) then
    list[#list + 1] = { name = "order", of = "line 1", times = whole(2, 4), amplitude = "0.7 V",
      tolerance = "3 V" }
  end
  return list
end

local function interferers_of(bin, first)
  local list = {}
  for i = 1, whole(0, 3) do
    local place = one_in(2) and even(3, 495) or even(500, 3000)
    if one_in(3) then place = first + even(1.5, 6) * bin end
    list[i] = source("other " .. i, place)
    list[i].amplitude = ("%.5f V"):format(ratio(0.01, 1))
  end
  return list
end

local function digitizer_of(samples)
  return { rates = { "1 kHz" }, samples = { samples, samples },
    timebase = one_in(2) and percent(1e-5, 3e-2) or nil,
    accuracy = one_in(3) and "3 %" or nil, jitter = one_in(4) and "20 us" or nil,
    filter = one_in(2) and { shape = "butterworth", order = whole(2, 8),
      corner = even(0.3, 0.6) .. " rate", flatness = one_in(2) and "3 %" or nil } or nil }
end

describe("a bound", function()
  it("is passed by no record of random scenes", function()
    local proved = 0
    for number = 1, SCENES do
      local samples = one_in(2) and whole(16, 64) or whole(64, 400)
      local bin = 1000 / samples
      local lines = lines_of(bin)
      local read, demand = pcall(lb.demand, { unit = "V", lines = lines,
        interferers = interferers_of(bin, lines[1].hz), offset = one_in(3) and "0.2 V" or nil })
      local digitizer = lb.digitizer(digitizer_of(samples))
      local plan = read and lb.plan(demand, digitizer, { windows = WINDOWS[whole(1, #WINDOWS)],
        readings = one_in(2) and "tracked" or "bin", undersample = true, effort_s = 0.05 })
      if plan then
        proved = proved + 1
        local proof = plan:prove { trials = 150, noise_trials = 0, progress = false,
          seed = number }
        assert.are.equal(0, proof.violations, ("scene %d: %s"):format(number, tostring(proof)))
      end
    end
    assert.is_true(proved > SCENES / 2, proved .. " scenes were proved")
  end)
end)
