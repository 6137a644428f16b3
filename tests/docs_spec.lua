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
