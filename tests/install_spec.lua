-- make install and make uninstall, below a folder of our own.

local function run(command)
  local pipe = assert(io.popen("(" .. command .. ") 2>&1", "r"))
  local text = pipe:read("a")
  return pipe:close() == true, text
end

describe("installation #checks", function()
  local root, said

  setup(function()
    root = os.tmpname()
    os.remove(root)
    local ok, text = run("make -s install PREFIX=/opt/line DESTDIR=" .. root)
    assert(ok, text)
    said = text
  end)

  teardown(function()
    os.execute("rm -rf " .. root)
  end)

  it("gives a library that loads without the tree", function()
    local prefix = root .. "/opt/line"
    local ok, text = run(([[cd / && env -u LUA_PATH -u LUA_CPATH
      LUA_PATH_5_4="%s/share/lua/5.4/?.lua;%s/share/lua/5.4/?/init.lua"
      LUA_CPATH_5_4="%s/lib/lua/5.4/?.so"
      lua5.4 -e 'local lb = require "libration"
        assert(package.searchpath("libration", package.path):find("/opt/line", 1, true))
        assert(package.searchpath("libration.core", package.cpath):find("/opt/line", 1, true))
        assert(#lb.window("hann"):samples(8) == 8)']]):gsub("\n%s*", " "):format(
      prefix, prefix, prefix))
    assert(ok, text)
  end)

  it("says what plain Lua needs to find it, and that works", function()
    local paths = said:gsub("/opt/line", root .. "/opt/line"):match "  (export LUA_PATH=.*\n)"
    local ok, text = run("cd / && unset LUA_PATH_5_4 LUA_CPATH_5_4\n" .. paths
      .. "lua5.4 -e 'print(#require(\"libration\").window(\"hann\"):samples(8))'")
    assert(ok, text)
    assert.are.equal("8\n", text)
    ok, text = run("make -s install PREFIX=/usr/local DESTDIR=" .. root .. "/default")
    assert(ok, text)
    assert.are.equal("", text)
    os.execute("rm -r " .. root .. "/default")
  end)

  it("holds every file of the library", function()
    local ok, text = run(("cd lua && find . -type f | sort && echo -- && "
      .. "cd %s/opt/line/share/lua/5.4 && find . -type f | sort"):format(root))
    assert(ok, text)
    local source, installed = text:match("^(.-)%-%-\n(.*)$")
    assert.are.equal(source, installed)
  end)

  it("gives a command that finds its library from anywhere", function()
    local ok, text = run(("cd / && env -u LUA_PATH_5_4 -u LUA_CPATH_5_4 -u LUA_PATH -u LUA_CPATH"
      .. " %s/opt/line/bin/libration --help"):format(root))
    assert(ok, text)
    assert.has_match("plan", text)
  end)

  it("is taken away completely", function()
    local ok, text = run("make -s uninstall PREFIX=/opt/line DESTDIR=" .. root
      .. " && find " .. root .. " -type f")
    assert.is_true(ok)
    assert.are.equal("", text)
  end)
end)
