--- Data files that cannot do anything: reading and writing.
-- The grammar looks like Lua's table constructors but is read by a parser of
-- its own, so nothing in a file can be called, opened or looped:
--     -- a comment
--     demand = { title = "pump", lines = { { name = "shaft", hz = 24.6 } } }
-- Values are strings, numbers, true, false and tables of them; keys are names,
-- ["strings"] or [integers]. A file has at most 1 MiB, 32 levels and 100 000
-- entries.

local parser = require "libration.inert.parser"
local writer = require "libration.inert.writer"

local M = {}

-- Reasons that need no parser.
local function unfit(text)
  if #text > parser.MOST_BYTES then
    return ("the file has %d bytes or more; at most %d"):format(#text, parser.MOST_BYTES)
  end
  local bad = text:find "[%z\1-\8\11\12\14-\31\127]"
  if bad then
    return ("this is not text: byte %d is %d"):format(bad, text:byte(bad))
  end
  local _, broken = utf8.len(text)
  return broken and ("this is not UTF-8 text: byte %d is %d"):format(broken, text:byte(broken))
end

--- Reads the text of a data file.
-- @param text string: name = value assignments
-- @return table: name -> value; or nil, message with line:column of every
-- mistake, "format"
-- @usage
-- local inert = require "libration.inert"
-- assert(inert.read('demand = { hz = 24.6, "a" } -- note').demand.hz == 24.6)
-- local value, message, code = inert.read "x = os.exit()"
-- assert(value == nil and code == "format" and message:find "1:5")
function M.read(text)
  local reason = unfit(text)
  if reason then
    return nil, reason, "format"
  end
  text = text:gsub("^\239\187\191", "") -- a byte order mark
  local result, mistakes = parser.parse(text)
  if not result then
    return nil, table.concat(mistakes, "\n"), "format"
  end
  return result
end

--- Reads a data file.
-- @param path string: file name
-- @return table: name -> value; or nil, message, code ("io" for what the file
-- system refuses, "format" for what is wrong in the file)
-- @usage
-- local value, message, code = require("libration.inert").read_file "/no/such/file"
-- assert(value == nil and code == "io" and message:find "/no/such/file")
function M.read_file(path)
  local file, message = io.open(path, "rb")
  if not file then
    return nil, message, "io"
  end
  local text, problem = file:read(parser.MOST_BYTES + 1)
  file:close()
  if not text and problem then
    return nil, ("%s: %s"):format(path, problem), "io"
  end
  local result, reason, code = M.read(text or "")
  if not result then
    reason = path .. ":" .. reason:gsub("\n", "\n" .. path:gsub("%%", "%%%%") .. ":")
  end
  return result, reason, code
end

--- Writes a plain table as the text of a data file, always the same way.
-- Keys are sorted and numbers read back bit for bit; a fraction becomes its
-- text ("123/5"). Tables are read raw. Anything else, a table inside itself,
-- infinities and NaN raise an error that names the path.
-- @param data table: name -> value
-- @return string: what read() turns into an equal table
-- @usage
-- local inert = require "libration.inert"
-- local text = inert.write { a = { 1, 0.1, x = "y" } }
-- assert(text == 'a = { 1, 0.1, x = "y" }\n' and inert.read(text).a[2] == 0.1)
function M.write(data)
  return writer.write(data)
end

return M
