--- Plans as data files, and their identity.
-- The file holds what was decided, the demand and the digitizer; the bounds are
-- computed again when it is loaded, so that a file cannot claim what does not hold.

local base = require("libration.core").base
local demand_module = require "libration.demand"
local digitizer_module = require "libration.digitizer"
local fraction = require "libration.fraction"
local inert = require "libration.inert"
local options = require "libration.options"
local units = require "libration.units"

local M = {}

local BOUNDS_VERSION = 2 -- raised whenever a bound may come out differently

local function decided(plan)
  return { rate = fraction.text(plan.rate), samples = plan.samples, setting = plan.setting,
    window = plan.window.name, parameter = plan.window.parameter, reading = plan.reading,
    bounds_version = BOUNDS_VERSION }
end

--- The identity of a plan: a hash of what it measures, with what, and how.
-- @param plan table: a plan
-- @return string: 64 hexadecimal digits
-- @usage
-- assert(type(require("libration.plan.file").identity) == "function")
function M.identity(plan)
  return base.sha256(inert.write { demand = plan.demand.source,
    digitizer = plan.digitizer.source, plan = decided(plan) })
end

-- Writes beside the file and renames, so that a reader never sees half of it.
local function replace(path, content)
  local beside = path .. ".part"
  local file, message = io.open(beside, "wb")
  if not file then
    return nil, message, "io"
  end
  local written, why = file:write(content)
  local closed, later = file:close()
  if not (written and closed) then
    os.remove(beside)
    return nil, ("%s: %s"):format(path, why or later), "io"
  end
  local renamed, reason = os.rename(beside, path)
  if not renamed then
    os.remove(beside)
    return nil, reason, "io"
  end
  return true
end

--- Writes a plan to a data file, in one step.
-- @param plan table: a plan
-- @param path string: file name
-- @return boolean: true; or nil, message, "io"
-- @usage
-- assert(type(require("libration.plan.file").write) == "function")
function M.write(plan, path)
  local stored = decided(plan)
  stored.identity = plan.identity
  return replace(path, inert.write { demand = plan.demand.source,
    digitizer = plan.digitizer.source, plan = stored })
end

local function setting_kind(value, path, mistakes)
  if type(value) ~= "table" then
    mistakes:add(path, options.show(value) .. " is not a table of settings")
    return nil
  end
  local copy = {}
  for key, entry in pairs(value) do
    copy[key] = math.tointeger(entry)
  end
  return copy
end

local schema = {
  rate = { options.quantity(function(value) return units.exact(value, "Hz") end, { above = 0 }),
    required = true },
  samples = { options.integer(4, 2 ^ 40), required = true },
  setting = { setting_kind, default = {} },
  window = { options.text(), required = true },
  parameter = { options.number() },
  reading = { options.choice { "bin", "tracked" }, required = true },
  bounds_version = { options.integer(1, 1000), required = true },
  identity = { options.text(), required = true },
}

--- Reads a plan's data file.
-- @param path string: file name
-- @return table: rate, samples, setting, window, parameter, reading, identity;
-- or nil, message, code ("io", "format")
-- @return table: demand
-- @return table: digitizer
-- @usage
-- local stored, message, code = require("libration.plan.file").read "/no/such/file"
-- assert(stored == nil and message and code == "io")
function M.read(path)
  local data, message, code = inert.read_file(path)
  if not data then
    return nil, message, code
  end
  local mistakes = options.mistakes()
  if data.plan == nil then
    return nil, path .. ": there is no plan = { ... } in it", "format"
  end
  local stored = options.read(schema, data.plan, "plan", mistakes)
  if mistakes.count > 0 then
    return nil, mistakes:message(path), "format"
  end
  local ok, demand = pcall(demand_module.demand, data.demand)
  if not ok then
    return nil, path .. ": " .. tostring(demand), "format"
  end
  local fine, digitizer = pcall(digitizer_module.digitizer, data.digitizer)
  if not fine then
    return nil, path .. ": " .. tostring(digitizer), "format"
  end
  return stored, demand, digitizer
end

return M
