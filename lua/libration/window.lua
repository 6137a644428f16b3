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

function Window:__tostring()
  local lines = { ("%s (%s)"):format(self.title, self.name), "  source        " .. self.source }
  if self.parameter_name then
    lines[#lines + 1] = ("  %-13s %.10g"):format(self.parameter_name, self.parameter)
  end
  for k, a in ipairs(self.coefficients) do
    lines[#lines + 1] = ("  a%-12d %.12g"):format(k - 1, a)
  end
  return table.concat(lines, "\n")
end

return M
