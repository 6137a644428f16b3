--- What repeats inside a record: cepstrum, envelope of a band, spectral kurtosis.

local libration = require "libration.core"
local input = require "libration.bands.input"
local options = require "libration.options"
local shown = require "libration.bands.shown"
local windows = require "libration.window"

local core, transform = libration.bands, libration.spectrum

local M = {}

local MOST_ROWS = 10 -- of a result that is printed

-- The largest local maxima from index `from` on, largest first: their indices.
local function peaks(values, from)
  local list = {}
  for i = from, #values do
    local v = values[i]
    if v > (i > 1 and values[i - 1] or -math.huge) and v >= (values[i + 1] or -math.huge) then
      list[#list + 1] = i
    end
  end
  table.sort(list, function(a, b)
    return values[a] > values[b] or values[a] == values[b] and a < b
  end)
  return table.move(list, 1, MOST_ROWS, 1, {})
end

local function printed(title, head, values, from, row)
  local lines = { title, head }
  for _, i in ipairs(peaks(values, from)) do
    lines[#lines + 1] = row(i)
  end
  return table.concat(lines, "\n")
end

local Cepstrum = { __name = "libration.cepstrum" }
Cepstrum.__index = Cepstrum

function Cepstrum:__tostring()
  local half = self.values:slice(1, #self.values // 2 + 1)
  return printed(("%s, %s window, %.6g s apart: the largest of %d"):format(self.kind, self.window,
    self.step_s, #half), ("  %14s %14s %12s"):format("quefrency s", "1 / it, Hz", "value"), half, 2,
    function(i)
      local at = (i - 1) * self.step_s
      return ("  %14.8g %14.6f %12.6g"):format(at, 1 / at, half[i])
    end)
end

local EnvelopeSpectrum = { __name = "libration.envelope_spectrum" }
EnvelopeSpectrum.__index = EnvelopeSpectrum

function EnvelopeSpectrum:__tostring()
  return printed(("envelope%s of %g .. %g Hz, %s window, lines %.6g Hz apart, mean %.6g %s"):format(
    self.squared and " squared" or "", self.from_hz, self.to_hz, self.window, self.step_hz,
    self.mean, self.unit), ("  %14s %14s"):format("Hz", "peak " .. self.unit), self.amplitude, 2,
    function(i)
      return ("  %14.6f %14.6g"):format((i - 1) * self.step_hz, self.amplitude[i])
    end)
end

local Kurtosis = { __name = "libration.spectral_kurtosis" }
Kurtosis.__index = Kurtosis

function Kurtosis:__tostring()
  return printed(("%s, %d segments%s, %s window, lines %.6g Hz apart; noise: %.3g +- %.3g"):format(
    self.kind, self.segments, self.independent and "" or " that overlap", self.window,
    self.step_hz, self.noise_mean, self.noise_sigma), ("  %14s %12s"):format("Hz", "kurtosis"),
    self.values:slice(1, #self.values - 1), 2, function(i)
      return ("  %14.6f %12.4f"):format((i - 1) * self.step_hz, self.values[i])
    end)
end

shown.repeats(Cepstrum, EnvelopeSpectrum, Kurtosis)

local cepstrum_schema = input.schema {
  kind = { options.choice { "real", "power" }, default = "real" },
  floor = { options.number { least = 0, most = 1 }, default = 0 },
  window = { input.window },
}

function M.cepstrum(x, spec)
  local read = options.take(cepstrum_schema, spec, "cepstrum")
  local samples, rate = input.signal(x, read, "cepstrum")
  if read.window then
    samples = samples * read.window:samples(#samples)
  end
  local values, message, code = core.cepstrum(samples, read.kind, read.floor)
  if not values then
    return nil, message, code
  end
  return setmetatable({ kind = read.kind .. " cepstrum", unit = "1", values = values,
    step_s = 1 / rate, window = read.window and read.window.name or "rectangular",
    floor = read.floor }, Cepstrum)
end

local function band_fields()
  return { from_hz = { input.hertz_or_zero, required = true },
           to_hz = { input.hertz, required = true } }
end

local envelope_schema = input.schema(band_fields())

-- The envelope of the band; nil and why.
local function envelope_of(samples, rate, read, what)
  if read.to_hz < read.from_hz then
    error(("%s: to_hz is %g, below from_hz, %g"):format(what, read.to_hz, read.from_hz), 0)
  elseif #samples < 4 then
    return nil, ("%s: %d samples hold no band; at least 4"):format(what, #samples), "domain"
  elseif read.to_hz > rate / 2 then
    return nil, ("%s: to_hz is %g; half the rate is %g"):format(what, read.to_hz, rate / 2),
      "domain"
  end
  local step = rate / #samples
  if math.floor(read.to_hz / step) < math.ceil(read.from_hz / step) then
    return nil, ("%s: no line lies in %g .. %g Hz; they are %g Hz apart"):format(what,
      read.from_hz, read.to_hz, step), "domain"
  end
  local re, im = core.analytic(samples, read.from_hz / rate, read.to_hz / rate)
  return core.magnitudes(re, im)
end

function M.envelope(x, spec)
  local read = options.take(envelope_schema, spec, "envelope")
  local samples, rate = input.signal(x, read, "envelope")
  return envelope_of(samples, rate, read, "envelope")
end

local spectrum_schema = input.schema(band_fields())
spectrum_schema.squared = { options.boolean(), default = false }
spectrum_schema.window = { input.window, default = windows.window "hann" }

function M.envelope_spectrum(x, spec)
  local read = options.take(spectrum_schema, spec, "envelope_spectrum")
  local samples, rate, unit = input.signal(x, read, "envelope_spectrum")
  local envelope, message, code = envelope_of(samples, rate, read, "envelope_spectrum")
  if not envelope then
    return nil, message, code
  end
  local n = #envelope
  if read.squared then
    envelope = envelope * envelope
  end
  local mean, window = envelope:mean(), read.window:samples(n)
  local re, im = transform.windowed(envelope - mean, window)
  local amplitude = core.magnitudes(re, im):scale(2 / window:sum())
  amplitude[1] = amplitude[1] / 2
  if n % 2 == 0 then
    amplitude[-1] = amplitude[-1] / 2
  end
  return setmetatable({ kind = "line amplitude, peak",
    unit = read.squared and ("(%s)^2"):format(unit) or unit,
    amplitude = amplitude, step_hz = rate / n, mean = mean, window = read.window.name,
    squared = read.squared, from_hz = read.from_hz, to_hz = read.to_hz }, EnvelopeSpectrum)
end

local kurtosis_schema = input.schema {
  segment = { options.integer(2, 1 << 27), required = true },
  hop = { options.integer(1, 1 << 27) },
  window = { input.window, default = windows.window "hann" },
  unbiased = { options.boolean(), default = true },
}

function M.kurtosis(x, spec)
  local read = options.take(kurtosis_schema, spec, "kurtosis")
  local samples, rate = input.signal(x, read, "kurtosis")
  local hop = read.hop or read.segment
  local segments = #samples < read.segment and 0 or (#samples - read.segment) // hop + 1
  if segments < 2 then
    return nil, ("kurtosis: %d samples hold %d segments of %d; at least 2"):format(#samples,
      segments, read.segment), "domain"
  end
  local values, power, k = core.kurtosis(samples, read.window:samples(read.segment), hop,
    read.unbiased)
  return setmetatable({
    kind = "spectral kurtosis, " .. (read.unbiased and "unbiased" or "plain"),
    unit = "1", values = values, power = power, step_hz = rate / read.segment, segments = k,
    independent = hop >= read.segment, window = read.window.name,
    noise_mean = read.unbiased and 0 or -2 / (k + 1),
    noise_sigma = math.sqrt(4 * k * k / ((k - 1) * (k + 2) * (k + 3)))
      * (read.unbiased and 1 or (k - 1) / (k + 1)) }, Kurtosis)
end

return M
