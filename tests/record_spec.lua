local lb = require "libration"
local core = require "libration.core"
local sounds = dofile "tests/support/sounds.lua"

local front = sounds.of_package("alsa-utils", "/Front_Center.wav")

after_each(sounds.clean)

local function two_channels()
  return lb.record.new { rate = "51.2 kS/s", title = "pump", channels = {
    { codes = { 0, 100, -100, 32767, -32768 }, bits = 16, name = "casing", unit = "m/s^2",
      range = "5 V", sensitivity = "10 mV/(m/s^2)" },
    { codes = { 1, 2, 3, 4, 5 }, bits = 16, name = "shaft", full_scale = "5 V", unit = "V" },
  } }
end

describe("a record from a file", function()
  it("has the facts of the file", function()
    local r = assert(lb.record.read(front))
    assert.equal(68545, r.samples)
    assert.equal(lb.fraction.new(48000), r.rate)
    assert.equal(68545 / 48000, r:duration_s())
    assert.equal("FS", r.channels[1].unit)
    local rails = r:rails()
    assert.equal(-15487 / 32768, rails.least)
    assert.equal(13448 / 32768, rails.most)
    assert.equal(0, rails.low + rails.high)
  end)

  it("is calibrated by range and sensitivity", function()
    local r = assert(lb.record.read(front, { unit = "m/s^2", range = "5 V",
      sensitivity = "100 mV/g" }))
    assert.near(-15487 / 32768 * 50 * 9.80665, r:rails().least, 1e-10)
    local v = assert(lb.record.read(front, { range = "5 V" }))
    assert.equal("V", v.channels[1].unit)
    assert.near(13448 / 32768 * 5, v:rails().most, 1e-12)
  end)

  it("takes a part of it, and channels in the order asked for", function()
    local path = sounds.temporary ".wav"
    assert(two_channels():write(path))
    local r = assert(lb.record.read(path, { channel = { 2, 1 }, first = 2, count = 3,
      full_scale = { 5, 500 }, unit = { "V", "m/s^2" }, name = { "shaft", "casing" } }))
    assert.same({ 3, 2 }, { r.samples, #r.channels })
    assert.same({ "shaft", 2 }, { r.channels[1].name, r.channels[1].number })
    local shaft = core.store.rails(r:values(1), -9, 9)
    assert.same({ 2 * 5 / 32768, 4 * 5 / 32768 }, { shaft.least, shaft.most })
    assert.equal(1, r:rails(2).high)
  end)

  -- ITU-T E.180 (1998) recommends 425 Hz for these tones; the files are the package's own.
  it("holds the telephone tone that the standard asks for", function()
    local r = assert(lb.record.read(sounds.of_package("sound-theme-freedesktop",
      "/phone-outgoing-calling.oga")))
    local x, best, at = r:values():totable(), 0, nil
    for tenth = 4150, 4350, 4 do
      local step, re, im = 2 * math.pi * tenth / 10 / r.rate:number(), 0, 0
      for i = 1, #x do
        re, im = re + x[i] * math.cos(step * i), im + x[i] * math.sin(step * i)
      end
      if re * re + im * im > best then best, at = re * re + im * im, tenth / 10 end
    end
    assert.near(425, at, 0.5)
  end)

  it("takes an exact rate that the header could only round", function()
    local r = assert(lb.record.read(front, { rate = "48000.25 S/s" }))
    assert.equal("192001/4", tostring(r.rate))
    assert.equal("domain", select(3, lb.record.read(front, { rate = 44100 })))
  end)

  it("returns refusals", function()
    local path = sounds.temporary ".wav"
    sounds.write_bytes(path, string.pack("<c4I4c4c4I4I2I2I4I4I2I2c4I4", "RIFF", 36, "WAVE", "fmt ",
      16, 1, 1, 8000, 16000, 2, 16, "data", 0))
    for _, case in ipairs {
      { "/nowhere.wav", nil, "io", "No such file" },
      { path, nil, "format", "holds no samples" },
      { front, { channel = 2 }, "domain", "has channels 1 to 1, not 2" },
      { front, { first = 68546 }, "domain", "has 68545 samples" },
      { front, { first = 68000, count = 547 }, "domain", "547 from number 68000 are not there" },
      { front, { unit = "Pa" }, "domain", "a unit needs full_scale" },
    } do
      local r, message, code = lb.record.read(case[1], case[2])
      assert.is_nil(r)
      assert.equal(case[3], code)
      assert.truthy(message:find(case[1], 1, true) and message:find(case[4]), message)
    end
  end)

  it("raises on misuse, naming field, value and choices", function()
    for pattern, options in pairs {
      ["unknown field frst; valid are channel, count, first"] = { frst = 1 },
      ["channel is 1.5; it must be a number from 1"] = { channel = 1.5 },
      ["first is 0; it must be an integer from 1"] = { first = 0 },
      ["sensitivity must say how many V a Pa is"] = { unit = "Pa", range = "5 V" },
      ["sensitivity needs range"] = { unit = "Pa", sensitivity = "50 mV/Pa" },
      ["but not both"] = { full_scale = 3, range = 5 },
      ["range is %-5; it must be positive"] = { range = -5 },
      ["range: \"5 Hz\" is a frequency"] = { range = "5 Hz" },
      ["rate: "] = { rate = "5 V" },
    } do
      local ok, message = pcall(lb.record.read, front, options)
      assert.is_false(ok)
      assert.truthy(message:find(pattern), message)
    end
  end)
end)

describe("a record from samples", function()
  it("gives codes their values, and finds the rails", function()
    local r = two_channels()
    local values = core.store.rails(r:values(1), -500, 500)
    assert.equal(-500, values.least)
    assert.near(500 * 32767 / 32768, values.most, 1e-10)
    local rails = r:rails(1)
    assert.same({ 1, 1, 4 }, { rails.low, rails.high, rails.first })
    assert.equal(0, r:rails(2).high)
    assert.is_nil(lb.record.new { rate = 1, samples = { 1 } }:rails())
  end)

  it("goes through a file and comes back the same", function()
    local path = sounds.temporary ".wav"
    local r = two_channels()
    assert(r:write(path))
    local back = assert(lb.record.read(path, { unit = { "m/s^2", "V" }, range = { "5 V", "5 V" },
      sensitivity = { "10 mV/(m/s^2)", 1 } }))
    assert.equal(r:identity(), back:identity())
    assert(r:write(path, { bits = 24 }))
    local wide = assert(lb.record.read(path, { full_scale = { 500, 5 }, unit = { "m/s^2", "V" } }))
    for k = 1, 2 do
      assert.equal(core.store.digest(r:values(k)), core.store.digest(wide:values(k)))
    end
  end)

  it("keeps values exactly in a float file", function()
    local path = sounds.temporary ".wav"
    local r = lb.record.new { rate = 1000, samples = { 0.1, -7.25, 1e-9, 123456.789 }, unit = "Pa" }
    assert(r:write(path))
    local back = assert(lb.record.read(path, { unit = "Pa" }))
    assert.equal(r:identity(), back:identity())
  end)

  it("has an identity that depends on content alone", function()
    local function id(change)
      local spec = { rate = 8000, samples = { 1, 2, 3 }, unit = "V", title = "x" }
      for key, value in pairs(change) do spec[key] = value end
      return lb.record.new(spec):identity()
    end
    local plain = id {}
    assert.equal(plain, id { title = "y", name = "other" })
    for _, change in ipairs { { rate = "8000.001 S/s" }, { samples = { 1, 2, 3.0000000001 } },
                              { unit = "Pa" }, { samples = { 1, 2 } } } do
      assert.are_not.equal(plain, id(change))
    end
  end)

  it("refuses to write what WAV cannot hold, and never clips", function()
    local path = sounds.temporary ".wav"
    local loud = lb.record.new { rate = 8000, samples = { 0.5, 1.5 }, full_scale = 1, unit = "V" }
    local done, message, code = loud:write(path, { bits = 16 })
    assert.is_true(done == nil and code == "domain" and message:find "would be clipped: 1 " ~= nil)
    assert(loud:write(path))
    local odd = lb.record.new { rate = "8000.5 S/s", samples = { 0.5 } }
    assert.equal("domain", select(3, odd:write(path)))
    local unknown = lb.record.new { rate = 8000, samples = { 0.5 } }
    assert.is_false(pcall(unknown.write, unknown, path, { bits = 16 }))
    assert.is_false(pcall(unknown.write, unknown, path, { bits = 12 }))
    assert.is_false(pcall(unknown.write, unknown, path, { dither = true }))
  end)

  it("raises on misuse", function()
    for pattern, spec in pairs {
      ["rate: "] = { samples = { 1 } },
      ["rate is 0; it must be positive"] = { rate = 0, samples = { 1 } },
      ["needs samples or codes"] = { rate = 1 },
      ["channel 2 has 2 samples, channel 1 has 1"] = { rate = 1,
        channels = { { samples = { 1 } }, { samples = { 1, 2 } } } },
      ["codes need bits and full_scale"] = { rate = 1, codes = { 1 } },
      ["bits is 40"] = { rate = 1, samples = { 1 }, bits = 40 },
      ["holds no samples"] = { rate = 1, samples = {} },
      ["unknown field gain"] = { rate = 1, samples = { 1 }, gain = 3 },
    } do
      local ok, message = pcall(lb.record.new, spec)
      assert.is_false(ok)
      assert.truthy(message:find(pattern), message)
    end
  end)

  it("prints a table", function()
    local text = tostring(two_channels())
    assert.truthy(text:find(
      "record pump: 51200 S/s, 5 samples (9.76563e-05 s), 2 channels", 1, true))
    assert.truthy(text:find("casing +m/s%^2 +16 +500 +%-500 +499.985 +2"))
  end)
end)
