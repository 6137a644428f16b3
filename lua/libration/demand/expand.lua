--- From what a demand says to its spectral lines: orders, locks and sidebands.
-- An entry becomes one line, or one per order, and each of these may have
-- sidebands. A node is where such a line stands: hz (fraction), driver (index),
-- lock (fraction: Hz per unit deviation of the driver), free (Hz of its own
-- movement), wander (relative).

local base = require("libration.core").base
local fraction_text = require("libration.fraction").text
local options = require "libration.options"

local M = {}

local MOST_LINES = 5000

-- The expansion under way: entries, names, drivers, mistakes.
local Expansion = {}
Expansion.__index = Expansion

-- Reports why exact arithmetic failed (once for all orders of an entry), and
-- stops this line.
function Expansion:exact(path, value, message)
  if not value and not self.failed[path] then
    self.failed[path] = true
    self.mistakes:add(path, message)
  end
  return value
end

-- node times a positive order.
function Expansion:scaled(node, order, path)
  local hz = node and self:exact(path, base.try_multiply(node.hz, order))
  local lock = hz and self:exact(path, base.try_multiply(node.lock, order))
  return lock and { hz = hz, lock = lock, driver = node.driver,
    free = node.free * order:number(), wander = node.wander }
end

local function ratio(movement, hz)
  return movement and (movement.relative or movement.hz / hz:number())
end

-- A line that stands by itself has a driver of its own.
function Expansion:absolute(entry)
  local drift = entry.drift or entry.default_drift
  local spread = ratio(drift, entry.hz) or 0
  self.drivers[#self.drivers + 1] = { name = entry.name, spread = spread }
  return { hz = entry.hz, lock = entry.hz, driver = #self.drivers, free = 0,
    wander = ratio(entry.wander or entry.default_wander, entry.hz) or 0 }
end

-- What a locked line adds to the movement of the line it hangs on.
local function with_own_movement(node, entry)
  if node and entry.of then
    node.free = node.free + (ratio(entry.drift, node.hz) or 0) * node.hz:number()
    node.wander = ratio(entry.wander, node.hz) or node.wander
  end
  return node
end

function Expansion:cycle(entry)
  local chain, from = {}, 1
  for i, name in ipairs(self.chain) do
    chain[i] = name
    from = name == entry.name and i or from
  end
  chain[#chain + 1] = entry.name
  self.mistakes:add(entry.path .. (entry.of and ".of" or ".sidebands.by"),
    "lines hang on each other in a circle: " .. table.concat(chain, " -> ", from))
end

-- Where the named line stands, or nil when that cannot be said.
function Expansion:find(name, path)
  local product = self.names[name]
  if product then
    return product:place()
  end
  if self.mistakes:enough() then
    self.mistakes:add(path, "no such line")
    return nil
  end
  local names = {}
  for known, item in pairs(self.names) do
    if item.entry.broken and name:sub(1, #known) == known then
      return nil -- may be one of its orders, which are not known
    end
    names[#names + 1] = known
  end
  table.sort(names)
  local near = options.nearest(name, names)
  self.mistakes:add(path, ("%s is no line or interferer%s; names: %s"):format(options.show(name),
    near and (' (did you mean "%s"?)'):format(near) or "",
    table.concat(names, ", ", 1, math.min(#names, 20)) .. (#names > 20 and ", ..." or "")))
end

-- Runs make once; a product asked for while it is being made is a circle.
local function product(expansion, entry, name, make)
  return { name = name, entry = entry, place = function(self)
    if self.state == "open" then
      expansion:cycle(entry)
      return nil
    elseif self.state ~= "done" then
      self.state = "open"
      expansion.chain[#expansion.chain + 1] = entry.name
      self.node = make()
      expansion.chain[#expansion.chain] = nil
      self.state = "done"
    end
    return self.node
  end }
end

-- Where an entry stands before orders and movement of its own.
function Expansion:basis(entry)
  if entry.hz then
    return self:absolute(entry)
  end
  local node = self:find(entry.of, entry.path .. ".of")
  return self:scaled(node, entry.times or base.fraction(1), entry.path)
end

-- carrier + order * modulator; order is negative for the lower sideband.
function Expansion:sideband(carrier, modulator, order, path)
  local shift = self:exact(path, base.try_multiply(modulator.hz, order))
  local hz = shift and self:exact(path, base.try_add(carrier.hz, shift))
  if not hz then
    return nil
  elseif hz <= 0 then
    self.mistakes:add(path, ("order %s puts a sideband at %s Hz; lines are above 0 Hz")
      :format(fraction_text(order), fraction_text(hz)))
    return nil
  end
  local times, node = math.abs(order:number()), { hz = hz, driver = carrier.driver }
  node.free = carrier.free + times * modulator.free
  if carrier.driver == modulator.driver then
    local lock = self:exact(path, base.try_multiply(modulator.lock, order))
    node.lock = lock and self:exact(path, base.try_add(carrier.lock, lock))
  else
    node.lock = carrier.lock
    node.free = node.free
      + times * modulator.lock:number() * self.drivers[modulator.driver].spread
  end
  if carrier.driver == modulator.driver and carrier.wander == modulator.wander then
    node.wander = carrier.wander
  else
    node.wander = (carrier.hz:number() * carrier.wander
      + times * modulator.hz:number() * modulator.wander) / hz:number()
  end
  return node.lock and node
end

function Expansion:sideband_product(carrier, entry, order)
  local sign = order > 0 and " +" or " -"
  return product(self, entry, carrier.name .. sign .. fraction_text(order:abs()), function()
    local path = entry.path .. ".sidebands"
    local node = carrier:place()
    local modulator = node and self:find(entry.sidebands.by, path .. ".by")
    return modulator and self:sideband(node, modulator, order, path)
  end)
end

-- All lines of an entry, in the order in which they are listed.
function Expansion:products(entry)
  local list = {}
  local whole = product(self, entry, entry.name, function()
    local node = self:basis(entry)
    return entry.orders and node or with_own_movement(node, entry)
  end)
  if not entry.orders then
    list[1] = whole
  else
    self:register(whole) -- no line, but others may be locked to it
  end
  for _, order in ipairs(entry.orders or {}) do
    list[#list + 1] = product(self, entry, entry.name .. " " .. fraction_text(order), function()
      local node = self:scaled(whole:place(), order, entry.path .. ".orders")
      return with_own_movement(node, entry)
    end)
  end
  for i = 1, entry.sidebands and #list or 0 do
    for _, order in ipairs(entry.sidebands.orders) do
      for _, signed in ipairs { -order, order } do
        local side = self:sideband_product(list[i], entry, signed)
        side.side = true
        list[#list + 1] = side
      end
    end
  end
  return list
end

function Expansion:register(item)
  if item.name == "" then
    return -- reported already
  elseif self.names[item.name] then
    self.mistakes:add(item.entry.path .. ".name",
      ("the name %s is taken; names are unique among lines and interferers"):format(
        options.show(item.name)))
    return
  end
  self.names[item.name] = item
end

-- A line must state where it stands in exactly one way.
local function check_place(entry, mistakes)
  local given = entry.given
  local function need(condition, reason)
    if not condition then
      mistakes:add(entry.path, reason)
    end
    return condition
  end
  return need((given.hz ~= nil) ~= (given.of ~= nil),
    'give either hz = 24.6 or of = "name" with times or orders')
    and need(not given.times or given.of, 'times goes with of: of = "shaft", times = 7')
    and need(not (given.times and given.orders), "give times or orders, not both")
    and need(given.hz or given.times or given.orders,
      'of needs times or orders: of = "shaft", times = 7')
end

-- Nothing may reach 0 Hz, drift and wander included.
function Expansion:check_interval(item, node)
  local hz = node.hz:number()
  local lowest = hz * (1 - node.wander / 2) - node.free
    - math.abs(node.lock:number()) * self.drivers[node.driver].spread
  if lowest <= 0 then
    self.mistakes:add(item.entry.path, ('"%s" at %s Hz reaches 0 Hz with its drift and wander')
      :format(item.name, fraction_text(node.hz)))
  end
end

-- How many lines an entry becomes, known before any is made.
local function lines_of(entry)
  local sides = entry.sidebands and entry.sidebands.orders or {}
  return (entry.orders and #entry.orders or 1) * (1 + 2 * #sides)
end

--- Expands entries into lines and says where each stands.
-- @param entries table: lines and interferers as read, each with path (text) and
-- given (set of the names of its fields)
-- @param mistakes table: from libration.options
-- @return table: list of { name, entry, side = boolean, node }, in order
-- @return table: drivers, list of { name, spread }
-- @usage
-- local entry = { name = "a", path = "lines[1]", hz = core.base.fraction(10),
--   given = { name = true, hz = true } }
-- local expand = require("libration.demand.expand").expand
-- local lines, drivers = expand({ entry }, require("libration.options").mistakes())
-- assert(lines[1].node.driver == 1 and drivers[1].spread == 0)
function M.expand(entries, mistakes)
  local expansion = setmetatable({ names = {}, drivers = {}, chain = {}, failed = {},
    mistakes = mistakes }, Expansion)
  local all, count = {}, 0
  for _, entry in ipairs(entries) do
    count = count + lines_of(entry)
    if count > MOST_LINES then
      mistakes:add(entry.path, ("more than %d lines after expansion"):format(MOST_LINES))
      return {}, {}
    elseif not check_place(entry, mistakes) or entry.broken then
      entry.broken = true
      expansion:register(product(expansion, entry, entry.name or "", function() end))
    else
      for _, item in ipairs(expansion:products(entry)) do
        expansion:register(item)
        all[#all + 1] = item
      end
    end
  end
  local placed = {}
  for _, item in ipairs(all) do
    local node = item:place()
    if node then
      expansion:check_interval(item, node)
      placed[#placed + 1] = item
    end
  end
  return placed, expansion.drivers
end

return M
