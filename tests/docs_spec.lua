-- The example in every docstring runs, quickly, and holds.

local core = require "libration.core"
local lb = require "libration"
local docstrings = require "tests.support.docstrings"

-- The code sits on its own line numbers, so that a failure names file and line.
local function compile(entry)
  local source = ("\n"):rep(entry.doc.usage_line - 1)
      .. "local lb, core = ...; " .. entry.doc.usage
  local env = setmetatable({ print = function() end }, { __index = _G })
  return assert(load(source, "@" .. entry.file:gsub("^%./", ""), "t", env))
end

-- Where it went wrong, without the frames of the test runner below it.
local function explain(message)
  local frames = debug.traceback(message, 2)
  return (frames:gsub("\n\t%[C%]: in function 'xpcall'.*$", ""))
end

describe("the start page of the reference", function()
  local start = require "tests.support.docs_start"
  local pages = docstrings.pages(".", core)
  local rooms = getmetatable(lb).rooms

  it("lists every room of the library and the methods of a plan, each with a summary", function()
    local seen = {}
    for _, row in ipairs(start.list(pages, rooms)) do
      seen[row.name] = true
      assert(row.summary:find "^%u.+[.:]", row.name .. ": " .. row.summary)
    end
    for name in pairs(rooms) do
      assert.is_true(seen["lb." .. name], name)
    end
    assert.is_true(seen["plan:prove"] and seen["record:measure"])
  end)

  it("stands first in the index, and its links lead somewhere #checks", function()
    assert(os.execute("lua5.4 scripts/docs >/dev/null"))
    local function read(name)
      local file = assert(io.open("build/docs/" .. name, "rb"))
      local text = file:read "a"
      file:close()
      return text
    end
    local head = read("index.html"):match "^(.-)<h1>All modules</h1>"
    local count = 0
    for page, mark, name in head:gmatch '<a href="([^"#]+)#?([^"]*)">([^<]+)</a>' do
      assert(mark == "" or read(page):find('id="' .. mark .. '"', 1, true), name)
      count = count + 1
    end
    assert.is_true(count >= 20)
    assert.truthy(head:find '<a href="libration%-plan.html#plan%-plan">lb.plan</a>')
  end)

  it("says what the library does not have", function()
    local fine, message = pcall(start.list, pages, {})
    assert.is_false(fine)
    assert.equal("start page: no room lb.plan", message)
  end)
end)

describe("usage example of", function()
  for _, page in ipairs(docstrings.pages(".", core)) do
    for _, entry in ipairs(page.entries) do
      if entry.doc and entry.doc.usage then
        it(entry.name, function()
          local chunk = compile(entry)
          local started = core.base.clock()
          local ok, message = xpcall(chunk, explain, lb, core)
          assert(ok, message)
          assert(core.base.clock() - started < 2, "an example takes less than a moment")
        end)
      end
    end
  end
end)
