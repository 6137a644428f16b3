-- What the failing-allocator sweep runs over windows, kernels and figures.
return "window", function()
  local window = require "libration.window"
  for _, case in ipairs { { "hann" }, { "kaiser", 9 }, { "tukey", 0.3 },
    { "dolph_chebyshev", 60 } } do
    local w = window.window(case[1], case[2])
    assert(#w:samples(600) == 600)
    for _, n in ipairs { 40, 600, 32 } do
      local low, high = w:range(0, 1.5, n)
      assert(low < w:gain(1, n) and high >= 1)
    end
  end
  local f = window.window("prolate", 2):figures()
  assert(f.overlap > 0.4 and f.side_lobe_db < -40)
end
