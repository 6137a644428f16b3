--- Signals and values of SciPy in tests/data, for the specs that compare.

local core = require "libration.core"

local M = {}

--- The two signals of oracle_signal.csv.
function M.signals()
  local x, y = {}, {}
  for line in io.lines "tests/data/oracle_signal.csv" do
    local a, b = line:match "^%d+,([^,]+),([^,]+)$"
    if a then
      x[#x + 1], y[#y + 1] = tonumber(a), tonumber(b)
    end
  end
  return core.samples.from(x), core.samples.from(y)
end

-- Fields of a line of comma-separated values with quotes.
local function fields_of(line)
  local out = {}
  line = line .. ","
  local at = 1
  while at <= #line do
    local text, stop = line:match('^"(.-)"(),', at)
    if not text then text, stop = line:match("^([^,]*)(),", at) end
    out[#out + 1] = text
    at = stop + 1
  end
  return out
end

--- The value in oracle_values.csv: the n-th row whose call holds `call` or
-- which repeats such a call, and whose quantity starts with `quantity`.
function M.value(call, quantity)
  local found = false
  for line in io.lines "tests/data/oracle_values.csv" do
    local f = fields_of(line)
    if #f >= 4 then
      local repeated = f[2]:find '^"*$' ~= nil
      found = f[2]:find(call, 1, true) ~= nil or found and repeated
      if found and f[3]:sub(1, #quantity) == quantity then return tonumber(f[4]) end
    end
  end
  error("no value of " .. call .. ", " .. quantity)
end

return M
