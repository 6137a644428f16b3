--- Opening a file of any format as a record whose samples stay in the file.

local core = require "libration.core"
local formats = require "libration.record.formats"
local given = require "libration.record.options"
local making = require "libration.record.making"
local time = require "libration.record.time"

local M = {}

local function refuse(path, text, ...)
  return nil, path .. ": " .. text:format(...), "domain"
end

-- The rate in some headers is whole; an exact one must round to it.
local function rate_of(path, file, rate)
  if not file.rate and not rate then
    return refuse(path, "does not say at what rate it was sampled; give rate")
  elseif rate and file.rate and file.rate_is_rounded then
    if math.abs(rate:number() - file.rate:number()) >= 1 then
      return refuse(path, "states %s S/s; the rate given, %s S/s, is another", tostring(file.rate),
        tostring(rate))
    end
  elseif rate and file.rate and rate ~= file.rate then
    return refuse(path, "states %s S/s exactly; the rate given, %s S/s, is another",
      tostring(file.rate), tostring(rate))
  end
  return rate or file.rate
end

local function channel_base(file, number, name)
  return {
    number = number, name = name or file.name or ("channel %d"):format(number), bits = file.bits,
    integer = file.integer, lossy = file.lossy or false,
  }
end

-- The calibration that the file itself holds.
local function own_calibration(out, file, unit)
  out.unit, out.factor = unit or file.unit or "1", file.factor
  out.full_scale, out.sensitivity, out.range = file.full_scale, file.sensitivity, file.range
  return out
end

-- One channel of a file as a channel of a record; nil and a reason where its integer
-- codes were given a unit but nothing that says how much of it they are.
local function channel_of(file, number, options, level)
  local c = given.calibration(options, level + 1)
  local out = channel_base(file, number, options.name)
  if file.factor and c.unit and file.unit and c.unit ~= file.unit then
    return nil, ("states the unit %s; the one given, %s, is another"):format(file.unit, c.unit)
  elseif file.factor and not c.full_scale then
    return own_calibration(out, file, c.unit)
  elseif file.factor and file.unit then
    return nil, ("is calibrated already, in %s; it takes no full_scale"):format(file.unit)
  end
  local full_scale = c.full_scale or not c.unit and 1 or nil
  if not full_scale and file.integer then
    return nil, "holds integer codes: a unit needs full_scale, or range and sensitivity"
  end
  out.full_scale, out.unit = full_scale, c.unit or "FS"
  out.factor = full_scale and file.code_full and full_scale / file.code_full or 1
  out.sensitivity, out.range = c.sensitivity, c.range
  return out
end

-- Which samples are asked for; nil and a refusal where they are not there.
local function stretch(path, options, samples)
  local first = options.first or 1
  local count = options.count or samples - first + 1
  if samples == 0 then
    return nil, path .. ": holds no samples", "format"
  elseif first > samples or count > samples - first + 1 then
    return refuse(path, "has %d samples; %d from number %d are not there", samples,
      math.max(count, 1), first)
  end
  return first, count
end

local function all_of(channels)
  local list = {}
  for k = 1, #channels do list[k] = k end
  return list
end

local fields = { "unit", "sensitivity", "range", "full_scale", "name" }

local function build(path, options, asked, file)
  local first, count, code = stretch(path, options, file.feed:samples())
  if not first then return nil, count, code end
  for _, number in ipairs(asked.list or {}) do
    if number < 1 or number > #file.channels then
      return refuse(path, "has channels 1 to %d, not %d", #file.channels, number)
    end
  end
  local rate, message
  rate, message, code = rate_of(path, file, asked.rate)
  if not rate then return nil, message, code end
  local segments = file.segments or { { first = 1, count = file.feed:samples(), counter = 0 } }
  local record = { rate = rate, path = path, container = file.container, first = first,
                   title = file.title, metadata = file.metadata or {}, channels = {},
                   start_ns = asked.start_ns or file.start_ns, segments = segments }
  local list, places = asked.list or all_of(file.channels), {}
  for k, number in ipairs(list) do
    local channel, reason = channel_of(file.channels[number], number,
      given.pick(options, k, fields), 5)
    if not channel then return refuse(path, "%s", reason) end
    record.channels[k], places[k] = channel, file.channels[number].place or number
  end
  record.source = core.store.part(file.feed, first, count, places, making.factors(record))
  record.file = file.feed
  return record
end

-- The start is that of the file's first sample; the record may begin later.
local function move_start(record, first)
  local segments = given.cut_segments(record.segments, first, record.source:samples())
  local n = segments[1].counter - record.segments[1].counter
  record.start_ns = record.start_ns and time.after(record.start_ns, n, record.rate)
  record.segments = segments
  return record
end

--- Opens a file.
-- @param path string: the file
-- @param options table: of lb.record.read
-- @param asked table: what the options mean: row, list, rate, start_ns
-- @return table: a record without its methods; or nil, message, code
function M.open(path, options, asked)
  local row = asked.row or formats.of_file(path)
  local file, message, code = row.open(path, asked)
  if not file then
    return nil, message, code
  end
  local record
  record, message, code = build(path, options, asked, file)
  if not record then
    file.feed:close()
    return nil, message, code
  end
  return move_start(record, record.first)
end

return M
