-- Damaged data files planned: a share of what tests/long does ten thousand times.
local damaged = require "tests.support.damaged_plans"

describe("damaged data files, planned #slow", function()
  it("give an error, a refusal or a plan, 300 times", function()
    local seen = damaged.try_many(300, 7)
    assert.is_true(seen.plan >= 30 and seen.refusal >= 20 and seen["refused file"] >= 30,
      ("%d plans, %d refusals, %d refused files"):format(seen.plan, seen.refusal,
        seen["refused file"]))
  end)

  it("plan when they are whole", function()
    local lb, parse = require "libration", require("libration.load").parse
    for _, text in ipairs(damaged.whole) do
      local data = assert(parse(text))
      local options = { windows = { "hann", "hft70" }, undersample = true }
      assert(lb.plan(data.demand, data.digitizer, options))
    end
  end)
end)
