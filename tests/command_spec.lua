local cjson = require "cjson"
local help = require "libration.command.help"
local lfs = require "lfs"
local words = require "libration.command.words"

local root = lfs.currentdir()
local folder

local function quote(word)
  return "'" .. word:gsub("'", "'\\''") .. "'"
end

local function read(path)
  local file = io.open(path, "rb")
  if not file then
    return nil
  end
  local bytes = file:read "a"
  file:close()
  return bytes
end

local function write(name, text)
  local file = assert(io.open(folder .. "/" .. name, "wb"))
  file:write(text)
  file:close()
  return folder .. "/" .. name
end

-- Runs a command line; returns exit code, standard output, standard error.
local function shell(line)
  local out, err = folder .. "/.out", folder .. "/.err"
  local _, _, code = os.execute(("%s >%s 2>%s </dev/null"):format(line, out, err))
  return code, read(out), read(err)
end

local function run(...)
  local list = { quote(root .. "/scripts/libration") }
  for _, word in ipairs { ... } do
    list[#list + 1] = quote(word)
  end
  return shell(table.concat(list, " "))
end

local good = [[
demand = {
  title = "Tone", unit = "V", noise = "20 uV/rtHz",
  lines = { { name = "tone", hz = 425, drift = "0.5 %", amplitude = "0.1..1 V",
              tolerance = "2 %" } },
}
digitizer = { title = "logger", rates = { "8 kS/s" }, bits = 16, range = "2 V" }
]]

setup(function()
  folder = os.tmpname()
  os.remove(folder)
  assert(lfs.mkdir(folder))
end)

teardown(function()
  os.execute("rm -rf " .. quote(folder))
end)

describe("help", function()
  it("names every command and exit code, and succeeds", function()
    local code, out, err = run "--help"
    assert.equal(0, code)
    assert.equal("", err)
    for _, name in ipairs { "plan", "prove", "measure", "windows", "prompt", "help", "--version",
                            "Exit codes" } do
      assert.truthy(out:find(name, 1, true), name)
    end
    assert.equal(out, select(2, run "help"))
  end)

  it("has an example that works as printed", function()
    local example = help.general:match("\n(  demand = .-)\n\n")
    local code, out, err = run("plan", write("help.demand", example), "--within", "60 s")
    assert.equal("", err)
    assert.equal(0, code)
    assert.truthy(out:find("holds every tolerance", 1, true))
  end)

  it("explains each command with all its options", function()
    for _, name in ipairs { "plan", "prove", "measure", "windows" } do
      local code, out = run(name, "--help")
      assert.equal(0, code)
      assert.truthy(out:find("libration " .. name, 1, true))
      assert.truthy(out:find("--json", 1, true))
    end
    assert.truthy(select(2, run("help", "plan")):find("--within TIME", 1, true))
  end)

  it("says the version", function()
    local code, out = run "--version"
    assert.equal(0, code)
    assert.equal("libration " .. require("libration").version .. "\n", out)
  end)
end)

describe("wrong use", function()
  it("ends with 2, a message, and no traceback", function()
    local path = write("good.demand", good)
    local cases = {
      { { "plna" }, 'unknown command "plna"; valid:' }, { {}, "say what to do" },
      { { "plan" }, "0 operands" }, { { "plan", "--jso", path }, "valid: --budget" },
      { { "plan", path, "--within" }, "needs a value" },
      { { "plan", path, "--within", "soon" }, "--within" },
      { { "plan", path, "--within=1 kg" }, "--within" },
      { { "plan", path, "--readings", "guess" }, "guess" },
      { { "plan", path, "--windows", "round" }, "round" },
      { { "plan", path, "--json=yes" }, "takes no value" },
      { { "plan", path, "--json", "--json" }, "given twice" },
      { { "plan", path, "--budget", "bass" }, "tone" },
      { { "prove", path, "--trials", "1.5" }, "not a whole number" },
      { { "prove", path, "--seed", "-1" }, "not a whole number" },
      { { "measure", path }, "1 operands" }, { { "windows", "x" }, "1 operands" },
      { { "help", "plna" }, "valid:" },
      { { "plan", path, "--json", "--csv" }, "--json and --csv exclude each other" },
      { { "plan", path, "--effort", "1 kg" }, "--effort" },
      { { "measure", path, "x.wav", "--first", "0" }, "--first: 0 is not a whole number" },
    }
    for _, case in ipairs(cases) do
      local code, _, err = run(table.unpack(case[1]))
      local label = table.concat(case[1], " ") .. ": " .. err
      assert.equal(2, code, label)
      assert.truthy(err:find(case[2], 1, true), label)
      assert.falsy(err:find("traceback", 1, true), label)
    end
  end)

  it("lists all mistakes of all files at once", function()
    local one = write("one.demand", 'demand = { lines = { { name = "a", hz = -1, '
      .. 'tolerence = "1 %" }, { name = "b", hz = "3 kg" } } }')
    local two = write("two.demand", 'digitizer = { rates = { "8 kS/s" }, bits = 99 }')
    local code, out, err = run("plan", one, two)
    assert.equal(2, code)
    assert.equal("", out)
    for _, part in ipairs { "lines[1].hz", "tolerence", "lines[2].hz", "digitizer.bits", "99" } do
      assert.truthy(err:find(part, 1, true), part .. " in " .. err)
    end
    assert.falsy(err:find("traceback", 1, true))
  end)

  it("needs one demand and a digitizer", function()
    local alone = write("alone.demand", good:match "^(.-)digitizer")
    assert.truthy(select(3, run("plan", alone)):find("no digitizer", 1, true))
    local code, _, err = run("plan", write("good.demand", good), alone)
    assert.equal(2, code)
    assert.truthy(err:find("a second demand", 1, true))
  end)
end)

describe("the world refusing", function()
  it("ends with 3", function()
    local path = write("good.demand", good)
    for _, line in ipairs { { "plan", "/no/such/file" }, { "prove", "/no/such/file" },
                            { "measure", "/no/such/plan", "x.wav" },
                            { "plan", path, "--save", "/no/such/folder/plan" },
                            { "plan", path, "--plots", "/proc/no" } } do
      local code, _, err = run(table.unpack(line))
      assert.equal(3, code, table.concat(line, " ") .. ": " .. err)
      assert.truthy(err:find("^libration: ") and not err:find("traceback", 1, true))
    end
  end)

  it("ends with 3 for a script that is not there", function()
    local code, _, err = run(folder .. "/missing.lua")
    assert.equal(3, code)
    assert.truthy(err:find("missing.lua: no such script", 1, true), err)
  end)

  it("is one JSON document with --json, as wrong use is", function()
    local path = write("good.demand", good)
    for _, case in ipairs {
      { 3, "world", { "plan", "/no/such/file\xff", "--json" } },
      { 3, "world", { "plan", path, "--json", "--save", "/no/such/folder/plan" } },
      { 2, "misuse", { "plan", path, "--within", "soon", "--json" } },
      { 2, "misuse", { "plan", path, "--json", "--budget", "bass" } },
      { 2, "misuse", { "prove", "--json" } },
      { 3, "world", { "measure", "--json", "/no/such/plan", "x.wav" } },
    } do
      local code, said, err = run(table.unpack(case[3]))
      local label = table.concat(case[3], " ") .. ": " .. said .. err
      assert.equal(case[1], code, label)
      local facts = cjson.decode(said)
      assert.equal(case[2], facts.code, label)
      assert.truthy(err:find("libration: ", 1, true) and #facts.error > 5, label)
    end
    assert.equal("", (select(2, run("plan", "--", "--json"))))
  end)

  it("shows when standard output is full", function()
    local line = quote(root .. "/scripts/libration") .. " --help"
    local _, _, code = os.execute(line .. " >/dev/full 2>" .. folder .. "/.err")
    assert.equal(3, code)
    assert.truthy(read(folder .. "/.err"):find("standard output", 1, true))
  end)
end)

describe("plan, prove, measure", function()
  it("hold: exit 0, one JSON document, pictures and a plan that proves", function()
    local path = write("good.demand", good)
    local code, out, err = run("plan", path, "--json", "--save", folder .. "/tone.plan",
      "--plots", folder .. "/plots")
    assert.same({ 0, "" }, { code, err })
    local facts = cjson.decode(out)
    assert.equal("plan", facts.kind)
    assert.is_true(facts.holds)
    assert.equal(8000, facts.rate_hz)
    for _, name in ipairs { "fold-map.svg", "fold-map.png", "spectrum.svg", "spectrum.png" } do
      assert.is_true(lfs.attributes(folder .. "/plots/" .. name, "size") > 1000)
    end
    code, out, err = run("prove", folder .. "/tone.plan", "--trials", "50", "--json")
    assert.same({ 0, "" }, { code, err })
    local proof = cjson.decode(out)
    assert.same({ "proof", 0, 50 }, { proof.kind, proof.violations, proof.trials })
    assert.equal(facts.identity, proof.identity)
  end)

  it("refuse: exit 1, with what would help", function()
    local path = write("good.demand", good)
    local code, out, err = run("plan", path, "--within", "1 ms", "--json")
    assert.same({ 1, "" }, { code, err })
    local facts = cjson.decode(out)
    assert.same({ "refusal", false }, { facts.kind, facts.holds })
    code, out = run("plan", path, "--within", "1 ms")
    assert.equal(1, code)
    assert.truthy(out:find("cannot be measured as demanded", 1, true))
  end)

  it("measure a record by its plan, or refuse it", function()
    assert.equal(0, (run("plan", write("good.demand", good), "--save", folder .. "/tone.plan")))
    local lb = require "libration"
    local plan = assert(lb.load_plan(folder .. "/tone.plan"))
    local record, truth = plan:replay { seed = 3, trial = 0 }
    assert(record:write(folder .. "/tone.wav"))
    local code, out, err = run("measure", folder .. "/tone.plan", folder .. "/tone.wav", "--json")
    assert.same({ 0, "" }, { code, err })
    local facts = cjson.decode(out)
    assert.equal("measurement", facts.kind)
    local line = facts.lines[1]
    assert.equal("tone", line.name)
    assert.near(truth.lines[1].amplitude, line.amplitude, line.bound)
    assert.near(record:measure(plan).lines[1].amplitude, line.amplitude, 2 * 4 / 2 ^ 16)
    local short = lb.record.new { rate = "8 kS/s", unit = "V", samples = { 0.5, -0.5, 0.25 } }
    assert(short:write(folder .. "/short.wav"))
    code, out = run("measure", folder .. "/tone.plan", folder .. "/short.wav",
      "--full-scale", "1 V")
    assert.equal(1, code)
    assert.truthy(out:find("samples", 1, true))
    code = run("measure", folder .. "/tone.plan", write("no.wav", "no sound"))
    assert.equal(2, code)
  end)

  it("measure exits 1 where a line is outside its demand, and reads from --first", function()
    local path, lb = folder .. "/tracked.plan", require "libration"
    assert.equal(0, (run("plan", write("good.demand", good), "--save", path, "--readings",
      "tracked")))
    local plan = assert(lb.load_plan(path))
    local x, tone = {}, assert(plan:replay { seed = 3, trial = 0 }):values()
    for i = 1, 50 + plan.samples do x[i] = i <= plan.samples and 0 or 0.5 end
    for i = 1, plan.samples do x[#x + 1] = tone[i] end
    local record = lb.record.new { rate = "8 kS/s", unit = "V", samples = x }
    assert(record:write(folder .. "/late.csv"))
    local code, out, err = run("measure", path, folder .. "/late.csv")
    assert.equal(1, code)
    assert.truthy(err:find("bounds do not hold: tone\n", 1, true), err)
    assert.truthy(out:find("(edge)  (*)", 1, true), out)
    assert.truthy(out:find("Read: samples 1.." .. plan.samples .. " of " .. #x, 1, true), out)
    code, out = run("measure", path, folder .. "/late.csv", "--json")
    assert.same({ 1, false }, { code, cjson.decode(out).holds })
    local first = tostring(plan.samples + 51)
    code, out, err = run("measure", path, folder .. "/late.csv", "--first", first, "--json")
    assert.same({ 0, "" }, { code, err })
    local want = record:measure(plan, { first = plan.samples + 51 })
    assert.same({ true, plan.samples + 51 }, { want.holds, cjson.decode(out).first })
    assert.equal(want.lines[1].amplitude, cjson.decode(out).lines[1].amplitude)
  end)

  it("measure gives a full scale only to what holds shares of one", function()
    local path, lb = folder .. "/tone.plan", require "libration"
    assert.equal(0, (run("plan", write("good.demand", good), "--save", path)))
    local record = assert(lb.load_plan(path)):replay { seed = 3, trial = 0 }
    local seen = {}
    for i, ending in ipairs { "wav", "flac", "csv", "sigmf-meta", "h5" } do
      local name = folder .. "/same." .. ending
      assert(record:write(name, ending == "flac" and { bits = 24 } or nil))
      local code, out, err = run("measure", path, name, "--json")
      assert.same({ 0, "" }, { code, err }, ending .. out)
      seen[i] = cjson.decode(out).lines[1].amplitude
      assert.near(seen[1], seen[i], 1e-4, ending)
    end
    local code, _, err = run("measure", path, folder .. "/same.csv", "--full-scale", "1 V")
    assert.equal(2, code)
    assert.truthy(err:find("takes no full_scale", 1, true), err)
    code, _, err = run("measure", path, folder .. "/same.wav", "--first", "2", "--json")
    assert.same({ 1, "" }, { code, err })
  end)

  it("a refused measurement says its code", function()
    local path, lb = folder .. "/tone.plan", require "libration"
    assert.equal(0, (run("plan", write("good.demand", good), "--save", path)))
    local slow = lb.record.new { rate = "4 kS/s", unit = "V", samples = { 0.5, -0.5, 0.25 } }
    assert(slow:write(folder .. "/slow.wav"))
    local code, out = run("measure", path, folder .. "/slow.wav", "--full-scale", "1 V", "--json")
    assert.same({ 1, "wrong_rate" }, { code, cjson.decode(out).code })
  end)

  it("a plan never replaces a file it is made of", function()
    local path = write("keep.demand", good)
    os.execute(("ln -sf keep.demand %s/alias"):format(folder))
    for _, name in ipairs { "keep.demand", "alias", "../" .. folder:match "[^/]*$" .. "/alias" } do
      local code, _, err = run("plan", path, "--save", folder .. "/" .. name)
      assert.equal(2, code, err)
      assert.truthy(err:find(name .. " would overwrite " .. path, 1, true), err)
    end
    assert.equal(good, read(path))
    assert.equal(0, (run("plan", path, "--save", folder .. "/keep.plan")))
  end)

  it("a saved plan given to plan points to prove and measure", function()
    local path = folder .. "/given.plan"
    assert.equal(0, (run("plan", write("good.demand", good), "--save", path)))
    local code, _, err = run("plan", path)
    assert.equal(2, code)
    assert.truthy(err:find("libration prove " .. path, 1, true), err)
    assert.truthy(err:find("libration measure " .. path, 1, true), err)
  end)

  it("a search that gave up points to --effort", function()
    local hard = good:gsub("2 %%", "0.1 %%")
      :gsub('"8 kS/s"', '"8 kS/s", "16 kS/s", "32 kS/s", "64 kS/s"')
    local code, out, err = run("plan", write("hard.demand", hard), "--effort", "1 us")
    assert.is_true(code == 0 or code == 1, err)
    assert.truthy(out:find("effort_s", 1, true), out)
    assert.truthy(err:find("--effort TIME", 1, true), err)
  end)

  it("windows are listed for people and machines", function()
    local code, out = run "windows"
    assert.equal(0, code)
    assert.truthy(out:find("\nhann", 1, true))
    code, out = run("windows", "--json")
    assert.equal(0, code)
    assert.is_true(#cjson.decode(out) > 40)
  end)
end)

describe("the launcher", function()
  it("finds the library from any folder and through links", function()
    os.execute(("ln -sf %s %s/link && ln -sf link %s/again"):format(
      quote(root .. "/scripts/libration"), folder, folder))
    local code, out = shell(("cd / && %s/again --version"):format(folder))
    assert.equal(0, code)
    assert.truthy(out:find("^libration %d"))
    code, out = shell(("cd / && PATH=%s:$PATH again --version"):format(folder))
    assert.equal(0, code)
    assert.truthy(out:find("^libration %d"))
  end)

  it("runs a script with its words and passes on its exit code", function()
    local path = write("say.lua", 'local lb = require "libration"\n'
      .. 'print(lb.version, arg[0]:match "[^/]*$", ...) os.exit(7)')
    local code, out = run(path, "a b", "--json")
    assert.equal(7, code)
    assert.truthy(out:find("say.lua\ta b\t--json", 1, true))
  end)

  it("is a prompt that prints results, reads on, and ends with its input", function()
    local input = write("input", "1 + 1\nfor i = 1, 2 do\n  print('row', i)\nend\n"
      .. "lb.version\nhelp 'plan'\nerror 'mine'\nlb.plna\n"
      .. "help(lb.digitizer)\n'still here'\n")
    local out, err = folder .. "/.out", folder .. "/.err"
    local _, _, code = os.execute(("%s prompt <%s >%s 2>%s"):format(
      quote(root .. "/scripts/libration"), input, out, err))
    assert.equal(0, code)
    local said = read(out)
    for _, part in ipairs { "2", "row\t2", require("libration").version, "lb.plan(demand",
                            "effort_s (seconds of search", "@param input", "still here" } do
      assert.truthy(said:find(part, 1, true), part)
    end
    local complaints = read(err)
    assert.truthy(complaints:find("mine", 1, true))
    assert.truthy(complaints:find("lb.plna is not there; did you mean lb.plan?", 1, true))
    assert.is_nil(require("libration").plna)
  end)
end)

describe("help at the prompt", function()
  it("names what the library has", function()
    local lb, text = require "libration", require("libration.prompt").about()
    for line in text:gmatch "[^\n]+" do
      local room, rest = line:match "^  lb%.([%w_]+)(.-)  "
      assert.truthy(lb[room], line)
      for field in rest:gsub("[({].*", ""):gmatch "%.([%w_]+)" do
        assert.truthy(lb[room][field], line .. ": " .. field)
      end
    end
    for room in pairs(getmetatable(lb).rooms) do
      assert.truthy(text:find("lb." .. room, 1, true), room)
    end
  end)
end)

describe("words of a command line", function()
  it("end options at --", function()
    local found, operands = words.read({ "--", "--json" }, { json = {} })
    assert.same({ {}, { "--json" } }, { found, operands })
  end)
end)
