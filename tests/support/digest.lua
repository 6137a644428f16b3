--- Prints one digest of what the synthesis makes, to compare builds with.
local core = require "libration.core"

local new, parts = core.samples.new, {}
local function keep(x)
  parts[#parts + 1] = x:pack()
end

keep(core.synth.gaussian(new(100003), 2385, { 1, 2 }, -777))
keep(core.synth.uniform(new(10007), 2385, { 3 }, 5))
local tones = {}
for k = 1, 70 do
  tones[k] = { amplitude = 1 / k, cycles = 0.00231 * k ^ 1.1, phase = k * k,
               ramp = k % 9 == 0 and 1e-9 * k or 0, swing = k % 7 == 0 and 1e-5 or 0,
               beat = 1e-4 }
end
local taps = core.synth.shape(core.samples.from { 0.01, 0.2 }, core.samples.from { 1, 3 }, 40)
keep(taps)
local x = core.synth.fill(new(30011), { tones = tones, sigma = 0.1, taps = taps,
  first = (1 << 40) - 9999, seed = 4 })
keep(x)
keep(core.samples.from { x:sum(), x:dot(x), x:rms(), x:min(), x:max() })
local record = new(5003)
core.synth.record(record, { rate = 1000, bits = 12, range = 2, jitter_s = 1e-6,
  input_noise = 1e-3, own_noise = 1e-3, tones = {
    { hz = 50, amplitude = 1.5 }, { hz = 60, amplitude = 1, ramp = 3 } } })
keep(record)
for _, kind in ipairs { "int16", "int24", "int32", "float32" } do
  keep(core.samples.raw(parts[1]:sub(1, 24000), kind):tosamples(0.1):fill(0) +
    core.samples.raw(record:pack():sub(1, 24000), kind == "float32" and "int32" or kind)
    :tosamples(0.1))
end
print(core.base.sha256(table.concat(parts)))
