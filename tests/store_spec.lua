local core = require "libration.core"
local lfs = require "lfs"
local sounds = dofile "tests/support/sounds.lua"

local store = core.store
local front = sounds.of_package("alsa-utils", "/Front_Center.wav")

after_each(sounds.clean)

local function read_all(path, channels)
  local sound <close> = assert(store.open(path))
  return assert(sound:read(sound:facts().frames, channels)), sound:facts()
end

local function digests(blocks)
  local out = {}
  for k, block in ipairs(blocks) do out[k] = store.digest(block) end
  return table.concat(out, " ")
end

local function refused(path, code, pattern)
  local sound, message, got = store.open(path)
  assert.is_nil(sound)
  assert.equal(code, got)
  assert.truthy(message:find(path, 1, true) and message:find(pattern), message)
end

describe("installed sound files", function()
  -- Facts of the package's own file, as sndfile-info and od show them.
  it("gives the codes of a 16-bit WAV", function()
    local blocks, facts = read_all(front)
    assert.same({ container = "wav", rate = 48000, channels = 1, bits = 16, integer = true,
                  lossy = false, full_scale = 32768, frames = 68545 }, facts)
    local rails = store.rails(blocks[1], -32768, 32767)
    assert.equal(-15487, rails.least)
    assert.equal(13448, rails.most)
    assert.equal(0, rails.low + rails.high + rails.bad)
  end)

  it("gives floats of Ogg Vorbis", function()
    for name, frames in pairs { calling = 9505, busy = 23078 } do
      local path = sounds.of_package("sound-theme-freedesktop",
        "/phone-outgoing-" .. name .. ".oga")
      local blocks, facts = read_all(path)
      assert.same({ container = "ogg", rate = 8000, channels = 1, bits = 0, integer = false,
                    lossy = true, full_scale = 1, frames = frames }, facts)
      assert.equal(frames, #blocks[1])
      local rails = store.rails(blocks[1], -1, 1)
      assert.is_true(rails.most > 0.1 and rails.most < 1 and rails.least < -0.1)
    end
  end)
end)

describe("sox and libsndfile formats", function()
  local kinds = {
    { ".wav", "-b 8 -e unsigned", "wav", 8 }, { ".wav", "-b 16", "wav", 16 },
    { ".wav", "-b 24", "wav", 24 }, { ".wav", "-b 32 -e signed", "wav", 32 },
    { ".flac", "-b 16", "flac", 16 }, { ".flac", "-b 24", "flac", 24 },
    { ".w64", "-b 24", "w64", 24 },
  }

  it("reads the facts that soxi reads, and the same codes from each container", function()
    for _, kind in ipairs(kinds) do
      local path = sounds.temporary(kind[1])
      sounds.sox("-R -r 51200 -n %s -c 3 %s synth 4801s sine 997 sine 331 noise gain -3",
        kind[2], path)
      local blocks, facts = read_all(path)
      local soxi = sounds.soxi(path)
      assert.equal(kind[3], facts.container)
      assert.same({ 51200, 3, 4801, kind[4] },
        { facts.rate, facts.channels, facts.frames, facts.bits })
      assert.same({ soxi.rate, soxi.channels, soxi.frames }, { 51200, 3, 4801 })
      local raw = sounds.temporary ".raw"
      sounds.sox("%s -b 32 -e signed %s", path, raw)
      local text = sounds.bytes(raw)
      local least = math.huge
      for i = 0, 4800 do
        least = math.min(least, (string.unpack("<i4", text, 12 * i + 1)))
      end
      assert.equal(least // (1 << (32 - kind[4])), store.rails(blocks[1], 0, 0).least)
    end
  end)

  it("reads a block at a time what it reads at once, any channel in any order", function()
    local path = sounds.temporary ".wav"
    sounds.sox("-R -r 8000 -n -b 24 -c 4 %s synth 30011s noise", path)
    local all = read_all(path)
    local swapped = read_all(path, { 4, 1 })
    assert.equal(digests { all[4], all[1] }, digests(swapped))
    local sound <close> = assert(store.open(path))
    assert(sound:seek(29000))
    local tail = assert(sound:read(1011, { 2 }))
    assert(sound:seek(0))
    assert(sound:read(17))
    assert(sound:seek(29000))
    assert.equal(digests(tail), digests(assert(sound:read(1011, { 2 }))))
    assert.is_false(pcall(sound.read, sound, 1))
    assert.is_false(pcall(sound.seek, sound, 30012))
    assert.is_false(pcall(sound.read, sound, 1, { 5 }))
  end)

  it("reads RF64 as it reads RIFF", function()
    -- Written by hand after EBU Tech 3306: sizes of FFFFFFFF, the true ones in ds64.
    local path = sounds.temporary ".wav"
    local data = string.pack("<i2i2i2i2", 1, -2, 32767, -32768)
    local fmt = string.pack("<c4I4I2I2I4I4I2I2", "fmt ", 16, 1, 1, 44100, 88200, 2, 16)
    local ds64 = string.pack("<c4I4I8I8I8I4", "ds64", 28, 80, 8, 4, 0)
    local text = "RF64\xff\xff\xff\xffWAVE" .. ds64 .. fmt .. "data\xff\xff\xff\xff" .. data
    assert.equal(88, #text)
    sounds.write_bytes(path, text)
    local blocks, facts = read_all(path)
    assert.equal("rf64", facts.container)
    assert.equal(4, facts.frames)
    assert.equal(store.digest(core.samples.from { 1, -2, 32767, -32768 }), store.digest(blocks[1]))
    sounds.write_bytes(path, text:sub(1, -3))
    refused(path, "format", "claims 8 bytes of samples, but only 6 are there")
  end)
end)

describe("writing", function()
  -- RIFF/WAVE: Microsoft/IBM, Multimedia Programming Interface 1.0 (1991), chunk layout.
  it("makes the bytes of the format", function()
    local path = sounds.temporary ".wav"
    local x = core.samples.from { 1, -1, 300 }
    assert(store.write(path, { rate = 51200, bits = 24, integer = true, scale = 1 }, { x }))
    local want = string.pack("<c4I4c4c4I4I2I2I4I4I2I2c4I4", "RIFF", 36 + 9 + 1, "WAVE", "fmt ", 16,
      1, 1, 51200, 153600, 3, 24, "data", 9) .. "\1\0\0\xff\xff\xff\44\1\0" .. "\0"
    assert.equal(want, sounds.bytes(path))
  end)

  it("writes every coding so that sox and we read it back", function()
    local blocks = read_all(front)
    for _, spec in ipairs { { 16, true, 1 }, { 24, true, 256 }, { 32, true, 65536 },
                            { 8, true, 1 / 256 }, { 32, false, 1 / 32768 }, { 64, false, 1 } } do
      local path = sounds.temporary ".wav"
      local bits, integer, scale = table.unpack(spec)
      assert(store.write(path, { rate = 48000, bits = bits, integer = integer, scale = scale },
        { blocks[1], blocks[1] }))
      local soxi = sounds.soxi(path)
      assert.same({ rate = 48000, channels = 2, frames = 68545, bits = bits },
        { rate = soxi.rate, channels = soxi.channels, frames = soxi.frames, bits = soxi.bits })
      local back, facts = read_all(path)
      assert.same({ bits, integer }, { facts.bits, facts.integer })
      if scale >= 1 or not integer then
        assert.equal(store.digest(blocks[1] * scale), store.digest(back[2]))
      end
    end
  end)

  it("never clips: it refuses, and leaves what was there", function()
    local path = sounds.temporary ".wav"
    sounds.write_bytes(path, "kept")
    local before = #sounds.bytes(path)
    local spec = { rate = 8000, bits = 16, integer = true, scale = 1 }
    for _, bad in ipairs { 32768, -32769, 32767.5, 0 / 0, math.huge } do
      local done, message, code = store.write(path, spec, { core.samples.from { 0, bad, 1 } })
      assert.is_nil(done)
      assert.equal("domain", code)
      assert.truthy(message:find "1 samples of channel 1 are beyond full scale or not finite")
      assert.equal(before, #sounds.bytes(path))
    end
    assert(store.write(path, spec, { core.samples.from { 32767.49, -32768.5 } }))
    assert.equal(1, store.rails(read_all(path)[1], -32768, 32768).low)
  end)

  it("leaves no temporary file, and replaces only files", function()
    local directory = os.tmpname()
    os.remove(directory)
    assert(lfs.mkdir(directory))
    local x = { core.samples.from { 0.5 } }
    local spec = { rate = 8000, bits = 32, integer = false, scale = 1 }
    assert(lfs.mkdir(directory .. "/taken"))
    local done, message, code = store.write(directory .. "/taken", spec, x)
    assert.is_true(done == nil and code == "io" and message:find "is a directory" ~= nil)
    assert.equal("io", select(3, store.write(directory .. "/none/x.wav", spec, x)))
    assert(lfs.link(directory .. "/taken", directory .. "/link", true))
    assert.truthy(select(2, store.write(directory .. "/link", spec, x)):find "symbolic link")
    assert(store.write(directory .. "/x.wav", spec, x))
    local names = {}
    for name in lfs.dir(directory) do names[#names + 1] = name end
    table.sort(names)
    assert.same({ ".", "..", "link", "taken", "x.wav" }, names)
    for _, name in ipairs { "link", "taken", "x.wav" } do os.remove(directory .. "/" .. name) end
    assert(lfs.rmdir(directory))
  end)
end)

describe("refusals", function()
  it("says what is no sound file", function()
    refused("/nowhere/x.wav", "io", "No such file")
    refused("/tmp", "io", "is a directory")
    refused("/dev/zero", "io", "is a character device")
    local path = sounds.temporary()
    refused(path, "format", "too short")
    sounds.write_bytes(path, ("text that is no sound\n"):rep(100))
    refused(path, "format", "cannot be read as a sound file")
    sounds.sox("-r 8000 -n %s.aiff synth 10s sine 100", path)
    os.rename(path .. ".aiff", path)
    refused(path, "format", "none of WAV, RF64")
    sounds.sox("-r 8000 -n -e a-law %s.wav synth 10s sine 100", path)
    os.rename(path .. ".wav", path)
    refused(path, "format", "neither plain integers")
    assert.is_false(pcall(store.open, "a\0b"))
  end)

  it("does not wait for a FIFO", function()
    local path = sounds.temporary ".fifo"
    assert(os.execute("mkfifo " .. path))
    refused(path, "io", "is a FIFO")
  end)

  it("does not believe a length that is not there", function()
    local path = sounds.temporary ".wav"
    local text = sounds.bytes(front)
    local at = text:find("data", 1, true) + 4
    for claimed, pattern in pairs { [137092] = "claims 137092 bytes", [137089] = "no whole number",
                                    [0xffffffff] = "does not state its length" } do
      sounds.write_bytes(path,
        text:sub(1, at - 1) .. string.pack("<I4", claimed) .. text:sub(at + 4))
      refused(path, "format", pattern)
    end
    local ogg = sounds.bytes(sounds.of_package("sound-theme-freedesktop",
      "/phone-outgoing-busy.oga"))
    local last = #ogg - ogg:reverse():find("SggO", 1, true) - 2
    for length, pattern in pairs { [3000] = "damaged or cut off in the page at byte",
                                   [#ogg - 1] = "cut off", [last - 1] = "not marked so" } do
      sounds.write_bytes(path, ogg:sub(1, length))
      refused(path, "format", pattern)
    end
    sounds.write_bytes(path, ogg .. ogg)
    refused(path, "format", "goes on after its last page")
    sounds.write_bytes(path, ogg:sub(1, 5000) .. "?" .. ogg:sub(5002))
    refused(path, "format", "damaged or cut off in the page at byte")
    local flac = sounds.temporary ".flac"
    sounds.sox("-R -r 8000 -n -b 16 %s synth 20000s noise", flac)
    local whole = sounds.bytes(flac)
    for _, share in ipairs { 0.3, 0.7, 0.99 } do
      sounds.write_bytes(flac, whole:sub(1, math.floor(#whole * share)))
      refused(flac, "format", "claims 20000 frames, but the last cannot be read")
    end
  end)

  it("is closed once, twice, and by collection", function()
    local sound = assert(store.open(front))
    sound:close()
    sound:close()
    assert.is_false(pcall(sound.facts, sound))
    assert.truthy(tostring(sound):find "closed")
    local function open_files()
      local count = 0
      for _ in lfs.dir "/proc/self/fd" do count = count + 1 end
      return count
    end
    collectgarbage()
    local before = open_files()
    for _ = 1, 100 do assert(store.open(front)) end
    for _ = 1, 100 do store.open("/etc/passwd") end
    collectgarbage()
    assert.equal(before, open_files())
  end)
end)

describe("damage", function()
  it("is survived at every length of the first 4 KiB", function()
    local path = sounds.temporary ".wav"
    local text = sounds.bytes(front)
    local file = assert(io.open(path, "wb"))
    file:setvbuf "no"
    for length = 0, 4096 do -- a file that grows is faster than one written anew
      assert.equal("format", sounds.try(store, path))
      file:write(text:sub(length + 1, length + 1))
    end
    file:close()
  end)

  it("is survived in 1000 headers", function()
    local random = sounds.generator(51)
    local path = sounds.temporary()
    local flac, w64 = sounds.temporary ".flac", sounds.temporary ".w64"
    sounds.sox("-R -r 8000 -n -b 16 %s synth 3000s noise", flac)
    sounds.sox("-R -r 8000 -n -b 16 %s synth 3000s noise", w64)
    local seen = {}
    local whole = { sounds.bytes(front):sub(1, 2000), sounds.bytes(flac), sounds.bytes(w64),
      sounds.bytes(sounds.of_package("sound-theme-freedesktop", "/phone-outgoing-calling.oga")) }
    whole[1] = whole[1]:gsub("(data)....", "%1" .. string.pack("<I4", 1956), 1)
    for i = 1, 1000 do
      sounds.write_bytes(path, sounds.damage(whole[1 + i % 4], random, 120))
      local outcome = sounds.try(store, path)
      seen[outcome] = (seen[outcome] or 0) + 1
    end
    assert.is_true(seen.format > 100 and seen.read > 100)
    for outcome in pairs(seen) do
      assert.truthy(("format read empty domain"):find(outcome, 1, true), outcome)
    end
  end)
end)

describe("rails", function()
  local function rails(list, low, high) return store.rails(core.samples.from(list), low, high) end

  it("counts samples and runs", function()
    local r = rails({ 0, 5, 5, 6, -5, 1, 5, -7, -5, 0 }, -5, 5)
    assert.same({ low = 3, high = 4, low_run = 2, high_run = 3, first = 2, bad = 0, least = -7,
                  most = 6 }, r)
    assert.is_nil(rails({ 1, 2 }, -5, 5).first)
    assert.equal(2, rails({ 0 / 0, 1, math.huge }, -5, 5).bad)
  end)

  it("agrees with a slow count over block borders", function()
    local random = sounds.generator(3)
    local list = {}
    for i = 1, 5000 do
      list[i] = i > 1000 and i < 2100 and 9 or random(-9, 9)
    end
    local high, run, longest = 0, 0, 0
    for _, x in ipairs(list) do
      run = x >= 9 and run + 1 or 0
      high = high + (x >= 9 and 1 or 0)
      longest = math.max(longest, run)
    end
    local r = rails(list, -10, 9)
    assert.same({ high, longest, 0 }, { r.high, r.high_run, r.low })
  end)
end)

describe("a feed", function()

  it("gives blocks in memory as values and as stored, in any range", function()
    local a, b = core.samples.from { 1.5, -2.25, 3 }, core.samples.from { 4, 5, 6 }
    local feed = core.store.feed({ a, b }, { 10, 1 })
    assert.equal(-22.5, feed:read(2, 1, { 1 })[1][1])
    assert.equal(-2.25, feed:codes(2, 1, { 1 })[1][1])
    assert.same({ 6, 3 }, { feed:codes(3, 1, { 2, 1 })[1][1], feed:codes(3, 1, { 2, 1 })[2][1] })
    assert.has_error(function() feed:read(3, 2) end)
    assert.has_error(function() feed:read(1, 1, { 3 }) end)
    assert.has_error(function() core.store.feed { a, core.samples.from { 1 } } end)
  end)

  it("over a file gives what lies in memory, for any size of block", function()
    local path = os.tmpname()
    local list = {}
    for i = 1, 5003 do list[i] = i * 7919 % 65536 - 32768 end
    local x = core.samples.from(list)
    local spec = { rate = 51200, bits = 24, integer = true, scale = 1 }
    assert(core.store.write(path, spec, { x, x * -1 }))
    local feed <close> = core.store.open(path):feed()
    os.remove(path)
    for _, size in ipairs { 1, 7, 1000, 5003 } do
      for first = 1, 5003 - size + 1, math.max(size, 997) do
        local got = feed:read(first, size, { 2 })[1]
        assert.equal(x:slice(first, first + size - 1) * -1, got)
      end
    end
  end)
end)
