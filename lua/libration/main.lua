--- What scripts/libration runs: the command with the words of its command line.

os.exit(require("libration.command").run({ ... }), true)
