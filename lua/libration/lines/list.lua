-- Lists of lines: peaks above the local floor, read by tracking, with
-- uncertainties from the floor; peaks that leakage explains are set apart.

local core = require("libration.core").lines
local options = require "libration.options"
local result = require "libration.lines.result"
local round = require("libration.report.numbers").round
local source = require "libration.lines.source"
local window = require("libration.window").window

local M = {}

local common = {
  window = { options.text(60), default = "blackman_harris4" },
  parameter = { options.number() },
  segment = { options.integer(64, 1 << 27) },
  overlap = { options.number { least = 0, most = 0.95 }, default = 0.5 },
  false_alarm = { options.number { above = 0, below = 0.5 }, default = 0.01 },
  floor_bins = { options.integer(5, 100001), default = 101 },
}

local function schema_with(extra)
  for name, row in pairs(common) do extra[name] = row end
  return source.schema(extra)
end

local schema = schema_with { most = { options.integer(1, 4096), default = 512 } }

local wanted = options.record {
  name = { options.text(80) }, from_hz = { source.hertz, required = true },
  to_hz = { source.hertz, required = true },
}

local track_schema = schema_with {
  lines = { options.list(wanted, 1, 512), required = true },
}

local LEAK_MARGIN = 2 -- a peak less than this above what leaks there is not a line

-- What a strong line can leave at a distance in bins, half a bin either way.
local function leak(shape, m, bins)
  local low = math.max(math.abs(bins) - 0.5, 0)
  local least, most = shape:range(low, low + 1, m)
  return math.max(math.abs(least), math.abs(most))
end

-- Amplitudes and frequencies by tracking, averaged over the segments; searches
-- are low, high, low, high ... in cycles per sample.
local function track(from, w, m, step, searches)
  local flat = {}
  local tracker <close> = core.tracker(w, searches)
  local segments = 1 + (#from.x - m) // step
  for s = 0, segments - 1 do
    local one = tracker:run(from.x, 1 + s * step)
    for i = 1, #searches // 2 do
      local row = flat[i] or { amplitude = 0, frequency = 0, phase = one[3 * i] }
      row.amplitude = row.amplitude + one[3 * i - 2] / segments
      row.frequency = row.frequency + one[3 * i - 1] / segments
      flat[i] = row
    end
  end
  return flat
end

local function line_of(row, k, floor, facts, rate)
  if not (floor > 0) then return nil end
  local averages = facts.freedom / 2
  -- The floor is the variance of one transform value: sum w^2 times that of a sample.
  local variance = floor / facts.square
  local a = row.amplitude
  local u_f = (2 * variance * facts.tilt / averages) ^ 0.5 / (a * facts.bend * 2 * math.pi)
  local power = (a * facts.sum / 2) ^ 2
  return {
    hz = row.frequency * rate, u_hz = u_f * rate, amplitude = a,
    u_amplitude = (2 * variance * facts.square / averages) ^ 0.5 / facts.sum,
    phase = row.phase, bin = k, over_floor_db = 10 * math.log(power / floor, 10),
    floor_density = (2 * variance / rate) ^ 0.5,
    chance = math.min(1, (facts.last - facts.first + 1)
      * core.chance(facts.freedom, power / floor)),
  }
end

-- Without any noise there is no measure of what stands above it.
local function no_noise(row, rate)
  return nil, ("lines: the floor at %.6g Hz is 0: there is no noise to judge by"):format(
    row.frequency * rate), "domain"
end

-- Sets apart what stronger lines leave in their skirts, and what stands so close
-- to a stronger line that both are one reading.
local function set_apart(lines, shape, m, rate)
  local kept, leaks = {}, {}
  table.sort(lines, function(a, b) return a.amplitude > b.amplitude end)
  for _, line in ipairs(lines) do
    local leaked, nearest = 0, math.huge
    for _, strong in ipairs(kept) do
      local bins = (line.hz - strong.hz) / rate * m
      leaked = leaked + strong.amplitude * leak(shape, m, bins)
      nearest = math.min(nearest, math.abs(bins))
    end
    line.leak = leaked
    local hidden = line.amplitude < LEAK_MARGIN * leaked or nearest < 1
    table.insert(hidden and leaks or kept, line)
  end
  table.sort(kept, function(a, b) return a.hz < b.hz end)
  return kept, #leaks
end

-- Half width of the main lobe, bins: a sum of k cosines and a constant has its
-- first null k + 1 bins off (F. J. Harris 1978, section V).
local function main_lobe(shape)
  if #shape.coefficients > 0 then return #shape.coefficients end
  local figures = shape:figures()
  return math.ceil(figures.first_null or figures.width_6db)
end

local function setup_of(from, read)
  local shape = window(read.window, read.parameter)
  local m = read.segment or #from.x
  if m > #from.x then
    return nil, ("lines: a segment of %d samples; the record has %d"):format(m, #from.x), "domain"
  elseif read.floor_bins % 2 == 0 then
    error("lines: floor_bins is " .. read.floor_bins .. "; it must be odd", 0)
  end
  local guard = main_lobe(shape)
  if m // 2 + 1 < read.floor_bins + 4 * (guard + 1) then
    return nil, ("lines: %d samples are too few for a floor of %d bins; %d would do"):format(m,
      read.floor_bins, 2 * (read.floor_bins + 4 * (guard + 1))), "domain"
  end
  return { shape = shape, m = m, guard = guard,
           step = math.max(1, math.floor(m * (1 - read.overlap) + 0.5)) }
end

--- See lines.list.
function M.list(what, given)
  local read = options.take(schema, given, "lines")
  local from = source.take(what, read, "lines")
  local s, message, code = setup_of(from, read)
  if not s then return nil, message, code end
  local w, rate = s.shape:samples(s.m), from.rate:number()
  local peaks, _, floor = core.peaks(from.x, w, s.step, read.floor_bins, s.guard, read.false_alarm)
  if not peaks then return nil, _, floor end
  if #peaks > read.most then
    return nil, ("lines: %d peaks; most = %d"):format(#peaks, read.most), "domain"
  end
  local lines, searches = {}, {}
  for i, k in ipairs(peaks) do
    searches[2 * i - 1], searches[2 * i] = (k - 1) / s.m, (k + 1) / s.m
  end
  for i, row in ipairs(track(from, w, s.m, s.step, searches)) do
    lines[i] = line_of(row, peaks[i], floor[peaks[i] + 1], peaks, rate)
    if not lines[i] then return no_noise(row, rate) end
  end
  local kept, hidden = set_apart(lines, s.shape, s.m, rate)
  return result.new("lines", result.facts(from, {
    lines = kept, leaks = hidden, window = read.window, segment = s.m, segments = peaks.segments,
    averages = peaks.freedom / 2, false_alarm = read.false_alarm,
    threshold_db = 10 * math.log(peaks.factor, 10), bins_tested = peaks.last - peaks.first + 1,
    first_hz = peaks.first * rate / s.m, last_hz = peaks.last * rate / s.m,
  }))
end

local function text(r)
  local rows = {}
  for i, l in ipairs(r.lines) do
    rows[i] = { result.with(l.hz, l.u_hz), result.u(l.u_hz),
                result.with(l.amplitude, l.u_amplitude), result.u(l.u_amplitude),
                result.u(l.leak), round(l.over_floor_db, 3), round(l.floor_density, 2) }
  end
  local notes = {
    ("  noise alone shows any line with a chance of at most %s (threshold %s dB over the floor)")
      :format(round(r.false_alarm, 2), round(r.threshold_db, 3)),
    ("  %d bins tested, %s to %s Hz; %s, %d segment%s of %d samples"):format(r.bins_tested,
      round(r.first_hz, 4), round(r.last_hz, 6), r.window, r.segments,
      r.segments == 1 and "" or "s", r.segment) }
  if r.leaks > 0 then
    notes[3] = ("  %d peak%s left out: no more than stronger lines leak there"):format(r.leaks,
      r.leaks == 1 and "" or "s")
  end
  return result.page(("%d lines above the floor: %s"):format(#rows, result.origin(r)), {
    { head = "frequency", unit = "Hz", align = "point" },
    { head = "u (k=1)", unit = "Hz", align = "point" },
    { head = "amplitude", unit = r.unit, align = "point" },
    { head = "u (k=1)", unit = r.unit, align = "point" },
    { head = "leaks", unit = r.unit, align = "point" },
    { head = "over floor", unit = "dB", align = "point" },
    { head = "floor", unit = r.unit .. "/sqrt(Hz)", align = "point" } }, rows, notes)
end

-- The searches of the wanted lines; each at most half the rate wide.
local function searches_of(lines, rate)
  local out = {}
  for i, line in ipairs(lines) do
    if line.to_hz < line.from_hz or line.to_hz - line.from_hz > rate / 2 then
      error(("track: lines[%d] from %s to %s Hz; to_hz must be from_hz to from_hz + %s"):format(i,
        tostring(line.from_hz), tostring(line.to_hz), tostring(rate / 2)), 0)
    end
    out[2 * i - 1], out[2 * i] = line.from_hz / rate, line.to_hz / rate
  end
  return out
end

-- The bin in which a frequency appears, kept where the floor is known.
local function bin_of(frequency, m, facts)
  local folded = math.abs(frequency - math.floor(frequency + 0.5))
  return math.max(facts.first, math.min(facts.last, math.floor(folded * m + 0.5)))
end

--- See lines.track.
function M.track(what, given)
  local read = options.take(track_schema, given, "track")
  local from = source.take(what, read, "track")
  local s, message, code = setup_of(from, read)
  if not s then return nil, message, code end
  local rate = from.rate:number()
  local w, searches = s.shape:samples(s.m), searches_of(read.lines, rate)
  local peaks, _, floor = core.peaks(from.x, w, s.step, read.floor_bins, s.guard, read.false_alarm)
  if not peaks then return nil, _, floor end
  local lines = {}
  for i, row in ipairs(track(from, w, s.m, s.step, searches)) do
    local k = bin_of(row.frequency, s.m, peaks)
    local line = line_of(row, k, floor[k + 1], peaks, rate)
    if not line then return no_noise(row, rate) end
    line.name = read.lines[i].name or tostring(i)
    line.at_edge = row.frequency <= searches[2 * i - 1] or row.frequency >= searches[2 * i]
    line.found = line.over_floor_db > 10 * math.log(peaks.factor, 10) and not line.at_edge
    lines[i] = line
  end
  return result.new("tracked", result.facts(from, { lines = lines, window = read.window,
    segment = s.m, segments = peaks.segments, averages = peaks.freedom / 2,
    false_alarm = read.false_alarm, threshold_db = 10 * math.log(peaks.factor, 10) }))
end

local function tracked_text(r)
  local rows = {}
  for i, l in ipairs(r.lines) do
    rows[i] = { l.name, result.with(l.hz, l.u_hz), result.u(l.u_hz),
                result.with(l.amplitude, l.u_amplitude), result.u(l.u_amplitude),
                round(l.over_floor_db, 3), l.found and "" or l.at_edge and "end of its interval"
                  or "not above the noise" }
  end
  return result.page(("%d tracked lines: %s"):format(#rows, result.origin(r)), {
    { head = "line" }, { head = "frequency", unit = "Hz", align = "point" },
    { head = "u (k=1)", unit = "Hz", align = "point" },
    { head = "amplitude", unit = r.unit, align = "point" },
    { head = "u (k=1)", unit = r.unit, align = "point" },
    { head = "over floor", unit = "dB", align = "point" }, { head = "remark" } }, rows, {
    ("  %s, %d segment%s of %d samples; threshold %s dB over the floor"):format(r.window,
      r.segments, r.segments == 1 and "" or "s", r.segment, round(r.threshold_db, 3)) })
end

result.define("tracked", { text = tracked_text, rows = function(r) return r.lines end,
  columns = { "name", "hz", "u_hz", "amplitude", "u_amplitude", "phase", "over_floor_db",
              "floor_density", "found", "at_edge" } })

result.define("lines", { text = text, rows = function(r) return r.lines end,
  columns = { "hz", "u_hz", "amplitude", "u_amplitude", "leak", "phase", "over_floor_db",
              "floor_density", "chance" } })

return M
