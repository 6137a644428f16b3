--- What the command reads: data files, saved plans, sound files.
-- Each function returns what it read, or nil, message, and the exit code.

local inert = require "libration.inert"
local load = require "libration.load"
local planner = require "libration.plan"
local record = require "libration.record"

local M = {}

M.HOLDS, M.FAILS, M.MISUSE, M.WORLD = 0, 1, 2, 3

--- The exit code that a refusal's code stands for.
-- @param code string: third result of the library's functions
-- @return integer: 3 for what the system refused, 2 for a mistake in a file
-- @usage
-- local exit_code = require("libration.command.inputs").exit_code
-- assert(exit_code "io" == 3 and exit_code "format" == 2)
function M.exit_code(code)
  return (code == "io" or code == "no_memory") and M.WORLD or M.MISUSE
end

local function add(all, data, path)
  if data.demand then
    if all.demand then
      return nil, path .. ": a second demand; the first is in " .. all.demand_path, M.MISUSE
    end
    all.demand, all.demand_path = data.demand, path
  end
  for _, digitizer in ipairs(data.digitizers or {}) do
    table.insert(all.digitizers, digitizer)
  end
  return true
end

--- Reads data files that together hold one demand and its digitizers.
-- @param paths table: list of paths
-- @return table: demand, digitizers; or nil, message, exit code. The message lists
-- the mistakes of all files
-- @usage
-- local data, message, code = require("libration.command.inputs").data { "/no/such/file" }
-- assert(data == nil and message:find "/no/such/file" and code == 3)
function M.data(paths)
  local all, complaints, worst = { digitizers = {} }, {}, 0
  for _, path in ipairs(paths) do
    local data, message, code = load.load(path)
    if data then
      data, message, code = add(all, data, path)
    else
      code = M.exit_code(code)
    end
    if not data then
      complaints[#complaints + 1], worst = message, math.max(worst, code)
    end
  end
  if #complaints > 0 then
    return nil, table.concat(complaints, "\n"), worst
  elseif not all.demand or #all.digitizers == 0 then
    local lacking = all.demand and "no digitizer" or "no demand"
    return nil, lacking .. " in " .. table.concat(paths, ", ") .. ": the files together need "
      .. "demand = { lines = { ... } } and digitizer = { ... }", M.MISUSE
  end
  return all
end

--- Whether a file is a saved plan.
-- @param path string: the file
-- @return boolean: false also for what cannot be read
-- @usage
-- assert(not require("libration.command.inputs").is_plan "/no/such/file")
function M.is_plan(path)
  local data = inert.read_file(path)
  return data ~= nil and data.plan ~= nil
end

--- Reads a saved plan.
-- @param path string: the file
-- @return plan: or nil, message, exit code
-- @usage
-- assert(select(3, require("libration.command.inputs").plan "/no/such/file") == 3)
function M.plan(path)
  local plan, message, code = planner.load(path)
  if not plan then
    return nil, message, M.exit_code(code)
  end
  return plan
end

-- How much of the demand's unit the full scale of a file is.
local function full_scale(plan, given)
  if given then
    return given
  end
  local digitizer, what = plan.digitizer, plan.demand
  if not digitizer.range then
    return nil
  elseif digitizer.range_unit == what.unit then
    return digitizer.range
  end
  return what.sensitivity and digitizer.range / what.sensitivity
end

--- Reads the record that a plan is to be measured in.
-- @param path string: a sound file
-- @param plan plan: says unit, rate and, unless given, the full scale
-- @param options table: channel (integer), full_scale (quantity), or empty
-- @return record: or nil, message, exit code
-- @usage
-- local inputs, fraction = require "libration.command.inputs", lb.fraction.new
-- local plan = { demand = { unit = "V" }, digitizer = {}, rate = fraction(8000) }
-- assert(select(3, inputs.record("/no/such/file.wav", plan, { full_scale = 1 })) == 3)
function M.record(path, plan, options)
  local scale = full_scale(plan, options.full_scale)
  if not scale then
    return nil, "the plan's digitizer states no range in " .. plan.demand.unit
      .. ": say --full-scale, the largest value that the file can hold", M.MISUSE
  end
  local exact = plan.rate.denominator ~= 1 and plan.rate or nil
  local found, message, code = record.read(path, { channel = options.channel, rate = exact,
    unit = plan.demand.unit, full_scale = scale })
  if not found then
    return nil, message, M.exit_code(code)
  end
  return found
end

return M
