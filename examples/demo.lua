-- What scripts/demo shows: the pump skid from a refused demand to a measured record.
--   scripts/libration examples/demo.lua [TRIALS [FOLDER]]
--
-- Every step says what it shows and why. All values of the skid and of the
-- digitizer are invented for the demo; a simulated record is not a measurement.

local lb = require "libration"

local trials = math.tointeger(tonumber(arg[1] or 10000)) or error("TRIALS is a whole number", 0)
local folder = arg[2] or "build/demo"
local started = os.time()
local report = {} -- what is said, for build/demo/report.txt

local function say(...)
  local text = table.concat({ ... })
  print(text)
  report[#report + 1] = text
end

local step = 0
local function heading(what, why)
  step = step + 1
  say(("\n== Step %d: %s"):format(step, what))
  say(why .. "\n")
end

local function need(value, message)
  if value == nil then
    io.stderr:write("demo: ", tostring(message), "\n")
    os.exit(3)
  end
  return value
end

local here = arg[0]:match("^(.*)/[^/]*$") or "."
local data = need(lb.load(here .. "/pump-skid.demand"))
local demand, digitizer = data.demand, data.digitizer

heading("a demand that cannot be held", "The rig is free for one second only. A tool that plans "
  .. "must be able to say no,\nand what stands in the way; here it is asked for the impossible.")
local plan, refusal = lb.plan(demand, digitizer, { within = "1 s" })
say(tostring(plan or refusal))

heading("the relaxed demand, and its plan", "With a minute allowed the planner looks for the "
  .. "shortest record that holds every\ntolerance wherever drift, noise and hum may fall, and "
  .. "itemises what each line\nmay be wrong by.")
plan, refusal = lb.plan(demand, digitizer, { within = "60 s" })
say(tostring(need(plan, refusal)))

heading("the proof", "The plan is simulated with random amplitudes, phases and frequencies "
  .. "through the\ndigitizer's model, and an adversary looks for the worst case. No systematic "
  .. "bound\nmay be passed: the count of violations must be 0.")
local proof = plan:prove { trials = trials, seed = 1 }
say(tostring(proof))

heading("a record, written and read back", "One simulated record goes into a sound file and "
  .. "comes back as a recording from\nthe rig would, sample for sample.")
need(require("libration.report.file").folder(folder))
local path = folder .. "/pump-skid.wav"
local simulated = need(plan:replay { seed = 2026, trial = 0 })
need(simulated:write(path))
local full_scale = digitizer.range / demand.sensitivity
local record = need(lb.record.read(path, { unit = demand.unit, full_scale = full_scale }))
say(("%s: %d samples at %s S/s, full scale %g %s"):format(path, record.samples,
  tostring(record.rate), full_scale, demand.unit))

heading("the record, measured", "Every line is read the way the plan says, with its worst-case "
  .. "error and its\nuncertainty.")
local result = need(record:measure(plan))
say(tostring(result))

heading("pictures and files", "The fold map shows where everything stands in the record; the "
  .. "predicted spectrum,\nevery line with what it may be and is allowed to be wrong by.")
for name, picture in pairs { ["fold-map"] = lb.report.plot.fold_map,
                             spectrum = lb.report.plot.spectrum } do
  for _, ending in ipairs { "svg", "png" } do
    need(picture(plan, ("%s/%s.%s"):format(folder, name, ending)))
  end
end
need(plan:save(folder .. "/pump-skid.plan"))
local file = require "libration.report.file"
need(file.write(folder .. "/plan.json", need(lb.report.json(plan)) .. "\n"))
need(file.write(folder .. "/lines.csv", lb.report.csv.plan(plan)))
say(folder .. ": fold-map and spectrum (svg, png), pump-skid.wav, pump-skid.plan, plan.json, "
  .. "lines.csv, report.txt")
say(("\nThese %d steps took %d s: %s"):format(step, os.time() - started,
  proof.holds and "the plan holds." or "THE PLAN DOES NOT HOLD."))
need(file.write(folder .. "/report.txt", table.concat(report, "\n") .. "\n"))
os.exit(proof.holds and 0 or 1)
