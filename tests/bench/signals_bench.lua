-- Beside W2: orders of a ramping driver, impacts and fractional octaves.

local core = require "libration.core"

local N = 10000000
local x = core.samples.new(N)

local ramp = { knots = { { at = 0, speed = 0.001 }, { at = N, speed = 0.004 } }, orders = {},
  workers = 2 }
for k = 1, 20 do
  ramp.orders[k] = { times = 0.77 * k, amplitude = 1 / k, phase = k }
end

local at = core.samples.new(20000)
for i = 1, #at do
  at[i] = 500.385 * i
end
local struck = { modes = {}, at = at, strength = core.samples.new(#at):fill(1), workers = 2 }
for k = 1, 4 do
  struck.modes[k] = { cycles = 0.05 * k, decay = 0.01 * k }
end

local power = core.samples.new(1 << 20):fill(1)

return {
  { name = "W2 ramp", work = "20 orders of a speed ramp, 10^7 samples",
    ours = function() core.synth.orders(x, ramp) end },
  { name = "W2 impacts", work = "4 modes struck 20 000 times, 10^7 samples",
    ours = function() core.synth.struck(x, struck) end },
  { name = "W1 bands", work = "30 third-octave bands from 2^20 lines",
    ours = function() core.bands.powers(power, 0.0244, 3, 6, -17, 30) end },
}
