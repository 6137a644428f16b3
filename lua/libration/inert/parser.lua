--- The parser of data files: text in, tables and mistakes out.
-- It goes on after a mistake where the next comma or brace says how.

local base = require("libration.core").base

local M = {}

M.MOST_BYTES, M.MOST_DEPTH, M.MOST_ENTRIES = 1 << 20, 32, 100000

local MOST_MISTAKES = 20

local escapes = { ["\\"] = "\\", ['"'] = '"', ["'"] = "'", n = "\n", r = "\r", t = "\t" }
local NAME = "^[%a_\128-\255][%w_\128-\255]*"

-- A parser is a table: text, at (next byte), entries, mistakes.
local Parser = {}
Parser.__index = Parser

local give_up = setmetatable({}, { __tostring = function() return "too many mistakes" end })

-- "line:column" of a byte, columns counted in characters.
function Parser:where(at)
  local line, start = 1, 1
  for stop in self.text:gmatch "()\n" do
    if stop >= at then
      break
    end
    line, start = line + 1, stop + 1
  end
  local column = utf8.len(self.text, start, at - 1 < start and start - 1 or at - 1, true)
  return ("%d:%d"):format(line, (column or at - start) + 1)
end

function Parser:mistake(at, reason)
  self.mistakes[#self.mistakes + 1] = self:where(at) .. ": " .. reason
  if #self.mistakes >= MOST_MISTAKES then
    error(give_up, 0)
  end
end

-- Moves to the next byte that is neither blank nor comment.
function Parser:skip()
  local text = self.text
  while true do
    local at = text:find("[^ \t\r\n]", self.at) or #text + 1
    self.at = at
    if text:sub(at, at + 1) ~= "--" then
      return
    elseif text:find("^%-%-%[=*%[", at) then
      local bars = text:match("^%-%-%[(=*)", at)
      local _, stop = text:find("]" .. bars .. "]", at + 4 + #bars, true)
      if not stop then
        self:mistake(at, "this comment is not closed")
      end
      self.at = (stop or #text) + 1
    else
      self.at = text:find("\n", at, true) or #text + 1
    end
  end
end

-- What stands at the current place, for messages.
function Parser:seen()
  if self.at > #self.text then
    return "the end of the file"
  end
  local word = self.text:match(NAME, self.at) or self.text:match(utf8.charpattern, self.at)
  return '"' .. (#word > 30 and word:sub(1, 27) .. "..." or word) .. '"'
end

-- After a mistake: on to the comma or closing brace of this level.
function Parser:recover()
  local depth, text = 0, self.text
  while true do
    local at = text:find("[,;{}\"'-]", self.at)
    local mark = at and text:sub(at, at)
    self.at = at or #text + 1
    if not at or depth == 0 and mark:find "[,;}]" then
      return
    elseif mark == '"' or mark == "'" then
      local _, stop = text:find("^[^\n" .. mark .. "]*" .. mark .. "?", at + 1)
      self.at = stop + 1
    elseif text:find("^%-%-", at) then
      self:skip()
    else
      depth = depth + (mark == "{" and 1 or mark == "}" and -1 or 0)
      self.at = at + 1
    end
  end
end

-- One escape behind a backslash at `at`: its meaning and the place behind it.
function Parser:escape(at)
  local mark = self.text:sub(at, at)
  if escapes[mark] then
    return escapes[mark], at + 1
  end
  local digits = self.text:match("^x(%x%x)", at)
  if digits then
    return string.char(tonumber(digits, 16)), at + 3
  end
  self:mistake(at - 1, [[unknown escape; there are \\ \" \' \n \r \t \xHH]])
  return "", at + 1
end

function Parser:string()
  local quote, start = self.text:sub(self.at, self.at), self.at
  local pattern, parts, at = "^[^\\\n" .. quote .. "]*", {}, self.at + 1
  while true do
    local _, stop = self.text:find(pattern, at)
    parts[#parts + 1] = self.text:sub(at, stop)
    at = stop + 1
    local mark = self.text:sub(at, at)
    if mark == quote then
      self.at = at + 1
      return table.concat(parts)
    elseif mark ~= "\\" then
      self.at = at
      self:mistake(start, "this string is not closed on its line")
      return nil
    end
    parts[#parts + 1], at = self:escape(at + 1)
  end
end

function Parser:number()
  local text = self.text:match("^[-+]?[%w.]+", self.at)
  local sign = text:match "[eE]$" and self.text:match("^[-+]%d+", self.at + #text)
  text = text .. (sign or "")
  local value, _, code = nil, nil, "format"
  if text:find "^-?%d+$" and text ~= "-0" then
    value = tonumber(text)
  end
  if math.type(value) ~= "integer" then
    value, _, code = base.number_read(text)
  end
  if not value then
    self:mistake(self.at, code == "overflow" and "this number is beyond the largest double"
      or ('"%s" is not a number; write decimals such as 24.6 or 1e-3'):format(text:sub(1, 30)))
  end
  self.at = self.at + #text
  return value
end

local words = { ["true"] = true, ["false"] = false }

function Parser:value(depth)
  local mark = self.text:sub(self.at, self.at)
  if mark == "{" then
    return self:table(depth + 1)
  elseif mark == '"' or mark == "'" then
    return self:string()
  elseif self.text:find("^[-+]?%.?%d", self.at) then
    return self:number()
  end
  local word = self.text:match(NAME, self.at)
  if word and words[word] ~= nil then
    self.at = self.at + #word
    return words[word]
  end
  self:mistake(self.at, ("%s is not a value; values are \"text\", numbers, true, false and { ... }")
    :format(self:seen()))
  self:recover()
end

-- [key] or name before an equals sign; nil when the entry has none.
function Parser:key(depth)
  local name, stop = self.text:match("^([%a_\128-\255][%w_\128-\255]*)()", self.at)
  if name then
    local before = self.at
    self.at = stop
    self:skip()
    if self.text:find("^=[^=]", self.at) or self.text:find("^=$", self.at) then
      return name
    end
    self.at = before
    return nil
  elseif self.text:sub(self.at, self.at) ~= "[" then
    return nil
  end
  local start = self.at
  self.at = self.at + 1
  self:skip()
  local key = self:value(depth)
  self:skip()
  if type(key) == "string" or math.type(key) == "integer" then
    if self.text:sub(self.at, self.at) == "]" then
      self.at = self.at + 1
      self:skip()
      return key, start
    end
  end
  self:mistake(start, 'a key is a name, ["text"] or [integer]')
  self:recover()
  return nil, start
end

-- Puts one entry into the table; index is where the next bare value goes.
function Parser:entry(result, index, depth)
  local start = self.at
  local key, bracket = self:key(depth)
  if key ~= nil then
    if self.text:sub(self.at, self.at) ~= "=" then
      self:mistake(self.at, ('"=" expected before %s'):format(self:seen()))
      self:recover()
      return index
    end
    self.at = self.at + 1
    self:skip()
  elseif bracket then
    return index
  end
  local value = self:value(depth)
  if key == nil then
    key, index = index, index + 1
  end
  if result[key] ~= nil then
    self:mistake(start, ("%s is given twice"):format(tostring(key)))
  end
  result[key] = value
  return index
end

function Parser:limits(depth)
  self.entries = self.entries + 1
  if self.entries > M.MOST_ENTRIES then
    self:mistake(self.at, ("more than %d entries"):format(M.MOST_ENTRIES))
    error(give_up, 0)
  elseif depth > M.MOST_DEPTH then
    self:mistake(self.at, ("more than %d tables inside each other"):format(M.MOST_DEPTH))
    error(give_up, 0)
  end
end

function Parser:table(depth)
  local result, index, start = {}, 1, self.at
  self.at = self.at + 1
  while true do
    self:skip()
    local mark = self.text:sub(self.at, self.at)
    if mark == "}" then
      self.at = self.at + 1
      return result
    elseif mark == "" then
      self:mistake(start, 'this "{" is not closed')
      error(give_up, 0)
    end
    self:limits(depth)
    index = self:entry(result, index, depth)
    self:skip()
    mark = self.text:sub(self.at, self.at)
    if mark == "," or mark == ";" then
      self.at = self.at + 1
    elseif mark ~= "}" and mark ~= "" then
      self:mistake(self.at, ('"," or "}" expected before %s'):format(self:seen()))
      self:recover()
      self.at = self.at + (self.text:find("^[,;]", self.at) and 1 or 0)
    end
  end
end

function Parser:top()
  local result = {}
  self:skip()
  while self.at <= #self.text do
    self:limits(0)
    local start = self.at
    local name = self.text:match(NAME, self.at)
    local key = name and self:key(0)
    if not key then
      self.at = start
      self:mistake(start, ('"name = value" expected before %s'):format(self:seen()))
      break -- there is no telling where the next assignment begins
    end
    self:entry_at_top(result, key, start)
    self:skip()
  end
  return result
end

function Parser:entry_at_top(result, key, start)
  self.at = self.at + 1
  self:skip()
  local value = self:value(0)
  if result[key] ~= nil then
    self:mistake(start, ("%s is given twice"):format(key))
  end
  result[key] = value
  self:skip()
  if self.text:find("^[,;]", self.at) then
    self.at = self.at + 1
  end
end

--- Parses the text of a data file.
-- @param text string: valid UTF-8 without control characters
-- @return table: name -> value; or nil and the list of mistakes, each with its
-- line:column
-- @usage
-- local parse = require("libration.inert.parser").parse
-- assert(parse("a = 1").a == 1)
function M.parse(text)
  local parser = setmetatable({ text = text, at = 1, entries = 0, mistakes = {} }, Parser)
  local ok, result = pcall(parser.top, parser)
  if not ok and result ~= give_up then
    error(result, 0)
  elseif #parser.mistakes > 0 then
    return nil, parser.mistakes
  end
  return result
end

return M
