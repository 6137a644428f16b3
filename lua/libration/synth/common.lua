--- What the parts of synthesis share: kinds of fields, and the samples to fill.

local core = require "libration.core"
local options = require "libration.options"
local units = require "libration.units"

local M = {}

local MOST_SAMPLES = 1 << 40

-- Numbers as they are; text and fractions through the units.
local function in_unit(unit)
  return function(value)
    if type(value) == "number" and value - value == 0 then
      return value + 0.0
    end
    return units.number(value, unit)
  end
end

local number = options.number()
local hertz = options.quantity(in_unit "Hz", { least = 0, unit = "Hz" })
local seconds = options.quantity(in_unit "s", { least = 0, unit = "s" })
local rate_kind = options.quantity(function(value)
  if type(value) == "number" and value - value == 0 then
    return value + 0.0
  end
  local rate, reason = units.rate(value)
  return rate and rate:number(), reason
end, { above = 0, unit = "S/s" })

-- Seeds and sample numbers: any 64-bit integer.
local function key(value, path, mistakes)
  local whole = type(value) == "number" and math.tointeger(value)
  if not whole then
    mistakes:add(path, options.show(value) .. " is not a whole number")
  end
  return whole or nil
end

local function samples_kind(value, path, mistakes)
  if core.samples.is(value) then
    return value
  end
  mistakes:add(path, options.show(value) .. " is not samples")
end

M.number, M.in_unit = number, in_unit
M.level = options.number { least = 0 }
M.above = options.number { above = 0 }
M.hertz, M.seconds, M.rate, M.key, M.samples = hertz, seconds, rate_kind, key, samples_kind

-- Fields of every signal.
M.common = {
  rate = { rate_kind, required = true },
  samples = { options.integer(0, MOST_SAMPLES) },
  into = { samples_kind },
  first = { key, default = 0 },
  workers = { options.integer(0, 256), default = 0 },
}

-- The fields of every signal, and these.
function M.schema(extra)
  local schema = {}
  for name, row in pairs(M.common) do
    schema[name] = row
  end
  for name, row in pairs(extra) do
    schema[name] = row
  end
  return schema
end

-- The samples to be filled: the caller's, or new ones; zeros either way where
-- clear is set.
function M.target(read, what, clear)
  if (read.into == nil) == (read.samples == nil) then
    error(what .. ": give samples (how many) or into (samples to be filled), one of them", 0)
  end
  if read.into and clear then
    read.into:fill(0)
  end
  return read.into or core.samples.new(read.samples)
end

return M
