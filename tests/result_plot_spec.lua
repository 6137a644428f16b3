local curves = require "libration.report.curves"
local lb = require "libration"
local lfs = require "lfs"
local result_plot = require "libration.report.result_plot"

local folder

local function read(path)
  local handle = assert(io.open(path, "rb"))
  local bytes = handle:read "a"
  handle:close()
  return bytes
end

before_each(function()
  folder = os.tmpname()
  os.remove(folder)
  assert(lfs.mkdir(folder))
end)

after_each(function()
  for name in lfs.dir(folder) do
    if name ~= "." and name ~= ".." then os.remove(folder .. "/" .. name) end
  end
  lfs.rmdir(folder)
end)

local RATE, N = 2048, 8192

local function noisy_tones()
  local x = lb.synth.noise { rate = RATE, samples = N, density = 0.003, seed = 1 }
  return x:add(lb.synth.tones { rate = RATE, samples = N, tones = {
    { hz = 49.6, amplitude = 1 }, { hz = 347.2, amplitude = 0.2 } } })
end

local function averages()
  local x = noisy_tones()
  local y = x * 3 + lb.synth.noise { rate = RATE, samples = N, density = 0.01, seed = 2 }
  return lb.survey.averages({ x, y }, { rate = RATE, segment = 256, unit = { "N", "m/s^2" },
    cross = true })
end

local function measurement()
  local demand = lb.demand { unit = "V", lines = {
    { name = "tone <&> `x`", hz = 100, amplitude = "1 V", tolerance = "1 %" } } }
  local plan = lb.plan(demand, lb.digitizer { rates = { "1 kHz" } })
  return assert(plan:replay { trial = 1 }:measure(plan))
end

local bare = { rate = RATE }
local with_unit = { rate = RATE, unit = "m/s^2" }

local function spec(more, base)
  local out = {}
  for key, value in pairs(base or bare) do out[key] = value end
  for key, value in pairs(more) do out[key] = value end
  return out
end

local function pulses()
  local out = {}
  for i = 0, 190 do out[i + 1] = i / 49.6 end
  return out
end

-- Every kind of result: how it is made, and a text its picture must show.
local kinds = {
  { "density spectrum", function() return averages():density(2) end,
    "power density ((m/s^2)^2/Hz)" },
  { "line spectrum, peak", function() return averages():lines(1):to_peak() end,
    "amplitude, peak (N)" },
  { "peak hold", function()
    return lb.survey.lines(noisy_tones(), spec({ segment = 256, averaging = "peak" }, with_unit))
  end, "power ((m/s^2)^2)" },
  { "cross spectrum", function() return averages():cross_density(1, 2) end,
    "size ((N) (m/s^2)/Hz)" },
  { "coherence", function() return averages():coherence(1, 2) end, "coherence (1)" },
  { "response", function() return averages():response(1, 2, { estimate = "h1" }) end,
    "gain ((m/s^2)/(N))" },
  { "levels of bands", function()
    return lb.bands.levels(noisy_tones(), spec { weighting = "A", reference = 2e-5 })
  end, "level (dB re 2e-05)" },
  { "mains groups", function()
    return lb.bands.groups(lb.synth.tones { rate = 10000, samples = 2000, tones = {
      { hz = 50, amplitude = 325 }, { hz = 250, amplitude = 13 } } }, { rate = 10000 })
  end, "rms (1)" },
  { "cepstrum", function() return lb.bands.cepstrum(noisy_tones(), bare) end, "quefrency (s)" },
  { "envelope spectrum", function()
    return lb.bands.envelope_spectrum(noisy_tones(), spec { from_hz = 300, to_hz = 400 })
  end, "peak amplitude (1)" },
  { "kurtosis", function() return lb.bands.kurtosis(noisy_tones(), spec { segment = 128 }) end,
    "spectral kurtosis (1)" },
  { "measurement", measurement, "uncertainty (V)" },
}

local line_kinds = {
  { "list", function() return lb.lines.list(noisy_tones(), with_unit) end },
  { "tracked", function()
    return lb.lines.track(noisy_tones(), spec({ lines = {
      { name = "shaft", from_hz = 48, to_hz = 51 }, { from_hz = 600, to_hz = 603 } } }, with_unit))
  end },
  { "sine", function() return lb.lines.sine(noisy_tones(), with_unit) end },
  { "joint", function()
    return lb.lines.joint(noisy_tones(), spec({ lines = { 49.6, 347.2 } }, with_unit))
  end },
  { "quality", function() return lb.lines.quality(noisy_tones(), with_unit) end },
  { "orders", function()
    return lb.lines.orders(noisy_tones(), spec({ speed_hz = 49.6, orders = { 1, 7 } }, with_unit))
  end },
}

local function parses(path)
  local check = "python3 -c 'import sys, xml.etree.ElementTree as e; e.parse(sys.argv[1])' "
  return (os.execute(check .. path))
end

local function unquoted(svg)
  return (svg:gsub("&lt;", "<"):gsub("&gt;", ">"):gsub("&amp;", "&"))
end

describe("a result of each kind is drawn:", function()
  local all = table.move(kinds, 1, #kinds, 1, {})
  for _, kind in ipairs(line_kinds) do
    all[#all + 1] = { "lines, " .. kind[1], kind[2], "peak amplitude (m/s^2)" }
  end
  all[#all + 1] = { "synchronous average", function()
    return lb.lines.synchronous(noisy_tones(), spec({ pulses = pulses() }, with_unit))
  end, "angle since the pulse (turn)" }
  for _, kind in ipairs(all) do
    it(kind[1], function()
      local r = assert(kind[2]())
      assert(r:plot(folder .. "/a.svg"))
      assert.is_true(parses(folder .. "/a.svg"))
      assert.truthy(unquoted(read(folder .. "/a.svg")):find(kind[3], 1, true))
      local text = assert(r:plot())
      assert.truthy(text:find(kind[3], 1, true), text)
      assert.is_nil(text:find "[\27\f]")
      assert(r:plot(folder .. "/a.txt"))
      assert.equal(text, read(folder .. "/a.txt"))
    end)
  end

  it("a PNG of the stated size", function()
    assert(averages():response(1, 2, { estimate = "h2" }):plot(folder .. "/a.png"))
    local bytes = read(folder .. "/a.png")
    assert.equal("\137PNG\r\n\26\n", bytes:sub(1, 8))
    assert.same({ 1280, 860 }, { (">I4I4"):unpack(bytes, 17), (select(2, (">I4I4"):unpack(bytes,
      17))) })
  end)

  it("names in a picture are the lines' own, harmless", function()
    assert(measurement():plot(folder .. "/a.svg"))
    assert.truthy(unquoted(read(folder .. "/a.svg")):find("tone <&> `x`", 1, true))
  end)
end)

describe("a result of each kind is written and read back:", function()
  for _, kind in ipairs(kinds) do
    it(kind[1], function()
      local r = assert(kind[2]())
      local text = assert(r:json())
      local back = assert(lb.report.result.read(text))
      assert.equal(tostring(r), tostring(back))
      assert.equal(text, back:json())
      assert.equal(getmetatable(r), getmetatable(back))
      for _, field in ipairs { "values", "re", "im", "amplitude", "coherence" } do
        if lb.samples.is(r[field]) then assert.is_true(r[field] == back[field], field) end
      end
      assert.equal(r:csv(), back:csv())
    end)
  end

  it("CSV holds the numbers bit for bit", function()
    local s = averages():density(2)
    local rows = assert(lb.report.csv.read(s:csv()))
    assert.same({ "frequency (Hz)", "power density ((m/s^2)^2/Hz)" }, { rows[1][1], rows[1][2] })
    assert.equal(#s.values + 1, #rows)
    local low, high = s:limits(0.95)
    for k = 2, #s.values - 1 do
      assert.equal(s:hz(k), rows[k + 1][1])
      assert.equal(s.values[k], rows[k + 1][2])
      assert.equal(s.values[k] * low, rows[k + 1][3])
      assert.equal(s.values[k] * high, rows[k + 1][4])
    end
    low = s:limits(0.95, 1) -- half the degrees of freedom at 0 Hz
    assert.equal(s.values[1] * low, rows[2][3])
  end)

  it("numbers that are none, and infinite ones, read back too", function()
    local c = lb.bands.cepstrum(noisy_tones(), bare)
    c.values[3], c.values[4], c.values[5] = 0 / 0, math.huge, -math.huge
    local back = assert(lb.report.result.read(c:json()))
    assert.is_true(back.values[3] ~= back.values[3])
    assert.same({ math.huge, -math.huge }, { back.values[4], back.values[5] })
    local rows = lb.report.csv.read(c:csv())
    assert.same({ math.huge, -math.huge }, { rows[5][2], rows[6][2] })
  end)

  it("names with quotes, commas and line ends are read from CSV as they were", function()
    local csv = lb.report.csv
    local cells = { 'a "b"', "c,d", "e\r\nf", "", "inf" }
    assert.same({ cells, { 1, 0.1, "", "", math.huge } },
      csv.read(csv.cells(cells, { { 1, 0.1, nil, "", math.huge } })))
    assert.same("format", select(3, csv.read 'a,"b'))
  end)
end)

describe("damaged JSON of a result", function()
  it("is refused where a field of its picture is missing or of another type", function()
    local text = measurement():json()
    for _, change in ipairs { { '"name": "[^"]*"', '"name": null' }, { '"name": "[^"]*"',
        '"name": []' }, { '"amplitude": [%d.]+', '"amplitude": "1"' },
        { '"coverage": %d', '"coverage": {}' }, { '"unit": "V"', '"unit": 3' } } do
      local damaged, count = text:gsub(change[1], change[2])
      assert.equal(1, count)
      assert.equal("format", select(3, lb.report.result.read(damaged)), change[2])
    end
  end)

  it("is refused, or is a result that prints", function()
    local text, random = averages():response(1, 2, { estimate = "h1" }):json():sub(1, 3000), 7
    local whole = lb.bands.groups(lb.synth.tones { rate = 10000, samples = 2000, tones = {
      { hz = 50, amplitude = 325 } } }, { rate = 10000, orders = 4 }):json()
    assert.equal("format", select(3, lb.report.result.read(text)))
    local refused = 0
    for _ = 1, 1000 do
      random = (random * 1103515245 + 12345) % 2 ^ 31 // 1 | 0
      local at, byte = random // 64 % #whole + 1, random // 7 % 96 + 32
      local damaged = whole:sub(1, at - 1) .. string.char(byte) .. whole:sub(at + 1)
      local back, message, code = lb.report.result.read(damaged)
      if back then
        assert.equal("string", type(tostring(back) .. back:csv() .. back:json()))
      else
        refused = refused + 1
        assert.equal("format", code)
        assert.equal("string", type(message))
      end
    end
    assert.is_true(refused > 100)
  end)
end)

describe("pictures of results", function()
  local function picture(unit)
    return { title = 'a"b`c\\n$(x)', below = "b", panels = { { x = { label = "frequency",
      unit = "Hz" }, y = { label = "size", unit = unit, log = true },
      curves = { { kind = "line", name = "curve", x = { 1, 2, 3 }, y = { 1, 0, 1e-20 } } } } } }
  end

  it("are not drawn without a unit", function()
    assert.has_error(function() result_plot.commands(picture(nil)) end)
    assert.has_error(function() result_plot.commands(picture "") end)
  end)

  it("refuse text that is not UTF-8 and leave no file", function()
    local ok, _, code = result_plot.save(picture "\xff", folder .. "/a.svg")
    assert.same({ nil, "format" }, { ok, code })
    assert.is_nil(lfs.attributes(folder .. "/a.svg"))
  end)

  it("say what a logarithmic axis does not show", function()
    assert(result_plot.save(picture "V", folder .. "/a.svg"))
    local svg = read(folder .. "/a.svg")
    assert.truthy(svg:find("1 values of 0 or less not shown", 1, true))
    assert.truthy(svg:find("1 values below the axis", 1, true))
    assert.truthy(unquoted(svg):gsub("&quot;", '"'):find('b`c\\n$(x)', 1, true))
  end)

  it("of nothing above 0 have a straight axis", function()
    local s = lb.survey.lines(lb.samples.new(64), { rate = 8, segment = 32, unit = "V" })
    assert(s:plot(folder .. "/a.svg"))
    assert.truthy(s:plot():find("power (V^2)", 1, true))
  end)

  it("of one bin alone are drawn", function()
    local s = lb.survey.lines(lb.samples.new { 1, 2 }, { rate = 8, segment = 1, unit = "V",
      window = "rectangular", overlap = 0 })
    assert(s:plot(folder .. "/a.svg"))
  end)

  it("of long curves keep the least and the most of every column", function()
    local x, y = {}, {}
    for k = 1, 20000 do x[k], y[k] = k, math.sin(k) end
    y[12345], y[6789] = 50, -40
    local axis = { least = 0, most = 20000, log = false }
    local rows = curves.rows({ kind = "line", x = x, y = y }, { x = axis, y = axis }, 100)
    assert.is_true(#rows <= 202)
    local seen = {}
    for _, row in ipairs(rows) do seen[row[2]] = row[1] end
    assert.same({ 12345, 6789 }, { seen[50], seen[-40] })
  end)
end)

describe("results of lines", function()
  for _, kind in ipairs(line_kinds) do
    it(kind[1] .. ": JSON reads back, CSV names the unit", function()
      local r = assert(kind[2]())
      local back = assert(lb.lines.from_json(r:json()))
      assert.equal(r:json(), back:json())
      assert.equal(r:csv(), back:csv())
      local rows, unit = lb.report.csv.read(r:csv()), 0
      assert.equal("unit", rows[1][#rows[1]])
      for i = 2, #rows do
        if rows[i][#rows[1]] == "m/s^2" then unit = unit + 1 end
      end
      assert.is_true(unit > 0)
    end)
  end

  it("of noise alone are drawn too", function()
    local x = lb.synth.noise { rate = RATE, samples = N, density = 0.003, seed = 1 }
    local r = lb.lines.list(x, spec({ false_alarm = 1e-6 }, with_unit))
    assert.equal(0, #r.lines)
    assert(r:plot(folder .. "/a.svg"))
  end)
end)
