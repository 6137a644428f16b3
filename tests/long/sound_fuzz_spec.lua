-- Ten thousand damaged sound files; the suite's own share is 1000.
local core = require "libration.core"
local sounds = dofile "tests/support/sounds.lua"

describe("damaged sound files", function()
  it("are read or refused, 10 000 times", function()
    local random = sounds.generator(20)
    local path = sounds.temporary()
    local whole = {}
    for i, kind in ipairs { "-b 16 %s.wav", "-b 24 %s.flac", "-b 24 %s.w64",
                              "-b 32 -e float %s.wav" } do
      local made = sounds.temporary()
      local name = made .. kind:match "%.%w+$"
      sounds.sox("-R -r 8000 -n -c 2 " .. kind .. " synth 2000s noise", made)
      whole[i] = sounds.bytes(name)
      os.remove(name)
    end
    whole[5] = sounds.bytes(sounds.of_package("sound-theme-freedesktop",
      "/phone-outgoing-calling.oga"))
    local seen = {}
    for i = 1, 10000 do
      sounds.write_bytes(path, sounds.damage(whole[1 + i % 5], random, i % 2 == 0 and 120 or 4000))
      local outcome = sounds.try(core.store, path)
      seen[outcome] = (seen[outcome] or 0) + 1
    end
    sounds.clean()
    assert.is_true(seen.format > 2000 and seen.read > 2000)
    assert.is_nil(seen.no_memory)
  end)
end)
