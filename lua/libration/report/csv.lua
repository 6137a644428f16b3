--- Tables as CSV (RFC 4180): one line a row, names in the first.
-- Numbers are the shortest text that reads back bit for bit, with a point in
-- any locale; cells that a spreadsheet might run as a formula get a leading
-- apostrophe.

local base = require("libration.core").base

local M = {}

-- Bare words by which numbers that are not finite are written.
local odd = { inf = math.huge, ["-inf"] = -math.huge, nan = 0 / 0, ["-nan"] = 0 / 0 }

-- A cell; with `told`, text that would be read as a number is in quotes.
local function cell(value, told)
  if value == nil then
    return ""
  elseif type(value) == "number" then
    return base.number_text(value)
  elseif base.is_fraction(value) then
    return base.number_text(value:number())
  end
  local text = tostring(value)
  if text:find("^[=+%-@\t\r]") then
    text = "'" .. text
  end
  if text:find('[",\r\n]') or told and (tonumber(text) or odd[text]) then
    text = '"' .. text:gsub('"', '""') .. '"'
  end
  return text
end

--- Writes rows as CSV.
-- @param names table: list of the columns
-- @param rows table: list of tables by these names
-- @return string: lines ended by CR LF, the names first
-- @usage
-- local csv = lb.report.csv.rows({ "name", "hz" }, { { name = 'a "b"', hz = 0.1 } })
-- assert(csv == 'name,hz\r\n"a ""b""",0.1\r\n')
function M.rows(names, rows)
  local lines = { table.concat(names, ",") }
  for i, row in ipairs(rows) do
    local cells = {}
    for k, name in ipairs(names) do
      cells[k] = cell(row[name])
    end
    lines[i + 1] = table.concat(cells, ",")
  end
  return table.concat(lines, "\r\n") .. "\r\n"
end

--- Writes heads and rows of cells as CSV.
-- @param heads table: list of texts, a column each
-- @param rows table: list of lists of cells; nil is an empty one
-- @return string: lines ended by CR LF, the heads first
-- @usage
-- assert(lb.report.csv.cells({ "a (V)" }, { { 0.5 } }) == "a (V)\r\n0.5\r\n")
function M.cells(heads, rows)
  local lines, first = {}, {}
  for k, head in ipairs(heads) do first[k] = cell(head, true) end
  lines[1] = table.concat(first, ",")
  for i, row in ipairs(rows) do
    local cells = {}
    for k = 1, #heads do cells[k] = cell(row[k], true) end
    lines[i + 1] = table.concat(cells, ",")
  end
  return table.concat(lines, "\r\n") .. "\r\n"
end

local function value_of(text, quoted)
  if quoted then return text end
  return tonumber(text) or odd[text] or text
end

-- The cell that begins at a place: its value, and the place after it.
local function read_cell(text, at)
  if text:sub(at, at) ~= '"' then
    local stop = text:find("[,\r\n]", at) or #text + 1
    return value_of(text:sub(at, stop - 1)), stop
  end
  local from, parts = at + 1, {}
  while true do
    local stop = text:find('"', from, true)
    if not stop then return nil end
    parts[#parts + 1] = text:sub(from, stop - 1)
    if text:sub(stop + 1, stop + 1) ~= '"' then
      return value_of(table.concat(parts), true), stop + 1
    end
    parts[#parts + 1], from = '"', stop + 2
  end
end

--- Reads CSV (RFC 4180) that this library wrote.
-- @param text string: lines ended by CR LF or LF
-- @return table: list of rows, lists of cells, the heads first: numbers as numbers, the rest as
--   text ("" where nothing is); or nil, message, code ("format") for a quote that does not end
-- @usage
-- local rows = lb.report.csv.read(lb.report.csv.cells({ "a,b", "c" }, { { 0.1, nil } }))
-- assert(rows[1][1] == "a,b" and rows[2][1] == 0.1 and rows[2][2] == "")
function M.read(text)
  local rows, row, at = {}, {}, 1
  while at <= #text do
    local value, stop = read_cell(text, at)
    if value == nil then
      return nil, ("csv: the quote of row %d, cell %d does not end"):format(#rows + 1, #row + 1),
        "format"
    end
    row[#row + 1] = value
    local mark = text:sub(stop, stop)
    if mark == "," and stop == #text then row[#row + 1] = "" end
    at = stop + (text:sub(stop, stop + 1) == "\r\n" and 2 or 1)
    if mark ~= "," then rows[#rows + 1], row = row, {} end
  end
  if #row > 0 then rows[#rows + 1] = row end
  return rows
end

local line_names = {
  "name", "hz", "bin", "least", "most", "tolerance", "error", "ratio", "systematic", "random",
  "hz_error", "tolerance_hz", "hz_ratio",
}

--- The lines of a plan as CSV.
-- @param plan table: a plan
-- @return string: name, hz, bin, then amplitudes and errors in the demand's unit
-- @usage
-- assert(lb.report.csv.plan { lines = { { name = "a", hz = 50 } } }:find("a,50,", 1, true))
function M.plan(plan)
  return M.rows(line_names, plan.lines)
end

return M
