--- The door to the plotting program gnuplot.
-- A plot is a list of commands with its data inline. It is drawn into a file of
-- our own, looked at for completeness, and only then put where it was asked
-- for. Text reaches the program in a form in which no byte has a meaning.

local base = require("libration.core").base
local file = require "libration.report.file"

local M = {}

local plain = "[%w ,.:;()/=_+%-]"

--- A text as gnuplot takes it literally.
-- @param text string: UTF-8 without NUL
-- @return string: in double quotes, every unusual byte in octal; or nil, message,
-- code ("format")
-- @usage
-- local quote = require("libration.report.gnuplot").quote
-- assert(quote "a`b" == [["a\140b"]] and quote "\0" == nil)
function M.quote(text)
  if not utf8.len(text) or text:find("\0", 1, true) then
    return nil, ("%q"):format(text) .. " cannot be drawn: it must be UTF-8 without NUL", "format"
  end
  return '"' .. text:gsub("[\1-\31\127]+", " "):gsub("[^\128-\255]", function(byte)
    return byte:find(plain) and byte or ("\\%03o"):format(byte:byte())
  end):gsub("[\128-\255]", function(byte)
    return ("\\%03o"):format(byte:byte())
  end) .. '"'
end

--- A number as gnuplot reads it.
-- @param value number: any
-- @return string: "NaN", which leaves a gap, for what is not finite
-- @usage
-- assert(require("libration.report.gnuplot").number(0.5) == "0.5")
function M.number(value)
  if value ~= value or value == math.huge or value == -math.huge then
    return "NaN"
  end
  return base.number_text(value + 0.0)
end

--- Inline data.
-- @param name string: of the data block, without "$"
-- @param rows table: list of lists of numbers
-- @return string: commands
-- @usage
-- local block = require("libration.report.gnuplot").block
-- assert(block("d", { { 1, 2.5 } }) == "$d << END_OF_DATA\n1 2.5\nEND_OF_DATA")
function M.block(name, rows)
  local lines = { "$" .. name .. " << END_OF_DATA" }
  for i, row in ipairs(rows) do
    local cells = {}
    for k, cell in ipairs(row) do
      cells[k] = type(cell) == "string" and cell or M.number(cell)
    end
    lines[i + 1] = table.concat(cells, " ")
  end
  lines[#lines + 1] = "END_OF_DATA"
  return table.concat(lines, "\n")
end

-- Kinds of output: the terminal for a size in points, and how a whole file ends.
local kinds = {
  png = {
    terminal = "pngcairo noenhanced size %d,%d background \"#ffffff\" font \"DejaVu Sans,11\"",
    scale = 1, complete = function(bytes)
      return bytes:sub(1, 8) == "\137PNG\r\n\26\n" and bytes:find("IEND", -8, true)
    end,
  },
  svg = {
    terminal = "svg noenhanced size %d,%d fixed background \"#ffffff\" font \"DejaVu Sans,11\"",
    scale = 1, complete = function(bytes)
      return bytes:find("</svg>%s*$")
    end,
  },
  txt = {
    terminal = "dumb noenhanced size %d,%d mono",
    scale = 1, complete = function(bytes)
      return #bytes > 0
    end,
  },
}

--- The kind of output that a path asks for by its ending.
-- @param path string: ending in .png, .svg or .txt
-- @return string: "png", "svg" or "txt"; or nil, message, code ("domain")
-- @usage
-- assert(require("libration.report.gnuplot").kind "a.SVG" == "svg")
function M.kind(path)
  local ending = type(path) == "string" and path:match("%.([^./]*)$")
  if ending and kinds[ending:lower()] then
    return ending:lower()
  end
  return nil, ("%q"):format(tostring(path)) .. ": a plot ends in .png, .svg or .txt", "domain"
end

local function read_whole(path)
  local handle = io.open(path, "rb")
  if not handle then
    return ""
  end
  local bytes = handle:read("a")
  handle:close()
  return bytes
end

-- Runs a script file; returns true, or nil and what the program said.
local function run(script)
  local pipe, why = io.popen("LC_ALL=C.UTF-8 gnuplot -d '" .. script .. "' 2>&1", "r")
  if not pipe then
    return nil, "gnuplot cannot be started: " .. why
  end
  local said = pipe:read("a") or ""
  local fine, _, status = pipe:close()
  if fine then
    return true
  elseif status == 127 then
    return nil, "gnuplot is not installed; scripts/setup installs it"
  end
  return nil, "gnuplot failed: " .. (said:match("[^\n]*error[^\n]*") or said:sub(1, 300))
end

--- Draws commands and returns the picture.
-- @param kind string: "png", "svg" or "txt"
-- @param commands table: list of texts, one command or block each
-- @param width integer: points, for txt columns
-- @param height integer: points, for txt rows
-- @return string: the bytes of the picture; or nil, message, code ("io")
-- @usage
-- local picture = require("libration.report.gnuplot").draw("txt", { "plot x" }, 60, 15)
-- assert(#picture > 0)
function M.draw(kind, commands, width, height)
  local script, picture = os.tmpname(), os.tmpname()
  local head = {
    "set encoding utf8",
    "set terminal " .. kinds[kind].terminal:format(width, height),
    "set output " .. M.quote(picture),
  }
  table.move(commands, 1, #commands, #head + 1, head)
  local text = table.concat(head, "\n") .. "\nunset output\n"
  local fine, message = file.write(script, text)
  if fine then
    fine, message = run(script)
  end
  local bytes = fine and read_whole(picture) or ""
  os.remove(script)
  os.remove(picture)
  if not fine then
    return nil, message, "io"
  elseif not kinds[kind].complete(bytes) then
    return nil, "gnuplot did not finish the picture: is the disk for temporary files full?", "io"
  end
  return bytes
end

--- Draws commands into a file, whole or not at all.
-- @param path string: ending in .png, .svg or .txt
-- @param commands table: list of commands
-- @param width integer: points, for txt columns
-- @param height integer: points, for txt rows
-- @return boolean: true; or nil, message, code
-- @usage
-- local _, message = require("libration.report.gnuplot").save("plot.doc", {}, 9, 9)
-- assert(message:find ".svg", 1, true)
function M.save(path, commands, width, height)
  local kind, message, code = M.kind(path)
  if not kind then
    return nil, message, code
  end
  local bytes
  bytes, message, code = M.draw(kind, commands, width, height)
  if not bytes then
    return nil, message, code
  end
  return file.write(path, bytes)
end

return M
