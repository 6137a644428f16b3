-- A narrow band far above half the rate, on purpose.
--   scripts/libration examples/undersampling.lua
--
-- The question: can a slow digitizer without an anti-alias filter measure two
-- lines near 40 kHz? Yes, when nothing else stands there: the band folds down, and
-- the planner picks a rate at which the folded lines stay clear of each other. The
-- option undersample allows it, because it is wrong whenever anything else is
-- present. All values are invented for the demo.

local lb = require "libration"

local demand = lb.demand {
  title = "Ultrasonic leak detector (invented for the demo)",
  unit = "V", noise = "20 uV/rtHz",
  lines = {
    { name = "carrier", hz = 40000, drift = "20 ppm", amplitude = "0.2 .. 1 V", tolerance = "2 %" },
    { name = "upper", hz = 40320, drift = "20 ppm", amplitude = "0.05 .. 0.2 V",
      tolerance = "5 %" },
  },
}

local digitizer = lb.digitizer {
  title = "10 kS/s card without filter (invented for the demo)",
  clock = "10 MHz", divider = { 1000, 2000 }, bits = 16, range = "2 V",
  timebase = "10 ppm", jitter = "1 ns",
}

local _, refusal = lb.plan(demand, digitizer, { within = "10 s" })
print("Without undersampling: " .. (refusal.message or "refused"))
print()

local plan
plan, refusal = lb.plan(demand, digitizer, { within = "10 s", undersample = true })
if not plan then
  print(refusal)
  os.exit(1)
end
print(plan)
print()
for _, row in ipairs(plan:fold_map()) do
  print(("%s: %.0f Hz shows at %.1f Hz, zone %d%s"):format(row.name, row.hz, row.shown_hz,
    row.zone, row.inverted and ", inverted" or ""))
end
