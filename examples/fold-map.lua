-- Where does everything show in the record?
--   scripts/libration examples/fold-map.lua
--
-- A converter that takes 8000 samples a second shows nothing above 4000 Hz: what
-- is higher folds down. The question: which interferers of an inverter drive come
-- to stand near the lines, and what does the filter leave of them? All values are
-- invented for the demo.

local lb = require "libration"

local demand = lb.demand {
  title = "Inverter drive (invented for the demo)",
  unit = "V",
  lines = {
    { name = "slot", hz = 1180, drift = "0.1 %", amplitude = "0.1 .. 1 V", tolerance = "5 %" },
    { name = "blade", hz = 410, drift = "0.1 %", amplitude = "0.1 .. 1 V", tolerance = "5 %" },
  },
  interferers = {
    { name = "switching", hz = 6500, drift = "0.1 %", orders = "1..3", amplitude = "0.3 V" },
  },
}

local digitizer = lb.digitizer {
  title = "8 kS/s logger (invented for the demo)",
  rates = { "8 kS/s" }, bits = 16, range = "10 V",
  filter = { shape = "butterworth", order = 6, corner = "3 kHz" },
}

local plan, refusal = lb.plan(demand, digitizer, { within = "10 s" })
if not plan then
  print(refusal)
  os.exit(1)
end

local filter = lb.filter(digitizer.filter)
for _, row in ipairs(plan:fold_map()) do
  print(("%-12s %7.0f Hz shows at %6.0f Hz, zone %d%s, the filter passes %6.1f dB"):format(row.name,
    row.hz, row.shown_hz, row.zone, row.inverted and " (inverted)" or "",
    filter:gain_db(row.hz, plan.rate:number())))
end
print()
print(assert(lb.report.plot.text(plan, "fold map")))
