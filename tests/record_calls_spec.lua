local calls = require "tests.support.record_calls"

describe("functions on records", function()
  it("survive any arguments, and name the wrong one", function()
    local done, raised, odd = calls.try(1000, 7)
    assert(done > 1000 and raised > 1000)
    assert.equal(0, #odd, odd[1])
  end)
end)
