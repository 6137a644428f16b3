--- Writing a whole file or nothing.
-- A regular file appears complete under its name or not at all: the bytes go to
-- a neighbour that is renamed at the end. What is no regular file (a device, a
-- pipe) is written directly.

local lfs = require "lfs"

local M = {}

local function refuse(path, why)
  return nil, tostring(path) .. ": " .. tostring(why), "io"
end

local function put(path, bytes)
  local file, why = io.open(path, "wb")
  if not file then
    return nil, why
  end
  local fine, message = file:write(bytes)
  local closed, last = file:close() -- a full disk may show only here
  if not fine or not closed then
    return nil, path .. ": " .. tostring(message or last)
  end
  return true
end

--- Whether a text can be the path of a file.
-- @param path string: the path
-- @return boolean: false for "" and for a path with a NUL byte
-- @usage
-- assert(not require("libration.report.file").is_path "a\0b")
function M.is_path(path)
  return type(path) == "string" and path ~= "" and not path:find("\0", 1, true)
end

--- Writes a file, whole or not at all.
-- @param path string: where to
-- @param bytes string: the contents
-- @return boolean: true; or nil, message, code ("io")
-- @usage
-- local ok, message, code = require("libration.report.file").write("/no/such/folder/x", "")
-- assert(ok == nil and code == "io" and message:find "/no/such/folder/x")
function M.write(path, bytes)
  if not M.is_path(path) then
    return refuse(("%q"):format(tostring(path)), "is not the path of a file")
  end
  local mode = lfs.attributes(path, "mode")
  if mode and mode ~= "file" then
    local fine, why = put(path, bytes)
    if not fine then
      return nil, why, "io"
    end
    return true
  end
  local part = string.format("%s.%08x.part", path, math.random(0, 0xffffffff))
  local fine, why = put(part, bytes)
  if fine then
    fine, why = os.rename(part, path)
  end
  if not fine then
    os.remove(part)
    return nil, (tostring(why):gsub(part:gsub("%W", "%%%0"), (path:gsub("%%", "%%%%")))), "io"
  end
  return true
end

--- Makes a folder, and those above it.
-- @param path string: the folder
-- @return boolean: true, also when it was there; or nil, message, code ("io")
-- @usage
-- assert(require("libration.report.file").folder ".")
function M.folder(path)
  if not M.is_path(path) then
    return refuse(("%q"):format(tostring(path)), "is not the path of a folder")
  end
  local built = path:sub(1, 1) == "/" and "/" or ""
  for name in path:gmatch "[^/]+" do
    built = built .. name
    if lfs.attributes(built, "mode") ~= "directory" then
      local fine, why = lfs.mkdir(built)
      if not fine and lfs.attributes(built, "mode") ~= "directory" then
        return refuse(built, why)
      end
    end
    built = built .. "/"
  end
  return true
end

return M
