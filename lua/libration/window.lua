--- Window shapes: their samples, their response and their figures of merit.
-- A window is a shape with its parameter and no length. All samples are
-- periodic. Distances are in bins, responses are relative to the peak at the
-- line; a length of nil stands for the limit of long records.

local core = require("libration.core").window

local M = {}

local Window = { __name = "libration.window" }
Window.__index = Window

local rows, names

local function load_rows()
  if rows then
    return
  end
  rows, names = {}, {}
  for i, row in ipairs(core.shapes()) do
    rows[row.name] = row
    names[i] = row.name
  end
end

--- The names of all windows.
-- @return table: list of strings, cosine sums first
-- @usage
-- local names = lb.windows()
-- assert(names[1] == "rectangular" and #names > 40)
function M.windows()
  load_rows()
  return table.move(names, 1, #names, 1, {})
end

local function check_parameter(row, parameter)
  if parameter == nil then
    return
  end
  if not row.parameter_name then
    error(("window '%s' has no parameter, got %s"):format(row.name, tostring(parameter)), 3)
  end
  if type(parameter) ~= "number" or not (parameter >= row.least and parameter <= row.most) then
    error(("%s of window '%s' must be a number from %g to %g, got %s"):format(row.parameter_name,
      row.name, row.least, row.most, tostring(parameter)), 3)
  end
end

--- A window by its name.
-- Raises on an unknown name (the message lists the valid ones) and on a
-- parameter out of its range.
-- @param name string: one of lb.windows()
-- @param parameter number: of shapes that have one; default: the shape's own
-- @return window: fields name, title, source, coefficients (w = a0 - a1 cos +
--   a2 cos 2 - ..., empty for other shapes), parameter_name, parameter
-- @usage
-- local w = lb.window "hann"
-- assert(#w:samples(8) == 8 and w.coefficients[2] == 0.5)
function M.window(name, parameter)
  load_rows()
  local row = rows[name]
  if not row then
    error(("no window '%s'; there are %s"):format(tostring(name), table.concat(names, ", ")), 2)
  end
  check_parameter(row, parameter)
  local kernel, used = core.new(name, parameter)
  return setmetatable({
    name = row.name, title = row.title, source = row.source,
    coefficients = table.move(row.coefficients, 1, #row.coefficients, 1, {}),
    parameter_name = row.parameter_name, parameter = row.parameter_name and used,
    kernel = kernel,
  }, Window)
end

--- The samples of the window.
-- @param n integer: length, at least 1
-- @return samples: n values, periodic, peak near 1
-- @usage
-- local x = lb.window("hann"):samples(4)
-- assert(x[1] == 0 and x[3] == 1)
function Window:samples(n)
  return self.kernel:samples(n)
end

--- The response at a distance from the line.
-- @param x number: distance, bins
-- @param n integer: record length, at least 4; default: the limit of long records
-- @return number: |W(x)| / |W(0)|
-- @usage
-- assert(math.abs(lb.window("hann"):gain(1, 64) - 0.5) < 1e-12)
function Window:gain(x, n)
  return self.kernel:gain(x, n)
end

--- Bounds of the response over an interval of distances.
-- Both bounds hold for every x of the interval; they are at most 1e-9 plus one
-- part in a thousand wide of the truth.
-- @param x1 number: start of the interval, bins
-- @param x2 number: end of the interval, bins
-- @param n integer: record length, at least 4; default: the limit of long records
-- @return number: low
-- @return number: high
-- @usage
-- local _, high = lb.window("blackman_harris4"):range(4, 1000)
-- assert(high < 10 ^ (-92 / 20))
function Window:range(x1, x2, n)
  return self.kernel:range(x1, x2, n)
end

--- The figures of merit, in the words of Harris 1978 and Heinzel et al. 2002.
-- In the limit of long records, or at the stated length where the shape has no
-- limit (Dolph-Chebyshev). The recommended overlap is the one at which amplitude
-- flatness less noise correlation is largest.
-- @return table: length (0: the limit), coherent_gain, noise_bandwidth (bins),
--   noise_bandwidth_db, scalloping_db, flatness_db, worst_loss_db,
--   width_half_power, width_3db, width_6db, width_half (bins), first_null (bins),
--   side_lobe_db, side_lobe_at (bins), decay_db_octave, overlap_50, overlap_75
--   (correlations), overlap (recommended, share of the length), and there
--   amplitude_flatness, power_flatness, correlation. A figure that the window
--   does not have is absent.
-- @usage
-- local f = lb.window("hann"):figures()
-- assert(math.abs(f.width_3db - 1.4382) < 1e-4 and f.decay_db_octave > 18)
function Window:figures()
  if not self.figures_made then
    self.figures_made = self.kernel:figures()
  end
  local copy = {}
  for name, value in pairs(self.figures_made) do
    copy[name] = value
  end
  return copy
end

-- What is printed: field, label, factor, format.
local printed = {
  { "coherent_gain", "coherent gain", 1, "%.6f" },
  { "noise_bandwidth", "noise bandwidth", 1, "%.5f bins" },
  { "scalloping_db", "scalloping loss", 1, "%.4f dB" },
  { "flatness_db", "flatness in half a bin", 1, "%+.4f dB" },
  { "worst_loss_db", "worst processing loss", 1, "%.4f dB" },
  { "width_half_power", "width at half power", 1, "%.4f bins" },
  { "width_3db", "width at -3 dB", 1, "%.4f bins" },
  { "width_6db", "width at -6 dB", 1, "%.4f bins" },
  { "first_null", "first null", 1, "%.4f bins" },
  { "side_lobe_db", "highest side lobe", 1, "%.2f dB" },
  { "side_lobe_at", "  where", 1, "%.3f bins" },
  { "decay_db_octave", "side lobe decay", 1, "%.1f dB/octave" },
  { "overlap_50", "correlation at 50 %", 100, "%.2f %%" },
  { "overlap_75", "correlation at 75 %", 100, "%.2f %%" },
  { "overlap", "recommended overlap", 100, "%.2f %%" },
  { "amplitude_flatness", "  amplitude flatness", 1, "%.4f" },
  { "power_flatness", "  power flatness", 1, "%.4f" },
}

local function row(label, text)
  return ("  %-24s %s"):format(label, text)
end

function Window:__tostring()
  local lines = { ("%s (%s)"):format(self.title, self.name), row("source", self.source) }
  if self.parameter_name then
    lines[#lines + 1] = row(self.parameter_name, ("%.10g"):format(self.parameter))
  end
  for k, a in ipairs(self.coefficients) do
    lines[#lines + 1] = row("a" .. k - 1, ("%.12g"):format(a))
  end
  local figures = self:figures()
  lines[#lines + 1] = row("figures for", figures.length == 0 and "long records"
    or ("%d samples"):format(figures.length))
  for _, item in ipairs(printed) do
    local value = figures[item[1]]
    lines[#lines + 1] = row(item[2], value and item[4]:format(item[3] * value) or "none")
  end
  return table.concat(lines, "\n")
end

return M
