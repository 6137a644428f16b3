--- Failures that come in with the signal: aliases, mains, neighbours, cables, sensors.

local core = require "libration.core"
local fields = require "libration.synth.plants.fields"
local options = require "libration.options"

local field, channel = fields.field, fields.channel
local PI = math.pi

local phase = field("phase", fields.number, 0.7, "rad", "at the first sample")

-- Adds tones { hz, amplitude, phase } to a channel, sampled without any filter.
local function add_tones(bench, k, tones)
  local list = {}
  for i, tone in ipairs(tones) do
    list[i] = { cycles = tone[1] / bench.rate, amplitude = tone[2], phase = tone[3] or 0 }
  end
  local x = bench:channel(k).values
  x:add(core.synth.fill(core.samples.new(#x), { tones = list }))
end

-- Where a frequency is seen after sampling, Hz.
local function fold(hz, rate)
  return math.abs(hz - rate * math.floor(hz / rate + 0.5))
end

local function alias(bench, o)
  if o.hz <= bench.rate / 2 then
    error(("plant: hz is %g; an alias comes from above half the rate, %g"):format(o.hz,
      bench.rate / 2), 0)
  end
  bench.facts.seen_hz = fold(o.hz, bench.rate)
  add_tones(bench, o.channel, { { o.hz, o.amplitude, o.phase } })
end

local function hidden(bench, o)
  local hz = (bench.rate + o.other_rate) / 2
  bench.facts.hz, bench.facts.seen_hz = hz, fold(hz, bench.rate)
  add_tones(bench, o.channel, { { hz, o.amplitude, o.phase } })
end

local function harmonics(bench, o)
  local tones = {}
  for h = 2, o.orders do
    tones[h - 1] = { h * o.hz, o.amplitude / h, o.phase * h }
  end
  add_tones(bench, o.channel, tones)
end

local function mains(bench, o)
  local tones = {}
  for h = 1, o.orders do
    tones[h] = { h * (o.hz + o.deviation_hz), o.amplitude / h, o.phase * h }
  end
  add_tones(bench, o.channel, tones)
end

-- Low-frequency swings at random moments, struck like a heavy, damped mode.
local function bursts(bench, o)
  local c, size = bench:channel(o.channel), o.size * bench:rms(o.channel)
  local u = core.synth.uniform(core.samples.new(2 * o.count), o.seed, { 0, o.channel, 69 })
  local hits = {}
  for k = 1, o.count do
    hits[k] = { u[2 * k - 1] * (bench.n - 1), u[2 * k] < 0.5 and -size or size }
  end
  table.sort(hits, function(a, b) return a[1] < b[1] end)
  local at, strength = {}, {}
  for k, hit in ipairs(hits) do
    at[k], strength[k] = hit[1], hit[2]
  end
  local cycles = o.hz / bench.rate
  c.values:add(core.synth.struck(core.samples.new(#c.values), {
    modes = { { cycles = cycles, decay = 2 * PI * cycles * 0.3 } },
    at = core.samples.from(at), strength = core.samples.from(strength) }))
  bench.facts.at = at
end

local function lost_bias(bench, o)
  local first = bench:range(o.at, bench.n - o.at + 1, "a lost bias")
  bench:each(o.channel, function(x) x:slice(first):fill(o.level) end)
end

local function warm_up(bench, o)
  local x = bench:channel(o.channel).values
  x:add(core.synth.struck(core.samples.new(#x), {
    modes = { { amplitude = o.amplitude, cycles = 0, phase = PI / 2,
                decay = 1 / (o.tau_s * bench.rate) } },
    at = core.samples.new(1), strength = core.samples.new(1):fill(1) }))
end

local function below_half(o, bench, name)
  if o[name] >= bench.rate / 2 then
    error(("plant: %s is %g; it must be below half the rate, %g"):format(name, o[name],
      bench.rate / 2), 0)
  end
  return o[name] / bench.rate
end

local function of_rate(share)
  return function(bench) return share * bench.rate end
end

return {
  { name = "alias", row = 4, does = "a line above half the rate is sampled without a filter",
    apply = alias, fields = { channel(),
      field("hz", fields.above, of_rate(0.77), "Hz", "its true frequency"),
      fields.amplitude(0.3, "peak"), phase } },
  { name = "hidden_alias", row = 5, apply = hidden,
    does = "an alias that stays in place when the rate is changed to the other one",
    fields = { channel(),
      field("other_rate", fields.above, of_rate(0.8), "S/s", "the rate it hides from"),
      fields.amplitude(0.3, "peak"), phase } },
  { name = "folded_harmonics", row = 6, apply = harmonics,
    does = "harmonics of a line fold onto it, or wherever they fall",
    fields = { channel(),
      field("hz", fields.above, of_rate(1 / 3), "Hz", "the line, by default a third of the rate"),
      field("orders", options.integer(2, 1000), 5, "1", "highest harmonic"),
      fields.amplitude(0.1, "peak of harmonic h is this over h"), phase } },
  { name = "droop", row = 8, does = "a first-order roll-off lowers the high lines",
    fields = { channel(),
      field("corner_hz", fields.above, of_rate(0.3), "Hz", "where half the power is left") },
    apply = function(bench, o)
      core.synth.low_pass(bench:channel(o.channel).values, below_half(o, bench, "corner_hz"))
    end },
  { name = "close_line", row = 12, does = "a second line stands within one main lobe",
    fields = { channel(), field("hz", fields.above, nil, "Hz", "the first line"),
      field("apart_hz", fields.number, function(bench) return 1.5 * bench.rate / bench.n end, "Hz",
        "distance; one and a half lines of the whole record"),
      fields.amplitude(0.5, "peak of the second line"), phase },
    apply = function(bench, o)
      add_tones(bench, o.channel, { { o.hz + o.apart_hz, o.amplitude, o.phase } })
    end },
  { name = "offset", row = 21, does = "a constant is added", fields = { channel(),
      fields.amplitude(0.2, "the constant") },
    apply = function(bench, o) bench:channel(o.channel).values:add(o.amplitude) end },
  { name = "mount_resonance", row = 45, does = "the sensor's mount resonates",
    fields = { channel(), field("hz", fields.above, of_rate(0.2), "Hz", "of the resonance"),
      field("q", fields.above, 10, "1", "gain there") },
    apply = function(bench, o)
      core.synth.resonate(bench:channel(o.channel).values, below_half(o, bench, "hz"), o.q)
    end },
  { name = "cable_bursts", row = 46, does = "a moving cable gives slow swings", apply = bursts,
    fields = { channel(), fields.count(5, "how many"),
      field("size", fields.above, 3, "1", "over the root mean square"),
      field("hz", fields.above, 4, "Hz", "how slow"), fields.seed } },
  { name = "lost_bias", row = 47, does = "the sensor's supply fails: a constant is left",
    apply = lost_bias, fields = { channel(), fields.at(0.5, "from where on"),
      field("level", fields.number, 0, "unit of the channel", "the constant") } },
  { name = "warm_up", row = 47, does = "the record starts before the sensor has settled",
    apply = warm_up, fields = { channel(), fields.amplitude(5, "offset at the first sample"),
      field("tau_s", fields.above, 0.1, "s", "time constant") } },
  { name = "mains", row = 48, does = "mains and its harmonics are picked up, folds included",
    apply = mains, fields = { channel(), field("hz", fields.above, 50, "Hz", "nominal"),
      field("deviation_hz", fields.number, 0.03, "Hz", "off nominal"),
      field("orders", options.integer(1, 65536), 10, "1", "highest harmonic"),
      fields.amplitude(0.1, "peak of harmonic h is this over h"), phase } },
  { name = "intermodulation", row = 49, does = "sums and differences of the lines appear",
    fields = { channel(),
      field("second", fields.number, 0.01, "1", "quadratic part at the largest magnitude"),
      field("third", fields.number, 0.01, "1", "cubic part at the largest magnitude") },
    apply = function(bench, o)
      local x = bench:channel(o.channel).values
      local peak = math.max(x:peak(), 1e-300)
      core.synth.bend(x, o.second / peak, o.third / peak ^ 2)
    end },
}
