--- Planting failures into records: one row per failure, in the files of plants/.
-- A row is { name, row (of the project's catalogue of failures), does, fields, apply }. A field is
-- { name, kind, default, unit, text }; a default may be a function of the bench. apply(bench, o)
-- works on the bench: the channels of a record, taken apart.

local core = require "libration.core"
local options = require "libration.options"
local record = require "libration.record"

local channels = require "libration.synth.plants.channels"
local converter = require "libration.synth.plants.converter"
local instants = require "libration.synth.plants.instants"
local sources = require "libration.synth.plants.sources"

local M = {}

local Bench = {}
Bench.__index = Bench

-- Rows of the catalogue that no record can carry, and why.
M.elsewhere = {
  { row = 11, why = "a reading between two lines: half_cycle_cut makes it happen" },
  { row = 13, why = "a choice of the transform" }, { row = 14, why = "a scaling of the spectrum" },
  { row = 15, why = "a scaling of the spectrum" }, { row = 16, why = "a scaling of the spectrum" },
  { row = 17, why = "a scaling of the spectrum" }, { row = 18, why = "a scaling of the spectrum" },
  { row = 19, why = "a choice of the window" }, { row = 20, why = "a choice of the window" },
  { row = 22, why = "a choice of the averaging" }, { row = 23, why = "a choice of the averaging" },
  { row = 24, why = "a choice of the averaging" }, { row = 25, why = "a choice of the averaging" },
  { row = 26, why = "a choice of the averaging" }, { row = 27, why = "a sign of the response" },
  { row = 53, why = "a record of the machine at rest: leave its lines out" },
}

local rows, by_name = {}, {}
for _, family in ipairs { converter, instants, sources, channels } do
  for _, row in ipairs(family) do
    rows[#rows + 1], by_name[row.name] = row, row
  end
end
table.sort(rows, function(a, b)
  return a.row < b.row or a.row == b.row and a.name < b.name
end)

local function names()
  local list = {}
  for i, row in ipairs(rows) do
    list[i] = row.name
  end
  return list
end

local function take_apart(given)
  local bench = setmetatable({ rate = given.rate:number(), exact_rate = given.rate,
    n = given.samples, channels = {}, facts = {} }, Bench)
  for k, channel in ipairs(given.channels) do
    bench.channels[k] = { name = channel.name, unit = channel.unit, bits = channel.bits,
      integer = channel.integer, full_scale = channel.full_scale, range = channel.range,
      sensitivity = channel.sensitivity, factor = channel.factor, values = given:values(k):copy() }
  end
  return bench
end

-- The channel of option `channel` (or another number), checked.
function Bench:channel(k)
  local channel = self.channels[k]
  if not channel then
    error(("plant: channel %d does not exist; there are 1 to %d"):format(k, #self.channels), 0)
  end
  return channel
end

-- Integer codes of a channel; what the caller returns to set_codes.
function Bench:codes(k, failure)
  local channel = self:channel(k)
  if not channel.integer then
    error(("plant: %s needs integer codes; channel %d has none"):format(failure, k), 0)
  end
  return core.synth.coarsen(channel.values / channel.factor, 1), channel
end

function Bench:set_codes(k, codes)
  local channel = self:channel(k)
  channel.values = codes * channel.factor
end

-- The level a channel clips at, in its unit: full scale, or what its samples reach.
function Bench:level(k)
  local channel = self:channel(k)
  return channel.full_scale or math.max(channel.values:peak(), 1e-300)
end

-- Runs f(values, k) over one channel or all (nil); what it returns replaces the values.
function Bench:each(only, f)
  for k = only or 1, only or #self.channels do
    local channel = self:channel(k)
    channel.values = f(channel.values, k) or channel.values
  end
end

-- A range of samples of the record, checked.
function Bench:range(at, count, failure)
  if at < 1 or count < 1 or at + count - 1 > self.n then
    error(("plant: %s of %d samples at %d leaves 1 .. %d"):format(failure, count, at, self.n), 0)
  end
  return at, count
end

-- The root mean square of a channel, never 0.
function Bench:rms(k)
  local rms = self:channel(k or 1).values:rms()
  return rms > 0 and rms or 1
end

-- Integer channels hold codes again afterwards, as a converter would give them.
local function requantised(channel)
  local top = 2.0 ^ (channel.bits - 1)
  local codes = core.synth.coarsen(channel.values / channel.factor, 1)
  core.synth.clip(codes, -top, top - 1)
  return codes
end

local function channel_spec(channel)
  local spec = { name = channel.name, unit = channel.unit, bits = channel.bits }
  if channel.range then
    spec.range, spec.sensitivity = channel.range, channel.sensitivity
  else
    spec.full_scale = channel.full_scale
  end
  if channel.integer then
    spec.codes = requantised(channel)
  else
    spec.samples = channel.values
  end
  return spec
end

local function put_together(bench, given)
  local spec = { rate = bench.exact_rate, title = given.title, start = given.start_ns,
                 metadata = given.metadata, channels = {} }
  local n = math.huge
  for _, channel in ipairs(bench.channels) do
    n = math.min(n, #channel.values)
  end
  if n == 0 then
    error("plant: nothing of the record is left", 0)
  end
  for k, channel in ipairs(bench.channels) do
    channel.values = channel.values:slice(1, n)
    spec.channels[k] = channel_spec(channel)
  end
  return record.new(spec)
end

local function schema_of(row)
  local schema = {}
  for _, field in ipairs(row.fields) do
    schema[field.name] = { field.kind, required = field.required,
      default = type(field.default) ~= "function" and field.default or nil }
  end
  return schema
end

local function resolve(row, bench, given)
  local read = options.take(schema_of(row), given, "plant " .. row.name)
  for _, field in ipairs(row.fields) do
    if read[field.name] == nil and type(field.default) == "function" then
      read[field.name] = field.default(bench, read)
    end
  end
  return read
end

function M.plant(given, name, spec)
  if not record.is(given) then
    error(("plant: a %s is no record"):format(type(given)), 0)
  end
  local row = by_name[name]
  if not row then
    local near = type(name) == "string" and options.nearest(name, names())
    error(("plant: %s is no failure%s; there are %s"):format(options.show(name),
      near and (' (did you mean "%s"?)'):format(near) or "", table.concat(names(), ", ")), 0)
  end
  local bench = take_apart(given)
  local read = resolve(row, bench, spec)
  row.apply(bench, read)
  bench.facts.failure, bench.facts.row, bench.facts.options = name, row.row, read
  return put_together(bench, given), bench.facts
end

local function fields_of(row)
  local list = {}
  for i, field in ipairs(row.fields) do
    list[i] = { name = field.name, unit = field.unit, required = field.required or false,
      default = type(field.default) ~= "function" and field.default or nil, text = field.text }
  end
  return list
end

function M.failures()
  local list = {}
  for i, row in ipairs(rows) do
    list[i] = { name = row.name, row = row.row, does = row.does, options = fields_of(row) }
  end
  local other = {}
  for i, row in ipairs(M.elsewhere) do
    other[i] = { row = row.row, why = row.why }
  end
  return list, other
end

return M
