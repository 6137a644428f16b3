--- Finds the datasets of the root group of an HDF5 file, without trusting it.
-- HDF5 File Format Specification, version 3. Superblocks 0 to 3, object headers
-- 1 and 2, groups of symbol tables or compact links; what else a file may hold
-- is refused by name. Every read is of a bounded part, and steps are counted.

local store = require("libration.core").store

local M = {}

local SIGNATURE = "\x89HDF\r\n\x1a\n"
local MOST_STEPS, MOST_BYTES = 20000, 4 << 20

local File = {}
File.__index = File

local function refuse(text, ...)
  error({ message = text:format(...) }, 0)
end

-- n bytes at an address; a refusal where they are not there.
function File:bytes(at, n)
  self.steps = self.steps + 1
  if self.steps > MOST_STEPS then
    refuse("has more objects than are followed, or they go round in circles")
  elseif at < 0 or n < 0 or n > MOST_BYTES or at > self.size or n > self.size - at then
    refuse("points outside the file (%d bytes at byte %d of %d)", n, at, self.size)
  elseif n == 0 then
    return ""
  end
  local text, message, code = store.head(self.path, n, at)
  if not text or #text < n then
    error({ message = message or "became shorter while it was read", code = code, whole = true }, 0)
  end
  return text
end

local function unpack(format, bytes, at)
  if string.packsize(format) > #bytes - (at or 1) + 1 then
    refuse("has a structure that is too short")
  end
  return string.unpack(format, bytes, at)
end

local function check_sizes(offsets, lengths)
  if offsets ~= 8 or lengths ~= 8 then
    refuse("has addresses of %d and lengths of %d bytes; read are 8", offsets, lengths)
  end
end

-- III.A: where the root group's header is.
function File:root()
  local head = self:bytes(0, math.min(self.size, 128))
  local version = head:byte(9)
  if version == 0 or version == 1 then
    local offsets, lengths = unpack("<BB", head, 14)
    check_sizes(offsets, lengths)
    local at = version == 0 and 57 or 61
    return (select(2, unpack("<i8i8", head, at)))
  elseif version == 2 or version == 3 then
    check_sizes(unpack("<BB", head, 10))
    return (unpack("<i8", head, 37))
  end
  refuse("has a superblock of version %s; read are 0 to 3", tostring(version))
end

-- Messages of version 1 in a block: type, size, flags, 3 spare, body.
local function take_old(block, list, continued)
  local at = 1
  while at + 7 <= #block do
    local kind, size, flags = unpack("<I2I2B", block, at)
    local body = block:sub(at + 8, at + 7 + size)
    if kind == 0x10 then
      continued[#continued + 1] = body
    else
      list[#list + 1] = { kind = kind, body = body, flags = flags }
    end
    at = at + 8 + size
  end
end

-- Messages of version 2: type, size, flags, perhaps an order, body.
local function take_new(block, order, list, continued)
  local at, extra = 1, order and 6 or 4
  while at + extra - 1 <= #block do
    local kind, size, flags = unpack("<BI2B", block, at)
    local body = block:sub(at + extra, at + extra + size - 1)
    if kind == 0x10 then
      continued[#continued + 1] = body
    else
      list[#list + 1] = { kind = kind, body = body, flags = flags }
    end
    at = at + extra + size
  end
end

function File:old_messages(at)
  local list, continued = {}, {}
  local _, _, _, _, size = unpack("<BBI2I4I4", self:bytes(at, 16))
  take_old(self:bytes(at + 16, size), list, continued)
  for _, body in ipairs(continued) do -- grows while it is walked
    local address, length = unpack("<i8i8", body)
    take_old(self:bytes(address, length), list, continued)
  end
  return list
end

function File:new_messages(at)
  local list, continued = {}, {}
  local flags = self:bytes(at, 6):byte(6)
  local skip = 6 + (flags & 0x20 ~= 0 and 16 or 0) + (flags & 0x10 ~= 0 and 4 or 0)
  local width = 1 << (flags & 3)
  local size = string.unpack("<I" .. width, self:bytes(at + skip, width))
  take_new(self:bytes(at + skip + width, size), flags & 4 ~= 0, list, continued)
  for _, body in ipairs(continued) do
    local address, length = unpack("<i8i8", body)
    local block = self:bytes(address, length)
    if block:sub(1, 4) ~= "OCHK" or length < 8 then
      refuse("has an object header that goes on where there is none")
    end
    take_new(block:sub(5, -5), flags & 4 ~= 0, list, continued)
  end
  return list
end

--- Messages of the object header at an address.
function File:messages(at)
  local first = self:bytes(at, 4)
  if first == "OHDR" then
    return self:new_messages(at)
  elseif first:byte(1) == 1 then
    return self:old_messages(at)
  end
  refuse("has no object header at byte %d", at)
end

-- III.D: names are in the heap's data segment.
function File:heap(at)
  local head = self:bytes(at, 32)
  if head:sub(1, 4) ~= "HEAP" then
    refuse("has no local heap at byte %d", at)
  end
  local size, _, data = unpack("<i8i8i8", head, 9)
  return self:bytes(data, size)
end

function File:symbols(at, heap, links)
  local head = self:bytes(at, 8)
  if head:sub(1, 4) ~= "SNOD" then
    refuse("has no symbol table node at byte %d", at)
  end
  local count = unpack("<I2", head, 7)
  local block = self:bytes(at + 8, 40 * count)
  for i = 0, count - 1 do
    local name, address = unpack("<i8i8", block, 40 * i + 1)
    if name < 0 or name >= #heap then
      refuse("has a name outside its heap")
    end
    links[#links + 1] = { name = heap:match("^[^\0]*", name + 1), at = address }
  end
end

-- III.A.1: children of a leaf are symbol nodes, of others trees.
function File:tree(at, heap, links)
  local head = self:bytes(at, 24)
  local kind, level, count = unpack("<BBI2", head, 5)
  if head:sub(1, 4) ~= "TREE" or kind ~= 0 then
    refuse("has no tree of a group at byte %d", at)
  end
  local block = self:bytes(at + 24, 16 * count)
  for i = 0, count - 1 do
    local child = unpack("<i8", block, 16 * i + 9)
    if level == 0 then
      self:symbols(child, heap, links)
    else
      self:tree(child, heap, links)
    end
  end
end

-- IV.A.2.g: a hard link to an object.
local function link_of(body)
  local version, flags = unpack("<BB", body)
  local at = 3
  local kind = 0
  if flags & 8 ~= 0 then kind, at = body:byte(at), at + 1 end
  if flags & 4 ~= 0 then at = at + 8 end
  if flags & 16 ~= 0 then at = at + 1 end
  local width = 1 << (flags & 3)
  local length = unpack("<I" .. width, body, at)
  at = at + width
  if version ~= 1 or kind ~= 0 or length < 0 or at + length + 7 > #body then
    return nil
  end
  return { name = body:sub(at, at + length - 1), at = unpack("<i8", body, at + length) }
end

--- Links of the group at an address: { name, at }.
function File:links(at)
  local links = {}
  for _, message in ipairs(self:messages(at)) do
    if message.kind == 0x11 then
      local tree, heap = unpack("<i8i8", message.body)
      self:tree(tree, self:heap(heap), links)
    elseif message.kind == 0x06 then
      links[#links + 1] = link_of(message.body)
    end
  end
  return links
end

-- IV.A.2.d; nil for what is no plain number or text.
local function type_of(body)
  local mark, bits, high, _, size = unpack("<BBBBI4", body)
  local class = mark & 15
  if size == 0 then
    return nil
  elseif class == 0 then
    local from, precision = unpack("<I2I2", body, 9)
    return from == 0 and precision == 8 * size and { size = size, coding = {
      bits = precision, integer = true, unsigned = bits & 8 == 0, big = bits & 1 == 1 } } or nil
  elseif class == 1 and (size == 4 or size == 8) and high == 8 * size - 1 then
    return { size = size, coding = { bits = 8 * size, integer = false, big = bits & 1 == 1 } }
  elseif class == 3 then
    return { size = size, text = true }
  end
  return nil
end

local function space_of(body)
  local version, rank = unpack("<BB", body)
  local at, shape = version == 1 and 9 or 5, {}
  if version ~= 1 and version ~= 2 or rank > 32 then
    refuse("has a dataspace that cannot be read")
  end
  for i = 1, rank do
    shape[i] = unpack("<i8", body, at + 8 * (i - 1))
    if shape[i] < 0 then
      refuse("has a dataspace of %d", shape[i])
    end
  end
  return shape
end

local function values_of(type_, count, data)
  local out, coding = {}, type_.coding
  if count > 65536 or count * type_.size > #data then
    return nil
  end
  for i = 1, count do
    local item = data:sub((i - 1) * type_.size + 1, i * type_.size)
    if type_.text then
      out[i] = item:match "^[^\0]*"
    else
      local order = coding.big and ">" or "<"
      out[i] = string.unpack(order .. (coding.integer and (coding.unsigned and "I" or "i")
        .. type_.size or type_.size == 8 and "d" or "f"), item)
    end
  end
  return out
end

-- IV.A.2.m: an attribute as name and value, a list or a single one.
local function attribute_of(body)
  local version, _, name_size, type_size, space_size = unpack("<BBI2I2I2", body)
  local at = version == 3 and 10 or 9
  local step = function(size) return version == 1 and size + -size % 8 or size end
  if version < 1 or version > 3 then
    return nil
  end
  local name = body:sub(at, at + name_size - 1):match "^[^\0]*"
  at = at + step(name_size)
  local type_ = type_of(body:sub(at, at + type_size - 1))
  at = at + step(type_size)
  local shape = space_of(body:sub(at, at + space_size - 1))
  if not type_ or #shape > 1 or not type_.text and type_.size > 8 then
    return nil
  end
  local values = values_of(type_, shape[1] or 1, body:sub(at + step(space_size)))
  return values and name, #shape == 0 and values and values[1] or values
end

-- IV.A.2.i; where the data lie, or why they cannot be read.
local function layout_of(body)
  local version, class = unpack("<BB", body)
  if version == 3 or version == 4 then
    if class == 1 then
      return (unpack("<i8", body, 3))
    end
    return nil, class == 2 and "in chunks" or "in a layout that is not contiguous"
  end
  return nil, "in a layout of version " .. version
end

-- The data end inside the file.
function File:check_place(set)
  local count, most = 1, self.size // (set.coding.bits // 8)
  for _, n in ipairs(set.shape) do
    count = n == 0 and 0 or count <= most // n and count * n or most + 1
  end
  if set.at == -1 and count == 0 then
    set.at = 0 -- nothing was ever stored
  elseif set.at < 0 or set.at > self.size or count > (self.size - set.at) // (set.coding.bits // 8)
  then
    refuse("does not hold the data of %s, which should be at byte %d", set.name, set.at)
  end
end

-- A dataset of numbers, or nil for any other object.
function File:dataset(link)
  local out = { name = link.name, attributes = {} }
  for _, message in ipairs(self:messages(link.at)) do
    local body = message.body
    if message.kind == 0x01 then
      out.shape = space_of(body)
    elseif message.kind == 0x03 and message.flags & 2 == 0 then
      local type_ = type_of(body)
      out.coding = type_ and type_.coding
    elseif message.kind == 0x08 then
      out.at, out.layout = layout_of(body)
    elseif message.kind == 0x0B then
      out.layout = "filtered (compressed)"
    elseif message.kind == 0x0C and message.flags & 2 == 0 then
      local name, value = attribute_of(body)
      if name then out.attributes[name] = value end
    end
  end
  if not (out.shape and out.coding and (out.at or out.layout)) then
    return nil
  elseif out.at then
    self:check_place(out)
  end
  return out
end

local function walk(file)
  local sets = {}
  for _, link in ipairs(file:links(file:root())) do
    sets[#sets + 1] = file:dataset(link)
  end
  return sets
end

--- The numeric datasets of the root group.
-- @return table: list of { name, shape, coding, at (byte offset; or nil and layout, why not),
--   attributes }; or nil, message, code
function M.datasets(path)
  local first, size, code = store.head(path, 8)
  if not first then
    return nil, size, code
  elseif first ~= SIGNATURE then
    return nil, path .. ": is no HDF5 file", "format"
  end
  local file = setmetatable({ path = path, size = size, steps = 0 }, File)
  local fine, sets = pcall(walk, file)
  if fine then
    return sets
  elseif type(sets) ~= "table" then
    error(sets, 0)
  end
  return nil, sets.whole and sets.message or path .. ": " .. sets.message, sets.code or "format"
end

return M
