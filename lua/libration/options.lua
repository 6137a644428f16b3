--- Strict option tables: an unknown field is an error, all mistakes come at once.
-- A schema maps field names to rows { kind, required =, default = }. A kind is
-- a function (value, path, mistakes) that returns what the value means, or
-- reports a mistake and returns nil. Tables are read raw: metatables of the
-- caller are never run, and only as deep as the schema goes.

local base = require("libration.core").base
local units = require "libration.units"

local M = {}

local MOST_MISTAKES = 50

--- Text of a value for a message, short and safe.
-- @param value any: strings are quoted, tables are not looked into
-- @return string: at most about 60 characters
-- @usage
-- local options = require "libration.options"
-- assert(options.show("1 m") == '"1 m"' and options.show {} == "a table")
function M.show(value)
  local kind = type(value)
  if kind == "string" then
    local text = #value > 60 and value:sub(1, 57) .. "..." or value
    return '"' .. text:gsub("%c", "?") .. '"'
  elseif kind == "number" then
    return base.number_text(value)
  elseif kind == "boolean" or kind == "nil" then
    return tostring(value)
  elseif base.is_fraction(value) then
    return tostring(value)
  end
  return "a " .. kind
end

--- Path of a field inside a table: "lines[3].tolerance".
-- @param path string: of the table, "" at the top
-- @param key any: name or index
-- @return string: path of the field
-- @usage
-- assert(require("libration.options").join("lines[3]", "hz") == "lines[3].hz")
function M.join(path, key)
  if math.type(key) == "integer" then
    return ("%s[%d]"):format(path, key)
  elseif type(key) == "string" and key:find "^[%a_\128-\255][%w_\128-\255]*$" and #key <= 60 then
    return path == "" and key or path .. "." .. key
  end
  return ("%s[%s]"):format(path, M.show(key))
end

-- Fewest single-character edits between two short words.
local function distance(a, b)
  local row = {}
  for j = 0, #b do
    row[j] = j
  end
  for i = 1, #a do
    local corner = row[0]
    row[0] = i
    for j = 1, #b do
      local change = corner + (a:byte(i) == b:byte(j) and 0 or 1)
      corner = row[j]
      row[j] = math.min(change, row[j] + 1, row[j - 1] + 1)
    end
  end
  return row[#b]
end

--- The choice nearest to a misspelt word.
-- @param word string: what was written
-- @param choices table: list of strings
-- @return string: nearest, or nil when none is near
-- @usage
-- local options = require "libration.options"
-- assert(options.nearest("tolerence", { "times", "tolerance" }) == "tolerance")
function M.nearest(word, choices)
  local best, least = nil, nil
  if #word > 40 then
    return nil
  end
  for _, choice in ipairs(choices) do
    local edits = distance(word:lower(), choice:lower())
    if edits <= (math.min(#word, #choice) + 1) // 3 and (not least or edits < least) then
      best, least = choice, edits
    end
  end
  return best
end

local Mistakes = {}
Mistakes.__index = Mistakes

--- Reports a mistake: keeps it with its path.
-- @param path string: where
-- @param reason string: the value, what is wrong with it, the valid choices
-- @usage
-- local mistakes = require("libration.options").mistakes()
-- mistakes:add("bits", "99 is out of range; give at most 32")
-- assert(mistakes.count == 1)
function Mistakes:add(path, reason)
  self.count = self.count + 1
  if self.count <= MOST_MISTAKES then
    self[self.count] = { path = path, reason = reason }
  end
end

--- Whether there are more mistakes than a message shows, so that no more need
-- be worded with care.
-- @return boolean: true from the 50th on
-- @usage
-- assert(not require("libration.options").mistakes():enough())
function Mistakes:enough()
  return self.count >= MOST_MISTAKES
end

--- All mistakes as one message, in the order found.
-- @param what string: of what they are, "demand"
-- @return string: a line per mistake
-- @usage
-- local mistakes = require("libration.options").mistakes()
-- mistakes:add("bits", "missing")
-- assert(mistakes:message "digitizer" == "digitizer: 1 mistake\n  bits: missing")
function Mistakes:message(what)
  local lines = { ("%s: %d mistake%s"):format(what, self.count, self.count == 1 and "" or "s") }
  for _, mistake in ipairs(self) do
    lines[#lines + 1] = ("  %s: %s"):format(mistake.path == "" and what or mistake.path,
      mistake.reason)
  end
  if self.count > MOST_MISTAKES then
    lines[#lines + 1] = ("  and %d more"):format(self.count - MOST_MISTAKES)
  end
  return table.concat(lines, "\n")
end

--- A new, empty collection of mistakes.
-- @return table: with count, entries {path, reason}, add(path, reason) and
-- message(what)
-- @usage
-- local mistakes = require("libration.options").mistakes()
-- mistakes:add("lines[1].hz", "missing")
-- assert(mistakes:message("demand"):find "lines%[1%].hz: missing")
function M.mistakes()
  return setmetatable({ count = 0 }, Mistakes)
end

local function sorted_names(schema)
  local names = {}
  for name in pairs(schema) do
    names[#names + 1] = name
  end
  table.sort(names)
  return names
end

local function report_unknown(schema, input, path, mistakes)
  local names, unknown = sorted_names(schema), {}
  for key in next, input do
    if type(key) ~= "string" or not schema[key] then
      unknown[#unknown + 1] = key
    end
  end
  if #unknown > MOST_MISTAKES then
    mistakes:add(path, ("%d fields that there are not; fields: %s"):format(#unknown,
      table.concat(names, ", ")))
    return
  end
  table.sort(unknown, function(a, b) return M.join("", a) < M.join("", b) end)
  for _, key in ipairs(unknown) do
    local near = type(key) == "string" and not mistakes:enough() and M.nearest(key, names)
    mistakes:add(M.join(path, key), ("no such field%s; fields: %s"):format(
      near and (' (did you mean "%s"?)'):format(near) or "", table.concat(names, ", ")))
  end
end

--- Reads a table by a schema and collects the mistakes.
-- @param schema table: field name -> { kind, required = boolean, default = any }
-- @param input any: the table of the caller
-- @param path string: of that table, "" at the top
-- @param mistakes table: from mistakes()
-- @return table: name -> what the value means, defaults filled in; nil when
-- input is no table
-- @usage
-- local options = require "libration.options"
-- local mistakes = options.mistakes()
-- local read = options.read({ n = { options.integer(1, 9), default = 4 } }, {}, "", mistakes)
-- assert(read.n == 4 and mistakes.count == 0)
function M.read(schema, input, path, mistakes)
  if type(input) ~= "table" then
    mistakes:add(path, ("%s is not a table; fields: %s"):format(M.show(input),
      table.concat(sorted_names(schema), ", ")))
    return nil
  end
  local result = {}
  report_unknown(schema, input, path, mistakes)
  for _, name in ipairs(sorted_names(schema)) do
    local row, value = schema[name], rawget(input, name)
    if value ~= nil then
      result[name] = row[1](value, M.join(path, name), mistakes)
    elseif row.required then
      mistakes:add(M.join(path, name), "missing; " .. (row.hint or "it must be given"))
    else
      result[name] = row.default
    end
  end
  return result
end

--- Reads an option table and raises one error that lists all mistakes.
-- @param schema table: as in read
-- @param input table: or nil for no options
-- @param what string: whose options, for the message: "plan options"
-- @return table: name -> what the value means
-- @usage
-- local options = require "libration.options"
-- local schema = { trials = { options.integer(1, 1000), default = 100 } }
-- assert(options.take(schema, nil, "prove options").trials == 100)
-- local ok, message = pcall(options.take, schema, { trails = 3 }, "prove options")
-- assert(not ok and message:find 'did you mean "trials"')
function M.take(schema, input, what)
  local mistakes = M.mistakes()
  local result = M.read(schema, input == nil and {} or input, "", mistakes)
  if mistakes.count > 0 then
    error(mistakes:message(what), 0)
  end
  return result
end

--- Kind: text of 1 to `most` bytes, valid UTF-8, without control characters.
-- @param most integer: default 200
-- @return function: kind
-- @usage
-- local options = require "libration.options"
-- assert(options.text()("pump", "title", options.mistakes()) == "pump")
function M.text(most)
  most = most or 200
  return function(value, path, mistakes)
    if type(value) ~= "string" then
      mistakes:add(path, M.show(value) .. " is not a text")
    elseif value == "" or #value > most then
      mistakes:add(path, ("%s has %d bytes; give 1 to %d"):format(M.show(value), #value, most))
    elseif value:find "%c" or not utf8.len(value) then
      mistakes:add(path, M.show(value) .. " must be UTF-8 text on one line")
    else
      return value
    end
  end
end

--- Kind: true or false.
-- @return function: kind
-- @usage
-- local options = require "libration.options"
-- assert(options.boolean()(true, "x", options.mistakes()) == true)
function M.boolean()
  return function(value, path, mistakes)
    if type(value) == "boolean" then
      return value
    end
    mistakes:add(path, M.show(value) .. " is neither true nor false")
  end
end

--- Kind: one of a list of words.
-- @param choices table: list of strings
-- @return function: kind
-- @usage
-- local options = require "libration.options"
-- assert(options.choice { "bin", "tracked" }("bin", "reading", options.mistakes()) == "bin")
function M.choice(choices)
  return function(value, path, mistakes)
    for _, choice in ipairs(choices) do
      if value == choice then
        return value
      end
    end
    local near = type(value) == "string" and M.nearest(value, choices)
    mistakes:add(path, ("%s is not one of %s%s"):format(M.show(value),
      table.concat(choices, ", "), near and (' (did you mean "%s"?)'):format(near) or ""))
  end
end

local function outside(value, bounds)
  return bounds.least and value < bounds.least or bounds.most and value > bounds.most
    or bounds.above and value <= bounds.above or bounds.below and value >= bounds.below
end

local function bounds_text(bounds)
  local parts = {}
  for _, row in ipairs { { "least", "at least " }, { "above", "more than " },
    { "most", "at most " }, { "below", "less than " } } do
    local bound = bounds[row[1]]
    parts[#parts + 1] = bound and row[2] .. M.show(bound) or nil
  end
  return table.concat(parts, " and ") .. (bounds.unit and " " .. bounds.unit or "")
end

--- Kind: whatever a reader of units makes of the value, within bounds.
-- @param reader function: value -> meaning, or nil and a reason
-- @param bounds table: least, most, above, below (each optional), unit (text)
-- @return function: kind
-- @usage
-- local options = require "libration.options"
-- local kind = options.quantity(lb.units.seconds, { above = 0, unit = "s" })
-- assert(kind("60 s", "within", options.mistakes()) == 60)
function M.quantity(reader, bounds)
  return function(value, path, mistakes)
    local meaning, reason = reader(value)
    if meaning == nil then
      mistakes:add(path, reason)
    elseif bounds and outside(meaning, bounds) then
      mistakes:add(path, ("%s is out of range; give %s"):format(M.show(value),
        bounds_text(bounds)))
    else
      return meaning
    end
  end
end

--- Kind: a whole number.
-- @param least integer: smallest
-- @param most integer: largest
-- @return function: kind; takes "4 Mi" too
-- @usage
-- local options = require "libration.options"
-- assert(options.integer(1, 64)("24", "bits", options.mistakes()) == 24)
function M.integer(least, most)
  return M.quantity(units.count, { least = least, most = most })
end

--- Kind: a plain finite number.
-- @param bounds table: as in quantity
-- @return function: kind
-- @usage
-- local options = require "libration.options"
-- assert(options.number { least = 0 }(2.5, "price", options.mistakes()) == 2.5)
function M.number(bounds)
  return M.quantity(function(value)
    if type(value) == "number" and value - value == 0 then
      return value
    elseif base.is_fraction(value) then
      return value:number()
    end
    return nil, M.show(value) .. " is not a finite number"
  end, bounds)
end

-- Length of a table that is a plain list, or nil.
local function list_length(value)
  local count, n = 0, 0
  for _ in next, value do
    count = count + 1
  end
  while rawget(value, n + 1) ~= nil do
    n = n + 1
  end
  return count == n and n or nil
end

--- Kind: a list whose items are of one kind.
-- @param kind function: of every item
-- @param least integer: fewest items
-- @param most integer: most items
-- @return function: kind; items that are wrong are left out of the result
-- @usage
-- local options = require "libration.options"
-- local kind = options.list(options.integer(1, 99), 1, 4)
-- assert(#kind({ 2, 4, 8 }, "decimation", options.mistakes()) == 3)
function M.list(kind, least, most)
  return function(value, path, mistakes)
    local n = type(value) == "table" and list_length(value)
    if not n then
      mistakes:add(path, ("%s is not a list { a, b, ... }"):format(M.show(value)))
      return nil
    elseif n < least or n > most then
      mistakes:add(path, ("%d items; give %d to %d"):format(n, least, most))
      return nil
    end
    local result = {}
    for i = 1, n do
      result[#result + 1] = kind(rawget(value, i), M.join(path, i), mistakes)
    end
    return result
  end
end

--- Kind: a table with its own schema.
-- @param schema table: as in read
-- @return function: kind
-- @usage
-- local options = require "libration.options"
-- local kind = options.record { by = { options.text(), required = true } }
-- assert(kind({ by = "shaft" }, "sidebands", options.mistakes()).by == "shaft")
function M.record(schema)
  return function(value, path, mistakes)
    return M.read(schema, value, path, mistakes)
  end
end

return M
