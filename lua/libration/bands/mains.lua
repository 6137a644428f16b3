--- Harmonic and interharmonic groups of mains signals, over windows of whole cycles.

local core = require("libration.core").bands
local input = require "libration.bands.input"
local options = require "libration.options"
local shown = require "libration.bands.shown"

local M = {}

local schema = input.schema {
  mains_hz = { options.choice { 50, 60 }, default = 50 },
  cycles = { options.integer(4, 4096) },
  orders = { options.integer(2, 4096), default = 40 },
}

local Groups = { __name = "libration.mains_groups" }
Groups.__index = Groups

function Groups:__tostring()
  local lines = { ("groups of %g Hz mains: %d windows of %d cycles, lines %g Hz apart"):format(
    self.mains_hz, self.windows, self.cycles, self.resolution_hz),
    ("  %5s %12s %12s %12s"):format("order", "line " .. self.unit, "group", "subgroup") }
  for h, row in ipairs(self.harmonics) do
    lines[#lines + 1] = ("  %5d %12.6g %12.6g %12.6g"):format(h, row.line, row.group, row.subgroup)
  end
  lines[#lines + 1] = ("  distortion %.4g %% lines, %.4g %% groups, %.4g %% subgroups"):format(
    100 * self.thd, 100 * self.thd_group, 100 * self.thd_subgroup)
  return table.concat(lines, "\n")
end

shown.groups(Groups)

-- Samples of a window of whole cycles; nil and why.
local function window_length(rate, read, cycles, n)
  local length = rate * cycles / read.mains_hz
  local whole = math.floor(length + 0.5)
  if math.abs(length - whole) > 1e-9 * length then
    return nil, ("%d cycles of %g Hz are %.10g samples, not a whole number: resample"):format(
      cycles, read.mains_hz, length), "domain"
  elseif whole // 2 < read.orders * cycles + cycles // 2 then
    return nil, ("harmonic %d with its group reaches beyond half the rate"):format(read.orders),
      "domain"
  elseif n < whole then
    return nil, ("%d samples are less than one window of %d"):format(n, whole), "domain"
  end
  return whole
end

local function mean_powers(samples, length, windows)
  local sum
  for i = 0, windows - 1 do
    local power = core.line_powers(samples:slice(i * length + 1, (i + 1) * length))
    sum = sum and sum:add(power) or power
  end
  return sum:scale(1 / windows)
end

local function distortion(rows, field)
  local sum = 0
  for h = 2, #rows do
    sum = sum + rows[h][field] ^ 2
  end
  return math.sqrt(sum) / rows[1][field]
end

function M.groups(x, spec)
  local read = options.take(schema, spec, "groups")
  local cycles = read.cycles or read.mains_hz // 5
  if cycles % 2 ~= 0 then
    error(("groups: cycles is %d; it must be even"):format(cycles), 0)
  end
  local samples, rate, unit = input.signal(x, read, "groups")
  local length, message, code = window_length(rate, read, cycles, #samples)
  if not length then
    return nil, message, code
  end
  local windows = #samples // length
  local power = mean_powers(samples, length, windows)
  local group, subgroup, inter, centred = core.groups(power, cycles, read.orders)
  local out = { kind = "group rms", unit = unit, mains_hz = read.mains_hz, cycles = cycles,
    windows = windows, unused_samples = #samples - windows * length,
    resolution_hz = read.mains_hz / cycles, harmonics = {}, interharmonics = {} }
  for h = 1, read.orders do
    out.harmonics[h] = { order = h, hz = h * read.mains_hz,
      line = math.sqrt(power[h * cycles + 1]), group = math.sqrt(group[h]),
      subgroup = math.sqrt(subgroup[h]) }
    out.interharmonics[h] = { above_order = h - 1, group = math.sqrt(inter[h]),
      centred_subgroup = math.sqrt(centred[h]) }
  end
  out.thd = distortion(out.harmonics, "line")
  out.thd_group = distortion(out.harmonics, "group")
  out.thd_subgroup = distortion(out.harmonics, "subgroup")
  return setmetatable(out, Groups)
end

return M
