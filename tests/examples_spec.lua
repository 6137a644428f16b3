local lfs = require "lfs"

local function run(words)
  local out = os.tmpname()
  local _, _, code = os.execute("scripts/libration " .. words .. " >" .. out .. " 2>&1 </dev/null")
  local file = assert(io.open(out))
  local said = file:read "a"
  file:close()
  os.remove(out)
  return code, said
end

describe("the examples", function()
  -- What each must say: its answer.
  local answers = {
    ["drifting-lines"] = "drift 0.5 %", ["fold-map"] = "switching 1     6500 Hz shows at   1500 Hz",
    ["measure-record"] = "low", ["pump-skid"] = "holds: no bound passed",
    ["run-up"] = "order 7 has 1.200 m/s^2", undersampling = "upper: 40320 Hz shows at",
  }
  for name in lfs.dir "examples" do
    local stem = name:match "^(.*)%.lua$"
    if stem and stem ~= "demo" then
      it(stem .. " gives its answer", function()
        local code, said = run("examples/" .. name)
        assert.equal(0, code, said)
        local answer = assert(answers[stem], "an example without an answer")
        assert.truthy(said:find(answer, 1, true), said)
      end)
    end
  end

  it("include a data file that can be planned", function()
    local code, said = run "plan examples/pump-skid.demand"
    assert.equal(0, code, said)
    assert.truthy(said:find("invented for the demo", 1, true))
  end)
end)

describe("the demo", function()
  it("goes from a refusal to a measured record, and leaves its files", function()
    local folder = os.tmpname()
    os.remove(folder)
    local code, said = run("examples/demo.lua 20 " .. folder)
    local names = {}
    for name in lfs.dir(folder) do
      names[name] = lfs.attributes(folder .. "/" .. name, "size")
    end
    os.execute("rm -r " .. folder)
    assert.equal(0, code, said)
    assert.truthy(said:find("cannot be measured as demanded", 1, true))
    assert.truthy(said:find("holds every tolerance", 1, true))
    assert.truthy(said:find("the plan holds.", 1, true))
    local _, steps = said:gsub("\n== Step %d+:", "")
    assert.equal(steps, tonumber(said:match "\nThese (%d+) steps took %d+ s: "))
    for _, name in ipairs { "fold-map.svg", "fold-map.png", "spectrum.svg", "spectrum.png",
                            "pump-skid.wav", "pump-skid.plan", "plan.json", "lines.csv",
                            "report.txt" } do
      assert.is_true((names[name] or 0) > 100, name)
    end
  end)
end)
