-- What the failing-allocator sweep runs over signals that move, ring and break.
return "motion", function()
  local core, synth = require "libration.core", require "libration.synth"
  local common = { rate = 1000, samples = 300, workers = 1 }
  local function with(fields)
    for k, v in pairs(common) do fields[k] = v end
    return fields
  end
  local x = synth.chirp(with { from_hz = 1, to_hz = 90, duration_s = 0.2, amplitude = 1 })
  x:add(synth.ramp(with { speed = { { s = 0, hz = 3 }, { s = 1, hz = 9 } },
    orders = { { times = 2, amplitude = 1 } } }))
  x:add(synth.modulated(with { hz = 90, amplitude = 1, am = { { hz = 3, depth = 1 } } }))
  local rung, at = synth.impacts(with { hz = 20, slip = 0.01,
    modes = { { hz = 200, damping = 0.1 } } })
  assert(#at > 0 and rung:peak() > 0)
  local list = synth.multisine { hz = 3, count = 7, amplitude = 1 }
  assert(#synth.tones(with { tones = list }) == 300)
  local warped = core.synth.warp(x, { shift = 0.3, sigma = 0.1 })
  local record = require("libration.record").new { rate = 1000, samples = x }
  for _, name in ipairs { "lost_samples", "overload_recovery", "clock_jitter", "mains" } do
    assert(synth.plant(record, name).samples > 200)
  end
  assert(core.synth.clip(core.synth.resonate(warped, 0.1, 3), -1, 1) >= 0)
end
