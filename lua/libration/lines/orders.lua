-- Orders of a shaft, and averages over its turns.

local core = require "libration.core"
local options = require "libration.options"
local result = require "libration.lines.result"
local round = require("libration.report.numbers").round
local sine = require "libration.lines.sine"
local source = require "libration.lines.source"
local units = require "libration.units"

local M = {}

-- 2 pi f sigma at which exp(-(2 pi f sigma)^2 / 2) is half of the power: f sigma
-- = sqrt(ln 2) / (2 pi) = 0.1325.
local HALF_POWER = math.log(2) ^ 0.5 / (2 * math.pi)

-- Orders: a list of positive numbers, or a text such as "1..10".
local function orders_kind(value, path, mistakes)
  if type(value) == "string" or type(value) == "number" then
    local list, reason = units.orders(value)
    if not list then
      mistakes:add(path, reason)
      return nil
    end
    value = list
  end
  return options.list(options.number { above = 0, most = 1e4 }, 1, 64)(value, path, mistakes)
end

local function pulses_kind(value, path, mistakes)
  if core.samples.is(value) then return value end
  local list = options.list(options.number(), 3, 1 << 24)(value, path, mistakes)
  return list and core.samples.from(list)
end

local pulse_fields = {
  pulses = { pulses_kind }, per_turn = { options.number { above = 0 }, default = 1 },
  jitter_s = { options.number { least = 0 } }, orders = { orders_kind, default = nil },
}

local function schema_with(extra)
  local out = {}
  for name, row in pairs(pulse_fields) do out[name] = row end
  for name, row in pairs(extra) do out[name] = row end
  return source.schema(out)
end

local orders_schema = schema_with { speed_hz = { source.hertz }, orders = { orders_kind,
  required = true } }
local average_schema = schema_with { pulses = { pulses_kind, required = true },
  points = { options.integer(8, 1 << 20), default = 256 },
  orders = { orders_kind, default = { 1, 2, 3, 4, 5, 6, 7, 8, 9, 10 } } }

local function check_pulses(pulses, what)
  if #pulses < 3 then
    error(("%s: %d pulses; give 3 or more"):format(what, #pulses), 0)
  end
  for i = 2, #pulses do
    if not (pulses[i] > pulses[i - 1]) then
      error(("%s: pulse %d comes at %s s, no later than the one before"):format(what, i,
        tostring(pulses[i])), 0)
    end
  end
end

-- Standard deviation of a pulse's time, as far as its second differences show
-- it: the variance of t[i+1] - 2 t[i] + t[i-1] is 6 times that of a pulse; speed
-- that changes from turn to turn looks the same, so it is an upper estimate.
local function jitter_of(pulses)
  local count, sum, square = #pulses - 2, 0, 0
  for i = 2, #pulses - 1 do
    local d = pulses[i + 1] - 2 * pulses[i] + pulses[i - 1]
    sum, square = sum + d, square + d * d
  end
  if count < 2 then return nil end
  return (math.max(square - sum * sum / count, 0) / (count - 1) / 6) ^ 0.5
end

-- The shaft's facts: mean speed, jitter, and the order that jitter halves.
local function shaft_of(read)
  local p = read.pulses
  local speed = (#p - 1) / read.per_turn / (p[#p] - p[1])
  local jitter = read.jitter_s or jitter_of(p)
  return { speed_hz = speed, jitter_s = jitter, jitter_given = read.jitter_s ~= nil,
           half_power_order = jitter and jitter > 0 and HALF_POWER / (jitter * speed) or nil }
end

-- What jitter takes from an order in an average over many turns, dB.
local function loss_db(shaft, order)
  local x = 2 * math.pi * order * shaft.speed_hz * (shaft.jitter_s or 0)
  return 10 * x * x / math.log(10)
end

local function at_known_speed(from, read)
  local lines = {}
  for i, order in ipairs(read.orders) do lines[i] = { hz = order * read.speed_hz } end
  local fitted, rest, code = sine.fit_lines(from, lines)
  if not fitted then return nil, rest, code end
  for i, line in ipairs(fitted) do line.order = read.orders[i] end
  return { lines = fitted, offset = rest.offset, residual_rms = rest.rms,
           speed_hz = read.speed_hz, used = #from.x }
end

-- The samples between first and last pulse: first, count.
local function covered(from, pulses)
  local first = math.max(1, math.ceil(pulses[1]) + 1)
  local last = math.min(#from.x, math.floor(pulses[#pulses]) + 1)
  return first, last - first + 1
end

local function at_pulses(from, read)
  check_pulses(read.pulses, "orders")
  local shaft, rate = shaft_of(read), from.rate:number()
  local pulses = read.pulses * rate
  local first, count = covered(from, pulses)
  if count < 2 * #read.orders + 2 then
    return nil, ("orders: %d samples lie between the pulses; %d orders need %d"):format(
      math.max(count, 0), #read.orders, 2 * #read.orders + 2), "domain"
  end
  local angle = core.lines.turns(pulses, read.per_turn, first, count)
  local flat, rest, code = core.lines.orders(from.x:slice(first, first + count - 1), angle,
    read.orders)
  if not flat then return nil, rest, code end
  if rest.rms ~= rest.rms then return source.not_finite "orders" end
  local lines = {}
  for i, order in ipairs(read.orders) do
    lines[i] = { order = order, hz = order * shaft.speed_hz, amplitude = flat[4 * i - 3],
                 phase = flat[4 * i - 2], u_amplitude = flat[4 * i - 1], u_phase = flat[4 * i],
                 jitter_loss_db = loss_db(shaft, order) }
  end
  shaft.lines, shaft.offset, shaft.residual_rms = lines, rest.offset, rest.rms
  shaft.used, shaft.turns = count, angle[-1] - angle[1]
  return shaft
end

--- See lines.orders.
function M.orders(what, given)
  local read = options.take(orders_schema, given, "orders")
  local from = source.take(what, read, "orders")
  if (read.speed_hz == nil) == (read.pulses == nil) then
    error("orders: give speed_hz (a steady speed) or pulses (times, s), one of them", 0)
  end
  local out, message, code = (read.pulses and at_pulses or at_known_speed)(from, read)
  if not out then return nil, message, code end
  return result.new("orders", result.facts(from, out))
end

local function shaft_notes(r)
  local notes = {}
  if r.jitter_s then
    notes[1] = ("  trigger jitter %s s (%s): an order loses half its power at %s"):format(
      round(r.jitter_s, 2), r.jitter_given and "given" or "from the pulses, at most",
      r.half_power_order and round(r.half_power_order, 3) or "none")
    notes[2] = "  losses are not corrected; compare high orders with the asynchronous level"
  end
  return notes
end

local function orders_text(r)
  local rows = {}
  for i, l in ipairs(r.lines) do
    rows[i] = { ("%.6g"):format(l.order), round(l.hz, 6), result.with(l.amplitude, l.u_amplitude),
                result.u(l.u_amplitude), result.with(l.phase, l.u_phase), result.u(l.u_phase),
                l.jitter_loss_db and round(l.jitter_loss_db, 2) or "" }
  end
  local notes = shaft_notes(r)
  table.insert(notes, 1, ("  speed %s Hz%s; residual rms %s %s"):format(round(r.speed_hz, 6),
    r.turns and (", %.4g turns"):format(r.turns) or ", steady", round(r.residual_rms, 3), r.unit))
  return result.page(("orders of a shaft: %s"):format(result.origin(r)), {
    { head = "order", align = "point" }, { head = "mean", unit = "Hz", align = "point" },
    { head = "amplitude", unit = r.unit, align = "point" },
    { head = "u (k=1)", unit = r.unit, align = "point" },
    { head = "phase", unit = "rad", align = "point" },
    { head = "u (k=1)", unit = "rad", align = "point" },
    { head = "jitter loss", unit = "dB", align = "point" } }, rows, notes)
end

result.define("orders", { text = orders_text, rows = function(r) return r.lines end,
  columns = { "order", "hz", "amplitude", "u_amplitude", "phase", "u_phase", "jitter_loss_db" } })

-- Amplitude and phase of whole orders of an average, below half its points.
local function orders_of(mean, u, read, shaft)
  local out, points = {}, #mean
  for _, order in ipairs(read.orders) do
    if order % 1 == 0 and order < points / 2 then
      local re, im = 0, 0
      for p = 1, points do
        local angle = 2 * math.pi * ((order * (p - 1)) % points) / points
        re, im = re + mean[p] * math.cos(angle), im - mean[p] * math.sin(angle)
      end
      out[#out + 1] = { order = order, amplitude = 2 * (re * re + im * im) ^ 0.5 / points,
        phase = math.atan(im, re), u_amplitude = u * (2 / points) ^ 0.5,
        jitter_loss_db = loss_db(shaft, order) }
    end
  end
  return out
end

--- See lines.synchronous.
function M.synchronous(what, given)
  local read = options.take(average_schema, given, "synchronous")
  local from = source.take(what, read, "synchronous")
  check_pulses(read.pulses, "synchronous")
  local mean, deviation, turns = core.lines.turn_average(from.x, read.pulses * from.rate:number(),
    read.per_turn, read.points)
  if not mean then return nil, deviation, turns end
  if mean:sum() ~= mean:sum() then return source.not_finite "synchronous" end
  local shaft = shaft_of(read)
  local points = {}
  for p = 1, read.points do
    points[p] = { angle_turns = (p - 1) / read.points, mean = mean[p],
                  u_mean = turns > 1 and deviation[p] / turns ^ 0.5 or nil }
  end
  shaft.points, shaft.turns = points, turns
  shaft.deviation_rms = deviation:rms()
  shaft.orders = orders_of(mean, shaft.deviation_rms / turns ^ 0.5, read, shaft)
  return result.new("synchronous", result.facts(from, shaft))
end

local function average_text(r)
  local rows = {}
  for i, o in ipairs(r.orders) do
    rows[i] = { ("%d"):format(o.order), result.with(o.amplitude, o.u_amplitude),
                result.u(o.u_amplitude), round(o.phase, 4), round(o.jitter_loss_db, 2) }
  end
  local notes = shaft_notes(r)
  local head = "  %d angles a turn, %d turns at %s Hz; turns scatter by %s %s rms"
  table.insert(notes, 1, head:format(#r.points, r.turns, round(r.speed_hz, 6),
    round(r.deviation_rms, 3), r.unit))
  return result.page(("synchronous average: %s"):format(result.origin(r)), {
    { head = "order", align = "point" }, { head = "amplitude", unit = r.unit, align = "point" },
    { head = "u (k=1)", unit = r.unit, align = "point" },
    { head = "phase", unit = "rad", align = "point" },
    { head = "jitter loss", unit = "dB", align = "point" } }, rows, notes)
end

result.define("synchronous", { text = average_text, rows = function(r) return r.points end,
  columns = { "angle_turns", "mean", "u_mean" } })

return M
