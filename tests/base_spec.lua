-- base/: statuses, checked sizes, workers, the clock. Laws, no outside source.

local core = require "libration.core"
local probe = require "probe" -- built by `make probe`

describe("core", function()
  it("opens as one table per room", function()
    for _, room in ipairs { "base", "filter", "lines", "plan", "proof", "reading", "samples",
                            "spectrum", "store", "synth", "window" } do
      assert.are.equal("table", type(core[room]), room)
    end
  end)

  it("gives the same table to whoever requires it again", function()
    assert.are.equal(core, require "libration.core")
  end)
end)

describe("front door", function()
  local lb = require "libration"

  it("knows its version", function()
    assert.has_match("^%d+%.%d+%.%d+$", lb.version)
  end)

  it("has no answer for a room that does not exist", function()
    assert.is_nil(lb.no_such_room)
  end)

  it("sets no globals", function()
    local pipe = assert(io.popen([[lua5.4 -e '
      local before = {}
      for k in pairs(_G) do before[k] = true end
      local lb = require "libration"
      local _ = lb.units
      for k in pairs(_G) do if not before[k] then print(k) end end']], "r"))
    local printed = pipe:read("a")
    assert.is_true(pipe:close())
    assert.are.equal("", printed)
  end)
end)

describe("statuses", function()
  it("have a word and a sentence each, all different", function()
    local seen = {}
    for status = 0, probe.statuses - 1 do
      local code, text = probe.status_words(status)
      assert.has_match("^[a-z_]+$", code)
      assert.is_true(#text > 5, text)
      assert.is_nil(seen[code], code)
      assert.is_nil(seen[text], text)
      seen[code], seen[text] = true, true
    end
  end)

  it("beyond the last one say that they are unknown", function()
    for _, status in ipairs { probe.statuses, 1000, -1 } do
      assert.has_match("unknown", (select(2, probe.status_words(status))))
    end
  end)
end)

describe("checked sizes", function()
  it("multiply exactly up to the last size there is", function()
    assert.are.equal(24, (probe.size(3, 8)))
    assert.are.equal(0, (probe.size(0, 8)))
    assert.are.equal(-8, (probe.size(0x1fffffffffffffff, 8))) -- 2^64 - 8, seen as signed
  end)

  it("refuse what does not fit", function()
    for _, pair in ipairs { { 0x2000000000000000, 8 }, { -1, 2 }, { math.maxinteger, 3 } } do
      local bytes, code = probe.size(pair[1], pair[2])
      assert.is_nil(bytes)
      assert.are.equal("overflow", code)
    end
  end)

  it("guard memory, which comes zeroed", function()
    for _, count in ipairs { 0, 1, 4099 } do
      local had, zero = probe.alloc(count, 8)
      assert.is_true(had and zero, count)
    end
  end)
end)

describe("workers", function()
  local function once_each(runs)
    for number, count in ipairs(runs) do
      assert.are.equal(1, count, "task " .. number)
    end
  end

  local function run_each_once(workers_list)
    for _, workers in ipairs(workers_list) do
      for _, tasks in ipairs { 0, 1, 2, 37, 401 } do
        local status, runs, most, shared = probe.run(tasks, workers, {})
        assert.are.equal(0, status)
        assert.are.equal(tasks, #runs)
        once_each(runs)
        assert.is_true(most < 256 and (workers == 0 or most < workers))
        assert.are.equal(0, shared)
      end
    end
  end

  it("run every task once", function()
    run_each_once { 1, 2, 3, 7, 0 }
  end)

  it("run every task once, however many there are of them #slow", function()
    run_each_once { 64, 255, 256, 1000 }
  end)

  it("take one per core when no number is given", function()
    local _, _, most = probe.run(200, 0, {})
    assert.is_true(most < core.base.cores())
  end)

  it("report the lowest-numbered failure and stop handing out", function()
    for round = 1, 20 do
      local first = 1 + round * 7 % 100
      local fails = { [first] = 3, [first + 1] = 4, [first + 3] = 5 }
      local status, runs = probe.run(4000, round % 5 + 1, fails)
      assert.are.equal(3, status)
      for number = 1, first do
        assert.are.equal(1, runs[number])
      end
      assert.is_true(runs[4000] == 0 or round % 5 + 1 > 1, "nothing is handed out after it")
    end
  end)

  it("pass on the failure of a single task", function()
    assert.are.equal(2, (probe.run(1, 4, { 2 })))
    assert.are.equal(6, (probe.run(64, 4, { [64] = 6 })))
  end)
end)

describe("clock", function()
  it("agrees with the wall while something waits", function()
    local started = core.base.clock()
    os.execute("sleep 0.1")
    local taken = core.base.clock() - started
    assert.is_true(taken >= 0.1 and taken < 30, taken)
  end)

  it("tells two moments apart that are a microsecond from each other", function()
    local first, steps = core.base.clock(), 0
    while core.base.clock() == first do
      steps = steps + 1
      assert.is_true(steps < 1e6, "the clock stands still")
    end
    assert.is_true(core.base.clock() - first < 1)
  end)
end)

describe("cores", function()
  it("are those that the system lets this process use", function()
    local pipe = assert(io.popen("env -u OMP_NUM_THREADS -u OMP_THREAD_LIMIT nproc", "r"))
    local told = pipe:read("n") -- coreutils nproc reads the affinity mask, too
    pipe:close()
    assert.are.equal(told, core.base.cores())
  end)

  it("become fewer where an affinity mask says so", function()
    local pipe = assert(io.popen("taskset -c 0 lua5.4 -e "
      .. "'print(require(\"libration.core\").base.cores())' 2>&1", "r"))
    local told = pipe:read("a")
    pipe:close()
    assert.are.equal("1\n", told)
  end)
end)
