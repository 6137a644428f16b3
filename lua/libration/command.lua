--- The command `libration`: plan, prove and measure from a shell.
-- Results go to standard output, messages to standard error; the exit code is 0
-- when it holds, 1 when it does not, 2 for wrong use or a mistake in a file, 3
-- when the system refuses. A traceback means a mistake of ours.

local file = require "libration.report.file"
local help = require "libration.command.help"
local inputs = require "libration.command.inputs"
local json = require "libration.json"
local measure = require "libration.measure"
local numbers = require "libration.report.numbers"
local planner = require "libration.plan"
local prover = require "libration.proof"
local report = require "libration.report"
local table_text = require "libration.report.table"
local units = require "libration.units"
local window = require "libration.window"
local words = require "libration.command.words"

local M = {}

local HOLDS, FAILS, MISUSE, WORLD = inputs.HOLDS, inputs.FAILS, inputs.MISUSE, inputs.WORLD

-- Ends the command with a message: raised as a table, so it is no mistake of ours.
local function stop(message, code)
  error({ message = message, code = code or MISUSE }, 0)
end

-- The value, or the end of the command; codes are the library's or exit codes.
local function need(value, message, code)
  if value == nil then
    stop(message, type(code) == "string" and inputs.exit_code(code) or code)
  end
  return value
end

local function out(text)
  local fine, why = io.stdout:write(text, "\n")
  if not (fine and io.stdout:flush()) then
    stop("standard output: " .. tostring(why or "cannot be written"), WORLD)
  end
end

local function out_json(value)
  local text, message = json.encode(report.facts.of(value))
  out(need(text, message, MISUSE))
end

-- Options that become options of lb.plan, checked here so that a mistake names
-- the option as it was typed.
local plan_options = {
  within = { value = "TIME", text = "all records together take at most this, such as \"60 s\"" },
  readings = { value = "LIST", text = "readings to choose from: tracked, bin, or both by comma" },
  windows = { value = "LIST", text = "windows to choose from, by comma, or all" },
  share = { value = "SHARE", text = "share of each tolerance that errors may take: \"80 %\"" },
  effort = { value = "TIME", text = "search at most about this long (10 s); notes say effort_s" },
  undersample = { text = "lines may stand above half the rate" },
}

local function list_of(text)
  local list = {}
  for word in text:gmatch "[^,%s]+" do
    list[#list + 1] = word
  end
  return list
end

local function checked(name, text, read)
  local value, message = read(text)
  if value == nil then
    stop("--" .. name .. ": " .. tostring(message))
  end
  return value
end

local function read_plan_options(found)
  local options = { undersample = found.undersample }
  if found.within then
    checked("within", found.within, units.seconds)
    options.within = found.within
  end
  if found.effort then
    checked("effort", found.effort, units.seconds)
    options.effort_s = found.effort
  end
  if found.share then
    checked("share", found.share, units.relative)
    options.share = found.share
  end
  options.readings = found.readings and list_of(found.readings)
  options.windows = found.windows and (found.windows == "all" and "all" or list_of(found.windows))
  return options
end

-- Calls the planner; what it says of wrong options or data is the user's.
local function plan_one(demand, digitizer, options)
  local fine, plan, refusal, code = pcall(planner.plan, demand, digitizer, options)
  if not fine then
    local text = tostring(plan)
    local place, rest = text:match "^(.-%.lua:%d+): (.*)$"
    if type(plan) ~= "string" or place and not place:find "command%.lua" then
      error(plan, 0)
    end
    stop(rest or text)
  elseif not plan and code ~= "infeasible" then
    stop(tostring(refusal), inputs.exit_code(code))
  end
  return plan, refusal
end

-- Plans on every digitizer: the shortest plan, or the first refusal; and a
-- table of all when there are several.
local function plan_all(data, options)
  local best, refused, rows = nil, nil, {}
  for i, digitizer in ipairs(data.digitizers) do
    local plan, refusal = plan_one(data.demand, digitizer, options)
    refused = refused or refusal
    if plan and (not best or plan.duration_s < best.duration_s) then
      best = plan
    end
    rows[i] = { digitizer.title or "digitizer " .. i,
      plan and numbers.time(plan.duration_s * plan.averages) or "refused",
      plan and numbers.exact(plan.rate) or "",
      plan and numbers.percent(1 - plan.worst, -1) or "" }
  end
  local overview = #rows > 1 and table.concat(table_text.layout({ { head = "digitizer" },
    { head = "takes", align = "right" }, { head = "rate", unit = "S/s", align = "point" },
    { head = "to spare", align = "right" } }, rows), "\n") .. "\n"
  return best, refused, overview
end

local pictures = { ["fold-map"] = report.plot.fold_map, spectrum = report.plot.spectrum }

local function draw(plan, folder)
  need(file.folder(folder))
  for name, picture in pairs(pictures) do
    for _, ending in ipairs { ".svg", ".png" } do
      need(picture(plan, folder .. "/" .. name .. ending))
    end
  end
end

-- A search that gave up says so in a note, which names the option of scripts.
local function hint_effort(answer)
  for _, note in ipairs(answer.notes or {}) do
    if tostring(note):find("effort_s", 1, true) then
      io.stderr:write("libration: --effort TIME lets the search take longer (the effort_s of "
        .. "the note), such as --effort \"60 s\"\n")
      return
    end
  end
end

local function budget_text(plan, which)
  local fine, text = pcall(report.text.budget, plan, tonumber(which) or which)
  if not fine then
    stop("--budget: " .. tostring(text):gsub("^.-%.lua:%d+: ", ""):gsub("^line: ", ""))
  end
  return text
end

local function show_plan(plan, overview, found, budget)
  if found.json then
    out_json(plan)
  elseif found.csv then
    out((report.csv.plan(plan):gsub("\r\n$", "")))
  else
    out((overview and overview .. "\n" or "") .. tostring(plan))
  end
  if budget and not found.json then
    out("\n" .. budget)
  end
  hint_effort(plan)
end

local function show_refusal(refusal, found)
  if found.json then
    out_json(refusal)
  else
    out(tostring(refusal))
  end
  hint_effort(refusal)
  return FAILS
end

-- A saved plan never replaces the data it was made of.
local function check_save(path, operands)
  for _, operand in ipairs(operands) do
    if inputs.same_file(path, operand) then
      stop(("--save %s would overwrite %s, the data file that is planned; give another name")
        :format(path, operand))
    end
  end
end

local commands = {}

commands.plan = {
  options = {
    json = { text = "the plan or the refusal as one JSON document" },
    csv = { text = "the plan's lines as CSV" },
    save = { value = "FILE", text = "save the plan for prove and measure" },
    plots = { value = "FOLDER", text = "draw fold map and predicted spectrum (SVG, PNG) there" },
    budget = { value = "LINE", text = "also all terms of one line's error, by name or number" },
  },
  least = 1,
}
for name, option in pairs(plan_options) do
  commands.plan.options[name] = option
end

-- Everything that may go wrong comes before the first word of the answer.
local function run_plan(found, operands)
  if found.json and found.csv then
    stop("--json and --csv exclude each other; give one")
  elseif found.save then
    check_save(found.save, operands)
  end
  local data = need(inputs.data(operands))
  local plan, refusal, overview = plan_all(data, read_plan_options(found))
  if not plan then
    return show_refusal(refusal, found)
  end
  local budget = found.budget and budget_text(plan, found.budget)
  if found.save then
    need(plan:save(found.save))
  end
  if found.plots then
    draw(plan, found.plots)
  end
  show_plan(plan, overview, found, budget)
  return HOLDS
end

commands.prove = {
  options = {
    json = { text = "the proof as one JSON document" },
    trials = { value = "N", text = "random trials, 0 to 1000000000 (10000)" },
    seed = { value = "N", text = "seed of all randomness (1)" },
    workers = { value = "N", text = "threads, 1 to 256 (one a core)" },
  },
  least = 1,
}
for name, option in pairs(plan_options) do
  commands.prove.options[name] = option
end

local function planned(found, operands)
  if #operands == 1 and inputs.is_plan(operands[1]) then
    return need(inputs.plan(operands[1]))
  end
  local plan, refusal = plan_all(need(inputs.data(operands)), read_plan_options(found))
  return plan, refusal
end

local function whole(found, name, least, most)
  return found[name] and need(words.whole(found[name], least, most, name))
end

local function run_prove(found, operands)
  local trials = whole(found, "trials", 0, 10 ^ 9)
  local seed = whole(found, "seed", 0, math.maxinteger)
  local workers = whole(found, "workers", 1, 256)
  local plan, refusal = planned(found, operands)
  if not plan then
    return show_refusal(refusal, found)
  end
  local proof = prover.prove(plan, { trials = trials, seed = seed, workers = workers })
  if found.json then
    local facts = report.facts.of(proof)
    facts.kind, facts.identity = "proof", plan.identity
    out_json(facts)
  else
    out(tostring(proof))
  end
  return proof.holds and HOLDS or FAILS
end

commands.measure = {
  options = {
    json = { text = "the measurement as one JSON document" },
    channel = { value = "N", text = "channel of the file, from 1; needed when it has several" },
    first = { value = "N", text = "number of the first sample that is read, from 1 (1)" },
    ["full-scale"] = { value = "QUANTITY", text = "largest value the file can hold: \"5 V\"" },
  },
  least = 2, most = 2,
}

-- The lines whose bounds do not hold, on standard error.
local function warn_outside(result)
  local names = {}
  for _, line in ipairs(result.lines) do
    names[#names + 1] = line.outside and line.name or nil
  end
  io.stderr:write(("libration: outside the amplitudes that were demanded, so that the bounds do "
    .. "not hold: %s\n"):format(table.concat(names, ", ")))
  return FAILS
end

local function run_measure(found, operands)
  local channel = whole(found, "channel", 1, 10000)
  local first = whole(found, "first", 1, math.maxinteger)
  local plan = need(inputs.plan(operands[1]))
  local scale = found["full-scale"]
  if scale then
    checked("full-scale", scale, function(text)
      return units.number(text, plan.demand.unit)
    end)
  end
  local record = need(inputs.record(operands[2], plan, { channel = channel,
    full_scale = scale }))
  local result, message, code = measure.measure(record, plan, { first = first })
  if not result then
    if found.json then
      out_json { kind = "refused", holds = false, message = message, code = code }
    else
      out(message)
    end
    return FAILS
  end
  if found.json then
    local facts = report.facts.of(result)
    facts.kind = "measurement"
    out_json(facts)
  else
    out(tostring(result))
  end
  return result.holds and HOLDS or warn_outside(result)
end

commands.windows = { options = { json = { text = "as one JSON document" } }, least = 0, most = 0 }

local function run_windows(found)
  local rows, list = {}, {}
  for i, name in ipairs(window.windows()) do
    local shape = window.window(name)
    rows[i] = { name, shape.title, shape.source }
    list[i] = { name = name, title = shape.title, source = shape.source,
      parameter = shape.parameter, parameter_name = shape.parameter_name,
      coefficients = shape.coefficients }
  end
  if found.json then
    out(json.encode(list))
  else
    out(table.concat(table_text.layout({ { head = "name" }, { head = "title" },
      { head = "source" } }, rows), "\n"))
  end
  return HOLDS
end

commands.help = { options = {}, least = 0, most = 1 }
commands.prompt = { options = {}, least = 0, most = 0 }

local function names_of(list)
  local names = {}
  for name in pairs(list) do
    names[#names + 1] = name
  end
  table.sort(names)
  return table.concat(names, ", ")
end

local function command_of(name)
  if not commands[name] then
    stop(("unknown command %q; valid: %s, or a file that ends in .lua"):format(tostring(name),
      names_of(commands)))
  end
  return commands[name]
end

local function run_help(_, operands)
  if operands[1] then
    out(help.about(operands[1], command_of(operands[1]).options))
  else
    out(help.general)
  end
  return HOLDS
end

local function run_prompt()
  stop("the prompt is started by scripts/libration: libration prompt, with nothing behind it")
end

commands.plan.run = run_plan
commands.prove.run = run_prove
commands.measure.run = run_measure
commands.windows.run = run_windows
commands.help.run = run_help
commands.prompt.run = run_prompt

-- Whether an option stands among the words, before any --.
local function says(line, option, short)
  for _, word in ipairs(line) do
    if word == "--" then
      return false
    elseif word == option or word == short then
      return true
    end
  end
  return false
end

local function dispatch(line, version)
  local name = line[1]
  if name == "--version" then
    out("libration " .. version)
    return HOLDS
  elseif name == nil or name == "--help" or name == "-h" then
    return name and run_help({}, {}) or stop("say what to do\n" .. help.general)
  end
  local command, rest = command_of(name), table.move(line, 2, #line, 1, {})
  if says(rest, "--help", "-h") then
    return run_help({}, { name })
  end
  local found, operands = words.read(rest, command.options)
  need(found, type(operands) == "string" and operands .. " (libration help " .. name .. ")")
  if #operands < command.least or #operands > (command.most or math.huge) then
    stop(("libration %s: %d operands; it is:\n%s"):format(name, #operands,
      help.about(name, command.options)))
  end
  return command.run(found, operands)
end

-- Tables are messages for the user; everything else is a mistake of ours.
local function explain(problem)
  if type(problem) == "table" and problem.message then
    return problem
  elseif type(problem) == "string" and problem:find "interrupted!" then
    return { message = "stopped", code = 130 }
  elseif problem == "not enough memory" then
    return { message = "not enough memory", code = WORLD }
  end
  return { message = debug.traceback("a mistake in libration itself; please report it:\n"
    .. tostring(problem), 2), code = 70 }
end

local kinds = { [MISUSE] = "misuse", [WORLD] = "world", [70] = "internal", [130] = "stopped" }

-- What went wrong, for a machine; the code is the exit code's name. Of text that is
-- not UTF-8 (a file's name, say) all bytes beyond ASCII become question marks.
local function error_json(problem)
  local message = problem.message
  if not utf8.len(message) then
    message = message:gsub("[\128-\255]", "?")
  end
  io.stdout:write(json.encode { error = message, code = kinds[problem.code] },
    "\n")
end

--- Runs a command line.
-- @param line table: the words after the command's own name
-- @param version string: of the library
-- @return integer: exit code: 0 holds, 1 does not, 2 wrong use, 3 the system
-- refused, 70 a mistake of ours, 130 stopped by Ctrl-C
-- @usage
-- assert(type(require("libration.command").run) == "function")
function M.run(line, version)
  local fine, result = xpcall(dispatch, explain, line, version)
  if fine then
    return result
  end
  io.stderr:write("libration: ", result.message, "\n")
  if says(line, "--json") then
    error_json(result)
  end
  return result.code
end

return M
