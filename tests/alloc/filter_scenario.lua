-- What the failing-allocator sweep runs over analog responses.
return "filter", function()
  local filter = require "libration.filter"
  local f = filter.new { shape = "elliptic", order = 7, corner = "100 Hz",
    ripple = 0.1, stop = 80 }
  local low, high = f:range(90, 300)
  assert(low < high and f:gain_db(300) < -79 and f:edge(1e-4) < 300)
  local points = filter.new { shape = "points",
    points = { { "1 Hz", 0 }, { "9 Hz", -9 } } }
  assert(points:gain(1) == 1 and tostring(points):find "2 points")
  assert(not pcall(filter.new, { shape = "bessel", order = 99, corner = "1 Hz" }))
end
