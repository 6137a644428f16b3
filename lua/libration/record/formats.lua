--- The formats of record files: one row each, tried in this order on what a file holds.
-- A row has name, title, suffixes, fields (options of writing), holds_gaps, and
--   matches(head, path)        whether the first bytes are of this format
--   open(path, options)        facts and a feed of the stored samples; or nil, message, code:
--     container, rate (fraction, or nil where the file says none), rate_is_rounded, title,
--     start_ns, segments, metadata, feed, channels = list of { name, unit, bits, integer, lossy,
--     code_full (the stored number that is full scale), factor (unit per stored number, where
--     the file says it), full_scale, sensitivity, range,
--     place (channel of the feed, default its number) }
--   write(record, path, options)   true; or nil, message, code

local store = require("libration.core").store

local M = {
  require("libration.record.sound"),
  require("libration.record.sound").flac,
  require "libration.record.sigmf",
  require "libration.record.raw",
  require "libration.record.universal",
  require "libration.record.hdf5",
  (require "libration.record.csv"),
}

local HEAD = 65536

--- The row of a name.
-- @param name string: "wav"
-- @return table: the row, or nil and a reason
function M.named(name)
  local names = {}
  for i, row in ipairs(M) do
    if row.name == name then
      return row
    end
    names[i] = row.name
  end
  return nil, ("format is %s; valid are %s"):format(tostring(name), table.concat(names, ", "))
end

--- The row that writes files of such a name, by its ending; WAV for any other.
-- @param path string: the file
-- @return table: the row
function M.for_path(path)
  for _, row in ipairs(M) do
    for _, suffix in ipairs(row.suffixes) do
      if row.write and path:lower():sub(-#suffix) == suffix then
        return row
      end
    end
  end
  return M[1]
end

--- The row that a file is of, by what it holds.
-- @param path string: the file
-- @return table: the row; the sound library's where none knows it
function M.of_file(path)
  local head = store.head(path, HEAD)
  for _, row in ipairs(M) do
    if head and row.matches(head, path) then
      return row
    end
  end
  return M[1]
end

return M
