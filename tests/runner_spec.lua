-- The runner of the tests, the sweep's allocator and the other checks: they have
-- to see what is wrong, or a clean result says nothing.

local docstrings = require "tests.support.docstrings"
local rules = require "tests.support.docs_rules"
local lexer = require "tests.support.lexer"

local folder

local function write(name, text)
  local file = assert(io.open(folder .. "/" .. name, "w"))
  assert(file:write(text))
  assert(file:close())
  return folder .. "/" .. name
end

local function run(command)
  local pipe = assert(io.popen(command .. " 2>&1", "r"))
  local text = pipe:read("a")
  return pipe:close() == true, text
end

local function in_folder()
  before_each(function()
    folder = os.tmpname()
    os.remove(folder)
    assert(os.execute("mkdir -p " .. folder .. "/obj/window " .. folder .. "/libration"))
  end)
  after_each(function()
    os.execute("rm -rf " .. folder)
  end)
end

describe("suite #checks", function()
  in_folder()

  local function suite()
    return run("BUILD=" .. folder .. " scripts/env lua5.4 tests/support/suite.lua -j 2 " .. folder)
  end

  local function last_line(text)
    return text:match("([^\n]*)\n$")
  end

  it("adds up what passed, failed and was skipped, and ends with that line", function()
    write("a_spec.lua", 'it("a", function() end) it("b", function() assert(false, "why") end)')
    write("b_spec.lua", 'it("c", function() end) pending' .. '("d")')
    local ok, text = suite()
    assert.is_false(ok)
    assert.are.equal("2 passed, 1 failed, 1 skipped", last_line(text))
    assert.has_match("a_spec.lua:1: why", text, 1, true)
  end)

  it("names a file that took its interpreter down", function()
    write("a_spec.lua", 'it("a", function() end)')
    write("b_spec.lua", 'it("b", function() os.execute("kill -SEGV $PPID") end)')
    local ok, text = suite()
    assert.is_false(ok)
    assert.are.equal("1 passed, 1 failed, 0 skipped", last_line(text))
    assert.has_match("FAILED " .. folder .. "/b_spec.lua\nended without a result", text, 1, true)
  end)

  it("takes a file that does not even compile for a failure", function()
    write("a_spec.lua", "it(")
    local ok, text = suite()
    assert.is_false(ok)
    assert.has_match("^0 passed, [1-9]%d* failed", last_line(text))
  end)

  it("fails when there was nothing to run", function()
    local ok, text = suite()
    assert.is_false(ok)
    assert.are.equal("0 passed, 0 failed, 0 skipped", last_line(text))
  end)

  it("fails a file for what it leaves behind", function()
    write("a_spec.lua", 'it("a", function() rawset(_G, "left", 1) end)')
    write("b_spec.lua", 'it("b", function() require("lfs").chdir("/") end)')
    local ok, text = suite()
    assert.is_false(ok)
    assert.are.equal("2 passed, 2 failed, 0 skipped", last_line(text))
    assert.has_match("new global left", text, 1, true)
    assert.has_match("working directory is now /", text, 1, true)
  end)
end)

describe("check-symbols #checks", function()
  in_folder()

  local function compile(source, shown)
    local path = write("x.c", source)
    assert(run(("gcc -fPIC -c -o %s/obj/window/x.o %s"):format(folder, path)))
    assert(run(("gcc -shared -o %s/libration/core.so %s/obj/window/x.o"):format(folder, folder)))
    local ok, text = run("BUILD=" .. folder .. " lua5.4 scripts/check-symbols")
    assert.are.equal(shown == nil, ok, text)
    assert.has_match(shown or "0 complaints", text, 1, true)
  end

  it("sees Lua outside bind/", function()
    compile("int lua_gettop(void *L); int luaopen_x(void *L) { return lua_gettop(L); }",
      "knows Lua (lua_gettop)")
  end)

  it("sees variables, initialised or not, also those inside functions", function()
    for _, source in ipairs { "static int n; int luaopen_x(void) { return n++; }",
                              "static int n = 3; int luaopen_x(void) { return n++; }",
                              "int luaopen_x(void) { static int n; return n++; }" } do
      compile(source, "the variable n")
    end
  end)

  it("sees what else the module shows", function()
    compile("int luaopen_x(void) { return 1; } int helper(void) { return 2; }", "exports helper")
  end)

  it("sees what nothing defines", function()
    compile("int lbr_x(void); int luaopen_x(void) { return lbr_x(); }", "nothing defines lbr_x")
  end)

  it("lets tables of constants be", function()
    compile('static const char *const names[] = {"a", "b"};\n'
      .. "int luaopen_x(int i) { return names[i][0]; }")
  end)
end)

describe("docstring rules", function()
  in_folder()

  local function complaints(source)
    local path = write("x.lua", source)
    local page = docstrings.lua_page(path, "libration.x")
    return table.concat(rules.check({ page }), "\n")
  end

  local good = "--- Purpose.\nlocal M = {}\n\n--- Doubles.\n-- @param x number: any\n"
      .. "-- @return number: twice x\n-- @usage\n-- assert(lb)\n"

  it("find nothing to say about a documented function", function()
    assert.are.equal("", complaints(good .. "function M.double(x)\nend\nreturn M\n"))
  end)

  it("see what is missing or does not match", function()
    for _, case in ipairs {
      { good .. "function M.double(y)\nend\n", "no @param for y" },
      { good .. "function M.double()\nend\n", "a @param x that it does not take" },
      { good .. "function M.double(\n  x,\n  factor)\nend\n", "no @param for factor" },
      { good .. "\nfunction M.double(x)\nend\n", "has no docstring" },
      { "--- Purpose.\nlocal M = {}\nM.double = function(x) end\n", "double has no docstring" },
      { "--- Purpose.\nlocal M = {}\nlocal function double(x) end\nM.double = double\n",
        "double has no docstring" },
      { "--- Purpose.\nlocal M = {}\n--- Doubles.\nfunction M.double()\nend\n", "no @usage" },
      { "local M = {}\nreturn M\n", "does not open with its purpose" },
    } do
      assert.has_match(case[2], complaints(case[1]), 1, true)
    end
  end)

  it("tell classes that are handed out, which have a name, from the others", function()
    assert.are.equal("", complaints("--- Purpose.\nlocal Part = {}\nfunction Part:f()\nend\n"))
    for _, class in ipairs { 'local Part = { __name = "x" }\n',
                             'local Part = {}\nPart.__name = "x"\n' } do
      assert.has_match("Part:f has no docstring",
        complaints("--- Purpose.\n" .. class .. "function Part:f()\nend\n"), 1, true)
    end
  end)

  it("leave local functions and names with an underscore alone", function()
    assert.are.equal("", complaints("--- Purpose.\nlocal M = {}\nlocal function a() end\n"
      .. "function M._b()\nend\nfunction M:__tostring()\nend\nreturn M, a\n"))
  end)
end)

describe("lexer", function()
  it("keeps count of functions through every kind of block", function()
    local source = [==[
local a = function() if x then for i = 1, 2 do while y do repeat z() until true end end end end
-- function
--[[ function
]] local s = "function" .. [=[ function ]] ]=] .. 'fun\'ction'
mark = 1
local function g() do inner = 2 end return function() deep = 3 end end
]==]
    local seen = {}
    lexer.walk(lexer.tokens(source), function(_, t, depth)
      seen[t.text] = { t.line, depth }
    end)
    assert.are.same({ 1, 1 }, seen.z)
    assert.are.same({ 5, 0 }, seen.mark)
    assert.are.same({ 6, 1 }, seen.inner)
    assert.are.same({ 6, 2 }, seen.deep)
    assert.is_truthy(seen["fun\\'ction"])
  end)
end)
