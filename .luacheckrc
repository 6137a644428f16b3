-- What luacheck is told: Lua 5.4 everywhere, busted's words in the tests.
std = "lua54"
max_line_length = 100
codes = true
ignore = { "581" } -- "not (a < b)" is not "a >= b" where a number may be no number
files["tests"] = { std = "+busted" }
