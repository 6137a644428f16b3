-- What the failing-allocator sweep runs over exact numbers, units and data.
return "numbers", function()
  local base = require("libration.core").base
  local sum = base.fraction(0)
  for _, value in ipairs { "1/3", 0.3, 7, "12.288e6", base.fraction(2, 5) } do
    sum = sum + base.fraction(value)
  end
  assert(tostring(sum / 2) == tostring(sum * "1/2"))
  assert(base.fraction_gcd(sum, -sum) == sum:abs())
  assert(select(3, base.try_fraction "1/0") == "domain")
  assert(base.number_read(base.number_text(0.1)) == 0.1)
  assert(#base.sha256(tostring(sum)) == 64)
end
