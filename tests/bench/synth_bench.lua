-- W2: 64 tones and Gaussian noise, 10^7 samples into memory that is there.

local core = require "libration.core"

local N = 10000000
local x = core.samples.new(N)

local signal = { tones = {}, sigma = 0.1, seed = 1 }
for k = 1, 64 do
  signal.tones[k] = { amplitude = 1 / k, cycles = 0.0077 * (k + 0.385), phase = k }
end

local function with(workers)
  return function()
    signal.workers = workers
    core.synth.fill(x, signal)
  end
end

-- Every sample written once.
local function written()
  x:fill(1)
end

-- What one trial of a proof costs: a record of 4096 samples of 20 tones.
local short = core.samples.new(4096)
local record = { rate = 51200, tones = {}, input_noise = 1e-4, own_noise = 1e-5, bits = 24,
  range = 10, timebase = 1e-5, filter = core.filter.prepare {
    shape = "butterworth", order = 8, corner = 0.4, corner_of_rate = true } }
for k = 1, 20 do
  record.tones[k] = { hz = 24.6 * k, amplitude = 1 / k, phase = k }
end

return {
  { name = "W2 script", work = "64 tones + noise, 10^7 samples; against a plain script",
    ours = with(2), peer = "w2_script.py", limit = written, goal = 0.04 },
  { name = "W2 tuned", work = "the same against a tuned script", ours = with(2),
    peer = "w2_tuned.py", limit = written, goal = 0.04 },
  { name = "W2 one thread", work = "the same on one thread", ours = with(1) },
  { name = "W2 record", work = "digitizer model, 20 tones, 4096 samples", times = 200,
    ours = function()
      record.trial = (record.trial or 0) + 1
      core.synth.record(short, record)
    end },
}
