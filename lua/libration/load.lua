--- Demands and digitizers from data files.

local demand = require "libration.demand"
local digitizer = require "libration.digitizer"
local inert = require "libration.inert"
local options = require "libration.options"

local M = {}

local names = { "demand", "digitizer", "digitizers" }

-- Reads one part of the file; its mistakes get the part's name in front.
local function part(value, name, read, mistakes)
  local own = options.mistakes()
  local result = read(value, own)
  for _, mistake in ipairs(own) do
    local path = mistake.path
    local mark = (path == "" or path:find "^%[") and "" or "."
    mistakes:add(name .. mark .. path, mistake.reason)
  end
  for _ = #own + 1, own.count do
    mistakes:add(name, "")
  end
  return result
end

local function read_digitizers(data, mistakes)
  local list = data.digitizers
  if list == nil then
    return data.digitizer ~= nil
      and { part(data.digitizer, "digitizer", digitizer.read, mistakes) } or nil
  elseif type(list) ~= "table" or data.digitizer ~= nil then
    mistakes:add("digitizers", "give digitizer = { ... } or digitizers = { { ... }, ... }")
    return nil
  end
  return options.list(function(value, path)
    return part(value, path, digitizer.read, mistakes)
  end, 1, 100)(list, "digitizers", mistakes)
end

local function interpret(data, mistakes)
  for name in pairs(data) do
    local known = name == "demand" or name == "digitizer" or name == "digitizers"
    if not known then
      local near = options.nearest(name, names)
      mistakes:add(name, ("no such part%s; parts: %s"):format(
        near and (' (did you mean "%s"?)'):format(near) or "", table.concat(names, ", ")))
    end
  end
  if data.demand == nil and data.digitizer == nil and data.digitizers == nil then
    mistakes:add("", "neither a demand nor a digitizer: demand = { lines = { ... } }")
  end
  local result = {}
  result.demand = data.demand ~= nil and part(data.demand, "demand", demand.read, mistakes) or nil
  result.digitizers = read_digitizers(data, mistakes)
  result.digitizer = result.digitizers and result.digitizers[1]
  return result
end

--- Reads the text of a data file: demand = { ... }, digitizer = { ... }.
-- @param text string: as libration.inert reads it
-- @param name string: what to call it in messages, default "data"
-- @return table: as load; or nil, message, code
-- @usage
-- local parse = require("libration.load").parse
-- local data = parse 'digitizer = { rates = { "48 kS/s" } }'
-- assert(data.digitizer.rates.kind == "list" and data.demand == nil)
function M.parse(text, name)
  name = name or "data"
  local data, reason, code = inert.read(text)
  if not data then
    return nil, name .. ":" .. reason:gsub("\n", function() return "\n" .. name .. ":" end), code
  end
  return M.interpret(data, name)
end

--- Makes demands and digitizers of the plain tables of a data file.
-- @param data table: from libration.inert
-- @param name string: what to call it in messages
-- @return table: as load; or nil, message, "format"
-- @usage
-- local interpret = require("libration.load").interpret
-- assert(select(3, interpret({ demnd = {} }, "x")) == "format")
function M.interpret(data, name)
  local mistakes = options.mistakes()
  local result = interpret(data, mistakes)
  if mistakes.count > 0 then
    return nil, mistakes:message(name), "format"
  end
  return result
end

--- Loads a data file: it can state things and do nothing.
-- The file assigns demand = { ... }, digitizer = { ... } or digitizers =
-- { { ... }, ... } with the fields that lb.demand and lb.digitizer take.
-- @param path string: file name
-- @return table: demand, digitizer (the first) and digitizers (list), each nil
-- when the file has none; or nil, message, code: "io" for what the file system
-- refuses, "format" for what is wrong in the file, all mistakes listed
-- @usage
-- local data, message, code = lb.load "/no/such/file"
-- assert(data == nil and code == "io")
function M.load(path)
  local data, reason, code = inert.read_file(path)
  if not data then
    return nil, reason, code
  end
  return M.interpret(data, path)
end

return M
