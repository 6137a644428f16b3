--- Records: what a digitizer delivered, with all that gives the numbers meaning.
-- A record holds one or more channels of equal length at one exact sample rate.
-- Its samples stay as they were stored (integer codes where there are integers),
-- in memory or in their file, and a factor makes them values of the channel's
-- unit on their way out, so that nothing is lost on the way. A record knows when
-- it started, and where the converter lost samples. It is treated as immutable.

local core = require "libration.core"
local formats = require "libration.record.formats"
local fraction = require "libration.fraction"
local given = require "libration.record.options"
local making = require "libration.record.making"
local opening = require "libration.record.opening"
local time = require "libration.record.time"

local M = {}

local store = core.store
local fail, check_options, set = given.fail, given.check, given.set

local Record = {}
Record.__index = Record
Record.__name = "libration.record"

--- The methods of every record; other modules add to it.
M.Record = Record

local read_fields = set [[channel unit sensitivity range full_scale name rate first count format
  start]]
local new_fields = set [[rate title channels samples codes unit sensitivity range full_scale bits
  name start gaps metadata]]
local channel_fields = set "samples codes unit sensitivity range full_scale bits name"
local part_fields = set "first count"
local block_fields = set "channel samples"

local function made(record)
  return setmetatable(making.finish(record), Record)
end

local function checked(options, level)
  options = options or {}
  check_options(options, read_fields, level + 1)
  given.count(options.first, "first", 1, level + 1)
  given.count(options.count, "count", 1, level + 1)
  given.calibration(given.pick(options, 1, { "unit", "sensitivity", "range", "full_scale" }),
    level + 1)
  local row, reason
  if options.format ~= nil then
    row, reason = formats.named(options.format)
    if not row then fail(level + 1, "%s", reason) end
  end
  return options, {
    row = row, list = given.channels(options.channel, level + 1),
    rate = options.rate ~= nil and given.rate(options.rate, level + 1) or nil,
    start_ns = given.moment(options.start, "start", level + 1),
  }
end

--- Opens a file as a record whose samples stay in the file.
-- Only what is asked for is read, in blocks, so that a record may be larger than memory. The kind
-- of file is found from what it holds, never from its name; options and refusals are those of
-- lb.record.read. A file that turns out to be damaged raises where its samples are used.
-- @param path string: the file
-- @param options table: as for lb.record.read
-- @return table: the record; or nil, message, code
-- @usage
-- local path = os.tmpname()
-- assert(lb.record.new { rate = 8000, samples = { 1, 2, 3 }, unit = "V" }:write(path,
--   { format = "csv" }))
-- local record = assert(lb.record.open(path))
-- assert(record.samples == 3 and record.channels[1].unit == "V")
-- assert(record:values()[3] == 3)
-- os.remove(path)
function M.open(path, options)
  local asked
  options, asked = checked(options, 2)
  local record, message, code = opening.open(path, options, asked)
  if not record then
    return nil, message, code
  end
  return made(record)
end

--- Reads a file as a record in memory: WAV, RF64, Wave64, FLAC, Ogg Vorbis, CSV and more (see
-- lb.record.formats).
-- Samples stay in the stored codes. Calibration is never guessed: where the file says nothing, the
-- values of a sound file are shares of full scale ("FS"), and a unit needs full_scale, or range
-- and sensitivity (a range alone gives V); only for floats a unit alone says that the values are
-- in that unit. Calibration options are one value for all channels, or a list with one per
-- channel read.
-- @param path string: the file
-- @param options table: channel (number from 1 or a list; nil: all), unit, sensitivity (V per
--   unit), range (V at full scale), full_scale (unit at full scale), name, rate (exact S/s, where
--   the file has none or rounds it), first (sample number from 1, default 1), count
--   (default: all that follow), format (a name; nil: by what the file holds), start (ISO 8601
--   text or integer nanoseconds since 1970, of the file's first sample)
-- @return table: the record; or nil, message, code ("io", "format", "domain") when the file is
--   refused: missing, damaged, shorter than it claims, or without what was asked for
-- @usage
-- local record, message, code = lb.record.read "no such file.wav"
-- assert(record == nil and code == "io" and message:find "no such file.wav")
function M.read(path, options)
  local asked
  options, asked = checked(options, 2)
  local record, message, code = opening.open(path, options, asked)
  if not record then
    return nil, message, code
  end
  local blocks
  blocks, message, code = record.source:codes(1, record.source:samples())
  if not blocks then
    return nil, message, code
  end
  record.file:close()
  record.file = nil
  record.source = store.feed(blocks, making.factors(record))
  for k, channel in ipairs(record.channels) do channel.data = blocks[k] end
  return made(record)
end

--- The formats that records are read from and written to.
-- @return table: list of { name, title, suffixes, writes = boolean }
-- @usage
-- assert(lb.record.formats()[1].name == "wav")
function M.formats()
  local out = {}
  for i, row in ipairs(formats) do
    out[i] = { name = row.name, title = row.title, suffixes = { table.unpack(row.suffixes) },
               writes = row.write ~= nil }
  end
  return out
end

--- Reads a moment as integer nanoseconds since 1970-01-01T00:00:00Z.
-- @param text string: ISO 8601, "2026-03-01T12:00:00.25Z"; a zone is needed, at most 9 decimals
-- @return integer: nanoseconds; or nil and a reason
-- @usage
-- assert(lb.record.moment "1970-01-01T00:00:01Z" == 1000000000)
function M.moment(text)
  return time.read(text)
end

--- Writes a moment as ISO 8601 text in UTC.
-- @param ns integer: nanoseconds since 1970-01-01T00:00:00Z
-- @return string: reads back as the same integer
-- @usage
-- assert(lb.record.moment_text(1500000000) == "1970-01-01T00:00:01.5Z")
function M.moment_text(ns)
  return time.text(ns)
end

--- Makes a record from samples that are already here.
-- @param spec table: rate (exact, S/s), title, start (ISO 8601 text or integer nanoseconds since
--   1970), gaps (list of { after = sample number, lost = samples that are missing behind it }),
--   metadata (plain table), and either channels, a list of tables, or the
--   fields of a single channel: samples (a block or list of values in the unit) or codes
--   (integer codes: a block, a list, or raw samples), unit (default "1"), name, full_scale (unit
--   at full scale) or range (V) and sensitivity (V per unit), bits (needed for codes)
-- @return table: the record
-- @usage
-- local record = lb.record.new { rate = 51200, samples = { 0, 0.5, -0.5 }, unit = "m/s^2" }
-- assert(record.samples == 3 and tostring(record.rate) == "51200")
function M.new(spec)
  check_options(spec, new_fields, 2)
  local list = spec.channels or { {} }
  if type(list) ~= "table" or #list == 0 then
    fail(2, "channels is %s; it must be a list of channels", tostring(spec.channels))
  elseif not spec.channels then
    for field in pairs(channel_fields) do list[1][field] = spec[field] end
  end
  local record = { rate = given.rate(spec.rate, 2), title = spec.title, channels = {},
                   start_ns = given.moment(spec.start, "start", 2), metadata = spec.metadata or {} }
  local blocks = {}
  for k, channel in ipairs(list) do
    check_options(channel, channel_fields, 2)
    record.channels[k], blocks[k] = making.channel(channel, k, 2)
    if #blocks[k] ~= #blocks[1] then
      fail(2, "channel %d has %d samples, channel 1 has %d; they must be equal", k,
        #blocks[k], #blocks[1])
    end
  end
  record.source = making.memory(blocks, making.factors(record))
  record.segments = given.segments(spec.gaps, #blocks[1], 2)
  return made(record)
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
  if channel.factor == 1 or rawget(channel, "data") then
    return channel.factor == 1 and channel.data or channel.data * channel.factor
  end
  local blocks, message = self.source:read(1, self.samples, { channel.place })
  return blocks and blocks[1] or error(message, 2)
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

--- What the record contains, as a hash: rate, length, gaps, units, and the value of every sample.
-- Names, paths, titles and moments do not take part, nor how the values were stored. Reads in
-- blocks; a damaged file raises.
-- @return string: 64 hexadecimal digits (SHA-256)
-- @usage
-- local a = lb.record.new { rate = 8000, samples = { 1, 2 } }
-- local b = lb.record.new { rate = 8000, samples = { 1, 2 }, title = "again" }
-- assert(a:identity() == b:identity() and #a:identity() == 64)
function Record:identity()
  local parts = { "record", tostring(self.rate), tostring(self.samples) }
  for _, segment in ipairs(#self.segments > 1 and self.segments or {}) do
    parts[#parts + 1] = ("segment %d %d"):format(segment.first, segment.counter)
  end
  for k, channel in ipairs(self.channels) do
    local digest, message = self.source:digest(k)
    if not digest then
      error(message, 2)
    end
    parts[#parts + 1] = channel.unit .. " " .. digest
  end
  return core.base.sha256(table.concat(parts, "\n"))
end

--- Writes the record as a file, whole or not at all.
-- Nothing is clipped or rounded without a word. WAV: integer codes are shares of full scale;
-- floats too where the full scale is known (1 is full scale), else they are the values. Formats
-- that cannot hold a gap, an exact rate or a unit refuse or say so (see lb.record.formats).
-- @param path string: the file; an existing one is replaced
-- @param options table: format (a name; nil: by the ending of the path, else WAV), and for WAV bits
--   (8, 16, 24, 32; floats 32, 64) and float (true: floats), default: what the record holds, else
--   64-bit floats; for FLAC bits (8, 16, 24); for CSV separator; for universal files binary
--   (default true; as text, numbers are rounded to 13 digits)
-- @return boolean: true; or nil, message, code ("domain": a sample beyond full scale, or a rate
--   that the format cannot hold; "io")
-- @usage
-- local r = lb.record.new { rate = "8000.5 S/s", samples = { 0 } }
-- local done, message, code = r:write "never.wav"
-- assert(not done and code == "domain" and message:find "8000.5")
function Record:write(path, options)
  options = options or {}
  if type(options) ~= "table" then
    fail(2, "the options are a table, not %s", type(options))
  end
  local row, reason = formats.for_path(path), nil
  if options.format ~= nil then
    row, reason = formats.named(options.format)
  end
  if not row or not row.write then
    fail(2, "%s", reason or row.name .. " is read, but not written")
  end
  local fields = { format = true }
  for field in pairs(row.fields) do fields[field] = true end
  check_options(options, fields, 2)
  if #self.segments > 1 and not row.holds_gaps then
    return nil, ("%s: %s holds no gaps, and there are %d; write the parts, or another format")
      :format(path, row.title, #self.segments - 1), "domain"
  end
  return row.write(self, path, options)
end

--- A feed of the record's channels, for whatever pulls samples in blocks.
-- @return feed: with methods channels, samples, read (values) and codes (as stored)
-- @usage
-- local r = lb.record.new { rate = 8000, codes = { 0, 64, -128 }, bits = 8, range = "10 V" }
-- assert(r:feed():read(2, 1)[1][1] == 5 and r:feed():codes(2, 1)[1][1] == 64)
function Record:feed()
  return self.source
end

--- Closes the file of a record that was opened; doing so again is allowed.
-- Samples that were not fetched cannot be had any more. Records read into memory stay whole.
-- @usage
-- local r = lb.record.new { rate = 8000, samples = { 1, 2 } }
-- r:close()
-- assert(#r:values() == 2)
function Record:close()
  if self.file then
    self.file:close()
    self.file = nil
  end
end

--- Walks over the record in blocks of values, in bounded memory.
-- A block is filled anew in every turn: what is to be kept must be copied. A damaged file raises.
-- @param options table: channel (number, default 1; or a list, then each turn gives a list of
--   blocks), samples (of a block, default 65536; the last one may be shorter)
-- @return function: iterator of block, number of its first sample
-- @usage
-- local r = lb.record.new { rate = 8000, samples = { 1, 2, 3, 4, 5 } }
-- local sum = 0
-- for block, first in r:blocks { samples = 2 } do sum = sum + block:sum() * first end
-- assert(sum == 3 * 1 + 7 * 3 + 5 * 5)
function Record:blocks(options)
  options = options or {}
  check_options(options, block_fields, 2)
  given.count(options.samples, "samples", 1, 2)
  local list = given.channels(options.channel or 1, 2)
  for _, k in ipairs(list) do channel_of(self, k) end
  local size, next_at, into = options.samples or 65536, 1, nil
  local single = type(options.channel) ~= "table"
  return function()
    local count = math.min(size, self.samples - next_at + 1)
    if count < 1 then
      return nil
    end
    local blocks, message = self.source:read(next_at, count, list, count == size and into or nil)
    if not blocks then
      error(message, 2)
    end
    into = count == size and blocks or into
    next_at = next_at + count
    return single and blocks[1] or blocks, next_at - count
  end
end

--- A stretch of the record as a record of its own, without copying.
-- @param options table: first (sample number from 1, default 1), count (default: all that follow)
-- @return table: the record; its start is the moment of its first sample
-- @usage
-- local r = lb.record.new { rate = 8000, samples = { 1, 2, 3, 4, 5 } }
-- assert(r:part { first = 2, count = 3 }:values():sum() == 9)
function Record:part(options)
  options = options or {}
  check_options(options, part_fields, 2)
  given.count(options.first, "first", 1, 2)
  given.count(options.count, "count", 1, 2)
  local first = options.first or 1
  local count = options.count or self.samples - first + 1
  if first > self.samples or count > self.samples - first + 1 then
    fail(2, "there are %d samples; %d from number %d are not there", self.samples,
      math.max(count, 1), first)
  end
  local part = { rate = self.rate, title = self.title, path = self.path, channels = {},
                 container = self.container, metadata = self.metadata, first = first,
                 start_ns = self:moment(first),
                 segments = given.cut_segments(self.segments, first, count) }
  for k, channel in ipairs(self.channels) do
    local copy = {}
    for key, value in pairs(channel) do copy[key] = key ~= "data" and value or nil end
    part.channels[k] = copy
  end
  part.source = store.part(self.source, first, count, nil, making.factors(part))
  return made(part)
end

--- The moment of a sample, gaps included.
-- @param i integer: sample number from 1, default 1
-- @return integer: nanoseconds since 1970-01-01T00:00:00Z, rounded down; nil where the start is not
--   known, or the moment is beyond 64 bits
-- @usage
-- local r = lb.record.new { rate = 1000, samples = { 1, 2, 3 }, start = "2026-03-01T12:00:00Z",
--   gaps = { { after = 2, lost = 10 } } }
-- assert(lb.record.moment_text(r:moment(3)) == "2026-03-01T12:00:00.012Z")
function Record:moment(i)
  local n = self:counter(i or 1) - self.segments[1].counter
  if not self.start_ns then
    return nil
  end
  return time.after(self.start_ns, n, self.rate)
end

--- The sample counter of a sample: how many the converter had taken before it, lost ones included.
-- @param i integer: sample number from 1
-- @return integer: 0 for the first sample, unless the file says another
-- @usage
-- local r = lb.record.new { rate = 1000, samples = { 1, 2 }, gaps = { { after = 1, lost = 5 } } }
-- assert(r:counter(1) == 0 and r:counter(2) == 6)
function Record:counter(i)
  if math.type(i) ~= "integer" or i < 1 or i > self.samples then
    fail(2, "there is no sample %s; there are 1 to %d", tostring(i), self.samples)
  end
  local found = self.segments[1]
  for _, segment in ipairs(self.segments) do
    if segment.first <= i then found = segment end
  end
  return found.counter + i - found.first
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
