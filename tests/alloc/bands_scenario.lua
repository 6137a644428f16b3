-- What the failing-allocator sweep runs over bands, groups, cepstrum, envelope and kurtosis.
local function work()
  local synth, bands = require "libration.synth", require "libration.bands"
  local x = synth.tones { rate = 1000, samples = 400, seed = 1, noise = 1e-3, workers = 1,
    tones = { { hz = 50, amplitude = 1 } } }
  local levels, message = bands.levels(x, { rate = 1000, fraction = 1, weighting = "A" })
  assert(levels or message:find "memory", message)
  assert(#bands.groups(x, { rate = 1000, orders = 2 }).harmonics == 2)
  assert(bands.cepstrum(x, { rate = 1000, floor = 1e-9 }).values)
  assert(bands.envelope_spectrum(x, { rate = 1000, from_hz = 20, to_hz = 80 }).amplitude)
  assert(bands.kurtosis(x, { rate = 1000, segment = 50 }).segments == 8)
end

return "bands", function()
  local core = require "libration.core"
  local ok, message = pcall(work)
  core.spectrum.forget()
  if not ok then
    error(message, 0)
  end
end
