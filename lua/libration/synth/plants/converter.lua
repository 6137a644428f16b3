--- Failures of amplifiers and converters: rails, bits, codes, labels of scale.

local core = require "libration.core"
local fields = require "libration.synth.plants.fields"
local options = require "libration.options"

local field, channel, at = fields.field, fields.channel, fields.at

local function bit_field(name, default, text)
  return field(name, options.integer(0, 31), default, "bit, 0 the least", text)
end

-- Rails of a channel: the last code is one step below full scale.
local function rails(bench, k)
  local c, level = bench:channel(k), bench:level(k)
  return -level, c.integer and level - level / 2 ^ (c.bits - 1) or level
end

-- Scales the label of a channel: what its codes are said to be worth.
local function relabel(c, factor)
  if c.range then
    c.range = c.range * factor
  elseif c.full_scale then
    c.full_scale = c.full_scale * factor
  end
  c.values, c.factor = c.values * factor, c.factor * factor
end

local function clip(bench, o)
  local c = bench:channel(o.channel)
  local low, high = rails(bench, o.channel)
  local peak = c.values:peak()
  if peak > 0 then
    c.values:scale(o.drive * math.min(-low, bench:level(o.channel)) / peak)
  end
  bench.facts.clipped = core.synth.clip(c.values, low, high)
end

local function soften(bench, o)
  local c = bench:channel(o.channel)
  local peak = math.max(c.values:peak(), 1e-300)
  core.synth.soften(c.values, o.share * peak * o.asymmetry, o.share * peak, o.knee)
end

local function overload(bench, o)
  local first, held = bench:range(o.at, o.held, "an overload")
  local c = bench:channel(o.channel)
  local _, high = rails(bench, o.channel)
  c.values:slice(first, first + held - 1):fill(high)
  local tail = c.values:slice(first + held)
  if #tail > 0 then
    local decay = core.synth.struck(core.samples.new(#tail), {
      modes = { { amplitude = o.amplitude, cycles = 0, decay = 1 / (o.tau_s * bench.rate),
                  phase = math.pi / 2 } },
      at = core.samples.new(1), strength = core.samples.new(1):fill(1) })
    tail:add(decay)
  end
end

local function spikes(bench, o)
  local c, size = bench:channel(o.channel), o.size * bench:rms(o.channel)
  local u = core.synth.uniform(core.samples.new(2 * o.count), o.seed, { 0, o.channel, 68 })
  bench.facts.at = {}
  for k = 1, o.count do
    local place = 1 + math.floor(u[2 * k - 1] * bench.n)
    c.values[place] = c.values[place] + (u[2 * k] < 0.5 and -size or size)
    bench.facts.at[k] = place
  end
  table.sort(bench.facts.at)
end

local function damage(bench, o, failure, change)
  local codes, c = bench:codes(o.channel, failure)
  change.bits = change.bits or c.bits
  bench.facts.changed = core.synth.damage_codes(codes, change)
  core.synth.clip(codes, -2.0 ^ (c.bits - 1), 2.0 ^ (c.bits - 1) - 1)
  bench:set_codes(o.channel, codes)
end

-- Bits of the converter of a channel, more than `needed`.
local function bits_of(bench, o, needed, failure)
  local _, c = bench:codes(o.channel, failure)
  if needed >= c.bits then
    error(("plant: %s: %d is too many for a converter of %d bits"):format(failure, needed,
      c.bits), 0)
  end
  return c.bits
end

-- As many bits as it takes for the largest code to wrap.
local function enough_to_wrap(bench, o)
  local codes, c = bench:codes(o.channel, "wrapped_codes")
  local needed = math.floor(math.log(math.max(codes:peak(), 1), 2)) + 1
  return math.max(1, math.min(c.bits - 1, c.bits - needed))
end

local function stuck_bit(bench, o)
  local mask = 1 << o.bit
  bits_of(bench, o, o.bit, "stuck_bit")
  damage(bench, o, "stuck_bit", o.high and { force = mask } or { keep = 0xffffffff ~ mask })
end

local function coarse(bench, o)
  local c = bench:channel(o.channel)
  core.synth.coarsen(c.values, 2 * bench:level(o.channel) / 2 ^ o.bits)
end

local function bend(bench, o)
  local c, level = bench:channel(o.channel), bench:level(o.channel)
  core.synth.bend(c.values, o.second / level, o.third / level ^ 2)
end

local ratio = "1"

return {
  { name = "adc_clipping", row = 1, does = "drives the converter beyond its rails", apply = clip,
    fields = { channel(),
      field("drive", fields.above, 1.01, ratio, "largest magnitude over full scale") } },
  { name = "soft_clipping", row = 2, does = "an earlier stage flattens peaks below full scale",
    apply = soften,
    fields = { channel(),
      field("share", fields.above, 0.8, ratio, "plateau over the largest magnitude"),
      field("asymmetry", fields.above, 0.9, ratio, "lower plateau over the upper one"),
      field("knee", options.number { above = 0, most = 1 }, 0.2, ratio,
        "share of the plateau that bends") } },
  { name = "overload_recovery", row = 3, apply = overload,
    does = "a shock holds the converter at its rail, then the baseline comes back slowly",
    fields = { channel(), at(0.25, "where the shock is"),
      field("held", fields.whole, 64, "samples", "samples at the rail"),
      fields.amplitude(3, "baseline right after the shock"),
      field("tau_s", fields.above, 0.05, "s", "time constant of the recovery") } },
  { name = "zero_gap", row = 30, does = "a gap is filled with zeros", fields = {
      at(0.5, "first sample of the gap"), fields.count(256, "length of the gap") },
    apply = function(bench, o)
      local first, count = bench:range(o.at, o.count, "a gap")
      bench:each(nil, function(x) x:slice(first, first + count - 1):fill(0) end)
    end },
  { name = "spikes", row = 31, does = "single samples are thrown far off", apply = spikes,
    fields = { channel(), fields.count(1, "how many"),
      field("size", fields.above, 10, ratio, "height over the root mean square"), fields.seed } },
  { name = "stuck_bit", row = 32, does = "a bit of the converter never changes", apply = stuck_bit,
    fields = { channel(), bit_field("bit", 8, "which bit"),
      field("high", options.boolean(), true, "boolean", "stuck at 1 (else at 0)") } },
  { name = "missing_codes", row = 33, does = "some codes never come", fields = { channel(),
      field("every", options.integer(2, 1 << 20), 16, "codes", "distance of missing codes") },
    apply = function(bench, o) damage(bench, o, "missing_codes", { skip = o.every }) end },
  { name = "bent_converter", row = 33, does = "the converter's line is bent", apply = bend,
    fields = { channel(),
      field("second", fields.number, 1e-3, ratio, "quadratic part at full scale"),
      field("third", fields.number, 1e-3, ratio, "cubic part at full scale") } },
  { name = "truncated_bits", row = 34, does = "the lowest bits are lost", fields = { channel(),
      field("lost", options.integer(1, 31), 4, "bits", "how many are always 0") },
    apply = function(bench, o)
      bits_of(bench, o, o.lost, "truncated_bits")
      damage(bench, o, "truncated_bits", { keep = 0xffffffff & ~((1 << o.lost) - 1) })
    end },
  { name = "wrapped_codes", row = 34, does = "the highest bits are lost: large codes wrap",
    fields = { channel(), field("lost", options.integer(1, 31), enough_to_wrap, "bits",
      "how many; by default as many as make the largest code wrap") },
    apply = function(bench, o)
      local bits = bits_of(bench, o, o.lost, "wrapped_codes")
      damage(bench, o, "wrapped_codes", { bits = bits - o.lost })
    end },
  { name = "wrong_full_scale", row = 35, does = "full scale is taken for one code more or less",
    fields = { channel(),
      field("factor", fields.above, 32768 / 32767, ratio, "said over true full scale") },
    apply = function(bench, o) relabel(bench:channel(o.channel), o.factor) end },
  { name = "wrong_sensitivity", row = 44, does = "the unit or sensitivity is mistaken",
    fields = { channel(),
      field("factor", fields.above, 9.80665, ratio, "said over true value") },
    apply = function(bench, o) relabel(bench:channel(o.channel), o.factor) end },
  { name = "too_few_codes", row = 51, does = "the range is far too wide for the signal",
    apply = coarse, fields = { channel(),
      field("bits", options.integer(1, 31), 6, "bits", "codes over full scale, as bits") } },
}
