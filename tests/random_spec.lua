-- Keyed random numbers: known answers, independence of order, distributions.

local core = require "libration.core"
local synth, samples = core.synth, core.samples

local function gaussian(n, first, words)
  return synth.gaussian(samples.new(n), 2385, words or { 3, 1, 4 }, first)
end

describe("Philox4x32-10", function()
  -- Known answers that come with the reference implementation of Salmon,
  -- Moraes, Dror and Shaw (SC11, 2011): counter, key, result. From memory of
  -- its table; a wrong digit could not agree with the generator.
  local known = {
    { { 0, 0, 0, 0 }, { 0, 0 }, { 0x6627e8d5, 0xe169c58d, 0xbc57ac4c, 0x9b00dbd8 } },
    { { 0xffffffff, 0xffffffff, 0xffffffff, 0xffffffff }, { 0xffffffff, 0xffffffff },
      { 0x408f276d, 0x41c83b0e, 0xa20bc7c6, 0x6d5451fd } },
    { { 0x243f6a88, 0x85a308d3, 0x13198a2e, 0x03707344 }, { 0xa4093822, 0x299f31d0 },
      { 0xd16cfe09, 0x94fdcceb, 0x5001e420, 0x24126ea1 } },
  }
  for i, row in ipairs(known) do
    it("gives known answer " .. i, function()
      local c, k = row[1], row[2]
      assert.same(row[3], { synth.philox(c[1], c[2], c[3], c[4], k[1], k[2]) })
    end)
  end
end)

-- The key of a stream, rebuilt from its definition.
local function key_of(seed, words)
  local s = { synth.philox(seed & 0xffffffff, seed >> 32, #words, 0, 0, 0) }
  for _, w in ipairs(words) do
    s = { synth.philox(s[1], s[2], s[3], s[4], w & 0xffffffff, w >> 32) }
  end
  return s
end

-- Both words of a block, from the definition.
local function block(key, c)
  local r = { synth.philox(c & 0xffffffff, c >> 32, key[3], key[4], key[1], key[2]) }
  return r[1] | r[2] << 32, r[3] | r[4] << 32
end

local function unit(word)
  return (2 * (word >> 12) + 1) * 2.0 ^ -53
end

describe("a keyed stream", function()
  it("is Philox of the counter under the key of its words", function()
    for _, seed in ipairs { 0, 7, -1, 0x123456789abcdef } do
      local words = { 5, -6, 1 << 40 }
      local key = key_of(seed, words)
      for _, c in ipairs { 0, 1, 77, 0xffffffff, 0x100000000, 1 << 50 } do
        local even, odd = block(key, c)
        assert.equal(even, synth.word(seed, words, 2 * c))
        assert.equal(odd, synth.word(seed, words, 2 * c + 1))
      end
    end
  end)

  it("has other numbers under every other seed, word, order and count of words", function()
    local seen = {}
    for _, case in ipairs { { 1, {} }, { 2, {} }, { 1, { 0 } }, { 1, { 0, 0 } }, { 1, { 1, 2 } },
      { 1, { 2, 1 } }, { 1, { 1, 2, 3 } }, { 1 << 32, {} }, { 1, { 1 << 32 } } } do
      local word = synth.word(case[1], case[2], 0)
      assert.is_nil(seen[word])
      seen[word] = case
    end
  end)

  it("gives uniform numbers by the stated formula from any start", function()
    local u = synth.uniform(samples.new(1100), 9, { 1 }, 12345)
    for _, i in ipairs { 1, 2, 511, 512, 513, 1024, 1025, 1100 } do
      assert.equal(unit(synth.word(9, { 1 }, 12345 + i - 1)), u[i])
      assert.equal(u[i], synth.uniform(samples.new(1), 9, { 1 }, 12345 + i - 1)[1])
    end
  end)

  it("gives the same normal numbers in pieces of any size, wherever it starts", function()
    local whole = gaussian(4000, 1000)
    for _, size in ipairs { 1, 2, 7, 15, 16, 17, 511, 1023 } do
      local at = 1
      while at <= #whole do
        local n = math.min(size, #whole - at + 1)
        assert(gaussian(n, 1000 + at - 1) == whole:slice(at, at + n - 1))
        at = at + n * (size < 100 and 13 or 1)
      end
    end
  end)

  it("gives normal numbers by Box and Muller's formula", function()
    local key = key_of(2385, { 3, 1, 4 })
    for _, n in ipairs { 0, 5, 8, 15, 16, 23, 24, 1000003, 1 << 41 } do
      local r = n % 16
      local low, up = block(key, 8 * (n // 16) + r % 8)
      local radius = math.sqrt(-2 * math.log(unit(low)))
      local turn = 2 * math.pi * unit(up)
      local expected = radius * (r < 8 and math.cos(turn) or math.sin(turn))
      assert.near(expected, gaussian(1, n)[1], 4e-15)
    end
  end)

  it("runs through the end of 64-bit indices without a seam", function()
    local across = gaussian(64, -32)
    assert(across:slice(33) == gaussian(32, 0))
    assert(across:slice(1, 32) == gaussian(32, -32))
    local u = synth.uniform(samples.new(64), 1, {}, -33)
    assert(u:slice(34) == synth.uniform(samples.new(31), 1, {}, 0))
  end)
end)

-- Chance of |z| > 4.5 is 7e-6: with a fixed seed a failure is a change.
describe("the distribution", function()
  local N = 1 << 20
  local g, u = gaussian(N, 0), synth.uniform(samples.new(N), 1, { 8 })

  it("of uniform numbers is flat (chi-square on 256 cells)", function()
    local count = {}
    for _, x in ipairs(u:totable()) do
      local cell = math.floor(x * 256)
      count[cell] = (count[cell] or 0) + 1
    end
    local chi = 0
    for cell = 0, 255 do
      chi = chi + (count[cell] - N / 256) ^ 2 / (N / 256)
    end
    assert(math.abs(chi - 255) < 4.5 * math.sqrt(2 * 255), chi)
  end)

  it("of normal numbers has the moments 0, 1, 0, 3, 0, 15", function()
    local g2 = g * g
    local moments = { g:sum(), g2:sum(), g2:dot(g), g2:dot(g2), (g2 * g2):dot(g),
                      (g2 * g2):dot(g2) }
    local exact, variance = { 0, 1, 0, 3, 0, 15 }, { 1, 2, 15, 96, 945, 10170 }
    for k = 1, 6 do
      local z = (moments[k] / N - exact[k]) / math.sqrt(variance[k] / N)
      assert(math.abs(z) < 4.5, ("moment %d: z = %g"):format(k, z))
    end
  end)

  it("of neighbours and of the two halves of a block shows no correlation", function()
    for _, lag in ipairs { 1, 2, 7, 8, 9, 16 } do
      local r = g:slice(1, N - lag):dot(g:slice(1 + lag)) / math.sqrt(N)
      assert(math.abs(r) < 4.5, ("lag %d: %g"):format(lag, r))
    end
  end)

  it("of normal numbers agrees with SciPy: Kolmogorov's test and tail counts", function()
    local path = os.tmpname()
    local file = assert(io.open(path, "wb"))
    file:write(g:pack())
    file:close()
    local pipe = assert(io.popen("env -u LD_PRELOAD /usr/bin/python3 tests/oracle/normal.py "
      .. path))
    local p, worst = pipe:read("n", "n")
    pipe:close()
    os.remove(path)
    assert(p > 1e-4, "probability of Kolmogorov's distance: " .. tostring(p))
    assert(worst < 4.5, "worst tail count, standard deviations: " .. tostring(worst))
  end)
end)
