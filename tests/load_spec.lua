-- Data files that hold demands and digitizers.

local lb = require "libration"
local damaged = require "tests.support.damaged_data"
local parse = require("libration.load").parse

local function reason_of(text)
  local value, reason, code = parse(text, "f")
  assert.is_nil(value)
  assert.equal("format", code)
  return reason
end

describe("loading", function()
  it("gives the same as stating it in a script", function()
    local path = os.tmpname()
    local file = assert(io.open(path, "wb"))
    assert(file:write(damaged.whole[1]))
    assert(file:close())
    local data = assert(lb.load(path))
    os.remove(path)
    assert.equal(tostring(lb.demand(data.demand.source)), tostring(data.demand))
    assert.equal("divider", data.digitizer.rates.kind)
    assert.equal(data.digitizer, data.digitizers[1])
    assert.is_nil(parse('digitizers = { { rate = 3 }, { rate = 4 } }').demand)
    assert.equal(2, #parse('digitizers = { { rate = 3 }, { rate = 4 } }').digitizers)
  end)

  it("tells what is wrong in all parts in one go", function()
    local reason = reason_of ('demand = { lines = { {} } } digitizer = { rate = 3, bits = 99 } '
      .. "digitzer = 1")
    for _, part in ipairs {
      "f: 7 mistakes", 'digitzer: no such part (did you mean "digitizer"?)',
      "demand.unit: missing", "demand.lines[1].name: missing", "demand.lines[1]: no amplitude",
      "digitizer.bits: 99 is out of range",
    } do
      assert.matches(part, reason, 1, true)
    end
    assert.matches("neither a demand nor a digitizer", reason_of "", 1, true)
    assert.matches("digitizers[2].rates: 0 items",
      reason_of "digitizers = { { rate = 3 }, { rates = {} } }", 1, true)
    assert.matches("give digitizer = { ... } or digitizers",
      reason_of "digitizers = { { rate = 3 } } digitizer = { rate = 3 }", 1, true)
    assert.matches("demand: 5 is not a table", reason_of "demand = 5", 1, true)
    assert.matches("demand: false is not a table", reason_of "demand = false", 1, true)
    assert.matches("digitizer: false is not a table", reason_of "digitizer = false", 1, true)
    assert.equal('f:1:10: "os" is not a value; values are "text", numbers, true, false and { ... }',
      (reason_of "demand = os"))
  end)

  it("refuses what the file system refuses", function()
    for _, path in ipairs { "/no/such/file", "/", "" } do
      local data, reason, code = lb.load(path)
      assert.is_nil(data)
      assert.is_string(reason)
      assert.equal("io", code)
    end
  end)

  it("survives what is as large and as bad as the limits allow", function()
    local function lines(count, line)
      local parts = {}
      for i = 1, count do
        parts[i] = line:gsub("#", tostring(i))
      end
      return 'demand = { unit = "V", defaults = { amplitude = 1, tolerance = 0.01 }, lines = {'
        .. table.concat(parts, ",") .. "} }"
    end
    local million = (1 << 20) - 200
    local cases = {
      refused = {
        lines(2000, '{ name = "a#", hz = 1, orders = "1..1000" }'),
        lines(2000, '{ name = "a#", of = "b#", times = 2 }'),
        lines(2000, '{ name = "a#", hz = 1, sidebands = { by = "a#", orders = "1..1000" } }'),
        lines(2000, '{ name = "a", hz = 1 }'), lines(2000, "{ x# = 1, y# = 2, z = 3 }"),
        lines(1, '{ name = "a", hz = 1, orders = "' .. ("1..1000,"):rep(million // 8) .. '" }'),
        lines(1, '{ name = "a", hz = "' .. (" "):rep(million) .. 'x" }'),
        lines(1, '{ name = "a", hz = "' .. ("9"):rep(million) .. '" }'),
        lines(1, '{ name = "a", hz = "1 ' .. ("m*"):rep(million // 2) .. '" }'),
        lines(1, '{ name = "a", hz = 1, drift = "' .. (" "):rep(million) .. '1 %" }'),
        lines(1, '{ name = "a", hz = 1, amplitude = "' .. ("1.."):rep(million // 3) .. '" }'),
        lines(99999 // 2, '{ [#] = # }'), "x = {" .. ("{},"):rep(99998) .. "}",
        ("x={"):rep(million // 3), ("'"):rep(million), ("--[["):rep(million // 4),
        "x = {" .. ("{a,"):rep(million // 3), "x = '" .. ("\\"):rep(million // 2) .. "'",
        ("a"):rep(million), (" "):rep(million), ("a = 1 "):rep(million // 6),
        ("-- x\n"):rep(million // 6) .. "x",
      },
      loaded = {
        lines(1500, '{ name = "a#", hz = #, sidebands = { by = "a1", orders = "0.5" } }'),
        lines(2, '{ name = "a#", hz = #, orders = "1..1000" }'),
        lines(200, '{ name = "a#", hz = #, orders = "1..20" }'),
      },
    }
    for outcome, texts in pairs(cases) do
      for i, text in ipairs(texts) do
        assert.equal(outcome, (damaged.judge(text, i)), outcome .. " " .. i)
      end
    end
  end)

  it("follows a chain of locks as long as may be written", function()
    local parts = { '{ name = "a1", hz = 1 }' }
    for i = 2, 2000 do
      parts[i] = ('{ name = "a%d", of = "a%d", times = 1 }'):format(i, i - 1)
    end
    local text = 'demand = { unit = "V", defaults = { amplitude = 1, tolerance = 0.01 }, '
      .. "lines = {%s} }"
    local forward = text:format(table.concat(parts, ","))
    assert.equal("loaded", (damaged.judge(forward, 1)))
    for i = 1, 1000 do
      parts[i], parts[2001 - i] = parts[2001 - i], parts[i]
    end
    damaged.judge(text:format(table.concat(parts, ",")), 2)
  end)

  it("survives a thousand damaged files within time and memory", function()
    local seen = damaged.try_many(1000, 20260512)
    assert.is_true(seen.loaded > 20 and seen.refused > 500)
  end)
end)
