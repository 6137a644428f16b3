-- What is drawn and tabled of averaged spectra, cross spectra, coherences and
-- responses.

local attach = require("libration.report.result").attach

local M = {}

local CONFIDENCE = 0.95
local SIGMAS = 1.96 -- of a normal distribution's 95 %

local frequency = { label = "frequency", unit = "Hz" }

local function frequencies(r, count)
  local out = {}
  for k = 1, count do out[k] = r:hz(k) end
  return out
end

local function setting_text(r)
  local worth = r.averages and (", worth %.4g averages"):format(r.averages) or ""
  return ("%s S/s, %d segments of %d samples%s, window %s, noise bandwidth %.5g Hz"):format(
    tostring(r.rate), r.segments, r.length, worth, r.window.name, r.bandwidth_hz)
end

local function quantity(s)
  local what = s.kind == "density" and s.quantity .. " density" or s.quantity
  return s.quantity == "amplitude" and what .. ", " .. s.scale or what
end

-- Confidence limits of every bin; nil where there are none.
local function limits(s)
  local low, high = s:limits(CONFIDENCE)
  if not low then return nil end
  local l, h, n = s.values * low, s.values * high, #s.values
  for _, k in ipairs { 1, n } do
    if k == 1 or 2 * (k - 1) == s.points then
      low, high = s:limits(CONFIDENCE, k)
      l[k], h[k] = s.values[k] * low, s.values[k] * high
    end
  end
  return l, h
end

local function spectrum_picture(s)
  local x, curves = frequencies(s, #s.values), {}
  local low, high = limits(s)
  if low then
    curves[1] = { kind = "band", name = "95 % confidence limits for noise", x = x, low = low,
                  high = high }
  end
  curves[#curves + 1] = { kind = "line", x = x, y = s.values,
    name = (s.averaging == "peak" and "largest" or s.averaging) .. " of the segments" }
  return { title = ("%s: %s spectrum"):format(s.name or "samples", s.kind), below = setting_text(s),
    panels = { { x = frequency, curves = curves,
                 y = { label = quantity(s), unit = s.unit, log = true } } } }
end

local function spectrum_table(s)
  local heads, rows = { "frequency (Hz)", ("%s (%s)"):format(quantity(s), s.unit) }, {}
  local low, high = limits(s)
  if low then
    heads[3] = ("lower 95 %% limit (%s)"):format(s.unit)
    heads[4] = ("upper 95 %% limit (%s)"):format(s.unit)
  end
  for k = 1, #s.values do
    rows[k] = { s:hz(k), s.values[k], low and low[k], high and high[k] }
  end
  return heads, rows
end

local integers = { "length", "step", "points", "segments", "sides", "from", "to" }

--- Gives averaged spectra their presentation.
function M.spectrum(class)
  return attach(class, { picture = spectrum_picture, table = spectrum_table, rate = true,
    samples = { "values" }, integers = integers })
end

local function phases(r)
  local out = {}
  for k = 1, #r.re do out[k] = math.atan(r.im[k], r.re[k]) end
  return out
end

local phase_axis = { label = "phase", unit = "rad", least = -3.4, most = 3.4 }

local function pair_title(r, what)
  return ("%s from %s to %s"):format(what, r.from_name, r.to_name)
end

local function cross_picture(r)
  local x = frequencies(r, #r.re)
  return { title = pair_title(r, r.kind .. " cross spectrum"), below = setting_text(r), panels = {
    { x = frequency, y = { label = "size", unit = r.unit, log = true }, share = 2,
      curves = { { kind = "line", x = x, y = r:size(), name = "size of the mean of conj(X) Y" } } },
    { x = frequency, y = phase_axis,
      curves = { { kind = "dots", role = "other", x = x, y = phases(r),
                   name = "phase, negative where the second comes later" } } } } }
end

local function cross_table(r)
  local rows = {}
  for k = 1, #r.re do rows[k] = { r:hz(k), r.re[k], r.im[k] } end
  return { "frequency (Hz)", ("real part (%s)"):format(r.unit),
           ("imaginary part (%s)"):format(r.unit) }, rows
end

-- Coherence with the level that unrelated channels stay below.
local function coherence_panel(r, x, values)
  local level = 1 - (1 - CONFIDENCE) ^ (1 / (r.averages - 1))
  return { x = frequency, y = { label = "coherence", unit = "1", least = 0, most = 1.05 },
    curves = {
      { kind = "line", x = x, y = values, name = "coherence" },
      { kind = "line", role = "limit", x = { x[1], x[#x] }, y = { level, level },
        name = "unrelated channels stay below in 95 % of cases" } } }
end

local function coherence_picture(r)
  return { title = pair_title(r, "coherence"), below = setting_text(r),
           panels = { coherence_panel(r, frequencies(r, #r.values), r.values) } }
end

local function coherence_table(r)
  local rows = {}
  for k = 1, #r.values do rows[k] = { r:hz(k), r.values[k] } end
  return { "frequency (Hz)", "coherence (1)" }, rows
end

-- Gain and phase with limits of 95 % for their random errors.
local function response_lists(r)
  local err, out = r:random_error(), { gain = r:gain(), phase = phases(r) }
  for _, name in ipairs { "low", "high", "early", "late" } do out[name] = {} end
  for k = 1, #out.gain do
    local share = SIGMAS * err[k]
    local turn = share < 1 and math.asin(share) or math.pi
    out.low[k], out.high[k] = out.gain[k] * math.max(0, 1 - share), out.gain[k] * (1 + share)
    out.early[k], out.late[k] = out.phase[k] - turn, out.phase[k] + turn
  end
  return out, err
end

-- The limits of a phase that reach over half a turn, seen from the other side.
local function turned(x, l)
  local out = { kind = "band", role = "other", x = x, low = {}, high = {}, wrap = 3 }
  for k = 1, #x do
    local shift = l.late[k] > math.pi and -2 * math.pi or l.early[k] < -math.pi and 2 * math.pi
      or 0 / 0
    out.low[k], out.high[k] = l.early[k] + shift, l.late[k] + shift
  end
  return out
end

local function response_picture(r)
  local x, l = frequencies(r, #r.re), response_lists(r)
  local title = pair_title(r, ("response (%s)"):format(r.estimate))
  return { title = title, below = setting_text(r), panels = {
    { x = frequency, y = { label = "gain", unit = r.unit, log = true }, share = 1.6,
      curves = { { kind = "band", x = x, low = l.low, high = l.high,
                   name = "95 % limits of the random error" },
                 { kind = "line", x = x, y = l.gain, name = "gain" } } },
    { x = frequency, y = phase_axis,
      curves = { turned(x, l),
                 { kind = "band", role = "other", x = x, low = l.early, high = l.late, wrap = 3,
                   name = "the same of the phase" },
                 { kind = "dots", role = "other", x = x, y = l.phase, name = "phase" } } },
    coherence_panel(r, x, r.coherence) } }
end

local function response_table(r)
  local rows, gain, err = {}, r:gain(), r:random_error()
  for k = 1, #r.re do
    rows[k] = { r:hz(k), r.re[k], r.im[k], gain[k], math.atan(r.im[k], r.re[k]), r.coherence[k],
                err[k] }
  end
  return { "frequency (Hz)", ("real part (%s)"):format(r.unit),
           ("imaginary part (%s)"):format(r.unit), ("gain (%s)"):format(r.unit), "phase (rad)",
           "coherence (1)", "random error of the gain, relative (1)" }, rows
end

--- Gives cross spectra, coherences and responses their presentation.
function M.cross(cross, coherence, response)
  attach(cross, { picture = cross_picture, table = cross_table, samples = { "re", "im" },
    rate = true, integers = integers })
  attach(coherence, { picture = coherence_picture, table = coherence_table, rate = true,
    samples = { "values" }, integers = integers })
  attach(response, { picture = response_picture, table = response_table, rate = true,
    samples = { "re", "im", "coherence" }, integers = integers })
end

return M
