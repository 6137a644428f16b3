local core = require "libration.core"
local fraction = require "libration.fraction"
local gnuplot = require "libration.report.gnuplot"
local lanes = require "libration.report.lanes"
local lfs = require "lfs"
local plot = require "libration.report.plot"
local sample = require "tests.support.plan_sample"
local sources = require "libration.report.sources"

local folder

local function read(path)
  local file = assert(io.open(path, "rb"))
  local bytes = file:read "a"
  file:close()
  return bytes
end

local function names_in(path)
  local names = {}
  for name in lfs.dir(path) do
    if name ~= "." and name ~= ".." then
      names[#names + 1] = name
    end
  end
  table.sort(names)
  return names
end

before_each(function()
  folder = os.tmpname()
  os.remove(folder)
  assert(lfs.mkdir(folder))
end)

after_each(function()
  for _, name in ipairs(names_in(folder)) do
    os.remove(folder .. "/" .. name)
  end
  lfs.rmdir(folder)
end)

describe("pictures", function()
  for name, draw in pairs { fold_map = plot.fold_map, spectrum = plot.spectrum } do
    it(name .. " is a whole PNG of the stated size", function()
      assert(draw(sample(), folder .. "/a.png"))
      local bytes = read(folder .. "/a.png")
      assert.equal("\137PNG\r\n\26\n", bytes:sub(1, 8))
      local width, height = (">I4I4"):unpack(bytes, 17)
      assert.same({ 1280, 860 }, { width, height })
      assert.same({ "a.png" }, names_in(folder))
    end)

    it(name .. " is an SVG that parses and holds every name", function()
      assert(draw(sample(), folder .. "/a.svg"))
      local check = "python3 -c 'import sys, xml.etree.ElementTree as e; e.parse(sys.argv[1])' "
      assert.is_true((os.execute(check .. folder .. "/a.svg")))
      local svg = read(folder .. "/a.svg")
      for _, text in ipairs { "shaft", "vane pass", "Lüfter 温度", "mains 1 .. 20", "inverter" } do
        assert.truthy(svg:find(text, 1, true), text)
      end
    end)

    it(name .. " can be text", function()
      assert(draw(sample(), folder .. "/a.txt"))
      assert.truthy(read(folder .. "/a.txt"):find "A")
    end)
  end

  it("are not harmed by hostile text", function()
    local mark = folder .. "/harm"
    for _, evil in ipairs {
      "`touch " .. mark .. "`", "$(touch " .. mark .. ")", '"; system("touch ' .. mark .. '"); "',
      "'\"\\n", "a\nsystem 'touch " .. mark .. "'", "@x %s {/Symbol a}_b^c", "END_OF_DATA",
    } do
      local plan = sample(evil)
      plan.demand.lines[1].name, plan.lines[1].name = evil, evil
      assert(plot.fold_map(plan, folder .. "/a.svg"))
      assert(plot.spectrum(plan, folder .. "/b.svg"))
      assert.is_nil(lfs.attributes(mark))
    end
    local back = read(folder .. "/a.svg")
    assert.truthy(back:find("END_OF_DATA", 1, true))
  end)

  it("refuse text that cannot be drawn", function()
    for _, bad in ipairs { "a\0b", "\xff" } do
      local done, message, code = plot.fold_map(sample(bad), folder .. "/a.svg")
      assert.same({ nil, "format" }, { done, code })
      assert.truthy(message:find "UTF%-8")
      local plan = sample()
      plan.demand.lines[1].name = bad
      assert.equal("format", select(3, plot.fold_map(plan, folder .. "/a.svg")))
      assert.equal("format", select(3, plot.spectrum(plan, folder .. "/a.svg")))
    end
    assert.same({}, names_in(folder))
  end)

  it("treat a path as a name, never as a command", function()
    local path = folder .. "/|touch x;`y`$(z) 'q'\".svg"
    local here = lfs.currentdir()
    assert(lfs.chdir(folder))
    local done, message = plot.fold_map(sample(), "|touch harm; a'b.svg")
    lfs.chdir(here)
    assert(done, message)
    assert.is_nil(lfs.attributes(folder .. "/harm"))
    assert.equal("file", lfs.attributes(folder .. "/|touch harm; a'b.svg", "mode"))
    os.remove(folder .. "/|touch harm; a'b.svg")
    assert.is_nil(lfs.attributes(path))
  end)

  it("return the reason when they cannot be written", function()
    local done, message, code = plot.fold_map(sample(), folder .. "/no/a.svg")
    assert.same({ nil, "io" }, { done, code })
    assert.truthy(message:find(folder .. "/no/a.svg", 1, true))
    os.execute("ln -s /dev/full " .. folder .. "/full.svg")
    done, message, code = plot.fold_map(sample(), folder .. "/full.svg")
    assert.same({ nil, "io" }, { done, code })
    assert.truthy(message:find "full.svg")
    assert.equal("domain", select(3, plot.spectrum(sample(), "a.doc")))
  end)

  it("leave an older picture when drawing fails", function()
    assert(plot.fold_map(sample(), folder .. "/a.svg"))
    local before = read(folder .. "/a.svg")
    assert.is_nil((gnuplot.save(folder .. "/a.svg", { "no such command" }, 100, 100)))
    assert.equal(before, read(folder .. "/a.svg"))
    local _, message = gnuplot.draw("svg", { "plot nonsense(" }, 100, 100)
    assert.truthy(message:find "gnuplot failed")
  end)
end)

describe("sources", function()
  it("stand where the fold arithmetic of the core puts them", function()
    local plan = sample()
    plan.rate = fraction.new(20000)
    local list = sources.list(plan)
    local inverter = list[#list]
    assert.equal(4000, inverter.shown_hz)
    assert.is_true(inverter.inverted)
    assert.near(16000 * 0.004, inverter.half, 1e-9)
    assert.equal((core.plan.fold(16000, 20000)), inverter.shown_hz)
  end)
end)

describe("names in lanes", function()
  local function marks(count, spread)
    local list = {}
    for i = 1, count do
      list[i] = { name = ("name%s"):format(string.char(96 + i):rep(3)), kind = "line",
        x = 0.5 + (i - 1) * spread }
    end
    return list
  end

  it("never overlap, and every name is placed or counted", function()
    for _, spread in ipairs { 0.0001, 0.003, 0.02, 0.04 } do
      local placed, used, left_out = lanes.place(lanes.group(marks(12, spread)), 0.007, 9)
      assert.equal(12, #placed + left_out)
      for i, a in ipairs(placed) do
        assert.is_true(a.left >= -1e-9 and a.right <= 1 + 1e-9 and a.lane <= used)
        for k = i + 1, #placed do
          local b = placed[k]
          assert.is_true(a.lane ~= b.lane or a.right < b.left or b.right < a.left)
        end
      end
    end
  end)

  it("share one name among many orders, not among few", function()
    local many, few = {}, {}
    for k = 1, 6 do
      many[k] = { name = "mains " .. k, kind = "interferer", x = k / 10 }
    end
    for k = 1, 3 do
      few[k] = { name = "mains " .. k, kind = "interferer", x = k / 10 }
    end
    assert.equal("mains 1 .. 6", lanes.group(many)[1].text)
    assert.equal(3, #lanes.group(few))
  end)
end)
