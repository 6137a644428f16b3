--- What the plots share: colours, frame, names in lanes, marks.
-- Lines are dark blue discs, interferers burnt-orange open triangles: different
-- in hue for every kind of colour vision, in lightness on a grey print, and in
-- shape without any colour.

local gnuplot = require "libration.report.gnuplot"
local lanes = require "libration.report.lanes"

local M = {}

M.ink, M.faint, M.shade = "#20242a", "#7d868f", "#e9edf0"
M.colour = { line = "#12477d", interferer = "#c4621a", limit = "#20242a", floor = "#8a929b" }
M.point = { line = 7, interferer = 8 } -- filled disc, open triangle

M.width, M.height = 1280, 860
M.left, M.right = 0.085, 0.975
M.columns, M.rows = 100, 32 -- of a plot in text

local character = 0.0068 -- width of a letter as a share of the plot's width
local lane_height = 0.026 -- share of the picture's height
local most_lanes = 9

-- Marks of one group with the group's name: a leader for one, a bracket for more.
local function draw_group(out, group, axis, scale, base_y)
  local y = base_y + (group.lane - 0.5) * lane_height
  local function at(place) return gnuplot.number(axis.at(place) / scale) end
  local style = ("lc rgb %q lw 0.7 dt 3"):format(M.faint)
  if #group.marks > 1 then
    local bar_y = gnuplot.number(y - lane_height * 0.45)
    out[#out + 1] = ("set arrow from first %s, screen %s to first %s, screen %s nohead"
      .. " lc rgb %q lw 1"):format(at(group.first), bar_y, at(group.last), bar_y,
        M.colour[group.kind])
  end
  for _, mark in ipairs(group.marks) do
    if #group.marks == 1 or mark == group.marks[1] or mark == group.marks[#group.marks] then
      out[#out + 1] = ("set arrow from first %s, screen %s to first %s, first %s nohead back %s")
        :format(at(mark.x), gnuplot.number(y - lane_height * 0.45), at(mark.x),
          gnuplot.number(mark.y), style)
    end
  end
  out[#out + 1] = ("set label %s at first %s, screen %s center front textcolor rgb %q")
    :format(gnuplot.quote(group.text), at(group.middle), gnuplot.number(y), M.colour[group.kind])
end

--- Names for marks, in lanes above a plot; sets the plot's top below them.
-- @param marks table: list of { name, kind, hz, y (first axis) }
-- @param axis table: of the plot, see axis.choose
-- @param scale number: Hz in one unit of the axis
-- @return table: commands; and integer: names left out
-- @usage
-- local canvas = require "libration.report.canvas"
-- local axis = require("libration.report.axis").choose(1, 10, 0)
-- local commands = canvas.names({ { name = "a", kind = "line", hz = 5, y = 1 } }, axis, 1)
-- assert(#commands == 3)
function M.names(marks, axis, scale)
  local seen = {}
  for _, mark in ipairs(marks) do
    mark.x = axis.place(mark.hz)
    if mark.x >= 0 and mark.x <= 1 then
      seen[#seen + 1] = mark
    end
  end
  local placed, used, left_out = lanes.place(lanes.group(seen), character, most_lanes)
  local base_y = 0.905 - used * lane_height
  local out = { ("set tmargin at screen %s"):format(gnuplot.number(base_y - 0.005)) }
  for _, group in ipairs(placed) do
    draw_group(out, group, axis, scale, base_y)
  end
  return out, left_out
end

--- Commands that every plot begins with.
-- @param title string: heading of the figure
-- @param below string: one line under the heading
-- @return table: commands; or nil, message, code ("format") for what cannot be drawn
-- @usage
-- assert(require("libration.report.canvas").begin("A", "b"))
function M.begin(title, below)
  local heading, message, code = gnuplot.quote(title)
  if not heading then
    return nil, message, code
  end
  return {
    "set border 3 lw 1 lc rgb \"" .. M.ink .. "\"",
    "set tics nomirror out scale 0.7",
    "set grid back lt 1 lw 0.7 lc rgb \"#d5dbe0\"",
    "unset key",
    ("set label %s at screen %g, screen 0.968 left font \",14\" textcolor rgb %q")
      :format(heading, M.left, M.ink),
    ("set label %s at screen %g, screen 0.938 left textcolor rgb %q")
      :format(gnuplot.quote(below), M.left, "#4a525b"),
    ("set lmargin at screen %g"):format(M.left),
    ("set rmargin at screen %g"):format(M.right),
  }
end

--- Commands for a frequency axis.
-- @param axis table: see axis.choose
-- @param scale number: Hz in one unit
-- @param letter string: "x" or "y"
-- @return table: commands
-- @usage
-- local axis = require("libration.report.axis").choose(1, 10, 0)
-- assert(#require("libration.report.canvas").frequency(axis, 1, "x") == 2)
function M.frequency(axis, scale, letter)
  return {
    axis.log and "set logscale " .. letter or "unset logscale " .. letter,
    ("set %srange [%s:%s]"):format(letter, gnuplot.number(axis.least / scale),
      gnuplot.number(axis.most / scale)),
  }
end

--- Adds a list of commands to another.
-- @param out table: grows
-- @param more table: what is added
-- @return table: out
-- @usage
-- assert(#require("libration.report.canvas").add({ "a" }, { "b" }) == 2)
function M.add(out, more)
  return table.move(more, 1, #more, #out + 1, out)
end

return M
