-- What the failing-allocator sweep runs over plans, refusals and coherence.
return "plan", function()
  local core, lb = require "libration.core", require "libration"
  local demand = lb.demand { unit = "V", noise = "1 mV/rtHz", lines = {
    { name = "tone", hz = 100, drift = "0.1 %", amplitude = "1 V", tolerance = "1 %" } },
    interferers = { { name = "x", hz = 130, amplitude = "0.1 V" } } }
  local digitizer = lb.digitizer { clock = "1 MHz", divider = "990..1000", samples = "16..512" }
  local options = { windows = "hann", effort_s = 0.01 }
  local plan = assert(lb.plan(demand, digitizer, options))
  assert(plan.worst <= 1 and #plan.lines[1].budget > 3 and #tostring(plan) > 100)
  options.within = "1 ms"
  local none, refusal, code = lb.plan(demand, digitizer, options)
  assert(none == nil and code == "infeasible", code ~= "infeasible" and refusal)
  local rows, count = core.plan.coherent { clock = 1000, divider_least = 1, divider_most = 10,
    samples_least = 16, samples_most = 100, lines = { 50 }, off = 0.001, away = { 420 }, bins = 1,
    workers = 1 }
  assert(rows, count)
  assert(#rows == count and count > 0)
  local period, message = core.plan.coherent_period { core.base.fraction(50) }
  assert(period, message)
end
