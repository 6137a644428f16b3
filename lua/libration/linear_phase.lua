--- Linear-phase filters, decimators and rational resamplers by Kaiser's window.
-- None of them delays: sample j of the result stands at the time of sample j of
-- the record, or of j times the factor. What a filter does to the band that it
-- keeps and to the rest is evaluated from its taps, and said.

local base = require("libration.core").base
local blocks = require("libration.core").samples
local core = require("libration.core").filter
local options = require "libration.options"
local parts = require "libration.filter.parts"
local units = require "libration.units"

local M = {}

local db = function(ratio) return -20 * math.log(ratio, 10) end
local ratio = function(decibel) return 10 ^ (-decibel / 20) end

local Taps = {}
Taps.__index = Taps
Taps.__name = "libration.linear_phase"

--- Filters or resamples a whole record.
-- @param x samples: the record
-- @param ends string: how it goes on beyond its ends: "bare" (default: zeros), "turn" (turned by
--   half a turn about the end point), "mirror" or "hold" (the end sample)
-- @return samples: ceil(#x up / down) of them
-- @usage
-- local f = lb.filter.linear { edge = "100 Hz", transition = "40 Hz", rate = 1000,
--   rejection = "60 dB" }
-- local y = f:run(lb.samples.new(300):fill(2), "hold")
-- assert(#y == 300 and math.abs(y[1] - 2) < 1e-3)
function Taps:run(x, ends)
  for _, stage in ipairs(self.stages) do
    x = stage:run(x, ends)
  end
  return x
end

local Stream = {}
Stream.__index = Stream
Stream.__name = "libration.linear_phase_stream"

--- Takes the next block of a record.
-- @param x samples: the block
-- @return samples: what can be given by now
-- @usage
-- local s = lb.filter.decimator({ factor = 2 }):stream()
-- assert(#s:run(lb.samples.new(1000)) <= 500)
function Stream:run(x)
  for _, stage in ipairs(self) do
    x = stage:run(x)
  end
  return x
end

--- Ends a stream: zeros follow the record.
-- @return samples: the rest of the output; all blocks together are, bit for bit, what run gives
--   with bare ends
-- @usage
-- local d, x = lb.filter.decimator { factor = 6 }, lb.samples.make(99, math.sqrt)
-- local s = d:stream()
-- assert(s:run(x:slice(1, 50)) .. s:run(x:slice(51)) .. s:finish() == d:run(x))
function Stream:finish()
  local rest = self[1]:finish()
  for i = 2, #self do
    rest = self[i]:run(rest) .. self[i]:finish()
  end
  return rest
end

--- A stream: blocks of a record go in one after another.
-- @return table: the stream, with methods run and finish
-- @usage
-- local s = lb.filter.resampler({ up = 3, down = 2 }):stream()
-- assert(#s:run(lb.samples.new(10)) + #s:finish() == 15)
function Taps:stream()
  local stream = {}
  for i, stage in ipairs(self.stages) do
    stream[i] = stage:stream()
  end
  return setmetatable(stream, Stream)
end

--- Samples that a record of a length gives.
-- @param n integer: samples of the record
-- @return integer: ceil(n up / down)
-- @usage
-- assert(lb.filter.resampler({ up = 147, down = 160 }):count(4096) == 3764)
function Taps:count(n)
  for _, stage in ipairs(self.stages) do
    n = stage:count(n)
  end
  return n
end

--- Gain at a frequency, with its sign; the phase is 0.
-- For a decimator or resampler, before anything folds; the rate is that of the record.
-- @param hz number: Hz, or a share of the rate where the filter knows no rate
-- @return number: the gain
-- @usage
-- local f = lb.filter.linear { edge = "100 Hz", transition = "40 Hz", rate = 1000,
--   rejection = "60 dB" }
-- assert(math.abs(f:gain(0) - 1) < 1e-12 and math.abs(f:gain(300)) < 1e-3)
function Taps:gain(hz)
  local share, gain = self.rate and hz / self.rate or hz, 1
  for _, part in ipairs(self.design) do
    gain = gain * core.taps_gain(part.taps, share / part.rate)
  end
  return gain
end

--- Gain in decibels at a frequency.
-- @param hz number: Hz, or a share of the rate where the filter knows no rate
-- @return number: 20 lg |gain|, dB; -math.huge where nothing passes
-- @usage
-- local f = lb.filter.linear { edge = "100 Hz", transition = "40 Hz", rate = 1000,
--   rejection = "60 dB" }
-- assert(f:gain_db(125) < -60)
function Taps:gain_db(hz)
  return 20 * math.log(math.abs(self:gain(hz)), 10)
end

-- One line a person reads.
function Taps:__tostring()
  local count = {}
  for i, part in ipairs(self.design) do
    count[i] = ("%d"):format(#part.taps)
  end
  local text = self.title .. (": %s taps"):format(table.concat(count, " + "))
  if self.flatness then
    text = text .. (", flat to %.3g, rejects %.4g dB"):format(self.flatness, self.rejection_db)
  end
  return text
end

local function finish(made, design, factors)
  made.design, made.stages = design, {}
  for i, part in ipairs(design) do
    local up = factors[i].up or 1
    local taps = up == 1 and part.taps or part.taps * up
    made.stages[i] = core.taps(taps, up, factors[i].down or 1)
  end
  return setmetatable(made, Taps)
end

local rejection = { options.quantity(units.db, { least = 20, most = 160 }), default = 80 }

local linear_schema = {
  band = { options.choice { "low", "high", "pass", "stop" }, default = "low" },
  edge = { parts.edges(), required = true, hint = 'such as "100 Hz" or "100..200 Hz"' },
  rate = { options.quantity(parts.rate, { above = 0 }), required = true,
    hint = 'such as "51.2 kS/s"' },
  transition = { options.quantity(parts.hz, { above = 0 }), required = true,
    hint = 'the width of a transition, such as "20 Hz"' },
  rejection = rejection,
}

-- Bands that pass and stop, as shares of the rate, for edges in the middle of transitions.
local function bands(band, edge, half)
  local low, high = edge[1], edge[2]
  local first, last = { 0, low - half }, { (high or low) + half, 0.5 }
  if band == "low" or band == "high" then
    return band == "low" and { first } or { last }, band == "low" and { last } or { first }
  end
  local middle = { low + half, high - half }
  local outside = { first, last }
  return band == "pass" and { middle } or outside, band == "pass" and outside or { middle }
end

local function check_transition(spec, mistakes)
  local half, low, high = spec.transition / 2, spec.edge[1], spec.edge[2]
  if low - half <= 0 or (high or low) + half >= spec.rate / 2
      or (high and low + half >= high - half) then
    mistakes:add("transition", "transitions reach over 0, half the rate or each other")
  end
end

--- Makes a linear-phase filter whose ripple and rejection are held.
-- Taps are an odd number, from Kaiser's estimate; where that falls short, more. The deviation of
-- the gain from 1 in the pass band is at most the rejection, too (80 dB: 1e-4).
-- @param spec table: band ("low" (default), "high", "pass", "stop"), edge ("100 Hz"; "100..200 Hz"
--   for pass and stop: the middle of the transition, where the gain is one half), transition (its
--   whole width, Hz), rate ("51.2 kS/s"), rejection (dB, 20 to 160, default 80)
-- @return table: the filter, with flatness (largest deviation from 1), rejection_db, taps
--   (samples), and methods run, stream, count, gain, gain_db; raises one error that lists all
--   mistakes
-- @usage
-- local f = lb.filter.linear { band = "pass", edge = "100..200 Hz", transition = "50 Hz",
--   rate = "1 kS/s", rejection = "60 dB" }
-- assert(f.rejection_db >= 60 and f.flatness <= 1e-3 and math.abs(f:gain(150) - 1) < 1e-3)
function M.linear(spec)
  local read = parts.read(linear_schema, spec, "linear-phase filter", check_transition)
  local rate = read.rate
  local edge, width = {}, read.transition / rate
  for i, hz in ipairs(read.edge) do
    edge[i] = hz / rate
  end
  local pass, stop = bands(read.band, edge, width / 2)
  local h, flat, gain = parts.taps(read.band, edge, width, ratio(read.rejection), pass, stop)
  local names = { low = "low-pass", high = "high-pass", pass = "band-pass", stop = "band-stop" }
  local title = ("linear-phase %s, %s at %.12g S/s"):format(names[read.band],
    parts.edges_text(read.edge), read.rate)
  return finish({ title = title, taps = h, rate = read.rate, flatness = flat,
    rejection_db = db(gain), band = read.band, edge = read.edge }, { { taps = h, rate = 1 } },
    { {} })
end

local weight_schema = { taps = { function(value, path, mistakes)
  if blocks.is(value) and #value > 0 then return value end
  mistakes:add(path, options.show(value) .. " is not samples")
end, required = true } }

--- Makes a filter of taps of one's own, symmetric ones for a phase of 0.
-- @param spec table: taps (samples)
-- @return table: the filter, with methods run, stream, count, gain, gain_db (the last two are
--   right for symmetric taps; frequencies are shares of the rate)
-- @usage
-- local f = lb.filter.taps { taps = lb.samples.new { 0.25, 0.5, 0.25 } }
-- assert(f:run(lb.samples.new { 0, 4, 0 })[2] == 2 and math.abs(f:gain(0.5)) < 1e-15)
function M.taps(spec)
  local read = parts.read(weight_schema, spec, "filter of taps")
  local h = read.taps:copy()
  return finish({ title = "taps of one's own", taps = h }, { { taps = h, rate = 1 } }, { {} })
end

local keep = { options.number { above = 0, below = 0.5 }, default = 0.4 }

-- Multiplications per final sample of the cheapest chain of stages for a factor, and its first
-- stage; rest of the chain by the same function.
local function cheapest(factor, share, decibel, known)
  if factor == 1 then
    return 0
  elseif known[factor] then
    return known[factor].cost, known[factor].first
  end
  local best = { cost = math.huge }
  for d = 2, factor do
    if factor % d == 0 then
      local width = 1 / d - 2 * share / factor
      local taps = (decibel - 7.95) / (4.57 * math.pi * width) + 1
      local cost = taps * (factor // d) + cheapest(factor // d, share, decibel, known)
      if cost < best.cost and taps < 2 ^ 22 then
        best.cost, best.first = cost, d
      end
    end
  end
  known[factor] = best
  return best.cost, best.first
end

local function stages_of(factor, share, decibel)
  local known, list = {}, {}
  while factor > 1 do
    local _, first = cheapest(factor, share, decibel, known)
    list[#list + 1] = first
    factor = factor // first
  end
  return list
end

local decimator_schema = {
  factor = { options.integer(2, 65536), required = true }, keep = keep, rejection = rejection,
  flatness = { options.quantity(units.relative, { above = 0, most = 0.1 }), default = 1e-4 },
}

--- Makes a decimator: keeps every factor-th sample after filtering, in stages.
-- What lies below keep times the new rate stays flat, and nothing folds onto it with more than
-- the rejection; between that and half the new rate folded parts may stand. Both are evaluated
-- from the taps of all stages.
-- @param spec table: factor (2 to 65536), keep (share of the new rate, below 0.5, default 0.4),
--   rejection (dB, 20 to 160, default 80), flatness (relative, default 1e-4)
-- @return table: the decimator, with flatness and rejection_db (as evaluated), factors (list, of
--   the stages) and methods run, stream, count, gain, gain_db (frequencies are shares of the rate
--   of the record)
-- @usage
-- local d = lb.filter.decimator { factor = 64, rejection = "100 dB" }
-- assert(d.rejection_db >= 100 and d.flatness <= 1e-4 and d:count(6400) == 100)
-- assert(d:gain_db(1.6 / 64) < -100)
function M.decimator(spec)
  local read = parts.read(decimator_schema, spec, "decimator")
  local share, left = read.keep, read.factor
  local list = stages_of(read.factor, share, read.rejection)
  local flat, most, design, factors, rate = 1, 0, {}, {}, 1
  local ripple = math.min(ratio(read.rejection) * (1 - read.flatness),
    read.flatness / (#list * (1 + read.flatness)))
  for i, d in ipairs(list) do
    local pass, stop = share / left, 1 / d - share / left
    local h, deviation, gain = parts.taps("low", { 0.5 / d }, stop - pass, ripple,
      { { 0, pass } }, { { stop, 0.5 } })
    flat, most = flat * (1 + deviation), math.max(most, gain)
    design[i], factors[i] = { taps = h, rate = rate }, { down = d }
    left, rate = left // d, rate / d
  end
  local title = ("decimator by %d = %s, keeps %.9g of the new rate"):format(read.factor,
    table.concat(list, " x "), share)
  return finish({ title = title, factor = read.factor, factors = list, keep = share,
    flatness = flat - 1, rejection_db = db(most * flat) }, design, factors)
end

local resampler_schema = {
  up = { options.integer(1, 65536) }, down = { options.integer(1, 65536) },
  from = { options.quantity(units.rate, { above = base.fraction(0) }) },
  to = { options.quantity(units.rate, { above = base.fraction(0) }) },
  keep = keep, rejection = rejection,
}

local function gcd(a, b)
  return b == 0 and a or gcd(b, a % b)
end

-- Factors from rates or as given, without common divisors.
local function read_factors(spec, mistakes)
  local by_rates, by_factors = spec.from and spec.to, spec.up and spec.down
  if not by_rates == not by_factors or (spec.from or spec.to) and (spec.up or spec.down) then
    return mistakes:add("", "give from and to (rates), or up and down (factors)")
  end
  if by_rates then
    local quotient = spec.to / spec.from
    spec.up, spec.down = quotient.numerator, quotient.denominator
  end
  local common = gcd(spec.up, spec.down)
  spec.up, spec.down = spec.up // common, spec.down // common
  if spec.up > 65536 or spec.down > 65536 then
    mistakes:add("", ("the factor %d/%d is too fine; each part is at most 65536"):format(spec.up,
      spec.down))
  end
end

--- Makes a resampler by an exact ratio of rates.
-- What lies below keep times the lower one of the rates stays flat to the rejection, and what
-- lies above (1 - keep) times it is taken away.
-- @param spec table: from and to (rates, "48 kS/s"), or up and down (factors); keep (share of the
--   lower rate, below 0.5, default 0.4), rejection (dB, 20 to 160, default 80)
-- @return table: the resampler, with up, down, flatness, rejection_db (as evaluated) and methods
--   run, stream, count, gain, gain_db
-- @usage
-- local r = lb.filter.resampler { from = "48 kS/s", to = "44.1 kS/s" }
-- assert(r.up == 147 and r.down == 160 and r.rejection_db >= 80)
function M.resampler(spec)
  local read = parts.read(resampler_schema, spec, "resampler", read_factors)
  local lower = math.min(1, read.up / read.down) / read.up
  local pass, stop = read.keep * lower, (1 - read.keep) * lower
  local title = ("resampler by %d/%d, keeps %.9g of the lower rate"):format(read.up, read.down,
    read.keep)
  if read.up == 1 and read.down == 1 then
    local one = blocks.from { 1 }
    return finish({ title = title, up = 1, down = 1, flatness = 0, rejection_db = math.huge },
      { { taps = one, rate = 1 } }, { {} })
  end
  local h, flat, gain = parts.taps("low", { 0.5 * lower }, stop - pass, ratio(read.rejection),
    { { 0, pass } }, { { stop, 0.5 } })
  return finish({ title = title, up = read.up, down = read.down, flatness = flat,
    rejection_db = db(gain), rate = read.from and read.from:number() },
    { { taps = h, rate = read.up } }, { { up = read.up, down = read.down } })
end

return M
