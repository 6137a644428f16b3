--- Samples: blocks of doubles, and views of parts of them that cost nothing.
-- A sequence like any other in Lua: #x, x[1], x[-1] (the last), ipairs. With
-- + - * / (sample by sample, or with a number), ==, and methods that work on
-- all samples in one call: slice, copy, fill, add, scale, sum, mean, rms, min,
-- max, peak, dot, totable, pack.

local core = require("libration.core").samples

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

return M
