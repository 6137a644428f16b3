-- A pump that runs up: lines of the shaft smear over frequency, not over angle.
--   scripts/libration examples/run-up.lua
--
-- A tacho gives one pulse a turn while the coolant pump's shaft goes from 18 to 31
-- turns a second. The question: how strong is the vane pass, the 7th order? The
-- spectrum of the record spreads it over ninety hertz; sampled at equal angles it
-- is one line. Then velocity from acceleration, by a high-pass and an integral.
-- All values are invented for the demo.

local lb = require "libration"

local rate, seconds = 5120, 8
local n = rate * seconds

-- Turns of the shaft since the start, at sample i.
local function turns(i)
  local t = (i - 1) / rate
  return 18 * t + (31 - 18) / (2 * seconds) * t * t
end

local tacho = lb.samples.make(n, function(i) return 4 * math.sin(2 * math.pi * turns(i)) end)
local x = lb.samples.make(n, function(i)
  return 1.2 * math.cos(2 * math.pi * 7 * turns(i)) -- vane pass, m/s^2
    + 0.3 * math.cos(2 * math.pi * turns(i) + 1)    -- unbalance, m/s^2
    + 0.2 * math.sin(2 * math.pi * 50 * i / rate)   -- mains
end)

-- Peak amplitude of every bin; a Hann window halves the sum of weights.
local function amplitudes(record)
  local w = lb.window("hann"):samples(#record)
  local t = lb.spectrum.transform(record, { window = w })
  return (t.re:square() + t.im:square()):sqrt() * (2 / w:sum())
end

local smeared = amplitudes(x):slice(18 * 7 * seconds, 31 * 7 * seconds)
print(("by time:  no bin from 126 to 217 Hz has more than %.3f m/s^2"):format(smeared:max()))

local pulses = tacho:crossings(0, 0.5, false, "cubic")
local y, about = lb.samples.by_angle(x, pulses, { per_turn = 64 })
local whole = y:slice(1, 64 * about.turns) -- whole turns: orders fall on bins
local orders = amplitudes(whole)
print(("by angle: %d turns from %.1f to %.1f a second, faithful up to order %.1f"):format(
  about.turns, about.slowest * rate, about.fastest * rate, about.orders))
print(("          order 7 has %.3f m/s^2, order 1 has %.3f m/s^2"):format(
  orders[7 * about.turns + 1], orders[about.turns + 1]))

-- Both ways, so that nothing is shifted; then the integral, which takes no mean.
local high_pass = lb.filter.digital { shape = "butterworth", order = 4, band = "high",
  edge = "10 Hz", rate = rate }
print(high_pass)
local v = x:filter(lb.filter.linear { band = "high", edge = "10 Hz", transition = "10 Hz",
  rate = rate }, "turn"):integrate { rate = rate, low_hz = 5 }
local both = high_pass:both_ways(x):integrate { rate = rate, low_hz = 5 }
local middle = both:slice(n // 4, -n // 4)
print(("velocity: %.3f mm/s rms, crest factor %.2f; two filters differ by %.1g mm/s")
  :format(1000 * middle:rms(), middle:crest(),
    1000 * (middle - v:slice(n // 4, -n // 4)):peak()))
