-- Data files: what they may say, what they may not, and writing them.

local fraction = require("libration.core").base.fraction
local inert = require "libration.inert"

local function reason_of(text)
  local value, reason, code = inert.read(text)
  assert.is_nil(value)
  assert.equal("format", code)
  return reason
end

describe("data files", function()
  it("hold strings, numbers, truth and tables", function()
    local data = assert(inert.read [==[
-- a comment
demand = {
  title = "Pümpe", 'single', [3] = 3, ["a b"] = { true, false; 1e-3 }, --[[ a longer
  comment ]] ünit = -0.5,
};
empty = {} more = "tab\tquote\"\x41\\"
]==])
    assert.same({
      demand = { title = "Pümpe", "single", [3] = 3, ["a b"] = { true, false, 0.001 },
        ["ünit"] = -0.5 },
      empty = {}, more = 'tab\tquote"A\\',
    }, data)
    assert.same({}, inert.read "")
    assert.same({ x = 1 }, inert.read "\239\187\191x = 1")
    assert.equal("integer", math.type(inert.read("x = 5").x))
    assert.equal("float", math.type(inert.read("x = 5.0").x))
    assert.equal(-math.huge, 1 / inert.read("x = -0").x)
  end)

  it("can do nothing", function()
    for _, text in ipairs {
      "x = os.exit()", "x = f'a'", "x = f{}", "x = (1)", "x = 1 + 1", "x = 2^3", "x = #y",
      "x = function() end", "while true do end", "for i = 1, 2 do end", "return { 1 }",
      "local x = 1", "x.y = 1", "x[1] = 2", "goto a", "::a::", "x = y", "x = {}.y", "x = nil",
      "x = { y = nil }", "x = 'a' .. 'b'", "x = not true", "x = [[long]]", "x = 0x10", "x = ...",
      "x, y = 1, 2", "x == 1", "x = { a == 1 }", "x = { a.b = 1 }", "x = require 'os'",
    } do
      assert.is_string(reason_of(text), text)
    end
  end)

  it("say where each mistake is, several in one go", function()
    local reason = reason_of 'x = { a = os, b = 1 c = 2,\n  "é" é }\ny = { 1e999 }\n'
    assert.equal([[
1:11: "os" is not a value; values are "text", numbers, true, false and { ... }
1:21: "," or "}" expected before "c"
2:7: "," or "}" expected before "é"
3:7: this number is beyond the largest double]], reason)
  end)

  it("name every kind of mistake", function()
    local cases = {
      { "x = {", '1:5: this "{" is not closed' }, { "x = 'a", "not closed on its line" },
      { "x = 'a\nb'", "1:5: this string" }, { "x = '\\q'", "unknown escape" },
      { "x = '\\xg0'", "unknown escape" }, { "x = { a = 1, a = 2 }", "a is given twice" },
      { "x = 1 x = 2", "1:7: x is given twice" }, { "x = { 1, [1] = 2 }", "1 is given twice" },
      { "x = { [{}] = 1 }", "a key is a name" }, { "x = { [1.5] = 1 }", "a key is a name" },
      { "x = { ['a' = 1 }", "a key is a name" }, { "x = { ['a'] 1 }", '"=" expected' },
      { "x", '"name = value" expected' }, { "x =", "the end of the file is not a value" },
      { "= 1", '"name = value" expected' }, { "x = 1.2.3", '"1.2.3" is not a number' },
      { "x = 1e", '"1e" is not a number' }, { "x = 5V", '"5V" is not a number' },
      { "x = -", "is not a value" }, { "--[[ x", "this comment is not closed" },
      { "x = 1,5", '"name = value" expected before "5"' },
    }
    for _, case in ipairs(cases) do
      assert.matches(case[2], reason_of(case[1]), 1, true)
    end
  end)

  it("are text of bounded size, depth and number of entries", function()
    assert.matches("byte 5 is 0", reason_of "x = \0", 1, true)
    assert.matches("byte 1 is 127", reason_of "\127ELF", 1, true)
    assert.matches("not UTF-8 text: byte 6", reason_of "x = '\255'", 1, true)
    assert.matches("at most 1048576", reason_of(("-"):rep((1 << 20) + 1)), 1, true)
    local function nested(n)
      return "x = " .. ("{"):rep(n) .. "1" .. ("}"):rep(n)
    end
    assert.is_table(inert.read(nested(32)))
    assert.matches("more than 32 tables", reason_of(nested(33)), 1, true)
    assert.matches("more than 32 tables", reason_of("x = " .. ("{"):rep(500000)), 1, true)
    assert.equal(99999, #inert.read("x = {" .. ("1,"):rep(99999) .. "}").x)
    assert.matches("more than 100000 entries", reason_of("x = {" .. ("1,"):rep(100001) .. "}"), 1,
      true)
  end)

  it("come from the file system or are refused by it", function()
    local path = os.tmpname()
    local file = assert(io.open(path, "wb"))
    assert(file:write "x = { 1,\n y }")
    assert(file:close())
    local value, reason, code = inert.read_file(path)
    assert.is_nil(value)
    assert.equal("format", code)
    assert.equal(path .. ':2:2: "y" is not a value; values are "text", numbers, true, false and '
      .. "{ ... }", reason)
    os.remove(path)
    for _, refused in ipairs { path, "/", "" } do
      value, reason, code = inert.read_file(refused)
      assert.is_nil(value)
      assert.equal("io", code)
      assert.is_string(reason)
    end
    -- a device without an end is read no further than the limit
    assert.matches("at most 1048576", select(2, inert.read_file "/dev/zero"), 1, true)
  end)
end)

describe("writing data", function()
  -- Random plain tables: strings of any bytes, numbers of any bits.
  local function draw(depth)
    local kind = math.random(depth > 0 and 6 or 4)
    if kind == 1 then
      return math.random(0) >> math.random(0, 63)
    elseif kind == 2 then
      local x = ("d"):unpack(("j"):pack(math.random(0)))
      return x - x == 0 and x or 0.1
    elseif kind == 3 then
      local bytes = {}
      for i = 1, math.random(0, 8) do
        bytes[i] = string.char(math.random(0, 255))
      end
      return table.concat(bytes)
    elseif kind == 4 then
      return math.random() < 0.5
    end
    local result = {}
    for i = 1, math.random(0, 5) do
      result[i] = draw(depth - 1)
    end
    for _ = 1, math.random(0, 3) do
      result[math.random() < 0.5 and "k" .. math.random(9) or draw(0) == 1 and "x" or "é ü"] =
        draw(depth - 1)
      result[math.random(-3, 9)] = draw(0)
    end
    return result
  end

  -- Tagged: memcheck computes long doubles in 64 bits, so last bits differ there.
  it("reads back equal, bit for bit #extended", function()
    math.randomseed(4242)
    for _ = 1, 300 do
      local data = { a = draw(4), b = draw(2) }
      local text = inert.write(data)
      local again, reason = inert.read(text)
      assert(again, reason)
      assert.same(data, again)
      assert.equal(text, inert.write(again))
    end
  end)

  it("is the same text whatever order a table was filled in", function()
    local one, two = {}, {}
    for i = 1, 50 do
      one["k" .. i], two["k" .. 51 - i] = i, 51 - i
    end
    assert.equal(inert.write { t = one }, inert.write { t = two })
    assert.equal("x = { 3, 1.5, a = true, b = \"1/3\" }\n",
      inert.write { x = { 3.0, 1.5, b = fraction(1, 3), a = true } })
    assert.equal("x = -0.0\n", inert.write { x = -0.0 })
  end)

  it("refuses what could not be read back, with its path", function()
    local loop = {}
    loop.again = loop
    local cases = {
      { { x = { 1, { y = 1 / 0 } } }, "x[2].y: inf cannot be written" },
      { { x = 0 / 0 }, "x: nan cannot be written" }, { { x = print }, "x: a function" },
      { { x = { [1.5] = 1 } }, "x: a number as key" }, { { x = { [{}] = 1 } },
        "x: a table as key" },
      { { x = loop }, "too deep, or contain themselves" }, { { 1 }, "the name 1 cannot" },
      { { ["a b"] = 1 }, "the name a b cannot" }, { { x = { [true] = 1 } }, "a boolean as key" },
    }
    for _, case in ipairs(cases) do
      local ok, message = pcall(inert.write, case[1])
      assert.is_false(ok)
      assert.matches(case[2], message, 1, true)
    end
  end)
end)
