local lb = require "libration"
local lfs = require "lfs"
local sounds = dofile "tests/support/sounds.lua"

after_each(sounds.clean)

local formats = {
  { "wav", ".wav" }, { "flac", ".flac" }, { "csv", ".csv" },
  { "universal", ".uff" }, { "raw", ".record" },
  { "sigmf", ".sigmf-meta" }, { "hdf5", ".h5" },
}

local function slurp(path)
  local file = assert(io.open(path, "rb"))
  local text = file:read "a"
  file:close()
  return text
end

local folder

local function contents()
  local out = {}
  for name in lfs.dir(folder) do
    if name ~= "." and name ~= ".." then out[name] = slurp(folder .. "/" .. name) end
  end
  return out
end

before_each(function()
  folder = os.tmpname()
  os.remove(folder)
  assert(lfs.mkdir(folder))
end)

after_each(function()
  for name in lfs.dir(folder) do os.remove(folder .. "/" .. name) end
  lfs.rmdir(folder)
end)

local function small()
  return lb.record.new { rate = 8000, codes = { 1, -2, 3 }, bits = 16, full_scale = 1 }
end

-- A process of its own that writes 300 000 samples over a file of that name.
local script = [[
local lb = require "libration"
local x = lb.samples.make(300000, function(i) return i %% 1000 end)
local r = lb.record.new { rate = 8000, codes = x, bits = 16, full_scale = 1 }
local done, message, code = r:write(%q, { format = %q })
io.write(tostring(done), " ", tostring(code), " ", tostring(message))
]]

local function run(format, path, shell)
  local name = folder .. "/script.lua"
  sounds.write_bytes(name, script:format(path, format))
  local pipe = assert(io.popen(("sh -c '%s; exec lua5.4 %s' 2>&1"):format(shell, name)))
  local text = pipe:read "a"
  pipe:close()
  os.remove(name)
  return text
end

describe("writing", function()
  for _, case in ipairs(formats) do
    local format, suffix = case[1], case[2]
    it("loses nothing when the disk is full: " .. format, function()
      local path = folder .. "/x" .. suffix
      assert(small():write(path, { format = format }))
      local before = contents()
      -- 64 KiB is all that a file may have; the signal is ignored, so that writing fails
      local text = run(format, path, 'trap "" XFSZ; ulimit -f 128')
      assert.is_truthy(text:find("^nil io "), text)
      assert.is_truthy(text:find(folder, 1, true), text)
      assert.same(before, contents())
      local sound = format == "wav" or format == "flac"
      local back = assert(lb.record.read(path, sound and { full_scale = 1, unit = "1" } or nil))
      assert.equal(small():identity(), back:identity())
    end)

    it("is whole or not there: " .. format, function()
      local path = folder .. "/none/x" .. suffix
      local done, message, code = small():write(path, { format = format })
      assert.is_nil(done)
      assert.equal("io", code)
      assert.is_truthy(message:find(folder, 1, true), message)
      assert.same({}, contents())
    end)

    it("replaces no link, nor what it leads to: " .. format, function()
      local path = folder .. "/x" .. suffix
      assert(lfs.link("/dev/full", path, true))
      local done, message, code = small():write(path, { format = format })
      assert.is_nil(done)
      assert.equal("io", code)
      assert.has_match("symbolic link", message)
      os.remove(path)
      assert.same({}, contents())
    end)
  end
end)

describe("reading", function()
  it("names what is no file", function()
    for _, path in ipairs { folder, "/dev/null", folder .. "/none" } do
      local r, message, code = lb.record.open(path)
      assert.is_nil(r)
      assert.equal("io", code)
      assert.is_truthy(message:find(path, 1, true))
    end
  end)

  it("goes by what a file holds, not by its name", function()
    for _, case in ipairs(formats) do
      if case[1] ~= "sigmf" and case[1] ~= "raw" then
        local path = folder .. "/plain.bin"
        assert(small():write(path, { format = case[1] }))
        local r = assert(lb.record.read(path))
        assert.equal(case[1], r.container)
      end
    end
  end)
end)
