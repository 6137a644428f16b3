--- How a record is cut into segments and averaged: options, checked.

local core = require("libration.core").spectrum
local units = require "libration.units"
local window = require "libration.window"

local M = {}

local MOST = 2 ^ 27 -- points of a transform

local fields = { segment = true, window = true, overlap = true, step = true, points = true,
                 detrend = true, averaging = true, workers = true, channels = true, rate = true,
                 unit = true, cross = true }

local choices = {
  detrend = { "none", "mean", "line" },
  averaging = { "mean", "median", "peak" },
}

--- Raises a mistake in the options of a survey.
-- @param level integer: as of error, of the caller
-- @param text string: a format, followed by its values
function M.fail(level, text, ...)
  error("survey: " .. text:format(...), level + 1)
end

local fail = M.fail

--- Raises on fields that are not in a set.
-- @param options table: what was given
-- @param valid table: names as keys
-- @param level integer: as of error
function M.check_fields(options, valid, level)
  if type(options) ~= "table" then
    fail(level + 1, "the options are a table, not %s", type(options))
  end
  for key in pairs(options) do
    if not valid[key] then
      local names = {}
      for name in pairs(valid) do names[#names + 1] = name end
      table.sort(names)
      fail(level + 1, "unknown field %s; valid are %s", tostring(key), table.concat(names, ", "))
    end
  end
end

local function one_of(options, field, level)
  local value = options[field]
  if value == nil then return choices[field][1] end
  for _, choice in ipairs(choices[field]) do
    if value == choice then return value end
  end
  fail(level + 1, "%s is %s; valid are %s", field, tostring(value),
    table.concat(choices[field], ", "))
end

local function integer(options, field, least, most, default, level)
  local value = options[field]
  if value == nil then value = default end
  if math.type(value) ~= "integer" or value < least or value > most then
    fail(level + 1, "%s is %s; it must be an integer from %d to %d", field, tostring(value), least,
      most)
  end
  return value
end

-- A window by name, as { name, parameter }, or made already.
local function window_of(given, level)
  if given == nil then given = "hann" end
  if type(given) == "string" then return window.window(given) end
  if type(given) == "table" and given.kernel then return given end
  if type(given) == "table" and type(given[1]) == "string" then
    return window.window(given[1], given[2])
  end
  fail(level + 1, "window is %s; give a name, { name, parameter } or a window", tostring(given))
end

-- Samples from segment to segment; an overlap must be a whole number of them.
local function step_of(options, length, level)
  if options.step ~= nil then
    if options.overlap ~= nil then fail(level + 1, "give overlap or step, not both") end
    return integer(options, "step", 1, length, nil, level + 1)
  end
  local share = 0.5
  if options.overlap ~= nil then
    local reason
    share, reason = units.number(options.overlap, "1")
    if not share then fail(level + 1, "overlap: %s", reason) end
  end
  local shared = share * length
  local whole = math.floor(shared + 0.5)
  if not (share >= 0 and whole < length) then
    fail(level + 1, "overlap is %s; it must be from 0 to less than 1", tostring(options.overlap))
  elseif math.abs(shared - whole) > 1e-9 * length then
    fail(level + 1, "overlap %s of %d samples is %g samples, no whole number; give step, such as "
      .. "%d", tostring(options.overlap or "0.5"), length, shared, length - whole)
  end
  return length - whole
end

--- The options of an average, checked and complete.
-- @param options table: as survey.averages takes them
-- @param level integer: as of error
-- @return table: length, step, points, overlap, window (with coefficients), weights (its samples),
--   detrend, averaging, workers, cross
function M.read(options, level)
  M.check_fields(options, fields, level + 1)
  if options.segment == nil then fail(level + 1, "segment is missing: samples in a segment") end
  local length = integer(options, "segment", 1, MOST, nil, level + 1)
  local out = {
    length = length, step = step_of(options, length, level + 1),
    points = integer(options, "points", length, MOST, length, level + 1),
    window = window_of(options.window, level + 1),
    detrend = one_of(options, "detrend", level + 1),
    averaging = one_of(options, "averaging", level + 1),
    workers = integer(options, "workers", 0, 1024, 0, level + 1), cross = options.cross or false,
  }
  if out.cross and out.averaging ~= "mean" then
    fail(level + 1, "averaging is %s; cross spectra are averaged by the mean alone", out.averaging)
  end
  out.overlap = 1 - out.step / length
  out.weights = out.window:samples(length)
  if not (out.weights:sum() > 0) then
    fail(level + 1, "window %s of %d samples has no sum to scale by", out.window.name, length)
  end
  return out
end

-- Effective averages of stretches that do not overlap each other: the variance of their weighted
-- mean, K^2 / sum of K_i^2 / n_i.
local function effective(s, segments, stretches, last)
  local function of(count) return core.effective_averages(s.weights, s.step, count) end
  if #stretches == 0 then return of(segments) end
  local sum = last > 0 and last ^ 2 / of(last) or 0
  for _, count in ipairs(stretches) do
    if count > 0 then sum = sum + count ^ 2 / of(count) end
  end
  return segments ^ 2 / sum
end

--- What a number of segments is worth.
-- The median of noise scatters more than the mean: its averages are fewer by (ln 2)^2, the limit
-- for many of them (variance of a sample median, 1 / (4 n f^2), f the density at the median). The
-- bias of a median is taken for as many averages as the segments are worth; simulated noise agrees
-- within 1 % for overlaps up to 75 %.
-- @param s table: of read
-- @param segments integer: how many there are
-- @param stretches table: how many of them lie before each break
-- @param last integer: how many after the last one
-- @return number: effective averages; nil for a peak hold, whose scatter is another
-- @return number: what a median is divided by; nil for other averages
function M.worth(s, segments, stretches, last)
  if s.averaging == "peak" then return nil, nil end
  local count = effective(s, segments, stretches, last)
  if s.averaging == "mean" then return count, nil end
  local ln2 = math.log(2)
  local odd = segments - 1 + segments % 2 -- an even number's median is biased as one less
  return count * (segments <= 2 and 1 or ln2 * ln2),
    core.median_bias(math.max(1, count * odd / segments))
end

return M
