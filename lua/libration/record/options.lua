--- Checks of what callers give to records, and how a channel is calibrated.

local time = require "libration.record.time"
local units = require "libration.units"

local M = {}

local function fail(level, text, ...)
  error("record: " .. text:format(...), level + 1)
end

-- Strict options: an unknown field is an error that lists the valid ones.
local function check_options(options, valid, level)
  if type(options) ~= "table" then
    fail(level + 1, "the options are a table, not %s", type(options))
  end
  for key in pairs(options) do
    if not valid[key] then
      local names = {}
      for name in pairs(valid) do names[#names + 1] = name end
      table.sort(names)
      fail(level + 1, "unknown field %s; valid are %s", tostring(key), table.concat(names, ", "))
    end
  end
end

local function set(text)
  local out = {}
  for word in text:gmatch("%S+") do out[word] = true end
  return out
end

-- A quantity in a unit, above zero; nil stays nil.
local function positive(options, field, unit, level)
  local value = options[field]
  if value == nil then
    return nil
  end
  local number, reason = units.number(value, unit)
  if not number then
    fail(level + 1, "%s: %s", field, reason)
  elseif not (number > 0 and number < math.huge) then
    fail(level + 1, "%s is %s; it must be positive", field, tostring(value))
  end
  return number
end

-- How a channel is calibrated: its unit, and the value of that unit at full scale.
local function calibration(options, level)
  local out = { unit = options.unit, full_scale = nil, sensitivity = nil, range = nil }
  if out.unit ~= nil and type(out.unit) ~= "string" then
    fail(level + 1, "unit is %s; it must be a text such as \"m/s^2\"", tostring(out.unit))
  end
  out.range = positive(options, "range", "V", level + 1)
  local named = out.unit or "V"
  local per = named:find("^%a+$") and named or "(" .. named .. ")"
  out.sensitivity = positive(options, "sensitivity", "V/" .. per, level + 1)
  out.full_scale = positive(options, "full_scale", named, level + 1)
  if out.full_scale and (out.range or out.sensitivity) then
    fail(level + 1, "give full_scale, or range and sensitivity, but not both")
  elseif out.sensitivity and not out.range then
    fail(level + 1, "sensitivity needs range, the volts at full scale")
  elseif out.range and not out.sensitivity and out.unit and out.unit ~= "V" then
    fail(level + 1, "range is in V; sensitivity must say how many V a %s is", out.unit)
  end
  if out.range then
    out.full_scale = out.range / (out.sensitivity or 1)
    out.unit = named
  end
  return out
end

local function exact_rate(value, level)
  local rate, reason = units.rate(value)
  if not rate then
    fail(level + 1, "rate: %s", reason)
  elseif rate <= 0 then
    fail(level + 1, "rate is %s; it must be positive", tostring(value))
  end
  return rate
end

-- Option k of a field that may be one value for all or a list, one each.
local function pick(options, k, fields)
  local out = {}
  for _, field in ipairs(fields) do
    local value = options[field]
    if type(value) == "table" then value = value[k] end
    out[field] = value
  end
  return out
end

-- Channel numbers asked for, checked for kind only.
local function wanted_channels(channel, level)
  local list = type(channel) == "table" and channel or { channel }
  for _, number in ipairs(list) do
    if math.type(number) ~= "integer" then
      fail(level + 1, "channel is %s; it must be a number from 1 or a list of such",
        tostring(number))
    end
  end
  return channel ~= nil and list or nil
end

local function check_count(value, field, least, level)
  if value ~= nil and (math.type(value) ~= "integer" or value < least) then
    fail(level + 1, "%s is %s; it must be an integer from %d", field, tostring(value), least)
  end
end

-- A moment as text or as integer nanoseconds; nil stays nil.
local function moment(value, field, level)
  if value == nil or math.type(value) == "integer" then
    return value
  elseif type(value) ~= "string" then
    fail(level + 1, "%s is %s; give ISO 8601 text or integer nanoseconds since 1970", field,
      tostring(value))
  end
  local ns, reason = time.read(value)
  if not ns then
    fail(level + 1, "%s: %s", field, reason)
  end
  return ns
end

-- Gaps { after, lost } in order as segments { first, count, counter }.
local function segments(gaps, samples, level)
  local list = { { first = 1, count = samples, counter = 0 } }
  if gaps ~= nil and type(gaps) ~= "table" then
    fail(level + 1, "gaps is %s; it must be a list of { after, lost }", tostring(gaps))
  end
  for i, gap in ipairs(gaps or {}) do
    local last = list[#list]
    local after, lost = type(gap) == "table" and gap.after, type(gap) == "table" and gap.lost
    if math.type(after) ~= "integer" or after < last.first or after >= samples then
      fail(level + 1, "gaps[%d].after is %s; it must be a sample number from %d to %d", i,
        tostring(after), last.first, samples - 1)
    elseif math.type(lost) ~= "integer" or lost < 1 or lost > 1 << 53 then
      fail(level + 1, "gaps[%d].lost is %s; it must be an integer from 1", i, tostring(lost))
    end
    last.count = after - last.first + 1
    list[#list + 1] = { first = after + 1, count = samples - after,
                        counter = last.counter + last.count + lost }
  end
  return list
end

-- The segments of samples first .. first + count - 1, numbered from 1.
local function cut_segments(list, first, count)
  local out, last = {}, first + count - 1
  for _, segment in ipairs(list) do
    local from = math.max(segment.first, first)
    local to = math.min(segment.first + segment.count - 1, last)
    if from <= to then
      out[#out + 1] = { first = from - first + 1, count = to - from + 1,
                        counter = segment.counter + from - segment.first }
    end
  end
  return out
end

M.moment, M.segments, M.cut_segments = moment, segments, cut_segments
M.fail, M.check, M.set, M.positive, M.calibration = fail, check_options, set, positive, calibration
M.rate, M.pick, M.channels, M.count = exact_rate, pick, wanted_channels, check_count

return M
