local lb = require "libration"
local sounds = dofile "tests/support/sounds.lua"

after_each(sounds.clean)

local function with_gaps()
  return lb.record.new { rate = "100000/3", title = "pump", start = "2026-03-01T12:00:00.25Z",
    gaps = { { after = 2, lost = 7 } }, channels = {
      { codes = { 1, -2, 32767, -32768, 5 }, bits = 16, name = "casing", unit = "m/s^2",
        range = "5 V", sensitivity = "10 mV/(m/s^2)" },
      { codes = { 8388607, -8388608, 0, 1, 2 }, bits = 24, name = "shaft", full_scale = "5 V",
        unit = "V" } } }
end

local function floats()
  return lb.record.new { rate = 0.5, channels = { { samples = { 0.1, -1e-300, 3e300 } },
    { samples = { 1, 2, 3 }, unit = "Pa" } } }
end

local function drop(...)
  for _, path in ipairs { ... } do os.remove(path) end
end

for _, case in ipairs {
  { format = "raw", suffix = ".record", data = ".raw" },
  { format = "sigmf", suffix = ".sigmf-meta", data = ".sigmf-data" },
} do
  describe(case.format, function()
    local stem
    before_each(function() stem = os.tmpname() end)
    after_each(function() drop(stem, stem .. case.suffix, stem .. case.data) end)

    it("gives back what was written, gaps, moments and calibration included", function()
      for _, make in ipairs { with_gaps, floats } do
        local r = make()
        assert(r:write(stem .. case.suffix))
        local back = assert(lb.record.read(stem .. case.suffix))
        assert.equal(case.format, back.container)
        assert.equal(r:identity(), back:identity())
        assert.equal(r.rate, back.rate)
        assert.equal(r.title, back.title)
        assert.equal(r.start_ns, back.start_ns)
        assert.same(r.segments, back.segments)
        for k, channel in ipairs(r.channels) do
          local other = back.channels[k]
          assert.same({ channel.name, channel.unit, channel.bits, channel.factor,
            channel.full_scale, channel.sensitivity, channel.range },
            { other.name, other.unit, other.bits, other.factor, other.full_scale,
              other.sensitivity, other.range })
          assert.equal(channel.data, other.data)
        end
      end
    end)

    it("is refused when its samples are cut, gone, or elsewhere", function()
      local path = stem .. case.suffix
      assert(with_gaps():write(path))
      assert(os.execute("truncate -s -1 " .. stem .. case.data))
      local r, message, code = lb.record.read(path)
      assert.is_nil(r)
      assert.equal("format", code)
      assert.is_truthy(message:find(stem .. case.data, 1, true), message)
      os.remove(stem .. case.data)
      assert.equal("io", select(3, lb.record.read(path)))
    end)

    it("survives damage of any kind", function()
      local path = stem .. case.suffix
      assert(with_gaps():write(path))
      local file = assert(io.open(path, "rb"))
      local text = file:read "a"
      file:close()
      math.randomseed(3, 5)
      for i = 1, 1000 do
        local at, kind = math.random(#text), math.random(4)
        local bad = kind == 1 and text:sub(1, at - 1) .. string.char(math.random(0, 255))
          .. text:sub(at + 1) or kind == 2 and text:sub(1, at)
          or kind == 3 and text:gsub("%d+", ("%d%s"):format(math.random(-9, 9), ("0"):rep(i % 20)))
          or text:sub(1, at) .. text:sub(at - 9)
        sounds.write_bytes(path, bad)
        local r, message, code = lb.record.read(path, { format = case.format })
        assert.is_true(r ~= nil or type(message) == "string" and type(code) == "string", bad)
      end
      for length = 0, math.min(#text, 4096) do
        sounds.write_bytes(path, text:sub(1, length))
        local r, message = lb.record.read(path, { rate = 1000 })
        assert.is_true(r ~= nil or message:find(stem, 1, true) ~= nil, message)
      end
    end)
  end)
end

describe("a description", function()
  it("reads what other programs left, in either byte order", function()
    local data, path = sounds.temporary ".dat", sounds.temporary ".txt"
    sounds.write_bytes(data, "head" .. string.pack(">i2i2i2i2", 256, -1, 2, -32768))
    sounds.write_bytes(path, ([[
      -- invented for the test
      record = { file = "%s", coding = "int16", order = "big", skip = 4, rate = "51200/7",
        channels = { { name = "a" }, { name = "b", unit = "V", factor = 0.5 } } }
    ]]):format(data:match "[^/]*$"))
    local r = assert(lb.record.read(path))
    assert.same({ 256 / 32768, 2 / 32768 }, r:values(1):totable())
    assert.same({ -0.5, -16384 }, r:values(2):totable())
    for _, words in ipairs { 'file = "../x"', 'file = "/etc/passwd"', 'coding = "int12"',
      'rate = "-1"', 'skip = -1', 'extra = 1' } do
      local key = words:match "^%a+"
      local fields = { file = ('file = %q'):format(data:match "[^/]*$"),
        coding = 'coding = "int16"',
        rate = 'rate = 8', skip = "skip = 4", channels = "channels = { {} }" }
      fields[key] = words
      local list = {}
      for _, field in pairs(fields) do list[#list + 1] = field end
      sounds.write_bytes(path, "record = { " .. table.concat(list, ", ") .. " }")
      local none, message, code = lb.record.read(path)
      assert.is_nil(none, words)
      assert.equal("format", code, message)
    end
  end)
end)

describe("SigMF metadata", function()
  local function open(global, captures, bytes)
    local data = sounds.temporary ".dat"
    local path = sounds.temporary ".sigmf-meta"
    sounds.write_bytes(data, bytes)
    sounds.write_bytes(path, ('{"global": {"core:version": "1.2.5", "core:dataset": "%s", %s},'
      .. '"captures": [%s], "annotations": []}'):format(data:match "[^/]*$", global, captures))
    return lb.record.read(path)
  end

  -- SigMF 1.2.5: complex samples are interleaved in phase, quadrature; captures are sorted;
  -- 24-bit types and types without a byte order do not exist.
  it("means what the specification says", function()
    local r = assert(open('"core:datatype": "ci16_be", "core:sample_rate": 1e6',
      '{"core:sample_start": 0, "core:datetime": "2026-03-01T12:00:00Z"}',
      string.pack(">i2i2i2i2", 1, 2, 3, 4)))
    assert.same({ 1, 3 }, r.channels[1].data:totable())
    assert.same({ 2, 4 }, r.channels[2].data:totable())
    assert.equal("1000000", tostring(r.rate))
    assert.equal(lb.record.moment "2026-03-01T12:00:00Z", r.start_ns)
    local f = assert(open('"core:datatype": "rf32_le", "core:sample_rate": 48000.5', "",
      string.pack("<ff", 0.5, -2)))
    assert.same({ 0.5, -2 }, f:values():totable())
    assert.equal("96001/2", tostring(f.rate))
    for _, kind in ipairs { "ri24_le", "rf32", "xf32_le", "rf32_me" } do
      assert.equal("format", select(3, open('"core:datatype": "' .. kind .. '"', "", "abcd")))
    end
    assert.equal("format", select(3, open('"core:datatype": "ri8", "core:sample_rate": 8',
      '{"core:sample_start": 2}, {"core:sample_start": 1}', "abcd")))
    assert.equal("domain", select(3, open('"core:datatype": "ri8"', "", "abcd")))
  end)

  it("that we write holds against the schema", function()
    local stem = os.tmpname()
    for _, make in ipairs { with_gaps, floats } do
      assert(make():write(stem .. ".sigmf-meta"))
      local pipe = assert(io.popen("env -u LD_PRELOAD /usr/bin/python3 -c 'import json, jsonschema,"
        .. " sys; jsonschema.validate(json.load(open(sys.argv[1])), json.load(open(sys.argv[2])));"
        .. ' print("valid")\' ' .. stem .. ".sigmf-meta tests/data/sigmf_schema.json 2>&1"))
      local text = pipe:read "a"
      pipe:close()
      assert.is_truthy(text:find "valid%s*$", text)
    end
    drop(stem, stem .. ".sigmf-meta", stem .. ".sigmf-data")
  end)

  it("that is deep or hostile is refused", function()
    local path = sounds.temporary ".sigmf-meta"
    sounds.write_bytes(path, '{"global": ' .. ("["):rep(100000))
    assert.equal("format", select(3, lb.record.read(path)))
    sounds.write_bytes(path, '{"global": {"core:datatype": "ri8", "core:dataset": "../etc/passwd"},'
      .. '"captures": [], "annotations": []}')
    local r, message = lb.record.read(path)
    assert.is_nil(r)
    assert.has_match("same folder", message)
  end)
end)
