-- What the failing-allocator sweep runs over averages, transforms and zooms.
local function work()
  local core, samples = require "libration.core", require "libration.samples"
  local survey, spectrum = require "libration.survey", require "libration.spectrum"
  local x = samples.make(700, function(i) return math.sin(i * i) end)
  local y = x * 2 + 1

  -- Refusals speak of memory, as raised errors do.
  local function had(value, message)
    return value or error(message, 2)
  end

  for _, workers in ipairs { 1, 2 } do
    local a = had(survey.averages({ x, y }, { rate = 1, segment = 64, cross = true,
      detrend = "line", workers = workers }))
    assert(#had(a:density(2)).values == 33 and #had(a:coherence(1, 2)).values == 33)
    assert(#had(a:response(1, 2, { estimate = "h2" })):gain() == 33)
  end
  local stream = survey.accumulate { rate = 1, segment = 50, averaging = "median", workers = 1 }
  had(stream:feed(x:slice(1, 333)))
  stream:split()
  had(stream:feed(x:slice(334, 700)))
  assert(had(stream:density()):limits(0.95) < 1)
  assert(#tostring(had(stream:lines())) > 0)
  for _, n in ipairs { 100, 2048, 2018 } do
    local re, im = core.spectrum.single(n, 1):run(x:slice(1, 100))
    assert(#re == #im and (n < 700 or #core.spectrum.forward(x, n) == #re))
  end
  assert(#spectrum.zoom(x, { rate = 1, first_hz = 0.1, step_hz = 1e-3, points = 20 }) == 20)
  assert(core.spectrum.zoom(5000, 0.1, 1e-6, 20, 1):decimation() > 1)
  assert(#spectrum.quadrature(x) == 700)
end

return "spectrum", function()
  local core = require "libration.core"
  local ok, message = pcall(work)
  core.spectrum.forget()
  if not ok then error(message, 0) end
end
