--- What the hardware can do: rates, record lengths, range, filter, clock.
-- A digitizer is plain data in the words of its data sheet, checked in one go
-- and turned into one normal form that planning works on.

local core = require "libration.core"
local demand = require "libration.demand"
local fields = require "libration.digitizer.fields"
local fraction_text = require("libration.fraction").text
local options = require "libration.options"
local units = require "libration.units"

local M = {}

local Digitizer = { __name = "libration.digitizer" }

local text = units.text

local function list_text(list, unit)
  local parts = {}
  for i = 1, math.min(#list, 12) do
    parts[i] = fraction_text(list[i])
  end
  return table.concat(parts, ", ") .. (#list > 12 and (", ... (%d in all)"):format(#list) or "")
    .. unit
end

local function run_text(run)
  local step = run.step and run.step > 1 and (" in steps of %d"):format(run.step) or ""
  return (run.least == run.most and "%d" or "%d..%d"):format(run.least, run.most) .. step
end

local rates_text = {
  divider = function(rates)
    local decimated = #rates.decimation > 1 or rates.decimation[1] ~= 1
    return ("%s Hz / (%s)%s"):format(fraction_text(rates.clock), run_text(rates),
      decimated and " / decimation " .. list_text(rates.decimation, "") or "")
  end,
  list = function(rates) return list_text(rates.rates, " S/s") end,
  range = function(rates)
    return ("%s..%s S/s%s"):format(fraction_text(rates.least), fraction_text(rates.most),
      rates.step and (" in steps of %s S/s"):format(fraction_text(rates.step)) or "")
  end,
  pll = function(rates)
    local vco = rates.vco and (", oscillator %s..%s Hz"):format(fraction_text(rates.vco.least),
      fraction_text(rates.vco.most)) or ""
    return ("%s Hz * (%s) / (%s) / (%s)%s"):format(fraction_text(rates.clock),
      run_text(rates.multiply), run_text(rates.divide), list_text(rates.after, ""), vco)
  end,
}

local function filter_text(filter)
  local parts = { filter.shape }
  local unit = filter.corner_of_rate and " rate" or " Hz"
  parts[#parts + 1] = filter.order and ("order %d"):format(filter.order)
  parts[#parts + 1] = filter.corner and ("corner %s%s"):format(text(filter.corner), unit)
  parts[#parts + 1] = filter.ripple_db and ("ripple %s dB"):format(text(filter.ripple_db))
  parts[#parts + 1] = filter.stop_db and ("stop %s dB"):format(text(filter.stop_db))
  if filter.points then
    local last = filter.points[#filter.points]
    parts[#parts + 1] = ("%d points up to %s%s, %s dB"):format(#filter.points, text(last.at), unit,
      text(last.db))
  end
  parts[#parts + 1] = ("flat within %s %%"):format(text(100 * filter.flatness, 4))
  return table.concat(parts, ", ")
end

function Digitizer:__tostring()
  local unit = self.range_unit
  local rows = {
    { "rates", rates_text[self.rates.kind](self.rates) },
    { "channels", ("%d%s"):format(self.channels, self.aggregate and
      (", %s S/s together"):format(fraction_text(self.aggregate)) or "") },
    { "record", ("%s samples, a multiple of %d%s"):format(run_text(self.samples), self.block,
      self.memory and (", memory %d samples"):format(self.memory) or "") },
    { "converter", ("%s, range %s, noise %s %s/rtHz"):format(
      self.bits and self.bits .. " bits" or "bits not given",
      self.range and text(self.range) .. " " .. unit or "not given", text(self.noise), unit) },
    { "filter", filter_text(self.filter) },
    { "clock", ("%s ppm, jitter %s s, skew %s s"):format(text(1e6 * self.timebase),
      text(self.jitter_s), text(self.skew_s)) },
    { "accuracy", text(100 * self.accuracy, 4) .. " %" },
  }
  rows[#rows + 1] = self.price and { "price", text(self.price) .. " per hour" }
  local lines = { self.title }
  for _, row in ipairs(rows) do
    lines[#lines + 1] = ("  %-9s  %s"):format(row[1], row[2])
  end
  return table.concat(lines, "\n")
end

local function by_size(a, b)
  return a < b
end

-- Each value once, in order; twice is a mistake.
local function sorted(list, path, mistakes)
  table.sort(list, by_size)
  for i = 2, #list do
    if list[i] == list[i - 1] then
      mistakes:add(path, fraction_text(list[i]) .. " is given twice")
    end
  end
  return list
end

-- One maker for each way to say the rates, keyed by the field that says it.
local makers = {
  divider = function(read, mistakes)
    return { kind = "divider", clock = read.clock, least = read.divider.least,
      most = read.divider.most, step = read.divider.step,
      decimation = sorted(read.decimation or { 1 }, "decimation", mistakes) }
  end,
  rates = function(read, mistakes)
    return { kind = "list", rates = sorted(read.rates, "rates", mistakes) }
  end,
  rate = function(read)
    if read.rate.least == read.rate.most then
      return { kind = "list", rates = { read.rate.least } }
    end
    return { kind = "range", least = read.rate.least, most = read.rate.most,
      step = read.rate_step }
  end,
  pll = function(read, mistakes)
    local pll = read.pll
    return { kind = "pll", clock = read.clock, multiply = pll.multiply, divide = pll.divide,
      after = sorted(pll.after or { 1 }, "pll.after", mistakes), vco = pll.vco }
  end,
}

-- Fields that only make sense beside another one.
local companions = {
  { "clock", { "divider", "pll" }, "clock goes with divider or pll" },
  { "decimation", { "divider" }, "decimation goes with clock and divider" },
  { "rate_step", { "rate" }, 'rate_step goes with a range: rate = "1..100 kS/s"' },
}

local ways = 'clock = "12.288 MHz" with divider = "128..65535", clock with pll = { ... }, '
  .. 'rates = { "48 kS/s", ... } or rate = "1..100 kS/s"'

local function check_rates(input, mistakes)
  local said = {}
  for _, name in ipairs { "divider", "pll", "rate", "rates" } do
    said[#said + 1] = rawget(input, name) ~= nil and name or nil
  end
  if #said ~= 1 then
    mistakes:add("rates", #said == 0 and "missing; give " .. ways
      or ("said by %s; give exactly one of: %s"):format(table.concat(said, " and "), ways))
  end
  if (said[1] == "divider" or said[1] == "pll") and rawget(input, "clock") == nil then
    mistakes:add("clock", ('missing; %s needs the master clock, clock = "12.288 MHz"')
      :format(said[1]))
  end
  for _, row in ipairs(companions) do
    local beside = rawget(input, row[1]) == nil
    for _, name in ipairs(row[2]) do
      beside = beside or rawget(input, name) ~= nil
    end
    if not beside then
      mistakes:add(row[1], row[3])
    end
  end
  return said[1]
end

local function read_noise(value, unit, mistakes)
  if value == nil then
    return 0.0
  end
  local noise, reason = units.number(value, "(" .. unit .. ")/rtHz")
  if reason or noise < 0 then
    mistakes:add("noise", reason or options.show(value) .. " is below 0")
  end
  return noise
end

local function check_together(read, mistakes)
  if read.bits and not read.range then
    mistakes:add("range", 'missing; bits need a range, such as range = "5 V"')
  end
  if read.memory and read.memory // read.channels < read.samples.least then
    mistakes:add("memory", ("%d samples are %d a channel, fewer than the shortest record of %d")
      :format(read.memory, read.memory // read.channels, read.samples.least))
  end
  if read.samples.most < read.block then
    mistakes:add("block", ("%d is more than the longest record of %d samples"):format(read.block,
      read.samples.most))
  end
end

local function check_filter(filter, mistakes)
  local ok, message = pcall(core.filter.prepare, filter)
  if not ok then
    message = tostring(message)
    if not message:find "bad argument" then
      error(message, 0)
    end
    mistakes:add("filter", message:match "%((.*)%)$" or message)
  end
end

--- Reads a digitizer and collects the mistakes.
-- @param input any: the table of the user, or a digitizer
-- @param mistakes table: from libration.options
-- @return table: the digitizer; worthless when mistakes were found
-- @usage
-- local mistakes = require("libration.options").mistakes()
-- require("libration.digitizer").read({ bits = 99 }, mistakes)
-- assert(mistakes:message("digitizer"):find "bits: 99 is out of range")
function M.read(input, mistakes)
  if type(input) ~= "table" then
    mistakes:add("", options.show(input) .. " is not a table { clock = ..., ... }")
    return nil
  elseif getmetatable(input) == Digitizer then
    return input
  end
  local way, before = check_rates(input, mistakes), mistakes.count
  local read = options.read(fields.schema, input, "", mistakes)
  local unit = read.range and read.range.unit or "V"
  read.noise = read_noise(read.noise, unit, mistakes)
  if mistakes.count > before or not way then
    return nil
  end
  check_together(read, mistakes)
  check_filter(read.filter, mistakes)
  return setmetatable({
    title = read.title, rates = makers[way](read, mistakes), channels = read.channels,
    aggregate = read.aggregate, memory = read.memory, block = read.block,
    samples = { least = read.samples.least, most = read.samples.most }, bits = read.bits,
    range = read.range and read.range.value, range_unit = unit, noise = read.noise,
    filter = read.filter, timebase = read.timebase, jitter_s = read.jitter,
    accuracy = read.accuracy, skew_s = read.skew, price = read.price,
    source = demand.plain_copy(input),
  }, Digitizer)
end

--- States what a digitizer can do.
-- Rates, in one of these ways: clock = "12.288 MHz" with divider = "128..65535"
-- ({ least, most, step } too) and perhaps decimation = { 1, 2, 4 }; rates =
-- { "48 kS/s", ... }; rate = "1..100 kS/s" and perhaps rate_step; clock with
-- pll = { multiply = "8..64", divide = "1..4", after = { 2, 4 }, vco =
-- "200..400 MHz" }: rate = clock * multiply / divide / after, the oscillator
-- (before the division by after) inside vco.
-- Other fields: channels in use (1), aggregate (S/s of all channels together),
-- memory (samples of all channels, "4 Mi"), block (record lengths are its
-- multiples, 1), samples (shortest and longest record, "16..16777216"), bits,
-- range (largest value before clipping, "5 V" or in another unit), noise (one-
-- sided density in the unit of the range), filter = { shape = "none",
-- "butterworth", "chebyshev", "bessel", "elliptic" or "points", order, corner
-- ("0.4 rate", "20 kHz"), ripple, stop ("80 dB"), points = { { "1 kHz",
-- "-0.1 dB" }, ... }, flatness ("0.05 dB") }, timebase ("25 ppm"), jitter
-- ("2 ns"), skew, accuracy ("0.5 %"), price (per hour), title. Decibels of
-- accuracy and flatness mean 10^(x/20) - 1.
-- @param input table: as above; a digitizer is returned as it is
-- @return table: title, rates, channels, aggregate, memory, block, samples, bits,
-- range, range_unit, noise, filter, timebase, jitter_s, accuracy, skew_s, price,
-- source; print() shows it. Mistakes raise one error that lists them all
-- @usage
-- local digitizer = lb.digitizer {
--   clock = "12.288 MHz", divider = { 128, 65535 }, bits = 24, range = "5 V",
--   filter = { shape = "butterworth", order = 8, corner = "0.4 rate" }, timebase = "25 ppm",
-- }
-- assert(digitizer.rates.kind == "divider" and digitizer.filter.corner == 0.4)
function M.digitizer(input)
  local mistakes = options.mistakes()
  local digitizer = M.read(input, mistakes)
  if mistakes.count > 0 then
    error(mistakes:message "digitizer", 2)
  end
  return digitizer
end

--- Whether a value is a digitizer made by this library.
-- @param value any: what to look at
-- @return boolean: true for what lb.digitizer and lb.load return
-- @usage
-- assert(not require("libration.digitizer").is {})
function M.is(value)
  return type(value) == "table" and getmetatable(value) == Digitizer
end

return M
