-- scripts/setup against a package manager of our own making.

local fake = {
  ["dpkg-query"] = [[sed 's/^/installed /' "$FAKE/installed"]],
  ["apt-get"] = [[
echo "$*" >>"$FAKE/calls"
case "$*" in
  *update*) test ! -e "$FAKE/no-network" ;;
  *install*)
    for word in "$@"; do
      case $word in
        -*|install|DPkg*) ;;
        *) if grep -qx "$word" "$FAKE/cannot" 2>/dev/null; then
             echo "E: Unable to locate package $word" >&2; exit 100
           fi
           echo "$word" >>"$FAKE/installed" ;;
      esac
    done ;;
esac]],
  id = [[echo "${FAKE_USER:-0}"]],
}

local tools = "sh awk grep sed wc mktemp rm tail env dirname cat"

local folder

local function shell(command)
  local pipe = assert(io.popen(command .. " 2>&1; echo \"status $?\"", "r"))
  local text = pipe:read("a")
  pipe:close()
  return tonumber(text:match("status (%d+)\n$")), (text:gsub("status %d+\n$", ""))
end

local function write(name, text, executable)
  local file = assert(io.open(folder .. "/" .. name, "w"))
  assert(file:write(text))
  assert(file:close())
  if executable then
    assert(os.execute("chmod +x " .. folder .. "/" .. name))
  end
end

local function read(name)
  local file = io.open(folder .. "/" .. name, "r")
  local text = file and file:read("a") or ""
  if file then
    file:close()
  end
  return text
end

local function setup(arguments, environment)
  return shell(("env PATH=%s/bin FAKE=%s %s sh scripts/setup %s"):format(
    folder, folder, environment or "", arguments or ""))
end

describe("scripts/setup #checks", function()
  before_each(function()
    folder = os.tmpname()
    os.remove(folder)
    assert(os.execute(([[mkdir -p %s/bin && cd %s/bin &&
      for tool in %s; do ln -s "$(command -v $tool)" $tool || exit 1; done]]):format(
      folder, folder, tools)))
    for name, body in pairs(fake) do
      write("bin/" .. name, "#!/bin/sh\n" .. body .. "\n")
    end
    assert(os.execute(("chmod +x %s/bin/dpkg-query %s/bin/apt-get %s/bin/id"):format(
      folder, folder, folder)))
    write("installed", "")
  end)

  after_each(function()
    os.execute("rm -rf " .. folder)
  end)

  it("installs what is missing, one reason each, and then has nothing to do", function()
    write("installed", "gcc\nmake\n")
    local status, text = setup()
    assert.are.equal(0, status, text)
    assert.has_match("\n  lua5%.4 +%l", text)
    assert.has_no.match("\n  gcc ", text)
    local calls = read("calls")
    assert.has_match("update\n.*install", calls)
    assert.has_match("libfftw3%-dev", calls)
    assert.has_no.match("valgrind", calls)

    write("calls", "")
    status, text = setup()
    assert.are.equal(0, status)
    assert.has_match("everything is installed", text)
    assert.are.equal("", read("calls"))
  end)

  it("adds what the tests need when asked", function()
    assert.are.equal(0, (setup "--tests"))
    assert.has_match("lua%-busted", read("installed"))
    assert.has_match("valgrind", read("installed"))
  end)

  it("names the package that cannot be had, and says what to do", function()
    write("cannot", "libsndfile1-dev\n")
    local status, text = setup()
    assert.are.equal(1, status)
    assert.has_match("Unable to locate package libsndfile1%-dev", text)
    assert.has_match("could not be had:[^\n]* libsndfile1%-dev", text)
    assert.has_match("apt%-get install", text)
  end)

  it("goes on with the list that is there when it cannot be renewed", function()
    write("no-network", "")
    local status, text = setup()
    assert.are.equal(0, status, text)
    assert.has_match("could not be renewed", text)
  end)

  it("says how when it is neither root nor has sudo", function()
    local status, text = setup("", "FAKE_USER=1000")
    assert.are.equal(1, status)
    assert.has_match("needs root", text)
    assert.are.equal("", read("calls"))
  end)

  it("goes through sudo otherwise", function()
    write("bin/sudo", "#!/bin/sh\necho sudo >>\"$FAKE/calls\"\nexec \"$@\"\n", true)
    local status, text = setup("", "FAKE_USER=1000")
    assert.are.equal(0, status, text)
    assert.has_match("^sudo\n.*update\nsudo\n.*install", read("calls"))
  end)

  it("lists the packages where there is no apt", function()
    os.remove(folder .. "/bin/apt-get")
    local status, text = setup()
    assert.are.equal(1, status)
    assert.has_match("libfftw3%-dev", text)
  end)

  it("does not know other arguments", function()
    local status, text = setup "--everything"
    assert.are.equal(2, status)
    assert.has_match("unknown argument '%-%-everything'; valid:", text)
  end)
end)
