--- busted's output: one line per spec file, failures in full, totals last.
-- With LBR_RESULT set the totals also go to that file, which is how the
-- parallel runner tells a finished file from one that took busted down.

local leftovers = dofile("tests/support/leftovers.lua")

local function text(message)
  if type(message) == "string" then
    return message
  end
  return message == nil and "no message" or require("pl.pretty").write(message)
end

return function()
  local busted = require "busted"
  local totals = { passed = 0, failed = 0, skipped = 0 }
  local file, leftover, stray

  local function full_name(element)
    local names = {}
    while element and element.descriptor ~= "file" and element.descriptor ~= "suite" do
      table.insert(names, 1, element.name or element.descriptor)
      element = busted.parent(element)
    end
    return table.concat(names, " ")
  end

  local function fail(element, message, trace)
    local at = trace or element.trace
    local place = at and at.short_src and ("%s:%s: "):format(at.short_src, at.currentline) or ""
    totals.failed = totals.failed + 1
    io.write("\nFAILED ", place, full_name(element), "\n", text(message), "\n")
  end

  -- busted's own count, which makes its exit status, has to hear of it too.
  local function fail_file(message)
    busted.publish({ "error", "file" }, { descriptor = "file", name = file }, nil, message, {})
  end

  local function on_error(element, _, message, trace)
    fail(element, (file or element.name or "") .. ": " .. text(message), trace)
    return nil, true
  end

  local function file_start(element)
    file = element.name
    leftover = leftovers.watch()
    stray = leftovers.watch_files(".")
    return nil, true
  end

  local function file_end(element)
    for _, path in ipairs(stray()) do
      fail_file("left a file behind: " .. path)
    end
    io.write(("%7.2f s  %s\n"):format(element.duration or 0, element.name))
    io.flush()
    return nil, true
  end

  local function test_end(element, _, status)
    local left = leftover()
    if left then
      fail_file(("%s left behind: %s"):format(full_name(element), left))
    end
    if status == "success" then
      totals.passed = totals.passed + 1
    elseif status == "pending" then
      totals.skipped = totals.skipped + 1
      io.write("skipped ", full_name(element), "\n")
    end
    return nil, true
  end

  local function suite_end()
    local line = ("%d passed, %d failed, %d skipped"):format(
      totals.passed, totals.failed, totals.skipped)
    local path = os.getenv("LBR_RESULT")
    if path then
      local out = assert(io.open(path, "w"))
      assert(out:write(line, "\n"))
      assert(out:close())
    end
    print(line)
    return nil, true
  end

  local handler = {}
  function handler.subscribe()
    busted.subscribe({ "file", "start" }, file_start)
    busted.subscribe({ "file", "end" }, file_end)
    busted.subscribe({ "test", "end" }, test_end)
    busted.subscribe({ "error" }, on_error)
    busted.subscribe({ "failure" }, on_error)
    busted.subscribe({ "suite", "end" }, suite_end)
  end
  return handler
end
