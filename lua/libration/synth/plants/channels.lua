--- Failures between channels: crosstalk, swaps, polarity.

local fields = require "libration.synth.plants.fields"
local options = require "libration.options"

local field = fields.field

local function number(name, default, text)
  return field(name, options.integer(1, 65536), default, "1", text)
end

return {
  { name = "ghost", row = 41, does = "a multiplexed channel keeps a part of its neighbour",
    fields = { number("from", 1, "the neighbour"), number("into", 2, "the channel"),
      field("share", fields.number, 0.02, "1", "part of the neighbour that is added") },
    apply = function(bench, o)
      bench:channel(o.into).values:add(bench:channel(o.from).values, o.share)
    end },
  { name = "channel_swap", row = 42, does = "two channels are exchanged, their labels are not",
    fields = { number("first", 1, "one channel"), number("second", 2, "the other") },
    apply = function(bench, o)
      local a, b = bench:channel(o.first), bench:channel(o.second)
      a.values, b.values = b.values * (a.factor / b.factor), a.values * (b.factor / a.factor)
    end },
  { name = "polarity", row = 43, does = "a channel is upside down", fields = { fields.channel() },
    apply = function(bench, o) bench:channel(o.channel).values:scale(-1) end },
}
