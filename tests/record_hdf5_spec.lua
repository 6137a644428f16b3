local lb = require "libration"
local lfs = require "lfs"
local sounds = dofile "tests/support/sounds.lua"

after_each(sounds.clean)

local function slurp(path)
  local file = assert(io.open(path, "rb"))
  local text = file:read "a"
  file:close()
  return text
end

local function output(command)
  local pipe = assert(io.popen(command .. " 2>&1"))
  local text = pipe:read "a"
  return text, pipe:close()
end

local function pump()
  return lb.record.new { rate = "100000/3", title = "pump", start = "2026-03-01T12:00:00.5Z",
    gaps = { { after = 2, lost = 7 } }, channels = {
      { codes = { 1, -2, 3, 4, 5 }, bits = 16, full_scale = 5, name = "casing", unit = "m/s^2" },
      { codes = { 6, 7, 8, 9, -8388608 }, bits = 24, unit = "V", range = "5 V" } } }
end

describe("HDF5", function()
  it("gives back what was written", function()
    local floats = lb.record.new { rate = 0.5, samples = { 0.1, -1e-300, 3e300 }, unit = "Pa" }
    for _, r in ipairs { pump(), floats } do
      local path = sounds.temporary ".h5"
      assert(r:write(path))
      local back = assert(lb.record.read(path))
      assert.equal("hdf5", back.container)
      assert.equal(r:identity(), back:identity())
      assert.same({ r.rate, r.title, r.start_ns, r.segments },
        { back.rate, back.title, back.start_ns, back.segments })
      for k, channel in ipairs(r.channels) do
        local other = back.channels[k]
        assert.same({ channel.name, channel.unit, channel.bits, channel.factor,
          channel.full_scale, channel.range }, { other.name, other.unit, other.bits, other.factor,
            other.full_scale, other.range })
      end
    end
  end)

  -- h5dump of the HDF5 library (Debian hdf5-tools) is the independent reader.
  it("is read by the HDF5 library", function()
    local path = sounds.temporary ".h5"
    assert(pump():write(path))
    local text, fine = output("env -u LD_PRELOAD h5dump " .. path)
    assert.is_true(fine, text)
    for _, line in ipairs { 'DATASET "samples"', "24-bit little-endian integer 24-bit precision",
      "SIMPLE { ( 5, 2 ) / ( 5, 2 ) }", "(4,0): 5, -8388608", '(0): "100000/3"', '"casing',
      '"2026-03-01T12:00:00.5Z"' } do
      assert.is_truthy(text:find(line, 1, true), line .. "\n" .. text)
    end
  end)

  it("of others is read where it is contiguous, and refused by name where not", function()
    local folder = os.tmpname()
    os.remove(folder)
    assert(lfs.mkdir(folder))
    local text, fine = output("env -u LD_PRELOAD /usr/bin/python3 tests/oracle/hdf5_files.py "
      .. folder)
    assert.is_true(fine, text)
    local old = assert(lb.record.read(folder .. "/old.h5", { rate = 8 }))
    assert.same({ 1, 3, -32768 }, old.channels[1].data:totable())
    assert.same({ -2 / 32768, 4 / 32768, 32767 / 32768 }, old:values(2):totable())
    local new = assert(lb.record.read(folder .. "/new.h5"))
    assert.same({ "51200/7", "V", "Pa" }, { tostring(new.rate), new.channels[1].unit,
      new.channels[2].unit })
    assert.same({ -4, 8, 65534 }, new:values(2):totable())
    local several = assert(lb.record.read(folder .. "/several.h5",
      { rate = 8, channel = { 20, 3 } }))
    assert.same({ "channel19", "channel02" },
      { several.channels[1].name, several.channels[2].name })
    assert.same({ 0, 19, 38, 57, 76 }, several:values(1):totable())
    local big = assert(lb.record.read(folder .. "/big.h5", { rate = 8, unit = "V" }))
    assert.equal(-1.25, big:values()[2])
    local r, message, code = lb.record.read(folder .. "/chunks.h5", { rate = 8 })
    assert.is_nil(r)
    assert.equal("format", code)
    assert.has_match("in chunks", message)
    for name in lfs.dir(folder) do os.remove(folder .. "/" .. name) end
    lfs.rmdir(folder)
  end)

  it("survives damage of any kind", function()
    local path = sounds.temporary ".h5"
    assert(pump():write(path))
    local text = slurp(path)
    math.randomseed(6, 9)
    for i = 1, 1000 do
      local bad = text
      for _ = 1, i % 3 + 1 do
        local at = math.random(#text - 30)
        local byte = ({ "\0", "\255", "\127", string.char(math.random(0, 255)) })[math.random(4)]
        bad = bad:sub(1, at - 1) .. byte .. bad:sub(at + 1)
      end
      sounds.write_bytes(path, bad)
      local r, message, code = lb.record.read(path, { format = "hdf5" })
      assert.is_true(r ~= nil or type(message) == "string" and type(code) == "string")
    end
    for length = 0, #text - 1 do
      sounds.write_bytes(path, text:sub(1, length))
      local r, message = lb.record.read(path, { format = "hdf5" })
      assert.is_nil(r)
      assert.is_truthy(message:find(path, 1, true), message)
    end
  end)

  it("whose groups go round in circles ends", function()
    local path = sounds.temporary ".h5"
    assert(pump():write(path))
    local text = slurp(path)
    local tree = text:find("TREE", 1, true)
    -- the tree's child is the tree, one level up
    sounds.write_bytes(path, text:sub(1, tree + 4) .. "\1" .. text:sub(tree + 6, tree + 31)
      .. string.pack("<i8", tree - 1) .. text:sub(tree + 40))
    local r, message, code = lb.record.read(path)
    assert.is_nil(r)
    assert.equal("format", code)
    assert.has_match("circles", message)
  end)
end)
