--- Plans, budgets and refusals as text that a person reads at a glance.
-- Every function returns text without a newline at its end. Facts come from the
-- plan alone; nothing is computed here but shares.

local numbers = require "libration.report.numbers"
local layout = require "libration.report.table"
local how = require "libration.report.how"

local M = {}

local width = 96

--- Cautions that every plan and proof carries.
M.caution = "Advisory only: not machine protection, not an interlock, not a declaration of safety. "
  .. "A plan is a calculation and a simulated result is not a measurement: numbers are only as "
  .. "traceable as the calibration chain. An absent line is no proof of a healthy machine."

local function push(lines, more)
  table.move(more, 1, #more, #lines + 1, lines)
end

local function paragraph(lines, text, indent)
  for _, line in ipairs(layout.wrap(text, width - indent)) do
    lines[#lines + 1] = (" "):rep(indent) .. line
  end
end

local function pairs_of(lines, rows)
  for _, row in ipairs(rows) do
    if row[2] then
      lines[#lines + 1] = string.format("  %-9s %s", row[1], layout.safe(row[2]))
    end
  end
end

-- What the worst line leaves of its tolerance; a plan may use it to the end.
local function spare(plan)
  local left = 1 - plan.worst
  return left < 0.001 and "less than 0.1 %" or numbers.percent(left, -1)
end

--- One line that says whether a plan holds.
-- @param plan table: a plan
-- @return string: "holds every tolerance with 23 % to spare", or what does not
-- @usage
-- local verdict = require("libration.report.text").verdict
-- assert(verdict { worst = 0.767 } == "holds every tolerance with 23 % to spare")
function M.verdict(plan)
  if plan.worst <= 1 then
    return "holds every tolerance with " .. spare(plan) .. " to spare"
  end
  return "does NOT hold: the worst line takes " .. numbers.percent(plan.worst)
    .. " of its tolerance"
end

local function heading(lines, plan)
  local demand, digitizer = plan.demand or {}, plan.digitizer or {}
  push(lines, layout.wrap(demand.title or "Plan", width))
  lines[#lines + 1] = M.verdict(plan)
  lines[#lines + 1] = ""
  pairs_of(lines, {
    { "digitizer", digitizer.title },
    { "rate", how.rate(plan) },
    { "record", how.record(plan) },
    { "window", how.window(plan) },
    { "reading", how.reading(plan) },
    { "noise", how.coverage(plan) },
    { "identity", plan.identity and plan.identity:sub(1, 16) },
  })
end

local function amplitude(line)
  if not line.least then
    return ""
  end
  return numbers.exact(line.least) .. " .. " .. numbers.exact(line.most)
end

local function share(ratio)
  return ratio and numbers.bar(ratio) .. " " .. numbers.percent(ratio) or ""
end

local function columns_of(plan, has_hz)
  local unit = plan.demand and plan.demand.unit or ""
  local columns = {
    { head = "line" },
    { head = "frequency", unit = "Hz", align = "point" },
    { head = "bin", align = "point" },
    { head = "amplitude", unit = unit, align = "right" },
    { head = "tolerance", unit = unit, align = "point" },
    { head = "worst error", unit = unit, align = "point" },
    { head = "share of tolerance" },
    { head = "freq. error", unit = "Hz", align = "point" },
  }
  if has_hz then
    columns[9] = { head = "of its tolerance" }
  end
  return columns
end

local function bin_text(bin)
  return bin and (math.tointeger(bin) and tostring(math.tointeger(bin)) or numbers.round(bin, 7))
    or ""
end

local function line_row(line)
  return {
    line.name, numbers.exact(line.hz), bin_text(line.bin),
    amplitude(line), numbers.tolerance(line.tolerance), numbers.error(line.error),
    share(line.ratio), numbers.error(line.hz_error), share(line.hz_ratio),
  }
end

--- The table of a plan's lines.
-- @param plan table: a plan
-- @return string: heads, units, one row a line; tolerances rounded down, errors up
-- @usage
-- local text = require("libration.report.text").lines { demand = { unit = "V" }, lines = {
--   { name = "tone", hz = lb.fraction.new(425), tolerance = 0.01, error = 0.004, ratio = 0.4 } } }
-- assert(text:find("tone", 1, true) and text:find("####...... 40 %", 1, true))
function M.lines(plan)
  local rows, has_hz = {}, false
  for i, line in ipairs(plan.lines) do
    has_hz = has_hz or line.hz_ratio ~= nil and line.hz_ratio > 0
    rows[i] = line_row(line)
  end
  return table.concat(layout.layout(columns_of(plan, has_hz), rows), "\n")
end

local function tightest(plan)
  local worst, found = -1, nil
  for i, line in ipairs(plan.lines) do
    if (line.ratio or 0) > worst then
      worst, found = line.ratio or 0, i
    end
  end
  return found
end

local function find_line(plan, which)
  if type(which) == "number" and plan.lines[which] then
    return plan.lines[which]
  end
  local names = {}
  for i, line in ipairs(plan.lines) do
    if line.name == which then
      return line
    end
    names[i] = line.name
  end
  error("line: " .. tostring(which) .. " is not a line of the plan; valid: "
    .. table.concat(names, ", ") .. ", or 1.." .. #names, 3)
end

local function sorted_budget(line)
  local terms = {}
  for i, term in ipairs(line.budget or {}) do
    terms[i] = term
  end
  table.sort(terms, function(a, b)
    if a.value ~= b.value then
      return a.value > b.value
    end
    return tostring(a.term) .. tostring(a.from) < tostring(b.term) .. tostring(b.from)
  end)
  return terms
end

local function budget_rows(line, most)
  local rows, terms = {}, sorted_budget(line)
  for i, term in ipairs(terms) do
    if i > most or (term.value == 0 and i > 3) then
      break
    end
    local ratio = line.tolerance and line.tolerance < math.huge and term.value / line.tolerance
    rows[i] = {
      term.term, term.from or "", term.kind or "", numbers.error(term.value),
      ratio and numbers.bar(ratio) .. " " .. numbers.percent(ratio) or "",
    }
  end
  return rows, #terms - #rows
end

local function budget_table(plan, line, most, indent)
  local unit = plan.demand and plan.demand.unit
  local rows, left = budget_rows(line, most)
  local lines = layout.layout({
    { head = "term" }, { head = "from" }, { head = "kind" },
    { head = "at most", unit = unit, align = "point" }, { head = "share of tolerance" },
  }, rows, indent)
  if left > 0 then
    lines[#lines + 1] = (" "):rep(indent) .. "and " .. left .. " smaller"
      .. (left == 1 and " term" or " terms")
  end
  return lines
end

--- All terms of one line's error.
-- @param plan table: a plan
-- @param which string or integer: name or number of the line, default the tightest
-- @return string: terms, largest first, with their share; then the sums.
-- Systematic terms add, random ones are standard deviations of one record
-- @usage
-- local text = require("libration.report.text").budget({ worst = 0.4, lines = { {
--   name = "tone", tolerance = 1, error = 0.4, ratio = 0.4, budget = {
--     { term = "own image", value = 0.4, kind = "systematic" } } } } })
-- assert(text:find("own image", 1, true))
function M.budget(plan, which)
  local line = find_line(plan, which or tightest(plan))
  local unit = plan.demand and plan.demand.unit or ""
  local lines = { "Error budget of " .. layout.safe(line.name) }
  push(lines, budget_table(plan, line, math.huge, 2))
  lines[#lines + 1] = ""
  local sums = {}
  if line.systematic then
    sums[#sums + 1] = "systematic " .. numbers.error(line.systematic)
  end
  if line.random then
    sums[#sums + 1] = "random " .. how.random(plan, line)
  end
  sums[#sums + 1] = "together at most " .. numbers.error(line.error) .. " of "
    .. numbers.tolerance(line.tolerance) .. " " .. unit .. " allowed"
  lines[#lines + 1] = "  " .. table.concat(sums, ", ")
  return table.concat(lines, "\n")
end

local function notes(lines, list)
  for _, note in ipairs(list or {}) do
    local text = type(note) == "table" and (note.text or note[1]) or note
    local wrapped = layout.wrap(tostring(text), width - 2)
    for i, line in ipairs(wrapped) do
      lines[#lines + 1] = (i == 1 and "* " or "  ") .. line
    end
  end
end

--- A plan for a person: verdict, how to measure, every line, the tightest budget.
-- @param plan table: a plan
-- @return string: several lines
-- @usage
-- local text = require("libration.report.text").plan { worst = 0.4, samples = 16000,
--   rate = lb.fraction.new(8000), duration_s = 2, reading = "bin", window = { name = "hann" },
--   demand = { title = "Tone", unit = "V" }, lines = {} }
-- assert(text:find("holds every tolerance with 60 % to spare", 1, true))
function M.plan(plan)
  local lines = {}
  heading(lines, plan)
  lines[#lines + 1] = ""
  lines[#lines + 1] = M.lines(plan)
  local index = tightest(plan)
  if index and plan.lines[index].budget then
    lines[#lines + 1] = ""
    lines[#lines + 1] = "Largest terms of the tightest line, "
      .. layout.safe(plan.lines[index].name)
    push(lines, budget_table(plan, plan.lines[index], 5, 2))
    lines[#lines + 1] = "  systematic terms add, random ones (noise, quantisation, jitter noise) "
      .. "add in squares"
  end
  lines[#lines + 1] = ""
  notes(lines, plan.notes)
  paragraph(lines, M.caution, 0)
  return table.concat(lines, "\n")
end

local function what_binds(lines, binding)
  paragraph(lines, "What binds: " .. how.binding(binding), 2)
  if binding.ratio then
    paragraph(lines, "How far off: " .. numbers.percent(binding.ratio) .. " of what is allowed", 2)
  end
end

local function plan_cells(plan)
  return {
    numbers.time(how.total(plan)), numbers.exact(plan.rate), tostring(plan.samples),
    how.window(plan), plan.reading or "", spare(plan),
  }
end

local plan_columns = {
  { head = "takes", align = "right" }, { head = "rate", unit = "S/s", align = "point" },
  { head = "samples", align = "right" }, { head = "window" }, { head = "reading" },
  { head = "to spare", align = "right" },
}

local function plans_table(first, rows, indent)
  local columns = { { head = first } }
  push(columns, plan_columns)
  return layout.layout(columns, rows, indent)
end

local function relaxation_row(relaxation)
  local row = { relaxation.text or how.change(relaxation.change) }
  push(row, relaxation.plan and plan_cells(relaxation.plan) or {})
  return row
end

--- The trade-off front as a table.
-- @param plans table: plans, shortest first
-- @return string: one row a plan
-- @usage
-- local text = require("libration.report.text").front { { worst = 0.5, samples = 16,
--   rate = lb.fraction.new(8), duration_s = 2, reading = "bin", window = { name = "hann" } } }
-- assert(text:find("2.000 s", 1, true) and text:find("50 %", 1, true))
function M.front(plans)
  local rows = {}
  for i, plan in ipairs(plans) do
    rows[i] = { tostring(i) }
    push(rows[i], plan_cells(plan))
  end
  return table.concat(plans_table("plan", rows, 0), "\n")
end

--- A refusal for a person: what binds, how far off, what would help.
-- @param refusal table: a refusal
-- @return string: several lines
-- @usage
-- local text = require("libration.report.text").refusal { title = "Pump",
--   binding = { line = "shaft", term = "leakage", limit = "within 1 s", ratio = 3 },
--   relaxations = {} }
-- assert(text:find("300 %", 1, true) and text:find("shaft", 1, true))
function M.refusal(refusal)
  local lines = {}
  local title = refusal.title or refusal.demand and refusal.demand.title
  lines[1] = title and layout.safe(title) or "Refused"
  lines[2] = refusal.gave_up and "no plan was found within the effort allowed; there may be one"
    or "cannot be measured as demanded: no plan holds every tolerance"
  lines[3] = ""
  if refusal.message then
    paragraph(lines, "Why: " .. refusal.message, 2)
  end
  if refusal.binding then
    what_binds(lines, refusal.binding)
  end
  lines[#lines + 1] = ""
  local rows = {}
  for i, relaxation in ipairs(refusal.relaxations or {}) do
    rows[i] = relaxation_row(relaxation)
  end
  if #rows == 0 then
    lines[#lines + 1] = "No single change that was tried would help."
  else
    lines[#lines + 1] = "Any one of these would help:"
    push(lines, plans_table("change", rows, 2))
  end
  if refusal.notes and refusal.notes[1] then
    lines[#lines + 1] = ""
    notes(lines, refusal.notes)
  end
  return table.concat(lines, "\n")
end

return M
