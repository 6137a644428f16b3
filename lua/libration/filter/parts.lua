--- What the kinds of filters for records share: edges of a band as people write
-- them, and what taps do in the bands that they were designed for.

local core = require "libration.core"
local options = require "libration.options"
local units = require "libration.units"

local M = {}

-- One frequency, or two as "100..200 Hz" or { "100 Hz", "200 Hz" }, as given.
local function split(value)
  if type(value) == "string" then
    local low, high = units.range(value)
    if low then
      return { low, high }
    end
  elseif type(value) == "table" and not core.base.is_fraction(value) then
    return { rawget(value, 1), rawget(value, 2) }, rawget(value, 3) ~= nil or #value > 2
  end
  return { value }
end

--- Kind of the edges of a band: "100 Hz", "100..200 Hz", { 100, 200 }.
-- @return function: kind giving a list of one or two numbers, Hz
function M.edges()
  return function(value, path, mistakes)
    local ends, more = split(value)
    if more or ends[1] == nil then
      return mistakes:add(path, 'give one frequency ("100 Hz") or two ("100..200 Hz")')
    end
    local read = {}
    for i, one in ipairs(ends) do
      local hz, reason = units.number(one, "Hz")
      if not hz then
        return mistakes:add(path, reason)
      end
      read[i] = hz
    end
    return read
  end
end

--- A sample rate as a number; no fraction is needed where nothing is divided.
-- @param value any: "51.2 kS/s", a number of S/s, a fraction
-- @return number: S/s; or nil and a reason
function M.rate(value)
  local rate, reason = units.rate(value)
  if rate then
    return rate:number()
  elseif type(value) == "number" and value - value == 0 then
    return value + 0.0
  end
  return nil, reason
end

--- A frequency as a number.
-- @param value any: "20 Hz", a number of Hz, a fraction
-- @return number: Hz; or nil and a reason
function M.hz(value)
  return units.number(value, "Hz")
end

-- Edges that the band cannot have, as a mistake.
local function complain(spec, mistakes)
  local two = spec.band == "pass" or spec.band == "stop"
  local low, high, half = spec.edge[1], spec.edge[2], spec.rate / 2
  if two ~= (high ~= nil) then
    mistakes:add("edge", two and ('a band "%s" has two edges ("100..200 Hz")'):format(spec.band)
      or ('a band "%s" has one edge ("100 Hz")'):format(spec.band))
  elseif low <= 0 or (high or low) >= half or (high and high <= low) then
    mistakes:add("edge", ("%s Hz: edges lie in order between 0 and half the rate, %.9g Hz")
      :format(table.concat(spec.edge, " to "), half))
  end
end

--- Reads options by a schema with band, edge and rate; raises all mistakes in one error.
-- @param schema table: of libration.options
-- @param input table: what the caller wrote
-- @param what string: whose options
-- @param check function: of (spec, mistakes), for more mistakes; may be absent
-- @return table: the fields' meanings
function M.read(schema, input, what, check)
  local mistakes = options.mistakes()
  local spec = options.read(schema, input == nil and {} or input, "", mistakes)
  if mistakes.count == 0 and spec.edge then
    complain(spec, mistakes)
  end
  if mistakes.count == 0 and check then
    check(spec, mistakes)
  end
  if mistakes.count > 0 then
    error(mistakes:message(what), 0)
  end
  return spec
end

--- Text of edges: "100 Hz", "100 to 200 Hz".
-- @param edge table: one or two numbers, Hz
-- @return string: the text
function M.edges_text(edge)
  return edge[2] and ("%.9g to %.9g Hz"):format(edge[1], edge[2]) or ("%.9g Hz"):format(edge[1])
end

-- Largest |gain - at| of taps over bands { { low, high } ... } (shares of the rate) on a grid of
-- 64 points a lobe, ends of the bands included. Between points it may be more by 0.2 %.
local function worst(h, bands, at, magnitude, points)
  local most = 0
  for _, band in ipairs(bands) do
    local first, last = math.ceil(band[1] * points), math.floor(band[2] * points)
    for _, share in ipairs(band) do
      most = math.max(most, math.abs(math.abs(core.filter.taps_gain(h, share)) - at))
    end
    if first <= last then
      most = math.max(most, (magnitude:slice(first + 1, last + 1) - at):peak())
    end
  end
  return most
end

--- What symmetric taps do in the bands where they should pass and stop.
-- @param h samples: the taps
-- @param pass table: list of { low, high }, shares of the rate
-- @param stop table: likewise
-- @return number: largest deviation of the gain from 1 where it should pass
-- @return number: largest gain where it should stop
function M.judge(h, pass, stop)
  local points = core.spectrum.fast_length(64 * #h)
  local re, im = core.spectrum.forward(h, points)
  local magnitude = (re:square() + im:square()):sqrt()
  return worst(h, pass, 1, magnitude, points), worst(h, stop, 0, magnitude, points)
end

--- Taps by Kaiser's window that hold a ripple: where his estimate falls short, by up to 12 dB
-- more than was asked for, in steps of 0.25 dB.
-- @param band string: "low", "high", "pass" or "stop"
-- @param edge table: one or two shares of the rate, middles of the transitions
-- @param width number: of a transition, a share of the rate
-- @param ripple number: largest deviation, as a ratio
-- @param pass table: bands for judge
-- @param stop table: bands for judge
-- @return samples: an odd number of taps
-- @return number: largest deviation from 1 where it passes
-- @return number: largest gain where it stops
function M.taps(band, edge, width, ripple, pass, stop)
  local asked = -20 * math.log(ripple, 10)
  for extra = 0, 48 do
    local count, beta = core.filter.kaiser(math.max(8, asked + extra / 4), width)
    local h = core.filter.window_taps(band, edge[1], edge[2], count | 1, beta)
    local flat, gain = M.judge(h, pass, stop)
    if flat <= ripple and gain <= ripple then
      return h, flat, gain
    end
  end
  error(("%.4g dB cannot be held in double precision by a transition of %.4g of the rate")
    :format(asked, width), 0)
end

return M
