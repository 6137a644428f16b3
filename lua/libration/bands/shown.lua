-- What is drawn and tabled of band levels, mains groups, cepstra, envelope
-- spectra and spectral kurtosis.

local attach = require("libration.report.result").attach

local M = {}

local frequency = { label = "frequency", unit = "Hz" }

local function column(rows, field)
  local out = {}
  for i, row in ipairs(rows) do out[i] = row[field] end
  return out
end

-- "2 V"; a number alone where the unit is 1.
local function with_unit(form, value, unit)
  return form:format(value) .. (unit == "1" and "" or " " .. unit)
end

local function levels_picture(r)
  local unit = "dB re " .. with_unit("%.6g", r.reference, r.unit)
  local low, high, mid = column(r.bands, "low_hz"), column(r.bands, "high_hz"),
    column(r.bands, "mid_hz")
  return { title = ("1/%d octave levels, %s weighted"):format(r.fraction, r.weighting),
    below = ("%s window, lines %.6g Hz apart; all together %.2f %s, %s rms"):format(r.window,
      r.resolution_hz, r.total_db, unit, with_unit("%.6g", r.total_rms, r.unit)),
    panels = { { x = { label = "frequency, exact edges of the bands", unit = "Hz", log = true,
                       least = low[1], most = high[#high] },
      y = { label = "level", unit = unit },
      curves = { { kind = "bars", x = mid, y = column(r.bands, "db"), from = low, to = high,
                   name = "level of a band" } } } } }
end

local function levels_table(r)
  local rows = {}
  for i, b in ipairs(r.bands) do
    rows[i] = { b.nominal_hz, b.mid_hz, b.low_hz, b.high_hz, b.rms, b.db }
  end
  return { "nominal frequency (Hz)", "exact frequency (Hz)", "lower edge (Hz)", "upper edge (Hz)",
           ("rms (%s)"):format(r.unit),
           ("level (dB re %s)"):format(with_unit("%.17g", r.reference, r.unit)) }, rows
end

--- Gives levels of bands their presentation.
function M.levels(class)
  return attach(class, { picture = levels_picture, table = levels_table,
    integers = { "number", "fraction", "order", "segments", "unused_samples" } })
end

-- Bars of rows beside each other, each from a share to a share of a harmonic's distance.
local function group_bars(rows, centres, mains, from, to, field, role, name)
  local curve = { kind = "bars", role = role, name = name, x = centres, y = column(rows, field),
                  from = {}, to = {} }
  for i, hz in ipairs(centres) do
    curve.from[i], curve.to[i] = hz + from * mains, hz + to * mains
  end
  return curve
end

local function groups_picture(r)
  local at, between, f = column(r.harmonics, "hz"), {}, r.mains_hz
  for i, row in ipairs(r.interharmonics) do between[i] = (row.above_order + 0.5) * f end
  return { title = ("groups of %g Hz mains"):format(f),
    below = ("%d windows of %d cycles, lines %g Hz apart; distortion %.4g %% lines, %.4g %% groups,"
      .. " %.4g %% subgroups"):format(r.windows, r.cycles, r.resolution_hz, 100 * r.thd,
      100 * r.thd_group, 100 * r.thd_subgroup),
    panels = { { x = { label = "frequency", unit = "Hz", least = 0, most = at[#at] + f / 2 },
      y = { label = "rms", unit = r.unit, log = true }, curves = {
        group_bars(r.harmonics, at, f, -0.26, 0.26, "group", "line", "harmonic group"),
        group_bars(r.interharmonics, between, f, -0.16, 0.16, "group", "other",
          "interharmonic group"),
        { kind = "points", role = "floor", x = at, y = column(r.harmonics, "line"),
          name = "harmonic, its line alone" } } } } }
end

local function groups_table(r)
  local rows, head = {}, function(what) return ("%s (%s)"):format(what, r.unit) end
  for i, h in ipairs(r.harmonics) do
    local between = r.interharmonics[i]
    rows[i] = { h.order, h.hz, h.line, h.group, h.subgroup, between.group,
                between.centred_subgroup }
  end
  return { "order (1)", "frequency (Hz)", head "line rms", head "group rms", head "subgroup rms",
           head "interharmonic group below, rms", head "centred subgroup below, rms" }, rows
end

--- Gives groups of mains harmonics their presentation.
function M.groups(class)
  return attach(class, { picture = groups_picture, table = groups_table,
    integers = { "order", "above_order", "mains_hz", "cycles", "windows", "unused_samples" } })
end

local function places(count, step)
  local out = {}
  for k = 1, count do out[k] = (k - 1) * step end
  return out
end

local function step_table(values, step, heads)
  local rows = {}
  for k = 1, #values do rows[k] = { (k - 1) * step, values[k] } end
  return heads, rows
end

local function cepstrum_picture(r)
  local half = r.values:slice(2, math.max(2, #r.values // 2 + 1))
  local x = places(#half + 1, r.step_s)
  table.remove(x, 1) -- quefrency 0 is the mean of the logarithm: off the scale of all others
  return { title = r.kind, below = ("%s window, values %.6g s apart, without quefrency 0"):format(
      r.window, r.step_s),
    panels = { { x = { label = "quefrency", unit = "s" }, y = { label = "cepstrum", unit = r.unit },
      curves = { { kind = "line", x = x, y = half, name = "cepstrum" } } } } }
end

-- To twice the width of the band: a squared envelope has nothing beyond once the width, the
-- envelope itself little.
local function envelope_picture(r)
  local most = math.min((#r.amplitude - 1) * r.step_hz,
    2 * math.max(r.to_hz - r.from_hz, 10 * r.step_hz))
  return { title = ("spectrum of the %senvelope of %g .. %g Hz"):format(
      r.squared and "squared " or "", r.from_hz, r.to_hz),
    below = ("%s window, lines %.6g Hz apart, mean %s removed; shown to %.6g Hz"):format(
      r.window, r.step_hz, with_unit("%.6g", r.mean, r.unit), most),
    panels = { { x = { label = "frequency", unit = "Hz", least = 0, most = most },
      y = { label = "peak amplitude", unit = r.unit, least = 0 },
      curves = { { kind = "line", x = places(#r.amplitude, r.step_hz), y = r.amplitude,
                   name = "amplitude of the lines" } } } } }
end

local function kurtosis_picture(r)
  local x, values = places(#r.values, r.step_hz), r.values
  local last = #x - 1
  local low, high = r.noise_mean - 2 * r.noise_sigma, r.noise_mean + 2 * r.noise_sigma
  local edges = { x[2] or x[1], x[last] or x[1] }
  return { title = r.kind, below = ("%d segments%s, %s window, lines %.6g Hz apart"):format(
      r.segments, r.independent and "" or " that overlap", r.window, r.step_hz),
    panels = { { x = frequency, y = { label = "spectral kurtosis", unit = "1" }, curves = {
      { kind = "band", role = "floor", x = edges, low = { low, low }, high = { high, high },
        name = "stationary noise, two standard deviations" },
      { kind = "line", x = table.move(x, 2, last, 1, {}),
        y = last > 1 and values:slice(2, last) or {}, name = "kurtosis" } } } } }
end

--- Gives cepstra, envelope spectra and kurtosis their presentation.
function M.repeats(cepstrum, envelope, kurtosis)
  attach(cepstrum, { picture = cepstrum_picture, samples = { "values" }, table = function(r)
    return step_table(r.values, r.step_s, { "quefrency (s)", ("cepstrum (%s)"):format(r.unit) })
  end })
  attach(envelope, { picture = envelope_picture, samples = { "amplitude" }, table = function(r)
    return step_table(r.amplitude, r.step_hz, { "frequency (Hz)",
      ("peak amplitude (%s)"):format(r.unit) })
  end })
  attach(kurtosis, { picture = kurtosis_picture, samples = { "values", "power" },
    integers = { "segments" }, table = function(r)
      return step_table(r.values, r.step_hz, { "frequency (Hz)", "spectral kurtosis (1)" })
    end })
end

return M
