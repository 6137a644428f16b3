-- Distortion and noise beside one sine: THD, SINAD, effective bits, spurs.

local core = require("libration.core").lines
local options = require "libration.options"
local record = require "libration.record"
local result = require "libration.lines.result"
local round = require("libration.report.numbers").round
local sine = require "libration.lines.sine"
local source = require "libration.lines.source"
local window = require("libration.window").window

local M = {}

local LEAST = 256      -- samples
local FLOOR_BINS = 51  -- of the floor in which spurs are looked for
local GUARD = 4        -- half main lobe of the window used for that
local NEAR = 12        -- bins beside the fundamental in which its skirt stands
local TURNS = 2        -- of fitting the fundamental and the harmonics
local CYCLES = 5       -- that a record should hold

local schema = source.schema {
  hz = { source.hertz }, near_hz = { source.hertz },
  harmonics = { options.integer(2, 100), default = 10 },
  full_scale = { options.number { above = 0 } },
}

local function db(ratio) return 20 * math.log(ratio, 10) end

--- Where a frequency appears in the record: 0 to half the rate.
function M.fold(hz, rate)
  return math.abs(hz - rate * math.floor(hz / rate + 0.5))
end

-- Harmonics with their places. One that falls within a bin of 0, half the rate,
-- the fundamental or a lower harmonic cannot be measured apart from it.
local function place_harmonics(f, rate, n, most)
  local bin, taken, out = rate / n, { M.fold(f, rate) }, {}
  for h = 2, most do
    local at, hidden = M.fold(h * f, rate), nil
    if at < bin then hidden = "0 Hz" end
    if rate / 2 - at < bin then hidden = "half the rate" end
    for i, other in ipairs(taken) do
      if math.abs(at - other) < bin then
        hidden = i == 1 and "the fundamental" or "another harmonic"
      end
    end
    out[#out + 1] = { harmonic = h, hz = h * f, appears_hz = at, hidden_by = hidden }
    taken[#taken + 1] = at
  end
  return out
end

local function read_harmonics(from, f, harmonics)
  local lines = { { hz = f } }
  for _, h in ipairs(harmonics) do
    if not h.hidden_by then lines[#lines + 1] = { hz = h.appears_hz, harmonic = h } end
  end
  local fitted, rest, code = sine.fit_lines(from, lines)
  if not fitted then return nil, rest, code end
  for i, line in ipairs(lines) do
    if line.harmonic then
      line.harmonic.amplitude, line.harmonic.u_amplitude = fitted[i].amplitude,
        fitted[i].u_amplitude
      line.harmonic.db = db(fitted[i].amplitude / fitted[1].amplitude)
    end
  end
  return fitted, rest
end

-- Harmonic distortion and its uncertainty, relative to the fundamental.
local function distortion(harmonics, fundamental)
  local sum, spread = 0, 0
  for _, h in ipairs(harmonics) do
    if h.amplitude then
      sum = sum + h.amplitude ^ 2
      spread = spread + (h.amplitude * h.u_amplitude) ^ 2
    end
  end
  local total = sum ^ 0.5
  return total / fundamental, total > 0 and spread ^ 0.5 / total / fundamental or 0
end

-- Peaks of what is left without the fundamental, and its highest reading.
local function spurs(left, rate)
  local n = #left
  local w = window("blackman_harris4"):samples(n)
  local peaks, power = core.peaks(left, w, n, FLOOR_BINS, GUARD, 0.01)
  if not peaks then return nil, power end
  local top, k = 0, peaks.first
  for j = peaks.first, peaks.last do
    if power[j + 1] > top then top, k = power[j + 1], j end
  end
  local tracker <close> = core.tracker(w, { (k - 1) / n, (k + 1) / n })
  local flat = tracker:run(left)
  return { hz = flat[2] * rate, amplitude = flat[1], bin = k }, peaks
end

local function name_spur(spur, harmonics, rate, n)
  for _, h in ipairs(harmonics) do
    if math.abs(h.appears_hz - spur.hz) < rate / n then spur.harmonic = h.harmonic end
  end
end

local function common_factor(a, b)
  while b > 0 do a, b = b, a % b end
  return a
end

local function warn(out, text, ...)
  out[#out + 1] = text:format(...)
end

local function warnings_of(f, rate, n, peaks, harmonics)
  local out, cycles = {}, M.fold(f, rate) / rate * n
  local turns = math.floor(cycles + 0.5)
  if cycles < CYCLES then
    warn(out, "only %.3g cycles: %d or more are common practice", cycles, CYCLES)
  elseif math.abs(cycles - turns) < 1e-3 and common_factor(turns, n) > 1 then
    local times = common_factor(turns, n)
    warn(out, "%d cycles in %d samples repeat %d times: only %d different samples", turns, n,
      times, n // times)
  end
  local near = 0
  for _, k in ipairs(peaks) do
    if math.abs(k - cycles) <= NEAR then near = near + 1 end
  end
  if near > 0 then
    warn(out, "limited by leakage: the fundamental is no steady sine, its skirt stands in the "
      .. "residual and counts as noise and distortion")
  end
  for _, h in ipairs(harmonics) do
    if h.hidden_by then
      warn(out, "harmonic %d falls on %s and is not in the distortion", h.harmonic, h.hidden_by)
    end
  end
  return out
end

local function full_scale_of(what, read, from)
  if read.full_scale or not record.is(what) then return read.full_scale end
  return what.channels[from.channel].full_scale
end

-- Effective bits by both conventions: from the residual and the full scale (IEEE Std 1057-2017),
-- and from SINAD as if the sine filled the full scale.
local function bits_of(nad, sinad_db, full_scale)
  return {
    of_full_scale = full_scale and math.log(2 * full_scale / (nad * 12 ^ 0.5), 2) or nil,
    of_sinad = (sinad_db - 10 * math.log(1.5, 10)) / (20 * math.log(2, 10)),
  }
end

-- Fits of fundamental and harmonics in turns: harmonics shift the fit of the
-- fundamental a little, and its frequency gives theirs.
local function settle(from, read, fit)
  local rate, f = from.rate:number(), fit.hz
  for _ = 1, TURNS do
    local harmonics = place_harmonics(f, rate, #from.x, read.harmonics)
    local lines, rest, code = read_harmonics(from, f, harmonics)
    if not lines then return nil, rest, code end
    local flat = {}
    for i = 2, #lines do
      table.move({ lines[i].hz / rate, lines[i].amplitude, lines[i].phase }, 1, 3, #flat + 1, flat)
    end
    local clean = core.without(from.x, 0, flat)
    local alone, message, refused = core.sine4(clean, f / rate)
    if read.hz then alone, message, refused = core.sine3(clean, f / rate) end
    if not alone then return nil, message, refused end
    f = alone.frequency * rate
    fit = { f = f, harmonics = harmonics, rest = rest, alone = alone }
  end
  return fit
end

local function measure(what, read, from, fit)
  local rate, n = from.rate:number(), #from.x
  local settled, reason, code = settle(from, read, fit)
  if not settled then return nil, reason, code end
  local f, harmonics, rest, alone = settled.f, settled.harmonics, settled.rest, settled.alone
  local left = core.without(from.x, alone.offset, { f / rate, alone.amplitude, alone.phase })
  local spur, peaks = spurs(left, rate)
  if not spur then return nil, peaks, "domain" end
  name_spur(spur, harmonics, rate, n)
  spur.db = db(spur.amplitude / fit.amplitude)
  local thd, u_thd = distortion(harmonics, fit.amplitude)
  local nad, rms = fit.residual_rms, fit.amplitude / 2 ^ 0.5
  local sinad = db(rms / nad)
  local full_scale = full_scale_of(what, read, from)
  return result.new("quality", result.facts(from, {
    hz = f, u_hz = fit.u_hz, amplitude = fit.amplitude, u_amplitude = fit.u_amplitude,
    offset = fit.offset, harmonics = harmonics, thd = thd, u_thd = u_thd, thd_db = db(thd),
    residual_rms = nad, thd_plus_noise = nad / rms, sinad_db = sinad,
    u_sinad_db = 20 / math.log(10) * ((fit.u_amplitude / fit.amplitude) ^ 2 + 0.5 / (n - 4)) ^ 0.5,
    noise_rms = rest.rms, snr_db = db(rms / rest.rms), full_scale = full_scale,
    effective_bits = bits_of(nad, sinad, full_scale), spur = spur, spurious_free_db = -spur.db,
    warnings = warnings_of(f, rate, n, peaks, harmonics),
  }))
end

--- See lines.quality.
function M.quality(what, given)
  local read = options.take(schema, given, "quality")
  local from = source.take(what, read, "quality")
  if #from.x < LEAST then
    return nil, ("quality: %d samples; %d or more are needed"):format(#from.x, LEAST), "domain"
  end
  local fit, message, code = sine.sine(what, { hz = read.hz, near_hz = read.near_hz,
    channel = read.channel, rate = read.rate, unit = read.unit })
  if not fit then return nil, message, code end
  if not (fit.residual_rms > 0) then
    return nil, "quality: nothing is left beside the sine", "domain"
  end
  return measure(what, read, from, fit)
end

local function figure_rows(r)
  local bits = r.effective_bits
  local spur = r.spur.harmonic and ("harmonic %d"):format(r.spur.harmonic) or "no harmonic"
  local rows = {
    { "fundamental", r.hz, r.u_hz, "Hz" },
    { "amplitude (peak)", r.amplitude, r.u_amplitude, r.unit },
    { "THD", r.thd_db, nil, "dB" }, { "THD", 100 * r.thd, 100 * r.u_thd, "%" },
    { "THD + noise", 100 * r.thd_plus_noise, nil, "%" },
    { "SINAD", r.sinad_db, r.u_sinad_db, "dB" }, { "SNR (no harmonics)", r.snr_db, nil, "dB" },
    { "spurious-free range", r.spurious_free_db, nil, "dB" },
    { "highest spur, " .. spur, r.spur.hz, nil, "Hz" },
    { "effective bits, of full scale", bits.of_full_scale, nil, "bit" },
    { "effective bits, from SINAD", bits.of_sinad, nil, "bit" },
  }
  local out = {}
  for _, row in ipairs(rows) do
    if row[2] then
      out[#out + 1] = { quantity = row[1], value = row[2], standard_uncertainty = row[3],
                        unit = row[4] }
    end
  end
  return out
end

local function text(r)
  local rows, notes = {}, {}
  for i, q in ipairs(figure_rows(r)) do
    rows[i] = { q.quantity, q.standard_uncertainty and result.with(q.value, q.standard_uncertainty)
                  or round(q.value, 5), result.u(q.standard_uncertainty), q.unit }
  end
  for _, h in ipairs(r.harmonics) do
    notes[#notes + 1] = ("  harmonic %2d: %12s Hz appears at %12s Hz%s"):format(h.harmonic,
      round(h.hz, 8), round(h.appears_hz, 8), h.db and (", %7.2f dB"):format(h.db)
      or ", hidden by " .. h.hidden_by)
  end
  for _, warning in ipairs(r.warnings) do notes[#notes + 1] = "  warning: " .. warning end
  return result.page(("one sine and what else there is: %s"):format(result.origin(r)),
    { { head = "quantity" }, { head = "value", align = "point" },
      { head = "u (k=1)", align = "point" }, { head = "unit" } }, rows, notes)
end

result.define("quality", { text = text, rows = figure_rows,
  columns = { "quantity", "value", "standard_uncertainty", "unit" } })

return M
