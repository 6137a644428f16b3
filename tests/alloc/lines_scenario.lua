-- What the failing-allocator sweep runs over fits of sines , lists of peaks, shafts.
return "lines", function()
  local core = require "libration.core"
  local lines = core.lines
  local x = core.samples.new(3 * 64)
  for i = 1, 3 * 64 do x[i] = math.cos(0.7 * i) end
  local function need(value, message)
    return value or error(message, 0)
  end
  assert(math.abs(need(lines.sine4(x:slice(1, 64))).amplitude - 1) < 1e-9)
  assert(#need(lines.sine_batch(x, 64, nil, 1)) == 36)
  local w = core.samples.from { 1, 1, 1, 1, 1, 1, 1, 1, 1, 1, 1, 1, 1, 1, 1, 1, 1, 1, 1, 1, 1, 1, 1,
    1, 1, 1, 1, 1, 1, 1, 1, 1 }
  assert(need(lines.peaks(x, w, 16, 5, 1, 0.1)).segments == 11)
  local pulses = core.samples.from { 0, 61, 122, 183 }
  local angle = lines.turns(pulses, 1, 1, 180)
  assert(#need(lines.orders(x:slice(1, 180), angle, { 1, 2 })) == 8)
  assert(#need(lines.turn_average(x, pulses, 1, 8)) == 8)
  assert(#lines.without(x, 1, { 0.1, 1, 0 }) == 192)
  local fit <close> = need(lines.joint(64, { 0.1, 0.2 }))
  assert(#fit:run(x) == 8)
  assert(#need(lines.joint_batch(x, 64, core.samples.from { 0.1, 0.2 }, 2, 1)) == 24)
end
