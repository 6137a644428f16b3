--- The plots as text: for a terminal without graphics.
-- Lines are letters A, B, C ... in the order of their frequencies, interferers
-- are plus signs; the plan's table names them in the same order.

local axes = require "libration.report.axis"
local gnuplot = require "libration.report.gnuplot"
local sources = require "libration.report.sources"

local M = {}

M.columns, M.rows = 96, 28

local function number(value)
  return type(value) == "number" and value or value:number()
end

-- Letters in the order of frequency: A .. Z, a .. z, then stars.
local function letter(index)
  if index > 52 then
    return "*"
  end
  return string.char((index <= 26 and 64 or 70) + index)
end

local function letters(out, list, x, y)
  local lines, rows = {}, {}
  for _, source in ipairs(list) do
    if source.kind == "line" then
      lines[#lines + 1] = source
    elseif y(source) then
      rows[#rows + 1] = { x(source), y(source) }
    end
  end
  table.sort(lines, function(a, b) return a.hz < b.hz end)
  for i, source in ipairs(lines) do
    out[#out + 1] = ("set label %s at first %s, first %s center front"):format(
      gnuplot.quote(letter(i)), gnuplot.number(x(source)), gnuplot.number(y(source) or 0))
  end
  rows[1] = rows[1] or { 0 / 0, 0 / 0 }
  out[#out + 1] = gnuplot.block("others", rows)
end

local function frame(title, x_title, y_title)
  local heading, message, code = gnuplot.quote(title)
  if not heading then
    return nil, message, code
  end
  return {
    "unset key", "set border 3", "set tics nomirror",
    "set title " .. heading, "set xlabel " .. gnuplot.quote(x_title),
    "set ylabel " .. gnuplot.quote(y_title) .. " rotate",
  }
end

local function range(letter_of, axis, scale)
  return (axis.log and "set logscale %s\n" or "unset logscale %s\n"):format(letter_of)
    .. ("set %srange [%s:%s]"):format(letter_of, gnuplot.number(axis.least / scale),
      gnuplot.number(axis.most / scale))
end

--- Commands that draw the fold map as text.
-- @param plan table: a plan
-- @return table: commands; or nil, message, code ("format")
-- @usage
-- local list = require("libration.report.text_plot").fold_map { rate = lb.fraction.new(1000),
--   digitizer = {}, demand = { lines = { { name = "a", hz = lb.fraction.new(700) } } } }
-- assert(#list > 5)
function M.fold_map(plan)
  local rate, list, most = number(plan.rate), sources.list(plan), 0
  for _, source in ipairs(list) do
    most = math.max(most, source.hz)
  end
  local axis = axes.choose(1, math.max(most * 1.05, rate), 1)
  axis.least = 0
  local scale, unit = axes.unit(axis.most)
  local out, message, code = frame((plan.demand.title or "Plan") .. ": fold map",
    "true frequency (" .. unit .. "); letters: lines, +: interferers", "shows at (" .. unit .. ")")
  if not out then
    return nil, message, code
  end
  out[#out + 1] = range("x", axis, scale)
  out[#out + 1] = range("y", { least = 0, most = rate / 2 }, scale)
  letters(out, list, function(s) return s.hz / scale end, function(s) return s.shown_hz / scale end)
  local rows = {}
  for k = 0, math.min(math.ceil(axis.most / rate * 2), 500) do
    rows[k + 1] = { k * rate / 2 / scale, k % 2 * rate / 2 / scale }
  end
  out[#out + 1] = gnuplot.block("zigzag", rows)
  out[#out + 1] = "plot $zigzag with lines dt 3, $others with points pt \"+\""
  return out
end

--- Commands that draw the predicted spectrum as text.
-- @param plan table: a plan
-- @return table: commands; or nil, message, code ("format")
-- @usage
-- local a = { name = "a", hz = lb.fraction.new(70), least = 1, most = 2 }
-- local list = require("libration.report.text_plot").spectrum { rate = lb.fraction.new(1000),
--   digitizer = {}, demand = { lines = { a } }, lines = {} }
-- assert(#list > 5)
function M.spectrum(plan)
  local list, low, high, least, most = sources.list(plan), math.huge, 0, math.huge, 0
  local function level(source)
    local value = source.most * source.gain
    return value > 0 and source.shown_hz > 0 and value or nil
  end
  for _, source in ipairs(list) do
    low, high = math.min(low, math.max(source.shown_hz, 1e-9)), math.max(high, source.shown_hz)
    least, most = math.min(least, level(source) or least), math.max(most, level(source) or 0)
  end
  local axis = axes.choose(low, math.max(high * 1.1, low * 2), 0)
  local scale, unit = axes.unit(axis.most)
  local out, message, code = frame((plan.demand.title or "Plan") .. ": predicted spectrum",
    "frequency in the record (" .. unit .. "); letters: lines, +: interferers",
    "most (" .. (plan.demand.unit or "") .. ")")
  if not out then
    return nil, message, code
  end
  out[#out + 1] = range("x", axis, scale)
  if most > 0 then
    out[#out + 1] = range("y", { log = true, least = least / 3, most = most * 3 }, 1)
  end
  letters(out, list, function(s) return s.shown_hz / scale end, level)
  out[#out + 1] = "plot $others with points pt \"+\""
  return out
end

return M
