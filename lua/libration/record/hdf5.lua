--- HDF5: one dataset "samples", rows are samples and columns channels, with attributes.
-- Attributes: rate (exact, S/s, as text), start (ISO 8601), title, and per channel names,
-- units, factors (unit per stored number), bits, full_scales, sensitivities, ranges (0: not
-- known); gaps_after and gaps_lost. From others a dataset of one or two dimensions in the
-- root group is read, or several of one length; contiguous ones only: data in chunks or
-- compressed are refused.

local core = require "libration.core"
local beside = require "libration.record.beside"
local fraction = require "libration.fraction"
local given = require "libration.record.options"
local pack = require "libration.record.hdf5_pack"
local parse = require "libration.record.hdf5_parse"
local time = require "libration.record.time"

local store = core.store

local M = {
  name = "hdf5", title = "HDF5", suffixes = { ".h5", ".hdf5", ".hdf" }, fields = {},
  holds_gaps = true,
}

local NAME = "samples"
local MOST_ATTRIBUTE = 60000

function M.matches(head)
  return head:sub(1, 8) == "\x89HDF\r\n\x1a\n"
end

local function bad(path, text, ...)
  return nil, path .. ": " .. text:format(...), "format"
end

local function is_readable(coding)
  if not coding.integer then
    return coding.bits == 32 or coding.bits == 64
  end
  return coding.bits == 8 or coding.bits == 16 or coding.bits == 32
    or coding.bits == 24 and not coding.unsigned and not coding.big
end

-- Where the channels of a dataset lie: rows of samples, or, where there are
-- more columns than rows, a row per channel.
local function places_of(set)
  local rows, columns = set.shape[1], set.shape[2] or 1
  local size, list = set.coding.bits // 8, {}
  local planar = columns > rows
  local channels, samples = planar and rows or columns, planar and columns or rows
  if channels > 65536 or channels * size > 65536 and not planar then
    return nil
  end
  for k = 1, channels do
    list[k] = { at = set.at + (k - 1) * size * (planar and samples or 1),
                step = planar and size or size * channels, bits = set.coding.bits,
                integer = set.coding.integer, unsigned = set.coding.unsigned,
                big = set.coding.big, coding = set.coding }
  end
  return list, samples
end

-- The datasets that are samples: ours, or all of one or two dimensions.
local function choose(sets)
  local list = {}
  for _, set in ipairs(sets) do
    local fits = (#set.shape == 1 or #set.shape == 2) and set.shape[1] > 0
      and (set.shape[2] or 1) > 0
    if fits and set.name == NAME and set.attributes.rate then
      return { set }
    elseif fits then
      list[#list + 1] = set
    end
  end
  return list
end

local function check_set(path, set)
  if not set.at then
    return bad(path, "holds the dataset %s %s; contiguous ones are read", set.name, set.layout)
  elseif not is_readable(set.coding) then
    return bad(path, "holds the dataset %s as %s of %d bits; read are integers to 32 and floats",
      set.name, set.coding.integer and "integers" or "floats", set.coding.bits)
  end
  return true
end

local function gather(path, sets)
  local places, samples, names = {}, nil, {}
  for _, set in ipairs(sets) do
    local fine, message, code = check_set(path, set)
    if not fine then
      return nil, message, code
    end
    local list, count = places_of(set)
    if not list or samples and count ~= samples then
      return bad(path, "holds datasets of different shapes; %s has %d rows of %d", set.name,
        set.shape[1], set.shape[2] or 1)
    end
    samples = count
    for _, place in ipairs(list) do
      places[#places + 1] = place
      names[#places] = #sets > 1 and (#list == 1 and set.name or set.name .. " " .. #names + 1)
        or nil
    end
  end
  if #places == 0 then
    return bad(path, "holds no dataset of numbers with one or two dimensions in its root group")
  elseif #places > 65536 then
    return bad(path, "holds %d channels, more than can be read", #places)
  end
  return places, samples, names
end

local per_channel = { name = "names", unit = "units", bits = "bits", factor = "factors",
                      full_scale = "full_scales", sensitivity = "sensitivities", range = "ranges" }

-- Channel k in the words of a description.
local function words_of(attributes, k)
  local words = {}
  for key, name in pairs(per_channel) do
    local value = attributes[name]
    if type(value) == "table" then value = value[k] end
    if value ~= 0 and value ~= "" then words[key] = value end
  end
  return words
end

local function add_facts(path, attributes, file)
  local rate = type(attributes.rate) == "string" and fraction.try(attributes.rate)
    or math.type(attributes.rate) and fraction.try(attributes.rate)
  file.rate = rate and rate > 0 and rate or nil
  file.title = type(attributes.title) == "string" and attributes.title or nil
  file.start_ns = type(attributes.start) == "string" and time.read(attributes.start) or nil
  local after, lost, gaps = attributes.gaps_after, attributes.gaps_lost, {}
  for i = 1, type(after) == "table" and #after or 0 do
    gaps[i] = { after = after[i], lost = type(lost) == "table" and lost[i] or nil }
  end
  local fine, segments = pcall(given.segments, gaps, file.feed:samples(), 0)
  if not fine then
    return bad(path, "%s", tostring(segments))
  end
  file.segments = segments
  return file
end

function M.open(path)
  local sets, message, code = parse.datasets(path)
  if not sets then
    return nil, message, code
  end
  local chosen = choose(sets)
  local places, samples, names = gather(path, chosen)
  if not places then
    return nil, samples, names
  end
  local file = { container = "hdf5", channels = {} }
  local attributes = #chosen == 1 and chosen[1].attributes or {}
  for k, place in ipairs(places) do
    local words = words_of(attributes, k)
    local channel, reason = beside.read_channel(words, place.coding)
    if not channel then
      return bad(path, "%s", reason)
    end
    channel.name = channel.name or names[k]
    if not words.unit and not place.coding.integer then
      channel.factor, channel.code_full = 1, nil
    end
    file.channels[k] = channel
  end
  file.feed, message, code = store.packed(path, places, samples)
  if not file.feed then
    return nil, message, code
  end
  return add_facts(path, attributes, file)
end

-- One list per field of all channels; 0 or "" where a channel has none.
local function columns_of(record, codes)
  local out = {}
  for k, channel in ipairs(record.channels) do
    local words = beside.channel(channel, codes)
    for key, name in pairs(per_channel) do
      out[name] = out[name] or {}
      local empty = (key == "name" or key == "unit") and "" or key == "bits" and 0 or 0.0
      local value = words[key] or empty
      out[name][k] = math.type(empty) == "float" and value + 0.0 or value
    end
  end
  return out
end

local function attributes_of(record, codes)
  local all, list = columns_of(record, codes), {}
  all.rate, all.title = tostring(record.rate), record.title
  all.start = record.start_ns and time.text(record.start_ns) or nil
  for i, gap in ipairs(beside.gaps(record) or {}) do
    all.gaps_after, all.gaps_lost = all.gaps_after or {}, all.gaps_lost or {}
    all.gaps_after[i], all.gaps_lost[i] = gap.after, gap.lost
  end
  local names = {}
  for name in pairs(all) do names[#names + 1] = name end
  table.sort(names)
  for i, name in ipairs(names) do
    list[i] = pack.attribute(name, all[name])
    if #list[i] > MOST_ATTRIBUTE then
      return nil, ("%s of this record are more than an attribute of HDF5 holds"):format(name)
    end
  end
  return list
end

function M.write(record, path)
  local coding, codes = beside.coding_of(record, { "int16", "int24", "int32" })
  local attributes, problem = attributes_of(record, codes)
  if not attributes then
    return nil, path .. ": " .. problem, "domain"
  end
  local draft <close>, message, code = store.draft(path)
  if not draft then
    return nil, message, code
  end
  local done
  done, message, code = draft:put(pack.front(NAME, beside.codings[coding], record.samples,
    #record.channels, attributes))
  if done then
    done, message, code = beside.fill(draft, record, coding, codes)
  end
  if not done then
    return nil, message, code
  end
  return draft:finish()
end

return M
