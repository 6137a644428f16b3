--- Reports: the same facts as text, pictures, JSON and CSV.

local csv = require "libration.report.csv"
local facts = require "libration.report.facts"
local json = require "libration.json"
local plot = require "libration.report.plot"
local result = require "libration.report.result"
local text = require "libration.report.text"

local M = { csv = csv, facts = facts, plot = plot, result = result, text = text }

--- A plan, refusal, proof or measurement as one JSON document.
-- @param value table: what lb.plan, plan:prove or record:measure returned
-- @return string: the document; or nil, message, code ("format")
-- @usage
-- assert(lb.report.json { worst = 0.5, lines = {} }:find '"holds": true')
function M.json(value)
  return json.encode(facts.of(value))
end

return M
