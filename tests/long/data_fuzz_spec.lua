-- Ten thousand damaged data files; the suite's own share is 1000.
local damaged = require "tests.support.damaged_data"

describe("damaged data files", function()
  it("are loaded or refused, 10 000 times", function()
    local seen = damaged.try_many(10000, 1)
    assert.is_true(seen.loaded > 200 and seen.refused > 5000)
    assert.is_true(seen.most < 64)
  end)
end)
