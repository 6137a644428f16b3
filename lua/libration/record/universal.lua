--- Universal file, dataset 58 (functions at nodal points): text and binary (58b).
-- Only evenly spaced real time functions are records; other datasets are
-- counted in metadata.skipped. The interval is stored in six digits, so that
-- the exact rate and the start stand in the ID lines 4 and 5 ("rate 100000/3 S/s",
-- "start 2026-03-01T12:00:00Z") of what we write. From others a rate is taken
-- where only one whole number of S/s is stored like that; else it must be given.
-- Layout of the records: universal dataset number 58, as published for the format.

local core = require "libration.core"
local fraction = require "libration.fraction"
local time = require "libration.record.time"

local store = core.store

local M = {
  name = "universal", title = "universal file (dataset 58)", suffixes = { ".uff", ".unv", ".58" },
  fields = { binary = true },
}

local HEAD, CHUNK, BLOCK, MOST_SETS = 4096, 65536, 65536, 4096

local function bad(path, text, ...)
  return nil, path .. ": " .. text:format(...), "format"
end

function M.matches(head)
  return head:find "^    %-1[ ]*\r?\n[ ]*%d+" ~= nil
end

-- The first `count` lines of text from `at` on, and where the next one starts.
local function take_lines(text, count)
  local lines, at = {}, 1
  for i = 1, count do
    local stop = text:find("\n", at, true)
    if not stop then
      return nil
    end
    lines[i] = text:sub(at, stop - 1):gsub("\r$", "")
    at = stop + 1
  end
  return lines, at
end

-- Characters first .. last of a line as an integer, a number, a text.
local function whole(line, first, last)
  return math.tointeger(tonumber(line:sub(first, last):match "^%s*([+-]?%d+)%s*$"))
end

local function number(line, first, last)
  local text = line:sub(first, last):gsub("[dD]", "E"):match "^%s*([+-]?%d*%.?%d*E?[+-]?%d*)%s*$"
  local exact = text and text ~= "" and fraction.try(text)
  return exact and exact:number() or nil
end

local function words(line, first, last)
  local text = line:sub(first, last):match "^%s*(.-)%s*$"
  return text ~= "" and text ~= "NONE" and text or nil
end

-- What the 11 records in front of the data say.
local function header_of(lines)
  local function of(at) return lines[2 + at] end
  return {
    id = { of(1), of(2), of(3), of(4), of(5) }, kind = whole(of(6), 1, 5),
    node = words(of(6), 32, 41), kind_of_number = whole(of(7), 1, 10), count = whole(of(7), 11, 20),
    even = whole(of(7), 21, 30) == 1, start = number(of(7), 31, 43),
    interval = number(of(7), 44, 56),
    abscissa = whole(of(8), 1, 10), unit = words(of(9), 48, 67), label = words(of(9), 27, 46),
  }
end

local function skip_to_end(path, at)
  while true do
    local text, bytes, code = store.head(path, CHUNK, at)
    if not text then
      return nil, bytes, code
    end
    local first, last = text:find("\n    %-1[ ]*\r?\n", 1)
    if not first then
      first, last = text:find("\n    %-1[ ]*$", 1)
    end
    if first then
      return at + last
    elseif at + #text >= bytes then
      return bad(path, "has a dataset without an end")
    end
    at = at + #text - 16
  end
end

-- Behind the numbers stands the end of the dataset and nothing else; behind it is next.
local function end_behind(path, at, pattern)
  local text, bytes, code = store.head(path, 2048, at)
  if not text then
    return nil, bytes, code
  end
  local _, last = text:find("^" .. pattern .. "    %-1[ ]*\r?\n")
  if not last and at + #text == bytes then
    _, last = text:find("^" .. pattern .. "    %-1[ ]*$")
  end
  if not last then
    return bad(path, "has no end of the dataset behind its numbers, at byte %d", at)
  end
  return at + last
end

local sizes = { [2] = 4, [4] = 8 }
local shapes = { [2] = { width = 13, per_line = 6 }, [4] = { width = 20, per_line = 4 } }

-- Where a binary dataset's numbers lie and where it ends.
local function place_binary(path, set, line, at)
  local order, float = whole(line, 8, 13), whole(line, 14, 19)
  local lines, bytes = whole(line, 20, 31), whole(line, 32, 43)
  local size = sizes[set.kind_of_number]
  if order ~= 1 and order ~= 2 or float ~= 2 then
    return bad(path, "has binary data of byte order %s and float format %s; read are 1, 2 and 2",
      tostring(order), tostring(float))
  elseif lines ~= 11 or bytes ~= set.count * size then
    return bad(path, "claims %s lines and %s bytes for %d numbers of %d bytes", tostring(lines),
      tostring(bytes), set.count, size)
  end
  set.place = { at = at, step = size, bits = 8 * size, integer = false, big = order == 2 }
  return end_behind(path, at + bytes, "\r?\n?")
end

local function place_text(path, set, at)
  local shape = shapes[set.kind_of_number]
  local text, message, code = store.head(path, 1024, at)
  if not text then
    return nil, message, code
  end
  local stop = text:find("\n", 1, true) or #text + 1
  local lines = (set.count + shape.per_line - 1) // shape.per_line
  if stop > 1024 or lines > 1 and stop <= shape.width * shape.per_line then
    return bad(path, "has numbers that are not in %d columns of %d", shape.per_line, shape.width)
  end
  set.place = { at = at, width = shape.width, per_line = shape.per_line,
                line = math.max(stop, shape.width * shape.per_line + 1) }
  return end_behind(path, at + (lines - 1) * stop, "[^\n]*\n")
end

local function is_record(set)
  return (set.kind == 1 or set.kind == 0) and set.abscissa == 17 and sizes[set.kind_of_number]
end

-- One dataset from byte `at` on; where the next one starts, or nil at the end.
local function take_set(path, at, sets)
  local text, bytes, code = store.head(path, HEAD, at)
  if not text then
    return nil, bytes, code
  elseif text:find "^%s*$" then
    return nil
  end
  local lines, behind = take_lines(text, 2)
  if not lines or not lines[1]:find "^    %-1%s*$" then
    return bad(path, "has no dataset where one must start, at byte %d", at)
  elseif lines[2]:sub(1, 6) ~= "    58" then
    sets.skipped = sets.skipped + 1
    return skip_to_end(path, at + behind - 2)
  end
  lines, behind = take_lines(text, 13)
  local set = lines and header_of(lines)
  if not set or not set.count or set.count < 1 or not set.kind then
    return bad(path, "has a dataset 58 whose first records cannot be read, at byte %d", at)
  end
  local data = at + behind - 1
  if not is_record(set) then
    sets.skipped = sets.skipped + 1
    if lines[2]:sub(7, 7) == "b" then
      data = data + math.max(whole(lines[2], 32, 43) or 0, 0)
    end
    return skip_to_end(path, data - 1)
  elseif not set.even then
    return bad(path, "has a time function with uneven spacing; records are even")
  end
  sets[#sets + 1] = set
  set.is_binary = lines[2]:sub(7, 7) == "b"
  if set.is_binary then
    return place_binary(path, set, lines[2], data)
  end
  return place_text(path, set, data)
end

local function all_sets(path)
  local sets, at = { skipped = 0 }, 0
  while at do
    local message, code
    at, message, code = take_set(path, at, sets)
    if message then
      return nil, message, code
    elseif #sets + sets.skipped > MOST_SETS then
      return bad(path, "has more than %d datasets", MOST_SETS)
    end
  end
  if #sets == 0 then
    return bad(path, "holds no time function (%d other datasets)", sets.skipped)
  end
  for k, set in ipairs(sets) do
    if set.count ~= sets[1].count or set.interval ~= sets[1].interval
      or set.is_binary ~= sets[1].is_binary then
      return bad(path, "has time functions of different length, rate or coding (1 and %d)", k)
    end
  end
  return sets
end

-- Rates that are stored as this interval of six digits, as far as they are whole.
local function whole_rates(interval)
  local half = 0.5 * 10.0 ^ (math.floor(math.log(interval, 10)) - 5) * (1 + 1e-9)
  local low, high = math.ceil(1 / (interval + half)), math.floor(1 / (interval - half))
  return low, high
end

local function rate_of(path, set, asked)
  local interval = set.interval
  local told = fraction.try(words(set.id[4], 1, 80) and set.id[4]:match "^rate (%S+) S/s" or "")
  if not interval or not (interval > 1e-12) or interval > 1e9 then
    return bad(path, "has the sample interval %s", tostring(interval))
  end
  local rate = asked or told
  if rate then
    if math.abs(rate:number() * interval - 1) > 1e-5 then
      return nil, ("%s: states an interval of %s s; the rate %s S/s is another"):format(path,
        core.base.number_text(interval), tostring(rate)), "domain"
    end
    return rate
  end
  local low, high = whole_rates(interval)
  if low ~= high then
    return nil, ("%s: stores the interval in six digits (%s s), which does not say the rate; "
      .. "give rate"):format(path, core.base.number_text(interval)), "domain"
  end
  return fraction.new(low), "the only whole rate with this interval"
end

function M.open(path, options)
  local sets, message, code = all_sets(path)
  if not sets then
    return nil, message, code
  end
  local first, file = sets[1], { container = "universal", channels = {}, metadata = {} }
  file.rate, message, code = rate_of(path, first, options.rate)
  if not file.rate then
    return nil, message, code
  end
  file.metadata = { rate_from = message, skipped = sets.skipped > 0 and sets.skipped or nil,
                    first_time_s = first.start ~= 0 and first.start or nil,
                    date = words(first.id[3], 1, 80) }
  local start = first.id[5]:match "^start (%S+)"
  file.start_ns = start and time.read(start) or nil
  file.title = words(first.id[2], 1, 80)
  local places = {}
  for k, set in ipairs(sets) do
    places[k] = set.place
    file.channels[k] = { name = words(set.id[1], 1, 80) or set.node, unit = set.unit, factor = 1,
                         integer = false }
  end
  local open = first.is_binary and store.packed or store.columns
  file.feed, message, code = open(path, places, first.count)
  return file.feed and file, message, code
end

local function fit(text, most, what)
  text = text or "NONE"
  if #text > most or text:find "[^\32-\126]" then
    return nil, ("%s %q does not fit %d characters of ASCII"):format(what, text, most)
  end
  return text
end

local function decimals(x)
  return (("%13.5E"):format(x):gsub(",", "."))
end

-- The 13 lines in front of the data of channel k.
local function head_of(record, k, binary)
  local channel = record.channels[k]
  local name, problem = fit(channel.name, 80, "name")
  local title, title_problem = fit(record.title, 80, "title")
  local unit, unit_problem = fit(channel.unit, 20, "unit")
  if not (name and title and unit) then
    return nil, problem or title_problem or unit_problem
  end
  local start = record.start_ns and "start " .. time.text(record.start_ns) or "NONE"
  local mark = binary and ("b%6d%6d%12d%12d%6d%6d%12d%12d"):format(1, 2, 11, record.samples * 8, 0,
    0, 0, 0) or ""
  local lines = {
    "    -1", "    58" .. mark, name, title, "NONE", "rate " .. tostring(record.rate) .. " S/s",
    start,
    ("%5d%10d%5d%10d %-10s%10d%4d %-10s%10d%4d"):format(1, k, 0, 0, "NONE", k, 0, "NONE", 0, 0),
    ("%10d%10d%10d%s%s%s"):format(4, record.samples, 1, decimals(0),
      decimals(1 / record.rate:number()), decimals(0)),
  }
  for i, axis in ipairs { { 17, "Time", "s" }, { 0, "NONE", unit }, { 0, "NONE", "NONE" },
                          { 0, "NONE", "NONE" } } do
    lines[9 + i] = ("%10d%5d%5d%5d %-20s %-20s"):format(axis[1], 0, 0, 0, axis[2], axis[3])
  end
  return table.concat(lines, "\n") .. "\n"
end

local function put_numbers(draft, record, k, binary)
  for first = 1, record.samples, BLOCK do
    local blocks, message, code = record.source:read(first,
      math.min(BLOCK, record.samples - first + 1), { k })
    local done = blocks
    if blocks and binary then
      done, message, code = draft:frames(blocks, { bits = 64, integer = false })
    elseif blocks then
      done, message, code = draft:columns(blocks[1], 20, 12, 4)
    end
    if not done then
      return nil, message, code
    end
  end
  return true
end

function M.write(record, path, options)
  local binary = options.binary ~= false
  if record.samples > 999999999 then
    return nil, path .. ": dataset 58 holds at most 999999999 samples", "domain"
  end
  local draft <close>, message, code = store.draft(path)
  if not draft then
    return nil, message, code
  end
  for k = 1, #record.channels do
    local head, problem = head_of(record, k, binary)
    if not head then
      return nil, path .. ": " .. problem, "domain"
    end
    local done
    done, message, code = draft:put(head)
    if done then
      done, message, code = put_numbers(draft, record, k, binary)
    end
    if done then
      done, message, code = draft:put(binary and "\n    -1\n" or "    -1\n")
    end
    if not done then
      return nil, message, code
    end
  end
  return draft:finish()
end

return M
