local lb = require "libration"
local sounds = dofile "tests/support/sounds.lua"

after_each(sounds.clean)

local function slurp(path)
  local file = assert(io.open(path, "rb"))
  local text = file:read "a"
  file:close()
  return text
end

local function pump()
  return lb.record.new { rate = "100000/3", title = "pump", start = "2026-03-01T12:00:00.5Z",
    channels = { { samples = { 1, 2.5, -3, 4e-5, 5, 1 / 1024 }, name = "casing", unit = "m/s^2" },
      { samples = { 6, 7, 8, 9, 10, -1e-20 }, unit = "V" } } }
end

-- A time function in single precision as others write it; invented for the test.
local function foreign(interval, rows, eol)
  local lines = { "    -1", "    58", "casing", "NONE", "01-MAR-26 12:00:00", "NONE", "NONE",
    "    1         1    0         0 PUMP               7   1 NONE               0   0",
    ("         2         8         1  0.00000E+00%13s  0.00000E+00"):format(interval),
    "        17    0    0    0 Time                 s                   ",
    "        12    0    0    0 Acceleration         m/s^2               ",
    "         0    0    0    0 NONE                 NONE                ",
    "         0    0    0    0 NONE                 NONE                " }
  for _, row in ipairs(rows or { "  1.00000E+00 -2.50000E+00  3.00000E+00  4.00000E-05  5.0"
    .. "0000E+00  6.00000E+00", "  7.00000E+00 -8.00000E+00" }) do
    lines[#lines + 1] = row
  end
  lines[#lines + 1] = "    -1"
  return table.concat(lines, eol or "\n") .. (eol or "\n")
end

local function read(text, options)
  local path = sounds.temporary ".uff"
  sounds.write_bytes(path, text)
  return lb.record.read(path, options)
end

describe("universal files", function()
  it("give back what was written, in both codings", function()
    for _, binary in ipairs { true, false } do
      local path, r = sounds.temporary ".uff", pump()
      assert(r:write(path, { binary = binary }))
      local back = assert(lb.record.read(path))
      assert.equal("universal", back.container)
      assert.equal(r:identity(), back:identity()) -- these values have few digits
      assert.equal(r.rate, back.rate)
      assert.equal(r.start_ns, back.start_ns)
      assert.same({ "casing", "m/s^2", "pump" }, { back.channels[1].name, back.channels[1].unit,
        back.title })
    end
  end)

  -- Dataset 58: record 6 is 2(I5,I10),2(1X,10A1,I10,I4), record 7 3I10,3E13.5, records 8 to 11
  -- I10,3I5,2(1X,20A1), data of even double precision 4E20.12.
  it("stand in the columns of the format", function()
    local path = sounds.temporary ".uff"
    assert(pump():write(path, { binary = false }))
    local lines = {}
    for line in slurp(path):gmatch "[^\n]*" do lines[#lines + 1] = line end
    assert.same({ "    -1", "    58", "casing" }, { lines[1], lines[2], lines[3] })
    assert.equal("    1", lines[8]:sub(1, 5))
    assert.same({ "         4", "         6", "         1", "  0.00000E+00", "  3.00000E-05" }, {
      lines[9]:sub(1, 10), lines[9]:sub(11, 20), lines[9]:sub(21, 30), lines[9]:sub(31, 43),
      lines[9]:sub(44, 56) })
    assert.same({ "        17", "Time", "s" }, { lines[10]:sub(1, 10),
      (lines[10]:sub(27, 46):gsub(" +$", "")), (lines[10]:sub(48, 67):gsub(" +$", "")) })
    assert.equal("m/s^2", (lines[11]:sub(48, 67):gsub(" +$", "")))
    assert.equal("  1.000000000000E+00", lines[14]:sub(1, 20))
    assert.equal(80, #lines[14])
    assert.equal("    -1", lines[16])
    assert(pump():write(path))
    local mark = slurp(path):match "\n([^\n]*)"
    assert.equal("    58b     1     2          11          48     0     0           0           0",
      mark)
  end)

  it("of others are read, in any line end, and the rate only where it is certain", function()
    for _, eol in ipairs { "\n", "\r\n" } do
      local r = assert(read(foreign("1.95313E-05", nil, eol)))
      assert.same({ 1, -2.5, 3, 4e-5, 5, 6, 7, -8 }, r:values():totable())
      assert.equal("51200", tostring(r.rate))
      assert.equal("the only whole rate with this interval", r.metadata.rate_from)
    end
    local none, message, code = read(foreign "2.00000E-06") -- 499999 .. 500001 S/s
    assert.is_nil(none)
    assert.equal("domain", code)
    assert.has_match("give rate", message)
    assert.equal("500001", tostring(assert(read(foreign "2.00000E-06", { rate = 500001 })).rate))
    assert.equal("domain", select(3, read(foreign "2.00000E-06", { rate = 500100 })))
  end)

  it("may hold other datasets, which are counted", function()
    local other = "    -1\n   151\nsome text\n    -1\n"
    local complex = foreign("1.00000E-03"):gsub("        17 ", "        18 ", 1)
    local r = assert(read(other .. complex .. foreign "1.00000E-03" .. other))
    assert.equal(3, r.metadata.skipped)
    assert.equal("1000", tostring(r.rate))
    assert.has_match("no time function", (select(2, read(other .. complex))))
  end)

  it("that lie are refused", function()
    local good = foreign "1.00000E-03"
    for _, bad in ipairs {
      good:gsub("         8         1", "         9         1"), -- one more than there is
      good:gsub("         8         1", "   9999999         1"), good:gsub("    %-1\n$", ""),
      good:gsub("         8         1", "         8         0"), good:gsub("%-8.00000", "-8,00000"),
      good:gsub("  1.00000E%-03", "  0.00000E+00"), (good:gsub("  3.00000E", "3.00000E  ")),
    } do
      local r, message, code = read(bad)
      assert.is_nil(r, bad)
      assert.equal("format", code, message)
    end
    local path = sounds.temporary ".uff"
    assert(pump():write(path))
    -- a writer that says 8 bytes where 16 are meant, or the reverse, shows in the count
    assert.has_match("claims", (select(2, read((slurp(path):gsub("  48 ", "  96 ", 1))))))
  end)

  it("survive damage of any kind", function()
    math.randomseed(5, 8)
    for _, binary in ipairs { true, false } do
      local path = sounds.temporary ".uff"
      assert(pump():write(path, { binary = binary }))
      local text = slurp(path)
      for _ = 1, 500 do
        local at, kind = math.random(#text), math.random(3)
        local bad = kind == 1 and text:sub(1, at - 1) .. string.char(math.random(0, 255))
          .. text:sub(at + 1) or kind == 2
          and text:gsub("%d+", tostring(math.random(0, 99999)), at % 30)
          or text:sub(1, at) .. text:sub(at - 9)
        sounds.write_bytes(path, bad)
        local r, message, code = lb.record.read(path, { format = "universal" })
        assert.is_true(r ~= nil or type(message) == "string" and type(code) == "string", bad)
      end
      for length = 0, #text - 2 do
        sounds.write_bytes(path, text:sub(1, length))
        local r, message = lb.record.read(path, { format = "universal" })
        -- what ends behind a whole dataset is a whole file
        assert.is_true(r ~= nil and #r.channels == 1 or r == nil
          and message:find(path, 1, true) ~= nil, message)
      end
    end
  end)
end)
