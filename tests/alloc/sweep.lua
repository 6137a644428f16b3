--- Lets every memory request of every scenario fail, one after the other.
--   make check-alloc [SCENARIOS="tests/alloc/samples_scenario.lua ..."]
-- A scenario is a file tests/alloc/NAME_scenario.lua that returns a name and a
-- function. The function does a piece of work with the library (which it
-- requires itself), checks what it got with assert, and is written so that a
-- refusal for lack of memory ends it: assert(core.room.f(...)) does that for
-- functions that return nil, message, code.
--
-- Two sweeps are made. In the first, the n-th request of the C core and all
-- later ones fail (n = 0, 1, 2 ... until a run meets no failure). In the
-- second, the requests of the Lua state itself fail. Each run has to end well
-- or with an error that speaks of memory, hold no block, file or Lua memory
-- afterwards that it did not hold before, and the run after it has to work.

local build = os.getenv("BUILD") or "build/alloc"
local MOST_STEPS = 600 -- of one sweep; longer ones are walked in strides

local lfs = require "lfs"

local function scenario_files()
  if arg[1] then
    return arg
  end
  local files = {}
  for name in lfs.dir("tests/alloc") do
    if name:match("_scenario%.lua$") then
      files[#files + 1] = "tests/alloc/" .. name
    end
  end
  table.sort(files)
  return files
end

local function load_scenario(path)
  local name, work = assert(loadfile(path))()
  if type(name) == "function" then
    name, work = work, name
  end
  assert(type(name) == "string" and type(work) == "function",
    path .. " must return a name and a function")
  return name, work
end

local function open_files()
  local count = 0
  for _ in lfs.dir("/proc/self/fd") do
    count = count + 1
  end
  return count
end

local function settle()
  collectgarbage()
  collectgarbage()
end

local function check(condition, ...)
  if not condition then
    error(string.format(...), 0)
  end
end

local function speaks_of_memory(message)
  return tostring(message):find("memory", 1, true) ~= nil
end

-- Requests of the C core fail from the n-th on.
local function sweep_core(work, alloc)
  local function once(n)
    alloc.fail_after(n)
    local ok, message = pcall(work)
    local failed, asked = alloc.failed(), alloc.asked()
    alloc.fail_after(-1)
    settle()
    return ok, message, failed, asked
  end
  local ok, message, _, asked = once(-1)
  check(ok, "fails without a failing allocator: %s", message)
  once(-1)
  local live, files = alloc.live(), open_files()
  local stride, steps, n = math.max(1, asked // MOST_STEPS), 0, 0
  while true do
    local failed
    ok, message, failed = once(n)
    steps = steps + 1
    check(ok or failed > 0, "request %d: fails although memory was there: %s", n, message)
    check(ok or speaks_of_memory(message), "request %d: not a clean error: %s", n, message)
    check(alloc.live() <= live, "request %d: %d blocks are still held", n, alloc.live() - live)
    check(open_files() == files, "request %d: %d files are still open", n, open_files() - files)
    if failed == 0 then
      break
    end
    n = n + stride
  end
  ok, message = once(-1)
  check(ok, "fails after the sweep: %s", message)
  return steps, asked
end

-- Requests of the Lua state fail from the n-th on (alloc_host.c has the table).
local function sweep_state(work, starved, alloc)
  local function requests()
    local low, high = 0, 1
    while select(3, starved.run(high, work)) > 0 do
      low, high = high, high * 2
    end
    while high - low > 1 do
      local middle = (low + high) // 2
      if select(3, starved.run(middle, work)) > 0 then
        low = middle
      else
        high = middle
      end
    end
    return high
  end
  local status, message = starved.run(-1, work)
  check(status == "ok", "fails without a failing allocator: %s", message)
  local asked = requests()
  settle()
  local live, files, used = alloc.live(), open_files(), starved.used()
  local stride, steps = math.max(1, asked // MOST_STEPS), 0
  for n = 0, asked - 1, stride do
    status, message = starved.run(n, work)
    steps = steps + 1
    settle()
    check(status ~= "error" or speaks_of_memory(message),
      "Lua request %d: not a clean error: %s", n, message)
    check(alloc.live() <= live, "Lua request %d: %d blocks are still held", n,
      alloc.live() - live)
    check(open_files() == files, "Lua request %d: files are still open", n)
  end
  status, message = starved.run(-1, work)
  check(status == "ok", "fails after the sweep: %s", message)
  settle()
  check(starved.used() - used < 65536, "the state grew by %d bytes", starved.used() - used)
  return steps, asked
end

local open = assert(package.loadlib(build .. "/libration/core.so", "luaopen_libration_alloc"))
local alloc = open()
local starved = rawget(_G, "starved")

-- The state's allocator can only be chosen by a host: run once more inside it.
if not starved then
  local words = { build .. "/host", arg[0] }
  table.move(arg, 1, #arg, 3, words)
  os.exit(os.execute(table.concat(words, " ")) == true)
end

local bad = 0
for _, path in ipairs(scenario_files()) do
  local name, work = load_scenario(path)
  for _, kind in ipairs { "core", "Lua" } do
    local sweep = kind == "core" and sweep_core or sweep_state
    local ok, steps, asked
    if kind == "core" then
      ok, steps, asked = pcall(sweep, work, alloc)
    else
      ok, steps, asked = pcall(sweep, work, starved, alloc)
    end
    alloc.fail_after(-1)
    if ok then
      print(("ok      %-12s %-5s %5d of %d requests"):format(name, kind, steps, asked))
    else
      bad = bad + 1
      print(("FAILED  %-12s %-5s %s"):format(name, kind, steps))
    end
  end
end
print(("%d of the sweeps failed"):format(bad))
os.exit(bad == 0)
