--- What the analyses of bands take: samples with a rate, or a record.

local core = require "libration.core"
local options = require "libration.options"
local record = require "libration.record"
local units = require "libration.units"
local windows = require "libration.window"

local M = {}

local function in_unit(unit)
  return function(value)
    if type(value) == "number" and value - value == 0 then
      return value + 0.0
    end
    return units.number(value, unit)
  end
end

M.hertz = options.quantity(in_unit "Hz", { above = 0, unit = "Hz" })
M.hertz_or_zero = options.quantity(in_unit "Hz", { least = 0, unit = "Hz" })

local rate_kind = options.quantity(function(value)
  if type(value) == "number" and value - value == 0 then
    return value + 0.0
  end
  local rate, reason = units.rate(value)
  return rate and rate:number(), reason
end, { above = 0, unit = "S/s" })

-- A window by name, or made by lb.window.
local function window_kind(value, path, mistakes)
  if type(value) == "table" and getmetatable(value) == getmetatable(windows.window "hann") then
    return value
  end
  local ok, made = pcall(windows.window, value)
  if ok then
    return made
  end
  mistakes:add(path, tostring(made))
end

M.window = window_kind

-- The fields of every analysis, and these.
function M.schema(extra)
  extra.rate, extra.channel = { rate_kind }, { options.integer(1, 65536), default = 1 }
  return extra
end

-- How many samples there are, their rate in S/s and their unit.
function M.facts(x, read, what)
  if record.is(x) then
    if read.rate then
      error(what .. ": rate is given, but the record has one", 0)
    elseif not x.channels[read.channel] then
      error(("%s: channel %d does not exist; there are 1 to %d"):format(what, read.channel,
        #x.channels), 0)
    end
    return x.samples, x.rate:number(), x.channels[read.channel].unit
  elseif not core.samples.is(x) then
    error(("%s: a %s is neither samples nor a record"):format(what, type(x)), 0)
  elseif not read.rate then
    error(what .. ": rate is missing; samples have none", 0)
  elseif #x == 0 then
    error(what .. ": there are no samples", 0)
  end
  return #x, read.rate, "1"
end

-- The samples, their rate in S/s and their unit.
function M.signal(x, read, what)
  local _, rate, unit = M.facts(x, read, what)
  return record.is(x) and x:values(read.channel) or x, rate, unit
end

-- Iterator over whole segments of `size` samples, one after the other; what is left is left out.
-- A block may be filled anew in every turn.
function M.segments(x, read, size)
  if record.is(x) then
    local blocks = x:blocks { channel = read.channel, samples = size }
    return function()
      local block = blocks()
      return block and #block == size and block or nil
    end
  end
  local done = 0
  return function()
    if done + size > #x then
      return nil
    end
    done = done + size
    return x:slice(done - size + 1, done)
  end
end

return M
