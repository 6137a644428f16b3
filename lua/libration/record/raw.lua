--- Packed samples with a description beside them: an inert data file, record = { ... }.
-- Fields: file (name in the same folder), coding (int8 .. int32, uint8 .. uint32, float32,
-- float64), order ("little" or "big"), skip (bytes before the samples), samples, rate (exact, as
-- text), start (ISO 8601), title, gaps (after, lost), channels (name, unit, bits, factor,
-- full_scale, sensitivity, range).

local beside = require "libration.record.beside"
local fraction = require "libration.fraction"
local given = require "libration.record.options"
local inert = require "libration.inert"
local store = require("libration.core").store
local time = require "libration.record.time"

local M = {
  name = "raw", title = "packed samples with a description", suffixes = { ".record" },
  fields = {}, holds_gaps = true,
}

local known = given.set "file coding order skip samples rate start title gaps channels"

function M.matches(head)
  return head:gsub("%-%-[^\n]*\n", ""):find "^%s*record%s*=%s*{" ~= nil
end

local function bad(path, text, ...)
  return nil, path .. ": " .. text:format(...), "format"
end

local function whole(value, least)
  return math.type(value) == "integer" and value >= least
end

-- What the description says, checked; nil, message, code.
local function check(path, words)
  for key in pairs(words) do
    if not known[key] then
      return bad(path, "record has the unknown field %s", tostring(key))
    end
  end
  local coding = beside.codings[words.coding]
  local rate = fraction.try(words.rate)
  if not coding then
    return bad(path, "coding is %s; valid are int8, int16, int24, int32, uint8, uint16, uint32, "
      .. "float32, float64", tostring(words.coding))
  elseif words.order ~= nil and words.order ~= "little" and words.order ~= "big" then
    return bad(path, "order is %s; valid are little, big", tostring(words.order))
  elseif not rate or not (rate > 0) then
    return bad(path, "rate is %s; it must be a positive number", tostring(words.rate))
  elseif words.skip ~= nil and not whole(words.skip, 0) then
    return bad(path, "skip is %s; it must be an integer from 0", tostring(words.skip))
  elseif words.samples ~= nil and not whole(words.samples, 0) then
    return bad(path, "samples is %s; it must be an integer from 0", tostring(words.samples))
  elseif type(words.channels) ~= "table" or #words.channels == 0 then
    return bad(path, "channels must be a list of channels")
  elseif words.title ~= nil and type(words.title) ~= "string" then
    return bad(path, "title is no text")
  end
  local out = { container = "raw", rate = rate, title = words.title, channels = {} }
  for k, channel in ipairs(words.channels) do
    local reason
    out.channels[k], reason = beside.read_channel(channel, coding)
    if not out.channels[k] then
      return bad(path, "%s", reason)
    end
  end
  return out, coding
end

local function add_times(path, words, file)
  if words.start ~= nil then
    local ns, reason = time.read(tostring(words.start))
    if not ns then
      return bad(path, "start: %s", reason)
    end
    file.start_ns = ns
  end
  local fine, segments = pcall(given.segments, words.gaps, file.feed:samples(), 0)
  if not fine then
    return bad(path, "%s", tostring(segments))
  end
  file.segments = segments
  return file
end

function M.open(path)
  local text, message, code = store.head(path, 1 << 20)
  if not text then
    return nil, message, code
  end
  local data
  data, message, code = inert.read(text)
  if not data then
    return nil, path .. ": " .. message, code
  elseif type(data.record) ~= "table" then
    return bad(path, "does not say record = { ... }")
  end
  local words = data.record
  local name = beside.path(path, words.file)
  if not name then
    return bad(path, "file is %s; it must name a file in the same folder", tostring(words.file))
  end
  local file, coding
  file, coding, code = check(path, words)
  if not file then
    return nil, coding, code
  end
  file.feed, message, code = beside.open(name, coding, words.order == "big", #file.channels,
    words.skip or 0, words.samples)
  if not file.feed then
    return nil, message, code
  end
  return add_times(path, words, file)
end

function M.write(record, path)
  local data_path = path:gsub("%.record$", "") .. ".raw"
  local coding, codes = beside.coding_of(record, { "int16", "int24", "int32" })
  local words = {
    file = data_path:match "[^/]*$", coding = coding, order = "little", samples = record.samples,
    rate = tostring(record.rate), title = record.title, gaps = beside.gaps(record), channels = {},
    start = record.start_ns and time.text(record.start_ns) or nil,
  }
  for k, channel in ipairs(record.channels) do
    words.channels[k] = beside.channel(channel, codes)
  end
  return beside.write(record, { data = data_path, words = path },
    inert.write { record = words }, coding, codes)
end

return M
