--- Sound files: WAV, RF64, Wave64, FLAC, Ogg Vorbis; WAV and RF64 are written.

local fraction = require "libration.fraction"
local store = require("libration.core").store

local M = {
  name = "wav", title = "sound file (WAV, RF64, Wave64, FLAC, Ogg Vorbis)",
  suffixes = { ".wav", ".wave", ".rf64" }, fields = { bits = true, float = true },
}

local heads = { "RIFF", "RF64", "BW64", "riff", "fLaC", "OggS" }

function M.matches(head)
  for _, start in ipairs(heads) do
    if head:sub(1, 4) == start then
      return true
    end
  end
  return false
end

function M.open(path)
  local sound, message, code = store.open(path)
  if not sound then
    return nil, message, code
  end
  local facts = sound:facts()
  local channels = {}
  for k = 1, facts.channels do
    channels[k] = { bits = facts.integer and facts.bits or nil, integer = facts.integer,
                    lossy = facts.lossy, code_full = facts.full_scale }
  end
  return { container = facts.container, rate = fraction.new(facts.rate), rate_is_rounded = true,
           channels = channels, feed = sound:feed() }
end

-- What one stored sample is multiplied by: up to full scale where it is known.
local function stored_factor(channel, spec, path)
  if not channel.full_scale then
    if spec.integer then
      return nil, ("%s: the full scale of %s is not known; write floats"):format(path, channel.name)
    end
    return channel.factor
  end
  return channel.factor / channel.full_scale * (spec.integer and 2 ^ (spec.bits - 1) or 1)
end

-- How to write: integers in the bits asked for or stored, else 64-bit floats.
local function spec_of(record, options)
  local first = record.channels[1]
  local bits, float = options.bits, options.float
  if float == nil then float = bits == nil and not first.integer end
  if bits == nil then bits = float and 64 or first.bits end
  local valid = float and { [32] = true, [64] = true }
    or { [8] = true, [16] = true, [24] = true, [32] = true }
  if not valid[bits] then
    return nil, ("record: bits is %s; WAV holds integers of 8, 16, 24, 32 and floats of 32, 64")
      :format(tostring(bits))
  end
  return { rate = record.rate.numerator, bits = bits, integer = not float, scale = 1 }
end

local function write(record, path, options, flac)
  local spec, misuse = spec_of(record, options)
  if not spec then
    error(misuse, 4)
  elseif record.rate.denominator ~= 1 then
    return nil, ("%s: the rate, %s S/s, is not whole, and WAV holds no other"):format(path,
      fraction.text(record.rate)), "domain"
  elseif record.rate.numerator > 0x7fffffff then
    return nil, ("%s: the rate, %s S/s, is more than WAV holds"):format(path,
      fraction.text(record.rate)), "domain"
  end
  local blocks = {}
  for k, channel in ipairs(record.channels) do
    local factor, problem = stored_factor(channel, spec, path)
    if not factor then
      error("record: " .. problem, 4)
    end
    blocks[k] = factor == 1 and channel.data or channel.data * factor
  end
  spec.flac = flac
  return store.write(path, spec, blocks)
end

function M.write(record, path, options)
  return write(record, path, options, false)
end

--- The same as FLAC, which holds integers of 8, 16 and 24 bits without loss.
M.flac = {
  name = "flac", title = "FLAC", suffixes = { ".flac" }, fields = { bits = true },
  matches = function(head) return head:sub(1, 4) == "fLaC" end, open = M.open,
}

function M.flac.write(record, path, options)
  if not record.channels[1].integer and options.bits == nil then
    return nil, path .. ": FLAC holds integers; give bits, 16 or 24", "domain"
  end
  return write(record, path, { bits = options.bits, float = false }, true)
end

return M
