-- What the failing-allocator sweep runs over transforms, readings and proofs.
-- Transform plans are kept for reuse, so they are given back at the end.
local function work(core)
  local samples = {}
  for i = 1, 64 do samples[i] = 0.5 - 0.5 * math.cos(2 * math.pi * (i - 1) / 64) end
  local w = core.samples.from(samples)
  local re, im = core.spectrum.windowed(w, w, 96)
  assert(#core.spectrum.back(re, im, 96) == 96)
  local tracker <close> = core.lines.tracker(w, { 0.05, 0.45, 0.1, 0.1 })
  assert(#tracker:run(w) == 6)
  local proof <close> = core.proof.new({
    rate = 64, window = w, spread = { 0.01 }, noise = 1e-3,
    front = { filter = { shape = "butterworth", order = 4, corner = 20 }, range = 4,
              step = 8 / 2 ^ 16, jitter_s = 1e-6 },
    sources = { { hz = 9, lock_hz = 9, wander = 1e-3, least = 1, most = 2, driver = 1 } },
    claims = { { own = 0.5, others = 0, sigma = 1, f_lo = 8, f_hi = 10, gain = 1 } },
  }, 2)
  assert(proof:run(1, 0, 4, true)[1].violations == 0)
  assert(#proof:attack(1) == 2)
  assert(#proof:replay(1, 2, true) == 64)
  assert(#proof:replay_attack(1, 1, "low") == 64)
end

return "proof", function()
  local core = require "libration.core"
  local ok, message = pcall(work, core)
  core.spectrum.forget()
  if not ok then
    error(message, 0)
  end
end
