-- W10, CSV: 10^7 numbers in ten columns, six significant digits, read into
-- doubles to the last bit. The file is in memory already.

local samples = require "libration.samples"
local store = require("libration.core").store

local ROWS, COLUMNS = 1000000, 10
local PATH = os.tmpname()

-- Removed with the state that made it.
local made = setmetatable({}, { __gc = function() os.remove(PATH) end })

local function make_file()
  if not made.file then
    local block = samples.make(10000, function(i) return (i * 7919 % 199999 - 100000) / 1000 end)
    local columns = {}
    for k = 1, COLUMNS do columns[k] = block end
    local draft <close> = assert(store.draft(PATH))
    assert(draft:put "a,b,c,d,e,f,g,h,i,j\n")
    for _ = 1, ROWS // 10000 do assert(draft:rows(columns, ",")) end
    assert(draft:finish())
    made.file = true
  end
end

local into

-- Opening counts the rows; then all are read into blocks that are there.
local function read_all()
  make_file()
  local rows <close> = assert(store.rows(PATH, { at = 20, line = 2, columns = COLUMNS,
    separator = "," }))
  into = assert(rows:read(1, ROWS, nil, into))
end

return {
  { name = "W10 CSV", work = "read 10^7 numbers of CSV as doubles", goal = 0.11,
    ours = read_all, peer = "w10_csv.py" },
}
