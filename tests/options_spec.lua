-- Strict option tables: everything wrong is said, once, with path and choices.

local options = require "libration.options"
local units = require "libration.units"

-- The message for one value under one kind, or nil and what it means.
local function judge(kind, value)
  local mistakes = options.mistakes()
  local meaning = kind(value, "x", mistakes)
  return mistakes.count > 0 and mistakes:message "options" or nil, meaning
end

local schema = {
  trials = { options.integer(1, 1000), default = 100 },
  within = { options.quantity(units.seconds, { above = 0, unit = "s" }), required = true,
    hint = 'give within = "60 s"' },
  reading = { options.choice { "bin", "tracked" } },
  lengths = { options.list(options.integer(1, 99), 1, 3) },
  side = { options.record { by = { options.text(), required = true } } },
}

describe("option tables", function()
  it("fill in defaults and keep what was given", function()
    local read = options.take(schema, { within = "1.5 min", lengths = { 3, 5 } }, "options")
    assert.same({ trials = 100, within = 90, lengths = { 3, 5 } }, read)
    assert.same(7, options.take({ n = { options.integer(1, 9), default = 7 } }, nil, "x").n)
  end)

  it("list all mistakes with path, value and choices", function()
    local ok, message = pcall(options.take, schema, { trails = 5, trials = 0, reading = "tracket",
      lengths = { 1, 200, "a", 4 }, side = { bye = 1 }, [3] = true }, "plan options")
    assert.is_false(ok)
    for _, part in ipairs {
      "plan options: 8 mistakes",
      'trails: no such field (did you mean "trials"?); fields: lengths, reading, side, trials',
      "[3]: no such field; fields:", "trials: 0 is out of range; give at least 1 and at most 1000",
      'reading: "tracket" is not one of bin, tracked (did you mean "tracked"?)',
      "lengths: 4 items; give 1 to 3", "side.by: missing", "side.bye: no such field",
      'within: missing; give within = "60 s"',
    } do
      assert.matches(part, message, 1, true)
    end
  end)

  it("refuse values of every wrong kind", function()
    local cases = {
      { options.text(), 5, "5 is not a text" }, { options.text(), "", "0 bytes" },
      { options.text(4), "12345", "5 bytes; give 1 to 4" },
      { options.text(), "a\nb", "one line" }, { options.text(), "\255", "UTF-8" },
      { options.boolean(), 1, "neither true nor false" },
      { options.choice { "a" }, {}, "a table is not one of a" },
      { options.integer(1, 9), 1.5, "not whole" }, { options.integer(1, 9), "x", "whole number" },
      { options.number { least = 0, below = 1 }, 1, "give at least 0 and less than 1" },
      { options.number { above = 0, most = 2 }, 0, "more than 0 and at most 2" },
      { options.number(), 0 / 0, "nan is not a finite number" },
      { options.number(), "1", '"1" is not a finite number' },
      { options.list(options.text(), 0, 9), "a", "not a list" },
      { options.list(options.text(), 0, 9), { x = 1 }, "not a list" },
      { options.list(options.text(), 0, 9), { "a", nil, "c" }, "not a list" },
      { options.list(options.text(), 0, 9), { "a", 2 }, "x[2]: 2 is not a text" },
      { options.record {}, print, "a function is not a table" },
    }
    for _, case in ipairs(cases) do
      assert.matches(case[3], judge(case[1], case[2]) or "accepted", 1, true)
    end
    assert.is_nil((judge(options.list(options.text(), 0, 9), {})))
    assert.is_nil((judge(options.boolean(), false)))
  end)

  it("stop listing after fifty, and say how many more there are", function()
    local many, list = {}, {}
    for i = 1, 80 do
      many["field" .. i], list[i] = i, 0
    end
    local numbers = { n = { options.list(options.integer(1, 9), 1, 99) } }
    local _, message = pcall(options.take, numbers, { n = list }, "options")
    assert.matches("options: 80 mistakes", message, 1, true)
    assert.matches("and 30 more", message, 1, true)
    _, message = pcall(options.take, numbers, many, "options")
    assert.matches("80 fields that there are not; fields: n", message, 1, true)
  end)

  it("never run, follow or trip over what a caller's table hides", function()
    local ran = false
    local trap = setmetatable({}, {
      __index = function() ran = true return 1 end, __pairs = function() ran = true end,
      __len = function() ran = true return 1e9 end, __tostring = function() error "boo" end,
      __eq = function() ran = true return true end, __metatable = "closed",
    })
    local _, message = pcall(options.take, schema, trap, "options")
    assert.matches("within: missing", message, 1, true)
    rawset(trap, "within", trap)
    rawset(trap, "reading", trap)
    rawset(trap, "lengths", trap)
    rawset(trap, "side", trap)
    rawset(trap, trap, trap)
    _, message = pcall(options.take, schema, trap, "options")
    assert.matches("[a table]: no such field", message, 1, true)
    assert.matches("side.side: no such field", message, 1, true)
    assert.is_false(ran)
  end)

  it("show values shortly and paths readably", function()
    assert.equal('"' .. ("x"):rep(57) .. '..."', options.show(("x"):rep(100)))
    assert.equal('a["b c"]', options.join("a", "b c"))
    assert.equal("a[2].ü", options.join(options.join("a", 2), "ü"))
    assert.is_nil(options.nearest("e", { "a", "b" }))
    assert.is_nil(options.nearest(("a"):rep(100), { ("a"):rep(99) }))
  end)
end)
