--- Sound files for the tests: where the installed ones are, how to make others,
-- and how to damage them repeatably.

local M = {}

local function output_of(command)
  local pipe = assert(io.popen("env -u LD_PRELOAD " .. command))
  local text = pipe:read "a"
  pipe:close()
  return text
end

--- The path of a file of an installed Debian package, by the end of its name.
function M.of_package(package, name)
  for line in output_of("dpkg -L " .. package):gmatch "[^\n]+" do
    if line:sub(-#name) == name then
      return line
    end
  end
  error(("package %s has no file %s"):format(package, name))
end

--- Runs sox; fails the test when it does.
function M.sox(text, ...)
  assert(os.execute("env -u LD_PRELOAD sox -V1 " .. text:format(...)), "sox failed: " .. text)
end

--- What soxi says: rate, channels, samples, bits as integers.
function M.soxi(path)
  local out = {}
  for field, letter in pairs { rate = "r", channels = "c", frames = "s", bits = "b" } do
    out[field] = tonumber(output_of(("soxi -V1 -%s %s"):format(letter, path)))
  end
  return out
end

function M.bytes(path)
  local file = assert(io.open(path, "rb"))
  local text = file:read "a"
  file:close()
  return text
end

-- Removed first: some file systems write a shortened file to the disk at once.
function M.write_bytes(path, text)
  os.remove(path)
  local file = assert(io.open(path, "wb"))
  file:write(text)
  file:close()
end

--- A temporary file name with an ending, removed by M.clean.
local made = {}
function M.temporary(ending)
  local name = os.tmpname()
  made[#made + 1] = name
  if ending then
    name = name .. ending
    made[#made + 1] = name
  end
  return name
end

function M.clean()
  for _, name in ipairs(made) do os.remove(name) end
  made = {}
end

--- A generator of integers in low .. high that repeats on every Lua build.
function M.generator(seed)
  local state = seed
  return function(low, high)
    state = state * 6364136223846793005 + 1442695040888963407
    return low + ((state >> 33) % (high - low + 1))
  end
end

--- A copy of text with one to eight bytes of its first `span` changed, cut or doubled.
function M.damage(text, random, span)
  span = math.min(span, #text)
  for _ = 1, random(1, 8) do
    local at = random(1, span)
    local kind = random(1, 10)
    local byte = string.char(kind <= 6 and random(0, 255) or kind == 7 and 255 or 0)
    if kind == 9 then
      text = text:sub(1, at - 1) .. text:sub(at + random(1, 4))
    elseif kind == 10 then
      text = text:sub(1, at) .. text:sub(math.max(at - 3, 1))
    else
      text = text:sub(1, at - 1) .. byte .. text:sub(at + 1)
    end
    if #text == 0 then return "R" end
    span = math.min(span, #text)
  end
  return text
end

--- Opens and reads a file whatever is in it; returns "read", or the code of the
-- refusal, and fails when a refusal does not name the file.
function M.try(store, path)
  local sound <close>, message, code = store.open(path)
  if sound then
    local facts = sound:facts()
    if facts.frames == 0 then
      return "empty"
    end
    local blocks
    blocks, message, code = sound:read(math.min(facts.frames, 5000))
    if blocks then
      assert(#blocks == facts.channels and #blocks[1] == math.min(facts.frames, 5000))
      return "read"
    end
  end
  assert(message:find(path, 1, true), message)
  return code
end

return M
