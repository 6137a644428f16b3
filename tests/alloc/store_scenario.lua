-- What the failing-allocator sweep runs over sound files and records. Memory
-- that the sound library itself cannot get is a refusal with a code.
return "store", function()
  local record = require "libration.record"
  local path = os.tmpname()
  local codes = require("libration.core").samples.from { 0, 1, -2, 32767 }
  local mine = record.new { rate = 48000, codes = codes, bits = 16, range = "5 V", name = "a" }
  local done, message, code = mine:write(path)
  if not done then
    os.remove(path)
    error(message .. " " .. code)
  end
  local back
  back, message, code = record.read(path, { full_scale = 5, unit = "V" })
  os.remove(path)
  if not back then
    error(message .. " " .. code)
  end
  assert(back:identity() == mine:identity() and back:rails().high == 1)
  assert(tostring(back):find "4 samples")
end
