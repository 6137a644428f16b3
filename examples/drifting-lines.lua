-- Lines that can never be coherent.
--   scripts/libration examples/drifting-lines.lua
--
-- When two speeds drift independently, no record length puts both lines on a bin.
-- The question: how much longer does a measurement take when the drift grows? The
-- planner then counts on nothing but the window: a record long enough that the
-- lines stand apart wherever they drift. All values are invented for the demo.

local lb = require "libration"

local digitizer = lb.digitizer {
  title = "Two-rate recorder (invented for the demo)",
  rates = { "12.8 kS/s", "25.6 kS/s" }, bits = 24, range = "10 V", timebase = "25 ppm",
  filter = { shape = "butterworth", order = 8, corner = "0.4 rate" },
}

local function demand(drift)
  return lb.demand {
    title = "Two fans, drift " .. drift .. " (invented for the demo)",
    unit = "V", noise = "50 uV/rtHz",
    lines = {
      { name = "fan A", hz = 148.2, drift = drift, amplitude = "0.1 .. 1 V", tolerance = "2 %" },
      { name = "fan B", hz = 155.7, drift = drift, amplitude = "0.1 .. 1 V", tolerance = "2 %" },
    },
  }
end

for _, drift in ipairs { "0.05 %", "0.5 %", "1 %", "2 %" } do
  local plan, refusal = lb.plan(demand(drift), digitizer, { within = "30 s" })
  if plan then
    print(("drift %-6s -> %.3f s, window %s, reading %s, worst error %.0f %% of the tolerance")
      :format(drift, plan.duration_s, plan.window.name, plan.reading, 100 * plan.worst))
  else
    print(("drift %-6s -> refused: %s"):format(drift, refusal.message or "nothing fits"))
  end
end
