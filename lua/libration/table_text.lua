--- Columns of text that line up, for everything that people read.

local M = {}

local function width(text)
  return utf8.len(text) or #text
end

--- Lays out rows in columns: the first one to the left, the others to the right.
-- @param rows table: list of lists of strings (or numbers), the first the heading
-- @param indent string: put before every row, default ""
-- @return string: lines joined by newlines, without one at the end
-- @usage
-- local layout = require("libration.table_text").layout
-- assert(layout { { "line", "Hz" }, { "shaft", "24.6" } } == "line     Hz\nshaft  24.6")
function M.layout(rows, indent)
  local widths, lines = {}, {}
  for _, row in ipairs(rows) do
    for i, cell in ipairs(row) do
      widths[i] = math.max(widths[i] or 0, width(tostring(cell)))
    end
  end
  for _, row in ipairs(rows) do
    local cells = {}
    for i, cell in ipairs(row) do
      cell = tostring(cell)
      local blanks = (" "):rep(widths[i] - width(cell))
      cells[i] = i == 1 and cell .. blanks or blanks .. cell
    end
    lines[#lines + 1] = (indent or "") .. table.concat(cells, "  "):gsub("%s+$", "")
  end
  return table.concat(lines, "\n")
end

return M
