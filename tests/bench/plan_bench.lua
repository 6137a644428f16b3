-- W5: all coherent settings of a clock; and whole plans with their bounds.

local core = require "libration.core"
local lb = require "libration"

-- The W5 of the goals: dividers 64 to 65535, lengths to 2^20, lines within 0.01
-- bin, thirty interferers more than 3 bins off. Numbers invented.
local function demand(lines)
  local t = { clock = 12.288e6, divider_least = 64, divider_most = 65535, samples_least = 16,
    samples_most = 2 ^ 20, lines = lines, off = 0.01, away = {}, bins = 3, most = 0 }
  table.sort(lines)
  for k = 0, 29 do
    t.away[#t.away + 1] = 1000 + 173.13 * k
  end
  return t
end

local families = {}
for k = 1, 6 do
  families[#families + 1] = 50 * k
  families[#families + 1] = tonumber(("%.1f"):format(24.6 * k))
end

local unrelated = { 24.6, 31.7, 47.3, 50, 61.9, 83.1, 97.7, 111.3, 149.9, 178.7, 233.3, 307.9 }

-- Each setting of some dividers by trying every length: is it what the core found?
local function exhaustive(t, divider)
  local rate, count = t.clock / divider, 0
  for samples = t.samples_least, t.samples_most do
    local seconds, fits = samples / rate, true
    for i = 1, #t.lines do
      local turns = t.lines[i] * seconds
      local off = turns - math.floor(turns + 0.5)
      if off > t.off or off < -t.off or 2 * t.lines[i] >= rate then
        fits = false
        break
      end
    end
    for _, away in ipairs(fits and t.away or {}) do
      local shown = math.abs(away - rate * math.floor(away / rate + 0.5))
      for _, line in ipairs(t.lines) do
        fits = fits and math.abs(shown - line) * seconds > t.bins
      end
    end
    count = count + (fits and 1 or 0)
  end
  return count
end

local function check(t)
  local whole = {}
  for key, value in pairs(t) do whole[key] = value end
  for _, divider in ipairs { 64, 1000, 2500, 6144, 12288, 19999, 20480 } do
    whole.divider_least, whole.divider_most = divider, divider
    local _, count = core.plan.coherent(whole)
    local expected = exhaustive(t, divider)
    assert(count == expected, ("divider %d: %d settings, %d by trying"):format(divider, count,
      expected))
  end
end

local function coherent(t)
  local checked
  return function()
    if not checked then
      check(t)
      checked = true
    end
    return select(2, core.plan.coherent(t)) < 0 and 0 or nil
  end
end

-- Writing down what was found, eight bytes a setting, is the least there is to do.
local function writing(t)
  local block
  return function()
    block = block or core.samples.new(select(2, core.plan.coherent(t)))
    local started = core.base.clock()
    block:fill(1.5)
    return core.base.clock() - started
  end
end

local skid = lb.demand { unit = "m/s^2", sensitivity = "100 mV/(m/s^2)", noise = "60 um/s^2/rtHz",
  lines = {
    { name = "shaft", hz = 24.6, drift = "0.1 %", amplitude = { 0.05, 2, "m/s^2" },
      tolerance = "1 %" },
    { name = "vane pass", of = "shaft", times = 7, amplitude = { 0.05, 2, "m/s^2" },
      tolerance = "1 %" },
    { name = "rotor bar", hz = 1377.6, drift = "0.05 %", amplitude = { 0.01, 0.3, "m/s^2" },
      tolerance = "2 %" },
  },
  interferers = { { name = "mains", hz = 50, drift = "0.4 %", orders = "1..20",
    amplitude = "20 mm/s^2" } } }

local bench = lb.digitizer { clock = "12.288 MHz", divider = { 128, 4096 }, bits = 24,
  range = "5 V", memory = "4 Mi", timebase = "25 ppm", jitter = "2 ns",
  filter = { shape = "butterworth", order = 8, corner = "0.4 rate" } }

local coherent_demand = lb.demand { unit = "V", lines = {
  { name = "a", hz = 24.6, orders = "1..6", amplitude = "1 V", tolerance = "0.1 %" },
  { name = "b", hz = 50, orders = "1..6", amplitude = "1 V", tolerance = "0.1 %" } } }
local divided = lb.digitizer { clock = "12.288 MHz", divider = "64..65535" }

local tone = lb.demand { unit = "V", noise = "1 mV/rtHz",
  lines = { { name = "tone", hz = 100, amplitude = "1 V", tolerance = "1 %" } },
  interferers = { { name = "x", hz = 130, drift = "1 %", amplitude = "0.2 V" } } }
local listed = lb.digitizer { rates = { "1 kHz", "2 kHz", "4 kHz" } }

local function plan(what, digitizer, options)
  return function() assert(lb.plan(what, digitizer, options)) end
end

local function refused()
  local none, refusal = lb.plan(skid, bench, { within = "1 s" })
  assert(none == nil and refusal.binding)
end

return {
  { name = "W5 two families", work = "settings of 65472 dividers x 2^20; script: 32 dividers, "
      .. "scaled up", ours = coherent(demand(families)), peer = "w5_coherent.py",
    limit = writing(demand(families)), goal = 0.01 },
  { name = "W5 unrelated", work = "12 unrelated lines", ours = coherent(demand(unrelated)),
    goal = 0.1 },
  { name = "W5 plan", work = "pump skid, 3 drifting lines, 20 interferers, 3969 dividers",
    ours = plan(skid, bench), goal = 0.2 },
  { name = "W5 plan coherent", work = "12 lines, 65472 dividers", goal = 0.2,
    ours = plan(coherent_demand, divided) },
  { name = "W5 front", work = "a tone and an interferer, three rates", goal = 0.2,
    ours = function() assert(#lb.plans(tone, listed) > 2) end },
  { name = "W5 refusal", work = "pump skid within 1 s", goal = 0.2, ours = refused },
}
