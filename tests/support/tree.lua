--- Files of this tree, for the scripts that check it.

local lfs = require "lfs"

local M = {}

--- Whole text of a file; raises when it cannot be read.
function M.read(path)
  local file = assert(io.open(path, "rb"))
  local text = assert(file:read("a"))
  file:close()
  return text
end

local function walk(folder, pattern, found)
  for name in lfs.dir(folder) do
    local path = folder .. "/" .. name
    if lfs.attributes(path, "mode") == "directory" then
      if not name:match("^%.") and name ~= "build" then
        walk(path, pattern, found)
      end
    elseif name:match(pattern) then
      found[#found + 1] = path
    end
  end
  return found
end

--- Paths below a folder whose last part matches a pattern, sorted.
function M.files(folder, pattern)
  if lfs.attributes(folder, "mode") ~= "directory" then
    return {}
  end
  local found = walk(folder, pattern, {})
  table.sort(found)
  return found
end

--- Lines of a text without their ends.
function M.lines(text)
  local lines = {}
  for line in (text .. (text:match("\n$") and "" or "\n")):gmatch("(.-)\r?\n") do
    lines[#lines + 1] = line
  end
  return lines
end

--- Prints complaints, then says what was looked at; the exit status.
function M.verdict(name, complaints, looked_at)
  for _, text in ipairs(complaints) do
    io.stderr:write(text, "\n")
  end
  io.write(("%s: %s, %d complaint%s\n"):format(
    name, looked_at, #complaints, #complaints == 1 and "" or "s"))
  return #complaints == 0
end

return M
