local lb = require "libration"
local core = require "libration.core"
local sounds = dofile "tests/support/sounds.lua"

after_each(sounds.clean)

local function file_of(text, suffix)
  local path = sounds.temporary(suffix or ".csv")
  sounds.write_bytes(path, text)
  return path
end

local function noisy(n, scale)
  local state = 12345
  return core.samples.from((function()
    local list = {}
    for i = 1, n do
      state = (state * 6364136223846793005 + 1442695040888963407)
      list[i] = (state >> 11) / 2 ^ 53 * (scale or 1) - 0.3
    end
    return list
  end)())
end

describe("CSV", function()
  it("gives back what was written: rate, start, names, units, every bit", function()
    local x, y = noisy(70001), noisy(70001, 1e-7)
    local r = lb.record.new { rate = "100000/3", start = "2026-03-01T12:00:00.25Z", channels = {
      { samples = x, name = 'casing, "upper"', unit = "m/s^2" },
      { samples = y, name = "flow", unit = "m^3/s" } } }
    local path = sounds.temporary ".csv"
    assert(r:write(path))
    local back = assert(lb.record.read(path))
    assert.equal("csv", back.container)
    assert.equal(r.rate, back.rate)
    assert.equal("2026-03-01T12:00:00.25Z", lb.record.moment_text(back.start_ns))
    assert.equal(x, back:values(1))
    assert.equal(y, back:values(2))
    assert.same({ 'casing, "upper"', "flow" }, { back.channels[1].name, back.channels[2].name })
    assert.same({ "m/s^2", "m^3/s" }, { back.channels[1].unit, back.channels[2].unit })
    assert.equal(r:identity(), back:identity())
    assert.equal(r:identity(), assert(lb.record.open(path)):identity())
  end)

  it("is read in blocks of any size, the same", function()
    local x = noisy(20011)
    local path = sounds.temporary ".csv"
    assert(lb.record.new { rate = 1000, samples = x, unit = "V" }:write(path))
    local r = assert(lb.record.open(path))
    for _, size in ipairs { 1009, 8192, 20011 } do
      local sum, count = 0, 0
      for block, first in r:blocks { samples = size } do
        assert.equal(x:slice(first, first + #block - 1), block)
        sum, count = sum + block:sum(), count + #block
      end
      assert.equal(20011, count)
      assert.near(x:sum(), sum, 1e-9)
    end
  end)

  it("takes other people's shapes", function()
    for _, text in ipairs {
      "a [V],b [Pa]\n1,2\n3,-4.5e-1\n", "a (V);b (Pa)\r\n1;2\r\n3;-.45\r\n",
      "\239\187\191a [V]\tb [Pa]\n1\t2\n3\t-0.45", "a [V],b [Pa]\n\"1\", 2 \n 3,\"-0.45\"\n\n",
      "time [s],a [V],b [Pa]\n0,1,2\n0.125,3,-0.45\n",
    } do
      local r = assert(lb.record.read(file_of(text), { rate = 8 }))
      assert.same({ 1, 3 }, r:values(1):totable())
      assert.same({ 2, -0.45 }, r:values(2):totable())
      assert.same({ "a", "V", "b", "Pa" }, { r.channels[1].name, r.channels[1].unit,
        r.channels[2].name, r.channels[2].unit })
    end
    local bare = assert(lb.record.read(file_of "1\n2\n3\n", { rate = 8, unit = "V" }))
    assert.same({ 1, 2, 3 }, bare:values():totable())
  end)

  it("finds the rate in an even time column, and says that it did", function()
    local rows = { "time (ms),x (V)" }
    for i = 0, 999 do rows[#rows + 1] = ("%.4f,%d"):format(100 + i * 1000 / 51200, i) end
    local r = assert(lb.record.read(file_of(table.concat(rows, "\n"))))
    assert.equal("51200", tostring(r.rate))
    assert.equal("the time column", r.metadata.rate_from)
    rows[500] = "109.9,0"
    local none, message, code = lb.record.read(file_of(table.concat(rows, "\n")))
    assert.is_nil(none)
    assert.equal("domain", code)
    assert.has_match("not even", message)
  end)

  it("refuses in words", function()
    for _, case in ipairs {
      { "a;b\n0,5;1\n", "decimal comma" }, { "a,b\n1,2\n3\n", "line 3 has too few" },
      { "a,b\n1,2\n3,4,5\n", "line 3 has too many" },
      { "a,b\n1,2\n3,x4\n", 'line 3, column 2: "x4"' },
      { "a,b\n1,2\n\n3,4\n", 'line 3, column 1: ""' }, { "a,b\n1,2\n3,0x10\n", "line 3" },
      { "a,b\n1,2\n3,1e999\n", "line 3" }, { "a,b\n1 2,2\n", "line 2" },
      { "a\n1\n" .. ("7"):rep(70000) .. "\n2\n" .. ("3\n"):rep(70000), "line 3" },
    } do
      local r, message, code = lb.record.read(file_of(case[1]), { rate = 8, format = "csv" })
      assert.is_nil(r, case[1]:sub(1, 20))
      assert.equal("format", code)
      assert.is_truthy(message:find(case[2], 1, true), message)
    end
    assert.equal("domain", select(3, lb.record.read(file_of "a\n1\n")))
  end)

  it("has one meaning in every locale", function()
    local path = file_of "a,b\n1.25,0.1\n"
    local old = os.setlocale(nil, "numeric")
    if os.setlocale("de_DE.UTF-8", "numeric") or os.setlocale("fr_FR.UTF-8", "numeric") then
      local r = assert(lb.record.read(path, { rate = 8 }))
      assert.same({ 1.25, 0.1 }, { r:values(1)[1], r:values(2)[1] })
      os.setlocale(old, "numeric")
    end
    assert.equal(0.1, assert(lb.record.read(path, { rate = 8 })):values(2)[1])
  end)

  it("survives damage of any kind", function()
    local good = sounds.temporary ".csv"
    assert(lb.record.new { rate = 1000, samples = noisy(40), unit = "V" }:write(good))
    local file = assert(io.open(good, "rb"))
    local text = file:read "a"
    file:close()
    math.randomseed(7, 11)
    local path = sounds.temporary ".csv"
    for _ = 1, 1000 do
      local at, kind = math.random(#text), math.random(3)
      local bad = kind == 1 and text:sub(1, at - 1) .. string.char(math.random(0, 255))
        .. text:sub(at + 1) or kind == 2 and text:sub(1, at) or text:sub(1, at) .. text:sub(at - 9)
      sounds.write_bytes(path, bad)
      local r, message, code = lb.record.read(path, { rate = 1000, format = "csv" })
      assert.is_true(r ~= nil or type(message) == "string" and type(code) == "string", bad)
    end
    for length = 0, #text do
      sounds.write_bytes(path, text:sub(1, length))
      local r, message = lb.record.read(path, { rate = 1000 })
      assert.is_true(r ~= nil or message:find(path, 1, true) ~= nil, message)
    end
  end)
end)

describe("decimal numbers", function()
  local function read_back(texts)
    return assert(lb.record.read(file_of("x\n" .. table.concat(texts, "\n") .. "\n"),
      { rate = 1, format = "csv" })):values()
  end

  -- The C library's reader is the reference; glibc rounds correctly in all cases.
  it("are read to the last bit", function()
    local texts, state = {}, 99
    for i = 1, 20000 do
      state = state * 6364136223846793005 + 1442695040888963407
      local x = string.unpack("<d", string.pack("<i8", state))
      local form = ({ "%.17g", "%.9g", "%.20e", "%.16g" })[i % 4 + 1]
      if i % 2 == 0 then x = (state >> 11) / 2 ^ 53 * 10 ^ (i % 30 - 15) end
      texts[#texts + 1] = x == x and x ~= math.huge and x ~= -math.huge and form:format(x) or "0"
    end
    -- ties and near-ties of doubles (2^53 + 1 and neighbours), and the ends of the range
    for _, text in ipairs { "9007199254740993", "9007199254740992.5", "9007199254740993.0000000001",
      "5e-324", "2.4703282292062327e-324", "1.7976931348623157e308", "2.2250738585072011e-308",
      "1e23", "8.5e22", "-0", "123456789012345678901234567890", "0.000000000000000000000000000001" }
    do
      texts[#texts + 1] = text
    end
    local values = read_back(texts)
    for i, text in ipairs(texts) do
      local expected = tonumber(text:find "[.e]" and text or text .. ".0")
      assert.equal(string.pack("<d", expected), string.pack("<d", values[i]), text)
    end
  end)
end)
