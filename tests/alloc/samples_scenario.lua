-- What the failing-allocator sweep runs over blocks of samples.
return "samples", function()
  local samples = require("libration.core").samples
  local blocks = {}
  for i, n in ipairs { 0, 1, 64, 4097 } do
    blocks[i] = samples.new(n)
    assert(#blocks[i] == n)
  end
end
