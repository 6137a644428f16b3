-- What is measured: a record and its channel, or samples with their rate.

local core = require "libration.core"
local fraction = require "libration.fraction"
local options = require "libration.options"
local record = require "libration.record"
local units = require "libration.units"

local M = {}

--- Kind: Hz, from a number, a text or a fraction; above zero.
M.hertz = options.quantity(function(value)
  if type(value) == "number" and value - value == 0 then
    return value + 0.0
  end
  return units.number(value, "Hz")
end, { above = 0, unit = "Hz" })

local fields = {
  channel = { options.integer(1, 65536) },
  rate = { function(value, path, mistakes)
    local rate, reason = units.rate(value)
    if not rate then
      mistakes:add(path, reason)
    elseif rate <= 0 then
      mistakes:add(path, tostring(value) .. " is not positive")
    else
      return rate
    end
  end },
  unit = { options.text(40) },
}

--- A schema of options: those of the source and more.
function M.schema(extra)
  local schema = {}
  for name, row in pairs(fields) do schema[name] = row end
  for name, row in pairs(extra) do schema[name] = row end
  return schema
end

local function of_record(rec, read, what)
  if read.rate or read.unit then
    error(what .. ": a record brings its own rate and unit; leave rate and unit out", 0)
  elseif not read.channel and #rec.channels > 1 then
    error(("%s: the record has %d channels; say which: channel = 1 to %d"):format(what,
      #rec.channels, #rec.channels), 0)
  end
  local k = read.channel or 1
  if not rec.channels[k] then
    error(("%s: channel %d is not there; the record has 1 to %d"):format(what, k,
      #rec.channels), 0)
  end
  return { x = rec:values(k), rate = rec.rate, unit = rec.channels[k].unit, channel = k }
end

--- The samples, their exact rate and their unit. Raises on misuse.
function M.take(source, read, what)
  if record.is(source) then
    return of_record(source, read, what)
  elseif not core.samples.is(source) then
    error(what .. ": measure a record or samples, not a " .. type(source), 0)
  elseif not read.rate then
    error(what .. ": rate is missing; samples alone do not have one", 0)
  elseif read.channel then
    error(what .. ": channel belongs to records; samples are one channel", 0)
  end
  return { x = source, rate = fraction.new(read.rate), unit = read.unit or "1" }
end

--- nil, message, code where a fit of samples that are not finite is none.
function M.not_finite(what)
  return nil, what .. ": some samples are not finite numbers", "domain"
end

return M
