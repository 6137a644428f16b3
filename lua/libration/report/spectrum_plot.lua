--- The predicted spectrum: what a record by the plan will show at most.
-- Every line is a bar over its range of amplitudes; below it stand what it may
-- be wrong by (its bound) and what it is allowed to be wrong by. Interferers are
-- where they show, as large as the filter leaves them; a curve shows how the
-- window spreads all of it; the shaded floor is what noise alone may read.

local axes = require "libration.report.axis"
local canvas = require "libration.report.canvas"
local gnuplot = require "libration.report.gnuplot"
local numbers = require "libration.report.numbers"
local sources = require "libration.report.sources"
local window = require "libration.window"

local M = {}

local function number(value)
  return type(value) == "number" and value or value:number()
end

-- Noise as an amplitude that a line's reading may show: the plan's own figure.
local function floor_of(plan)
  local coverage = plan.coverage or plan.demand.coverage or 3
  local most = 0
  for _, line in ipairs(plan.lines) do
    most = math.max(most, coverage * (line.random or 0))
  end
  return most
end

local function finite(value)
  return value and value > 0 and value < math.huge and value or nil
end

-- What is drawn of every line and interferer, and the range of amplitudes.
local function gather(plan)
  local by_name, least, most = {}, math.huge, 0
  for _, line in ipairs(plan.lines) do
    by_name[line.name] = line
  end
  local function see(value)
    if finite(value) then
      least, most = math.min(least, value), math.max(most, value)
    end
    return finite(value)
  end
  local list = {}
  for _, source in ipairs(sources.list(plan)) do
    local mark = {
      name = source.name, kind = source.kind, hz = source.shown_hz, half = source.half,
      least = see(source.least * source.gain), most = see(source.most * source.gain),
    }
    local line = source.kind == "line" and by_name[source.name]
    if line then
      mark.least, mark.most = see(source.least), see(source.most)
      mark.error, mark.tolerance = see(line.error), see(line.tolerance)
    end
    mark.least = mark.least or mark.most
    list[#list + 1] = mark
  end
  see(floor_of(plan))
  return list, least, most
end

local function amplitude_axis(least, most)
  if most <= 0 then
    least, most = 0.1, 1
  end
  least = math.max(least, most * 1e-9)
  return 10 ^ math.floor(math.log(least, 10) - 0.3), 10 ^ math.ceil(math.log(most, 10) + 0.15)
end

local columns = 480 -- of the skirts, over the width of the plot

-- Most that a source shows between two frequencies, through the window.
local function skirt(mark, shape, from, to, duration_s)
  local near = math.max(from - mark.hz, mark.hz - to, 0)
  local far = math.max(math.abs(from - mark.hz), math.abs(to - mark.hz))
  local _, high = shape:range(math.max(near - mark.half, 0) * duration_s,
    (far + mark.half) * duration_s)
  return mark.most * high
end

-- What all sources together show at most, over the whole plot.
local function skirts(view)
  local plan, rows = view.plan, {}
  local shape = window.window(plan.window.name, plan.window.parameter)
  for i = 1, columns do
    local from, to = view.axis.at((i - 1) / columns), view.axis.at(i / columns)
    local sum = 0
    for _, mark in ipairs(view.list) do
      sum = sum + (mark.most and skirt(mark, shape, from, to, plan.duration_s) or 0)
    end
    rows[i] = { (from + to) / 2 / view.scale, math.max(sum, view.least) }
  end
  return rows
end

local function rows_of(list, kind, scale, fields, least)
  local rows = {}
  for _, mark in ipairs(list) do
    local row, whole = { mark.hz / scale }, mark.kind == kind
    for i, field in ipairs(fields) do
      local value = field == "floor" and least or mark[field]
      whole = whole and value ~= nil
      row[i + 1] = value and math.max(value, least)
    end
    if whole then
      rows[#rows + 1] = row
    end
  end
  if #rows == 0 then
    rows[1] = { 0 / 0 }
    for i = 1, #fields do
      rows[1][i + 1] = 0 / 0
    end
  end
  return rows
end

local function frame(out, view)
  local floor = floor_of(view.plan)
  canvas.add(out, canvas.frequency(view.axis, view.scale, "x"))
  canvas.add(out, {
    "set logscale y", "set format y \"%g\"", "set bmargin at screen 0.16",
    ("set yrange [%s:%s]"):format(gnuplot.number(view.least), gnuplot.number(view.most)),
    ("set xlabel %s"):format(gnuplot.quote("frequency in the record (" .. view.unit .. ")")),
    ("set ylabel %s"):format(gnuplot.quote(
      "peak amplitude (" .. (view.plan.demand.unit or "") .. ")")),
  })
  if floor > view.least then
    out[#out + 1] = ("set object rectangle from graph 0, graph 0 to graph 1, first %s behind"
      .. " fillstyle solid noborder fillcolor rgb %q"):format(gnuplot.number(floor), canvas.shade)
  end
end

local function key(out, left_out)
  local notes = {
    "bar with disc: line, least to most amplitude    open square: its allowed error"
      .. "    diamond: the most it may be wrong by",
    "open triangle: interferer where it shows, after the filter"
      .. "    grey curve: all of it through the window    shaded: what noise alone may read"
      .. (left_out > 0 and ("    (%d names left out)"):format(left_out) or ""),
  }
  for i, note in ipairs(notes) do
    out[#out + 1] = ("set label %s at screen %g, screen %g left textcolor rgb \"#4a525b\""):format(
      gnuplot.quote(note), canvas.left, 0.052 - 0.028 * (i - 1))
  end
end

local function data(out, view)
  local function block(name, kind, ...)
    out[#out + 1] = gnuplot.block(name, rows_of(view.list, kind, view.scale, { ... }, view.least))
  end
  out[#out + 1] = gnuplot.block("skirts", skirts(view))
  block("bars", "line", "least", "most")
  block("errors", "line", "error")
  block("allowed", "line", "tolerance")
  block("slack", "line", "error", "tolerance")
  block("stems", "interferer", "floor", "most")
end

local function draw(out)
  local c = canvas.colour
  local pieces = {
    ("$skirts with lines lw 1.2 lc rgb %q"):format(c.floor),
    ("$stems using 1:2:(0):($3-$2) with vectors nohead lw 1 dt 2 lc rgb %q"):format(c.interferer),
    ("$stems using 1:3 with points pt 8 ps 1.3 lw 1.8 lc rgb %q"):format(c.interferer),
    ("$slack using 1:2:(0):($3-$2) with vectors nohead lw 1 lc rgb %q"):format(c.floor),
    ("$bars using 1:2:(0):($3-$2) with vectors nohead lw 5 lc rgb %q"):format(c.line),
    ("$bars using 1:3 with points pt 7 ps 1.4 lc rgb %q"):format(c.line),
    ("$allowed with points pt 4 ps 1.2 lw 1.6 lc rgb %q"):format(c.limit),
    ("$errors with points pt 13 ps 1.4 lc rgb %q"):format(c.limit),
  }
  out[#out + 1] = "plot " .. table.concat(pieces, ", \\\n  ")
end

local function view_of(plan)
  local view = { plan = plan }
  view.list, view.least, view.most = gather(plan)
  view.least, view.most = amplitude_axis(view.least, view.most)
  local half, low = number(plan.rate) / 2, math.huge
  local high = 0
  for _, mark in ipairs(view.list) do
    if mark.hz > 0 then
      low, high = math.min(low, mark.hz), math.max(high, mark.hz)
    end
  end
  view.axis = axes.choose(math.min(low, half), half, 0)
  if not view.axis.log and high < half / 3 and high > 0 then
    view.axis = axes.choose(math.min(low, half), high * 1.3, 0)
  end
  view.scale, view.unit = axes.unit(view.axis.most)
  return view
end

--- Commands that draw the predicted spectrum of a plan.
-- @param plan table: a plan with lines, demand and digitizer
-- @return table: commands for gnuplot.save; or nil, message, code ("format")
-- @usage
-- local a = { name = "a", hz = lb.fraction.new(70), least = 1, most = 2 }
-- local commands = require("libration.report.spectrum_plot").commands { worst = 0.5,
--   rate = lb.fraction.new(1000), samples = 1000, duration_s = 1, digitizer = {},
--   window = { name = "hann" },
--   demand = { unit = "V", lines = { a } },
--   lines = { { name = "a", error = 0.1, tolerance = 0.2 } } }
-- assert(#commands > 10)
function M.commands(plan)
  local view = view_of(plan)
  local out, message, code = canvas.begin((plan.demand.title or "Plan") .. ": predicted spectrum",
    numbers.exact(plan.rate) .. " S/s, " .. plan.samples .. " samples = "
    .. numbers.time(plan.duration_s) .. ", window " .. (plan.window and plan.window.name or "none")
    .. ", reading " .. tostring(plan.reading))
  if not out then
    return nil, message, code
  end
  for _, mark in ipairs(view.list) do
    local fine, why, kind = gnuplot.quote(mark.name)
    if not fine then
      return nil, why, kind
    end
  end
  frame(out, view)
  local marks = {}
  for i, mark in ipairs(view.list) do
    marks[i] = { name = mark.name, kind = mark.kind, hz = mark.hz, y = mark.most or view.least }
  end
  local names, left_out = canvas.names(marks, view.axis, view.scale)
  canvas.add(out, names)
  key(out, left_out)
  data(out, view)
  draw(out)
  return out
end

return M
