--- Channels of records: made by hand, and completed with their samples.

local core = require "libration.core"
local given = require "libration.record.options"

local M = {}

local fail = given.fail

-- The stored samples of a channel, fetched from the file when they are first asked for.
local Channel = {}

function Channel.__index(channel, key)
  if key ~= "data" then
    return nil
  end
  local record = rawget(channel, "record")
  local blocks, message = record.source:codes(1, record.samples, { channel.place })
  if not blocks then
    error(message, 2)
  end
  rawset(channel, "data", blocks[1])
  return blocks[1]
end

--- Completes a record: its length, segments and channels.
function M.finish(record)
  record.samples = record.source:samples()
  record.segments = record.segments or { { first = 1, count = record.samples, counter = 0 } }
  for k, channel in ipairs(record.channels) do
    channel.place, channel.record = k, record
    setmetatable(channel, Channel)
  end
  return record
end

local function is_raw(block)
  return type(block) == "userdata" and getmetatable(block) == "libration.raw"
end

-- The samples of a channel given by hand: a block, or a list of numbers.
local function block_of(channel, k, level)
  local content = channel.samples or channel.codes
  if (channel.samples == nil) == (channel.codes == nil) then
    fail(level + 1, "channel %d needs samples or codes, one of them", k)
  end
  local ok, block = true, content
  if type(content) == "table" then ok, block = pcall(core.samples.from, content) end
  if not ok or not (core.samples.is(block) or is_raw(block)) then
    fail(level + 1, "the samples of channel %d are %s; give a block or a list of numbers", k,
      ok and type(content) or "a list with " .. tostring(block))
  elseif #block == 0 then
    fail(level + 1, "channel %d holds no samples", k)
  end
  return block
end

-- Codes have bits and a full scale; samples are values and may have them.
function M.channel(spec, k, level)
  local c = given.calibration(spec, level + 1)
  local bits = spec.bits
  if bits ~= nil and (math.type(bits) ~= "integer" or bits < 2 or bits > 32) then
    fail(level + 1, "bits is %s; it must be an integer from 2 to 32", tostring(bits))
  elseif spec.codes ~= nil and not (bits and c.full_scale) then
    fail(level + 1, "codes need bits and full_scale, or range and sensitivity")
  end
  local codes = spec.codes ~= nil
  local block = block_of(spec, k, level + 1)
  return {
    data = core.samples.is(block) and block or nil, number = k,
    name = spec.name or ("channel %d"):format(k),
    bits = bits, integer = codes, lossy = false, full_scale = c.full_scale,
    factor = codes and c.full_scale / 2 ^ (bits - 1) or 1,
    unit = c.unit or "1", sensitivity = c.sensitivity, range = c.range,
  }, block
end

--- What makes the stored numbers of each channel values of its unit.
function M.factors(record)
  local out = {}
  for k, channel in ipairs(record.channels) do out[k] = channel.factor end
  return out
end

--- A feed over blocks, raw ones kept as they are where all are of one kind.
function M.memory(blocks, factors)
  local kinds, list = {}, {}
  for k, block in ipairs(blocks) do
    kinds[k] = is_raw(block) and block:kind() or "samples"
  end
  for k, block in ipairs(blocks) do
    local same = kinds[k] == kinds[1]
    for _, kind in ipairs(kinds) do same = same and kind == kinds[1] end
    list[k] = (same or not is_raw(block)) and block or block:tosamples(1)
  end
  return core.store.feed(list, factors)
end

return M
