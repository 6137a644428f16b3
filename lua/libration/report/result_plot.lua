--- Pictures of results of analysis, from what the results say is to be drawn.
-- A picture is { title, below, panels }; a panel { x, y, curves, names }: the
-- axes { label, unit, log, least, most }, each curve { kind, role, name, x, y,
-- low, high } (see curves.rows), names a list of { name, kind, hz, y } for marks
-- on the one frequency axis. No axis is drawn without its unit. Roles are told
-- apart by hue, by lightness and by shape.

local canvas = require "libration.report.canvas"
local choose = require "libration.report.axis"
local curves = require "libration.report.curves"
local file = require "libration.report.file"
local gnuplot = require "libration.report.gnuplot"
local safe = require("libration.report.table").safe
local text_plot = require "libration.report.text_plot"

local M = {}

local note_colour = "#4a525b"

-- How a kind of curve is drawn in a role, and how it is called in the key.
local roles = {
  line = { colour = canvas.colour.line, shade = "#b7c9dd", hue = "dark blue", point = 7,
           shape = "disc" },
  other = { colour = canvas.colour.interferer, shade = "#f0cfb2", hue = "orange", point = 8,
            shape = "open triangle" },
  limit = { colour = canvas.colour.limit, shade = "#c9ced3", hue = "black", dash = 2, point = 4,
            shape = "open square" },
  floor = { colour = canvas.colour.floor, shade = "#dde2e6", hue = "grey", point = 13,
            shape = "grey diamond" },
}

local called = {
  line = function(r) return r.hue .. (r.dash and " dashes" or " line") end,
  band = function(r) return "pale " .. r.hue:gsub("dark ", "") .. " band" end,
  points = function(r) return r.shape end,
  dots = function(r) return r.hue .. " dots" end,
  bars = function(r) return r.hue .. " bars" end,
}

local function label(axis, unit)
  return axis.label .. " (" .. unit .. ")"
end

-- Every text of a picture; asserts that no axis is without a unit.
local function texts_of(picture)
  local list = { picture.title, picture.below }
  for _, panel in ipairs(picture.panels) do
    for _, axis in ipairs { panel.x, panel.y } do
      assert(type(axis.unit) == "string" and axis.unit ~= "", "an axis without a unit")
      list[#list + 1] = label(axis, axis.unit)
    end
    for _, curve in ipairs(panel.curves) do list[#list + 1] = curve.name or "" end
    for _, mark in ipairs(panel.names or {}) do list[#list + 1] = mark.name end
  end
  return list
end

local function check(picture)
  for _, text in ipairs(texts_of(picture)) do
    local fine, message, code = gnuplot.quote(text)
    if not fine then return nil, message, code end
  end
  return true
end

-- The axes of a panel, and what one unit of its x axis is.
local function axes_of(panel)
  local x, scale, unit = curves.range(panel, "x"), 1, panel.x.unit
  if panel.names and #panel.names > 0 or panel.x.spread then
    local low, high = x.least > 0 and x.least or x.most / 100, x.most
    x = choose.choose(low, high * (high / low > 25 and 1.5 or 1.1), 0)
  end
  if unit == "Hz" then scale, unit = choose.unit(x.most) end
  return { x = x, y = curves.range(panel, "y"), scale = scale, unit = unit }
end

local function numbers_range(letter, axis, scale)
  return {
    (axis.log and "set logscale " or "unset logscale ") .. letter,
    ("set %srange [%s:%s]"):format(letter, gnuplot.number(axis.least / scale),
      gnuplot.number(axis.most / scale)),
    "set format " .. letter .. ' "%g"',
  }
end

local function scaled(rows, curve, scale)
  if scale == 1 then return rows end
  for _, row in ipairs(rows) do
    for i, value in ipairs(row) do
      if i == 1 or curve.kind == "bars" and (i == 3 or i == 4) then row[i] = value / scale end
    end
  end
  return rows
end

-- One way to draw each kind: the block's name and the role -> pieces of a plot.
local styles = {
  line = function(d, r)
    return { ("%s with lines lw 1.6 %slc rgb %q"):format(d, r.dash and "dt 2 " or "", r.colour) }
  end,
  band = function(d, r)
    return { ("%s using 1:2:3 with filledcurves fillstyle solid noborder lc rgb %q"):format(d,
      r.shade) }
  end,
  points = function(d, r)
    return { ("%s with points pt %d ps 1.3 lw 1.6 lc rgb %q"):format(d, r.point, r.colour) }
  end,
  limits = function(d, r)
    return { ("%s using 1:3:(0):($4-$3) with vectors nohead lw 3 lc rgb %q"):format(d, r.colour),
             ("%s using 1:2 with points pt %d ps 1.3 lw 1.6 lc rgb %q"):format(d, r.point,
               r.colour) }
  end,
  dots = function(d, r)
    return { ("%s with points pt 7 ps 0.35 lc rgb %q"):format(d, r.colour) }
  end,
  bars = function(d, r)
    return { ("%s using 1:2:3:4:5:2 with boxxyerror fillstyle solid 1 border rgb \"#ffffff\""
      .. " lw 0.6 lc rgb %q"):format(d, r.colour) }
  end,
}

-- Bands lie behind all else.
local function in_order(list)
  local out = {}
  for _, behind in ipairs { true, false } do
    for _, curve in ipairs(list) do
      if (curve.kind == "band") == behind then out[#out + 1] = curve end
    end
  end
  return out
end

local function add_curves(out, panel, axes, number)
  local pieces = {}
  for i, curve in ipairs(in_order(panel.curves)) do
    local rows = curves.rows(curve, axes, curves.columns)
    local name = ("d%d_%d"):format(number, i)
    if #rows > 0 and not (#rows == 1 and #rows[1] == 0) then
      canvas.add(out, { gnuplot.block(name, scaled(rows, curve, axes.scale)) })
      local style = curve.kind == "points" and curve.low and "limits" or curve.kind
      canvas.add(pieces, styles[style]("$" .. name, roles[curve.role or "line"]))
    end
  end
  pieces[1] = pieces[1] or "1/0"
  out[#out + 1] = "plot " .. table.concat(pieces, ", \\\n  ")
end

-- The panel's place from the top (0) to the bottom (1) of the picture's field.
local function margins(picture, number)
  local top, bottom, gap = 0.905, 0.135, 0.065
  local share = 0
  for i, panel in ipairs(picture.panels) do
    if i < number then share = share + (panel.share or 1) end
  end
  local whole = 0
  for _, panel in ipairs(picture.panels) do whole = whole + (panel.share or 1) end
  local field = top - bottom + gap
  local high = top - field * share / whole
  local low = high - field * (picture.panels[number].share or 1) / whole + gap
  return high, low
end

local function frame(out, picture, number, axes)
  local panel = picture.panels[number]
  local high, low = margins(picture, number)
  canvas.add(out, numbers_range("x", axes.x, axes.scale))
  canvas.add(out, numbers_range("y", axes.y, 1))
  local last = number == #picture.panels
  canvas.add(out, {
    ("set tmargin at screen %g"):format(high), ("set bmargin at screen %g"):format(low),
    last and "set xlabel " .. gnuplot.quote(label(panel.x, axes.unit)) or "unset xlabel",
    "set ylabel " .. gnuplot.quote(label(panel.y, panel.y.unit)),
  })
  local left_out = 0
  if panel.names and #panel.names > 0 then
    assert(number == 1, "names stand above the first panel")
    local names
    names, left_out = canvas.names(panel.names, axes.x, axes.scale)
    canvas.add(out, names)
  end
  return left_out
end

-- What the marks mean, in the order in which they are drawn.
local function key_of(picture)
  local parts, seen = {}, {}
  for _, panel in ipairs(picture.panels) do
    for _, curve in ipairs(panel.curves) do
      local mark = called[curve.kind](roles[curve.role or "line"])
      local part = mark .. ": " .. (curve.name or "")
      if curve.name and not seen[part] then
        seen[part] = true
        parts[#parts + 1] = part
      end
    end
  end
  return parts
end

local function remarks(picture, views, left_out)
  local out, thin = {}, false
  for i, panel in ipairs(picture.panels) do
    local none, below = curves.hidden(panel, views[i].y)
    for _, curve in ipairs(panel.curves) do
      thin = thin or curves.is_long(curve, curves.columns)
    end
    local which = #picture.panels > 1 and panel.y.label .. ": " or ""
    if none > 0 then out[#out + 1] = ("%s%d values of 0 or less not shown"):format(which, none) end
    if below > 0 then out[#out + 1] = ("%s%d values below the axis"):format(which, below) end
  end
  if left_out > 0 then out[#out + 1] = ("%d names left out"):format(left_out) end
  if thin then out[#out + 1] = "each column shows the least and the most of its values" end
  return out
end

-- Texts one after the other in lines of a width, so many lines at most.
local function wrapped(parts, width)
  local lines = { "" }
  for _, part in ipairs(parts) do
    local line = lines[#lines]
    if line ~= "" and utf8.len(line) + utf8.len(part) + 4 > width then
      lines[#lines + 1] = part
    else
      lines[#lines] = line == "" and part or line .. "    " .. part
    end
  end
  return lines
end

local function key(out, parts)
  for i, line in ipairs(wrapped(parts, 145)) do
    out[#out + 1] = ("set label %s at screen %g, screen %g left textcolor rgb %q"):format(
      gnuplot.quote(line), canvas.left, 0.056 - 0.025 * (i - 1), note_colour)
  end
end

--- Commands that draw a picture of a result.
-- @param picture table: title, below, panels (see above)
-- @return table: commands for gnuplot.save; or nil, message, code ("format")
-- @usage
-- local commands = require("libration.report.result_plot").commands { title = "A", below = "b",
--   panels = { { x = { label = "frequency", unit = "Hz" }, y = { label = "size", unit = "V" },
--     curves = { { kind = "line", x = { 1, 2 }, y = { 3, 4 } } } } } }
-- assert(#commands > 10)
function M.commands(picture)
  local fine, message, code = check(picture)
  if not fine then return nil, message, code end
  local out = canvas.begin(picture.title, picture.below)
  out[#out + 1] = "set multiplot"
  local views, left_out = {}, 0
  for i, panel in ipairs(picture.panels) do
    views[i] = axes_of(panel)
    left_out = left_out + frame(out, picture, i, views[i])
    if i == #picture.panels then
      key(out, canvas.add(key_of(picture), remarks(picture, views, left_out)))
    end
    add_curves(out, panel, views[i], i)
    canvas.add(out, { "unset label", "unset arrow" })
  end
  out[#out + 1] = "unset multiplot"
  return out
end

-- What draws a kind of curve with characters, and how the key calls it.
local characters = { line = "*", other = "x", limit = "-", floor = "." }

local function text_pieces(name, curve)
  local mark = characters[curve.role or "line"]
  if curve.kind == "bars" then return { "$" .. name .. " using 1:2 with impulses lt 4" } end
  if curve.kind == "band" then
    return { ("$%s using 1:2 with points pt \".\""):format(name),
             ("$%s using 1:3 with points pt \".\""):format(name) }
  end
  local how = curve.kind == "line" and "with linespoints lt 1 pt %q" or "with points pt %q"
  return { ("$%s using 1:2 " .. how):format(name, curve.kind == "points" and mark == "*" and "o"
    or mark) }
end

local function text_panel(panel)
  local axes = axes_of(panel)
  local out = { "unset key", "set border 3", "set tics nomirror",
    "set xlabel " .. gnuplot.quote(label(panel.x, axes.unit)),
 }
  canvas.add(out, numbers_range("x", axes.x, axes.scale))
  canvas.add(out, numbers_range("y", axes.y, 1))
  local pieces = {}
  for i, curve in ipairs(in_order(panel.curves)) do
    local rows = curves.rows(curve, axes, text_plot.columns - 14)
    if #rows > 0 and not (#rows == 1 and #rows[1] == 0) then
      canvas.add(out, { gnuplot.block("d" .. i, scaled(rows, curve, axes.scale)) })
      canvas.add(pieces, text_pieces("d" .. i, curve))
    end
  end
  out[#out + 1] = "plot " .. (pieces[1] and table.concat(pieces, ", \\\n  ") or "1/0")
  return out
end

local function text_key(panel)
  local parts = {}
  for _, curve in ipairs(panel.curves) do
    local mark = characters[curve.role or "line"]
    if curve.kind == "band" then mark = "." end
    if curve.kind == "bars" then mark = "bars" end
    if curve.kind == "points" and mark == "*" then mark = "o" end
    if curve.name then parts[#parts + 1] = mark .. " " .. curve.name end
  end
  for _, mark in ipairs(panel.names or {}) do
    parts[#parts + 1] = ("%.6g: %s"):format(mark.hz, mark.name)
  end
  return table.concat(wrapped(parts, text_plot.columns), "\n")
end

--- A picture of a result as text for a terminal, panel below panel.
-- @param picture table: as of commands
-- @return string: lines; or nil, message, code ("format", "io")
-- @usage
-- local text = require("libration.report.result_plot").text { title = "A", below = "b",
--   panels = { { x = { label = "frequency", unit = "Hz" }, y = { label = "size", unit = "V" },
--     curves = { { kind = "line", x = { 1, 2 }, y = { 3, 4 } } } } } }
-- assert(text:find("size (V)", 1, true) and text:find("frequency (Hz)", 1, true))
function M.text(picture)
  local fine, message, code = check(picture)
  if not fine then return nil, message, code end
  local parts = {}
  for i, panel in ipairs(picture.panels) do
    local rows = math.max(14, text_plot.rows - 4 * (#picture.panels - 1))
    local drawn
    drawn, message, code = gnuplot.draw("txt", text_panel(panel), text_plot.columns, rows)
    if not drawn then return nil, message, code end
    parts[i] = label(panel.y, panel.y.unit) .. "\n"
      .. drawn:gsub("\f", ""):gsub("^%s*\n", ""):gsub("%s+$", "") .. "\n" .. text_key(panel) .. "\n"
  end
  local lines = {}
  for line in (picture.title .. "\n" .. picture.below .. "\n" .. table.concat(parts, "\n"))
      :gmatch "([^\n]*)\n" do
    lines[#lines + 1] = safe(line):gsub("%s+$", "")
  end
  return table.concat(lines, "\n") .. "\n"
end

--- Saves a picture of a result, whole or not at all.
-- @param picture table: as of commands
-- @param path string: ending in .svg, .png or .txt
-- @return boolean: true; or nil, message, code ("io", "domain", "format")
-- @usage
-- local save = require("libration.report.result_plot").save
-- assert(select(3, save({ panels = {} }, "a.doc")) == "domain")
function M.save(picture, path)
  local kind, message, code = gnuplot.kind(path)
  if not kind then return nil, message, code end
  local made
  made, message, code = (kind == "txt" and M.text or M.commands)(picture)
  if not made then return nil, message, code end
  if kind == "txt" then return file.write(path, made) end
  return gnuplot.save(path, made, canvas.width, canvas.height)
end

return M
