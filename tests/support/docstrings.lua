--- Reads the docstrings of the library: what is public, what is said about it.
-- A page is { name=, file=, purpose=, entries= }; an entry is { name=, file=,
-- line=, params= (names in the code, nil for C), least_params= (C: highest
-- argument number that the code asks for), doc= } and its doc { summary=,
-- text=, params= { {name=, text=} }, returns= { text }, usage=, usage_line= }.

local tree = require "tests.support.tree"

local M = {}

-- Cuts the comment marks; returns the lines and the number of the first one.
local function stripped(lines, first, last, in_c)
  local cut = {}
  for i = first, last do
    local line = lines[i]
    if in_c then
      line = line:gsub("%s*%*/%s*$", ""):gsub("^%s*/?%*+ ?", "")
    else
      line = line:gsub("^%s*%-%-%-? ?", "")
    end
    cut[#cut + 1] = line
  end
  return cut
end

local function trim(text)
  return (text:gsub("^%s+", ""):gsub("%s+$", ""))
end

-- Takes apart the lines of one block; `first` is the number of its first line.
local function parse_block(cut, first)
  local doc = { params = {}, returns = {} }
  local body, usage, last_item = {}, nil, nil
  for i, line in ipairs(cut) do
    local tag, rest = line:match("^@(%a+)%s*(.*)$")
    if usage then
      usage[#usage + 1] = line
    elseif tag == "usage" then
      usage, doc.usage_line = { rest }, first + i - 1
    elseif tag == "param" then
      local name, text = rest:match("^(%S+)%s*(.*)$")
      last_item = { name = name or "", text = text or "" }
      doc.params[#doc.params + 1] = last_item
    elseif tag == "return" then
      last_item = { text = rest }
      doc.returns[#doc.returns + 1] = last_item
    elseif tag then
      doc.unknown = tag
    elseif last_item then
      last_item.text = last_item.text .. " " .. trim(line)
    else
      body[#body + 1] = line
    end
  end
  doc.usage = usage and table.concat(usage, "\n")
  while body[1] and not body[1]:match("%S") do
    table.remove(body, 1)
  end
  doc.summary = trim(body[1] or "")
  doc.text = trim(table.concat(body, "\n", 2))
  return doc
end

local function split_params(list)
  local names = {}
  for name in list:gsub("%s", ""):gmatch("[^,]+") do
    names[#names + 1] = name
  end
  return names
end

-- The parameter list that starts on a line, which may go on over several.
local function lua_params(lines, number)
  local text = table.concat(lines, "\n", number, math.min(number + 8, #lines))
  return split_params((text:match("%b()") or "()"):sub(2, -2))
end

local function is_public(name)
  for part in name:gmatch("[^.:]+") do
    if part:match("^_") then
      return false
    end
  end
  return true
end

-- Name of the function that a line of Lua defines, and whether it is local.
local function lua_definition(line)
  local hidden = line:match("^local function ([%w_]+)%s*%(")
  if hidden then
    return hidden, true
  end
  return line:match("^function ([%w_.:]+)%s*%(")
      or line:match("^([%w_]+%.[%w_.]+)%s*=%s*function%s*%(")
end

local function lua_entry(lines, number, path, name, block)
  local doc = block and parse_block(stripped(lines, block, number - 1), block)
  return { name = name, file = path, line = number, params = lua_params(lines, number),
           doc = doc }
end

-- First line of the docstring that ends right above a line, or nil.
local function lua_block_above(lines, number)
  local first = number - 1
  while lines[first] and lines[first]:match("^%-%-") and not lines[first]:match("^%-%-%-") do
    first = first - 1
  end
  return lines[first] and lines[first]:match("^%-%-%-") and first or nil
end

local function lua_purpose(lines)
  if not (lines[1] or ""):match("^%-%-%-") then
    return nil
  end
  local last = 1
  while (lines[last + 1] or ""):match("^%-%-") do
    last = last + 1
  end
  local doc = parse_block(stripped(lines, 1, last), 1)
  return trim(doc.summary .. "\n" .. doc.text)
end

-- Local functions that are made public by `M.name = name`.
local function exported(lines)
  local names = {}
  for _, line in ipairs(lines) do
    local public, inner = line:match("^([%w_]+%.[%w_]+)%s*=%s*([%w_]+)%s*$")
    if public and public:match("^[^.]+%.(.*)$") then
      names[inner] = public
    end
  end
  return names
end

-- Tables of a file whose functions nobody outside sees: local classes that
-- have no __name.
local function private_classes(text)
  local private = {}
  for name in text:gmatch("\nlocal (%u[%w_]+)%s*=%s*{") do
    private[name] = true
  end
  for name, body in text:gmatch("\nlocal (%u[%w_]+)%s*=%s*(%b{})") do
    if body:match("__name%s*=") or text:match("\n" .. name .. "%.__name%s*=")
        or text:match("\nreturn " .. name .. "%s") then
      private[name] = nil
    end
  end
  private.M = nil
  return private
end

--- The page of one Lua module.
function M.lua_page(path, module)
  local text = tree.read(path)
  local lines, private = tree.lines(text), private_classes(text)
  local short = module:match("([^.]+)$")
  local entries, aliases = {}, exported(lines)
  for number, line in ipairs(lines) do
    local name, hidden = lua_definition(line)
    if hidden then
      name = aliases[name]
    end
    if name and is_public(name) and not private[name:match("^[%w_]+")] then
      local shown = name:gsub("^M([.:])", short .. "%1")
      entries[#entries + 1] = lua_entry(lines, number, path, shown, lua_block_above(lines, number))
    end
  end
  return { name = module, file = path, purpose = lua_purpose(lines), entries = entries }
end

-- Highest argument number that a C function asks Lua for.
local function c_arguments(lines, number)
  local most = 0
  for i = number, #lines do
    if lines[i]:match("^}") then
      break
    end
    for arg in lines[i]:gmatch("[%w_]*check[%w_]*%(L, (%d+)") do
      most = math.max(most, tonumber(arg))
    end
    for arg in lines[i]:gmatch("luaL_opt[%w_]*%(L, (%d+)") do
      most = math.max(most, tonumber(arg))
    end
  end
  return most
end

local function c_block_above(lines, number)
  if not (lines[number - 1] or ""):match("%*/%s*$") then
    return nil
  end
  local first = number - 1
  while first > 0 and not lines[first]:match("^/%*") do
    first = first - 1
  end
  return lines[first] and lines[first]:match("^/%*%*%*") and first or nil
end

local function c_functions(path)
  local lines = tree.lines(tree.read(path))
  local functions = {}
  for number, line in ipairs(lines) do
    local name = line:match("^static int ([%w_]+)%(lua_State") or
        line:match("^int ([%w_]+)%(lua_State")
    if name and not line:match(";%s*$") then
      local block = c_block_above(lines, number)
      functions[name] = {
        file = path, line = number, least_params = c_arguments(lines, number),
        doc = block and parse_block(stripped(lines, block, number - 1, true), block),
      }
    end
  end
  return functions
end

-- Rows of the luaL_Reg tables of a file: Lua name, C name, table.
local function c_rows(path)
  local rows = {}
  local text = tree.read(path):gsub("/%*.-%*/", "")
  for list, body in text:gmatch("luaL_Reg ([%w_]+)%[%]%s*=%s*(%b{})") do
    for name, func in body:gmatch('{%s*"([%w_]+)"%s*,%s*([%w_]+)%s*}') do
      if list ~= "rooms" and not name:match("^_") then
        rows[#rows + 1] = { name = name, func = func, list = list }
      end
    end
  end
  return rows
end

local function room_of(stem, rooms)
  return rooms[stem] and stem or rooms[stem:match("^[^_]+")] and stem:match("^[^_]+") or stem
end

-- What the C compiler calls "functions" is public under the room's name in
-- Lua; every other table holds the methods of a class.
local function c_name(row, stem, core)
  local room = room_of(stem, core)
  if row.list:match("methods") then
    return room .. ":" .. row.name
  end
  if core[room] and core[room][row.name] then
    return "core." .. room .. "." .. row.name
  end
  for other, members in pairs(core) do
    if type(members) == "table" and members[row.name] then
      return "core." .. other .. "." .. row.name
    end
  end
  return stem .. "." .. row.name
end

--- Pages of the C module, one per file of the door between Lua and C.
-- `core` is the loaded module, which says what is registered where.
function M.core_pages(root, core)
  local pages = {}
  for _, path in ipairs(tree.files(root .. "/csrc/bind", "%.c$")) do
    local stem = path:match("([%w_]+)%.c$")
    local functions, entries = c_functions(path), {}
    for _, row in ipairs(c_rows(path)) do
      local found = functions[row.func] or { file = path, line = 1 }
      entries[#entries + 1] = {
        name = c_name(row, stem, core), file = found.file, line = found.line, in_c = true,
        least_params = found.least_params, is_method = row.list:match("methods") ~= nil,
        doc = found.doc,
      }
    end
    if entries[1] then
      pages[#pages + 1] = { name = "libration.core: " .. stem, file = path, entries = entries }
    end
  end
  return pages
end

-- Folders whose modules are public; those of other folders serve the module
-- that the folder is named after.
local public_folders = { libration = true }

--- All pages: Lua modules first, then the C module.
function M.pages(root, core)
  local pages = {}
  for _, path in ipairs(tree.files(root .. "/lua", "%.lua$")) do
    local module = path:sub(#root + #"/lua/" + 1):gsub("%.lua$", "")
    if public_folders[module:match("^(.*)/") or ""] then
      module = module:gsub("/init$", ""):gsub("/", ".")
      pages[#pages + 1] = M.lua_page(path, module)
    end
  end
  return table.move(M.core_pages(root, core), 1, 1000, #pages + 1, pages)
end

return M
