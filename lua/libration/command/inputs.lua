--- What the command reads: data files, saved plans, sound files.
-- Each function returns what it read, or nil, message, and the exit code.

local lfs = require "lfs"

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

-- As load.load, but a saved plan is told from a file with a mistake.
local function read_data(path)
  local data, message, code = inert.read_file(path)
  if not data then
    return nil, message, code
  elseif data.plan ~= nil then
    return nil, ("%s is a saved plan, there is nothing left to plan: libration prove %s, or "
      .. "libration measure %s RECORD"):format(path, path, path), "format"
  end
  return load.interpret(data, path)
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
    local data, message, code = read_data(path)
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

--- Whether two names lead to one file, through links and any spelling of the path.
-- @param one string: a path
-- @param other string: a path
-- @return boolean: false also where one of them leads to nothing
-- @usage
-- local same = require("libration.command.inputs").same_file
-- assert(same("/", "/../") and not same("/", "/no/such/file"))
function M.same_file(one, other)
  local a, b = lfs.attributes(one), lfs.attributes(other)
  return a ~= nil and b ~= nil and a.dev == b.dev and a.ino == b.ino
end

-- Whether a file holds shares of a full scale, or codes, rather than values.
local function needs_scale(path, options)
  local found, message, code = record.open(path, options)
  if not found then
    return nil, message, code
  end
  local needs = found.channels[1].unit == "FS"
  found:close()
  return needs
end

--- Reads the record that a plan is to be measured in.
-- A full scale is given only to files that hold codes or shares of one.
-- @param path string: a file of any format that lb.record.read reads
-- @param plan plan: says unit, rate and, unless given, the full scale
-- @param options table: channel (integer), full_scale (quantity), or empty
-- @return record: or nil, message, exit code
-- @usage
-- local inputs, fraction = require "libration.command.inputs", lb.fraction.new
-- local plan = { demand = { unit = "V" }, digitizer = {}, rate = fraction(8000) }
-- assert(select(3, inputs.record("/no/such/file.wav", plan, { full_scale = 1 })) == 3)
function M.record(path, plan, options)
  local exact = plan.rate.denominator ~= 1 and plan.rate or nil
  local needs, message, code = needs_scale(path, { channel = options.channel, rate = exact })
  if needs == nil then
    return nil, message, M.exit_code(code)
  end
  local scale = options.full_scale or needs and plan.front.range or nil
  if needs and not scale then
    return nil, "the plan's digitizer states no range in " .. plan.demand.unit
      .. ": say --full-scale, the largest value that the file can hold", M.MISUSE
  end
  local found
  found, message, code = record.read(path, { channel = options.channel, rate = exact,
    unit = plan.demand.unit, full_scale = scale })
  if not found then
    return nil, message, M.exit_code(code)
  end
  return found
end

return M
