-- Fits of one sine and of many known lines as results.

local core = require("libration.core").lines
local options = require "libration.options"
local result = require "libration.lines.result"
local source = require "libration.lines.source"

local M = {}

local sine_schema = source.schema {
  hz = { source.hertz }, near_hz = { source.hertz },
}

local function fit_of(from, read, rate)
  if read.hz then
    return core.sine3(from.x, read.hz / rate)
  end
  return core.sine4(from.x, read.near_hz and read.near_hz / rate)
end

--- See lines.sine.
function M.sine(what, given)
  local read = options.take(sine_schema, given, "sine")
  if read.hz and read.near_hz then
    error("sine: hz (known) or near_hz (a start), not both", 0)
  end
  local from = source.take(what, read, "sine")
  local rate = from.rate:number()
  local fit, message, code = fit_of(from, read, rate)
  if not fit then return nil, message, code end
  return result.new("sine", result.facts(from, {
    parameters = read.hz and 3 or 4, rounds = fit.rounds,
    hz = read.hz or fit.frequency * rate, u_hz = fit.u_frequency * rate,
    amplitude = fit.amplitude, u_amplitude = fit.u_amplitude,
    phase = fit.phase, u_phase = fit.u_phase,
    start_phase = fit.start_phase, u_start_phase = fit.u_start_phase,
    offset = fit.offset, u_offset = fit.u_offset, residual_rms = fit.rms,
  }))
end

local quantities = {
  { "frequency", "hz", "Hz" }, { "amplitude (peak)", "amplitude" },
  { "phase at the centre", "phase", "rad" }, { "phase at the start", "start_phase", "rad" },
  { "offset", "offset" },
}

local function sine_rows(r)
  local rows = {}
  for i, q in ipairs(quantities) do
    rows[i] = { quantity = q[1], value = r[q[2]], standard_uncertainty = r["u_" .. q[2]],
                unit = q[3] or r.unit }
  end
  rows[#rows + 1] = { quantity = "residual (rms)", value = r.residual_rms, unit = r.unit }
  return rows
end

local function sine_text(r)
  local rows = {}
  for i, q in ipairs(sine_rows(r)) do
    rows[i] = { q.quantity, result.with(q.value, q.standard_uncertainty),
                result.u(q.standard_uncertainty), q.unit }
  end
  return result.page(("sine fit, %d parameters: %s"):format(r.parameters, result.origin(r)),
    { { head = "quantity" }, { head = "value", align = "point" },
      { head = "u (k=1)", align = "point" }, { head = "unit" } }, rows)
end

result.define("sine", { rows = sine_rows, text = sine_text,
  columns = { "quantity", "value", "standard_uncertainty", "unit" } })

local wanted = options.record {
  hz = { source.hertz, required = true }, name = { options.text(80) },
}

local function line_kind(value, path, mistakes)
  if type(value) == "table" and not getmetatable(value) then
    return wanted(value, path, mistakes)
  end
  local hz = source.hertz(value, path, mistakes)
  return hz and { hz = hz }
end

local joint_schema = source.schema {
  lines = { options.list(line_kind, 1, 512), required = true },
}

--- Joint fit of lines { hz, name } to samples: list of lines, and the rest.
function M.fit_lines(from, lines)
  local rate, f, out = from.rate:number(), {}, {}
  for i, line in ipairs(lines) do f[i] = line.hz / rate end
  if #from.x < 2 * #f + 2 then
    return nil, ("joint fit: %d samples; %d lines need %d"):format(#from.x, #f, 2 * #f + 2),
      "domain"
  end
  local fit <close>, message, code = core.joint(#from.x, f)
  if not fit then return nil, message, code end
  local flat, rest = fit:run(from.x)
  if rest.rms ~= rest.rms then return source.not_finite "joint fit" end
  for i, line in ipairs(lines) do
    out[i] = { name = line.name, hz = line.hz, amplitude = flat[4 * i - 3],
               phase = flat[4 * i - 2], u_amplitude = flat[4 * i - 1], u_phase = flat[4 * i] }
  end
  return out, rest
end

--- See lines.joint.
function M.joint(what, given)
  local read = options.take(joint_schema, given, "joint")
  local from = source.take(what, read, "joint")
  local lines, rest, code = M.fit_lines(from, read.lines)
  if not lines then return nil, rest, code end
  return result.new("joint", result.facts(from, { lines = lines, offset = rest.offset,
    u_offset = rest.u_offset, residual_rms = rest.rms }))
end

local function joint_text(r)
  local rows = {}
  for i, l in ipairs(r.lines) do
    rows[i] = { l.name or tostring(i), ("%.10g"):format(l.hz),
                result.with(l.amplitude, l.u_amplitude), result.u(l.u_amplitude),
                result.with(l.phase, l.u_phase), result.u(l.u_phase) }
  end
  return result.page(("joint fit of %d lines: %s"):format(#rows, result.origin(r)), {
    { head = "line" }, { head = "frequency", unit = "Hz", align = "point" },
    { head = "amplitude", unit = r.unit, align = "point" },
    { head = "u (k=1)", unit = r.unit, align = "point" },
    { head = "phase", unit = "rad", align = "point" },
    { head = "u (k=1)", unit = "rad", align = "point" } }, rows, {
    ("  offset %s +- %s, residual rms %s %s"):format(result.with(r.offset, r.u_offset),
      result.u(r.u_offset), result.u(r.residual_rms), r.unit),
    "  phases: of the cosine at the centre of the record" })
end

result.define("joint", { text = joint_text, rows = function(r) return r.lines end,
  columns = { "name", "hz", "amplitude", "u_amplitude", "phase", "u_phase" } })

return M
