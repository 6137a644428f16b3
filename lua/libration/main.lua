--- What scripts/libration runs: the command with the words of its command line.

local command = require "libration.command"
local version = require "libration.version"

os.exit(command.run({ ... }, version), true)
