--- Pictures of plans: the fold map and the predicted spectrum.
-- The ending of the path chooses the kind: .svg and .png for reports, .txt for
-- a terminal. A picture appears whole or not at all.

local canvas = require "libration.report.canvas"
local fold_plot = require "libration.report.fold_plot"
local gnuplot = require "libration.report.gnuplot"
local spectrum_plot = require "libration.report.spectrum_plot"
local text_plot = require "libration.report.text_plot"

local M = {}

local function save(commands, draw_text, plan, path)
  local kind, message, code = gnuplot.kind(path)
  if not kind then
    return nil, message, code
  end
  local list
  list, message, code = (kind == "txt" and draw_text or commands)(plan)
  if not list then
    return nil, message, code
  end
  if kind == "txt" then
    return gnuplot.save(path, list, text_plot.columns, text_plot.rows)
  end
  return gnuplot.save(path, list, canvas.width, canvas.height)
end

--- Draws the fold map of a plan: where every frequency shows in the record.
-- @param plan table: a plan
-- @param path string: ending in .svg, .png or .txt
-- @return boolean: true; or nil, message, code ("io", "domain", "format")
-- @usage
-- assert(select(3, lb.report.plot.fold_map({}, "map.doc")) == "domain")
function M.fold_map(plan, path)
  return save(fold_plot.commands, text_plot.fold_map, plan, path)
end

--- Draws the predicted spectrum of a plan: every line with its bound.
-- @param plan table: a plan
-- @param path string: ending in .svg, .png or .txt
-- @return boolean: true; or nil, message, code ("io", "domain", "format")
-- @usage
-- assert(select(3, lb.report.plot.spectrum({}, "spectrum")) == "domain")
function M.spectrum(plan, path)
  return save(spectrum_plot.commands, text_plot.spectrum, plan, path)
end

--- A picture as text for a terminal.
-- @param plan table: a plan
-- @param which string: "fold map" or "spectrum"
-- @return string: lines; or nil, message, code
-- @usage
-- assert(not pcall(lb.report.plot.text, {}, "pie"))
function M.text(plan, which)
  local make = which == "fold map" and text_plot.fold_map
    or which == "spectrum" and text_plot.spectrum
  if not make then
    error('which: "' .. tostring(which) .. '" is no picture; valid: "fold map", "spectrum"', 2)
  end
  local list, message, code = make(plan)
  if not list then
    return nil, message, code
  end
  return gnuplot.draw("txt", list, text_plot.columns, text_plot.rows)
end

return M
