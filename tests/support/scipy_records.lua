--- Asks tests/oracle/records.py about records.

local M = {}

local function write(path, text)
  local file = assert(io.open(path, "wb"))
  file:write(text)
  file:close()
end

--- Answers to requests about a record, a list of numbers each.
function M.ask(x, requests)
  local data, list = os.tmpname(), os.tmpname()
  write(data, x:pack())
  write(list, table.concat(requests, "\n") .. "\n")
  local pipe = assert(io.popen(("env -u LD_PRELOAD /usr/bin/python3 tests/oracle/records.py %s %s")
    :format(data, list)))
  local answers = {}
  for line in pipe:lines() do
    local row = {}
    for word in line:gmatch("%S+") do
      row[#row + 1] = word == "nan" and 0 / 0 or tonumber(word)
    end
    answers[#answers + 1] = row
  end
  pipe:close()
  os.remove(data)
  os.remove(list)
  assert(#answers == #requests, "SciPy did not answer all requests")
  return answers
end

--- Largest difference between samples and a list, relative to the largest of the list.
function M.distance(got, list)
  assert(#got == #list, ("%d samples, SciPy has %d"):format(#got, #list))
  local most, scale = 0, 0
  for i = 1, #list do
    most = math.max(most, math.abs(got[i] - list[i]))
    scale = math.max(scale, math.abs(list[i]))
  end
  return most / (scale > 0 and scale or 1)
end

--- Numbers between two limits, the same in every run.
function M.generator(seed)
  local state = seed
  return function(low, high)
    state = (state * 6364136223846793005 + 1442695040888963407) & math.maxinteger
    return low + (high - low) * ((state >> 10) / (math.maxinteger >> 10))
  end
end

--- The two channels of tests/data/oracle_signal.csv as lists.
function M.signal()
  local x, y = {}, {}
  for line in io.lines("tests/data/oracle_signal.csv") do
    local _, a, b = line:match("^(%d+),([^,]+),([^,]+)$")
    if a then
      x[#x + 1], y[#y + 1] = tonumber(a), tonumber(b)
    end
  end
  assert(#x == 4096)
  return x, y
end

--- The value of a row of tests/data/oracle_values.csv by the start of its line.
function M.value(start)
  for line in io.lines("tests/data/oracle_values.csv") do
    if line:sub(1, #start) == start then
      return assert(tonumber(line:match(",([^,]+)$")), line)
    end
  end
  error("no row " .. start)
end

return M
