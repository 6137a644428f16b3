--- Writes values as JSON (RFC 8259), the same bytes for the same value.
-- Keys are sorted, numbers are the shortest text that reads back bit for bit in
-- any locale, a number that JSON cannot say (infinite, or none) is null, and a
-- fraction is an object with its exact text and its nearest number. Text that
-- is not UTF-8 is refused, not altered.

local base = require("libration.core").base

local M = {}

local short = {
  ['"'] = '\\"', ["\\"] = "\\\\", ["\n"] = "\\n", ["\r"] = "\\r", ["\t"] = "\\t",
}

local function escape(character)
  return short[character] or string.format("\\u%04x", character:byte())
end

local function quote(text, path)
  if not utf8.len(text) then
    error({ message = path .. " is text, but not UTF-8" }, 0)
  end
  return '"' .. text:gsub('[%c"\\\127]', escape) .. '"'
end

local function number(value)
  if value ~= value or value == math.huge or value == -math.huge then
    return "null"
  end
  return base.number_text(value)
end

local writers = {} -- by type: value, path, indentation, tables that are open -> text

local function write(value, path, margin, open)
  local writer = writers[type(value)]
  if not writer then
    error({ message = path .. " is a " .. type(value) .. ", which JSON cannot say" }, 0)
  end
  return writer(value, path, margin, open)
end

-- A table is a list when its keys are 1..n; an empty one is a list unless its
-- metatable says kind = "object".
local function is_list(value)
  local meta = getmetatable(value)
  if type(meta) == "table" and meta.kind == "object" then
    return false
  end
  local count = 0
  for _ in pairs(value) do
    count = count + 1
  end
  return count == #value
end

local function list(value, path, margin, open)
  local items, inner = {}, margin .. "  "
  for i, item in ipairs(value) do
    items[i] = inner .. write(item, path .. "[" .. i .. "]", inner, open)
  end
  if #items == 0 then
    return "[]"
  end
  return "[\n" .. table.concat(items, ",\n") .. "\n" .. margin .. "]"
end

local function object(value, path, margin, open)
  local keys, items, inner = {}, {}, margin .. "  "
  for key in pairs(value) do
    if type(key) ~= "string" then
      error({ message = path .. " mixes a list with names, which JSON cannot say" }, 0)
    end
    keys[#keys + 1] = key
  end
  table.sort(keys)
  for i, key in ipairs(keys) do
    local below = path == "" and key or path .. "." .. key
    items[i] = inner .. quote(key, below) .. ": " .. write(value[key], below, inner, open)
  end
  if #items == 0 then
    return "{}"
  end
  return "{\n" .. table.concat(items, ",\n") .. "\n" .. margin .. "}"
end

local function table_text(value, path, margin, open)
  if value == M.null then
    return "null"
  end
  if open[value] then
    error({ message = path .. " contains itself" }, 0)
  end
  open[value] = true
  local text = (is_list(value) and list or object)(value, path, margin, open)
  open[value] = nil
  return text
end

local function userdata_text(value, path, margin, open)
  if not base.is_fraction(value) then
    error({ message = path .. " is an object that JSON cannot say" }, 0)
  end
  return object({ exact = tostring(value), value = value:number() }, path, margin, open)
end

writers["nil"] = function() return "null" end
writers["boolean"] = tostring
writers["number"] = number
writers["string"] = quote
writers["table"] = table_text
writers["userdata"] = userdata_text

-- What stands for JSON's null inside a table.
M.null = setmetatable({}, { kind = "object" })

--- Marks a table as an object, so that it is written {} when it is empty.
-- @param value table: with text keys
-- @return table: the same
-- @usage
-- assert(lb.json.encode(lb.json.object {}) == "{}" and lb.json.encode {} == "[]")
function M.object(value)
  return setmetatable(value, { kind = "object" })
end

--- Writes a value as one JSON document.
-- @param value any: nil, boolean, number, text, fraction, and tables of these
-- @return string: the document, without a newline at its end; or nil, message,
-- code ("format") for what JSON cannot say
-- @usage
-- assert(lb.json.encode { 0.1, "a\n" } == '[\n  0.1,\n  "a\\n"\n]')
-- assert(select(3, lb.json.encode "\xff") == "format")
function M.encode(value)
  local fine, text = pcall(write, value, "", "", {})
  if fine then
    return text
  end
  if type(text) == "table" then
    return nil, "json: " .. text.message:gsub("^ ", "the value "), "format"
  end
  error(text, 0)
end

return M
