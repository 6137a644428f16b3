-- What every measurement of lines is: a table of facts with a kind, printed as
-- a table, written as CSV and JSON, and read back from JSON.

local base = require("libration.core").base
local csv = require "libration.report.csv"
local fraction = require "libration.fraction"
local json = require "libration.json"
local layout = require("libration.report.table").layout
local round = require("libration.report.numbers").round
local shown = require "libration.lines.shown"

local cjson = require "cjson"

local M = {}

local Result = {}
Result.__index = Result
Result.__name = "libration.lines.result"

--- The methods of every result.
M.Result = Result

-- kind -> { columns = names of a row for CSV, rows = function, text = function }
local kinds = {}

--- Adds a kind of result.
function M.define(kind, row)
  kinds[kind] = row
end

--- Makes a result of a table of facts.
function M.new(kind, facts)
  assert(kinds[kind], "a result of no kind")
  facts.kind = kind
  return setmetatable(facts, Result)
end

--- Value and uncertainty as text: to the second digit of the uncertainty
-- (JCGM 100:2008, 7.2.6).
function M.with(value, u)
  if not (u and u > 0 and u < math.huge) then
    return round(value, 6)
  end
  local places = 1 - math.floor(math.log(u, 10))
  return places > 0 and places < 16 and ("%." .. places .. "f"):format(value) or round(value, 6)
end

--- Text of an uncertainty: two digits, rounded up; empty without one.
function M.u(u)
  return u and u == u and round(u, 2, 1) or ""
end

--- Lines of a table below a headline.
function M.page(head, columns, rows, notes)
  local lines = { head }
  table.move(layout(columns, rows, 2), 1, #rows + 3, 2, lines)
  table.move(notes or {}, 1, #(notes or {}), #lines + 1, lines)
  return table.concat(lines, "\n")
end

--- "51200 S/s, 4096 samples, channel 2"
function M.origin(r)
  return ("%s S/s, %d samples%s"):format(fraction.text(r.rate), r.samples,
    r.channel and ", channel " .. r.channel or "")
end

--- What a source gives every result.
function M.facts(source, more)
  more.rate, more.samples = source.rate, #source.x
  more.unit, more.channel = source.unit, source.channel
  return more
end

--- See Result:csv in lines.
function M.csv(self)
  local row, rows = kinds[self.kind], {}
  if row.columns[#row.columns] == "unit" then return csv.rows(row.columns, row.rows(self)) end
  for i, line in ipairs(row.rows(self)) do -- a unit for amplitudes; the others say theirs
    rows[i] = setmetatable({ unit = self.unit }, { __index = line })
  end
  local columns = table.move(row.columns, 1, #row.columns, 1, {})
  columns[#columns + 1] = "unit"
  return csv.rows(columns, rows)
end

--- See Result:json in lines.
function M.json(self)
  return json.encode(self)
end

function Result:__tostring()
  return kinds[self.kind].text(self)
end

local function revive(value)
  if value == cjson.null then
    return nil
  elseif type(value) ~= "table" then
    return value
  elseif type(value.exact) == "string" and type(value.value) == "number" then
    return fraction.new(value.exact)
  end
  local out = {}
  for key, item in pairs(value) do out[key] = revive(item) end
  out.samples = math.tointeger(out.samples) or out.samples
  return out
end

-- Whether all is there that its table and its CSV are made of.
local function is_whole(value)
  return math.type(value.samples) == "integer" and type(value.unit) == "string"
    and pcall(kinds[value.kind].text, value)
    and pcall(M.csv, value) and pcall(shown.picture, value)
end

--- A result from what json() wrote.
function M.read(text)
  local fine, value = pcall(cjson.decode, text)
  if not fine then
    return nil, "lines: not JSON: " .. tostring(value), "format"
  elseif type(value) ~= "table" or type(value.kind) ~= "string" or not kinds[value.kind] then
    return nil, "lines: JSON, but no measurement of lines", "format"
  end
  fine, value = pcall(revive, value)
  if not fine or not base.is_fraction(value.rate) then
    return nil, "lines: a measurement of lines without an exact rate", "format"
  end
  if not is_whole(value) then
    return nil, "lines: a measurement of lines with fields missing or of another type", "format"
  end
  return setmetatable(value, Result)
end

shown.results(Result)

return M
