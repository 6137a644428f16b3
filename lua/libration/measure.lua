--- Measuring a record by its plan: every line with its uncertainty.
-- A record is read only if it is the record that was planned: its rate, length,
-- unit and freedom from clipping are checked first. Every line then gets its
-- amplitude with the plan's worst-case bound and with a standard uncertainty in
-- the manner of JCGM 100:2008 (systematic bounds as rectangular distributions,
-- a / sqrt 3, clause 4.3.7; random parts as standard deviations; combined in
-- quadrature, clause 5.1; expanded with k = 2).

local core = require "libration.core"
local attach = require("libration.report.result").attach
local record = require "libration.record"
local window = require("libration.window").window

local M = {}

local Measurement = {}
Measurement.__index = Measurement
Measurement.__name = "libration.measurement"

local EXPANDED = 2 -- coverage factor of the expanded uncertainty

local function refuse(code, text, ...)
  return nil, "the record breaks its plan: " .. text:format(...), code
end

local function check_channel(rec, k)
  if k == nil and #rec.channels > 1 then
    return refuse("which_channel", "it has %d channels; say which: channel = 1 to %d",
      #rec.channels, #rec.channels)
  elseif k ~= nil and not rec.channels[k] then
    return refuse("wrong_channel", "channel %s is not there; it has 1 to %d", tostring(k),
      #rec.channels)
  end
  return k or 1
end

-- Rails from the record's own full scale, else from the digitizer's range.
local function check_values(rec, plan, k, values, first)
  local rails = rec:rails(k)
  local range = plan.front.range or math.huge
  if not rails then
    local step = plan.front.step or 0
    rails = core.store.rails(values, -range + step / 2, range - 1.5 * step)
  end
  if rails.bad > 0 then
    return refuse("not_finite", "%d samples are not finite numbers", rails.bad)
  elseif rails.low + rails.high > 0 then
    return refuse("clipped", "%d samples stand at the rails, the first is number %d",
      rails.low + rails.high, rails.first + first - 1)
  end
  return true
end

--- Checks that a record is the one that a plan asks for.
-- @param rec record: what was measured
-- @param plan plan: what was planned
-- @param k integer: channel; needed when the record has several
-- @param first integer: number of the first sample that is read, default 1
-- @return integer: the channel to be read; or nil, message, code: "which_channel",
--   "wrong_channel", "wrong_rate", "too_short", "wrong_unit", "not_finite" or "clipped"
-- @return samples: the values that the plan reads, in the demand's unit; only they are looked at
-- @usage
-- local demand = lb.demand { unit = "V", lines = {
--   { name = "tone", hz = 100, amplitude = "1 V", tolerance = "1 %" } } }
-- local plan = lb.plan(demand, lb.digitizer { rates = { "1 kHz" } })
-- local record = plan:replay { trial = 1 }
-- assert(require("libration.measure").check(record, plan) == 1)
function M.check(rec, plan, k, first)
  local channel, message, code = check_channel(rec, k)
  if not channel then return nil, message, code end
  first = first or 1
  local needed, unit = plan.samples * plan.averages, rec.channels[channel].unit
  if rec.rate ~= plan.rate then
    return refuse("wrong_rate", "it was sampled at %s S/s, the plan says %s S/s",
      tostring(rec.rate), tostring(plan.rate))
  elseif rec.samples - (first - 1) < needed then
    return refuse("too_short", "it has %d samples%s, the plan needs %d", rec.samples,
      first > 1 and (", %d of them from number %d on"):format(math.max(rec.samples - first + 1, 0),
        first) or "", needed)
  elseif unit ~= plan.demand.unit then
    return refuse("wrong_unit", "its unit is %s, the demand's is %s", unit, plan.demand.unit)
  end
  local stretch = rec:part { first = first, count = needed }
  local values = stretch:values(channel)
  local fine
  fine, message, code = check_values(stretch, plan, channel, values, first)
  if not fine then return nil, message, code end
  return channel, values
end

local function make_tracker(plan, rate)
  local searches = {}
  for _, claim in ipairs(plan.claims) do
    searches[#searches + 1] = claim.f_lo / rate
    searches[#searches + 1] = claim.f_hi / rate
  end
  local w = window(plan.window.name, plan.window.parameter):samples(plan.samples)
  return core.lines.tracker(w, searches)
end

-- Whether a search stopped at an end of its interval: what it found may be the
-- skirt of something else, or nothing at all.
local EDGE = 1e-9 -- of the interval's width

local function stopped_at_end(claim, hz)
  local near = EDGE * (claim.f_hi - claim.f_lo)
  return near > 0 and (hz <= claim.f_lo + near or hz >= claim.f_hi - near)
end

-- Amplitudes and frequencies averaged over the plan's consecutive records;
-- phases are those of the first.
local function read_all(plan, values, rate)
  local tracker <close> = make_tracker(plan, rate)
  local out = {}
  for record_number = 1, plan.averages do
    local flat = tracker:run(values, 1 + (record_number - 1) * plan.samples)
    for i = 1, #flat // 3 do
      local line = out[i] or { amplitude = 0, frequency = 0, phase = flat[3 * i] }
      line.amplitude = line.amplitude + flat[3 * i - 2] / plan.averages
      line.frequency = line.frequency + flat[3 * i - 1] / plan.averages
      line.at_edge = line.at_edge or stopped_at_end(plan.claims[i], flat[3 * i - 1] * rate)
      out[i] = line
    end
  end
  return out
end

-- The largest systematic error of a reading: the bound at the largest true
-- amplitude that can have given it.
local function systematic_parts(claim, amplitude)
  local true_most = claim.own < 1 and (amplitude + claim.others) / (1 - claim.own) or math.huge
  return claim.own * true_most, claim.others
end

local function measured_line(plan, i, reading, rate)
  local claim, line, k = plan.claims[i], plan.lines[i], plan.demand.coverage
  local amplitude = reading.amplitude / claim.gain
  local own, others = systematic_parts(claim, amplitude)
  local sigma = (claim.sigma or 0) / plan.averages ^ 0.5
  local standard = (own ^ 2 / 3 + others ^ 2 / 3 + sigma ^ 2) ^ 0.5
  local tracked = claim.f_hi > claim.f_lo
  local sigma_hz = (claim.sigma_hz or 0) / plan.averages ^ 0.5
  local bound = own + others + k * sigma
  local outside = line.least and (amplitude + bound < line.least or amplitude - bound > line.most)
  return {
    name = line.name, amplitude = amplitude, phase = reading.phase, outside = outside or false,
    at_edge = reading.at_edge or false, hz = reading.frequency * rate, tracked = tracked,
    nominal_hz = line.hz,
    bound = bound, systematic = own + others, random = sigma,
    standard = standard, expanded = EXPANDED * standard,
    hz_bound = tracked and claim.hz and claim.hz + k * sigma_hz or nil,
  }
end

-- The number of the first sample; raises for what is no option.
local function check_options(options, level)
  for key in pairs(options) do
    if key ~= "channel" and key ~= "first" then
      error(("measure: unknown option %s; valid are channel, first"):format(tostring(key)), level)
    end
  end
  local first = options.first == nil and 1 or math.tointeger(options.first)
  if not first or first < 1 then
    error(("measure: first is %s; it is a sample number, 1 or more")
      :format(tostring(options.first)), level)
  end
  return first
end

--- Measures every line of a record by a plan's own reading.
-- The record must be the planned one (see check); of a longer one the planned number of samples
-- is read, from sample number first on, and the rest is not looked at. With averages, consecutive
-- records are read and amplitudes and frequencies averaged.
-- @param rec record: what was recorded
-- @param plan plan: the plan it was recorded by
-- @param options table: channel (integer; needed when the record has several), first (number of
--   the first sample read, default 1)
-- @return table: the measurement: unit, rate, samples, averages, identity (of the plan), coverage
--   (k of the bounds), first and last (samples read), recorded (samples that the record has),
--   holds (no line is outside), and lines[i]: name, amplitude (peak), bound (worst error, random
--   part with k), systematic, random (standard deviation), standard and expanded (k = 2)
--   uncertainty, hz (where the line was read) with hz_bound (tracked lines), phase (rad, of the
--   cosine at the centre of the first record, as the digitizer shows it), tracked, outside
--   (boolean: the amplitude is not one the demand allows for, and the bounds do not hold), at_edge
--   (boolean: a search stopped at an end of its interval, so there may be no line); print shows a
--   table; or nil, message, code when the record breaks its plan
-- @usage
-- local demand = lb.demand { unit = "V", lines = {
--   { name = "tone", hz = 100, amplitude = "1 V", tolerance = "1 %" } } }
-- local plan = lb.plan(demand, lb.digitizer { rates = { "1 kHz" } })
-- local record = plan:replay { trial = 1 }
-- local m = assert(record:measure(plan))
-- assert(m.lines[1].name == "tone" and m.lines[1].bound < 0.01)
function M.measure(rec, plan, options)
  local first = check_options(options or {}, 3)
  local channel, values, code = M.check(rec, plan, options and options.channel, first)
  if not channel then return nil, values, code end
  local rate = plan.rate:number()
  local out = { unit = plan.demand.unit, rate = plan.rate, samples = plan.samples,
                averages = plan.averages, identity = plan.identity, channel = channel,
                coverage = plan.demand.coverage, first = first, last = first + #values - 1,
                recorded = rec.samples, holds = true, lines = {} }
  for i, reading in ipairs(read_all(plan, values, rate)) do
    out.lines[i] = measured_line(plan, i, reading, rate)
    out.holds = out.holds and not out.lines[i].outside
  end
  return setmetatable(out, Measurement)
end

--- Measures this record: `record:measure(plan)`; see libration.measure.
-- @param plan plan: the plan it was recorded by
-- @param options table: channel (integer; needed when the record has several), first (number of
--   the first sample read, default 1)
-- @return table: the measurement; or nil, message, code when the record breaks its plan
-- @usage
-- local demand = lb.demand { unit = "V", lines = {
--   { name = "tone", hz = 100, amplitude = "1 V", tolerance = "1 %" } } }
-- local plan = lb.plan(demand, lb.digitizer { rates = { "1 kHz" } })
-- local record = plan:replay { trial = 1 }
-- local short = lb.record.new { rate = 1000, samples = { 0, 0 }, unit = "V" }
-- local m, message, code = short:measure(plan)
-- assert(m == nil and code == "too_short" and record:measure(plan).unit == "V")
function record.Record:measure(plan, options)
  return M.measure(self, plan, options)
end

-- A value to the second significant digit of its uncertainty (JCGM 100:2008, 7.2.6).
local function to_digits(value, uncertainty)
  if not (uncertainty > 0 and uncertainty < math.huge) then
    return ("%.6g"):format(value)
  end
  local places = 1 - math.floor(math.log(uncertainty, 10))
  return places > 0 and places < 12 and ("%." .. places .. "f"):format(value)
    or ("%.6g"):format(value)
end

local function hz_text(line)
  if not line.tracked then return ("%.6g (bin)"):format(line.hz) end
  return line.hz_bound and ("%s +- %.2g"):format(to_digits(line.hz, line.hz_bound), line.hz_bound)
    or ("%.6f"):format(line.hz)
end

--- A measurement as a table that a person reads.
-- @param m table: as measure returns it
-- @return string: a row per line
-- @usage
-- local demand = lb.demand { unit = "V", lines = {
--   { name = "tone", hz = 100, amplitude = "1 V", tolerance = "1 %" } } }
-- local plan = lb.plan(demand, lb.digitizer { rates = { "1 kHz" } })
-- local record = plan:replay { trial = 1 }
-- assert(tostring(record:measure(plan)):find "tone")
function M.text(m)
  local rows = {
    ("Measured by plan %s: %s S/s, %d samples, %d average%s, unit %s"):format(
      tostring(m.identity or "without identity"):sub(1, 12), tostring(m.rate), m.samples,
      m.averages, m.averages == 1 and "" or "s", m.unit),
    ("Read: samples %d..%d of %d"):format(m.first, m.last, m.recorded),
    ("  %-20s %12s %11s %11s %11s  %s"):format("line", "amplitude", "worst +-", "u (k=1)",
      "U (k=2)", "frequency, Hz"),
  }
  local at_edge = false
  for _, l in ipairs(m.lines) do
    at_edge = at_edge or l.at_edge
    rows[#rows + 1] = ("  %-20s %12s %11.2g %11.2g %11.2g  %s"):format(l.name,
      to_digits(l.amplitude, l.expanded), l.bound, l.standard, l.expanded,
      hz_text(l) .. (l.at_edge and "  (edge)" or "") .. (l.outside and "  (*)" or ""))
  end
  if not m.holds then
    rows[#rows + 1] = "(*) outside the amplitudes that were demanded: the bounds do not hold there"
  end
  if at_edge then
    rows[#rows + 1] = "(edge) nothing higher within the interval searched than at its very end:"
      .. " there may be no line"
  end
  rows[#rows + 1] = ("worst: systematic bound and %g standard deviations; u: JCGM 100 style")
    :format(m.coverage)
  return table.concat(rows, "\n")
end

Measurement.__tostring = M.text

local function shown_lists(m)
  local l = { hz = {}, amplitude = {}, low = {}, high = {}, bound = {}, expanded = {}, names = {} }
  for i, line in ipairs(m.lines) do
    l.hz[i], l.amplitude[i], l.bound[i] = line.hz, line.amplitude, line.bound
    l.low[i], l.high[i] = line.amplitude - line.bound, line.amplitude + line.bound
    l.expanded[i] = line.expanded
    l.names[i] = { name = line.name, hz = line.hz, y = line.amplitude,
                   kind = line.outside and "interferer" or "line" }
  end
  return l
end

local function picture(m)
  local l, x = shown_lists(m), { label = "frequency", unit = "Hz", spread = true }
  return { title = "Measured lines",
    below = ("by plan %s: %s S/s, %d samples, averages %d; names in orange: outside the demand")
      :format(tostring(m.identity or "without identity"):sub(1, 12), tostring(m.rate), m.samples,
        m.averages),
    panels = {
      { x = x, y = { label = "peak amplitude", unit = m.unit, log = true }, share = 2,
        names = l.names, curves = { { kind = "points", x = l.hz, y = l.amplitude, low = l.low,
          high = l.high, name = "amplitude, with the most it may be wrong by" } } },
      { x = x, y = { label = "uncertainty", unit = m.unit, log = true }, curves = {
        { kind = "points", role = "limit", x = l.hz, y = l.bound,
          name = ("worst error, k = %g"):format(m.coverage) },
        { kind = "points", role = "other", x = l.hz, y = l.expanded,
          name = "expanded uncertainty, k = 2" } } } } }
end

local function cells(m)
  local rows, head = {}, function(what) return ("%s (%s)"):format(what, m.unit) end
  for i, l in ipairs(m.lines) do
    rows[i] = { l.name, l.hz, l.hz_bound, l.amplitude, l.bound, l.systematic, l.random, l.standard,
                l.expanded, l.phase, l.outside and "yes" or "no" }
  end
  return { "line", "frequency (Hz)", "worst error of it (Hz)", head "peak amplitude",
    head "worst error", head "systematic", head "random, standard deviation",
    head "standard uncertainty", head "expanded uncertainty, k = 2", "phase (rad)",
    "outside the demand" }, rows
end

attach(Measurement, { picture = picture, table = cells,
  integers = { "samples", "averages", "channel" } })

return M
