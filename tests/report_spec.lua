local cjson = require "cjson"
local csv = require "libration.report.csv"
local facts = require "libration.report.facts"
local fraction = require "libration.fraction"
local json = require "libration.json"
local layout = require "libration.report.table"
local numbers = require "libration.report.numbers"
local sample = require "tests.support.plan_sample"
local text = require "libration.report.text"

local function lines_of(block)
  local lines = {}
  for line in (block .. "\n"):gmatch "(.-)\n" do
    lines[#lines + 1] = line
  end
  return lines
end

describe("numbers for people", function()
  it("never print an error smaller or a tolerance larger than it is", function()
    local seed = 12345
    for _ = 1, 5000 do
      seed = (seed * 1103515245 + 12345) % 2 ^ 31
      local value = (1 + seed / 2 ^ 31 * 9) * 10 ^ (seed % 19 - 9)
      local up, down = tonumber(numbers.error(value)), tonumber(numbers.tolerance(value))
      assert.is_true(up >= value * (1 - 1e-11) and up <= value * 1.0101, numbers.error(value))
      assert.is_true(down <= value * (1 + 1e-11) and down >= value * 0.9899)
    end
  end)

  it("carry over where rounding adds a digit", function()
    assert.equal("1.00", numbers.error(0.9999))
    assert.equal("0.100", numbers.error(0.0999999))
    assert.equal("999", numbers.tolerance(999.9))
    assert.equal("0.999", numbers.round(0.9999, 3, -1))
  end)

  it("keep what is exact and mark what is not", function()
    assert.equal("0.1", numbers.error(0.1):gsub("0*$", ""))
    assert.equal("24.6", numbers.exact(fraction.new "24.6"))
    assert.equal("~24625.2505", numbers.exact(fraction.new "12288000/499"))
    assert.equal("none", numbers.tolerance(math.huge))
    assert.equal("unbounded", numbers.error(math.huge))
  end)

  it("write times in a unit that suits", function()
    assert.equal("1.500 ms", numbers.time(0.0015))
    assert.equal("599.0 s", numbers.time(599))
    assert.equal("11 min", numbers.time(601))
    assert.equal("2 h 0 min", numbers.time(7200))
  end)

  it("overflow their bar visibly", function()
    assert.equal("##########!", numbers.bar(1.01))
    assert.equal("##########", numbers.bar(1))
    assert.equal("..........", numbers.bar(0.001))
    assert.equal("..........", numbers.bar(0.0499))
    assert.equal("#.........", numbers.bar(0.05))
    assert.equal("#.........", numbers.bar(0.1))
    assert.equal("##........", numbers.bar(0.101))
    assert.equal("..........", numbers.bar(0))
  end)
end)

describe("tables", function()
  local columns = { { head = "name" }, { head = "value", unit = "Hz", align = "point" },
    { head = "end" } }

  it("line up columns whatever the width of the letters", function()
    local rows = layout.layout(columns, {
      { "a", "1.5", "|" }, { "温度", "100", "|" }, { "e\u{301}µ", "22.25", "|" }, { "", "", "|" } })
    local place
    for i = 4, #rows do
      local before = rows[i]:match "^(.*)|$"
      place = place or layout.width(before)
      assert.equal(place, layout.width(before))
    end
    assert.equal(layout.width(rows[4]:match "^(.-)%."), layout.width(rows[6]:match "^(.-)%."))
  end)

  it("show what would steer a terminal as a replacement", function()
    local safe = layout.safe "a\27[31m\nb\u{202E}c\xffd"
    assert.equal("a\u{FFFD}[31m\u{FFFD}b\u{FFFD}c\u{FFFD}d", safe)
    assert.truthy(utf8.len(safe))
  end)
end)

describe("a plan as text", function()
  it("says the verdict, and every line once", function()
    local block = text.plan(sample())
    assert.truthy(block:find("holds every tolerance with 23 % to spare", 1, true))
    assert.truthy(block:find("\n  systematic terms add, random ones (noise, quantisation, jitter "
      .. "noise) add in squares\n", 1, true))
    for _, name in ipairs { "shaft  ", "vane pass", "Lüfter 温度" } do
      assert.truthy(block:find("\n" .. name, 1, true), name)
    end
    assert.truthy(block:find("exactly 12288000/499 S/s", 1, true))
    assert.truthy(block:find("Advisory only", 1, true))
  end)

  it("never hides that a plan does not hold", function()
    assert.truthy(text.plan(sample(nil, 1.25)):find("does NOT hold", 1, true))
    assert.falsy(text.plan(sample(nil, 1.25)):find("holds every", 1, true))
    assert.truthy(text.verdict({ worst = 1 }):find("less than 0.1 %", 1, true))
  end)

  it("prints numbers that read back within their digits", function()
    local plan = sample()
    local rows = lines_of(text.lines(plan))
    local cells = {}
    for cell in rows[5]:gmatch "%S+" do
      cells[#cells + 1] = cell
    end
    assert.same({ "vane", "pass", "172.2" }, { cells[1], cells[2], cells[3] })
    assert.near(plan.lines[2].error, tonumber(cells[9]), 0.01 * plan.lines[2].error)
  end)

  it("orders a budget by size and says what is left out", function()
    local block = text.budget(sample(), "vane pass")
    local first, second = block:find("leakage", 1, true), block:find("own image", 1, true)
    assert.is_true(first < second and second < block:find("noise", 1, true))
    assert.has_error(function() text.budget(sample(), "no such") end)
  end)

  it("keeps a hostile title on its line", function()
    local block = text.plan(sample "x\27]0;y\7\nholds every tolerance")
    assert.falsy(block:find "[\27\7]")
    assert.falsy(block:find "\nholds every tolerance\n")
  end)
end)

describe("a refusal as text", function()
  it("names what binds and what helps", function()
    local block = text.refusal { demand = { title = "Pump" },
      binding = { line = "shaft", term = "leakage", from = "mains 1", limit = "within 1 s",
        ratio = 3.201 },
      relaxations = { { text = "within 4 s", plan = sample() } } }
    for _, part in ipairs { "shaft", "leakage from mains 1", "within 1 s", "321 %",
                            "within 4 s", "15.97 s" } do
      assert.truthy(block:find(part, 1, true), part)
    end
    assert.truthy(text.refusal({ message = "no", relaxations = {} })
      :find("No single change", 1, true))
  end)
end)

describe("JSON", function()
  it("reads back bit for bit", function()
    local list = { 0.1, 1 / 3, 1e-300, 5e-324, 1.7976931348623157e308, -0.0, 2 ^ 53 }
    local back = cjson.decode(json.encode(list))
    for i, value in ipairs(list) do
      assert.equal(value, back[i])
    end
  end)

  it("escapes every byte that needs it", function()
    local all = {}
    for byte = 0, 127 do
      all[#all + 1] = string.char(byte)
    end
    local whole = table.concat(all) .. "µ温"
    assert.equal(whole, cjson.decode(json.encode { whole })[1])
  end)

  it("refuses what it cannot say", function()
    for _, value in ipairs { { "\xff" }, { print }, { 1, a = 2 } } do
      local done, message, code = json.encode(value)
      assert.same({ nil, "format" }, { done, code })
      assert.is_string(message)
    end
    local loop = {}
    loop.a = loop
    assert.is_nil((json.encode(loop)))
  end)

  it("says infinite and unknown as null", function()
    assert.equal("[\n  null,\n  null\n]", json.encode { math.huge, 0 / 0 })
  end)

  it("holds the facts of a plan, exact and nearest", function()
    local back = cjson.decode(json.encode(facts.of(sample())))
    assert.equal("12288000/499", back.rate_exact)
    assert.equal(12288000 / 499, back.rate_hz)
    assert.equal("shaft", back.lines[1].name)
    assert.is_true(back.holds)
    assert.equal(3, #back.lines[1].budget)
  end)

  it("holds what is false, and leaves out what is no fact", function()
    local back = facts.of { holds = false, lines = { { outside = false, draw = print } } }
    assert.same({ holds = false, lines = { { outside = false } } }, back)
  end)
end)

describe("CSV", function()
  it("quotes, disarms formulas, and reads back", function()
    local out = csv.rows({ "name", "x" }, { { name = "=1+1", x = 0.1 }, { name = 'a,"b"', x = 2 } })
    assert.equal("name,x\r\n'=1+1,0.1\r\n\"a,\"\"b\"\"\",2\r\n", out)
  end)

  it("has a row for each line of a plan", function()
    local rows = lines_of((csv.plan(sample()):gsub("\r", "")))
    assert.equal(5, #rows) -- names, three lines, and what follows the last newline
    assert.equal("24.6", rows[2]:match "^shaft,([^,]*),")
  end)
end)
