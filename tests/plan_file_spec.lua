-- Saved plans: identity, what a changed file gives, and files that are none.
local lb = require "libration"

local demand = lb.demand { unit = "V", noise = "0.1 mV/rtHz", lines = {
  { name = "tone", hz = 100, drift = "0.1 %", amplitude = "0.5..1 V", tolerance = "1 %" },
  { name = "third", of = "tone", times = 3, amplitude = "0.1 V", tolerance = "2 %" } } }
local digitizer = lb.digitizer { clock = "1 MHz", divider = "100..2000", bits = 16,
  range = "2 V" }
local plan = assert(lb.plan(demand, digitizer))

local function with_file(content, work)
  local path = os.tmpname()
  local file = assert(io.open(path, "wb"))
  file:write(content)
  file:close()
  local results = table.pack(pcall(work, path))
  os.remove(path)
  assert(results[1], results[2])
  return table.unpack(results, 2, results.n)
end

local function saved(one)
  return with_file("", function(path)
    assert(one:save(path))
    local file = assert(io.open(path, "rb"))
    local text = file:read "a"
    file:close()
    return text
  end)
end

describe("a saved plan", function()
  it("comes back the same", function()
    local again = assert(with_file(saved(plan), lb.load_plan))
    assert.are.equal(plan.identity, again.identity)
    assert.are.equal(plan.rate, again.rate)
    assert.are.same({ plan.samples, plan.window, plan.reading, plan.worst, plan.averages },
      { again.samples, again.window, again.reading, again.worst, again.averages })
    assert.are.same(plan.setting, again.setting)
    for i, line in ipairs(plan.lines) do
      for _, field in ipairs { "name", "error", "ratio", "own", "others", "random" } do
        assert.are.equal(line[field], again.lines[i][field])
      end
      assert.are.same(line.budget, again.lines[i].budget)
    end
    assert.are.equal(tostring(plan), tostring(again))
    assert.are.equal(saved(plan), saved(again))
  end)

  it("has an identity of 64 hexadecimal digits that follows what is measured", function()
    assert.matches("^%x+$", plan.identity)
    assert.are.equal(64, #plan.identity)
    assert.are.equal(plan.identity, lb.plan(demand, digitizer).identity)
    local other = lb.plan(demand, digitizer, { share = "50 %" })
    assert.are_not.equal(plan.identity, other.identity)
  end)

  it("measures and proves as the first one", function()
    local again = assert(with_file(saved(plan), lb.load_plan))
    local record = plan:replay { trial = 3 }
    assert.are.same(record:measure(plan).lines, record:measure(again).lines)
    assert.are.equal(0, again:prove({ trials = 50 }).violations)
  end)
end)

local function changed(from, to)
  local text, count = saved(plan):gsub(from, to)
  assert.are.equal(1, count, from)
  return select(2, with_file(text, function(path)
    local one, message, code = lb.load_plan(path)
    assert.is_nil(one)
    assert.is_truthy(message:find(path, 1, true))
    return message, code
  end))
end

describe("a changed file", function()
  it("is stale when what was decided is another", function()
    assert.are.equal("stale", changed("samples = " .. plan.samples, "samples = "
      .. plan.samples - 1))
    assert.are.equal("stale", changed('window = "' .. plan.window.name .. '"', 'window = "hft95"'))
    assert.are.equal("stale", changed('reading = "%a+"', 'reading = "'
      .. (plan.reading == "bin" and "tracked" or "bin") .. '"'))
    assert.are.equal("stale", changed('identity = "%x%x%x%x', 'identity = "0z12'))
  end)

  it("is stale when the demand or the digitizer is another", function()
    assert.are.equal("stale", changed('tolerance = "1 %%"', 'tolerance = "0.9 %%"'))
    assert.are.equal("stale", changed('range = "2 V"', 'range = "3 V"'))
  end)

  it("is no plan when a field is missing, wrong or unknown", function()
    for _, case in ipairs { { "samples = %d+,?", "" }, { "samples = %d+", "samples = -4" },
        { 'reading = "%a+"', 'reading = "fit"' }, { 'window = "[%w_]+"', 'window = "barn"' },
        { "bounds_version = 2", "bounds_version = 2, more = 2" },
        { 'range = "2 V"', 'range = "2 m"' }, { "plan = {", "plann = {" } } do
      assert.are.equal("format", changed(case[1], case[2]), case[1])
    end
  end)
end)

describe("a file that is none", function()
  it("is refused with its name", function()
    for _, content in ipairs { "", "plan = {", "plan = {}", "plan = 3", "\0\1\2",
        'plan = { rate = "1 kHz" }', "os.exit()" } do
      local one, message, code = with_file(content, lb.load_plan)
      assert.is_nil(one)
      assert.is_string(message)
      assert.are.equal("format", code)
    end
  end)

  it("is refused when it cannot be read or written", function()
    local one, message, code = lb.load_plan "no/such/folder/plan"
    assert.are.same({ nil, "io" }, { one, code })
    assert.matches("no/such/folder", message)
    local done, why, refused = plan:save "no/such/folder/plan"
    assert.are.same({ nil, "io" }, { done, refused })
    assert.matches("no/such/folder", why)
  end)
end)
