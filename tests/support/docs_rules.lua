--- What every public function must say about itself.

local M = {}

local function documented(doc)
  local names = {}
  for _, item in ipairs(doc.params) do
    local name = item.name:match("^[%w_]+") or item.name:match("^%.%.%.") or item.name
    names[name] = true
  end
  return names
end

-- Parameters in the code and in the docstring are the same ones.
local function check_params(entry, complain)
  local said, real = documented(entry.doc), {}
  for _, name in ipairs(entry.params) do
    real[name] = true
    if not name:match("^_") and name ~= "self" and not said[name] then
      complain("has no @param for " .. name)
    end
  end
  for name in pairs(said) do
    if not real[name] then
      complain("has a @param " .. name .. " that it does not take")
    end
  end
end

local function check_c_params(entry, complain)
  local said = #entry.doc.params + (entry.is_method and 1 or 0)
  if entry.least_params and said < entry.least_params then
    complain(("reads argument %d but has %d @param"):format(
      entry.least_params, #entry.doc.params))
  end
end

local function check_entry(entry, complain)
  local doc = entry.doc
  if not doc then
    return complain("has no docstring")
  end
  if doc.summary == "" then
    complain("does not say what it does")
  end
  if not doc.usage or not doc.usage:match("%S") then
    complain("has no @usage")
  end
  if doc.unknown then
    complain("has an unknown tag @" .. doc.unknown)
  end
  if entry.in_c then
    check_c_params(entry, complain)
  else
    check_params(entry, complain)
  end
end

--- Complaints about all pages, as lines of text.
function M.check(pages)
  local complaints = {}
  for _, page in ipairs(pages) do
    if page.file:match("%.lua$") and not page.purpose then
      complaints[#complaints + 1] = page.file .. ":1: the module does not open with its purpose"
    end
    for _, entry in ipairs(page.entries) do
      check_entry(entry, function(text)
        complaints[#complaints + 1] = ("%s:%d: %s %s"):format(
          entry.file, entry.line, entry.name, text)
      end)
    end
  end
  return complaints
end

return M
