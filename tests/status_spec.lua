local core = require "libration.core"

describe("core", function()
  it("opens as one table per room", function()
    for _, room in ipairs { "base", "filter", "lines", "plan", "proof", "reading", "samples",
                            "spectrum", "store", "synth", "window" } do
      assert.are.equal("table", type(core[room]), room)
    end
  end)
end)
