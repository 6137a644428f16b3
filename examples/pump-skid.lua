-- Coolant pump skid: from a demand to a proven plan.
--   scripts/libration examples/pump-skid.lua
--
-- The question: how long must a pump skid be recorded, and how, so that three
-- lines of its vibration are measured within 1 % although the speed of the shaft
-- drifts and mains hum stands between the lines? All values of the skid and of
-- the digitizer are invented for the demo.

local lb = require "libration"

local demand = lb.demand {
  title = "Coolant pump skid, cell 4 (invented for the demo)",
  sensitivity = "10 mV/(m/s^2)", -- of the accelerometer: volts at the digitizer
  noise = "60 um/s^2/rtHz",
  lines = {
    { name = "shaft", hz = 24.6, drift = "0.1 %", amplitude = { 0.05, 2, "m/s^2" },
      tolerance = "1 %" },
    { name = "vane pass", of = "shaft", times = 7, amplitude = { 0.05, 2, "m/s^2" },
      tolerance = "1 %" },
    { name = "rotor bar", hz = 1377.6, drift = "0.05 %", amplitude = { 0.02, 0.3, "m/s^2" },
      tolerance = "1 %" },
  },
  interferers = {
    { name = "mains", hz = 50, drift = "0.4 %", orders = "1..20", amplitude = "20 mm/s^2" },
    { name = "inverter", hz = "16 kHz", drift = "0.1 %", amplitude = "0.5 m/s^2" },
  },
}

local digitizer = lb.digitizer {
  title = "24-bit digitizer, clock 12.288 MHz (invented for the demo)",
  clock = "12.288 MHz", divider = { 128, 128 }, decimation = { 8, 10, 12, 16, 20, 24, 32, 40 },
  bits = 24, range = "5 V", memory = "4 Mi",
  filter = { shape = "butterworth", order = 8, corner = "0.4 rate" },
  timebase = "25 ppm", jitter = "2 ns",
}

-- The shortest plan, or the reason why there is none.
local plan, refusal = lb.plan(demand, digitizer, { within = "60 s" })
print(plan or refusal)
if not plan then
  os.exit(1)
end

-- The same plan simulated: random amplitudes, phases and frequencies, and an
-- adversary that looks for the worst case. No bound may be passed.
print()
print(plan:prove { trials = 1000, seed = 1 })
