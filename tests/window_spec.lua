-- Window shapes: names, samples, and an outside source of samples.
local lb = require "libration"

local PYTHON = "/usr/bin/python3"

-- Samples by SciPy's scipy.signal.get_window, which is periodic: for a list of
-- { window, length } in its own words, one list of numbers each.
local function outside(requests)
  local code = { "from scipy.signal import get_window as g" }
  for _, request in ipairs(requests) do
    code[#code + 1] = ("print(*('%%.17g' %% v for v in g(%s, %d)))"):format(request[1], request[2])
  end
  local pipe = assert(io.popen(("%s -c \"%s\""):format(PYTHON, table.concat(code, "; "))))
  local lists = {}
  for line in pipe:lines() do
    local list = {}
    for cell in line:gmatch "%S+" do
      list[#list + 1] = tonumber(cell)
    end
    lists[#lists + 1] = list
  end
  assert.equal(0, select(3, pipe:close()))
  assert.equal(#requests, #lists)
  return lists
end

local function farthest(window, list)
  local x, worst = window:samples(#list), 0
  for i = 1, #list do
    worst = math.max(worst, math.abs(x[i] - list[i]))
  end
  return worst
end

describe("windows", function()
  it("have unique names, a title and a source", function()
    local seen = {}
    for _, name in ipairs(lb.windows()) do
      local w = lb.window(name)
      assert.is_nil(seen[name])
      seen[name] = true
      assert.equal(name, w.name)
      assert.truthy(#w.title > 0 and #w.source > 0)
      assert.truthy(#w.coefficients > 0 or name == "cosine_power" or w.parameter_name)
    end
    for _, name in ipairs { "rectangular", "hann", "hamming", "hft248d", "kaiser", "tukey",
      "dolph_chebyshev", "gaussian", "prolate", "flat_top_iso18431" } do
      assert.truthy(seen[name], name)
    end
  end)

  it("are periodic: even about the middle, and no sample twice", function()
    for _, name in ipairs(lb.windows()) do
      for _, n in ipairs { 1, 2, 5, 8, 33, 700, 701 } do
        local x = lb.window(name):samples(n)
        assert.equal(n, #x)
        for i = 2, n do
          assert.truthy(math.abs(x[i] - x[n + 2 - i]) <= 1e-15, name)
        end
      end
      local x = lb.window(name):samples(64)
      assert.truthy(math.abs(x[33] - 1) < 1e-7 or #lb.window(name).coefficients > 0, name)
    end
  end)

  it("are the sums of their coefficients", function()
    for _, name in ipairs(lb.windows()) do
      local w = lb.window(name)
      local x = w:samples(23)
      for i = 0, #w.coefficients > 0 and 22 or -1 do
        local sum = 0
        for k, a in ipairs(w.coefficients) do
          sum = sum + (-1) ^ (k - 1) * a * math.cos(2 * math.pi * (k - 1) * i / 23)
        end
        assert.truthy(math.abs(sum - x[i + 1]) < 1e-14, name)
      end
    end
  end)

  -- SciPy 1.10, scipy.signal.get_window.
  it("agree with SciPy's samples", function()
    local cases, requests = {}, {}
    for _, n in ipairs { 16, 101, 514 } do
      for _, case in ipairs {
        { "rectangular", nil, "'boxcar'" }, { "hann", nil, "'hann'" },
        { "hamming", nil, "'hamming'" }, { "blackman", nil, "'blackman'" },
        { "blackman_harris4", nil, "'blackmanharris'" }, { "flat_top_93", nil, "'flattop'" },
        { "nuttall4c", nil, "'nuttall'" },
        { "kaiser", 0, "('kaiser', 0)" }, { "kaiser", 8.6, "('kaiser', 8.6)" },
        { "kaiser", 33, "('kaiser', 33)" }, { "tukey", 0.25, "('tukey', 0.25)" },
        { "tukey", 1, "('tukey', 1)" }, { "gaussian", 3, ("('gaussian', %.17g)"):format(n / 6) },
        { "dolph_chebyshev", 80, "('chebwin', 80)" },
        { "dolph_chebyshev", 110, "('chebwin', 110)" } } do
        cases[#cases + 1], requests[#requests + 1] = case, { case[3], n }
      end
    end
    for i, list in ipairs(outside(requests)) do
      local case = cases[i]
      local distance = farthest(lb.window(case[1], case[2]), list)
      local limit = case[1] == "dolph_chebyshev" and 1e-10 or 1e-13
      assert.truthy(distance < limit, ("%s: %g"):format(case[1], distance))
    end
  end)

  -- The sequence that is optimal for one length against the continuous function:
  -- the difference falls with the length.
  it("prolate is the limit of the sequences for single lengths", function()
    local lists = outside { { "('dpss', 3)", 64 }, { "('dpss', 3)", 256 }, { "('dpss', 3)", 1024 } }
    for _, list in ipairs(lists) do
      local scaled = farthest(lb.window("prolate", 3), list) * #list
      assert.truthy(scaled < 0.9 and scaled > 0.5)
    end
  end)

  -- Two windows go by the name of Nuttall: here 4c is the one with -98 dB, 4b the
  -- one with -93 dB; a quarter of the way they differ in the third digit.
  it("do not confuse windows of one name", function()
    local n = 400
    assert.truthy(math.abs(lb.window("nuttall4b"):samples(n)[101] - 0.211536) < 1e-12)
    assert.truthy(math.abs(lb.window("nuttall4c"):samples(n)[101] - 0.2269824) < 1e-12)
    local quarter = outside({ { "'nuttall'", n } })[1][101]
    assert.truthy(math.abs(quarter - 0.2269824) < 1e-12)
    -- flat tops of 93 and 68 dB, and that of ISO 18431-2, are three windows
    local a, b, c = lb.window "flat_top_93", lb.window "flat_top_68", lb.window "flat_top_iso18431"
    assert.truthy(a:figures().side_lobe_db < -92 and b:figures().side_lobe_db > -69)
    assert.truthy(math.abs(c:figures().side_lobe_db + 83.93) < 0.01)
  end)

  -- Periodic samples put all of a coherent tone into three bins; the symmetric
  -- ones (of period n - 1) leak into all of them.
  it("periodic Hann has three bins, symmetric Hann does not", function()
    local n, periodic, symmetric = 32, {}, {}
    local x, y = lb.window("hann"):samples(n), lb.window("hann"):samples(n - 1)
    for i = 1, n do
      periodic[i], symmetric[i] = x[i], y[(i - 1) % (n - 1) + 1]
    end
    local function size(list, k)
      local re, im = 0, 0
      for i = 1, n do
        local angle = 2 * math.pi * k * (i - 1) / n
        re, im = re + list[i] * math.cos(angle), im + list[i] * math.sin(angle)
      end
      return math.sqrt(re * re + im * im) / n
    end
    for k = 2, 15 do
      assert.truthy(size(periodic, k) < 1e-15)
      assert.truthy(size(symmetric, k) > 1e-7)
    end
    assert.truthy(math.abs(lb.window("hann"):gain(2, n)) < 1e-15)
  end)

  it("refuse what they do not know, naming the choices", function()
    local _, message = pcall(lb.window, "hanning")
    assert.truthy(message:find "no window 'hanning'" and message:find "blackman_harris4")
    _, message = pcall(lb.window, "hann", 2)
    assert.truthy(message:find "has no parameter")
    for _, value in ipairs { -1, 41, "8", 0 / 0, 1 / 0 } do
      _, message = pcall(lb.window, "kaiser", value)
      assert.truthy(message:find "from 0 to 40", message)
    end
    assert.has_error(function() lb.window("hann"):samples(0) end)
    assert.has_error(function() lb.window("hann"):gain(1, 3) end)
    assert.has_error(function() lb.window("hann"):gain(0 / 0) end)
    assert.has_error(function() lb.window("hann"):range(2, 1) end)
    assert.has_error(function() lb.window("dolph_chebyshev"):gain(1) end)
  end)

  it("print as a table of source, coefficients and figures", function()
    local text = tostring(lb.window "hft95")
    for _, part in ipairs { "hft95", "Heinzel", "0.0350665", "highest side lobe +%-95.01 dB",
      "3.81121 bins" } do
      assert.truthy(text:find(part), part)
    end
    assert.truthy(tostring(lb.window("kaiser", 7.5)):find "beta +7.5")
  end)
end)
