--- What the command says about itself.

local M = {}

M.general = [[
libration plans measurements of spectral lines: write down which lines matter
and which digitizer is at hand, and get the shortest measurement that is
guaranteed to hold every tolerance, or what stands in the way.

  libration                        a prompt with the library at hand
  libration SCRIPT.lua [WORD...]   run a Lua script with the library at hand
  libration plan FILE...           plan what the data files demand
  libration prove FILE...|PLAN     simulate a plan and attack its error bounds
  libration measure PLAN RECORD    measure a record by a saved plan
  libration windows                list the windows a plan may use
  libration prompt                 the prompt, also when input is no terminal
  libration help [COMMAND]         this text, or all about one command
  libration --version              which version this is

A first plan: save these lines as pump.demand, then  libration plan pump.demand

  demand = {
    title = "My pump",
    lines = { { name = "shaft", hz = 24.6, drift = "0.1 %",
                amplitude = "0.05 .. 2 m/s^2", tolerance = "1 %" } },
    noise = "60 um/s^2/rtHz", sensitivity = "10 mV/(m/s^2)",
  }
  digitizer = { rates = { "6.4 kS/s", "12.8 kS/s" }, bits = 24, range = "5 V",
                timebase = "25 ppm" }

Exit codes: 0 it holds, 1 it does not (refused, a bound was violated, or a
line measured is outside its demand), 2 wrong use or a mistake in a data file,
3 the world refused (a file, a disk). Results go to standard output; with
--json exactly one JSON document (with exit codes 2 and 3 "error" and "code"),
messages to standard error. Advisory only: a plan is a calculation, not a
safety device.]]

local heads = {
  plan = { "plan FILE... [options]",
    "Reads demand = { ... } and digitizer = { ... } (or digitizers = { ... }) from the data\n"
      .. "files and prints the shortest plan that holds every tolerance, or a refusal that says\n"
      .. "what binds and what would help. With several digitizers the shortest plan of all." },
  prove = { "prove FILE...|PLAN [options]",
    "Simulates a plan end to end with random amplitudes, phases and frequencies, lets an\n"
      .. "adversary look for the worst case, and counts violations of the promised bounds.\n"
      .. "Takes a saved plan, or data files that are planned first." },
  measure = { "measure PLAN RECORD [options]",
    "Measures every line of a saved plan in a record (WAV, FLAC, Ogg, CSV and whatever else\n"
      .. "lb.record.read reads) with its uncertainty, or refuses the record and says why. A sound\n"
      .. "file holds shares of a full scale, which without --full-scale is taken to be the range\n"
      .. "of the plan's digitizer. Exit code 1 when the record is refused, or when a line is\n"
      .. "outside the amplitudes that were demanded." },
  windows = { "windows [options]", "Lists the windows with their figures of merit." },
  prompt = { "prompt", "Reads Lua, runs it, prints the results; lb is the library, help() helps.\n"
    .. "Ctrl-C stops what runs, Ctrl-D leaves." },
  help = { "help [COMMAND]", "Explains the whole, or one command." },
}

--- Help on one command.
-- @param name string: of the command
-- @param options table: its options
-- @return string: several lines
-- @usage
-- local about = require("libration.command.help").about
-- assert(about("windows", { json = { text = "as JSON" } }):find("--json", 1, true))
function M.about(name, options)
  local head = heads[name]
  local lines, names = { "libration " .. head[1], "", head[2] }, {}
  for option in pairs(options) do
    names[#names + 1] = option
  end
  table.sort(names)
  for i, option in ipairs(names) do
    local value = options[option].value
    local word = "--" .. option .. (value and " " .. value or "")
    lines[#lines + 1] = (i == 1 and "\n" or "") .. ("  %-22s %s"):format(word, options[option].text)
  end
  return table.concat(lines, "\n")
end

return M
