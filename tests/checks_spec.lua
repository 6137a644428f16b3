-- The checks of the sources, as tests; and proof that their alarms ring.

local function run(command)
  local pipe = assert(io.popen(command .. " 2>&1", "r"))
  local text = pipe:read("a")
  return pipe:close() == true, text
end

local function passes(command)
  local ok, text = run(command)
  assert(ok, text)
end

local function write(path, text)
  local file = assert(io.open(path, "w"))
  assert(file:write(text))
  assert(file:close())
end

describe("sources #checks", function()
  it("have only the arrows of the table", function()
    passes "lua5.4 scripts/check-arrows"
  end)

  it("keep to the rules on sizes, words and places", function()
    passes "lua5.4 scripts/check-text"
  end)

  it("compile to objects that know, keep and show only what they may", function()
    passes "lua5.4 scripts/check-symbols"
  end)

  it("document every public function", function()
    passes "scripts/env lua5.4 scripts/docs --check"
  end)

  it("please luacheck", function()
    passes "luacheck -q --no-color lua tests $(grep -lE '^.!.*lua5\\.4' scripts/*)"
  end)

  it("please the second compiler", function()
    passes "make -s -k -j2 lint-c"
  end)

  it("are shell scripts that parse", function()
    passes "for f in $(grep -l '^.!/bin/sh' scripts/* .ci/*); do sh -n $f || exit 1; done"
  end)
end)

describe("check-arrows #checks", function()
  local root

  before_each(function()
    root = os.tmpname()
    os.remove(root)
    passes("mkdir -p " .. root .. "/csrc/base " .. root .. "/csrc/window " .. root
      .. "/lua/libration")
  end)

  after_each(function()
    os.execute("rm -rf " .. root)
  end)

  local function complaint()
    local ok, text = run("lua5.4 scripts/check-arrows --root " .. root)
    return not ok and text or "no complaint"
  end

  local faults = {
    { "an arrow that is not in the table", "csrc/base/a.c", '#include "window/window.h"\n',
      "base/ may not know window/" },
    { "an include without a room", "csrc/base/a.c", '#include "a.h"\n', "names no room" },
    { "a file in no room", "csrc/stray.c", "\n", "stands in no room" },
    { "Lua outside its room", "csrc/base/a.c", "# include <lua.h>\n", "belongs to bind/" },
    { "FFTW outside its room", "csrc/window/a.c", "#include <fftw3.h>\n",
      "belongs to spectrum/" },
    { "sound files outside their room", "csrc/window/a.c", "#include <sndfile.h>\n",
      "belongs to store/" },
    { "a header that includes itself by another", "csrc/base/a.h",
      '#include "base/a.h"\n', "in a circle: base/a.h" },
    { "the front door required back", "lua/libration/a.lua", 'local lb = require "libration"\n',
      "front door" },
    { "a require inside a function", "lua/libration/a.lua",
      'local M = {}\nfunction M.f()\n  return require("libration.b")\nend\nreturn M\n',
      'a.lua:3: require "libration.b" inside a function' },
    { "modules that require each other", "lua/libration/a.lua",
      'local a = require "libration.a"\nreturn a\n', "in a circle" },
    { "a require of a computed name", "lua/libration/a.lua",
      'local name = "x"\nreturn require(name)\n', "plain string" },
  }

  for _, fault in ipairs(faults) do
    it("sees " .. fault[1], function()
      write(root .. "/" .. fault[2], fault[3])
      assert.has_match(fault[4], complaint(), 1, true)
    end)
  end

  it("does not take a word in a comment or a string for an arrow", function()
    write(root .. "/lua/libration/a.lua", '-- require "libration"\nlocal M = {}\n'
      .. "--[[ function ( require 'libration' ]]\nlocal s = [[require 'libration']]\n"
      .. 'if s then M.s = "function" end\nlocal b = require "libration.b"\nM.b = b\nreturn M\n')
    assert.are.equal("no complaint", complaint())
  end)
end)
