--- SigMF 1.2: metadata in JSON (.sigmf-meta), samples beside it (.sigmf-data).
-- What SigMF has no word for (an exact rate, units, names) stands in an optional
-- extension of ours, "libration". Complex data are read as two channels each.
-- A checksum (core:sha512) is not verified; metadata.unchecked says so.

local cjson = require "cjson"

local beside = require "libration.record.beside"
local fraction = require "libration.fraction"
local json = require "libration.json"
local store = require("libration.core").store
local time = require "libration.record.time"

local M = {
  name = "sigmf", title = "SigMF", suffixes = { ".sigmf-meta" }, fields = {}, holds_gaps = true,
}

local MOST_BYTES = 16 << 20

local reader = cjson.new()
reader.decode_max_depth(32)
reader.decode_invalid_numbers(false)

-- SigMF 1.2.5, "Dataset Format": the names of sample types.
local types = {
  f32 = "float32", f64 = "float64", i32 = "int32", i16 = "int16", i8 = "int8", u32 = "uint32",
  u16 = "uint16", u8 = "uint8",
}
local names = { int16 = "ri16_le", int32 = "ri32_le", float64 = "rf64_le" }

function M.matches(head)
  return head:find "^%s*{" ~= nil and head:find('"global"', 1, true) ~= nil
end

local function bad(path, text, ...)
  return nil, path .. ": " .. text:format(...), "format"
end

local function object(value)
  return type(value) == "table" and value or {}
end

local function whole(value)
  return type(value) == "number" and math.tointeger(value) or nil
end

local function coding_of(path, datatype)
  local kind, name, order = tostring(datatype):match "^([cr])(%a%d+)(.*)$"
  local coding = name and types[name] and beside.codings[types[name]]
  if not coding or order ~= "_le" and order ~= "_be" and not (order == "" and coding.bits == 8) then
    return bad(path, "core:datatype is %s; valid are such as ri16_le, rf32_be, cf32_le",
      tostring(datatype))
  end
  return coding, kind == "c", order == "_be"
end

local function rate_of(global)
  local exact = global["libration:rate"]
  local rate = type(exact) == "string" and fraction.try(exact)
    or type(global["core:sample_rate"]) == "number" and fraction.try(global["core:sample_rate"])
  return rate and rate > 0 and rate or nil
end

-- Segments from the captures, which must be in order and say the same count.
local function segments_of(path, captures, samples, offset)
  local list = {}
  for i, capture in ipairs(captures) do
    local at, last = whole(object(capture)["core:sample_start"]), list[#list]
    local first = at and at - offset + 1
    if not first or first < (last and last.first + 1 or 1) or first > samples then
      return bad(path, "captures[%d] starts at %s of %d samples, out of order", i, tostring(at),
        samples)
    end
    local counter = whole(capture["core:global_index"])
    if last then
      last.count = first - last.first
      local follows = last.counter + last.count
      counter = counter or follows
      if counter < follows then
        return bad(path, "captures[%d] overlaps the one before it", i)
      end
      first = counter == follows and last.first or first
    end
    if not last or first ~= last.first then
      list[#list + 1] = { first = first, counter = counter or 0 }
    end
  end
  if #list == 0 or list[1].first ~= 1 then
    list = { { first = 1, counter = 0 } }
  end
  list[#list].count = samples - list[#list].first + 1
  return list
end

local function channels_of(path, global, coding, complex)
  local count = whole(global["core:num_channels"] or 1)
  local words, list = object(global["libration:channels"]), {}
  if not count or count < 1 or count > 65536 then
    return bad(path, "core:num_channels is %s", tostring(global["core:num_channels"]))
  end
  for k = 1, count * (complex and 2 or 1) do
    local own = {}
    for key, value in pairs(object(words[k])) do
      own[key] = key == "bits" and whole(value) or value
    end
    local channel, reason = beside.read_channel(own, coding)
    if not channel then
      return bad(path, "libration:channels: %s", reason)
    end
    if complex and not channel.name then
      channel.name = ("channel %d, %s"):format((k + 1) // 2, k % 2 == 1 and "in phase"
        or "quadrature")
    end
    if not words[k] and not coding.integer then
      channel.factor, channel.code_full = nil, 1 -- no unit is said: shares of full scale
    end
    list[k] = channel
  end
  return list
end

local function meta_of(path)
  local text, bytes, code = store.head(path, MOST_BYTES)
  if not text then
    return nil, bytes, code
  elseif bytes > MOST_BYTES then
    return bad(path, "has %d bytes of metadata; at most %d are read", bytes, MOST_BYTES)
  end
  local fine, meta = pcall(reader.decode, text)
  if not fine then
    return bad(path, "is no JSON (%s)", tostring(meta))
  end
  for _, part in ipairs { "global", "captures", "annotations" } do
    if type(meta) ~= "table" or type(meta[part]) ~= "table" then
      return bad(path, "has no %s, which SigMF asks for", part)
    end
  end
  return meta
end

local function data_path(path, global)
  local name = global["core:dataset"]
  if name == nil then
    return path:gsub("%.sigmf%-meta$", "") .. ".sigmf-data"
  end
  return beside.path(path, name)
end

function M.open(path)
  local meta, message, code = meta_of(path)
  if not meta then
    return nil, message, code
  end
  local global, first = meta.global, object(meta.captures[1])
  local data = data_path(path, global)
  local header = whole(first["core:header_bytes"] or 0)
  if not data then
    return bad(path, "core:dataset must name a file in the same folder")
  elseif not header or header < 0 or #meta.captures > 1 and header > 0 then
    return bad(path, "core:header_bytes is more than can be read")
  end
  local coding, complex, big = coding_of(path, global["core:datatype"])
  if not coding then
    return nil, complex, big
  end
  local file = { container = "sigmf", rate = rate_of(global), metadata = { global = global } }
  file.channels, message, code = channels_of(path, global, coding, complex)
  if file.channels then
    file.feed, message, code = beside.open(data, coding, big, #file.channels, header)
  end
  if not file.feed then
    return nil, message, code
  end
  file.segments, message, code = segments_of(path, meta.captures, file.feed:samples(),
    whole(global["core:offset"]) or 0)
  if not file.segments then
    return nil, message, code
  end
  local description = global["core:description"]
  file.title = type(description) == "string" and description or nil
  file.start_ns = time.read(tostring(first["core:datetime"] or ""))
  file.metadata.unchecked = global["core:sha512"] and "core:sha512" or nil
  return file
end

local function captures_of(record)
  local list = {}
  for i, segment in ipairs(record.segments) do
    list[i] = { ["core:sample_start"] = segment.first - 1, ["core:global_index"] = segment.counter,
                ["core:datetime"] = record.start_ns and time.text(record:moment(segment.first))
                  or nil }
  end
  return list
end

function M.write(record, path)
  local stem = path:gsub("%.sigmf%-meta$", "")
  local coding, codes = beside.coding_of(record, { "int16", "int32" })
  local rate = record.rate:number()
  local global = {
    ["core:datatype"] = names[coding], ["core:version"] = "1.2.5",
    ["core:sample_rate"] = rate >= 1 and rate or nil, -- less than 1 Hz is against the schema
    ["core:num_channels"] = #record.channels, ["core:description"] = record.title,
    ["core:extensions"] = { { name = "libration", version = "1.0.0", optional = true } },
    ["libration:rate"] = tostring(record.rate), ["libration:channels"] = {},
  }
  for k, channel in ipairs(record.channels) do
    global["libration:channels"][k] = beside.channel(channel, codes)
  end
  local text, message, code = json.encode { global = global, captures = captures_of(record),
                                            annotations = {} }
  if not text then
    return nil, path .. ": " .. message, code
  end
  return beside.write(record, { data = stem .. ".sigmf-data", words = stem .. ".sigmf-meta" },
    text .. "\n", coding, codes)
end

return M
