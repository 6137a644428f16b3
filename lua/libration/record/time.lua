--- Moments as integer nanoseconds since 1970-01-01T00:00:00Z, and as ISO 8601 text.
-- The calendar is Gregorian and every day has 86 400 s, as in POSIX: a leap
-- second has no moment of its own and is refused. Integers reach from 1677 to 2262.

local fraction = require "libration.fraction"

local M = {}

local SECOND = 1000000000

-- Days from 1970-01-01 to a date, by counting years from March, so that the
-- leap day comes last (arithmetic of the Gregorian calendar, ISO 8601-1, 4.2.1).
local function days_of(year, month, day)
  local from_march = (month + 9) % 12
  local y = month < 3 and year - 1 or year
  local era = y // 400
  local in_era = y - era * 400
  local in_year = (153 * from_march + 2) // 5 + day - 1
  return era * 146097 + in_era * 365 + in_era // 4 - in_era // 100 + in_year - 719468
end

local function date_of(days)
  local shifted = days + 719468
  local era = shifted // 146097
  local in_era = shifted - era * 146097
  local year = (in_era - in_era // 1460 + in_era // 36524 - in_era // 146096) // 365
  local in_year = in_era - (365 * year + year // 4 - year // 100)
  local from_march = (5 * in_year + 2) // 153
  local month = from_march < 10 and from_march + 3 or from_march - 9
  local day = in_year - (153 * from_march + 2) // 5 + 1
  return year + era * 400 + (month < 3 and 1 or 0), month, day
end

local function days_in(year, month)
  local following = month == 12 and { year + 1, 1 } or { year, month + 1 }
  return days_of(following[1], following[2], 1) - days_of(year, month, 1)
end

local function offset_of(zone)
  if zone == "Z" or zone == "z" then
    return 0
  end
  local sign, hours, minutes = zone:match "^([+-])(%d%d):?(%d%d)$"
  if not sign or tonumber(hours) > 23 or tonumber(minutes) > 59 then
    return nil
  end
  return (sign == "-" and -1 or 1) * (tonumber(hours) * 3600 + tonumber(minutes) * 60)
end

local function refuse(text, reason)
  local shown = #text > 60 and text:sub(1, 57) .. "..." or text
  return nil, ("%q is no moment: %s"):format(shown, reason)
end

local shape = "^(%d%d%d%d)%-(%d%d)%-(%d%d)[Tt ](%d%d):(%d%d):(%d%d)([.,]?%d*)([Zz+-][%d:]*)$"

--- Reads a moment, "2026-03-01T12:00:00.25Z".
-- Date, time and zone (Z or an offset such as +01:00) are all needed; up to 9 decimals of a
-- second are read exactly and more are refused.
-- @param text string: ISO 8601 extended format
-- @return integer: nanoseconds since 1970-01-01T00:00:00Z; or nil and a reason
-- @usage
-- local time = require "libration.record.time"
-- assert(time.read "1970-01-01T00:00:01.5Z" == 1500000000)
-- assert(time.read "2000-01-01T01:00:00+01:00" == time.read "2000-01-01T00:00:00Z")
function M.read(text)
  local year, month, day, hour, minute, second, part, zone = text:match(shape)
  if not year then
    return refuse(text, "write 2026-03-01T12:00:00.25Z, with Z or an offset such as +01:00")
  end
  year, month, day = tonumber(year), tonumber(month), tonumber(day)
  hour, minute, second = tonumber(hour), tonumber(minute), tonumber(second)
  local offset = offset_of(zone)
  if month < 1 or month > 12 or day < 1 or day > days_in(year, month) then
    return refuse(text, "there is no such day")
  elseif hour > 23 or minute > 59 or second > 59 then
    return refuse(text, second == 60 and "leap seconds have no moment of their own here"
      or "there is no such time of day")
  elseif not offset then
    return refuse(text, "the zone is Z or an offset such as +01:00")
  elseif #part == 1 or #part > 10 then
    return refuse(text, "a second has 1 to 9 decimals")
  end
  local nanoseconds = #part > 0 and tonumber((part:sub(2) .. "000000000"):sub(1, 9)) or 0
  local seconds = days_of(year, month, day) * 86400 + hour * 3600 + minute * 60 + second - offset
  if seconds < -9223372036 or seconds >= 9223372036 then
    return refuse(text, "nanoseconds in 64 bits reach from 1677-09-21 to 2262-04-11")
  end
  return seconds * SECOND + nanoseconds
end

--- The moment n samples after another one, rounded down to a nanosecond.
-- @param ns integer: the other one
-- @param n integer: samples
-- @param rate fraction: S/s
-- @return integer: nanoseconds since 1970-01-01T00:00:00Z; nil beyond 64 bits
-- @usage
-- local time = require "libration.record.time"
-- assert(time.after(5, 1, lb.fraction.new(3)) == 333333338)
function M.after(ns, n, rate)
  local fine, seconds = pcall(function() return fraction.new(n) / rate end)
  if not fine then
    return nil
  end
  local whole, rest = seconds.numerator // seconds.denominator, seconds.numerator
    % seconds.denominator
  local part = rest < 9000000000 and rest * SECOND // seconds.denominator
    or math.floor(rest / seconds.denominator * SECOND)
  if math.abs(whole) > 9000000000 then
    return nil
  end
  return ns + whole * SECOND + part
end

--- Writes a moment as ISO 8601 text in UTC, with no more decimals than needed.
-- @param ns integer: nanoseconds since 1970-01-01T00:00:00Z
-- @return string: reads back as the same integer
-- @usage
-- assert(require("libration.record.time").text(-1) == "1969-12-31T23:59:59.999999999Z")
function M.text(ns)
  local seconds, part = ns // SECOND, ns % SECOND
  local year, month, day = date_of(seconds // 86400)
  local of_day = seconds % 86400
  local decimals = part == 0 and "" or ("." .. ("%09d"):format(part):gsub("0+$", ""))
  return ("%04d-%02d-%02dT%02d:%02d:%02d%sZ"):format(year, month, day, of_day // 3600,
    of_day // 60 % 60, of_day % 60, decimals)
end

return M
