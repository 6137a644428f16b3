-- Filters, decimation, resampling and figures of a record of 2^20 samples, beside SciPy.

local lb = require "libration"

local n = 1 << 20
local x = lb.samples.make(n, function(i) return math.sin(0.1 * i) + (i * 7919 % 1000) * 1e-3 end)
local sections = lb.filter.digital { shape = "elliptic", order = 8, edge = 100, rate = 1000,
  ripple = 0.1, stop = 60 }
local decimator = lb.filter.decimator { factor = 64 }
local room = lb.samples.new(n)
local resampler = lb.filter.resampler { up = 147, down = 160 }

local function line(name, work, peer, ours)
  return { name = name, work = work .. ", 2^20 samples", peer = peer, ours = ours }
end

return {
  line("record sections", "8 poles, causal, reused room", "records.py sections", function()
    sections:run(x, "rest", room)
  end),
  line("record both ways", "8 poles, no phase", "records.py both", function()
    sections:both_ways(x)
  end),
  line("record decimate", "by 64, 80 dB", "records.py decimate", function()
    decimator:run(x)
  end),
  line("record resample", "by 147/160, 80 dB", "records.py resample", function()
    resampler:run(x)
  end),
  line("record percentiles", "three", "records.py percentiles", function()
    x:percentile(1, 50, 99)
  end),
  line("record detrend", "straight line", "records.py detrend", function()
    x:detrend "linear"
  end),
}
