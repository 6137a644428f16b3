--- Fields that many rows of plants share: kinds, defaults, units.

local common = require "libration.synth.common"
local options = require "libration.options"

local M = {}

M.number, M.above, M.level = common.number, common.above, common.level
M.whole = options.integer(1, 1 << 40)

-- A field: name, kind, default (nil: required), unit, what it means.
function M.field(name, kind, default, unit, text)
  return { name = name, kind = kind, default = default, required = default == nil, unit = unit,
           text = text }
end

function M.channel(default)
  return M.field("channel", options.integer(1, 65536), default or 1, "1", "channel of the record")
end

function M.count(default, text)
  return M.field("count", M.whole, default, "samples", text)
end

-- A place in the record: a share of its length.
function M.at(share, text)
  return M.field("at", M.whole, function(bench)
    return math.max(1, math.floor(bench.n * share))
  end, "sample number from 1", text)
end

M.seed = M.field("seed", common.key, 0, "1", "key of what is random")

-- An amplitude: a share of the channel's root mean square by default.
function M.amplitude(share, text)
  return M.field("amplitude", M.number, function(bench, read)
    return share * bench:rms(read.channel)
  end, "unit of the channel", text)
end

return M
