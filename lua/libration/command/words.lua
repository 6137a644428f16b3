--- The words of a command line: options and operands, strictly.
-- An option is --name VALUE, --name=VALUE, or --name alone; after -- everything
-- is an operand. An unknown or incomplete option is a complaint that says what
-- is valid.

local M = {}

local function names_of(options)
  local names = {}
  for name in pairs(options) do
    names[#names + 1] = "--" .. name
  end
  table.sort(names)
  return table.concat(names, ", ")
end

local function take_option(word, words, at, options, found)
  local name, value = word:match("^%-%-([^=]+)=(.*)$")
  name = name or word:match("^%-%-(.+)$")
  local option = name and options[name]
  if not option then
    return nil, "unknown option " .. word .. "; valid: " .. names_of(options)
  elseif not option.value and value then
    return nil, "--" .. name .. " takes no value, but was given " .. value
  elseif option.value and not value then
    at = at + 1
    value = words[at]
    if not value then
      return nil, "--" .. name .. " needs a value: " .. option.value
    end
  end
  if found[name] ~= nil then
    return nil, "--" .. name .. " was given twice"
  end
  found[name] = value or true
  return at
end

--- Reads the words after a command's name.
-- @param words table: list of texts
-- @param options table: name to { value = text for help or nil, text = for help }
-- @return table: options found, by name; or nil and a complaint
-- @return table: operands in their order
-- @usage
-- local read = require("libration.command.words").read
-- local found, operands = read({ "a", "--n=3" }, { n = { value = "N" } })
-- assert(found.n == "3" and operands[1] == "a")
-- assert(select(2, read({ "--m" }, { n = {} })):find "--n", 1, true)
function M.read(words, options)
  local found, operands, at, all = {}, {}, 1, false
  while at <= #words do
    local word = words[at]
    if all or word:sub(1, 1) ~= "-" or word == "-" then
      operands[#operands + 1] = word
    elseif word == "--" then
      all = true
    else
      local stop, complaint = take_option(word, words, at, options, found)
      if not stop then
        return nil, complaint
      end
      at = stop
    end
    at = at + 1
  end
  return found, operands
end

--- A whole number from a word.
-- @param text string: the word
-- @param least integer: smallest allowed
-- @param most integer: largest allowed
-- @param name string: of the option, for the complaint
-- @return integer: or nil and a complaint
-- @usage
-- local whole = require("libration.command.words").whole
-- assert(whole("12", 0, 20, "n") == 12 and whole("1.5", 0, 20, "n") == nil)
function M.whole(text, least, most, name)
  local value = text:match("^[-+]?%d+$") and math.tointeger(tonumber(text))
  if not value or value < least or value > most then
    return nil, ("--%s: %s is not a whole number from %d to %d"):format(name, text, least, most)
  end
  return value
end

return M
