--- Multisines: many tones of one fundamental with phases that keep peaks low.

local core = require "libration.core"
local common = require "libration.synth.common"
local options = require "libration.options"

local M = {}

local PI = math.pi

-- Rows of the table: what phase tone k of n has, in rad. `powers` are shares
-- of the total power, tones in increasing order.

-- D. J. Newman, "An L1 extremal problem for polynomials", Proc. AMS 16 (1965):
-- pi (k - 1)^2 / n.
local function newman(n)
  local phases = {}
  for k = 1, n do
    phases[k] = PI * (((k - 1) ^ 2 / n) % 2)
  end
  return phases
end

-- M. R. Schroeder, "Synthesis of low-peak-factor signals and binary sequences
-- with low autocorrelation", IEEE Trans. IT 16 (1970): minus 2 pi times the sum
-- over l < k of (k - l) p_l; for equal powers minus pi k (k - 1) / n.
local function schroeder(n, powers)
  local phases, sum, weighted = {}, 0, 0
  for k = 1, n do
    weighted = weighted + sum
    phases[k] = -2 * PI * (weighted % 1)
    sum = sum + powers[k]
  end
  return phases
end

-- Signs of the sequence of W. Rudin, "Some theorems on Fourier coefficients",
-- Proc. AMS 10 (1959), and H. S. Shapiro (1951): minus where k - 1 has an odd
-- number of pairs of neighbouring ones in binary.
local function rudin_shapiro(n)
  local phases = {}
  for k = 0, n - 1 do
    local pairs_of_ones, parity = k & (k >> 1), 0
    while pairs_of_ones ~= 0 do
      pairs_of_ones, parity = pairs_of_ones & (pairs_of_ones - 1), 1 - parity
    end
    phases[k + 1] = parity == 0 and 0 or PI
  end
  return phases
end

local function equal(n)
  local phases = {}
  for k = 1, n do
    phases[k] = 0
  end
  return phases
end

local function random(n, _, seed)
  local u = core.synth.uniform(core.samples.new(n), seed, { 0, 0, 65 })
  return (u * (2 * PI)):totable()
end

local laws = { newman = newman, schroeder = schroeder, rudin_shapiro = rudin_shapiro,
               equal = equal, random = random }

local schema = {
  hz = { common.hertz, required = true },
  harmonics = { options.list(options.integer(1, 1 << 31), 1, 65536) },
  count = { options.integer(1, 65536) },
  amplitude = { common.level },
  amplitudes = { options.list(options.number { above = 0 }, 1, 65536) },
  rms = { common.above },
  phases = { options.choice { "newman", "schroeder", "rudin_shapiro", "equal", "random" },
             default = "schroeder" },
  seed = { common.key, default = 0 },
}

local function harmonics_of(read)
  if (read.harmonics == nil) == (read.count == nil) then
    error("multisine: give harmonics (a list) or count (1 .. count), one of them", 0)
  end
  local list = read.harmonics or {}
  for k = 1, read.count or 0 do
    list[k] = k
  end
  for k = 2, #list do
    if list[k] <= list[k - 1] then
      error("multisine: harmonics must increase", 0)
    end
  end
  return list
end

local function amplitudes_of(read, n)
  local given = (read.amplitude and 1 or 0) + (read.amplitudes and 1 or 0) + (read.rms and 1 or 0)
  if given ~= 1 then
    error("multisine: give amplitude, amplitudes or rms, one of them", 0)
  elseif read.amplitudes and #read.amplitudes ~= n then
    error(("multisine: %d amplitudes for %d harmonics"):format(#read.amplitudes, n), 0)
  end
  local list = read.amplitudes or {}
  local each = read.amplitude or read.rms and read.rms * math.sqrt(2 / n)
  for k = 1, n do
    list[k] = list[k] or each
  end
  return list
end

local function shares(amplitudes)
  local sum, list = 0, {}
  for _, a in ipairs(amplitudes) do
    sum = sum + a * a
  end
  for k, a in ipairs(amplitudes) do
    list[k] = sum > 0 and a * a / sum or 0
  end
  return list
end

function M.tones(spec)
  local read = options.take(schema, spec, "multisine")
  local harmonics = harmonics_of(read)
  local n = #harmonics
  local amplitudes = amplitudes_of(read, n)
  local phases, tones = laws[read.phases](n, shares(amplitudes), read.seed), {}
  for k = 1, n do
    tones[k] = { hz = read.hz * harmonics[k], amplitude = amplitudes[k], phase = phases[k] }
  end
  return tones
end

return M
