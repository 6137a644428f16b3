--- Records as CSV (RFC 4180): a header row "name [unit]", then a row per sample.
-- We write a first column "time [s] 51200 S/s" with the exact rate in its title,
-- and the start behind it where it is known. From others we take commas,
-- semicolons or tabs, a point between the digits, any line end, and an even
-- time column or none. Values are read to the last bit in every locale.

local core = require "libration.core"
local fraction = require "libration.fraction"
local samples = require "libration.samples"
local time = require "libration.record.time"
local units = require "libration.units"

local store = core.store

local M = {
  name = "csv", title = "CSV (RFC 4180)", suffixes = { ".csv", ".tsv", ".txt" },
  fields = { separator = true },
}

local MOST_HEADER = 1048576
local BLOCK = 65536
local separators = { [","] = true, [";"] = true, ["\t"] = true }

local function is_number(text)
  local bare = text:match "^%s*(.-)%s*$"
  return bare == "nan" or bare == "NaN" or bare:match "^%-?inf$" ~= nil
    or bare:match "^[+-]?%d+%.?%d*[eE]?[+-]?%d*$" ~= nil
    or bare:match "^[+-]?%.%d+[eE]?[+-]?%d*$" ~= nil
end

-- One field from `at` on: its text, and where the separator or line end behind
-- it is; nil where a quote is not closed.
local function take_field(head, at, separator)
  if head:sub(at, at) ~= '"' then
    local stop = head:find("[" .. separator .. "\r\n]", at) or #head + 1
    return head:sub(at, stop - 1), stop
  end
  local parts, from = {}, at + 1
  while true do
    local quote = head:find('"', from, true)
    if not quote then
      return nil
    end
    parts[#parts + 1] = head:sub(from, quote - 1)
    if head:sub(quote + 1, quote + 1) ~= '"' then
      return table.concat(parts, '"'), quote + 1
    end
    from = quote + 2
  end
end

-- The fields of the first row and where the next row starts; nil: no row ends.
local function first_row(head, at, separator)
  local fields, lines = {}, 1
  while true do
    local text, stop = take_field(head, at, separator)
    if not text or #fields >= 4096 then
      return nil
    end
    fields[#fields + 1] = text
    local _, feeds = text:gsub("\n", "")
    lines = lines + feeds
    local mark = head:sub(stop, stop)
    if mark == separator then
      at = stop + 1
    elseif mark == "\n" or mark == "" then
      return fields, stop + 1, lines
    elseif head:sub(stop, stop + 1) == "\r\n" then
      return fields, stop + 2, lines
    else
      return nil
    end
  end
end

local function separator_of(line)
  local bare = line:gsub('"[^"]*"', "")
  return bare:match ";" or bare:match "\t" or ","
end

local function layout_of(head)
  local at = head:sub(1, 3) == "\239\187\191" and 4 or 1
  local separator = separator_of(head:match("^[^\r\n]*", at))
  local fields, next_at, lines = first_row(head, at, separator)
  if not fields then
    return nil
  end
  local titled = false
  for _, field in ipairs(fields) do
    titled = titled or not is_number(field)
  end
  return { fields = fields, titled = titled, separator = separator, columns = #fields,
           at = titled and next_at - 1 or at - 1, line = titled and 1 + lines or 1 }
end

-- Text in lines, with a row of numbers somewhere near the top.
function M.matches(head)
  if head:find("[\0-\8\14-\31]") then
    return false
  end
  local layout = layout_of(head)
  if not layout then
    return false
  end
  local line = head:match("^[^\r\n]*", layout.at + 1) or ""
  local first = take_field(line, 1, layout.separator)
  return first ~= nil and is_number(first)
end

-- "name [unit] rest" or "name (unit) rest".
local function title_of(text)
  local name, unit, rest = text:match "^(.-)%s*%[([^%[%]]*)%]%s*(.*)$"
  if not name then
    name, unit, rest = text:match "^(.-)%s*%(([^()]*)%)%s*(.*)$"
  end
  return { name = name or text, unit = unit ~= "" and unit or nil, rest = rest or "" }
end

local function time_unit(title)
  local name = title.name:lower()
  return (name == "time" or name == "t") and units.number("1 " .. (title.unit or "s"), "s") or nil
end

-- The largest distance of a time from an even grid, in intervals.
local function unevenness(feed, rate, scale)
  local count, worst = feed:samples(), 0
  local ramp = samples.make(math.min(BLOCK, count), function(i) return i - 1 end)
  local start, reason, kind = feed:read(1, 1, { 1 })
  if not start then
    return nil, reason, kind
  end
  local origin = start[1][1] * scale * rate
  for first = 1, count, BLOCK do
    local n = math.min(BLOCK, count - first + 1)
    local block, message, code = feed:read(first, n, { 1 })
    if not block then
      return nil, message, code
    end
    local off = block[1] * (scale * rate) - ramp:slice(1, n) - (origin + first - 1)
    worst = math.max(worst, math.abs(off:min()), math.abs(off:max()))
  end
  return worst
end

-- Rates that the first interval and the whole span speak for, exact ones first.
local function candidates(feed, scale)
  local count = feed:samples()
  local first, message, code = feed:read(1, 2, { 1 })
  local second
  if first then
    second, message, code = feed:read(count, 1, { 1 })
  end
  if not second then
    return nil, message, code
  end
  local span = (second[1][1] - first[1][1]) * scale
  local mean = (count - 1) / span
  local list = {}
  if not (span > 0) or mean == math.huge or mean < 1e-9 or mean > 1e15 then
    return {}
  end
  local whole = math.floor(mean + 0.5)
  if whole >= 1 then
    list[1] = fraction.new(whole)
  end
  local interval = units.exact(core.base.number_text((first[1][2] - first[1][1]) * scale), "1")
  if interval and interval > 0 then
    list[#list + 1] = fraction.new(interval.denominator, interval.numerator)
  end
  local period = math.floor(1 / mean + 0.5)
  if period >= 1 then
    list[#list + 1] = fraction.new(1, period)
  end
  return list
end

-- The rate that the time column has, to a hundredth of an interval anywhere.
local function even_rate(path, feed, scale, given)
  if feed:samples() < 2 then
    return given, ("%s: one time does not say the rate; give rate"):format(path), "domain"
  end
  local list, reason, kind = { given }, nil, nil
  if not given then
    list, reason, kind = candidates(feed, scale)
  end
  if not list then
    return nil, reason, kind
  end
  for _, rate in ipairs(list) do
    local worst, message, code = unevenness(feed, rate:number(), scale)
    if not worst then
      return nil, message, code
    elseif worst <= 0.01 then
      return rate
    end
  end
  return nil, ("%s: its time column is not even%s to a hundredth of an interval"):format(path,
    given and " at the rate given, " .. fraction.text(given) .. " S/s," or ""), "domain"
end

local function open_rows(path, layout)
  local feed, message, code = store.rows(path, layout)
  if not feed then
    return nil, message, code
  elseif feed:samples() == 0 then
    return nil, path .. ": holds no samples", "format"
  end
  return feed
end

-- What the titles say: channels, and which column, if any, is the time.
local function titles_of(layout)
  local channels, numbers, first = {}, {}, nil
  for column, text in ipairs(layout.fields) do
    local title = title_of(layout.titled and text or "")
    if column == 1 and layout.titled and layout.columns > 1 and time_unit(title) then
      first = title
    else
      numbers[#numbers + 1] = column
      channels[#channels + 1] = {
        name = title.name ~= "" and title.name or nil, integer = false, lossy = false, factor = 1,
        unit = title.unit,
      }
    end
  end
  return channels, numbers, first
end

local function rate_in(text)
  local rate = text:match "(%d[%d/.]*) S/s"
  local exact = rate and fraction.try(rate)
  return exact and exact > 0 and exact or nil
end

function M.open(path, options)
  local head, message, code = store.head(path, MOST_HEADER)
  if not head then
    return nil, message, code
  end
  local layout = layout_of(head)
  if not layout then
    return nil, path .. ": has no first row that ends as a row does, within 1 MiB", "format"
  end
  local feed
  feed, message, code = open_rows(path, layout)
  if not feed then
    return nil, message, code
  end
  local channels, numbers, first = titles_of(layout)
  local out = { container = "csv", channels = channels, metadata = {} }
  if first then
    out.rate = rate_in(first.rest)
    local start = first.rest:match "%d%d%d%d%-%d%d%-%d%d[Tt]%S+"
    out.start_ns = start and time.read(start) or nil
    if not out.rate then
      out.rate, message, code = even_rate(path, feed, time_unit(first), options.rate)
      if not out.rate then
        return nil, message, code
      end
      out.metadata.rate_from = "the time column"
    end
  end
  for k, number in ipairs(numbers) do channels[k].place = number end
  out.feed = feed
  return out
end

local function quoted(text, separator)
  if text:find('["\r\n' .. separator .. ']') then
    return '"' .. text:gsub('"', '""') .. '"'
  end
  return text
end

local function header_of(record, separator)
  local start = record.start_ns and " " .. time.text(record.start_ns) or ""
  local titles = { ("time [s] %s S/s%s"):format(tostring(record.rate), start) }
  for k, channel in ipairs(record.channels) do
    titles[k + 1] = quoted(("%s [%s]"):format(channel.name, channel.unit), separator)
  end
  return table.concat(titles, separator) .. "\r\n"
end

function M.write(record, path, options)
  local separator = options.separator or ","
  if not separators[separator] then
    error("record: separator is \"" .. tostring(separator) .. "\"; valid are , ; and tab", 3)
  end
  local draft <close>, message, code = store.draft(path)
  local done = draft
  if draft then
    done, message, code = draft:put(header_of(record, separator))
  end
  for first = 1, record.samples, BLOCK do
    local blocks = done
    if blocks then
      blocks, message, code = record.source:read(first, math.min(BLOCK, record.samples - first + 1))
    end
    if not blocks then
      return nil, message, code
    end
    done, message, code = draft:rows(blocks, separator, first - 1, record.rate.numerator,
      record.rate.denominator)
  end
  if not done then
    return nil, message, code
  end
  return draft:finish()
end

return M
