--- Times our work against a script's, in turns, in one session.
--   make bench                     all lines
--   make bench BENCH="W9 W2"       lines whose name starts with one of these
-- A file tests/bench/NAME_bench.lua returns a list of lines:
--   { name  = "W9 import",         what the line is called (W number first)
--     work  = "require, fresh state",          what is done, in a few words
--     ours  = function() ... end,  does the work once and returns nothing, or
--                                  the seconds if it has to take the time itself
--     peer  = "w9_import.py",      script in tests/bench/peer/, or nil
--     limit = function() ... end or seconds,   the least time thinkable, or nil
--     goal  = seconds,             what we want to stay under, or nil
--     times = 1,                   repetitions inside one reading (a short work)
--     peer_times = times }         the same for the script
-- A peer is a Python script that imports tests/bench/peer/turns.py and calls
-- serve(work): it stays up, does the work each time it is told "go" and answers
-- with its seconds, so that imports and first calls are not counted. Ours is
-- called once before the clock counts, too. Each line takes RUNS (5) readings
-- of ours, peer and limit in turns; medians are shown, ratios are peer / ours
-- and ours / limit.

local clock = require("libration.core").base.clock
local lfs = require "lfs"

local RUNS = tonumber(os.getenv("RUNS") or "") or 5
local PYTHON = "/usr/bin/python3"

local function median(list)
  table.sort(list)
  local n = #list
  return n > 0 and (list[(n + 1) // 2] + list[n // 2 + 1]) / 2 or nil
end

-- Seconds of one go, however the work tells them.
local function time_of(work, times)
  local started = clock()
  local told
  for _ = 1, times do
    told = work()
  end
  return (type(told) == "number" and told or clock() - started) / times
end

local Peer = {}
Peer.__index = Peer

-- Two named pipes: popen gives one direction, and answers have to come back.
local function start_peer(script)
  local path = os.tmpname()
  os.remove(path)
  assert(os.execute("mkfifo " .. path))
  local to = assert(io.popen(("%s -B tests/bench/peer/%s >%s"):format(PYTHON, script, path), "w"))
  local from = assert(io.open(path, "r"))
  os.remove(path)
  to:setvbuf("line")
  return setmetatable({ to = to, from = from, script = script }, Peer)
end

function Peer:go(times)
  self.to:write("go ", times, "\n")
  self.to:flush()
  local answer = self.from:read("n")
  return answer or error("the peer " .. self.script .. " gave no answer", 0)
end

function Peer:stop()
  self.to:close()
  self.from:close()
end

local function seconds(value)
  if not value then
    return "-"
  elseif value < 1e-6 then
    return ("%.0f ns"):format(value * 1e9)
  elseif value < 1e-3 then
    return ("%.3g us"):format(value * 1e6)
  elseif value < 1 then
    return ("%.3g ms"):format(value * 1e3)
  end
  return ("%.3g s"):format(value)
end

local function ratio(over, under)
  return over and under and under > 0 and ("%.3g"):format(over / under) or "-"
end

local function measure(line)
  local times = line.times or 1
  local peer = line.peer and start_peer(line.peer)
  local limit_runs = type(line.limit) == "function"
  local ours, peers, limits = {}, {}, {}
  line.ours()
  if peer then
    peer:go(1)
  end
  for i = 1, RUNS do
    ours[i] = time_of(line.ours, times)
    peers[i] = peer and peer:go(line.peer_times or times)
    limits[i] = limit_runs and time_of(line.limit, times) or nil
  end
  if peer then
    peer:stop()
  end
  return median(ours), median(peers), limit_runs and median(limits) or line.limit or nil
end

local function wanted(name)
  if not arg[1] then
    return true
  end
  for _, word in ipairs(arg) do
    if name:sub(1, #word) == word then
      return true
    end
  end
  return false
end

local function bench_files()
  local files = {}
  for name in lfs.dir("tests/bench") do
    if name:match("_bench%.lua$") then
      files[#files + 1] = "tests/bench/" .. name
    end
  end
  table.sort(files)
  return files
end

local row = "%-22s %10s %10s %10s %10s %8s %8s  %s"
print(("medians of %d readings in turns, %d cores"):format(
  RUNS, require("libration.core").base.cores()))
print(row:format("line", "ours", "script", "limit", "goal", "script/", "ours/", "work"))
print(row:format("", "", "", "", "", "ours", "limit", ""))
local missed = 0
for _, path in ipairs(bench_files()) do
  for _, line in ipairs(dofile(path)) do
    if wanted(line.name) then
      local ours, peer, limit = measure(line)
      local over = line.goal and ours > line.goal
      missed = missed + (over and 1 or 0)
      print(row:format(line.name, seconds(ours), seconds(peer), seconds(limit),
        seconds(line.goal), ratio(peer, ours), ratio(ours, limit),
        (line.work or "") .. (over and "  (over the goal)" or "")))
      io.flush()
    end
  end
end
print(missed == 0 and "all goals met" or missed .. " goals missed")
