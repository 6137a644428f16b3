--- The writer of data files: the same text for the same data, always.

local base = require("libration.core").base
local parser = require "libration.inert.parser"

local M = {}

local NAME = "^[%a_\128-\255][%w_\128-\255]*$"

local function as_byte(mark)
  return ("\\x%02x"):format(mark:byte())
end

local function quoted(text)
  local short = { ["\n"] = "\\n", ["\r"] = "\\r", ["\t"] = "\\t", ['"'] = '\\"' }
  local clean = text:gsub("\\", "\\\\"):gsub('[%c"]', function(mark)
    return short[mark] or as_byte(mark)
  end)
  if not utf8.len(text) then
    clean = clean:gsub("[\128-\255]", as_byte)
  end
  return '"' .. clean .. '"'
end

local function keys_of(value)
  local names, n = {}, 0
  while rawget(value, n + 1) ~= nil do
    n = n + 1
  end
  for key in next, value do
    if math.type(key) ~= "integer" or key < 1 or key > n then
      names[#names + 1] = key
    end
  end
  table.sort(names, function(a, b)
    if type(a) ~= type(b) then
      return type(a) == "number"
    end
    return a < b
  end)
  return names, n
end

local function key_text(key, path)
  if math.type(key) == "integer" then
    return ("[%d]"):format(key)
  elseif type(key) ~= "string" then
    error(("%s: a %s as key cannot be written"):format(path, type(key)), 0)
  elseif key:find(NAME) and key ~= "true" and key ~= "false" and utf8.len(key) then
    return key
  end
  return "[" .. quoted(key) .. "]"
end

local write

-- A table on one line when it is short, else an entry a line.
local function write_table(value, path, depth, indent)
  if depth >= parser.MOST_DEPTH then
    error(path .. ": tables are too deep, or contain themselves", 0)
  end
  for key in next, value do
    key_text(key, path)
  end
  local parts, inner = {}, indent .. "  "
  local names, n = keys_of(value)
  for i = 1, n do
    parts[i] = write(rawget(value, i), ("%s[%d]"):format(path, i), depth + 1, inner)
  end
  for _, key in ipairs(names) do
    local text = key_text(key, path)
    parts[#parts + 1] = text .. " = "
      .. write(rawget(value, key), path .. "." .. text, depth + 1, inner)
  end
  local line = "{ " .. table.concat(parts, ", ") .. " }"
  if #parts == 0 then
    return "{}"
  elseif #line + #indent <= 90 and not line:find("\n", 1, true) then
    return line
  end
  return "{\n" .. inner .. table.concat(parts, ",\n" .. inner) .. ",\n" .. indent .. "}"
end

write = function(value, path, depth, indent)
  local kind = type(value)
  if kind == "table" then
    return write_table(value, path, depth, indent)
  elseif kind == "string" then
    return quoted(value)
  elseif kind == "boolean" then
    return tostring(value)
  elseif kind == "number" and value - value == 0 then
    return value == 0 and 1 / value < 0 and "-0.0" or base.number_text(value)
  elseif base.is_fraction(value) then
    return quoted(tostring(value))
  end
  error(("%s: %s cannot be written"):format(path,
    kind == "number" and base.number_text(value) or "a " .. kind), 0)
end

--- Writes a plain table, see libration.inert.
-- @param data table: name -> value
-- @return string: a line or more for every name
-- @usage
-- assert(require("libration.inert.writer").write { a = 1 } == "a = 1\n")
function M.write(data)
  local parts = {}
  for key in next, data do
    if type(key) ~= "string" or key_text(key, "data") ~= key then
      error(("the name %s cannot be written at the top"):format(tostring(key)), 0)
    end
  end
  for _, key in ipairs((keys_of(data))) do
    parts[#parts + 1] = key .. " = " .. write(rawget(data, key), key, 0, "") .. "\n"
  end
  return table.concat(parts)
end

return M
