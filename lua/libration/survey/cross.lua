--- What two channels have in common: cross spectrum, coherence, response.
-- All three carry what was averaged. The response is that of the output to the
-- input: an output that comes later has a falling phase.

local core = require("libration.core").spectrum
local samples = require("libration.core").samples
local setting = require "libration.survey.setting"
local shown = require "libration.survey.shown"

local M = {}

local fail = setting.fail

-- What a result that is not a power shares with spectra.
local shared = { "rate", "points", "length", "step", "overlap", "window", "detrend", "averaging",
                 "segments", "averages", "dof", "spacing_hz", "bandwidth_hz", "bandwidth_bins" }

local function facts_of(averages, from, to, class, with)
  local out = { from = from, to = to, averaging = "mean" }
  for _, field in ipairs(shared) do out[field] = averages[field] end
  out.from_name, out.to_name = averages.names[from], averages.names[to]
  for key, value in pairs(with) do out[key] = value end
  return setmetatable(out, class)
end

local function hz(self, k)
  return (k - 1) * self.rate.numerator / (self.points * self.rate.denominator)
end

local function head(self, what)
  return {
    ("%s from %s to %s"):format(what, self.from_name, self.to_name),
    ("  bins %.8g Hz apart, noise bandwidth %.8g Hz; %d segments, worth %.4g averages"):format(
      self.spacing_hz, self.bandwidth_hz, self.segments, self.averages),
  }
end

-- About twelve rows, spread over the bins.
local function spread(rows, count, row)
  local every = math.max(1, (count - 1) // 11)
  for k = 1, count, every do rows[#rows + 1] = row(k) end
  return table.concat(rows, "\n")
end

local Cross = { __name = "libration.cross", hz = hz }
Cross.__index = Cross

--- The size of the cross spectrum.
-- @return samples: |S|, in its unit
-- @usage
-- local x = lb.samples.make(64, math.sin)
-- local a = lb.survey.averages({ x, x * 2 }, { rate = 1, segment = 16, cross = true })
-- assert(math.abs(a:cross_density(1, 2):size()[3] / a:density(1).values[3] - 2) < 1e-12)
function Cross:size()
  return core.root(self.re * self.re + self.im * self.im)
end

function Cross:__tostring()
  return spread(head(self, self.kind .. " cross spectrum, " .. self.unit), #self.re, function(k)
    return ("  %14.8g Hz %14.6g %+14.6g i"):format(self:hz(k), self.re[k], self.im[k])
  end)
end

local Coherence = { __name = "libration.coherence", hz = hz }
Coherence.__index = Coherence

--- The level that the coherence of unrelated channels stays below.
-- 1 - (1 - confidence)^(1 / (averages - 1)) with the effective averages (Carter, Knapp, Nuttall
-- 1973, IEEE Trans. AU-21, 337-344; from memory).
-- @param confidence number: between 0 and 1, default 0.95
-- @return number: coherence
-- @usage
-- local x, y = lb.samples.make(256, math.sin), lb.samples.make(256, math.cos)
-- local a = lb.survey.averages({ x, y }, { rate = 1, segment = 32, overlap = 0, cross = true })
-- assert(math.abs(a:coherence(1, 2):zero_level() - 0.34816) < 1e-5)
function Coherence:zero_level(confidence)
  confidence = confidence or 0.95
  return 1 - (1 - confidence) ^ (1 / (self.averages - 1))
end

function Coherence:__tostring()
  local rows = head(self, "coherence")
  rows[#rows + 1] = ("  unrelated channels stay below %.5g in 95 %% of cases"):format(
    self:zero_level())
  return spread(rows, #self.values, function(k)
    return ("  %14.8g Hz %10.6f"):format(self:hz(k), self.values[k])
  end)
end

local Response = { __name = "libration.response", hz = hz }
Response.__index = Response

--- The gain of a response.
-- @return samples: |H|, in its unit
-- @usage
-- local x = lb.samples.make(64, math.sin)
-- local a = lb.survey.averages({ x, x * 2 }, { rate = 1, segment = 16, cross = true })
-- assert(math.abs(a:response(1, 2, { estimate = "h1" }):gain()[3] - 2) < 1e-12)
function Response:gain()
  return core.root(self.re * self.re + self.im * self.im)
end

--- The phase of a response, not unwrapped.
-- @return samples: rad, from -pi to pi; negative where the output comes later
-- @usage
-- local x = lb.samples.make(64, math.sin)
-- local a = lb.survey.averages({ x, x * -1 }, { rate = 1, segment = 16, cross = true })
-- assert(math.abs(math.abs(a:response(1, 2, { estimate = "h1" }):phase()[3]) - math.pi) < 1e-9)
function Response:phase()
  local out = samples.new(#self.re)
  for k = 1, #out do out[k] = math.atan(self.im[k], self.re[k]) end
  return out
end

--- The random error of the gain, as a share of it; of the phase, in rad, its arc sine.
-- sqrt((1 - g2) / (2 n g2)), n the effective averages (Bendat and Piersol, Random Data).
-- @return samples: standard deviation over value
-- @usage
-- local x = lb.samples.make(64, math.sin)
-- local a = lb.survey.averages({ x, x * 2 }, { rate = 1, segment = 16, cross = true })
-- assert(a:response(1, 2, { estimate = "h1" }):random_error()[3] < 1e-6)
function Response:random_error()
  return core.response_error(self.coherence, self.averages)
end

--- Resonances too narrow for the resolution, and how much too low they come out.
-- A peak is listed when it is narrower at half power than four noise bandwidths. A resonance of
-- half-power width B seen with a bandwidth b is low by 1 - atan(x) / x, x = b / B, in power; the
-- width seen is wider than the true one, so the bias is at least as stated.
-- @return table: list of hz, width_hz (as seen), bias (relative, of |H|^2, negative)
-- @return integer: how many there are; the list has 64 at most
-- @usage
-- local x = lb.samples.make(64, math.sin)
-- local a = lb.survey.averages({ x, x * 2 }, { rate = 1, segment = 16, cross = true })
-- assert(select(2, a:response(1, 2, { estimate = "h1" }):narrow()) == 0)
function Response:narrow()
  local power = self.re * self.re + self.im * self.im
  local list, count = core.narrow_peaks(power, 4 * self.bandwidth_hz / self.spacing_hz)
  for i, peak in ipairs(list) do
    local width = peak.width * self.spacing_hz
    local x = self.bandwidth_hz / width
    list[i] = { hz = self:hz(peak.bin), width_hz = width, bias = math.atan(x) / x - 1 }
  end
  return list, count
end

function Response:__tostring()
  local rows = head(self, ("response (%s, %s)"):format(self.estimate, self.unit))
  local narrow, count = self:narrow()
  if count > 0 then
    rows[#rows + 1] = ("  %d peak%s narrower than four noise bandwidths: the one at %.6g Hz is at "
      .. "least %.2g %% low in power; longer segments are needed"):format(count,
      count == 1 and "" or "s", narrow[1].hz, -100 * narrow[1].bias)
  end
  local gain, phase, err = self:gain(), self:phase(), self:random_error()
  return spread(rows, #gain, function(k)
    return ("  %14.8g Hz %12.6g +- %7.2g %% %9.4f rad"):format(self:hz(k), gain[k], 100 * err[k],
      phase[k])
  end)
end

shown.cross(Cross, Coherence, Response)

local function check_pair(averages, from, to)
  local count = #averages.names
  for _, k in ipairs { from, to } do
    if math.type(k) ~= "integer" or k < 1 or k > count then
      fail(4, "channel %s is not there; there are 1 to %d", tostring(k), count)
    end
  end
  if from == to then fail(4, "a cross spectrum is of two channels, not of %d twice", from) end
  if not averages.cross then fail(4, "give cross = true to have cross spectra") end
end

--- The cross spectrum of two channels of averages.
-- @param averages table: of survey.averages
-- @param from integer: input channel
-- @param to integer: output channel
-- @param kind string: "line" or "density"
-- @return cross: re, im (samples), kind, unit, and what was averaged; or nil, message, code
function M.cross(averages, from, to, kind)
  check_pair(averages, from, to)
  local re, im, code = averages.sums:cross(from, to, averages.scale[kind])
  if not re then return nil, im, code end
  local a, b = averages.units[from], averages.units[to]
  return facts_of(averages, from, to, Cross, { re = re, im = im, kind = kind, sides = 1,
    unit = ("(%s) (%s)%s"):format(a, b, kind == "density" and "/Hz" or "") })
end

-- Powers and cross spectrum of a pair, as averaged densities.
local function pair_of(averages, from, to)
  local between, message, code = M.cross(averages, from, to, "density")
  if not between then return nil, message, code end
  return { averages:density(from).values, averages:density(to).values, between.re, between.im }
end

--- The coherence of two channels; refused for a single average, where it is 1 always.
-- @param averages table: of survey.averages
-- @param from integer: one channel
-- @param to integer: the other
-- @return coherence: values (samples); or nil, message, code "one_average"
function M.coherence(averages, from, to)
  check_pair(averages, from, to)
  local segments = averages.sums:segments()
  if segments == 1 then
    return nil, "one segment alone has a coherence of 1 whatever is in it; average more",
      "one_average"
  end
  local p, message, code = pair_of(averages, from, to)
  if not p then return nil, message, code end
  return facts_of(averages, from, to, Coherence,
    { values = core.coherence(p[1], p[2], p[3], p[4]), unit = "1" })
end

local response_fields = { estimate = true, noise_ratio = true }
local estimates = { h1 = true, h2 = true, total = true }

--- The response of one channel to another.
-- @param averages table: of survey.averages
-- @param from integer: input channel
-- @param to integer: output channel
-- @param options table: estimate ("h1", "h2", "total"), noise_ratio
-- @return response: re, im, coherence (samples); or nil, message, code
function M.response(averages, from, to, options)
  setting.check_fields(options, response_fields, 3)
  check_pair(averages, from, to)
  local estimate, ratio = options.estimate, options.noise_ratio
  if not estimates[estimate] then
    fail(3, "estimate is %s; valid are h1 (noise on the output), h2 (noise on the input), total "
      .. "(noise on both)", tostring(estimate))
  elseif (estimate == "total") ~= (ratio ~= nil) then
    fail(3, "noise_ratio (noise power on the output over that on the input) is for total, and "
      .. "needed there")
  end
  local common, message, code = M.coherence(averages, from, to)
  if not common then return nil, message, code end
  local p = pair_of(averages, from, to)
  local re, im = core.response(p[1], p[2], p[3], p[4], estimate, ratio)
  return facts_of(averages, from, to, Response, { re = re, im = im, estimate = estimate,
    noise_ratio = ratio, coherence = common.values,
    unit = ("(%s)/(%s)"):format(averages.units[to], averages.units[from]) })
end

return M
