-- Damaged data files that still load, planned: each gives a plan, a refusal or an
-- error with a message, in bounded time and memory.

local damaged = require "tests.support.damaged_data"
local lb = require "libration"
local parse = require("libration.load").parse

local M = {}

-- Sources that plan quickly when whole. Invented for the tests.
M.whole = { [[
demand = { unit = "V", noise = "1 mV/rtHz",
  lines = { { name = "tone", hz = 100, drift = "0.1 %", amplitude = "0.5..1 V",
    tolerance = "1 %", tolerance_hz = "0.1 Hz" },
    { name = "third", of = "tone", times = 3, amplitude = "0.1 V", tolerance = "2 %" } },
  interferers = { { name = "x", hz = 770, drift = "0.2 %", amplitude = "50 mV",
    orders = "1..3" } },
}
digitizer = { clock = "1 MHz", divider = "200..2000", bits = 16, range = "2 V",
  filter = { shape = "butterworth", order = 6, corner = "0.4 rate" }, timebase = "25 ppm",
  memory = "1 Mi", jitter = "1 us", channels = 2, block = 16 }
]], [[
demand = { unit = "Pa", offset = "1 mPa", averages = 4, sensitivity = "50 mV/Pa",
  lines = { { name = "fan", hz = "24.6", wander = "0.01 %", amplitude = "1..2 Pa",
    tolerance = "0.1 dB", orders = "1..4" } } }
digitizer = { rate = "1..8 kS/s", rate_step = "500 S/s", noise = "50 nV/rtHz", range = "1 V",
  bits = 12, accuracy = "0.1 %", samples = "64..65536" }
]], [[
demand = { unit = "V", lines = {
  { name = "a", hz = 10.2e6, amplitude = "1 V", tolerance = "1 %" } } }
digitizer = { clock = "10 MHz", pll = { multiply = "8..64", divide = { 1, 4 }, after = { 4, 8 },
  vco = "200..400 MHz" }, filter = { shape = "points", points = { { "1 kHz", "-0.1 dB" },
  { "20 MHz", "-20 dB" } }, flatness = "0.05 dB" } }
]] }

-- A number changed to another of the same look: most such files still load.
local function other_number(text)
  local at = math.random(#text)
  local first, last = text:find("%d+%.?%d*", at)
  if not first then return text end
  local new = text:sub(first, last)
  if new:sub(-1) == "." then
    last, new = last - 1, new:sub(1, -2)
  end
  local kind = math.random(4)
  if kind == 1 then
    new = tostring(math.random(0, 9))
  elseif kind == 2 then
    new = new .. ("0"):rep(math.random(6))
  elseif kind == 3 then
    new = "0." .. ("0"):rep(math.random(0, 8)) .. new:gsub("%.", "")
  else
    new = tostring(math.random(1, 99999))
  end
  return text:sub(1, first - 1) .. new .. text:sub(last + 1)
end

local function damage(text)
  if math.random(6) == 1 then
    return damaged.damage(text)
  end
  for _ = 1, math.random(3) do text = other_number(text) end
  return text
end

local SECONDS = 10
local MEBIBYTES = 64

-- Memory of this process that is in use, MiB (statm counts pages of 4 KiB).
local function resident()
  local file = assert(io.open "/proc/self/statm")
  local _, pages = file:read("n", "n")
  file:close()
  return pages / 256
end

local function plan_text(text)
  local ok, data = pcall(parse, text)
  if not (ok and data and data.demand and data.digitizer) then
    return "refused file"
  end
  local fine, plan, refusal, code = pcall(lb.plan, data.demand, data.digitizer,
    { effort_s = 0.2, windows = { "hann", "hft70" } })
  if not fine then
    assert(type(plan) == "string" and not plan:find("attempt to", 1, true)
      and not plan:find("assertion", 1, true), tostring(plan))
    return "error"
  elseif plan then
    assert(plan.worst <= 1 and #tostring(plan) > 100)
    return "plan"
  end
  assert(type(code) == "string" and #tostring(refusal) > 0, tostring(refusal))
  return "refusal"
end

--- Plans one damaged file; equal seeds and numbers give equal files.
-- Returns a table: outcome ("refused file", "error", "refusal", "plan"), seconds
-- (processor), memory (MiB), text.
function M.try_one(number, seed)
  math.randomseed(seed, number)
  local text = damage(M.whole[number % #M.whole + 1])
  collectgarbage()
  local started, before = os.clock(), resident()
  local ok, outcome = pcall(plan_text, text)
  local seconds, memory = os.clock() - started, resident() - before
  local case = ("case %d of seed %d: "):format(number, seed)
  assert(ok, case .. tostring(outcome) .. "\n" .. text)
  assert(seconds < SECONDS or os.getenv "LBR_SLOWED", ("%s%.1f s\n%s"):format(case, seconds, text))
  local slowed = os.getenv "LBR_SLOWED" -- sanitizers take memory of their own
  assert(memory < MEBIBYTES or slowed, ("%s%.1f MiB\n%s"):format(case, memory, text))
  return { outcome = outcome, seconds = seconds, memory = memory, text = text }
end

--- Plans so many damaged files.
-- Returns how many ended in each way, and the longest time and most memory.
function M.try_many(count, seed)
  local seen = { ["refused file"] = 0, error = 0, refusal = 0, plan = 0, seconds = 0, memory = 0 }
  for number = 1, count do
    local one = M.try_one(number, seed)
    seen[one.outcome] = seen[one.outcome] + 1
    seen.seconds = math.max(seen.seconds, one.seconds)
    seen.memory = math.max(seen.memory, one.memory)
  end
  return seen
end

return M
