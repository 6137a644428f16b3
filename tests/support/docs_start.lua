--- The start page of the reference: what to read first, in the order of a job.

local M = {}

-- Names as a script writes them. Methods say where their docstring is.
local order = {
  { "lb.plan" }, { "lb.plans" }, { "lb.load_plan" }, { "lb.load" }, { "lb.demand" },
  { "lb.digitizer" }, { "plan:prove", "libration.proof", "proof.prove" },
  { "plan:replay", "libration.proof", "proof.replay" },
  { "plan:save", "libration.plan", "Plan:save" },
  { "plan:budget", "libration.plan", "Plan:budget" },
  { "record:measure", "libration.measure", "measure.measure" },
  { "lb.record" }, { "lb.survey" }, { "lb.lines" }, { "lb.bands" }, { "lb.spectrum" },
  { "lb.synth" }, { "lb.filter" }, { "lb.window" }, { "lb.windows" }, { "lb.report" },
  { "lb.json" }, { "lb.samples" }, { "lb.units" }, { "lb.fraction" },
}

local function page_of(pages, name)
  for _, page in ipairs(pages) do
    if page.name == name then
      return page
    end
  end
  error("start page: there is no page " .. name, 0)
end

local function entry_of(page, name)
  for _, entry in ipairs(page.entries) do
    if entry.name == name then
      return entry
    end
  end
  error(("start page: %s has no %s"):format(page.name, name), 0)
end

local function first_sentence(text)
  text = text:gsub("\n", " ")
  return text:match "^(.-[.])%s" or text
end

--- What the start page lists; raises where the library does not have it.
-- @param pages table: from tests.support.docstrings
-- @param rooms table: of the library's front door: name to module and field
-- @return table: list of name, page, entry (or nil: the page itself), summary
function M.list(pages, rooms)
  local list = {}
  for i, row in ipairs(order) do
    local module, wanted = row[2], row[3]
    if not module then
      local room = rooms[row[1]:sub(4)] or error("start page: no room " .. row[1], 0)
      module, wanted = room[1], room[2] and room[1]:match "[^.]+$" .. "." .. room[2]
    end
    local page = page_of(pages, module)
    local entry = wanted and entry_of(page, wanted)
    list[i] = { name = row[1], page = page, entry = entry,
      summary = first_sentence(entry and entry.doc.summary or page.purpose or "") }
  end
  return list
end

return M
