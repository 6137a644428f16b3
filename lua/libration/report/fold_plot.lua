--- The fold map: where every frequency shows in the record.
-- Above, the shown frequency over the true one: a zigzag that turns at every
-- multiple of half the rate; zones in which a rising frequency shows as a
-- falling one are shaded. Below, what the digitizer's filter lets through.

local axes = require "libration.report.axis"
local canvas = require "libration.report.canvas"
local gnuplot = require "libration.report.gnuplot"
local numbers = require "libration.report.numbers"
local sources = require "libration.report.sources"

local M = {}

local most_zones = 40 -- more zones than this are not drawn from 0 on

-- The span of true frequencies to be seen, and the axis for them.
local function true_axis(list, rate)
  local low, high = math.huge, 0
  for _, source in ipairs(list) do
    low, high = math.min(low, source.hz), math.max(high, source.hz)
  end
  low, high = math.min(low, rate / 4), math.max(high * 1.08, rate * 1.25)
  local floor = 0
  if high > most_zones * rate / 2 then
    floor = math.max(0, math.floor(low / rate - 1) * rate)
    high = math.ceil(high / rate + 0.5) * rate
  end
  return axes.choose(low, high, floor)
end

local function shown_axis(list, rate, log)
  local low = rate / 2
  for _, source in ipairs(list) do
    if source.shown_hz > 0 then
      low = math.min(low, source.shown_hz)
    end
  end
  local axis = axes.choose(low, rate / 2, 0)
  axis.log = axis.log and log
  if not axis.log then
    axis.least = 0
  end
  return axis
end

-- The zigzag: dense where the axis bends it, exact at every turn.
local function zigzag(axis, shown, rate, scales)
  local places = {}
  for i = 0, 600 do
    places[#places + 1] = axis.at(i / 600)
  end
  local first, last = math.ceil(axis.least / rate * 2), math.floor(axis.most / rate * 2)
  for k = first, math.min(last, first + 400) do
    places[#places + 1] = k * rate / 2
  end
  table.sort(places)
  local rows = {}
  for i, hz in ipairs(places) do
    local within = hz % rate
    local fold = math.min(within, rate - within)
    rows[i] = { hz / scales.x, math.max(fold, shown.log and shown.least or 0) / scales.y }
  end
  return rows
end

-- Shading and names of the zones that are to be seen.
local function zones(axis, rate, scale, top)
  local out = {}
  local first = math.floor(axis.least / rate * 2)
  local last = math.ceil(axis.most / rate * 2) - 1
  for zone = first + 1, last + 1 do
    local from = math.max((zone - 1) * rate / 2, axis.least)
    local to = math.min(zone * rate / 2, axis.most)
    local room = axis.place(to) - axis.place(from)
    if zone % 2 == 0 then
      out[#out + 1] = ("set object rectangle from first %s, graph 0 to first %s, graph 1 behind"
        .. " fillstyle solid noborder fillcolor rgb %q"):format(gnuplot.number(from / scale),
          gnuplot.number(to / scale), canvas.shade)
    end
    local text = room > 0.16 and (zone % 2 == 0 and "zone %d, inverted" or "zone %d")
      or room > 0.03 and "%d"
    if text and top then
      local middle = axis.at((axis.place(from) + axis.place(to)) / 2)
      out[#out + 1] = ("set label %s at first %s, graph 0.965 center front textcolor rgb %q")
        :format(gnuplot.quote(text:format(zone)), gnuplot.number(middle / scale), "#5a626b")
    end
  end
  return out
end

local function marks_of(list, scales, kind, value)
  local rows = {}
  for _, source in ipairs(list) do
    if source.kind == kind then
      rows[#rows + 1] = { source.hz / scales.x, value(source) }
    end
  end
  if #rows == 0 then
    rows[1] = { 0 / 0, 0 / 0 }
  end
  return rows
end

local function points(name, kind)
  return ("$%s with points pt %d ps 1.3 lw 1.8 lc rgb %q"):format(name, canvas.point[kind],
    canvas.colour[kind])
end

local function key_line(left_out)
  local text = "disc: line to be measured    triangle: interferer    shaded: shows inverted"
  if left_out > 0 then
    text = text .. "    (" .. left_out .. " names left out for want of room)"
  end
  return ("set label %s at screen %g, screen 0.02 left textcolor rgb %q"):format(
    gnuplot.quote(text), canvas.left, "#4a525b")
end

local function upper(out, view)
  local axis, scales = view.axis, view.scales
  local bottom = view.filter and 0.36 or 0.11
  canvas.add(out, {
    ("set bmargin at screen %g"):format(bottom),
    ("set ylabel %s"):format(gnuplot.quote("shows in the record at (" .. scales.y_unit .. ")")),
    view.filter and "set format x \"\"" or ("set xlabel %s"):format(
      gnuplot.quote("true frequency (" .. scales.x_unit .. ")")),
  })
  canvas.add(out, canvas.frequency(axis, scales.x, "x"))
  canvas.add(out, canvas.frequency(view.shown, scales.y, "y"))
  canvas.add(out, zones(axis, view.rate, scales.x, true))
  local marks = {}
  for i, source in ipairs(view.list) do
    marks[i] = { name = source.name, kind = source.kind, hz = source.hz,
      y = view.height(source) }
  end
  local names, left_out = canvas.names(marks, axis, scales.x)
  canvas.add(out, names)
  out[#out + 1] = key_line(left_out)
  out[#out + 1] = ("plot $zigzag with lines lw 1.4 lc rgb %q, %s, %s"):format(canvas.faint,
    points("others", "interferer"), points("lines", "line"))
end

local function lower(out, view)
  local rows, floor = {}, -10
  for i = 0, 600 do
    local hz = view.axis.at(i / 600)
    local db = view.filter:gain_db(hz, view.rate)
    rows[i + 1] = { hz / view.scales.x, math.max(db, -160) }
    floor = math.min(floor, rows[i + 1][2])
  end
  floor = math.floor(floor / 20) * 20
  local function level(source)
    return math.max(view.filter:gain_db(source.hz, view.rate), floor)
  end
  canvas.add(out, {
    "unset label", "unset arrow", "unset object", "set bmargin at screen 0.11",
    "set tmargin at screen 0.33", "set format x \"% h\"",
    ("set xlabel %s"):format(gnuplot.quote("true frequency (" .. view.scales.x_unit .. ")")),
    ("set ylabel %s"):format(gnuplot.quote("filter passes (dB)")),
    "unset logscale y", ("set yrange [%d:5]"):format(floor),
    ("set ytics %d"):format(floor <= -100 and 40 or floor <= -40 and 20 or 10),
  })
  canvas.add(out, zones(view.axis, view.rate, view.scales.x, false))
  canvas.add(out, {
    gnuplot.block("gain", rows),
    gnuplot.block("others_db", marks_of(view.list, view.scales, "interferer", level)),
    gnuplot.block("lines_db", marks_of(view.list, view.scales, "line", level)),
    ("plot $gain with lines lw 1.4 lc rgb %q, %s, %s"):format(canvas.faint,
      points("others_db", "interferer"), points("lines_db", "line")),
  })
end

local function view_of(plan)
  local rate = type(plan.rate) == "number" and plan.rate or plan.rate:number()
  local list = sources.list(plan)
  local view = { list = list, rate = rate, filter = sources.filter(plan) }
  view.axis = true_axis(list, rate)
  view.shown = shown_axis(list, rate, view.axis.log)
  view.scales = {}
  view.scales.x, view.scales.x_unit = axes.unit(view.axis.most)
  view.scales.y, view.scales.y_unit = axes.unit(view.shown.most)
  function view.height(source)
    return math.max(source.shown_hz, view.shown.log and view.shown.least or 0) / view.scales.y
  end
  return view
end

local function half_text(rate)
  return numbers.exact(rate / 2)
end

--- Commands that draw the fold map of a plan.
-- @param plan table: a plan with demand and digitizer
-- @return table: commands for gnuplot.save; or nil, message, code ("format")
-- @usage
-- local commands = require("libration.report.fold_plot").commands {
--   rate = lb.fraction.new(1000), digitizer = {},
--   demand = { title = "t", lines = { { name = "a", hz = lb.fraction.new(700) } } } }
-- assert(#commands > 10)
function M.commands(plan)
  local view = view_of(plan)
  local title = (plan.demand.title or "Plan") .. ": fold map"
  local out, message, code = canvas.begin(title, "rate " .. numbers.exact(plan.rate)
    .. " S/s: everything above " .. half_text(plan.rate) .. " Hz folds below it")
  if not out then
    return nil, message, code
  end
  for _, source in ipairs(view.list) do
    local fine, why, kind = gnuplot.quote(source.name)
    if not fine then
      return nil, why, kind
    end
  end
  out[#out + 1] = "set multiplot"
  out[#out + 1] = gnuplot.block("zigzag", zigzag(view.axis, view.shown, view.rate, view.scales))
  out[#out + 1] = gnuplot.block("others",
    marks_of(view.list, view.scales, "interferer", view.height))
  out[#out + 1] = gnuplot.block("lines", marks_of(view.list, view.scales, "line", view.height))
  upper(out, view)
  if view.filter then
    lower(out, view)
  end
  out[#out + 1] = "unset multiplot"
  return out
end

return M
