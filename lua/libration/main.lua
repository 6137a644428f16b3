--- What scripts/libration runs: the command with the words of its command line.

local command = require "libration.command"
local lb = require "libration"

os.exit(command.run({ ... }, lb.version), true)
