-- What the failing-allocator sweep runs over exact numbers, units and data.
local text = [[
demand = { unit = "V", noise = "1 uV/rtHz", lines = {
  { name = "a", hz = 24.6, amplitude = "1..20 mV", tolerance = "0.1 dB", orders = "1..2",
    sidebands = { by = "b", orders = { 1 } } },
  { name = "b", of = "a", times = "1/3", amplitude = { 1, 2, "V" }, tolerance_hz = "50 ppm" } } }
digitizer = { clock = "12.288 MHz", divider = "128..512", bits = 24, range = "5 V",
  filter = { shape = "bessel", order = 4, corner = "0.4 rate" } }
]]

return "numbers", function()
  local base = require("libration.core").base
  local inert = require "libration.inert"
  local load = require "libration.load"
  local sum = base.fraction(0)
  for _, value in ipairs { "1/3", 0.3, 7, "12.288e6", base.fraction(2, 5) } do
    sum = sum + base.fraction(value)
  end
  assert(tostring(sum / 2) == tostring(sum * "1/2"))
  assert(base.fraction_gcd(sum, -sum) == sum:abs())
  assert(select(3, base.try_fraction "1/0") == "domain")
  assert(select(3, base.try_multiply(math.maxinteger, 3)) == "overflow")
  assert(base.number_read(base.number_text(0.1)) == 0.1)
  assert(#base.sha256(tostring(sum)) == 64)
  local data = assert(load.parse(text))
  assert(#data.demand.lines == 7 and data.digitizer.bits == 24)
  assert(#tostring(data.demand) > 100 and #tostring(data.digitizer) > 100)
  local again = assert(load.parse(inert.write { demand = data.demand.source }))
  assert(tostring(again.demand) == tostring(data.demand))
  assert(load.parse "demand = { lines = { {} }, x = os }" == nil)
  assert(load.parse "demand = { lines = { { hz = '1 V', of = 3 } } }" == nil)
end
