-- What the failing-allocator sweep runs over the formats of records.
return "formats", function()
  local record = require "libration.record"
  local stem = os.tmpname()
  local mine = record.new { rate = 48000, channels = {
    { codes = { 0, 1, -2, 32767 }, bits = 16, range = "5 V", name = "a" },
    { codes = { 5, 6, 7, 8 }, bits = 16, range = "5 V", name = "b" } } }
  local failure
  for _, suffix in ipairs { ".csv", ".uff", ".h5", ".record", ".sigmf-meta" } do
    local fine, problem = pcall(function()
      local done, message, code = mine:write(stem .. suffix)
      if not done then error(message .. " " .. code) end
      local back
      back, message, code = record.open(stem .. suffix)
      if not back then error(message .. " " .. code) end
      assert(back:part { first = 2 }:values(2):sum() == mine:part { first = 2 }:values(2):sum())
      back:close()
    end)
    failure = failure or not fine and problem or nil
    if failure then break end
  end
  for _, suffix in ipairs { "", ".csv", ".uff", ".h5", ".record", ".raw", ".sigmf-meta",
                            ".sigmf-data" } do
    os.remove(stem .. suffix)
  end
  if failure then error(failure, 0) end
end
