-- Measuring a record by its plan.
--   scripts/libration examples/measure-record.lua [FILE.wav]
--
-- The question: what are the lines in this recording, and how wrong can each be?
-- The plan is made first; then a simulated record is written as a sound file, read
-- back as any recording would be, and measured by the plan's own reading. A
-- record that breaks its plan (wrong rate, too short, clipped) is refused. All
-- values are invented for the demo; a simulated record is not a measurement.

local lb = require "libration"

local demand = lb.demand {
  title = "Two tones (invented for the demo)", unit = "V", noise = "20 uV/rtHz",
  lines = {
    { name = "low", hz = 97, drift = "0.1 %", amplitude = "0.1 .. 1 V", tolerance = "1 %" },
    { name = "high", hz = 1210, drift = "0.1 %", amplitude = "0.1 .. 1 V", tolerance = "1 %" },
  },
}
local digitizer = lb.digitizer {
  title = "Sound card (invented for the demo)", rates = { "8 kS/s", "48 kS/s" }, bits = 16,
  range = "2 V", timebase = "50 ppm",
}

local plan = assert(lb.plan(demand, digitizer, { within = "10 s" }))
local path, own = arg and arg[1], false
if not path then
  path, own = os.tmpname(), true
  local simulated = assert(plan:replay { seed = 7, trial = 0 })
  assert(simulated:write(path))
end

-- The file holds shares of the full scale: how many volts that is must be said.
local record, message = lb.record.read(path, { unit = "V", full_scale = "2 V" })
if own then
  os.remove(path)
end
if not record then
  io.stderr:write(message, "\n")
  os.exit(3)
end
local result, why = record:measure(plan)
print(result or why)
os.exit(result and 0 or 1)
