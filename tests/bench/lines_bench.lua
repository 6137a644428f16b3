-- W3: four-parameter sine fits of 10 000 records of 4096 samples, frequencies not known
-- beforehand; W3b: joint fits of 20 known lines, 1000 records of 16384 samples.

local core = require "libration.core"

local N, RECORDS, LONG, FEW, LINES = 4096, 10000, 16384, 1000, 20

local x = core.samples.new(N * RECORDS)
core.synth.fill(x, { tones = { { amplitude = 1, cycles = 0.0771, phase = 0.3 } }, sigma = 0.01,
  seed = 1 })

local y = core.samples.new(LONG * FEW)
local shared, own = core.samples.new(LINES), core.samples.new(LINES * FEW)
local tones = {}
for k = 1, LINES do
  shared[k] = 0.0217 * k
  tones[k] = { amplitude = 1 / k, cycles = shared[k], phase = k }
  for i = 0, FEW - 1 do own[i * LINES + k] = 0.0217 * k * (1 + 1e-6 * i) end
end
core.synth.fill(y, { tones = tones, sigma = 0.01, seed = 1 })

local function fits(workers)
  return function() core.lines.sine_batch(x, N, nil, workers) end
end

local function joints(f, workers)
  return function() core.lines.joint_batch(y, LONG, f, LINES, workers) end
end

-- The samples read once.
local function read(z)
  return function() return z:sum() and nil end
end

return {
  { name = "W3 script", work = "10 000 sine fits of 4096", ours = fits(2), peer = "w3_script.py",
    limit = read(x), goal = 0.065 },
  { name = "W3 tuned", work = "the same against a tuned script", ours = fits(2),
    peer = "w3_tuned.py", limit = read(x), goal = 0.065 },
  { name = "W3 one thread", work = "the same on one thread", ours = fits(1) },
  { name = "W3b same", work = "1000 x 16384, the same 20 lines in all", ours = joints(shared, 2),
    peer = "w3b_same.py", limit = read(y), goal = 0.035 },
  { name = "W3b same tuned", work = "the same against a tuned script", ours = joints(shared, 2),
    peer = "w3b_same_tuned.py", limit = read(y), goal = 0.035 },
  { name = "W3b own", work = "the same, every record its own 20", ours = joints(own, 2),
    peer = "w3b_own.py", limit = read(y), goal = 0.035 },
  { name = "W3b own tuned", work = "the same against a tuned script", ours = joints(own, 2),
    peer = "w3b_own_tuned.py", limit = read(y), goal = 0.035 },
  { name = "W3b one thread", work = "every record its own, on one thread", ours = joints(own, 1) },
}
