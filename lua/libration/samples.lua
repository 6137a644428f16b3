--- Samples: blocks of doubles, and views of parts of them that cost nothing.
-- A sequence like any other in Lua: #x, x[1], x[-1] (the last), ipairs. With
-- + - * / (sample by sample, or with a number), ==, and methods that work on
-- all samples in one call:
--   parts: slice, copy, fill, totable, pack, and x .. y
--   figures: sum, mean, rms, min, max, peak, crest, variance, deviation,
--     skewness, kurtosis, percentile, histogram, dot
--   in place: add, scale
--   new samples: abs, square, sqrt, log10, ln, exp, round, clip, detrend,
--     differences, cumulative, filter, integrate, differentiate
--   angles: crossings, values_at, refine

local core = require("libration.core").samples
local options = require "libration.options"

local M = {}

--- Makes samples.
-- @param what integer, table, string or samples: how many (all 0), a list of
-- numbers, little-endian doubles as pack writes them, or samples to be copied
-- @return samples: a block of their own; raises where what is none of these
-- @usage
-- assert(#lb.samples.new(3) == 3 and lb.samples.new { 1, 2 }:sum() == 3)
-- local x = lb.samples.new { 1.5, -2 }
-- assert(lb.samples.new(x:pack()) == x)
function M.new(what)
  if core.is(what) then
    return what:copy()
  elseif type(what) == "table" then
    return core.from(what)
  elseif type(what) == "string" then
    return core.unpack(what)
  elseif math.type(what) == "integer" then
    return core.new(what)
  end
  error(("samples are made from an integer, a list, a string or samples, not from %s")
    :format(type(what)), 2)
end

--- Samples at indices 1 .. n, each from a function.
-- @param n integer: how many
-- @param f function: index -> number
-- @return samples: f(1), f(2) ... f(n)
-- @usage
-- assert(lb.samples.make(3, function(i) return i * i end)[3] == 9)
function M.make(n, f)
  local list = {}
  for i = 1, n do
    list[i] = f(i)
  end
  return core.from(list)
end

--- Whether a value is samples.
-- @param value any: what is in question
-- @return boolean: true for samples
-- @usage
-- assert(lb.samples.is(lb.samples.new(1)) and not lb.samples.is {})
function M.is(value)
  return core.is(value)
end

--- A view of raw samples in a string, without copying.
-- @param bytes string: little-endian, tightly packed
-- @param kind string: "int16", "int24", "int32" or "float32"
-- @return raw: #r, r[i] (the code), r:slice(first, last), r:kind() and
-- r:tosamples(scale)
-- @usage
-- local r = lb.samples.raw("\255\127\0\128", "int16")
-- assert(r[1] == 32767 and r[2] == -32768)
-- assert(r:tosamples(1 / 32768)[2] == -1)
function M.raw(bytes, kind)
  return core.raw(bytes, kind)
end

--- Samples one after another, in a block of their own.
-- @param ... samples: any number of them; x .. y joins two
-- @return samples: all of them
-- @usage
-- local x = lb.samples.new { 1, 2 }
-- assert(#lb.samples.join(x, x, x) == 6 and (x .. x)[3] == 1)
function M.join(...)
  return core.join(...)
end

local angle_schema = {
  pulses_per_turn = { options.integer(1, 65536), default = 1 },
  per_turn = { options.integer(1, 2 ^ 20), required = true,
    hint = "how many samples a turn is to have" },
  keep = { options.number { above = 0, below = 0.5 }, default = 0.4 },
  error_db = { options.number { least = 40, most = 120 }, default = 80 },
}

-- Every pulse that begins a turn; places must increase.
local function turn_places(pulses, per_turn)
  if #pulses < 2 or not (pulses:differences():min() > 0) then
    error("by_angle: the pulses must be two or more places that increase", 3)
  end
  local count = (#pulses - 1) // per_turn
  if count < 3 then
    error(("by_angle: %d pulses are fewer than three turns of %d"):format(#pulses, per_turn), 3)
  end
  if per_turn == 1 then
    return pulses
  end
  return M.make(count + 1, function(i) return pulses[(i - 1) * per_turn + 1] end)
end

--- A record at equal angles of a shaft, from the pulses of a tacho.
-- One pulse a turn is used, so that uneven marks do no harm; between them the place in the record
-- is a cubic of the angle (exact where the speed is a parabola over three turns, else off by 3/128
-- of the fourth difference of the pulse times). The record is then interpolated: what lies below
-- keep times the lower one of the two rates (that of the record, and per_turn times the slowest
-- speed) keeps its amplitude to error_db; what lies above (1 - keep) times that is taken away, so
-- that it does not fold.
-- @param x samples: the record
-- @param pulses samples: places of the pulses in samples from 0, as x:crossings gives
-- @param spec table: per_turn (samples a turn), pulses_per_turn (default 1), keep (default
--   0.4), error_db (40 to 120, default 80)
-- @return samples: per_turn samples a turn, from the first pulse to the last whole turn, its end
--   included
-- @return table: turns, per_turn, orders (up to this order all speeds are faithful), places
--   (samples: where in the record they were taken), slowest and fastest (turns per sample)
-- @usage
-- local tacho = lb.samples.make(2000, function(i) return math.sin(2 * math.pi * i / 100) end)
-- local x = lb.samples.make(2000, function(i) return math.cos(2 * math.pi * 3 * i / 100) end)
-- local y, about = lb.samples.by_angle(x, tacho:crossings(0), { per_turn = 32 })
-- assert(about.turns == 18 and math.abs(y[32 * 9 + 1] - 1) < 1e-3)
function M.by_angle(x, pulses, spec)
  local read = options.take(angle_schema, spec, "by_angle")
  local turns = turn_places(pulses, read.pulses_per_turn)
  local places = turns:refine(read.per_turn)
  local steps = places:differences()
  local ratio, keep = math.min(1, 1 / steps:max()), read.keep
  local y = x:values_at(places, keep, ratio, read.error_db)
  local slowest, fastest = 1 / (steps:max() * read.per_turn), 1 / (steps:min() * read.per_turn)
  return y, { turns = #turns - 1, per_turn = read.per_turn, places = places, slowest = slowest,
    fastest = fastest, orders = keep * ratio / fastest }
end

return M
