-- What the failing-allocator sweep runs over figures, filters and resamplers of records.
return "filters of records", function()
  local lb = require "libration"
  local x = lb.samples.make(400, function(i) return math.sin(0.1 * i) end)
  assert(x:percentile(50) and x:kurtosis() and #(x .. x) == 800)
  assert(#x:histogram(-1, 1, 10) == 10 and #x:detrend "linear" == 400)
  local f = lb.filter.digital { shape = "elliptic", order = 3, edge = 100, rate = 1000,
    ripple = 1, stop = 40 }
  assert(#f:run(x) == 400 and #f:both_ways(x, "hold") == 400 and #f:stream():run(x) == 400)
  local d = lb.filter.decimator { factor = 4, rejection = 40, flatness = 0.05 }
  local stream = d:stream()
  assert(#(stream:run(x) .. stream:finish()) == 100 and #d:run(x, "mirror") == 100)
  assert(#x:integrate { rate = 1000, low_hz = 10 } == 400)
  local y, about = lb.samples.by_angle(x, x:crossings(0), { per_turn = 8, error_db = 40 })
  assert(#y == 8 * about.turns + 1)
end
