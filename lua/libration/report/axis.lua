--- Frequency axes: straight or logarithmic, and places along them.

local M = {}

--- Chooses an axis for frequencies.
-- @param low number: lowest to be seen, Hz, above 0
-- @param high number: highest to be seen, Hz
-- @param floor number: where a straight axis begins when it need not begin at 0
-- @return table: least, most (Hz), log (boolean), and place(hz) from 0 to 1
-- @usage
-- local choose = require("libration.report.axis").choose
-- assert(choose(10, 10000, 0).log and not choose(400, 1000, 0).log)
function M.choose(low, high, floor)
  local axis = { log = high / low > 25 and floor == 0 }
  if axis.log then
    axis.least, axis.most = low / 1.5, high
    axis.span = math.log(axis.most / axis.least)
  else
    axis.least, axis.most = floor, high
  end
  function axis.place(hz)
    if axis.log then
      return math.log(math.max(hz, axis.least) / axis.least) / axis.span
    end
    return (hz - axis.least) / (axis.most - axis.least)
  end
  function axis.at(place)
    if axis.log then
      return axis.least * math.exp(place * axis.span)
    end
    return axis.least + place * (axis.most - axis.least)
  end
  return axis
end

local si = { { 1e9, "GHz" }, { 1e6, "MHz" }, { 1e3, "kHz" }, { 1, "Hz" }, { 1e-3, "mHz" } }

--- The unit in which an axis is easiest to read.
-- @param most number: its end, Hz
-- @return number: Hz in one unit; and string: the unit
-- @usage
-- local scale, unit = require("libration.report.axis").unit(24000)
-- assert(scale == 1000 and unit == "kHz")
function M.unit(most)
  for _, row in ipairs(si) do
    if most >= 2 * row[1] then
      return row[1], row[2]
    end
  end
  return 1e-3, "mHz"
end

return M
