--- The options of lb.plan and lb.plans.

local options = require "libration.options"
local units = require "libration.units"

local M = {}

local READINGS = { "bin", "tracked" }

-- Windows that are tried unless the engineer names some: narrow to wide main
-- lobe, each the best of its width for some spread of levels.
local USUAL = {
  "rectangular", "hann", "nuttall3b", "blackman_harris4", "nuttall4c", "hft70", "hft95",
  "hft116d", "hft144d", "hft196d", "hft248d",
}

-- Windows the search cannot use: no limit for long records to start from.
local LIMITLESS = { dolph_chebyshev = true }

local function window_list(value, path, mistakes, known)
  local list = {}
  for i, entry in ipairs(value) do
    local place = options.join(path, i)
    local row = type(entry) == "table" and entry or { entry }
    if row[2] ~= nil and type(row[2]) ~= "number" then
      mistakes:add(place, options.show(row[2]) .. " is no parameter of a window; give a number")
    elseif known[row[1]] then
      list[#list + 1] = { name = row[1], parameter = row[2] }
    else
      local names = {}
      for name in pairs(known) do
        names[#names + 1] = name
      end
      table.sort(names)
      mistakes:add(place, ("%s is no window%s; windows: %s"):format(options.show(row[1]),
        LIMITLESS[row[1]] and " that plans can use (its shape has no limit for long records)" or "",
        table.concat(names, ", ")))
    end
  end
  return list
end

local function windows_kind(known, all)
  return function(value, path, mistakes)
    if value == "all" then
      value = all
    elseif type(value) == "string" then
      value = { value }
    end
    if type(value) ~= "table" or #value == 0 then
      mistakes:add(path, options.show(value) .. ' is not a window name, a list of them, or "all"')
      return nil
    end
    return window_list(value, path, mistakes, known)
  end
end

local function readings_kind(value, path, mistakes)
  if type(value) == "string" then
    value = { value }
  end
  return options.list(options.choice(READINGS), 1, #READINGS)(value, path, mistakes)
end

--- Reads the options of lb.plan.
-- @param given table: the caller's options, or nil
-- @param all table: names of all windows
-- @return table: within (s, total time, or nil), readings, windows (list of
-- {name, parameter}), undersample, share, least_rate, most_rate, effort_s
-- @usage
-- local choices = require "libration.plan.choices"
-- assert(choices.read({ within = "60 s" }, { "hann" }).within == 60)
-- local ok, message = pcall(choices.read, { witin = 3 }, { "hann" })
-- assert(not ok and message:find "within")
function M.read(given, all)
  local known, usable = {}, {}
  for _, name in ipairs(all) do
    if not LIMITLESS[name] then
      known[name] = true
      usable[#usable + 1] = name
    end
  end
  local usual = {}
  for _, name in ipairs(USUAL) do
    if known[name] then
      usual[#usual + 1] = { name = name }
    end
  end
  local function rate(value)
    local exact, reason = units.rate(value)
    return exact and exact:number(), reason
  end
  local share = options.quantity(units.relative, { above = 0, most = 1 })
  return options.take({
    within = { options.quantity(units.seconds, { above = 0, unit = "s" }) },
    readings = { readings_kind, default = { "tracked", "bin" } },
    windows = { windows_kind(known, usable), default = usual },
    undersample = { options.boolean(), default = false },
    share = { share, default = 1 },
    least_rate = { options.quantity(rate, { above = 0, unit = "S/s" }) },
    most_rate = { options.quantity(rate, { above = 0, unit = "S/s" }) },
    effort_s = { options.quantity(units.seconds, { above = 0, most = 3600, unit = "s" }),
      default = 3 },
  }, given, "plan options")
end

return M
