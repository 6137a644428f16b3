-- Blocks and views of samples.

local core = require "libration.core"
local lb = require "libration"
local from = core.samples.from

local function raises(text, f, ...)
  local ok, message = pcall(f, ...)
  assert(not ok, "no error")
  assert(message:find(text, 1, true), message)
end

describe("samples", function()
  it("are a sequence with negative indices", function()
    local x = from { 1.5, 2.5, 4 }
    assert.equal(3, #x)
    assert.same({ 1.5, 2.5, 4.0, nil, nil, 4.0, 1.5, nil },
      { x[1], x[2], x[3], x[4], x[0], x[-1], x[-3], x[-4] })
    local seen = {}
    for i, v in ipairs(x) do
      seen[i] = v
    end
    assert.same({ 1.5, 2.5, 4.0 }, seen)
    x[2], x[-1] = 7, 8
    assert.same({ 1.5, 7.0, 8.0 }, x:totable())
    assert.is_nil(x.nothing)
  end)

  it("refuse indices and values that are none", function()
    local x = from { 1, 2 }
    raises("3 is outside 1 .. 2", function() x[3] = 1 end)
    raises("0 is outside 1 .. 2", function() x[0] = 1 end)
    raises("number", function() x[1] = "one" end)
    raises("number", function() x.name = 1 end)
    raises("number has no integer representation", function() x[1.5] = 1 end)
  end)

  it("are sliced without copying, and views keep their block alive", function()
    local view
    do
      local x = from { 1, 2, 3, 4, 5, 6 }
      view = x:slice(2, -2):slice(2)
      x[3] = 30
    end
    for _ = 1, 20 do
      collectgarbage()
      lb.samples.new(4096):fill(9)
    end
    assert.same({ 30.0, 4.0, 5.0 }, view:totable())
  end)

  it("check the ends of slices", function()
    local x = from { 1, 2, 3 }
    assert.equal(0, #x:slice(4, 3))
    assert.equal(0, #x:slice(1, 0))
    assert.equal(3, #x:slice(-3, -1))
    raises("5 is outside", x.slice, x, 5)
    raises("ends behind", x.slice, x, 1, 4)
    raises("ends before", x.slice, x, 3, 1)
    raises("0 is no index", x.slice, x, 0)
    raises("outside", x.slice, x, math.mininteger, math.maxinteger)
  end)

  it("calculate sample by sample and with numbers", function()
    local x, y = from { 1, 2, 3 }, from { 10, 20, 40 }
    assert(x + y == from { 11, 22, 43 } and y - x == from { 9, 18, 37 })
    assert(x * y == from { 10, 40, 120 } and y / x == from { 10, 10, 40 / 3 })
    assert(x + 1 == from { 2, 3, 4 } and 1 - x == from { 0, -1, -2 })
    assert(2 * x == x * 2 and 6 / x == from { 6, 3, 2 } and x / 2 == from { 0.5, 1, 1.5 })
    assert(-x == from { -1, -2, -3 } and x ~= y and x ~= from { 1, 2 })
    assert(from { 0 / 0 } ~= from { 0 / 0 })
    raises("2 samples cannot go with 3 samples", function() return x + from { 1, 2 } end)
    raises("number expected", function() return x + {} end)
  end)

  it("change in place on request only", function()
    local x = from { 1, 2 }
    local y = x:copy()
    assert(rawequal(x:add(y, 2):scale(10):add(5), x) and x == from { 35, 65 })
    assert(y == from { 1, 2 } and y:fill(x) == x and y:fill(0):sum() == 0)
    raises("cannot go with", x.add, x, from { 1 })
    raises("as many", x.fill, x, from { 1 })
  end)

  it("sum with an error that does not grow with the number", function()
    -- Exact sum of n times 0.1 as doubles: n * 0x1.999999999999ap-4.
    local n = 1000003
    local x = core.samples.new(n):fill(0.1)
    assert.near(n * 0.1, x:sum(), 2e-11)
    assert.near(0.1, x:mean(), 1e-16)
    -- a large offset that cancels: naive summation loses four digits here
    local big = core.synth.gaussian(core.samples.new(1 << 16), 1, {})
    local sum = big:sum()
    assert.near(sum, (big + 1e6):add(-1e6):sum(), 1e-5)
  end)

  it("tell figures that follow from their definitions", function()
    local list = {}
    for i = 1, 777 do
      list[i] = math.sin(i * i * 0.7385) * 3 - 0.2
    end
    local sum, squares, least, most = 0, 0, math.huge, -math.huge
    for _, v in ipairs(list) do
      sum, squares = sum + v, squares + v * v
      least, most = math.min(least, v), math.max(most, v)
    end
    local x = from(list)
    assert.near(sum, x:sum(), 1e-11)
    assert.near(math.sqrt(squares / 777), x:rms(), 1e-14)
    assert.near(squares, x:dot(x), 1e-10)
    assert.equal(least, x:min())
    assert.equal(most, x:max())
    assert.equal(math.max(-least, most), x:peak())
    local nan = from { 1, 0 / 0, 2 }
    assert(nan:min() ~= nan:min() and nan:max() ~= nan:max() and nan:peak() ~= nan:peak())
  end)

  it("have a root mean square wherever doubles reach", function()
    assert.near(1, from { 3e200, -4e200 }:rms() / (5e200 / math.sqrt(2)), 1e-15)
    assert.near(1, from { 3e-200, 4e-200 }:rms() / (5e-200 / math.sqrt(2)), 1e-15)
    assert.equal(0, from { 0, 0 }:rms())
    assert.equal(math.huge, from { math.huge, 1 }:rms())
    for _, name in ipairs { "mean", "rms", "min", "max", "peak" } do
      raises("no samples", core.samples.new(0)[name], core.samples.new(0))
    end
  end)

  it("go through bytes and tables unchanged", function()
    local x = from { 0.1, -0.0, 1e308, 5e-324, math.huge }
    assert.equal(string.pack("<ddddd", 0.1, -0.0, 1e308, 5e-324, math.huge), x:pack())
    assert(core.samples.unpack(x:pack()) == x and lb.samples.new(x:totable()) == x)
    raises("multiple of 8", core.samples.unpack, "1234567")
    raises("item 2 is a string", core.samples.from, { 1, "2" })
    raises("not from boolean", lb.samples.new, true)
  end)

  it("refuse sizes that no machine has before they allocate", function()
    local before = collectgarbage "count"
    raises("out of memory", core.samples.new, 1 << 50)
    raises("not a count", core.samples.new, -1)
    raises("not a count", core.samples.new, math.maxinteger)
    assert(collectgarbage "count" - before < 64)
  end)

  it("keep their metatables to themselves and print briefly", function()
    assert.equal("libration.samples", getmetatable(core.samples.new(1)))
    assert.equal("libration.raw", getmetatable(core.samples.raw("", "int16")))
    assert.equal("2 samples, 1 to 2, rms 1.58114", tostring(from { 1, 2 }))
    assert.equal("no samples", tostring(core.samples.new(0)))
    raises("libration.samples expected", from { 1 }.slice, {}, 1)
    raises("libration.samples expected", from { 1 }.slice, core.samples.raw("", "int16"), 1)
  end)
end)

describe("raw samples", function()
  local formats = { int16 = "<i2", int24 = "<i3", int32 = "<i4", float32 = "<f" }

  it("are the codes that were stored, times the scale", function()
    for kind, format in pairs(formats) do
      local top = kind == "float32" and 1 or 2 ^ (8 * string.packsize(format) - 1)
      local codes = kind == "float32" and { -1, 0.5, 1, 0 } or { -top, -1, 0, 1, top - 1 }
      local packed = {}
      for i, code in ipairs(codes) do
        packed[i] = string.pack(format, kind == "float32" and code or math.tointeger(code))
      end
      local r = core.samples.raw(table.concat(packed), kind)
      assert.equal(#codes, #r)
      assert.equal(kind, r:kind())
      local scaled = r:tosamples(5 / top)
      for i, code in ipairs(codes) do
        assert.equal(code, r[i])
        assert.equal(5 / top * code, scaled[i])
      end
      assert.equal(codes[#codes], r[-1])
      assert.is_nil(r[#codes + 1])
      assert.equal(codes[2], r:slice(2)[1])
    end
  end)

  it("convert alike at every length and start", function()
    local bytes = {}
    for i = 1, 300 do
      bytes[i] = string.char((i * i * 31 + i) % 256)
    end
    local r = core.samples.raw(table.concat(bytes), "int24")
    local all = r:tosamples()
    for first = 1, 40 do
      assert(r:slice(first, -first):tosamples() == all:slice(first, -first))
    end
  end)

  it("keep their bytes alive", function()
    local r = core.samples.raw(("\1\2"):rep(5000), "int16"):slice(4001)
    for _ = 1, 10 do
      collectgarbage()
      local _ = ("x"):rep(10000)
    end
    assert(r:tosamples() == core.samples.new(1000):fill(513))
  end)

  it("refuse what does not fit", function()
    raises('"int8" is none of int16, int24, int32, float32', core.samples.raw, "", "int8")
    raises("whole number of samples", core.samples.raw, "12345", "int24")
    raises("not finite", core.samples.raw("", "int16").tosamples,
      core.samples.raw("", "int16"), 1 / 0)
    raises("string expected", core.samples.raw, 12, "int16")
  end)
end)
