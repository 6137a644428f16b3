-- More of tests/record_calls_spec.lua.
local calls = require "tests.support.record_calls"

describe("functions on records", function()
  for seed = 1, 4 do
    it("survive any arguments #slow " .. seed, function()
      local done, raised, odd = calls.try(6000, seed)
      assert(done > 6000 and raised > 6000)
      assert.equal(0, #odd, odd[1])
    end)
  end
end)
