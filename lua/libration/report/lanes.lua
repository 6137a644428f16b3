--- Names above a plot in lanes, so that none covers another.
-- Every name stands as near as it can to the frequency it belongs to, in the
-- lowest lane with room, with a thin leader down to its mark. Four or more names
-- that differ only in their order ("mains x 1", "mains x 2") share one.

local layout = require "libration.report.table"

local M = {}

local most_of_family = 3 -- more than this many of one family share a name

local function family_of(name)
  local stem, order = name:match("^(.-)%s*[x#]%s*([%d./]+)$")
  if not stem then
    stem, order = name:match("^(.-)%s+([%d./]+)$")
  end
  return stem, order
end

--- Puts names that differ only in their order together.
-- @param marks table: list of { name=text, kind=text, x=number (0 to 1) }
-- @return table: list of { text=, kind=, marks=list }, in the order of x
-- @usage
-- local group = require("libration.report.lanes").group
-- local marks = {}
-- for k = 1, 5 do marks[k] = { name = "mains x " .. k, kind = "interferer", x = k / 10 } end
-- assert(group(marks)[1].text == "mains x 1 .. 5")
function M.group(marks)
  local families, groups = {}, {}
  for _, mark in ipairs(marks) do
    local stem = family_of(mark.name)
    if stem then
      local key = mark.kind .. "\0" .. stem
      families[key] = families[key] or { marks = {}, kind = mark.kind }
      table.insert(families[key].marks, mark)
      mark.family = families[key]
    end
  end
  for _, mark in ipairs(marks) do
    local family = mark.family
    if not family or #family.marks <= most_of_family then
      groups[#groups + 1] = { text = mark.name, kind = mark.kind, marks = { mark } }
    elseif not family.text then
      local last = family.marks[#family.marks]
      family.text = family.marks[1].name .. " .. " .. select(2, family_of(last.name))
      groups[#groups + 1] = family
    end
  end
  for _, group in ipairs(groups) do
    table.sort(group.marks, function(a, b) return a.x < b.x end)
    group.first, group.last = group.marks[1].x, group.marks[#group.marks].x
  end
  table.sort(groups, function(a, b)
    return a.first ~= b.first and a.first < b.first or a.first == b.first and a.text < b.text
  end)
  return groups
end

local function shorten(text, most)
  if layout.width(text) <= most then
    return text
  end
  local kept = {}
  for _, code in utf8.codes(text) do
    kept[#kept + 1] = utf8.char(code)
    if layout.width(table.concat(kept)) >= most - 1 then
      break
    end
  end
  return table.concat(kept) .. "\u{2026}"
end

-- Where the middle of a text may be: over its marks, or to one side of them;
-- kept inside 0 to 1.
local function middles_of(group, width)
  local middle, list = (group.first + group.last) / 2, {}
  for i, shift in ipairs { 0, -0.5, 0.5 } do
    list[i] = math.min(math.max(middle + shift * width, width / 2), 1 - width / 2)
  end
  return list
end

-- What may not stand over what in one lane: a leader may cross a bracket.
local clash = {
  text = { text = true, leader = true, bracket = true },
  leader = { text = true },
  bracket = { text = true, bracket = true },
}

local function free(spans, kind, left, right, gap)
  for _, span in ipairs(spans) do
    local apart = (kind == "leader" or span.kind == "leader") and 0 or gap
    if clash[kind][span.kind] and left < span.right + apart and right > span.left - apart then
      return false
    end
  end
  return true
end

-- Everything a group draws in a lane and in the lanes below it.
local function pieces_of(group, lane)
  local pieces = { { lane = lane, kind = "text", left = group.left, right = group.right } }
  if #group.marks > 1 then
    pieces[2] = { lane = lane, kind = "bracket", left = group.first, right = group.last }
  end
  for below = 1, lane - 1 do
    for _, x in ipairs { group.first, group.last } do
      pieces[#pieces + 1] = { lane = below, kind = "leader", left = x, right = x }
    end
  end
  return pieces
end

-- Whether a text would hide the way down from a name that has no place yet.
local function hides(group, waiting)
  for other in pairs(waiting) do
    for _, x in ipairs { other.first, other.last } do
      if other ~= group and x > group.left and x < group.right then
        return true
      end
    end
  end
  return false
end

local function put(taken, pieces, gap)
  for _, piece in ipairs(pieces) do
    if not free(taken[piece.lane], piece.kind, piece.left, piece.right, gap) then
      return false
    end
  end
  for _, piece in ipairs(pieces) do
    table.insert(taken[piece.lane], piece)
  end
  return true
end

-- Finds the lowest lane and the nearest place; kind to names still waiting
-- where that can be.
local function settle(group, taken, waiting, width, gap)
  for _, kind in ipairs { true, false } do
    for lane = 1, #taken do
      for _, middle in ipairs(middles_of(group, width)) do
        group.middle, group.left, group.right = middle, middle - width / 2, middle + width / 2
        if not (kind and hides(group, waiting)) and put(taken, pieces_of(group, lane), gap) then
          return lane
        end
      end
    end
  end
end

-- Single names before brackets, which have more places to go to.
local function nearest_first(groups)
  local order = {}
  for _, several in ipairs { false, true } do
    for _, group in ipairs(groups) do
      if (#group.marks > 1) == several then
        order[#order + 1] = group
      end
    end
  end
  return order
end

--- Gives every group a lane and a place.
-- @param groups table: what group() returned
-- @param character number: width of a character, as a share of the plot's width
-- @param most integer: lanes
-- @return table: groups with lane= (1 is the lowest), middle=, left=, right=; and
-- integer: lanes used; and integer: groups left out for want of room
-- @usage
-- local lanes = require "libration.report.lanes"
-- local placed = lanes.place(lanes.group { { name = "a", kind = "line", x = 0.5 },
--   { name = "b", kind = "line", x = 0.501 } }, 0.01, 5)
-- assert(placed[1].lane ~= placed[2].lane)
function M.place(groups, character, most)
  local placed, taken, waiting, used, left_out = {}, {}, {}, 0, 0
  for lane = 1, most do
    taken[lane] = {}
  end
  for _, group in ipairs(groups) do
    waiting[group] = true
  end
  for _, group in ipairs(nearest_first(groups)) do
    group.text = shorten(layout.safe(group.text), 28)
    group.lane = settle(group, taken, waiting, layout.width(group.text) * character, character)
    waiting[group] = nil
    if group.lane then
      placed[#placed + 1], used = group, math.max(used, group.lane)
    else
      left_out = left_out + 1
    end
  end
  return placed, used, left_out
end

return M
