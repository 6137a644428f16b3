--- Surveys of records: averaged spectra, cross spectra, coherence, responses.
-- A survey cuts a record into overlapping segments of one length, windows and
-- transforms each, and averages. Every result says what it is: line or density,
-- unit, effective or peak, window, noise bandwidth apart from the spacing of
-- bins, and how many independent averages it is worth.

local core = require "libration.core"
local cross = require "libration.survey.cross"
local record = require "libration.record"
local result = require "libration.report.result"
local setting = require "libration.survey.setting"
local spectrum = require "libration.survey.spectrum"
local units = require "libration.units"

local M = {}

local fail = setting.fail

local Averages = {}
Averages.__index = Averages
Averages.__name = "libration.averages"

-- Blocks, factors, units and names of samples given bare.
local function bare_source(source, options, level)
  local list = core.samples.is(source) and { source } or source
  if type(list) ~= "table" or #list == 0 then
    fail(level + 1, "give a record, samples, or a list of samples of equal length")
  end
  local rate, reason = units.rate(options.rate == nil and "nothing" or options.rate)
  if options.rate == nil or not rate then
    fail(level + 1, "rate: %s", options.rate == nil and "samples need their rate, S/s" or reason)
  end
  local out = { rate = rate, blocks = {}, units = {}, names = {}, samples = #list[1] }
  for k, block in ipairs(list) do
    if not core.samples.is(block) then
      fail(level + 1, "channel %d is %s, not samples", k, type(block))
    elseif #block ~= #list[1] then
      fail(level + 1, "channel %d has %d samples, channel 1 has %d; they must be equal", k, #block,
        #list[1])
    end
    local unit = options.unit
    if type(unit) == "table" then unit = unit[k] end
    out.blocks[k] = block
    out.units[k], out.names[k] = unit or "1", ("channel %d"):format(k)
  end
  return out
end

-- The same of a record's channels; its feed makes values of the stored codes.
local function record_source(rec, options, level)
  if options.rate ~= nil or options.unit ~= nil then
    fail(level + 1, "%s is the record's own", options.rate ~= nil and "rate" or "unit")
  end
  local out = { rate = rec.rate, feed = rec:feed(), places = {}, segments = rec.segments,
                units = {}, names = {}, samples = rec.samples }
  local wanted = options.channels
  if type(wanted) ~= "table" then wanted = wanted ~= nil and { wanted } or nil end
  for i = 1, wanted and #wanted or #rec.channels do
    local k = wanted and wanted[i] or i
    local channel = rec.channels[k]
    if not channel then
      fail(level + 1, "channel %s is not there; the record has 1 to %d", tostring(k),
        #rec.channels)
    end
    out.places[i], out.units[i], out.names[i] = channel.place, channel.unit, channel.name
  end
  return out
end

local function source_of(source, options, level)
  if type(options) ~= "table" then
    fail(level + 1, "the options are a table, not %s", type(options))
  end
  if record.is(source) then return record_source(source, options, level + 1) end
  if options.channels ~= nil then
    fail(level + 1, "channels choose from a record; list the samples wanted")
  end
  return bare_source(source, options, level + 1)
end

local function make(source, options, level)
  local s = setting.read(options, level + 1)
  local out = { rate = source.rate, length = s.length, step = s.step, points = s.points,
                overlap = s.overlap, window = s.window, detrend = s.detrend,
                averaging = s.averaging, cross = s.cross, stretches = {},
                units = source.units, names = source.names, setting = s }
  local sum, power, rate = s.weights:sum(), s.weights:dot(s.weights), source.rate:number()
  out.scale = { line = 1 / sum ^ 2, density = 1 / (rate * power) }
  out.spacing_hz = rate / s.points
  out.bandwidth_bins = s.length * power / sum ^ 2
  out.bandwidth_hz = rate * power / sum ^ 2
  out.sums = core.spectrum.average(s.weights, s.step, s.points, #source.names, s.detrend,
    s.averaging, s.cross, s.workers)
  return setmetatable(out, Averages)
end

--- Brings segments, averages and dof up to what has been fed.
-- @return averages: these
-- @usage
-- local a = lb.survey.accumulate { rate = 1000, segment = 32 }
-- assert(a:feed(lb.samples.new(48)):refresh().segments == 2)
function Averages:refresh()
  self.segments = self.sums:segments()
  if self.segments > 0 then
    local last = self.segments
    for _, segments in ipairs(self.stretches) do last = last - segments end
    self.averages, self.median_bias = setting.worth(self.setting, self.segments, self.stretches,
      last)
    self.dof = self.averages and 2 * self.averages
  end
  return self
end

--- Appends samples to what is averaged, in blocks of any size.
-- The result is the same to the last bit however the samples are cut into blocks, and for any
-- number of workers.
-- @param blocks samples or table: one block, or a list of blocks of equal length, one per channel
-- @return averages: these; or nil, message, code ("no_memory")
-- @usage
-- local a = lb.survey.accumulate { rate = 1000, segment = 32, channels = 2 }
-- for _ = 1, 4 do a:feed { lb.samples.new(20), lb.samples.new(20) } end
-- assert(a:refresh().segments == 4)
function Averages:feed(blocks)
  local done, message, code = self.sums:feed(blocks)
  if not done then return nil, message, code end
  return self
end

--- Says that what is fed from now on does not follow what was fed before.
-- No segment reaches across; samples after the last whole segment are left out.
-- @return averages: these
-- @usage
-- local a = lb.survey.accumulate { rate = 1000, segment = 32, overlap = 0 }
-- a:feed(lb.samples.new(40)):split():feed(lb.samples.new(40))
-- assert(a:density().segments == 2)
function Averages:split()
  assert(self.sums:split())
  local rest = self.sums:segments()
  for _, segments in ipairs(self.stretches) do rest = rest - segments end
  self.stretches[#self.stretches + 1] = rest
  return self
end

-- Feeds all of a source: blocks, or a record's stretches between its gaps.
local function feed_all(averages, from)
  if from.blocks then return averages:feed(from.blocks) end
  for i, stretch in ipairs(from.segments) do
    if i > 1 then averages:split() end
    local done, message, code = averages.sums:feed(from.feed, from.places, stretch.first,
      stretch.count)
    if not done then return nil, message, code end
  end
  return averages
end

-- The averaged power of a channel as a spectrum.
local function spectrum_of(averages, k, kind)
  k = k or 1
  if not averages.names[k] then
    fail(3, "channel %s is not there; there are 1 to %d", tostring(k), #averages.names)
  end
  averages:refresh()
  local scale = averages.scale[kind] / (averages.median_bias or 1)
  local values, message, code = averages.sums:power(k, scale)
  if not values then return nil, message, code end
  return spectrum.new {
    values = values, kind = kind, quantity = "power", scale = "rms", sides = 1,
    of_unit = averages.units[k], name = averages.names[k], rate = averages.rate,
    length = averages.length, step = averages.step, points = averages.points,
    overlap = averages.overlap, window = averages.window, detrend = averages.detrend,
    averaging = averages.averaging, segments = averages.segments, averages = averages.averages,
    dof = averages.dof, median_bias = averages.median_bias, spacing_hz = averages.spacing_hz,
    bandwidth_hz = averages.bandwidth_hz, bandwidth_bins = averages.bandwidth_bins,
  }
end

--- The density spectrum of a channel: powers per Hz.
-- @param k integer: channel, default 1
-- @return spectrum: see survey.density; or nil, message, code ("infeasible": no whole segment)
-- @usage
-- local a = lb.survey.averages(lb.samples.make(64, math.sin), { rate = 1, segment = 32 })
-- assert(a:density().unit == "1/Hz")
function Averages:density(k)
  return spectrum_of(self, k, "density")
end

--- The line spectrum of a channel: powers of lines.
-- @param k integer: channel, default 1
-- @return spectrum: see survey.lines; or nil, message, code ("infeasible": no whole segment)
-- @usage
-- local x = lb.samples.make(64, math.sin)
-- assert(lb.survey.averages(x, { rate = 1, segment = 32, unit = "V" }):lines().unit == "V^2")
function Averages:lines(k)
  return spectrum_of(self, k, "line")
end

--- The cross density of two channels, the mean of conj(X) Y per Hz.
-- @param from integer: channel of X
-- @param to integer: channel of Y
-- @return cross: re, im (samples, one-sided), unit; or nil, message, code
-- @usage
-- local x = lb.samples.make(64, math.sin)
-- local a = lb.survey.averages({ x, x }, { rate = 1, segment = 16, cross = true })
-- assert(math.abs(a:cross_density(1, 2).re[3] / a:density(1).values[3] - 1) < 1e-12)
function Averages:cross_density(from, to)
  return cross.cross(self:refresh(), from, to, "density")
end

--- The cross spectrum of lines of two channels, the mean of conj(X) Y.
-- @param from integer: channel of X
-- @param to integer: channel of Y
-- @return cross: re, im (samples, one-sided), unit; or nil, message, code
-- @usage
-- local x = lb.samples.make(64, math.sin)
-- local a = lb.survey.averages({ x, x }, { rate = 1, segment = 16, cross = true })
-- assert(math.abs(a:cross_lines(1, 2).re[3] / a:lines(1).values[3] - 1) < 1e-12)
function Averages:cross_lines(from, to)
  return cross.cross(self:refresh(), from, to, "line")
end

--- The coherence of two channels.
-- @param from integer: one channel
-- @param to integer: the other
-- @return coherence: values (samples, 0 to 1), averages (effective), zero_level(confidence); or
--   nil, message, code ("one_average": a single segment has a coherence of 1 whatever is in it)
-- @usage
-- local x = lb.samples.make(64, math.sin)
-- local a = lb.survey.averages({ x, x }, { rate = 1, segment = 64, cross = true })
-- local g, _, code = a:coherence(1, 2)
-- assert(g == nil and code == "one_average")
function Averages:coherence(from, to)
  return cross.coherence(self:refresh(), from, to)
end

--- The response of one channel to another.
-- @param from integer: channel of the input
-- @param to integer: channel of the output
-- @param options table: estimate: "h1" (noise on the output), "h2" (noise on the input), "total"
--   (noise on both: total least squares; needs noise_ratio, the noise power on the output over
--   that on the input)
-- @return response: re, im, coherence (samples), unit, gain(), phase(), random_error(), narrow();
--   or nil, message, code ("one_average")
-- @usage
-- local x = lb.samples.make(64, math.sin)
-- local a = lb.survey.averages({ x, x * 3 }, { rate = 1, segment = 16, cross = true })
-- local h = a:response(1, 2, { estimate = "total", noise_ratio = 9 })
-- assert(math.abs(h.re[3] - 3) < 1e-9)
function Averages:response(from, to, options)
  return cross.response(self:refresh(), from, to, options)
end

function Averages:__tostring()
  self:refresh()
  return ("averages of %d channel%s at %s S/s: %d segments of %d samples so far%s"):format(
    #self.names, #self.names == 1 and "" or "s", tostring(self.rate), self.segments, self.length,
    self.cross and ", with cross spectra" or "")
end

--- Averages the spectra of a record's segments, for results of several kinds.
-- A record is read in blocks where it lies in a file; no segment reaches across a gap of it.
-- @param source record, samples or table: a record; or samples, or a list of blocks of samples of
--   equal length, with rate and unit
-- @param options table: segment (samples in one; needed), window (name, { name, parameter } or a
--   window; default "hann"), overlap (share of a segment, default 0.5; must be whole samples) or
--   step (samples from segment to segment), points (of the transform, zeros added; default
--   segment), detrend ("none", "mean", "line" of least squares; from every segment; default
--   "none"), averaging ("mean", "median", "peak"; default "mean"), cross (true: cross spectra of
--   all pairs of channels), workers (0: one per core), channels (number or list: of a record);
--   for samples rate (S/s, exact) and unit (text, or a list)
-- @return averages: density(k), lines(k), cross_density(i, j), cross_lines(i, j), coherence(i, j),
--   response(i, j, options), feed(blocks); or nil, message, code ("infeasible": shorter than a
--   segment)
-- @usage
-- local x = lb.samples.make(2048, function(i) return math.sin(i) end)
-- local a = lb.survey.averages(x, { rate = "1 kHz", segment = 256, unit = "V" })
-- assert(a:density().unit == "V^2/Hz" and a:lines():to_peak().unit == "V" and a.segments == 15)
function M.averages(source, options)
  local from = source_of(source, options, 2)
  local out = make(from, options, 2)
  local done, message, code = feed_all(out, from)
  if not done then return nil, message, code end
  if out:refresh().segments == 0 then
    return nil, ("%d samples%s are less than a segment of %d"):format(from.samples,
      from.segments and #from.segments > 1 and " with gaps" or "", out.length), "infeasible"
  end
  return out
end

--- Averages to be fed block by block, for records that come or lie in pieces.
-- @param options table: as for averages; rate (S/s, exact), channels (how many, default 1), unit
--   (text, or a list)
-- @return averages: empty; feed(blocks), then as for averages
-- @usage
-- local a = lb.survey.accumulate { rate = 1000, segment = 64, unit = "Pa" }
-- a:feed(lb.samples.new(100)):feed(lb.samples.new(28))
-- assert(a:density().segments == 3)
function M.accumulate(options)
  if type(options) ~= "table" then
    fail(1, "the options are a table, not %s", type(options))
  end
  local count = options.channels or 1
  if math.type(count) ~= "integer" or count < 1 or count > 1024 then
    fail(1, "channels is %s; it must be an integer from 1 to 1024", tostring(options.channels))
  end
  local rate, reason = units.rate(options.rate == nil and "nothing" or options.rate)
  if not rate then
    fail(1, "rate: %s", options.rate == nil and "samples need their rate, S/s" or reason)
  end
  local from = { rate = rate, units = {}, names = {} }
  for k = 1, count do
    local unit = options.unit
    if type(unit) == "table" then unit = unit[k] end
    from.units[k], from.names[k] = unit or "1", ("channel %d"):format(k)
  end
  return make(from, options, 2)
end

--- The density spectrum of a channel: for noise, whose height does not depend on the segment.
-- @param source record, samples or table: see averages
-- @param options table: see averages; channels may be one number
-- @return spectrum: values (samples, from 0 Hz), kind "density", quantity "power", scale "rms",
--   sides 1, unit, rate, spacing_hz (of bins), bandwidth_hz (noise bandwidth), bandwidth_bins,
--   window, length, step, overlap, points, detrend, averaging, segments, averages (effective;
--   nil for "peak"), dof, median_bias; methods hz(k), frequencies(), bin(hz), to_rms(),
--   to_power(), to_lines(), levels(reference), mean_square(low, high), limits(confidence); or nil,
--   message, code ("infeasible": shorter than a segment)
-- @usage
-- local x = lb.samples.make(2048, function(i) return math.sin(i) end)
-- local s = lb.survey.density(x, { rate = 1000, segment = 256 })
-- assert(math.abs(s:mean_square(0, 500) - 0.5) < 0.01)
function M.density(source, options)
  local averages, message, code = M.averages(source, options)
  if not averages then return nil, message, code end
  return averages:density()
end

--- The line spectrum of a channel: for lines, whose height does not depend on the segment.
-- @param source record, samples or table: see averages
-- @param options table: see averages; channels may be one number
-- @return spectrum: as of density, kind "line", quantity "power" (mean square of a line); methods
--   to_rms(), to_peak(), to_density() besides; or nil, message, code
-- @usage
-- local x = lb.samples.make(2048, function(i) return 3 * math.sin(math.pi / 8 * i) end)
-- local s = lb.survey.lines(x, { rate = 1600, segment = 256, unit = "V" }):to_peak()
-- assert(math.abs(s.values[s:bin(100)] - 3) < 1e-9)
function M.lines(source, options)
  local averages, message, code = M.averages(source, options)
  if not averages then return nil, message, code end
  return averages:lines()
end

--- A result again from the text that its json() wrote.
-- @param text string: JSON
-- @return table: the result with its methods; or nil, message, code ("format")
-- @usage
-- local s = lb.survey.lines(lb.samples.make(64, math.sin), { rate = 8, segment = 32 })
-- assert(lb.survey.from_json(s:json()).values[5] == s.values[5])
function M.from_json(text)
  return result.read(text)
end

return M
