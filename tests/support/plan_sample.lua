--- A plan written by hand, with the fields that reports read. Invented numbers.

local fraction = require "libration.fraction"

local function add(plan, name, hz, least, most, tolerance, ratio)
  local line = {
    name = name, hz = fraction.new(hz), bin = hz * plan.duration_s, least = least, most = most,
    tolerance = tolerance, error = tolerance * ratio, ratio = ratio,
    systematic = tolerance * ratio * 0.8, random = tolerance * ratio / 15,
    hz_error = 0.0123 * ratio, tolerance_hz = 0.1, hz_ratio = 0.123 * ratio,
    budget = {
      { term = "leakage", from = "mains 3", value = tolerance * ratio * 0.4, kind = "systematic" },
      { term = "own image", value = tolerance * ratio * 0.3, kind = "systematic" },
      { term = "noise", value = tolerance * ratio * 0.2, kind = "random" },
    },
  }
  table.insert(plan.lines, line)
  table.insert(plan.demand.lines, { name = name, hz = line.hz, least = least, most = most,
    lock_hz = hz, free_hz = 0, driver = 1 })
end

local function interfere(plan, name, hz, most)
  table.insert(plan.demand.interferers, { name = name, hz = fraction.new(hz), least = 0,
    most = most, lock_hz = hz, free_hz = 0, driver = 2 })
end

return function(title, worst)
  local plan = {
    worst = worst or 0.767, rate = fraction.new("12288000/499"), samples = 98304,
    duration_s = 98304 * 499 / 12288000, averages = 4, coverage = 3, reading = "tracked",
    window = { name = "hann" }, setting = { divider = 499, decimation = 1 },
    identity = ("0123456789abcdef"):rep(4), lines = {}, notes = { "A note." },
    demand = { title = title or "Coolant pump skid (invented)", unit = "m/s^2", coverage = 3,
      lines = {}, interferers = {}, drivers = { { spread = 0.001 }, { spread = 0.004 } } },
    digitizer = { title = "Bench digitizer", filter = { shape = "none" },
      rates = { kind = "divider", clock = fraction.new(12288000) } },
  }
  add(plan, "shaft", 24.6, 0.05, 2, 0.0005, worst or 0.767)
  add(plan, "vane pass", 172.2, 0.02, 1, 0.0002, 0.3)
  add(plan, "Lüfter 温度", 9800, 0.001, 0.3, 0.00001, 0.04)
  for order = 1, 20 do
    interfere(plan, "mains " .. order, 50 * order, 0.02)
  end
  interfere(plan, "inverter", 16000, 0.5)
  return plan
end
