-- The same bits on every processor: the module built for plain x86-64, for
-- AVX2 alone, and with all its variants chosen at run time makes the same
-- samples.

local builds = {
  { name = "plain", flags = "-D'target_clones(...)=unused' -DLBR_NO_WIDE" },
  { name = "avx2", flags = "-D'target_clones(...)=target(\"avx2\")' -DLBR_NO_WIDE" },
}

local function output(command)
  local pipe = assert(io.popen(command))
  local text = pipe:read "a"
  pipe:close()
  return text:match "%x+" or error("no digest from " .. command)
end

describe("samples made by", function()
  local ours = output "scripts/env lua5.4 tests/support/digest.lua"
  for _, build in ipairs(builds) do
    it("a build for " .. build.name .. " are the same", function()
      local folder = "build/only-" .. build.name
      local made = os.execute(("make -s BUILD=%s CFLAGS=%q all >/dev/null 2>&1")
        :format(folder, build.flags .. " -Wno-error"))
      assert(made, "the build failed")
      assert.equal(ours, output(("BUILD=%s scripts/env lua5.4 tests/support/digest.lua")
        :format(folder)))
    end)
  end
end)
