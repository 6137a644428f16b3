-- What the failing-allocator sweep runs over samples, synthesis and records.
return "signal", function()
  local samples, synth = require "libration.samples", require "libration.synth"
  local x = samples.new { 1, 2, 3 }
  local y = (x + x * 2 - 1):slice(2):copy():add(x:slice(1, 2))
  assert(samples.new(y:pack()) == y and #tostring(y) > 0 and y:totable()[1])
  assert(samples.raw("\1\0\2\0", "int16"):slice(2):tosamples(2)[1] == 4)
  local spec = { rate = 1000, samples = 300, seed = 1, workers = 1,
    noise = { { hz = 10, density = 1 }, { hz = 100, density = 0.1 } }, noise_taps = 8,
    tones = { { hz = 50, amplitude = 1 }, { hz = 60, amplitude = 1, ramp = 2 } } }
  assert(synth.tones(spec) == synth.tones(spec))
  local record, clipped = synth.record { rate = 1000, samples = 300, bits = 8, range = 1,
    jitter_s = 1e-6, input_noise = 1e-3, noise_taps = 8, tones = { { hz = 50, amplitude = 1.5 } },
    filter = { shape = "butterworth", order = 2, corner = "400 Hz" } }
  assert(#record == 300 and clipped > 0)
  assert(not pcall(synth.record, { rate = 1000, samples = 10, bits = 8 }))
end
