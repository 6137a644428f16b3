--- Failures of the sampling instants: lost and repeated samples, clocks, delays, labels of rate.

local core = require "libration.core"
local fields = require "libration.synth.plants.fields"
local fraction = require "libration.fraction"
local options = require "libration.options"

local field, at = fields.field, fields.at

local last_channel = field("channel", fields.whole, function(bench)
  return #bench.channels
end, "1", "channel of the record, by default the last")

local function warp(x, spec)
  return core.synth.warp(x, spec)
end

local function lose(bench, o)
  local first, count = bench:range(o.at, o.count, "a loss")
  local left = bench.n - count
  bench:each(nil, function(x)
    local y = core.samples.new(left)
    if first > 1 then y:slice(1, first - 1):fill(x:slice(1, first - 1)) end
    if first <= left then y:slice(first):fill(x:slice(first + count)) end
    return y
  end)
end

local function repeat_block(bench, o)
  local first, count = bench:range(o.at, o.count, "a repeated block")
  if first <= count then
    error(("plant: a block of %d cannot repeat at %d; it needs as many samples before it"):format(
      count, first), 0)
  end
  bench:each(nil, function(x)
    x:slice(first, first + count - 1):fill(x:slice(first - count, first - 1):copy())
  end)
end

local function decimate(bench, o)
  bench:each(nil, function(x) return core.synth.every(x, o.factor) end)
  bench.exact_rate = bench.exact_rate / fraction.new(o.factor)
end

-- The longest record that ends half a cycle past a whole number of cycles.
local function half_cycle(bench, o)
  local per = bench.rate / o.hz
  local cycles = math.floor(bench.n / per - 0.5)
  local left = math.floor((cycles + 0.5) * per + 0.5)
  if cycles < 0 or left < 1 then
    error(("plant: the record is shorter than half a cycle of %g Hz"):format(o.hz), 0)
  end
  left = math.min(left, bench.n)
  bench.facts.cycles = left / per
  bench:each(nil, function(x) return x:slice(1, left):copy() end)
end

local function speed(bench, o)
  local n = bench.n
  bench:each(nil, function(x)
    return warp(x, { stretch = -o.change / 2, bend = o.change / n })
  end)
end

return {
  { name = "unfiltered_decimation", row = 7, does = "samples are dropped without a filter",
    apply = decimate, fields = {
      field("factor", options.integer(2, 65536), 4, "1", "one of so many is kept") } },
  { name = "ignored_delay", row = 9, does = "a filter's delay in one channel is not told",
    fields = { last_channel,
      field("delay", fields.above, 24, "samples", "how much later the channel is") },
    apply = function(bench, o)
      bench:each(o.channel, function(x) return warp(x, { shift = -o.delay }) end)
    end },
  { name = "half_cycle_cut", row = 10, apply = half_cycle,
    does = "the record ends half a cycle past a whole number: a line leaks and scallops most",
    fields = { field("hz", fields.above, nil, "Hz", "frequency of the line") } },
  { name = "lost_samples", row = 28, does = "samples are missing and nothing says so",
    apply = lose, fields = { at(0.5, "first one lost"), fields.count(1, "how many") } },
  { name = "repeated_block", row = 29, does = "a block is delivered twice, in place of the next",
    apply = repeat_block, fields = { at(0.5, "where the repetition begins"),
      fields.count(256, "samples of the block") } },
  { name = "wrong_rate", row = 36, does = "the rate in the record is not that of the clock",
    fields = { field("numerator", fields.whole, 160, "1", "said over true rate, above"),
      field("denominator", fields.whole, 147, "1", "and below the line") },
    apply = function(bench, o)
      bench.exact_rate = bench.exact_rate * fraction.new(o.numerator, o.denominator)
    end },
  { name = "clock_mismatch", row = 37, does = "a channel comes from a device with another clock",
    fields = { last_channel, field("error", options.number { above = -0.5, below = 0.5 }, 1e-4,
      "relative", "instants drift by this; the record ends where a channel does") },
    apply = function(bench, o)
      bench:each(o.channel, function(x) return warp(x, { stretch = o.error }) end)
    end },
  { name = "clock_jitter", row = 38, does = "the sampling instants tremble",
    fields = { field("jitter_s", fields.above, function(bench) return 0.01 / bench.rate end, "s",
      "standard deviation; a hundredth of a sample interval"), fields.seed },
    apply = function(bench, o)
      bench:each(nil, function(x)
        return warp(x, { sigma = o.jitter_s * bench.rate, seed = o.seed })
      end)
    end },
  { name = "trigger_jitter", row = 39, does = "each stretch of the record starts a little off",
    fields = { field("period", fields.whole, 1024, "samples", "length of a stretch"),
      field("jitter_s", fields.above, function(bench) return 0.3 / bench.rate end, "s",
        "standard deviation; three tenths of a sample interval"), fields.seed },
    apply = function(bench, o)
      bench:each(nil, function(x)
        return warp(x, { sigma = o.jitter_s * bench.rate, period = o.period, seed = o.seed })
      end)
    end },
  { name = "channel_skew", row = 40, does = "a multiplexer takes one channel later",
    fields = { last_channel, field("delay_s", fields.number, function(bench)
      return 0.25 / bench.rate
    end, "s", "how much later; a quarter of a sample interval") },
    apply = function(bench, o)
      bench:each(o.channel, function(x) return warp(x, { shift = o.delay_s * bench.rate }) end)
    end },
  { name = "speed_drift", row = 50, does = "the machine's speed changes within the record",
    apply = speed, fields = { field("change", options.number { above = -0.5, below = 0.5 }, 0.01,
      "relative", "all frequencies rise by this from end to end") } },
  { name = "half_record", row = 52, does = "the file ends early",
    fields = { field("share", options.number { above = 0, below = 1 }, 0.5, "1",
      "of the samples that are left") },
    apply = function(bench, o)
      local left = math.max(1, math.floor(bench.n * o.share))
      bench:each(nil, function(x) return x:slice(1, left):copy() end)
    end },
}
