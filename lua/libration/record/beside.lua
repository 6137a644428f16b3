--- Formats of two files: one that describes, and one beside it that holds packed samples.

local store = require("libration.core").store

local M = {}

local BLOCK = 65536

--- What a name of a coding means: { bits, integer, unsigned }.
M.codings = {
  int8 = { bits = 8, integer = true }, uint8 = { bits = 8, integer = true, unsigned = true },
  int16 = { bits = 16, integer = true }, uint16 = { bits = 16, integer = true, unsigned = true },
  int24 = { bits = 24, integer = true },
  int32 = { bits = 32, integer = true }, uint32 = { bits = 32, integer = true, unsigned = true },
  float32 = { bits = 32, integer = false }, float64 = { bits = 64, integer = false },
}

--- The path of a file in the same folder; nil where the name leaves it.
function M.path(path, name)
  if type(name) ~= "string" or name == "" or #name > 255 or name:find "[/\0]" or name == ".."
    or name == "." then
    return nil
  end
  return (path:match "^(.*/)" or "") .. name
end

--- Opens interleaved samples as a feed; all from `at` on where samples is nil.
-- @return feed: or nil, message, code
function M.open(path, coding, big, channels, at, samples)
  local size = coding.bits // 8
  local step = size * channels
  if at > 1 << 60 or samples and samples > 1 << 60 then
    return nil, ("%s: is shorter than its description says"):format(path), "format"
  elseif step > 65536 then
    return nil, ("%s: frames of %d bytes are more than can be read"):format(path, step), "domain"
  end
  if not samples then
    local head, bytes, code = store.head(path, 1)
    if not head then
      return nil, bytes, code
    elseif bytes < at or (bytes - at) % step ~= 0 then
      return nil, ("%s: %d bytes from byte %d on are no whole number of frames of %d"):format(path,
        bytes - at, at, step), "format"
    end
    samples = (bytes - at) // step
  end
  local list = {}
  for k = 1, channels do
    list[k] = { at = at + (k - 1) * size, step = step, bits = coding.bits, integer = coding.integer,
                unsigned = coding.unsigned, big = big }
  end
  return store.packed(path, list, samples)
end

--- The name of the coding that holds the record without loss, and whether it is of codes.
function M.coding_of(record, integers)
  local bits = 0
  for _, channel in ipairs(record.channels) do
    if not channel.integer then
      return "float64", false
    end
    bits = math.max(bits, channel.bits)
  end
  for _, name in ipairs(integers) do
    if M.codings[name].bits >= bits then
      return name, true
    end
  end
  return "float64", false
end

--- Fills a draft with all samples, interleaved, little-endian.
function M.fill(draft, record, coding, codes)
  local source = record.source
  for first = 1, record.samples, BLOCK do
    local read = codes and source.codes or source.read
    local blocks, message, code = read(source, first, math.min(BLOCK, record.samples - first + 1))
    local done = blocks
    if blocks then
      done, message, code = draft:frames(blocks, M.codings[coding])
    end
    if not done then
      return nil, message, code
    end
  end
  return true
end

--- Writes both files: complete drafts first, then the data's name, then the description's.
function M.write(record, paths, text, coding, codes)
  local data <close>, message, code = store.draft(paths.data)
  if not data then
    return nil, message, code
  end
  local words <close>, words_message, words_code = store.draft(paths.words)
  if not words then
    return nil, words_message, words_code
  end
  local done
  done, message, code = M.fill(data, record, coding, codes)
  if done then
    done, message, code = words:put(text)
  end
  if done then
    done, message, code = data:finish()
  end
  if not done then
    return nil, message, code
  end
  return words:finish()
end

--- Gaps { after, lost } of the segments of a record, or nil.
function M.gaps(record)
  local out = {}
  for i = 2, #record.segments do
    local before, here = record.segments[i - 1], record.segments[i]
    out[i - 1] = { after = here.first - 1, lost = here.counter - before.counter - before.count }
  end
  return #out > 0 and out or nil
end

--- What a channel says of itself, for a description that reads back.
function M.channel(channel, codes)
  return { name = channel.name, unit = channel.unit, bits = channel.bits,
           factor = codes and channel.factor or 1, full_scale = channel.full_scale,
           sensitivity = channel.sensitivity, range = channel.range }
end

local kinds = { name = "string", unit = "string", bits = "integer", factor = "number",
                full_scale = "number", sensitivity = "number", range = "number" }

--- A channel of a description as a channel of a file; nil and a reason for nonsense.
function M.read_channel(words, coding)
  if type(words) ~= "table" then
    return nil, "a channel is no table"
  end
  for key, value in pairs(words) do
    local kind = math.type(value) == "integer" and kinds[key] == "integer" and "integer"
      or type(value)
    if not kinds[key] then
      return nil, ("a channel has the unknown field %s"):format(tostring(key))
    elseif kind ~= kinds[key] or kind == "number" and not (value > 0 and value < math.huge) then
      return nil, ("%s of a channel is %s"):format(key, tostring(value))
    end
  end
  local bits = words.bits or coding.integer and coding.bits or nil
  if bits and (bits < 2 or bits > 64) then
    return nil, "bits of a channel is " .. bits
  end
  return {
    name = words.name, unit = words.unit, bits = bits, integer = coding.integer,
    code_full = coding.integer and 2.0 ^ (bits - (coding.unsigned and 0 or 1)) or nil,
    factor = words.factor or not coding.integer and 1 or nil, full_scale = words.full_scale,
    sensitivity = words.sensitivity, range = words.range,
  }
end

return M
