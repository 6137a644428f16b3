--- Runs spec files side by side, one busted each, and adds up their results.
--   lua5.4 tests/support/suite.lua [-j N] [-l folder] [file or folder ...]
-- A file that takes its interpreter down counts as one failure by name. The
-- words in BUSTED_FLAGS go to every busted; LUA names the interpreter and what
-- stands before it ("valgrind ... lua5.4"). Last line: totals.

local lfs = require "lfs"

local function fail(...)
  io.stderr:write("suite: ", ...)
  io.stderr:write("\n")
  os.exit(2)
end

local function parse(words)
  local options = { jobs = nil, roots = {} }
  local i = 1
  while words[i] do
    if words[i] == "-j" then
      i = i + 1
      options.jobs = math.tointeger(words[i]) or fail("-j takes a whole number")
    else
      options.roots[#options.roots + 1] = words[i]
    end
    i = i + 1
  end
  if not options.roots[1] then
    options.roots = { "tests" }
  end
  return options
end

-- Spec files below a path; tests/long only when it is asked for.
local function collect(path, files)
  local mode = lfs.attributes(path, "mode") or fail("no such file: ", path)
  if mode ~= "directory" then
    files[#files + 1] = path
    return files
  end
  for name in lfs.dir(path) do
    local below = path .. "/" .. name
    if name:match("_spec%.lua$") then
      files[#files + 1] = below
    elseif not name:match("^%.") and below ~= "tests/long"
        and lfs.attributes(below, "mode") == "directory" then
      collect(below, files)
    end
  end
  return files
end

local function read_all(path)
  local file = io.open(path, "r")
  if not file then
    return nil
  end
  local text = file:read("a")
  file:close()
  return text
end

local function quote(text)
  return "'" .. text:gsub("'", "'\\''") .. "'"
end

local out = (os.getenv("BUILD") or "build") .. "/test/"

local function result_base(file)
  return out .. file:gsub("[/%s]", "-"):gsub("%.lua$", "")
end

-- One shell line a file: run it, keep what it prints, say so when it is done.
local function command(file)
  local base = result_base(file)
  local busted = ("LBR_RESULT=%s.result %s /usr/bin/busted %s %s"):format(
    base, os.getenv("LUA") or "lua5.4", os.getenv("BUSTED_FLAGS") or "", quote(file))
  return ("%s >%s.out 2>&1; echo $? >%s.code; grep -a ' s  ' %s.out || echo '   ended  '%s"):format(
    busted, base, base, base, quote(file))
end

local function run(files, jobs)
  os.execute("mkdir -p " .. quote(out))
  local list = {}
  for i, file in ipairs(files) do
    local base = result_base(file)
    os.remove(base .. ".result")
    os.remove(base .. ".code")
    list[i] = command(file)
  end
  local pipe = assert(io.popen(("xargs -0 -P %d -n 1 sh -c"):format(jobs), "w"))
  pipe:write(table.concat(list, "\0"), "\0")
  pipe:close()
end

-- The three numbers of one file; a run without a result is one failure.
local function outcome(file)
  local base = result_base(file)
  local result = read_all(base .. ".result")
  local code = tonumber(read_all(base .. ".code") or "") or -1
  local printed = read_all(base .. ".out") or ""
  local passed, failed, skipped = (result or ""):match("(%d+) passed, (%d+) failed, (%d+)")
  if not passed then
    return 0, 1, 0, ("FAILED %s\nended without a result, exit status %d%s\n%s"):format(
      file, code, code > 128 and " (signal " .. code - 128 .. ")" or "", printed)
  end
  passed, failed, skipped = tonumber(passed), tonumber(failed), tonumber(skipped)
  if failed == 0 and code ~= 0 then
    failed = 1
    printed = ("FAILED %s\nexit status %d after its tests had passed\n%s"):format(
      file, code, printed)
  end
  return passed, failed, skipped, failed + skipped > 0 and printed or nil
end

local function cores()
  local pipe = io.popen("nproc", "r")
  local count = pipe and pipe:read("n")
  if pipe then
    pipe:close()
  end
  return count or 1
end

local options = parse(arg)
local files = {}
for _, root in ipairs(options.roots) do
  collect(root, files)
end
table.sort(files)
run(files, options.jobs or cores())

local total = { 0, 0, 0 }
for _, file in ipairs(files) do
  local passed, failed, skipped, printed = outcome(file)
  total = { total[1] + passed, total[2] + failed, total[3] + skipped }
  if printed then
    io.write("\n== ", file, "\n", printed)
  end
end
print(("%d passed, %d failed, %d skipped"):format(table.unpack(total)))
os.exit(total[2] == 0 and total[1] > 0)
