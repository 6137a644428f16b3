-- W9: what it costs to come in, and what a call costs.

local core = require "libration.core"

-- A new process each time: requiring again in this one would find everything
-- loaded. The child tells the processor time that it took; that of starting
-- the interpreter is not in it.
local function import(code)
  local command = ("lua5.4 -e 'local t = os.clock() %s io.write(os.clock() - t)'"):format(code)
  return function()
    local pipe = assert(io.popen(command, "r"))
    local taken = pipe:read("n")
    pipe:close()
    return assert(taken, "the child told no time")
  end
end

local rooms = 'local lb = require "libration"; local _ = lb.units, lb.filter'
local x = core.samples.new(64)

return {
  { name = "W9 import", work = "require the library, fresh state", goal = 5e-3,
    ours = import 'require "libration"', peer = "w9_import.py" },
  { name = "W9 import and use", work = "two rooms loaded too", goal = 5e-3,
    ours = import(rooms), peer = "w9_import.py" },
  { name = "W9 call", work = "a call on 64 samples (length)", goal = 0.5e-6, times = 100000,
    peer = "w9_call.py", peer_times = 200,
    ours = function()
      local _ = #x
    end },
}
