--- What must be measured: spectral lines, their ranges and their tolerances.
-- A demand is plain data: a table in the words of the test engineer, checked in
-- one go, and turned into one normal form that planning works on.

local base = require("libration.core").base
local expand = require "libration.demand.expand"
local fields = require "libration.demand.fields"
local fraction_text = require("libration.fraction").text
local options = require "libration.options"
local table_text = require "libration.table_text"
local units = require "libration.units"

local M = {}

local Demand = { __name = "libration.demand" }

local text = units.text

local function range_text(line)
  if line.least == line.most then
    return text(line.most, 5)
  end
  return text(line.least, 5) .. ".." .. text(line.most, 5)
end

local function tolerance_text(line, unit)
  if line.tolerance then
    return text(100 * line.tolerance, 4) .. " %"
  end
  return line.tolerance_abs and text(line.tolerance_abs, 4) .. " " .. unit or "-"
end

local function moves(demand, line)
  return line.lock_hz * demand.drivers[line.driver].spread + line.free_hz
end

-- Rows for lines or interferers; tolerances only where there are any.
local function rows(demand, list, heading)
  local result = { { heading, "Hz", "moves +-Hz", "driver", "peak " .. demand.unit, "wander %" } }
  local tolerant = heading == "line"
  if tolerant then
    table.move({ "tolerance", "tol. Hz" }, 1, 2, 7, result[1])
  end
  for _, line in ipairs(list) do
    local row = { line.name, fraction_text(line.hz), text(moves(demand, line), 4),
      demand.drivers[line.driver].name, range_text(line), text(100 * line.wander, 4) }
    if tolerant then
      row[7] = tolerance_text(line, demand.unit)
      row[8] = line.tolerance_hz and text(line.tolerance_hz, 4) or "-"
    end
    result[#result + 1] = row
  end
  return table_text.layout(result, "  ")
end

function Demand:__tostring()
  local lines = { self.title, rows(self, self.lines, "line") }
  if #self.interferers > 0 then
    lines[#lines + 1] = rows(self, self.interferers, "interferer")
  end
  lines[#lines + 1] = ("  noise %s %s/rtHz, offset %s %s, averages %d, coverage k = %s%s"):format(
    text(self.noise), self.unit, text(self.offset), self.unit, self.averages, text(self.coverage),
    self.sensitivity and (", sensitivity %s V per %s"):format(text(self.sensitivity), self.unit)
      or "")
  return table.concat(lines, "\n")
end

-- The unit of the first amplitude that has one, in base units.
local function unit_of_amplitude(value)
  if type(value) == "table" then
    local third = rawget(value, 3)
    value = type(third) == "string" and "1 " .. third or rawget(value, 1)
  end
  if type(value) ~= "string" then
    return nil
  end
  local quantity = units.parse((select(2, units.range(value))) or value)
  return quantity and quantity.unit ~= "" and units.base(quantity.unit) or nil
end

local function first_unit(input)
  local lists = { rawget(input, "lines"), { rawget(input, "defaults") },
    rawget(input, "interferers") }
  for i = 1, 3 do
    local list = lists[i]
    for j = 1, type(list) == "table" and math.min(rawlen(list), 2000) or 0 do
      local entry = rawget(list, j)
      local unit = type(entry) == "table" and unit_of_amplitude(rawget(entry, "amplitude"))
      if unit then
        return unit
      end
    end
  end
end

-- The demand's unit, and a stand-in when there is none so that the other
-- mistakes are found as well.
local function unit_for(input, path, mistakes)
  local unit = rawget(input, "unit")
  if unit == nil then
    unit = first_unit(input)
    if not unit then
      mistakes:add(options.join(path, "unit"),
        'missing, and no amplitude has one; give the unit of the amplitudes, such as "m/s^2"')
    end
    return unit or "1"
  end
  local ok, reason = nil, nil
  if type(unit) == "string" and #unit <= 40 then
    ok, reason = units.base(unit)
  end
  if not ok then
    mistakes:add(options.join(path, "unit"), reason or options.show(unit)
      .. ' is not a unit; give one such as "m/s^2", "V", "Pa"')
  end
  return ok and unit or first_unit(input) or "1"
end

--- What a user wrote, as a plain table of its own: fractions become text.
-- @param value any: plain data, as checked
-- @param depth integer: levels above it, default 0
-- @return any: a copy without metatables
-- @usage
-- local copy = require("libration.demand").plain_copy { x = core.base.fraction(1, 2) }
-- assert(copy.x == "1/2")
function M.plain_copy(value, depth)
  depth = depth or 0
  if base.is_fraction(value) then
    return tostring(value)
  elseif type(value) ~= "table" or depth > 16 then
    return value
  end
  local copy = {}
  for key, item in next, value do
    copy[key] = M.plain_copy(item, depth + 1)
  end
  return copy
end

-- Every line needs an amplitude, and those to be measured a tolerance.
local function check_given(entry, defaults, mistakes)
  local function given(name)
    return entry.given[name] or entry.wanted and defaults.given[name]
  end
  if not given "amplitude" then
    mistakes:add(entry.path, 'no amplitude; give amplitude = "0.05..2 m/s^2"'
      .. (entry.wanted and " here or in defaults" or ""))
  end
  if entry.wanted and not given "tolerance" and not given "tolerance_hz" then
    mistakes:add(entry.path,
      'no tolerance; give tolerance = "1 %" or tolerance_hz = "0.1 Hz" here or in defaults')
  end
end

-- Puts the entry's kind and the demand's defaults where expansion and the
-- normal form look for them.
local function prepare(list, wanted, defaults, mistakes)
  for _, entry in ipairs(list) do
    entry.wanted = wanted
    check_given(entry, defaults, mistakes)
    if wanted then
      entry.default_drift, entry.default_wander = defaults.drift, defaults.wander
    end
  end
  return list
end

local function first_of(name, ...)
  for i = 1, select("#", ...) do
    local from = select(i, ...)
    if from and from[name] then
      return from[name]
    end
  end
end

-- One expanded line in the normal form.
local function normal(item, defaults)
  local entry, node = item.entry, item.node
  local side = item.side and entry.sidebands or nil
  local fallback = entry.wanted and defaults or nil
  local amplitude = first_of("amplitude", side, entry, fallback)
  local tolerance = entry.wanted and first_of("tolerance", side, entry, fallback) or {}
  local tolerance_hz = entry.wanted and first_of("tolerance_hz", side, entry, fallback)
  return {
    name = item.name, hz = node.hz, driver = node.driver, lock_hz = node.lock:number(),
    free_hz = node.free + 0.0, wander = node.wander + 0.0,
    least = amplitude and (not entry.wanted and amplitude.single and 0.0 or amplitude.least),
    most = amplitude and amplitude.most,
    tolerance = tolerance.relative, tolerance_abs = tolerance.absolute,
    tolerance_hz = tolerance_hz and (tolerance_hz.hz or tolerance_hz.relative * node.hz:number()),
  }
end

local function check_line(line, entry, mistakes)
  if entry.wanted and line.least == 0 and not entry.told then
    entry.told = true -- once for an entry, not once for every order
    mistakes:add(entry.path, "the least amplitude of a line to be measured is more than 0")
  end
end

local function number_drivers(demand, drivers)
  demand.drivers = drivers
  return setmetatable(demand, Demand)
end

-- Lists that had mistakes are missing, or hold entries marked as broken.
local function build(read, mistakes)
  local defaults = read.defaults or { given = {} }
  local entries = prepare(read.lines or {}, true, defaults, mistakes)
  entries = table.move(entries, 1, #entries, 1, {})
  for _, entry in ipairs(prepare(read.interferers or {}, false, defaults, mistakes)) do
    entries[#entries + 1] = entry
  end
  local items, drivers = expand.expand(entries, mistakes)
  local demand = { lines = {}, interferers = {} }
  for _, item in ipairs(items) do
    local line = normal(item, defaults)
    check_line(line, item.entry, mistakes)
    local list = item.entry.wanted and demand.lines or demand.interferers
    list[#list + 1] = line
  end
  return number_drivers(demand, drivers)
end

--- Reads a demand and collects the mistakes.
-- @param input any: the table of the user, or a demand
-- @param mistakes table: from libration.options
-- @return table: the demand; worthless when mistakes were found
-- @usage
-- local mistakes = require("libration.options").mistakes()
-- require("libration.demand").read({ lines = {} }, mistakes)
-- assert(mistakes.count > 0)
function M.read(input, mistakes)
  if type(input) ~= "table" or getmetatable(input) == Demand then
    if type(input) ~= "table" then
      mistakes:add("", options.show(input) .. " is not a table { lines = { ... }, ... }")
    end
    return input
  end
  local unit = unit_for(input, "", mistakes)
  local read = options.read(fields.schema(unit), input, "", mistakes)
  local demand = build(read, mistakes)
  for _, name in ipairs { "title", "offset", "noise", "averages", "coverage", "sensitivity" } do
    demand[name] = read[name]
  end
  demand.unit = unit
  if mistakes.count == 0 then -- only then is there no circle in it
    demand.source = M.plain_copy(input)
  end
  return demand
end

--- States what must be measured.
-- Fields: lines (list, required), interferers (list), unit (of all amplitudes;
-- else that of the first amplitude, in base units), noise (one-sided density,
-- "60 um/s^2/rtHz"), offset, sensitivity ("100 mV/g"), averages (1), coverage
-- (k, 3), title, defaults (amplitude, tolerance, tolerance_hz, drift, wander of
-- lines that do not say otherwise; drift and wander only of lines that are not
-- locked).
-- A line: name; hz, or of = "name" with times = "7/2" or orders = "1..20"; drift
-- ("0.1 %" or "0.2 Hz"; of a locked line: its own, beside what it is locked to);
-- wander (end to end in one record; a locked line has that of what it is locked
-- to); amplitude (peak, or with "rms": "0.05..2 m/s^2", { 0.05, 2, "m/s^2" });
-- tolerance ("1 %", "0.1 dB", "2 mm/s^2"); tolerance_hz ("0.1 Hz", "50 ppm");
-- orders ("1..20" makes "name 1" ... "name 20"); sidebands = { by = "shaft",
-- orders = "1..3" } (makes "name -1", "name +1", ...; may have an amplitude and
-- tolerances of its own). An interferer is a line without tolerances; a single
-- amplitude is its largest. Decibels of a tolerance mean 1 - 10^(-x/20), so that
-- the result is within x dB on both sides.
-- @param input table: as above; a demand is returned as it is
-- @return table: title, unit, offset, noise, averages, coverage, sensitivity,
-- drivers, lines, interferers, source; print() shows it. Mistakes raise one
-- error that lists them all with their paths
-- @usage
-- local demand = lb.demand { lines = {
--   { name = "shaft", hz = 24.6, drift = "0.1 %", amplitude = "0.05..2 m/s^2",
--     tolerance = "1 %" },
--   { name = "vane", of = "shaft", times = 7, amplitude = "1 m/s^2", tolerance = "0.1 dB" },
-- } }
-- assert(#demand.lines == 2 and tostring(demand.lines[2].hz) == "861/5")
function M.demand(input)
  local mistakes = options.mistakes()
  local demand = M.read(input, mistakes)
  if mistakes.count > 0 then
    error(mistakes:message "demand", 2)
  end
  return demand
end

--- Whether a value is a demand made by this library.
-- @param value any: what to look at
-- @return boolean: true for what lb.demand and lb.load return
-- @usage
-- assert(not require("libration.demand").is {})
function M.is(value)
  return type(value) == "table" and getmetatable(value) == Demand
end

return M
