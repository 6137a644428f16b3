-- What is drawn of measurements of lines: points over the noise, with limits
-- that are two standard uncertainties wide either way.

local attach = require("libration.report.result").attach

local M = {}

local WIDE = 2

-- Points of rows with their limits, and where asked the names above them.
local function points(rows, x, name, role)
  local curve = { kind = "points", role = role, name = name, x = {}, y = {}, low = {}, high = {} }
  for i, row in ipairs(rows) do
    local u = WIDE * (row.u_amplitude or 0)
    curve.x[i], curve.y[i] = row[x], row.amplitude
    curve.low[i], curve.high[i] = row.amplitude - u, row.amplitude + u
  end
  return curve
end

local function names(rows, x, kind)
  local out = {}
  for i, row in ipairs(rows) do
    if row.name then
      out[#out + 1] = { name = row.name, kind = kind or "line", hz = row[x or "hz"],
                        y = row.amplitude, index = i }
    end
  end
  return out
end

local function frequency(spread)
  return { label = "frequency", unit = "Hz", spread = spread }
end

local function amplitude(r, log)
  return { label = "peak amplitude", unit = r.unit, log = log ~= false }
end

local with_limits = "amplitude, +- 2 standard uncertainties"

local function place_text(r)
  return ("%s S/s, %d samples%s"):format(tostring(r.rate), r.samples,
    r.channel and (", channel %d"):format(r.channel) or "")
end

-- The floor and the threshold over it as amplitudes, where lines were read.
local function add_floor(curves, r)
  local x, floor, threshold = {}, {}, {}
  for i, l in ipairs(r.lines) do
    x[i], floor[i] = l.hz, l.amplitude / 10 ^ (l.over_floor_db / 20)
    threshold[i] = floor[i] * 10 ^ (r.threshold_db / 20)
  end
  curves[#curves + 1] = { kind = "points", role = "floor", x = x, y = floor,
                          name = "the floor around a line, read as an amplitude" }
  curves[#curves + 1] = { kind = "points", role = "limit", x = x, y = threshold,
                          name = ("threshold, false alarm %.3g"):format(r.false_alarm) }
end

local pictures = {}

function pictures.lines(r)
  local curves = { points(r.lines, "hz", with_limits) }
  add_floor(curves, r)
  return { title = ("%d lines above the floor"):format(#r.lines),
    below = ("%s; %s, %d segment%s of %d samples"):format(place_text(r), r.window, r.segments,
      r.segments == 1 and "" or "s", r.segment),
    panels = { { x = { label = "frequency", unit = "Hz", least = 0, most = r.last_hz },
                 y = amplitude(r), curves = curves } } }
end

function pictures.tracked(r)
  local found, missed = {}, {}
  for _, l in ipairs(r.lines) do
    local list = l.found and found or missed
    list[#list + 1] = l
  end
  local curves = { points(found, "hz", with_limits), points(missed, "hz", "not found", "other") }
  add_floor(curves, r)
  local marks = names(found)
  table.move(names(missed, "hz", "interferer"), 1, #missed, #marks + 1, marks)
  return { title = ("%d tracked lines"):format(#r.lines),
    below = ("%s; %s, %d segment%s of %d samples"):format(place_text(r), r.window, r.segments,
      r.segments == 1 and "" or "s", r.segment),
    panels = { { x = frequency(true), y = amplitude(r), curves = curves, names = marks } } }
end

-- A level across the picture.
local function level(x, value, name)
  return { kind = "line", role = "limit", x = { x.least, x.most }, y = { value, value },
           name = name }
end

function pictures.sine(r)
  local x = { label = "frequency", unit = "Hz", least = 0, most = r.rate:number() / 2 }
  local rows = { r }
  if r.hz > x.most then x.most = r.hz * 1.05 end
  return { title = ("sine fit, %d parameters"):format(r.parameters), below = place_text(r),
    panels = { { x = x, y = amplitude(r), curves = { points(rows, "hz", with_limits),
      level(x, r.residual_rms, "what is left, rms") } } } }
end

function pictures.joint(r)
  return { title = ("joint fit of %d lines"):format(#r.lines),
    below = ("%s; what is left: %.4g %s rms"):format(place_text(r), r.residual_rms, r.unit),
    panels = { { x = frequency(true), y = amplitude(r), names = names(r.lines),
                 curves = { points(r.lines, "hz", with_limits) } } } }
end

function pictures.orders(r)
  local most = 0
  for _, l in ipairs(r.lines) do most = math.max(most, 1.05 * l.order) end
  return { title = ("%d orders of a shaft at %.6g Hz"):format(#r.lines, r.speed_hz),
    below = ("%s; what is left: %.4g %s rms"):format(place_text(r), r.residual_rms, r.unit),
    panels = { { x = { label = "order", unit = "per turn", least = 0, most = most },
                 y = amplitude(r),
                 curves = { points(r.lines, "order", with_limits) } } } }
end

function pictures.synchronous(r)
  local x, y, low, high = {}, {}, {}, {}
  for i, p in ipairs(r.points) do
    local u = WIDE * (p.u_mean or 0)
    x[i], y[i], low[i], high[i] = p.angle_turns, p.mean, p.mean - u, p.mean + u
  end
  local curves = { { kind = "line", x = x, y = y, name = "mean over the turns" } }
  if r.turns > 1 then
    curves[2] = { kind = "band", x = x, low = low, high = high,
                  name = "+- 2 standard uncertainties" }
  end
  return { title = ("synchronous average of %d turns at %.6g Hz"):format(r.turns, r.speed_hz),
    below = ("%s; turns scatter by %.4g %s rms"):format(place_text(r), r.deviation_rms, r.unit),
    panels = { { x = { label = "angle since the pulse", unit = "turn", least = 0, most = 1 },
                 y = { label = "mean", unit = r.unit }, curves = curves } } }
end

function pictures.quality(r)
  local x = { label = "frequency in the record", unit = "Hz", least = 0,
              most = r.rate:number() / 2 }
  local harmonics = {}
  for _, h in ipairs(r.harmonics) do
    if h.amplitude then
      harmonics[#harmonics + 1] = h
    end
  end
  local spur = { { hz = r.spur.hz, amplitude = r.spur.amplitude } }
  return { title = "one sine and what else there is",
    below = ("%s; THD %.2f dB, SINAD %.2f dB, %.2f effective bits (from SINAD)"):format(
      place_text(r), r.thd_db, r.sinad_db, r.effective_bits.of_sinad),
    panels = { { x = x, y = amplitude(r), curves = {
      points({ r }, "hz", with_limits), points(harmonics, "appears_hz", with_limits),
      points(spur, "hz", "highest spur", "other"),
      level(x, r.noise_rms, "noise without harmonics, rms") } } } }
end

--- What is drawn of a result of lines.
function M.picture(r)
  return pictures[r.kind](r)
end

--- Gives results of lines their pictures.
function M.results(class)
  return attach(class, { picture = M.picture })
end

return M
