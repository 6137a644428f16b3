-- Ten thousand damaged data files planned; the suite's own share is 300.
local damaged = require "tests.support.damaged_plans"

describe("damaged data files, planned #slow", function()
  it("give an error, a refusal or a plan, 10 000 times", function()
    local seen = damaged.try_many(10000, 1)
    print(("%d plans, %d refusals, %d errors, %d refused files; at most %.1f s and %.1f MiB")
      :format(seen.plan, seen.refusal, seen.error, seen["refused file"], seen.seconds,
        seen.memory))
    assert.is_true(seen.plan > 1000 and seen.refusal > 500)
  end)
end)
