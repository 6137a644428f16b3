-- W1, W1b, W1c, W4, W7, W8: averages, single transforms, zooms, responses. A line makes its data
-- when it is first called, and keeps it.

local core = require "libration.core"
local lb = require "libration"

local function noise(n, seed)
  return lb.synth.noise { rate = 1, samples = n, seed = seed, density = 2 ^ 0.5 }
end

-- What is made once, when it is first asked for.
local function once(make)
  local made
  return function()
    made = made or { make() }
    return table.unpack(made)
  end
end

local long = once(function() return noise(1 << 26, 1) end)

local function averaged(segment)
  return function()
    lb.survey.density(long(), { rate = 48000, segment = segment, detrend = "mean" })
  end
end

-- A file of 2^27 samples of 16 bits, a quarter of W1c, as wav_file.py makes it; without a name as
-- soon as it is open.
local file = once(function()
  local path, bytes = os.tmpname(), 1 << 28
  local out = assert(io.open(path, "wb"))
  out:write(string.pack("<c4I4c4c4I4I2I2I4I4I2I2c4I4", "RIFF", 36 + bytes, "WAVE", "fmt ", 16, 1, 1,
    48000, 96000, 2, 16, "data", bytes))
  local part = {}
  for i = 1, 1 << 16 do part[i] = string.pack("<i2", i * 7919 % 60000 - 30000) end
  local block = table.concat(part)
  for _ = 1, bytes // #block do out:write(block) end
  out:close()
  local record = assert(lb.record.open(path))
  os.remove(path)
  return record
end)

local function averaged_file()
  assert(lb.survey.density(file(), { segment = 8192, detrend = "mean" }))
end

-- A transform whose object and blocks are there.
local function single(n)
  local ready = once(function()
    return core.spectrum.single(n), noise(n, 2), lb.window("hann"):samples(n),
      lb.samples.new(n // 2 + 1), lb.samples.new(n // 2 + 1)
  end)
  return function()
    local t, x, w, re, im = ready()
    t:run(x, w, re, im)
  end
end

local zoom_data = once(function()
  return noise(1 << 20, 3), core.spectrum.zoom(1 << 20, 0.1234567, 0.0005 / 4096, 4096)
end)

local pair = once(function()
  local x = noise(1 << 24, 4)
  return x, x + noise(1 << 24, 5)
end)

local function respond()
  local x, y = pair()
  local a = lb.survey.averages({ x, y }, { rate = 48000, segment = 4096, detrend = "mean",
    cross = true })
  a:response(1, 2, { estimate = "h1" })
end

return {
  { name = "W1 average", work = "2^26 samples, segments of 8192", ours = averaged(8192),
    peer = "w1_script.py", goal = 0.12 },
  { name = "W1 average, tuned", work = "the same beside chunks and threads",
    ours = averaged(8192), peer = "w1_tuned.py", goal = 0.12 },
  { name = "W1b average", work = "segments of 65536", ours = averaged(65536),
    peer = "w1b_script.py", goal = 0.18 },
  { name = "W1b average, tuned", work = "the same beside chunks and threads",
    ours = averaged(65536), peer = "w1b_tuned.py", goal = 0.18 },
  { name = "W1c average of a file", work = "2^27 samples of 16 bits", ours = averaged_file,
    peer = "w1c_script.py", goal = 0.125 },
  { name = "W4 single", work = "50000 samples", ours = single(50000), times = 50,
    peer = "w4_script.py", goal = 0.12e-3 },
  { name = "W4 single, prime", work = "1000003 samples", ours = single(1000003),
    peer = "w4_1000003.py", goal = 0.025 },
  { name = "W4 single, long", work = "2^24 samples", ours = single(1 << 24),
    peer = "w4_16777216.py", goal = 0.07 },
  { name = "W7 zoom", work = "2^20 samples, 4096 points",
    goal = 1.5e-3, times = 10, peer = "w7_script.py", peer_times = 1,
    ours = function()
      local x, z = zoom_data()
      z:run(x)
    end },
  { name = "W7 zoom, cold", work = "the same with its planning", goal = nil, times = 5,
    peer = "w7_script.py", peer_times = 1,
    ours = function()
      lb.spectrum.zoom(zoom_data(), { rate = 1, first_hz = 0.1234567, step_hz = 0.0005 / 4096,
        points = 4096 })
    end },
  { name = "W8 response", work = "2 channels of 2^24, segments of 4096", ours = respond,
    peer = "w8_script.py", goal = 0.065 },
}
