-- Data files, whole and damaged, and the trial that each must stand: it loads or
-- is refused, in bounded time and memory, and never ends in an error.

local parse = require("libration.load").parse

local M = {}

-- Invented for the tests; between them they use every field.
M.whole = { [[
-- a pump skid, invented for the tests
demand = {
  title = "Pümpe 4", unit = "m/s^2", averages = 2, coverage = 3, offset = "1 mm/s^2",
  noise = "60 um/s^2/rtHz", sensitivity = "100 mV/g",
  lines = {
    { name = "shaft", hz = 24.6, drift = "0.1 %", amplitude = { 0.05, 2, "m/s^2" },
      tolerance = "1 %", wander = "0.01 %" },
    { name = "vane", of = "shaft", times = "7/2", tolerance_hz = "0.1 Hz",
      sidebands = { by = "shaft", orders = "1..2", amplitude = "1..2 m/s^2 rms" } },
    { name = "bar", hz = "1.3776 kHz", orders = { 1, "3..4" }, tolerance = "0.1 dB" },
  },
  defaults = { amplitude = "0.01..0.3 m/s^2", tolerance = "2 mm/s^2", drift = "10 ppm" },
  interferers = { { name = "mains", hz = 50, drift = "0.2 Hz", orders = "1..20",
    amplitude = "20 mm/s^2" } },
}
digitizer = {
  clock = "12.288 MHz", divider = { 128, 65535 }, decimation = { 1, 2, 4 }, bits = 24,
  range = "5 V", memory = "4 Mi", timebase = "25 ppm", jitter = "2 ns", skew = "1 us",
  filter = { shape = "butterworth", order = 8, corner = "0.4 rate" }, channels = 4,
  aggregate = "400 kS/s", block = 16, samples = "64..65536", accuracy = "0.5 %", price = 80,
}
]], [[
digitizers = {
  { rates = { "8 kS/s", 44100, "48 kHz" }, filter = { shape = "points",
    points = { { "1 kHz", "-0.1 dB" }, { "20 kHz", "-80 dB" } }, flatness = "0.05 dB" } },
  { rate = "1..100 kS/s", rate_step = 10, noise = "50 nV/rtHz", filter = { shape = "elliptic",
    order = 7, corner = "20 kHz", ripple = "0.1 dB", stop = "80 dB" } },
  { clock = 1e7, pll = { multiply = "8..64", divide = { 1, 4 }, after = { 2, 4 },
    vco = "200..400 MHz" }, --[=[ x ]=] title = 'loop' };
}
]] }

local words = { "{", "}", ",", "=", '"', "'", "--", "--[[", "]]", "nil", "true", "function()",
  "1e999", "-0", "1e-320", "0/0", "1..1000", "1e18 Hz", "1/0 V", "..", "[1]",
  "[-9223372036854775808]", "\0", "\255", "\\", "\\x00", "é", "of", "hz", "lines", "os.exit()",
  ("9"):rep(400), "{{{{{{{{{{" }

local function splice(text, at, length, new)
  return text:sub(1, at - 1) .. new .. text:sub(at + length)
end

-- Kinds of damage, small ones first: each takes the text and a place in it.
local SMALL = 4
local damages = {
  function(text, at) return splice(text, at, 1, string.char(math.random(32, 126))) end,
  function(text, at) return splice(text, at, 1, string.char(math.random(0, 255))) end,
  function(text, at) return splice(text, at, 1, "") end,
  function(text, at)
    local first, last = text:find("[%d.]+", at)
    local number = math.random(2) == 1 and math.random(0) >> math.random(0, 63)
      or 2.0 ^ math.random(-1100, 1023)
    return first and splice(text, first, last - first + 1, tostring(number)) or text
  end,
  function(text, at) return text:sub(1, at) end,
  function(text, at) return splice(text, at, math.random(40), "") end,
  function(text, at) return splice(text, at, 0, text:sub(at, at + math.random(200))) end,
  function(text, at) return splice(text, at, math.random(0, 3), words[math.random(#words)]) end,
  function(text, at) return splice(text, at, 0, ("{"):rep(math.random(2000))) end,
  function(text, at) return splice(text, at, 0, ("9"):rep(math.random(3000))) end,
  function(text, at) return splice(text, at, 0, ("a"):rep(math.random(20000))) end,
  function(text, at) return splice(text, at, 0, ("1, "):rep(math.random(10000))) end,
}

--- A damaged copy of a whole file: mostly one small damage, up to five of any.
function M.damage(text)
  local small = math.random(2) == 1
  for _ = 1, small and 1 or math.random(5) do
    text = damages[math.random(small and SMALL or #damages)](text, math.random(#text + 1))
  end
  return text
end

-- Raises when the trial of one text takes more than a second of processor time
-- (where a sanitizer slows everything down: twenty).
local function within_time(text)
  local limit = os.clock() + (os.getenv("LBR_SLOWED") and 20 or 1)
  debug.sethook(function()
    if os.clock() > limit then
      error("a data file takes too long", 0)
    end
  end, "", 10000)
  local ok, data, reason, code = pcall(parse, text)
  debug.sethook()
  return ok, data, reason, code
end

--- Tries one text: it loads or is refused within a second and 64 MiB.
-- Returns "loaded" or "refused", and the MiB that it took.
function M.judge(text, number)
  local before = collectgarbage "count"
  collectgarbage "stop"
  local ok, data, reason, code = within_time(text)
  local grown = (collectgarbage "count" - before) / 1024
  collectgarbage "restart"
  local case = ("case %d (%d bytes): "):format(number, #text)
  assert(ok, case .. tostring(data))
  assert(data or type(reason) == "string" and code == "format", case .. "no reason")
  assert(data or #reason < 100000, case .. "endless reason")
  assert(grown < 64, ("%s%.1f MiB"):format(case, grown))
  return data and "loaded" or "refused", grown
end

--- Tries so many damaged files; equal seeds give equal files.
-- Returns how many were loaded and refused, and the most MiB that one took.
function M.try_many(count, seed)
  local seen = { loaded = 0, refused = 0, most = 0 }
  for i = 1, count do
    math.randomseed(seed, i)
    local outcome, grown = M.judge(M.damage(M.whole[i % #M.whole + 1]), i)
    seen[outcome], seen.most = seen[outcome] + 1, math.max(seen.most, grown)
  end
  return seen
end

return M
