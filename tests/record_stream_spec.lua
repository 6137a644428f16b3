local lb = require "libration"
local core = require "libration.core"
local sounds = dofile "tests/support/sounds.lua"

after_each(sounds.clean)

describe("moments", function()
  -- Values of POSIX.1-2017, 4.16 (seconds since the epoch) computed with `date -u +%s`.
  it("read and write exactly, and refuse what is none", function()
    for text, ns in pairs { ["1970-01-01T00:00:00Z"] = 0,
      ["2000-02-29T23:59:59.000000001Z"] = 951868799000000001,
      ["2026-03-01T12:00:00.25Z"] = 1772366400250000000,
      ["1969-12-31T23:59:59.999999999Z"] = -1, ["1900-03-01T00:00:00Z"] = -2203891200000000000 } do
      assert.equal(ns, lb.record.moment(text))
      assert.equal(text, lb.record.moment_text(ns))
    end
    assert.equal(lb.record.moment "2026-03-01T12:00:00Z",
      lb.record.moment "2026-03-01T13:30:00+01:30")
    for _, text in ipairs { "2023-02-29T00:00:00Z", "2016-12-31T23:59:60Z", "2026-13-01T00:00:00Z",
      "2026-03-01T24:00:00Z", "2026-03-01T12:00:00", "2026-03-01", "9999-01-01T00:00:00Z",
      "2026-03-01T12:00:00.1234567891Z", "2026-03-01T12:00:00.Z", "2026-03-01T12:00:00+25:00" } do
      local ns, reason = lb.record.moment(text)
      assert.is_nil(ns, text)
      assert.is_string(reason)
    end
  end)
end)

describe("a record with gaps", function()
  local function gappy()
    return lb.record.new { rate = 1000, samples = { 1, 2, 3, 4, 5, 6 }, unit = "V",
      start = "2026-03-01T12:00:00Z", gaps = { { after = 2, lost = 10 }, { after = 4, lost = 1 } } }
  end

  it("knows counter and moment of every sample", function()
    local r = gappy()
    local counters = {}
    for i = 1, 6 do counters[i] = r:counter(i) end
    assert.same({ 0, 1, 12, 13, 15, 16 }, counters)
    assert.equal("2026-03-01T12:00:00.015Z", lb.record.moment_text(r:moment(5)))
    local part = r:part { first = 4, count = 2 }
    assert.same({ 13, 15 }, { part:counter(1), part:counter(2) })
    assert.equal(r:moment(5), part:moment(2))
    assert.same({ 4, 5 }, part:values():totable())
    assert.not_equal(r:identity(), lb.record.new { rate = 1000, samples = r:values(), unit = "V" }
      :identity())
  end)

  it("is refused by formats that cannot hold them", function()
    for _, format in ipairs { "wav", "csv" } do
      local done, message, code = gappy():write("never.x", { format = format, bits = nil })
      assert.is_nil(done)
      assert.equal("domain", code)
      assert.has_match("holds no gaps", message)
    end
    assert.has_error(function()
      lb.record.new { rate = 1, samples = { 1, 2 }, gaps = { { after = 2, lost = 1 } } }
    end)
  end)
end)

describe("raw samples", function()
  it("stay raw in memory and come out as values", function()
    local raw = lb.samples.raw(string.pack("<i2i2i2", 16384, -32768, 1), "int16")
    local r = lb.record.new { rate = 8000, codes = raw, bits = 16, range = "5 V" }
    assert.same({ 2.5, -5, 5 / 32768 }, r:values():totable())
    assert.same({ 16384, -32768, 1 }, r.channels[1].data:totable())
    local path = sounds.temporary ".wav"
    assert(r:write(path))
    assert.equal(r:identity(), lb.record.read(path, { range = "5 V" }):identity())
  end)
end)

describe("a file larger than its share of memory", function()
  local function resident_kib()
    local file = assert(io.open "/proc/self/status")
    local text = file:read "a"
    file:close()
    return tonumber(text:match "VmHWM:%s+(%d+)")
  end

  it("is read in blocks in bounded memory", function()
    -- 512 MiB of 16-bit zeros with one sample that is not: a hole in the file, no disk used
    local path = sounds.temporary ".wav"
    local frames = 1 << 28
    local file = assert(io.open(path, "wb"))
    file:write(string.pack("<c4I4c4c4I4I2I2I4I4I2I2c4I4", "RIFF", 36 + 2 * frames, "WAVE", "fmt ",
      16, 1, 1, 51200, 102400, 2, 16, "data", 2 * frames))
    file:seek("set", 44 + 2 * (frames - 1))
    file:write "\1\0"
    file:close()
    local before = resident_kib()
    local r = assert(lb.record.open(path, { range = "32768 V" }))
    local sum, count = 0, 0
    for block in r:blocks { samples = 1 << 20 } do
      sum, count = sum + block:sum(), count + #block
    end
    assert.same({ 1, frames }, { sum, count })
    if not os.getenv "LBR_SLOWED" then
      assert.is_true(resident_kib() - before < 32 * 1024)
    end
    r:close()
  end)

  it("that is cut while open raises where it is used", function()
    local path = sounds.temporary ".wav"
    local x = core.samples.new(100000)
    assert(lb.record.new { rate = 1000, samples = x, unit = "V" }:write(path))
    local r = assert(lb.record.open(path, { unit = "V" }))
    assert(os.execute("truncate -s 1000 " .. path))
    local ok, message = pcall(r.values, r)
    assert.is_false(ok)
    assert.is_truthy(message:find(path, 1, true))
  end)
end)

describe("FLAC", function()
  local function noise(n, bits)
    local state, list = 77, {}
    for i = 1, n do
      state = state * 6364136223846793005 + 1442695040888963407
      list[i] = (state >> (64 - bits)) - (1 << (bits - 1))
    end
    return list
  end

  it("holds the codes without loss, read in any blocks, in any order", function()
    for _, bits in ipairs { 16, 24 } do
      local a, b = noise(20011, bits), noise(20011, bits - 3)
      local r = lb.record.new { rate = 51200, channels = {
        { codes = a, bits = bits, full_scale = 1 }, { codes = b, bits = bits, full_scale = 1 } } }
      local path = sounds.temporary ".flac"
      assert(r:write(path))
      local back = assert(lb.record.open(path))
      assert.equal("flac", back.container)
      for _, first in ipairs { 1, 15000, 7, 20011 } do
        local n = math.min(5000, 20011 - first + 1)
        local got = back:feed():codes(first, n)
        assert.equal(r.channels[1].data:slice(first, first + n - 1), got[1])
        assert.equal(r.channels[2].data:slice(first, first + n - 1), got[2])
      end
    end
  end)

  -- sox is the independent reader
  it("is read by others", function()
    local r = lb.record.new { rate = 51200, codes = noise(9001, 16), bits = 16, full_scale = 1 }
    local path, wave = sounds.temporary ".flac", sounds.temporary ".wav"
    assert(r:write(path))
    assert(os.execute(("env -u LD_PRELOAD sox -D -t flac %s -t wav %s"):format(path, wave)))
    assert.equal(r.channels[1].data, assert(lb.record.read(wave)).channels[1].data)
  end)

  it("refuses what it cannot hold", function()
    local path = sounds.temporary ".flac"
    local list = {}
    for k = 1, 9 do list[k] = { codes = { 1 }, bits = 16, full_scale = 1 } end
    for _, r in ipairs { lb.record.new { rate = 8000, samples = { 0.5 } },
      lb.record.new { rate = 8000, channels = list },
      lb.record.new { rate = 1000000, codes = { 1 }, bits = 16, full_scale = 1 },
      lb.record.new { rate = 8000, codes = { 1 }, bits = 32, full_scale = 1 } } do
      local done, message, code = r:write(path, { format = "flac" })
      assert.is_nil(done)
      assert.equal("domain", code, message)
    end
  end)
end)
