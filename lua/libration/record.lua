--- Records: what a digitizer delivered, with all that gives the numbers meaning.
-- A record holds one or more channels of equal length at one exact sample rate.
-- Each channel keeps the samples as they were stored (integer codes where the
-- file has integers) and the factor that makes them values of its unit, so that
-- nothing is lost on the way. A record is treated as immutable.

local core = require "libration.core"
local fraction = require "libration.fraction"
local units = require "libration.units"

local M = {}

local store = core.store

local Record = {}
Record.__index = Record
Record.__name = "libration.record"

--- The methods of every record; other modules add to it.
M.Record = Record

local function fail(level, text, ...)
  error("record: " .. text:format(...), level + 1)
end

-- Strict options: an unknown field is an error that lists the valid ones.
local function check_options(options, valid, level)
  if type(options) ~= "table" then
    fail(level + 1, "the options are a table, not %s", type(options))
  end
  for key in pairs(options) do
    if not valid[key] then
      local names = {}
      for name in pairs(valid) do names[#names + 1] = name end
      table.sort(names)
      fail(level + 1, "unknown field %s; valid are %s", tostring(key), table.concat(names, ", "))
    end
  end
end

local function set(text)
  local out = {}
  for word in text:gmatch("%S+") do out[word] = true end
  return out
end

local read_fields = set "channel unit sensitivity range full_scale name rate first count"
local new_fields = set [[rate title channels samples codes unit sensitivity range full_scale bits
  name]]
local channel_fields = set "samples codes unit sensitivity range full_scale bits name"
local write_fields = set "bits float"

-- A quantity in a unit, above zero; nil stays nil.
local function positive(options, field, unit, level)
  local value = options[field]
  if value == nil then
    return nil
  end
  local number, reason = units.number(value, unit)
  if not number then
    fail(level + 1, "%s: %s", field, reason)
  elseif not (number > 0 and number < math.huge) then
    fail(level + 1, "%s is %s; it must be positive", field, tostring(value))
  end
  return number
end

-- How a channel is calibrated: its unit, and the value of that unit at full scale.
local function calibration(options, level)
  local out = { unit = options.unit, full_scale = nil, sensitivity = nil, range = nil }
  if out.unit ~= nil and type(out.unit) ~= "string" then
    fail(level + 1, "unit is %s; it must be a text such as \"m/s^2\"", tostring(out.unit))
  end
  out.range = positive(options, "range", "V", level + 1)
  local named = out.unit or "V"
  local per = named:find("^%a+$") and named or "(" .. named .. ")"
  out.sensitivity = positive(options, "sensitivity", "V/" .. per, level + 1)
  out.full_scale = positive(options, "full_scale", named, level + 1)
  if out.full_scale and (out.range or out.sensitivity) then
    fail(level + 1, "give full_scale, or range and sensitivity, but not both")
  elseif out.sensitivity and not out.range then
    fail(level + 1, "sensitivity needs range, the volts at full scale")
  elseif out.range and not out.sensitivity and out.unit and out.unit ~= "V" then
    fail(level + 1, "range is in V; sensitivity must say how many V a %s is", out.unit)
  end
  if out.range then
    out.full_scale = out.range / (out.sensitivity or 1)
    out.unit = named
  end
  return out
end

local function exact_rate(value, level)
  local rate, reason = units.rate(value)
  if not rate then
    fail(level + 1, "rate: %s", reason)
  elseif rate <= 0 then
    fail(level + 1, "rate is %s; it must be positive", tostring(value))
  end
  return rate
end

-- Option k of a field that may be one value for all or a list, one each.
local function pick(options, k, fields)
  local out = {}
  for _, field in ipairs(fields) do
    local value = options[field]
    if type(value) == "table" then value = value[k] end
    out[field] = value
  end
  return out
end

local function finish(record)
  record.samples = #record.channels[1].data
  return setmetatable(record, Record)
end

-- Channel numbers asked for, checked for kind only.
local function wanted_channels(channel, level)
  local list = type(channel) == "table" and channel or { channel }
  for _, number in ipairs(list) do
    if math.type(number) ~= "integer" then
      fail(level + 1, "channel is %s; it must be a number from 1 or a list of such",
        tostring(number))
    end
  end
  return channel ~= nil and list or nil
end

local function check_count(value, field, least, level)
  if value ~= nil and (math.type(value) ~= "integer" or value < least) then
    fail(level + 1, "%s is %s; it must be an integer from %d", field, tostring(value), least)
  end
end

local function refuse(path, text, ...)
  return nil, path .. ": " .. text:format(...), "domain"
end

-- One channel of a file as a channel of a record; nil where its integer codes
-- were given a unit but nothing that says how much of it they are.
local function file_channel(facts, data, number, options)
  local c = calibration(options, 5)
  local full_scale = c.full_scale or not c.unit and 1 or nil
  if not full_scale and facts.integer then
    return nil
  end
  return {
    data = data, number = number, name = options.name or ("channel %d"):format(number),
    bits = facts.integer and facts.bits or nil, integer = facts.integer, lossy = facts.lossy,
    full_scale = full_scale, factor = full_scale and full_scale / facts.full_scale or 1,
    unit = c.unit or "FS", sensitivity = c.sensitivity, range = c.range,
  }
end

-- The rate in the header is whole; an exact one must round to it.
local function file_rate(path, facts, rate)
  if rate and math.abs(rate:number() - facts.rate) >= 1 then
    return refuse(path, "states %d S/s; the rate given, %s S/s, is another", facts.rate,
      tostring(rate))
  end
  return rate or fraction.new(facts.rate)
end

local function read_open(sound, path, options, list, rate)
  local facts = sound:facts()
  local first = options.first or 1
  local count = options.count or facts.frames - first + 1
  if facts.frames == 0 then
    return nil, path .. ": holds no samples", "format"
  elseif first > facts.frames or count > facts.frames - first + 1 then
    return refuse(path, "has %d samples; %d from number %d are not there", facts.frames,
      math.max(count, 1), first)
  end
  for _, number in ipairs(list or {}) do
    if number < 1 or number > facts.channels then
      return refuse(path, "has channels 1 to %d, not %d", facts.channels, number)
    end
  end
  local message, code
  rate, message, code = file_rate(path, facts, rate)
  if not rate then return nil, message, code end
  local done
  done, message, code = sound:seek(first - 1)
  if not done then return nil, message, code end
  local blocks
  blocks, message, code = sound:read(count, list)
  if not blocks then return nil, message, code end
  local record = { rate = rate, path = path, container = facts.container, first = first,
                   channels = {} }
  for k, data in ipairs(blocks) do
    record.channels[k] = file_channel(facts, data, list and list[k] or k,
      pick(options, k, { "unit", "sensitivity", "range", "full_scale", "name" }))
    if not record.channels[k] then
      return refuse(path, "holds integer codes: a unit needs full_scale, or range and sensitivity")
    end
  end
  return finish(record)
end

--- Reads a sound file (WAV, RF64, Wave64, FLAC, Ogg Vorbis) as a record.
-- Samples stay in the stored codes. Calibration is never guessed: without unit the values are
-- shares of full scale ("FS"); a unit needs full_scale, or range and sensitivity (a range alone
-- gives V); only for a float file a unit alone says that its values are in that unit. Calibration
-- options are one value for all channels, or a list with one per channel read.
-- @param path string: the file
-- @param options table: channel (number from 1 or a list; nil: all), unit, sensitivity (V per
--   unit), range (V at full scale), full_scale (unit at full scale), name, rate (exact S/s, where
--   the header's whole number is rounded), first (sample number from 1, default 1), count
--   (default: all that follow)
-- @return table: the record; or nil, message, code ("io", "format", "domain") when the file is
--   refused: missing, damaged, shorter than it claims, or without what was asked for
-- @usage
-- local record, message, code = lb.record.read "no such file.wav"
-- assert(record == nil and code == "io" and message:find "no such file.wav")
function M.read(path, options)
  options = options or {}
  check_options(options, read_fields, 2)
  check_count(options.first, "first", 1, 2)
  check_count(options.count, "count", 1, 2)
  local list = wanted_channels(options.channel, 2)
  local rate = options.rate ~= nil and exact_rate(options.rate, 2) or nil
  calibration(pick(options, 1, { "unit", "sensitivity", "range", "full_scale" }), 2)
  local sound <close>, message, code = store.open(path)
  if not sound then
    return nil, message, code
  end
  return read_open(sound, path, options, list, rate)
end

-- The samples of a channel given by hand: a block, or a list of numbers.
local function block_of(channel, k, level)
  local given = channel.samples or channel.codes
  if (channel.samples == nil) == (channel.codes == nil) then
    fail(level + 1, "channel %d needs samples or codes, one of them", k)
  end
  local ok, block = true, given
  if type(given) == "table" then ok, block = pcall(core.samples.from, given) end
  if not ok or not core.samples.is(block) then
    fail(level + 1, "the samples of channel %d are %s; give a block or a list of numbers", k,
      ok and type(given) or "a list with " .. tostring(block))
  elseif #block == 0 then
    fail(level + 1, "channel %d holds no samples", k)
  end
  return block
end

-- Codes have bits and a full scale; samples are values and may have them.
local function new_channel(given, k, level)
  local c = calibration(given, level + 1)
  local bits = given.bits
  if bits ~= nil and (math.type(bits) ~= "integer" or bits < 2 or bits > 32) then
    fail(level + 1, "bits is %s; it must be an integer from 2 to 32", tostring(bits))
  elseif given.codes ~= nil and not (bits and c.full_scale) then
    fail(level + 1, "codes need bits and full_scale, or range and sensitivity")
  end
  local codes = given.codes ~= nil
  return {
    data = block_of(given, k, level + 1), number = k, name = given.name or ("channel %d"):format(k),
    bits = bits, integer = codes, lossy = false, full_scale = c.full_scale,
    factor = codes and c.full_scale / 2 ^ (bits - 1) or 1,
    unit = c.unit or "1", sensitivity = c.sensitivity, range = c.range,
  }
end

--- Makes a record from samples that are already here.
-- @param spec table: rate (exact, S/s), title, and either channels, a list of tables, or the
--   fields of a single channel: samples (a block or list of values in the unit) or codes
--   (integer codes), unit (default "1"), name, full_scale (unit at full scale) or range (V) and
--   sensitivity (V per unit), bits (needed for codes)
-- @return table: the record
-- @usage
-- local record = lb.record.new { rate = 51200, samples = { 0, 0.5, -0.5 }, unit = "m/s^2" }
-- assert(record.samples == 3 and tostring(record.rate) == "51200")
function M.new(spec)
  check_options(spec, new_fields, 2)
  local given = spec.channels or { {} }
  if type(given) ~= "table" or #given == 0 then
    fail(2, "channels is %s; it must be a list of channels", tostring(spec.channels))
  elseif not spec.channels then
    for field in pairs(channel_fields) do given[1][field] = spec[field] end
  end
  local record = { rate = exact_rate(spec.rate, 2), title = spec.title, channels = {} }
  for k, channel in ipairs(given) do
    check_options(channel, channel_fields, 2)
    record.channels[k] = new_channel(channel, k, 2)
    if #record.channels[k].data ~= #record.channels[1].data then
      fail(2, "channel %d has %d samples, channel 1 has %d; they must be equal", k,
        #record.channels[k].data, #record.channels[1].data)
    end
  end
  return finish(record)
end

--- Tells whether a value is a record.
-- @param value any: what to look at
-- @return boolean: true for a record
-- @usage
-- assert(not lb.record.is {} and lb.record.is(lb.record.new { rate = 1, samples = { 0 } }))
function M.is(value)
  return getmetatable(value) == Record
end

local function channel_of(record, k)
  local channel = record.channels[k or 1]
  if not channel then
    fail(3, "channel %s does not exist; there are 1 to %d", tostring(k), #record.channels)
  end
  return channel
end

--- How long the record is.
-- @return number: samples per channel times the exact sample interval, s
-- @usage
-- assert(lb.record.new { rate = 100, samples = { 1, 2, 3 } }:duration_s() == 0.03)
function Record:duration_s()
  return self.samples * self.rate.denominator / self.rate.numerator
end

--- The samples of a channel as values of its unit.
-- @param k integer: channel of the record, default 1
-- @return samples: a block; the stored one where no factor is needed
-- @usage
-- local r = lb.record.new { rate = 8000, codes = { 0, 64, -128 }, bits = 8, range = "10 V" }
-- local rails = core.store.rails(r:values(), -10, 10)
-- assert(rails.least == -10 and rails.most == 5 and r.channels[1].unit == "V")
function Record:values(k)
  local channel = channel_of(self, k)
  return channel.factor == 1 and channel.data or channel.data * channel.factor
end

-- Where the rails of a channel's stored samples stand; half a code inwards, so
-- that values which went through a unit are recognised as well.
local function rail_limits(channel)
  if not channel.full_scale then
    return nil
  end
  local full = channel.full_scale / channel.factor
  local half = channel.bits and full / 2 ^ channel.bits or 0
  return -full + half, full - 3 * half
end

--- How many samples of a channel stand at the rails of the converter.
-- @param k integer: channel of the record, default 1
-- @return table: low, high (samples at each rail), low_run, high_run (longest run in a row), first
--   (number of the first, or nil), least, most (range, in the unit), bad (not finite); nil and a
--   reason when the full scale is not known
-- @usage
-- local r = lb.record.new { rate = 8000, codes = { 0, 127, 127, -128 }, bits = 8, range = "10 V" }
-- local rails = r:rails()
-- assert(rails.high == 2 and rails.high_run == 2 and rails.low == 1 and rails.first == 2)
function Record:rails(k)
  local channel = channel_of(self, k)
  local low, high = rail_limits(channel)
  if not low then
    return nil, "the full scale of " .. channel.name .. " is not known"
  end
  local out = store.rails(channel.data, low, high)
  out.least, out.most = out.least * channel.factor, out.most * channel.factor
  return out
end

--- What the record contains, as a hash: rate, length, units, and every sample.
-- Names, paths and titles do not take part.
-- @return string: 64 hexadecimal digits (SHA-256)
-- @usage
-- local a = lb.record.new { rate = 8000, samples = { 1, 2 } }
-- local b = lb.record.new { rate = 8000, samples = { 1, 2 }, title = "again" }
-- assert(a:identity() == b:identity() and #a:identity() == 64)
function Record:identity()
  local parts = { "record", tostring(self.rate), tostring(self.samples) }
  for _, channel in ipairs(self.channels) do
    parts[#parts + 1] = ("%s %a %s"):format(channel.unit, channel.factor,
      store.digest(channel.data))
  end
  return core.base.sha256(table.concat(parts, "\n"))
end

-- How to write: integers in the bits asked for or stored, else 64-bit floats.
local function write_spec(record, options, level)
  local first = record.channels[1]
  local bits, float = options.bits, options.float
  if float == nil then float = bits == nil and not first.integer end
  if bits == nil then bits = float and 64 or first.bits end
  local valid = float and { [32] = true, [64] = true }
    or { [8] = true, [16] = true, [24] = true, [32] = true }
  if not valid[bits] then
    fail(level + 1, "bits is %s; WAV holds integers of 8, 16, 24, 32 and floats of 32, 64",
      tostring(bits))
  end
  return { rate = record.rate.numerator, bits = bits, integer = not float, scale = 1 }
end

-- What one stored sample is multiplied by: up to full scale where it is known.
local function stored_factor(channel, spec, level)
  if not channel.full_scale then
    if spec.integer then
      fail(level + 1, "the full scale of %s is not known; write floats", channel.name)
    end
    return channel.factor
  end
  return channel.factor / channel.full_scale * (spec.integer and 2 ^ (spec.bits - 1) or 1)
end

--- Writes the record as a WAV file, whole or not at all.
-- Integer codes are shares of full scale; floats too where the full scale is known (1 is full
-- scale), else they are the values. Nothing is clipped.
-- @param path string: the file; an existing one is replaced
-- @param options table: bits (8, 16, 24, 32; floats 32, 64), float (true: floats); default: what
--   the record holds, else 64-bit floats
-- @return boolean: true; or nil, message, code ("domain": a sample beyond full scale, or a rate
--   that is no whole number; "io")
-- @usage
-- local r = lb.record.new { rate = "8000.5 S/s", samples = { 0 } }
-- local done, message, code = r:write "never.wav"
-- assert(not done and code == "domain" and message:find "8000.5")
function Record:write(path, options)
  options = options or {}
  check_options(options, write_fields, 2)
  local spec = write_spec(self, options, 2)
  if self.rate.denominator ~= 1 then
    return refuse(path, "the rate, %s S/s, is not whole, and WAV holds no other",
      fraction.text(self.rate))
  elseif self.rate.numerator > 0x7fffffff then
    return refuse(path, "the rate, %s S/s, is more than WAV holds", fraction.text(self.rate))
  end
  local blocks = {}
  for k, channel in ipairs(self.channels) do
    local factor = stored_factor(channel, spec, 2)
    blocks[k] = factor == 1 and channel.data or channel.data * factor
  end
  return store.write(path, spec, blocks)
end

local function row_of(record, k)
  local channel = record.channels[k]
  local range = store.rails(channel.data, -math.huge, math.huge)
  local rails = record:rails(k)
  return ("  %-16s %-10s %5s %12s %12.6g %12.6g %7s"):format(channel.name, channel.unit,
    channel.bits or "-", channel.full_scale and ("%.6g"):format(channel.full_scale) or "-",
    range.least * channel.factor, range.most * channel.factor,
    rails and rails.low + rails.high or "-")
end

-- A table a person reads: what the record is, and a row per channel.
function Record:__tostring()
  local lines = {
    ("record %s: %s S/s, %d samples (%.6g s), %d channel%s"):format(
      self.title or self.path or "without a name", fraction.text(self.rate), self.samples,
      self:duration_s(), #self.channels, #self.channels == 1 and "" or "s"),
    ("  %-16s %-10s %5s %12s %12s %12s %7s"):format("channel", "unit", "bits", "full scale",
      "least", "most", "at rail"),
  }
  for k = 1, #self.channels do lines[#lines + 1] = row_of(self, k) end
  return table.concat(lines, "\n")
end

--- Prints the record's facts, one row per channel.
-- @usage
-- assert(tostring(lb.record.new { rate = 8000, samples = { 0 } }):find "8000 S/s, 1 samples")
function Record:print()
  print(tostring(self))
end

return M
