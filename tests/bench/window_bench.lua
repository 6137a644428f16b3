-- What a planner pays for a window: bounds of its response over an interval.

local core = require "libration.core"

-- Bounds over intervals of one width, at places spread over a thousand bins.
local function ranges(name, width)
  local kernel, x = core.window.new(name), 0
  return function()
    x = (x + 0.6180339887498949 * 1000) % 1000
    kernel:range(x, x + width, 65536)
  end
end

local function line(name, width, goal)
  return { name = "window range", work = ("%s, %g bins wide"):format(name, width),
    ours = ranges(name, width), times = 20000, goal = goal }
end

local kernel, n = core.window.new "blackman_harris4", 65536

return {
  line("hann", 1e-4, 0.5e-6),
  line("hann", 0.3, 2e-6),
  line("blackman_harris4", 1e-4, 0.5e-6),
  line("blackman_harris4", 0.3, 2e-6),
  line("blackman_harris4", 1000, 20e-6),
  line("hft248d", 1e-4, 0.7e-6),
  line("kaiser", 1e-4, 1e-6),
  line("tukey", 1e-4, 2e-6),
  { name = "window resize", work = "blackman_harris4, another length and one gain", goal = 1e-6,
    times = 20000,
    ours = function()
      n = n + 1
      kernel:gain(2.385, n)
    end },
}
