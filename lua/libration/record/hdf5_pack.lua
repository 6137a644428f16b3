--- Bytes of an HDF5 file with one dataset in its root group, and attributes.
-- HDF5 File Format Specification, version 3: superblock 0, object headers 1, a
-- group of the old kind, contiguous data. Every reader of HDF5 takes these.

local M = {}

local UNDEFINED = -1 -- an address that is none: all bits set

local function padded(bytes)
  return bytes .. ("\0"):rep(-#bytes % 8)
end

-- IV.A.2.d: class 0 is fixed point, 1 floating point, 3 string.
local function type_of(coding)
  local size = coding.bits // 8
  if coding.integer then
    return string.pack("<BBBBI4I2I2", 0x10, coding.unsigned and 0 or 8, 0, 0, size, 0, coding.bits)
  elseif coding.bits == 64 then
    return string.pack("<BBBBI4I2I2BBBBI4", 0x11, 0x20, 63, 0, 8, 0, 64, 52, 11, 0, 52, 1023)
  end
  return string.pack("<BBBBI4I2I2BBBBI4", 0x11, 0x20, 31, 0, 4, 0, 32, 23, 8, 0, 23, 127)
end

local function text_type(size)
  return string.pack("<BBBBI4", 0x13, 0x11, 0, 0, size) -- padded with NUL, UTF-8
end

-- IV.A.2.b
local function space(...)
  local bytes = string.pack("<BBBBI4", 1, select("#", ...), 0, 0, 0)
  for _, n in ipairs { ... } do bytes = bytes .. string.pack("<i8", n) end
  return bytes
end

local function message(kind, body)
  body = padded(body)
  return string.pack("<I2I2BBBB", kind, #body, 0, 0, 0, 0) .. body
end

-- IV.A.2.m, version 3
local function attribute(name, type_bytes, space_bytes, data)
  name = name .. "\0"
  return message(0x0C, string.pack("<BBI2I2I2B", 3, 0, #name, #type_bytes, #space_bytes, 1) .. name
    .. type_bytes .. space_bytes .. data)
end

local function header(messages)
  local body = table.concat(messages)
  return string.pack("<BBI2I4I4I4", 1, 0, #messages, 1, #body, 0) .. body
end

--- An attribute from a text, a list of texts, of numbers (floats) or of integers.
function M.attribute(name, value)
  local list = type(value) == "table" and value or { value }
  local shape = type(value) == "table" and space(#list) or space()
  if type(list[1]) == "string" then
    local size = 1
    for _, text in ipairs(list) do size = math.max(size, #text) end
    local parts = {}
    for i, text in ipairs(list) do parts[i] = text .. ("\0"):rep(size - #text) end
    return attribute(name, text_type(size), shape, table.concat(parts))
  end
  local whole = math.type(list[1]) == "integer"
  local parts = {}
  for i, number in ipairs(list) do parts[i] = string.pack(whole and "<i8" or "<d", number) end
  return attribute(name, type_of { bits = 64, integer = whole }, shape, table.concat(parts))
end

-- III.C, III.D: the local heap with the one name, its symbol node and tree.
local function group(name, tree_at, dataset_at)
  local names = ("\0"):rep(8) .. padded(name .. "\0")
  local tree = "TREE" .. string.pack("<BBI2i8i8i8i8i8", 0, 0, 1, UNDEFINED, UNDEFINED, 0,
    tree_at + 544, 8)
  tree = tree .. ("\0"):rep(544 - #tree)
  local node = "SNOD" .. string.pack("<BBI2i8i8I4I4i8i8", 1, 0, 1, 8, dataset_at, 0, 0, 0, 0)
  node = node .. ("\0"):rep(328 - #node)
  local heap_at = tree_at + 544 + 328
  local heap = "HEAP" .. string.pack("<BBBBi8i8i8", 0, 0, 0, 0, #names, 1, heap_at + 32) .. names
  return tree .. node .. heap, heap_at
end

--- Everything in front of the data.
-- @param name string: of the dataset
-- @param coding table: bits, integer, unsigned
-- @param rows integer
-- @param columns integer
-- @param attributes table: list of packed attributes
-- @return string: the bytes; the data follow at once
function M.front(name, coding, rows, columns, attributes)
  local bytes = rows * columns * coding.bits // 8
  local root_at, tree_at = 96, 96 + 16 + 24
  local group_bytes, heap_at = group(name, tree_at, 0)
  local dataset_at = tree_at + #group_bytes
  local function dataset(data_at)
    local messages = { message(0x01, space(rows, columns)), message(0x03, type_of(coding)),
                       message(0x05, string.pack("<BBBB", 2, 2, 2, 0)),
                       message(0x08, string.pack("<BBi8i8", 3, 1, data_at, bytes)) }
    table.move(attributes, 1, #attributes, 5, messages)
    return header(messages)
  end
  local data_at = dataset_at + #dataset(0)
  local super = "\x89HDF\r\n\x1a\n" .. string.pack("<BBBBBBBBI2I2I4i8i8i8i8", 0, 0, 0, 0, 0, 8, 8,
    0, 4, 16, 0, 0, UNDEFINED, data_at + bytes, UNDEFINED)
    .. string.pack("<i8i8I4I4i8i8", 0, root_at, 1, 0, tree_at, heap_at)
  return super .. header { message(0x11, string.pack("<i8i8", tree_at, heap_at)) }
    .. group(name, tree_at, dataset_at) .. dataset(data_at)
end

return M
