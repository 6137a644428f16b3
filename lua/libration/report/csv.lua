--- Tables as CSV (RFC 4180): one line a row, names in the first.
-- Numbers are the shortest text that reads back bit for bit, with a point in
-- any locale; cells that a spreadsheet might run as a formula get a leading
-- apostrophe.

local base = require("libration.core").base

local M = {}

local function cell(value)
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
  if text:find('[",\r\n]') then
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
