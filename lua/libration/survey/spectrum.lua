--- An averaged spectrum that says what it is.
-- Values are one-sided, at bins spacing_hz apart from 0 Hz. kind is "line" (a
-- line's height does not depend on the segment's length) or "density" (noise's
-- height does not); quantity is "power" or "amplitude"; scale is "rms", or
-- "peak" for amplitudes of lines.

local core = require("libration.core").spectrum
local new_samples = require("libration.core").samples.new
local setting = require "libration.survey.setting"
local shown = require "libration.survey.shown"

local M = {}

local Spectrum = {}
Spectrum.__index = Spectrum
Spectrum.__name = "libration.averaged"

--- The methods of an averaged spectrum.
M.Spectrum = Spectrum

local fail = setting.fail

local function squared(unit)
  if unit == "1" then return "1" end
  return unit:find("^[%a%%]+$") and unit .. "^2" or "(" .. unit .. ")^2"
end

-- The unit of the values, from the unit of the samples.
local function unit_of(s)
  local unit = s.quantity == "power" and squared(s.of_unit) or s.of_unit
  if s.kind == "line" then return unit end
  local per = s.quantity == "power" and "/Hz" or "/sqrt(Hz)"
  return unit == "1" and "1" .. per or unit .. per
end

--- Makes an averaged spectrum: the fields of `facts`, and the unit of the values.
-- @param facts table: see survey.averages
-- @return spectrum: with unit filled in
function M.new(facts)
  facts.unit = unit_of(facts)
  return setmetatable(facts, Spectrum)
end

local function changed(s, with)
  local copy = {}
  for key, value in pairs(s) do copy[key] = value end
  for key, value in pairs(with) do copy[key] = value end
  return M.new(copy)
end

local function need(s, field, value, what)
  if s[field] ~= value then
    fail(3, "%s needs a %s of %s; this is one of %s", what, field, value, s[field])
  end
end

--- The frequency of a bin.
-- @param k integer: bin, 1 is 0 Hz
-- @return number: Hz, the exact (k - 1) rate / points rounded once
-- @usage
-- local x = lb.samples.make(64, function(i) return math.sin(i) end)
-- local s = lb.survey.lines(x, { rate = 1000, segment = 32 })
-- assert(s:hz(17) == 500)
function Spectrum:hz(k)
  return (k - 1) * self.rate.numerator / (self.points * self.rate.denominator)
end

--- The frequencies of all bins.
-- @return samples: Hz, as many as there are values
-- @usage
-- local s = lb.survey.lines(lb.samples.new(32), { rate = 8, segment = 32 })
-- assert(s:frequencies()[2] == 0.25)
function Spectrum:frequencies()
  local out = new_samples(#self.values)
  for k = 1, #out do out[k] = self:hz(k) end
  return out
end

--- The bin nearest to a frequency.
-- @param hz number: 0 to half the rate
-- @return integer: bin, from 1
-- @return number: how far the frequency is above its centre, bins
-- @usage
-- local s = lb.survey.lines(lb.samples.new(32), { rate = 8, segment = 32 })
-- assert(s:bin(0.3) == 2)
function Spectrum:bin(hz)
  local at = hz / self.spacing_hz
  local k = math.floor(at + 0.5)
  if not (k >= 0 and k < #self.values) then
    fail(2, "%s Hz is outside 0 to %g Hz", tostring(hz), self:hz(#self.values))
  end
  return k + 1, at - k
end

--- This spectrum of powers as effective (rms) amplitudes: square roots.
-- @return spectrum: quantity "amplitude", scale "rms"; of a density, per root of Hz
-- @usage
-- local x = lb.samples.make(64, math.sin)
-- local s = lb.survey.density(x, { rate = 1, segment = 32, unit = "V" })
-- assert(s:to_rms().unit == "V/sqrt(Hz)" and s:to_rms().values[5] == s.values[5] ^ 0.5)
function Spectrum:to_rms()
  if self.quantity == "amplitude" then
    return self.scale == "rms" and self
      or changed(self, { scale = "rms", values = self.values * 0.5 ^ 0.5 })
  end
  return changed(self, { quantity = "amplitude", scale = "rms", values = core.root(self.values) })
end

--- This line spectrum as peak amplitudes: 1 V stands for a sine of 1 V peak.
-- The bins at 0 Hz and half the rate, too, are root 2 times the effective value there.
-- @return spectrum: quantity "amplitude", scale "peak"
-- @usage
-- local x = lb.samples.make(64, function(i) return 3 * math.cos(math.pi / 4 * i) end)
-- local s = lb.survey.lines(x, { rate = 8, segment = 64 }):to_peak()
-- assert(math.abs(s.values[9] - 3) < 1e-12)
function Spectrum:to_peak()
  need(self, "kind", "line", "to_peak")
  if self.scale == "peak" then return self end
  local rms = self:to_rms()
  return changed(rms, { scale = "peak", values = rms.values * 2 ^ 0.5 })
end

--- This spectrum of amplitudes as powers (mean squares).
-- @return spectrum: quantity "power", scale "rms"
-- @usage
-- local s = lb.survey.lines(lb.samples.make(64, math.sin), { rate = 1, segment = 32 })
-- assert(math.abs(s:to_peak():to_power().values[6] / s.values[6] - 1) < 1e-14)
function Spectrum:to_power()
  if self.quantity == "power" then return self end
  local rms = self:to_rms()
  return changed(rms, { quantity = "power", values = rms.values * rms.values })
end

--- This line spectrum of powers as a density: divided by the noise bandwidth.
-- @return spectrum: kind "density"
-- @usage
-- local o = { rate = 100, segment = 32 }
-- local x = lb.samples.make(64, math.sin)
-- local d = lb.survey.lines(x, o):to_density()
-- assert(math.abs(d.values[4] / lb.survey.density(x, o).values[4] - 1) < 1e-14)
function Spectrum:to_density()
  if self.kind == "density" then return self end
  local power = self:to_power()
  return changed(power, { kind = "density", values = power.values * (1 / self.bandwidth_hz) })
end

--- This density of powers as a line spectrum: times the noise bandwidth.
-- @return spectrum: kind "line"
-- @usage
-- local s = lb.survey.density(lb.samples.make(64, math.sin), { rate = 100, segment = 32 })
-- assert(s:to_lines().kind == "line")
function Spectrum:to_lines()
  if self.kind == "line" then return self end
  local power = self:to_power()
  return changed(power, { kind = "line", values = power.values * self.bandwidth_hz })
end

--- Levels in dB.
-- @param reference number: what 0 dB stands for, in the unit of amplitudes (of densities per root
--   of Hz); its square for powers
-- @return samples: 10 lg of powers over reference^2, 20 lg of amplitudes over reference
-- @usage
-- local s = lb.survey.lines(lb.samples.make(64, math.cos), { rate = 1, segment = 64 })
-- assert(math.abs(s:levels(1)[11] - s:to_rms():levels(1)[11]) < 1e-12)
function Spectrum:levels(reference)
  if self.quantity == "power" then return core.levels(self.values, reference ^ 2, 10) end
  return core.levels(self.values, reference, 20)
end

--- The mean square in a band: the sum of a density over its bins.
-- @param low_hz number: lower edge; bins at it count
-- @param high_hz number: upper edge; bins at it count
-- @return number: mean square of the samples there, unit^2
-- @return integer: bins that were added
-- @usage
-- local x = lb.samples.make(64, function(i) return math.cos(math.pi / 4 * i) end)
-- local s = lb.survey.density(x, { rate = 8, segment = 64, window = "rectangular" })
-- assert(math.abs(s:mean_square(0, 4) - 0.5) < 1e-12)
function Spectrum:mean_square(low_hz, high_hz)
  local density = self:to_density()
  local first = math.max(0, math.ceil(low_hz / self.spacing_hz - 1e-9))
  local last = math.min(#self.values - 1, math.floor(high_hz / self.spacing_hz + 1e-9))
  if not (first <= last) then
    fail(2, "no bin lies from %s to %s Hz", tostring(low_hz), tostring(high_hz))
  end
  return density.values:slice(first + 1, last + 1):sum() * self.spacing_hz, last - first + 1
end

--- Confidence limits as factors of the values.
-- For noise: dof / chi-square quantiles (Bendat and Piersol, Random Data; from memory). dof is
-- twice the effective averages; at 0 Hz and half the rate, where a bin is real, half of that.
-- @param confidence number: between 0 and 1, such as 0.95
-- @param k integer: bin; default: one that is neither of these two
-- @return number: factor of the lower limit; nil, reason for a peak hold
-- @return number: factor of the upper limit
-- @usage
-- local s = lb.survey.density(lb.samples.make(320, math.sin),
--   { rate = 1, segment = 32, overlap = 0 })
-- local low, high = s:limits(0.95)
-- assert(math.abs(low - 0.58532) < 1e-5 and math.abs(high - 2.08534) < 1e-5)
function Spectrum:limits(confidence, k)
  if type(confidence) ~= "number" or not (confidence > 0 and confidence < 1) then
    fail(2, "confidence is %s; it must be a number between 0 and 1", tostring(confidence))
  end
  if not self.averages then
    return nil, "the largest of many powers has no limits of this kind"
  end
  local dof = self.dof
  if k == 1 or k and 2 * (k - 1) == self.points then dof = dof / 2 end
  local tail = (1 - confidence) / 2
  local low, high = dof / core.chi_square(dof, 1 - tail), dof / core.chi_square(dof, tail)
  if self.quantity == "amplitude" then return low ^ 0.5, high ^ 0.5 end
  return low, high
end

-- The highest local maxima, in order of frequency.
local function peaks(values, most)
  local list = {}
  for k = 2, #values - 1 do
    local v = values[k]
    if v > values[k - 1] and v >= values[k + 1] then list[#list + 1] = k end
  end
  table.sort(list, function(a, b)
    if values[a] ~= values[b] then return values[a] > values[b] end
    return a < b
  end)
  list = table.move(list, 1, math.min(most, #list), 1, {})
  table.sort(list)
  return list
end

local function averages_text(s)
  if not s.averages then return ("peak hold of %d segments"):format(s.segments) end
  return ("%s of %d segments, worth %.4g averages (%.4g degrees of freedom)"):format(s.averaging,
    s.segments, s.averages, s.dof)
end

local function window_text(w)
  return w.parameter and ("%s, %s %.6g"):format(w.name, w.parameter_name, w.parameter) or w.name
end

function Spectrum:__tostring()
  local rows = {
    ("%s spectrum of %s, %s, %s %s, one-sided"):format(self.kind, self.name or "samples",
      self.unit, self.scale, self.quantity),
    ("  %d bins, %.8g Hz apart; noise bandwidth %.8g Hz (%.5g of a segment's bins)"):format(
      #self.values, self.spacing_hz, self.bandwidth_hz, self.bandwidth_bins),
    ("  window %s, segments of %d samples, overlap %.4g %%, detrend %s"):format(
      window_text(self.window), self.length, 100 * self.overlap, self.detrend),
    "  " .. averages_text(self),
    ("  %14s %14s"):format("Hz", self.unit),
  }
  for _, k in ipairs(peaks(self.values, 12)) do
    rows[#rows + 1] = ("  %14.8g %14.6g"):format(self:hz(k), self.values[k])
  end
  return table.concat(rows, "\n")
end

shown.spectrum(Spectrum)

return M
