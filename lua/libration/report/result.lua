--- What every result of an analysis can do: be drawn, written and read back.
-- A result's own module says what is drawn and what its table is; this module
-- makes the methods plot, csv and json of it and knows how to read JSON again.
-- Numbers are written so that they read back bit for bit; in JSON one that is
-- infinite or none is { "number": "inf" }, samples are lists.

local base = require("libration.core").base
local cjson = require "cjson"
local csv = require "libration.report.csv"
local fraction = require "libration.fraction"
local json = require "libration.json"
local result_plot = require "libration.report.result_plot"
local samples = require "libration.samples"

local M = {}

local known = {} -- name of a class -> { class, spec }

local odd = { inf = math.huge, ["-inf"] = -math.huge, nan = 0 / 0 }

local function odd_name(value)
  return value ~= value and "nan" or value > 0 and "inf" or "-inf"
end

local plain

local function plain_list(values)
  local out = {}
  for k = 1, #values do out[k] = plain(values[k]) end
  return out
end

-- A value as JSON can say it; a window by its name and parameter.
function plain(value)
  if type(value) == "number" and value - value ~= 0 then
    return { number = odd_name(value) }
  elseif samples.is(value) then
    return plain_list(value)
  elseif type(value) ~= "table" then
    return value
  elseif value.kernel then
    return { name = value.name, parameter_name = value.parameter_name or nil,
             parameter = value.parameter or nil }
  end
  local out = {}
  for key, item in pairs(value) do out[key] = plain(item) end
  return out
end

--- The methods that results share.
local Result = {}

--- Draws the result.
-- Every axis has its unit. Spectra show their confidence limits as a band, responses gain, phase
-- and coherence with their random error, bands bars, lists of lines points over the floor.
-- @param path string: ending in .svg, .png or .txt; nil: for the terminal
-- @return boolean: true, or without a path the picture as text; or nil, message, code ("io",
--   "domain", "format")
-- @usage
-- local x = lb.synth.noise { rate = 1000, samples = 4096, density = 0.01, seed = 1 }
-- local s = lb.survey.density(x, { rate = 1000, segment = 256, unit = "V" })
-- assert(s:plot():find("power density (V^2/Hz)", 1, true))
-- assert(select(3, s:plot "spectrum.doc") == "domain")
function Result:plot(path)
  local picture = known[getmetatable(self).__name].spec.picture(self)
  if path == nil then return result_plot.text(picture) end
  return result_plot.save(picture, path)
end

--- The result as CSV (RFC 4180): a row per bin, band or line, units in the first row.
-- Numbers read back bit for bit; lb.report.csv.read reads the text.
-- @return string: lines ended by CR LF
-- @usage
-- local s = lb.survey.lines(lb.samples.make(64, math.sin), { rate = 8, segment = 32, unit = "V" })
-- assert(s:csv():find("frequency (Hz),power (V^2)", 1, true) == 1)
function Result:csv()
  local heads, rows = known[getmetatable(self).__name].spec.table(self)
  return csv.cells(heads, rows)
end

--- The result as JSON, all its fields; lb.report.result.read reads it back.
-- @return string: the document; or nil, message, code ("format") for text that is not UTF-8
-- @usage
-- local s = lb.survey.lines(lb.samples.make(64, math.sin), { rate = 8, segment = 32 })
-- assert(lb.report.result.read(s:json()).values[5] == s.values[5])
function Result:json()
  local out = plain(self)
  out.result = getmetatable(self).__name
  return json.encode(out)
end

--- Gives a class of results the methods plot, csv and json; those it has stay.
-- @param class table: its metatable and methods, with __name
-- @param spec table: picture(self) (see result_plot), table(self) (column heads with units, list
--   of rows), samples (names of fields), integers (names of fields, at any depth)
-- @return table: the class
-- @usage
-- local class = { __name = "example.result" }
-- class.__index = class
-- lb.report.result.attach(class, { table = function(r) return { "a (V)" }, { { r.a } } end })
-- assert(setmetatable({ a = 0.5 }, class):csv() == "a (V)\r\n0.5\r\n")
function M.attach(class, spec)
  known[class.__name] = { class = class, spec = spec }
  for name, method in pairs(Result) do
    if rawget(class, name) == nil then class[name] = method end
  end
  return class
end

local function names_of(list)
  local out = {}
  for _, name in ipairs(list or {}) do out[name] = true end
  return out
end

local function revive(value, integers)
  if value == cjson.null then
    return nil
  elseif type(value) ~= "table" then
    return value
  elseif odd[value.number] then
    return odd[value.number]
  elseif type(value.exact) == "string" and type(value.value) == "number" then
    return fraction.new(value.exact)
  end
  local out = {}
  for key, item in pairs(value) do
    out[key] = revive(item, integers)
    if integers[key] then out[key] = math.tointeger(out[key]) or out[key] end
  end
  return out
end

local function make(value)
  local entry = known[value.result]
  local out = revive(value, names_of(entry.spec.integers))
  out.result = nil
  for _, name in ipairs(entry.spec.samples or {}) do
    out[name] = out[name] and samples.new(out[name])
  end
  if not base.is_fraction(out.rate) and entry.spec.rate then error("no exact rate", 0) end
  setmetatable(out, entry.class)
  local spec = entry.spec
  assert(type(tostring(out)) == "string" and type(out.unit) == "string" and spec.table(out))
  if spec.picture then result_plot.commands(spec.picture(out)) end -- raises where a field is wrong
  return out
end

--- A result again from the text that its json() wrote.
-- @param text string: JSON
-- @return table: the result with its methods; or nil, message, code ("format")
-- @usage
-- assert(select(3, lb.report.result.read "{}") == "format")
function M.read(text)
  local fine, value = pcall(cjson.decode, text)
  if not fine then
    return nil, "result: not JSON: " .. tostring(value), "format"
  elseif type(value) ~= "table" or not known[value.result] then
    return nil, "result: JSON, but no result of an analysis", "format"
  end
  local whole, out = pcall(make, value)
  if not whole then
    return nil, "result: a " .. value.result .. " with fields missing or of another type", "format"
  end
  return out
end

return M
