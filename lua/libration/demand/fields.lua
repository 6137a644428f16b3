--- What a demand's fields may say: the kinds of amplitudes, tolerances, drifts.
-- Each maker returns a kind for libration.options; those of amplitudes are made
-- for the demand's unit.

local base = require("libration.core").base
local options = require "libration.options"
local units = require "libration.units"

local M = {}

local show = options.show

-- The three quantities { lo, hi, unit } of a table, as what units can read.
local function from_table(value)
  local lo, hi, unit = rawget(value, 1), rawget(value, 2), rawget(value, 3)
  local function with_unit(item)
    if unit == nil or type(item) == "string" then
      return item
    end
    return type(item) == "number" and base.number_text(item) .. " " .. tostring(unit) or item
  end
  for key in next, value do
    if key ~= 1 and key ~= 2 and key ~= 3 then
      return nil, nil, ("%s has no place here; give { lo, hi, \"unit\" }"):format(show(key))
    end
  end
  if lo == nil or hi == nil or unit ~= nil and type(unit) ~= "string" then
    return nil, nil, 'give { lo, hi, "unit" }, "0.05..2 m/s^2" or a single amplitude'
  end
  return with_unit(lo), with_unit(hi)
end

local function both_ends(value)
  if type(value) == "table" then
    return from_table(value)
  end
  local lo, hi = nil, nil
  if type(value) == "string" then
    lo, hi = units.range(value)
  end
  return lo or value, hi or value
end

-- What a value looks like in a message about a range.
local function look(value)
  if type(value) ~= "table" then
    return show(value)
  end
  local parts = {}
  for i = 1, 3 do
    local item = rawget(value, i)
    parts[i] = item ~= nil and show(item) or nil
  end
  return "{ " .. table.concat(parts, ", ") .. " }"
end

--- Kind of an amplitude range: "20 mm/s^2", "0.05..2 m/s^2", { 0.05, 2, "m/s^2" }.
-- @param unit string: of the result
-- @return function: kind giving { least, most, single = boolean }, peak
-- @usage
-- local fields, options = require "libration.demand.fields", require "libration.options"
-- local range = fields.amplitude "V"("1..20 mV", "amplitude", options.mistakes())
-- assert(range.least == 0.001 and range.most == 0.02)
function M.amplitude(unit)
  return function(value, path, mistakes)
    local lo, hi, reason = both_ends(value)
    local least, most = nil, nil
    if not reason then
      least, reason = units.amplitude(lo, unit)
    end
    if not reason then
      most, reason = units.amplitude(hi, unit)
    end
    if not reason and not (least >= 0 and most > 0 and least <= most) then
      reason = ("%s: give 0 <= lo <= hi and hi > 0"):format(look(value))
    end
    if reason then
      mistakes:add(path, reason)
      return nil
    end
    return { least = least, most = most, single = lo == hi }
  end
end

local function tolerance(value, unit)
  if type(value) == "string" then
    value = value:gsub("^%s*±%s*", "")
    local quantity, reason = units.parse(value)
    if not quantity then
      return nil, reason
    elseif not quantity.decibel and quantity.unit ~= "" and quantity.signature ~= "" then
      local amount = units.amplitude(value, unit)
      return amount and { absolute = amount },
        (select(2, units.relative(value)) or ""):gsub("; give.*", "")
    end
  end
  local amount, reason = units.relative(value)
  return amount and { relative = amount }, reason and reason:gsub("; give.*", "")
end

--- Kind of an amplitude tolerance: "1 %", "0.1 dB", "2 mm/s^2", 0.01.
-- @param unit string: of the demand
-- @return function: kind giving { relative = ratio } or { absolute = unit }
-- @usage
-- local fields, options = require "libration.demand.fields", require "libration.options"
-- local t = fields.tolerance "V"("2 mV", "tolerance", options.mistakes())
-- assert(t.absolute == 0.002)
function M.tolerance(unit)
  local give = ('; give a ratio ("1 %%"), decibels ("0.1 dB") or an amplitude ("0.02 %s")')
    :format(unit)
  return function(value, path, mistakes)
    local result, reason = tolerance(value, unit)
    local amount = result and (result.relative or result.absolute)
    if not result then
      mistakes:add(path, reason .. give)
    elseif amount <= 0 then
      mistakes:add(path, show(value) .. ": a tolerance is more than 0" .. give)
    elseif result.relative and amount >= 1 then
      mistakes:add(path, ("%s is %s %%; a relative tolerance is below 100 %%"):format(show(value),
        units.text(100 * amount, 4)) .. give)
    else
      return result
    end
  end
end

local function share(value)
  local quantity = type(value) == "string" and units.parse((value:gsub("^%s*±%s*", "")))
  if quantity and not quantity.decibel and quantity.signature == "s:-2" then
    local hz, reason = units.hz((value:gsub("^%s*±%s*", "")))
    return hz and { hz = hz:number() }, reason
  end
  if type(value) == "string" then
    value = value:gsub("^%s*±%s*", "")
  end
  local ratio, reason = units.number(value, "1")
  return ratio and { relative = ratio }, reason
end

--- Kind of a movement in frequency: "0.1 %", "50 ppm", "0.2 Hz", 0.001.
-- @param most number: largest ratio, exclusive
-- @return function: kind giving { relative = ratio } or { hz = Hz }
-- @usage
-- local fields, options = require "libration.demand.fields", require "libration.options"
-- assert(fields.movement(1)("0.2 Hz", "drift", options.mistakes()).hz == 0.2)
function M.movement(most)
  local give = '; give a ratio ("0.1 %", "50 ppm") or a frequency ("0.2 Hz")'
  return function(value, path, mistakes)
    local result, reason = share(value)
    if not result then
      mistakes:add(path, (reason:gsub("; give.*", "")) .. give)
    elseif (result.relative or result.hz) < 0 or (result.relative or 0) >= most then
      mistakes:add(path, show(value) .. ": at least 0, and below 100 %" .. give)
    else
      return result
    end
  end
end

--- Kind of a frequency tolerance: "0.1 Hz", 0.1, "50 ppm".
-- @return function: kind giving { hz = Hz } or { relative = ratio }; a bare
-- number is in Hz
-- @usage
-- local fields, options = require "libration.demand.fields", require "libration.options"
-- assert(fields.tolerance_hz()(0.1, "tolerance_hz", options.mistakes()).hz == 0.1)
function M.tolerance_hz()
  local movement = M.movement(1)
  return function(value, path, mistakes)
    if type(value) == "number" then
      value = base.number_text(value) .. " Hz"
    elseif base.is_fraction(value) then
      value = tostring(value) .. " Hz"
    end
    local result = movement(value, path, mistakes)
    if result and (result.hz or result.relative) == 0 then
      mistakes:add(path, show(value) .. ": a tolerance is more than 0")
      return nil
    end
    return result
  end
end

--- Kind of a list of orders: "1..20", { 1, "7/2" }.
-- @param most integer: orders that all lists read by it may have together,
-- default 5000
-- @return function: kind giving a list of fractions
-- @usage
-- local fields, options = require "libration.demand.fields", require "libration.options"
-- assert(#fields.orders()("1..20", "orders", options.mistakes()) == 20)
function M.orders(most)
  most = most or 5000
  local left = most
  local read = options.quantity(units.orders)
  return function(value, path, mistakes)
    local orders = left >= 0 and read(value, path, mistakes) or nil
    left = left - (orders and #orders or 0)
    if left >= 0 then
      return orders
    end
    mistakes:add(path, ("more than %d orders in all"):format(most))
  end
end

--- Kind that notes in its table where it stood (path), whether something in it
-- was wrong (broken), and which fields were given at all, right or wrong (given).
-- @param kind function: giving a table
-- @return function: kind
-- @usage
-- local fields, options = require "libration.demand.fields", require "libration.options"
-- local kind = fields.marked(options.record { n = { options.integer(1, 9) } })
-- assert(kind({ n = 10 }, "x", options.mistakes()).broken)
function M.marked(kind)
  return function(value, path, mistakes)
    local before = mistakes.count
    local result = kind(value, path, mistakes)
    if result then
      result.path, result.broken, result.given = path, mistakes.count > before, {}
      for key in next, value do
        result.given[key] = true
      end
    end
    return result
  end
end

--- Schemas for a demand in a unit.
-- @param unit string: of the amplitudes
-- @return table: fields of the demand, for libration.options
-- @usage
-- assert(require("libration.demand.fields").schema("V").lines.required)
function M.schema(unit)
  local amplitude, tolerance_kind = M.amplitude(unit), M.tolerance(unit)
  local orders = M.orders()
  local frequency = options.quantity(units.hz, { above = base.fraction(0), unit = "Hz" })
  local side = options.record {
    by = { options.text(), required = true, hint = 'name the line, by = "shaft"' },
    orders = { orders, required = true, hint = 'give orders, "1..3"' },
    amplitude = { amplitude }, tolerance = { tolerance_kind }, tolerance_hz = { M.tolerance_hz() },
  }
  local function source(extra)
    local schema = {
      name = { options.text(80), required = true, hint = "every line has a name" },
      hz = { frequency }, of = { options.text() },
      times = { options.quantity(function(value) return units.exact(value, "1") end,
        { above = base.fraction(0) }) },
      orders = { orders }, sidebands = { side }, amplitude = { amplitude },
      drift = { M.movement(1) }, wander = { M.movement(1) },
    }
    for name, row in pairs(extra) do
      schema[name] = row
    end
    return M.marked(options.record(schema))
  end
  local tolerances = { tolerance = { tolerance_kind }, tolerance_hz = { M.tolerance_hz() } }
  local function number(per)
    return options.quantity(function(value) return units.number(value, per) end, { least = 0 })
  end
  return {
    title = { options.text(), default = "demand" }, unit = { options.text(40) },
    lines = { options.list(source(tolerances), 1, 2000), required = true,
      hint = 'list the lines to be measured: lines = { { name = "shaft", hz = 24.6, ... } }' },
    interferers = { options.list(source {}, 0, 2000), default = {} },
    defaults = { M.marked(options.record {
      amplitude = { amplitude }, tolerance = { tolerance_kind },
      tolerance_hz = { M.tolerance_hz() }, drift = { M.movement(1) }, wander = { M.movement(1) },
    }), default = { given = {} } },
    offset = { options.quantity(function(value) return units.number(value, unit) end),
      default = 0.0 },
    noise = { number("(" .. unit .. ")/rtHz"), default = 0.0 },
    sensitivity = { options.quantity(function(value)
      return units.number(value, "V/(" .. unit .. ")")
    end, { above = 0 }) },
    averages = { options.integer(1, 1000000), default = 1 },
    coverage = { options.number { above = 0, most = 10 }, default = 3 },
  }
end

return M
