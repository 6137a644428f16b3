-- W10, sound files: a quarter of a GiB of 16-bit samples, read in blocks into
-- doubles and looked through for their range. The file is in memory already.

local store = require("libration.core").store

local FRAMES = 1 << 27
local BLOCK = 65536

-- Sample i is (i * 7919) mod 60000 - 30000; the pattern repeats within a block.
local function make_file()
  local path = os.tmpname()
  local file = assert(io.open(path, "wb"))
  file:write(string.pack("<c4I4c4c4I4I2I2I4I4I2I2c4I4", "RIFF", 36 + 2 * FRAMES, "WAVE", "fmt ", 16,
    1, 1, 48000, 96000, 2, 16, "data", 2 * FRAMES))
  local codes = {}
  for i = 1, BLOCK do codes[i] = string.pack("<i2", i * 7919 % 60000 - 30000) end
  local block = table.concat(codes)
  for _ = 1, FRAMES // BLOCK do file:write(block) end
  file:close()
  return path
end

local sound

-- The name is removed at once: the file lives as long as it is open.
local function opened()
  if not sound then
    local path = make_file()
    sound = assert(store.open(path))
    os.remove(path)
  end
  return sound
end

local function read_blocks(work)
  return function()
    local blocks
    opened():seek(0)
    for _ = 1, FRAMES // BLOCK do
      blocks = assert(sound:read(BLOCK, nil, blocks))
      work(blocks[1])
    end
  end
end

return {
  { name = "W10 WAV blocks", work = "read 256 MiB of int16 WAV as doubles", goal = 0.11 / 4,
    ours = read_blocks(function() end), peer = "w10_wav.py" },
  { name = "W10 WAV range", work = "the same, and its range and rails", peer = "w10_range.py",
    ours = read_blocks(function(x) store.rails(x, -32768, 32767) end) },
}
