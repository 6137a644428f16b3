--- Tables of text in columns that line up.
-- Widths are those of a terminal: a wide character takes two columns, a mark
-- that combines takes none, and what would move the cursor is shown as a
-- replacement character, so a hostile name can neither break a table nor steer
-- the terminal.

local M = {}

-- First and last code points of what takes two columns (Unicode 15, East Asian
-- Width W and F, in coarse blocks) and of what takes none.
local wide = {
  { 0x1100, 0x115F }, { 0x2E80, 0x303E }, { 0x3041, 0x33FF }, { 0x3400, 0x4DBF },
  { 0x4E00, 0x9FFF }, { 0xA000, 0xA4CF }, { 0xA960, 0xA97F }, { 0xAC00, 0xD7A3 },
  { 0xF900, 0xFAFF }, { 0xFE30, 0xFE6F }, { 0xFF00, 0xFF60 }, { 0xFFE0, 0xFFE6 },
  { 0x1F300, 0x1F64F }, { 0x1F680, 0x1F6FF }, { 0x1F900, 0x1F9FF }, { 0x20000, 0x3FFFD },
}
local none = {
  { 0x0300, 0x036F }, { 0x0483, 0x0489 }, { 0x0591, 0x05BD }, { 0x0610, 0x061A },
  { 0x064B, 0x065F }, { 0x1AB0, 0x1AFF }, { 0x1DC0, 0x1DFF }, { 0x200B, 0x200D },
  { 0x20D0, 0x20FF }, { 0xFE00, 0xFE0F }, { 0xFE20, 0xFE2F },
}
-- Controls, line separators, and marks that turn the direction of writing.
local steering = {
  { 0x00, 0x1F }, { 0x7F, 0x9F }, { 0x200E, 0x200F }, { 0x2028, 0x202E },
  { 0x2066, 0x2069 }, { 0xFEFF, 0xFEFF },
}

local function within(blocks, code)
  for _, block in ipairs(blocks) do
    if code >= block[1] and code <= block[2] then
      return true
    end
  end
  return false
end

local replacement = utf8.char(0xFFFD)

--- Text that is safe to print on one line of a terminal.
-- @param text string: any bytes
-- @return string: UTF-8; controls, and bytes that are no UTF-8, are U+FFFD
-- @usage
-- local safe = require("libration.report.table").safe
-- assert(safe "a\27[2Jb" == "a\u{FFFD}[2Jb" and safe "µm" == "µm")
function M.safe(text)
  local parts, at = {}, 1
  while at <= #text do
    local length, bad = utf8.len(text, at)
    local stop = length and #text or bad - 1
    for _, code in utf8.codes(text:sub(at, stop)) do
      parts[#parts + 1] = within(steering, code) and replacement or utf8.char(code)
    end
    if not length then
      parts[#parts + 1] = replacement
    end
    at = stop + 2
  end
  return table.concat(parts)
end

--- Columns that a text takes on a terminal.
-- @param text string: UTF-8 without controls
-- @return integer: columns
-- @usage
-- local width = require("libration.report.table").width
-- assert(width "µm" == 2 and width "温度" == 4 and width "e\u{301}" == 1)
function M.width(text)
  local total = 0
  for _, code in utf8.codes(text) do
    if code < 0x300 then
      total = total + 1
    elseif not within(none, code) then
      total = total + (within(wide, code) and 2 or 1)
    end
  end
  return total
end

-- A column lines up left, right, or on the decimal point.
local function split(cell, align)
  if align == "point" then
    local whole, rest = cell:match("^([^.e]*)(.*)$")
    return whole, rest
  elseif align == "right" then
    return cell, ""
  end
  return "", cell
end

local function measure(columns, rows)
  local before, after = {}, {}
  for i, column in ipairs(columns) do
    before[i], after[i] = 0, 0
    for _, row in ipairs(rows) do
      local left, right = split(row[i], column.align)
      before[i] = math.max(before[i], M.width(left))
      after[i] = math.max(after[i], M.width(right))
    end
  end
  return before, after
end

local function pad(count)
  return (" "):rep(math.max(count, 0))
end

local function cell_text(cell, align, before, after)
  local left, right = split(cell, align)
  return pad(before - M.width(left)) .. left .. right .. pad(after - M.width(right))
end

local function head_text(text, align, width)
  local room = width - M.width(text)
  if align == "left" or not align then
    return text .. pad(room)
  end
  return pad(room) .. text
end

local function line_of(cells, indent)
  return (pad(indent) .. table.concat(cells, "  ")):match("^(.-)%s*$")
end

--- Lays out a table.
-- @param columns table: list of { head=text, unit=text or nil, align="left",
-- "right" or "point" (on the decimal point) }
-- @param rows table: list of lists of texts, one for each column
-- @param indent integer: columns left free in front, default 0
-- @return table: lines of text without newlines; heads, units if any, a rule, rows
-- @usage
-- local layout = require("libration.report.table").layout
-- local lines = layout({ { head = "n" }, { head = "Hz", align = "point" } },
--   { { "a", "1.5" }, { "bc", "10.25" } })
-- assert(lines[3] == "a    1.5" and lines[4] == "bc  10.25")
function M.layout(columns, rows, indent)
  indent = indent or 0
  local safe = {}
  for r, row in ipairs(rows) do
    safe[r] = {}
    for i = 1, #columns do
      safe[r][i] = M.safe(row[i] or "")
    end
  end
  local before, after = measure(columns, safe)
  local heads, units, rule, any_unit = {}, {}, {}, false
  for i, column in ipairs(columns) do
    local unit = column.unit or ""
    any_unit = any_unit or unit ~= ""
    local width = math.max(M.width(column.head), M.width(unit), before[i] + after[i])
    local spare = width - before[i] - after[i]
    if column.align and column.align ~= "left" then
      before[i] = before[i] + spare
    else
      after[i] = after[i] + spare
    end
    heads[i] = head_text(column.head, column.align, width)
    units[i] = head_text(unit, column.align, width)
    rule[i] = ("-"):rep(width)
  end
  local lines = { line_of(heads, indent) }
  if any_unit then
    lines[2] = line_of(units, indent)
  end
  lines[#lines + 1] = line_of(rule, indent)
  for _, row in ipairs(safe) do
    local cells = {}
    for i, column in ipairs(columns) do
      cells[i] = cell_text(row[i], column.align, before[i], after[i])
    end
    lines[#lines + 1] = line_of(cells, indent)
  end
  return lines
end

--- Breaks a text into lines no wider than asked, at spaces.
-- @param text string: UTF-8
-- @param width integer: columns
-- @return table: lines
-- @usage
-- local wrap = require("libration.report.table").wrap
-- assert(table.concat(wrap("one two three", 8), "|") == "one two|three")
function M.wrap(text, width)
  local lines, line = {}, nil
  for word in M.safe(text):gmatch("%S+") do
    if line and M.width(line) + 1 + M.width(word) <= width then
      line = line .. " " .. word
    else
      lines[#lines + 1] = line
      line = word
    end
  end
  lines[#lines + 1] = line
  return lines
end

return M
