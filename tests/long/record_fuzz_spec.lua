-- A million damaged files for each parser of records; the suite's own share is 1000.
local lb = require "libration"
local sounds = dofile "tests/support/sounds.lua"

local formats = { hdf5 = ".h5", csv = ".csv", universal = ".uff", raw = ".record",
                  sigmf = ".sigmf-meta" }

local TIMES = tonumber(os.getenv "LBR_FUZZ" or "") or 1000000

local function damage(text)
  for _ = 1, math.random(4) do
    local kind, at = math.random(4), math.random(#text)
    if kind == 1 then
      text = text:sub(1, at - 1) .. string.char(math.random(0, 255)) .. text:sub(at + 1)
    elseif kind == 2 then
      local byte = ({ "\0", "\255", "\127", "\1", "9", "-", "\n" })[math.random(7)]
      text = text:sub(1, at - 1) .. byte .. text:sub(at + 1)
    elseif kind == 3 then
      text = text:sub(1, at) .. text:sub(math.max(1, at - math.random(40)))
    else
      text = text:sub(1, at) .. text:sub(at + math.random(20))
    end
    text = text == "" and "x" or text
  end
  return text
end

describe("damaged records", function()
  for format, suffix in pairs(formats) do
    it("are read or refused: " .. format, function()
      local stem = os.tmpname()
      local record = lb.record.new { rate = "100000/3", title = "pump", channels = {
        { codes = { 1, -2, 3, 4, 5 }, bits = 16, full_scale = 5, name = "a", unit = "m/s^2" },
        { codes = { 6, 7, 8, 9, -8388608 }, bits = 24, unit = "V", range = "5 V" } } }
      assert(record:write(stem .. suffix))
      local whole, seen = sounds.bytes(stem .. suffix), { read = 0, refused = 0 }
      math.randomseed(2026, 12)
      for i = 1, TIMES do
        sounds.write_bytes(stem .. suffix, damage(whole))
        local r, message, code = lb.record.read(stem .. suffix,
          { format = format, rate = i % 2 == 0 and 1000 or nil })
        assert.is_true(r ~= nil or type(message) == "string" and type(code) == "string")
        seen[r and "read" or "refused"] = seen[r and "read" or "refused"] + 1
      end
      for _, ending in ipairs { "", suffix, ".raw", ".sigmf-data" } do os.remove(stem .. ending) end
      assert.is_true(seen.refused > TIMES / 4)
    end)
  end
end)
