--- Just enough of Lua's grammar to see names, strings and nesting of functions.

local M = {}

-- Skips a long bracket that opens at `at`; the position after it and its text.
local function long_bracket(text, at)
  local level = text:match("^%[(=*)%[", at)
  if not level then
    return nil
  end
  local first = at + #level + 2
  local last, stop = text:find("]" .. level .. "]", first, true)
  return (stop or #text) + 1, text:sub(first, (last or #text + 1) - 1)
end

local function comment(text, at)
  if text:sub(at, at + 1) ~= "--" then
    return nil
  end
  return long_bracket(text, at + 2) or text:match("^[^\n]*()", at)
end

local function quoted(text, at)
  local mark = text:match("^[\"']", at)
  if not mark then
    return nil
  end
  local i = at + 1
  while i <= #text and text:sub(i, i) ~= mark do
    i = i + (text:sub(i, i) == "\\" and 2 or 1)
  end
  return i + 1, text:sub(at + 1, i - 1)
end

-- The token at a position that holds one: kind, text, position after it.
local function token(text, at)
  local stop, content = long_bracket(text, at)
  if not stop then
    stop, content = quoted(text, at)
  end
  if stop then
    return "string", content, stop
  end
  local name, after = text:match("^([%a_][%w_]*)()", at)
  if name then
    return "name", name, after
  end
  local number, beyond = text:match("^(%d[%w.]*)()", at)
  if number then
    return "number", number, beyond
  end
  return "mark", text:sub(at, at), at + 1
end

--- Tokens of a chunk: { kind = "name"|"string"|"number"|"mark", text=, line= }.
function M.tokens(text)
  local tokens, at, line = {}, text:match("^#[^\n]*()") or 1, 1
  while at <= #text do
    local from = at
    local space = text:match("^%s+()", at)
    local kind, content, stop
    if space then
      stop = space
    else
      stop = comment(text, at)
    end
    if not stop then
      kind, content, stop = token(text, at)
      tokens[#tokens + 1] = { kind = kind, text = content, line = line }
    end
    for _ in text:sub(from, stop - 1):gmatch("\n") do
      line = line + 1
    end
    at = stop
  end
  return tokens
end

local opens = { ["function"] = true, ["if"] = true, ["do"] = true, ["repeat"] = true }
local closes = { ["end"] = true, ["until"] = true }

--- Calls `visit(i, token, depth)` for each token; depth counts the functions
-- around it.
function M.walk(tokens, visit)
  local stack, depth = {}, 0
  for i, t in ipairs(tokens) do
    if t.kind == "name" and opens[t.text] then
      stack[#stack + 1] = t.text
      depth = depth + (t.text == "function" and 1 or 0)
    elseif t.kind == "name" and closes[t.text] then
      if table.remove(stack) == "function" then
        depth = depth - 1
      end
    end
    visit(i, t, depth)
  end
end

return M
