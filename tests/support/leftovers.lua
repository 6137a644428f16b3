--- What a test may not leave behind: new globals, another directory, files.
-- `watch` remembers how things stand; the function it returns gives one
-- sentence about what has changed since, or nil.

local lfs = require "lfs"

local M = {}

-- Names that may stand at the top of the tree or come and go beside the code.
local ignored = { ["."] = true, [".."] = true, [".git"] = true, build = true }

local function list(folder, names)
  for name in lfs.dir(folder) do
    if not ignored[name] then
      local path = folder .. "/" .. name
      names[path] = true
      if lfs.symlinkattributes(path, "mode") == "directory" then
        list(path, names)
      end
    end
  end
  return names
end

local function added(before, now, describe)
  local new = {}
  for key in pairs(now) do
    if before[key] == nil then
      new[#new + 1] = describe:format(tostring(key))
    end
  end
  table.sort(new)
  return new
end

local function copy_keys(t)
  local keys = {}
  for key in next, t do
    keys[key] = true
  end
  return keys
end

--- Files of the tree (build output left out) as a set of paths.
function M.files(root)
  return list(root or ".", {})
end

--- Remembers globals and directory; the result says what has changed since.
function M.watch()
  local globals, directory = copy_keys(_G), lfs.currentdir()
  return function()
    local found = added(globals, _G, "new global %s")
    if lfs.currentdir() ~= directory then
      found[#found + 1] = "working directory is now " .. tostring(lfs.currentdir())
      lfs.chdir(directory)
    end
    globals = copy_keys(_G)
    return found[1] and table.concat(found, "; ") or nil
  end
end

--- Remembers the files of the tree; the result lists the ones that came since.
function M.watch_files(root)
  local before = M.files(root)
  return function()
    return added(before, M.files(root), "%s")
  end
end

return M
