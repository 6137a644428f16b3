-- Refusals: what binds, and relaxations that are true: each change that is named,
-- made to the demand or the digitizer, gives a plan. Invented demands.
local lb = require "libration"

local function case(t)
  t.lines = t.lines or { { name = "tone", hz = 100, amplitude = "1 V", tolerance = "1 %" } }
  t.digitizer = t.digitizer or { rates = { "1 kHz" }, samples = "16..4096" }
  t.options = t.options or {}
  t.options.effort_s = t.options.effort_s or 1
  return t
end

-- Copies of the user's tables, as they can be changed and given again.
local function copy(value)
  if type(value) ~= "table" or lb.fraction.is and lb.fraction.is(value) then return value end
  local result = {}
  for key, entry in pairs(value) do result[key] = copy(entry) end
  return result
end

local function plan_of(t)
  return lb.plan(lb.demand { unit = "V", lines = t.lines, interferers = t.interferers,
    noise = t.noise, averages = t.averages }, lb.digitizer(t.digitizer), t.options)
end

local apply = {}

function apply.range(t, range) t.digitizer.range = range .. " V" end
function apply.within(t) t.options.within = nil end
function apply.averages(t, averages) t.averages = averages end
function apply.undersample(t) t.options.undersample = true end
function apply.filter_order(t, order) t.digitizer.filter.order = order end

function apply.samples(t, samples)
  t.digitizer.samples = { 16, math.tointeger(samples) }
  t.digitizer.memory = nil
end

function apply.tolerances(t, times)
  for _, line in ipairs(t.lines) do
    line.tolerance = tonumber((line.tolerance:match "[%d.]+")) * times .. " %"
  end
end

function apply.without(t, name)
  t.interferers = t.interferers or {}
  for i = #t.lines, 1, -1 do
    if t.lines[i].name == name then
      local line = table.remove(t.lines, i)
      line.tolerance, line.tolerance_hz = nil, nil
      table.insert(t.interferers, line)
    end
  end
end

function apply.drift(t, part)
  for _, list in ipairs { t.lines, t.interferers or {} } do
    for _, line in ipairs(list) do
      line.drift = line.drift and tonumber((line.drift:match "[%d.]+")) * part .. " %"
    end
  end
end

function apply.rate(t, rate)
  table.insert(t.digitizer.rates, rate)
  t.digitizer.aggregate = nil
end

-- Refused with this term and limit, offering (at least) these changes, all true.
local function check(t, term, limit, offers)
  local none, refusal, code = plan_of(t)
  assert.are.same({ nil, "infeasible" }, { none, code })
  assert.are.equal(term, refusal.binding.term)
  assert.matches(limit, refusal.binding.limit)
  local seen = {}
  for _, relaxation in ipairs(refusal.relaxations) do
    local name, value = next(relaxation.change)
    seen[name] = true
    local changed = copy(t)
    apply[name](changed, value)
    local plan, why = plan_of(changed)
    assert.is_truthy(plan, relaxation.text .. ": " .. tostring(why))
    assert.is_true(plan.worst <= 1)
    assert.is_true(relaxation.plan.worst <= 1 or name == "tolerances")
    assert.is_true(#relaxation.text > 0)
  end
  for _, name in ipairs(offers) do
    assert.is_true(seen[name], "not offered: " .. name)
  end
  return refusal
end

describe("a refusal", function()
  it("for clipping says how far the sources reach", function()
    local t = case { lines = { { name = "a", hz = 100, amplitude = "2 V", tolerance = "1 %" },
      { name = "b", hz = 200, amplitude = "1 V", tolerance = "1 %" } },
      digitizer = { rates = { "1 kHz" }, range = "2 V", bits = 12 } }
    local refusal = check(t, "clipping", "range", { "range" })
    assert.are.equal(1.5, refusal.binding.ratio)
    assert.matches("can reach 3 V, the digitizer's range ends at 2 V", tostring(refusal))
  end)

  it("for want of a rate offers a faster one and undersampling", function()
    local t = case { lines = { { name = "a", hz = 730, amplitude = "1 V", tolerance = "1 %" } } }
    check(t, "sample rate", "rates of the digitizer", { "rate", "undersample" })
  end)

  it("for noise and time offers more time", function()
    local t = case { noise = "5 mV/rtHz", digitizer = { rates = { "1 kHz" } },
      options = { within = "1 s" } }
    local refusal = check(t, "noise", "within 1 s", { "within", "tolerances" })
    -- (3 x 0.005 / 0.01)^2 = 2.25 s are needed, so the ratio is 1.5 in 1 s.
    assert.is_true(math.abs(refusal.binding.ratio - 1.5) < 0.03)
    assert.matches("What binds: line tone, by noise, at the limit: within 1 s", tostring(refusal))
  end)

  it("for noise and memory offers longer records and averages", function()
    local t = case { noise = "10 mV/rtHz", digitizer = { rates = { "1 kHz" }, memory = 4000 } }
    check(t, "noise", "memory for 4000 samples", { "samples", "tolerances", "averages" })
  end)

  it("for an alias offers another rate", function()
    local t = case { interferers = { { name = "x", hz = 900, amplitude = "0.1 V" } } }
    local refusal = check(t, "leakage", "rate", { "rate", "tolerances" })
    assert.are.equal("x", refusal.binding.from)
    assert.are.equal("tone", refusal.binding.line)
  end)

  it("for an alias through the filter offers a steeper one", function()
    local t = case { lines = { { name = "tone", hz = 300, amplitude = "1 V", tolerance = "1 %" } },
      interferers = { { name = "x", hz = 705, drift = "1 %", amplitude = "0.5 V" } },
      options = { effort_s = 5, windows = "hann", readings = "tracked" },
      digitizer = { rates = { "1 kHz" }, samples = "16..512",
        filter = { shape = "butterworth", order = 4, corner = "0.4 rate" } } }
    check(t, "leakage", "rate", { "filter_order" })
  end)

  it("for lines that drift into each other offers less drift", function()
    local t = case { lines = {
      { name = "a", hz = 100, drift = "0.5 %", amplitude = "1 V", tolerance = "1 %" },
      { name = "b", hz = 100.5, drift = "0.5 %", amplitude = "1 V", tolerance = "1 %" } },
      digitizer = { rates = { "1 kHz" } } }
    local refusal = check(t, "leakage", ".", { "drift" })
    assert.matches("even in the longest record", refusal.message)
  end)

  it("for the gain of the sensor cannot be helped by time", function()
    local t = case { digitizer = { rates = { "1 kHz" }, accuracy = "2 %",
      samples = "16..4096" } }
    local refusal = check(t, "sensor and range", ".", { "tolerances" })
    for _, relaxation in ipairs(refusal.relaxations) do
      assert.is_nil(relaxation.change.samples)
    end
  end)

  -- Was: trials of hopeless changes used up the allowance, and nothing was offered
  -- though the same demand plans in 1.2 s without a limit of time.
  it("offers more time for a machine of many lines, too", function()
    local skid = lb.demand { unit = "m/s^2", sensitivity = "100 mV/(m/s^2)",
      noise = "60 um/s^2/rtHz", lines = {
        { name = "shaft", hz = 24.6, drift = "0.1 %", amplitude = { 0.05, 2, "m/s^2" },
          tolerance = "1 %" },
        { name = "vane pass", of = "shaft", times = 7, amplitude = { 0.05, 2, "m/s^2" },
          tolerance = "1 %" },
        { name = "rotor bar", hz = 1377.6, drift = "0.05 %", amplitude = { 0.01, 0.3, "m/s^2" },
          tolerance = "2 %" } },
      interferers = { { name = "mains", hz = 50, drift = "0.4 %", orders = "1..20",
        amplitude = "20 mm/s^2" } } }
    local digitizer = lb.digitizer { clock = "12.288 MHz", divider = { 128, 4096 }, bits = 24,
      range = "5 V", memory = "4 Mi", timebase = "25 ppm", jitter = "2 ns",
      filter = { shape = "butterworth", order = 8, corner = "0.4 rate" } }
    local none, refusal = lb.plan(skid, digitizer, { within = "1 s" })
    assert.is_nil(none)
    local offered = {}
    for _, relaxation in ipairs(refusal.relaxations) do
      offered[next(relaxation.change)] = relaxation.plan.duration_s
    end
    assert.is_true(offered.within > 1 and offered.within < 2)
    assert.is_true(offered.tolerances <= 1)
  end)

  it("prints whole, with a row for every relaxation", function()
    local _, refusal = plan_of(case { noise = "10 mV/rtHz", digitizer = { rates = { "1 kHz" },
      memory = 4000 } })
    local text = tostring(refusal)
    assert.matches("cannot be measured as demanded", text)
    assert.matches("Any one of these would help:", text)
    for _, relaxation in ipairs(refusal.relaxations) do
      assert.is_truthy(text:find(relaxation.text, 1, true))
    end
  end)

  it("says that it gave up when the effort was too small", function()
    local t = case { lines = {}, digitizer = { clock = "12.288 MHz", divider = "64..65535" } }
    for i, hz in ipairs { 24.6, 49.3, 74.1, 98.9, 123.7 } do
      t.lines[i] = { name = "line " .. i, hz = hz, amplitude = "1 V", tolerance = "2 ppm" }
    end
    t.options = { effort_s = 0.001, windows = "rectangular", readings = "bin" }
    local none, refusal = plan_of(t)
    assert.is_nil(none)
    assert.matches("gave up after about 0%.001 s of work; a plan may exist", tostring(refusal))
  end)
end)
