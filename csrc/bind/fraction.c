#include "bind/fraction.h"

#include <string.h>

#include "base/hash.h"
#include "base/text.h"

typedef lbr_status (*operation)(lbr_fraction, lbr_fraction, lbr_fraction *);

void lbr_push_fraction(lua_State *L, lbr_fraction value) {
  lbr_fraction *f = lua_newuserdatauv(L, sizeof *f, 0);
  *f = value;
  luaL_setmetatable(L, LBR_FRACTION_CLASS);
}

/* The value at `arg` as a fraction; LBR_FORMAT for what is no number. */
static lbr_status to_fraction(lua_State *L, int arg, lbr_fraction *out) {
  const lbr_fraction *held = luaL_testudata(L, arg, LBR_FRACTION_CLASS);
  size_t n;
  if (held) {
    *out = *held;
    return LBR_OK;
  }
  if (lua_isinteger(L, arg))
    return lbr_fraction_make(lua_tointeger(L, arg), 1, out);
  if (lua_type(L, arg) == LUA_TNUMBER)
    return lbr_fraction_from_double_shortest(lua_tonumber(L, arg), out);
  if (lua_type(L, arg) != LUA_TSTRING)
    return LBR_FORMAT;
  const char *text = lua_tolstring(L, arg, &n);
  return lbr_fraction_parse(text, n, out);
}

/* Pushes what the value at `arg` looks like, for messages. */
static const char *push_look(lua_State *L, int arg) {
  char text[LBR_FRACTION_TEXT], number[LBR_NUMBER_TEXT];
  const lbr_fraction *held = luaL_testudata(L, arg, LBR_FRACTION_CLASS);
  if (held) {
    lbr_fraction_text(*held, text);
    return lua_pushstring(L, text);
  }
  if (lua_isinteger(L, arg))
    return lua_pushfstring(L, "%I", (LUAI_UACINT)lua_tointeger(L, arg));
  if (lua_type(L, arg) == LUA_TNUMBER) {
    lbr_number_text(lua_tonumber(L, arg), number);
    return lua_pushstring(L, number);
  }
  if (lua_type(L, arg) != LUA_TSTRING)
    return lua_pushfstring(L, "a %s", luaL_typename(L, arg));
  const char *read = lua_tostring(L, arg);
  if (strlen(read) < 60)
    return lua_pushfstring(L, "\"%s\"", read);
  lua_pushlstring(L, read, 57);
  return lua_pushfstring(L, "\"%s...\"", lua_tostring(L, -1));
}

static const char *complaint(lbr_status status) {
  switch (status) {
  case LBR_FORMAT:
    return "is not a number; give an integer, a decimal (\"12.288e6\"), "
           "a quotient (\"7/2\") or a fraction";
  case LBR_OVERFLOW:
    return "overflow: does not fit a fraction of two 64-bit integers";
  case LBR_DOMAIN:
    return "is not finite (divided by zero, an infinity or not a number)";
  default:
    return lbr_status_text(status);
  }
}

/* nil, message, code; the message is on the stack, so it stays. */
static int refuse_look(lua_State *L, const char *message, lbr_status status) {
  lua_pushnil(L);
  lua_pushstring(L, message);
  lua_pushstring(L, lbr_status_code(status));
  return 3;
}

lbr_fraction lbr_check_fraction(lua_State *L, int arg) {
  lbr_fraction value = {0, 1};
  lbr_status status = to_fraction(L, arg, &value);
  if (status)
    luaL_argerror(L, arg, lua_pushfstring(L, "%s %s", push_look(L, arg),
                                          complaint(status)));
  return value;
}

static int operate(lua_State *L, operation run, const char *sign) {
  lbr_fraction a = lbr_check_fraction(L, 1), b = lbr_check_fraction(L, 2);
  lbr_fraction result = {0, 1};
  lbr_status status = run(a, b, &result);
  if (status == LBR_DOMAIN)
    return luaL_error(L, "division by zero: %s %s 0", push_look(L, 1), sign);
  if (status)
    return luaL_error(L, "overflow: %s %s %s does not fit a fraction of two "
                      "64-bit integers", push_look(L, 1), sign,
                      push_look(L, 2));
  lbr_push_fraction(L, result);
  return 1;
}

static int add(lua_State *L) { return operate(L, lbr_fraction_add, "+"); }
static int sub(lua_State *L) { return operate(L, lbr_fraction_sub, "-"); }
static int mul(lua_State *L) { return operate(L, lbr_fraction_mul, "*"); }
static int divide(lua_State *L) { return operate(L, lbr_fraction_div, "/"); }

/*** Largest fraction of which two fractions are both whole multiples.
 * @param a fraction: the first (integer, float, text or fraction)
 * @param b fraction: the second
 * @return fraction: >= 0; the gcd of 0 and x is |x|; raises on overflow
 * @usage
 * local gcd = core.base.fraction_gcd
 * assert(tostring(gcd("3/2", "5/4")) == "1/4")
 */
static int fraction_gcd(lua_State *L) {
  return operate(L, lbr_fraction_gcd, "gcd");
}

static int negate(lua_State *L) {
  lua_settop(L, 1);
  lua_pushinteger(L, 0);
  lua_insert(L, 1);
  return operate(L, lbr_fraction_sub, "-");
}

static int compare(lua_State *L) {
  return lbr_fraction_compare(lbr_check_fraction(L, 1),
                              lbr_check_fraction(L, 2));
}

static int equal(lua_State *L) {
  lua_pushboolean(L, compare(L) == 0);
  return 1;
}

static int less(lua_State *L) {
  lua_pushboolean(L, compare(L) < 0);
  return 1;
}

static int less_or_equal(lua_State *L) {
  lua_pushboolean(L, compare(L) <= 0);
  return 1;
}

static int to_text(lua_State *L) {
  char text[LBR_FRACTION_TEXT];
  lbr_fraction_text(lbr_check_fraction(L, 1), text);
  lua_pushstring(L, text);
  return 1;
}

/*** Nearest double to a fraction.
 * @return number: correctly rounded, ties to even
 * @usage
 * assert(core.base.fraction(1, 3):number() == 1 / 3)
 */
static int number(lua_State *L) {
  lua_pushnumber(L, lbr_fraction_to_double(lbr_check_fraction(L, 1)));
  return 1;
}

/*** Largest integer that is not above a fraction.
 * @return integer: rounded towards minus infinity
 * @usage
 * assert(core.base.fraction(-7, 2):floor() == -4)
 */
static int floor_of(lua_State *L) {
  lua_pushinteger(L, lbr_fraction_floor(lbr_check_fraction(L, 1)));
  return 1;
}

/*** Integer nearest to a fraction.
 * @return integer: halves are rounded away from zero
 * @usage
 * assert(core.base.fraction(-7, 2):round() == -4)
 */
static int round_of(lua_State *L) {
  lua_pushinteger(L, lbr_fraction_round(lbr_check_fraction(L, 1)));
  return 1;
}

/*** Size of a fraction without its sign.
 * @return fraction: >= 0; raises on overflow
 * @usage
 * assert(core.base.fraction(-7, 2):abs() == core.base.fraction(7, 2))
 */
static int absolute(lua_State *L) {
  return lbr_check_fraction(L, 1).num < 0 ? negate(L) : (lua_settop(L, 1), 1);
}

/* fraction.numerator, fraction.denominator, or a method (upvalue 1). */
static int field(lua_State *L) {
  const lbr_fraction *f = luaL_checkudata(L, 1, LBR_FRACTION_CLASS);
  const char *key = lua_type(L, 2) == LUA_TSTRING ? lua_tostring(L, 2) : "";
  if (!strcmp(key, "numerator")) {
    lua_pushinteger(L, f->num);
  } else if (!strcmp(key, "denominator")) {
    lua_pushinteger(L, f->den);
  } else {
    lua_settop(L, 2);
    lua_rawget(L, lua_upvalueindex(1));
  }
  return 1;
}

/*** An exact fraction of two 64-bit integers.
 * A float means its shortest decimal (0.3 is 3/10), an integer itself, a text
 * its exact value ("12.288e6", "7/2"). Operators + - * / == < <= are exact and
 * raise where the reduced result does not fit; == needs fractions on both
 * sides. Fields: numerator, denominator. Methods: number() (nearest double),
 * floor(), round() (halves away from zero), abs().
 * @param value number or text or fraction: the value, or what stands above
 * @param below number or text or fraction: what stands below the bar, default 1
 * @return fraction: in lowest terms; raises on misuse and on overflow
 * @usage
 * local f = core.base.fraction
 * assert(f(0.3) == f(3, 10) and tostring(f "24.6") == "123/5")
 * assert((f(1, 3) + f(1, 6)):number() == 0.5)
 */
static int fraction(lua_State *L) {
  if (lua_isnoneornil(L, 2)) {
    lbr_push_fraction(L, lbr_check_fraction(L, 1));
    return 1;
  }
  return divide(L);
}

/*** The same as fraction(value) for what comes from outside: never raises.
 * @param value any: number, text or fraction
 * @return fraction: or nil, message, code ("format", "overflow", "domain")
 * @usage
 * local value, message, code = core.base.try_fraction "1/0"
 * assert(value == nil and code == "domain" and message:find "1/0")
 */
static int try_fraction(lua_State *L) {
  lbr_fraction value = {0, 1};
  luaL_checkany(L, 1);
  lbr_status status = to_fraction(L, 1, &value);
  if (!status) {
    lbr_push_fraction(L, value);
    return 1;
  }
  return refuse_look(L, lua_pushfstring(L, "%s %s", push_look(L, 1),
                                        complaint(status)), status);
}

/* run(a, b), or nil, message, code. */
static int try_operate(lua_State *L, operation run, const char *sign) {
  lbr_fraction a = lbr_check_fraction(L, 1), b = lbr_check_fraction(L, 2);
  lbr_fraction result = {0, 1};
  lbr_status status = run(a, b, &result);
  if (!status) {
    lbr_push_fraction(L, result);
    return 1;
  }
  return refuse_look(L, lua_pushfstring(L, "%s %s %s %s", push_look(L, 1), sign,
                                        push_look(L, 2), complaint(status)),
                     status);
}

/*** Sum of two fractions that does not raise where it does not fit.
 * @param a fraction: the first (integer, float, text or fraction)
 * @param b fraction: the second
 * @return fraction: a + b; or nil, message, code ("overflow")
 * @usage
 * assert(core.base.try_add("1/3", "1/6") == core.base.fraction "1/2")
 * assert(select(3, core.base.try_add(math.maxinteger, 1)) == "overflow")
 */
static int try_add(lua_State *L) {
  return try_operate(L, lbr_fraction_add, "+");
}

/*** Product of two fractions that does not raise where it does not fit.
 * @param a fraction: the first (integer, float, text or fraction)
 * @param b fraction: the second
 * @return fraction: a * b; or nil, message, code ("overflow")
 * @usage
 * assert(core.base.try_multiply("2/3", 3) == core.base.fraction(2))
 * assert(select(3, core.base.try_multiply(math.maxinteger, 2)) == "overflow")
 */
static int try_multiply(lua_State *L) {
  return try_operate(L, lbr_fraction_mul, "*");
}

/*** Quotient of two fractions that does not raise where it does not fit.
 * @param a fraction: what is divided (integer, float, text or fraction)
 * @param b fraction: what it is divided by
 * @return fraction: a / b; or nil, message, code ("overflow", "domain")
 * @usage
 * assert(core.base.try_divide(1, 3) == core.base.fraction "1/3")
 * assert(select(3, core.base.try_divide(1, 0)) == "domain")
 */
static int try_divide(lua_State *L) {
  return try_operate(L, lbr_fraction_div, "/");
}

/*** Whether a value is a fraction.
 * @param value any: what to look at
 * @return boolean: true for fractions made by this library
 * @usage
 * assert(core.base.is_fraction(core.base.fraction(1)))
 * assert(not core.base.is_fraction(1))
 */
static int is_fraction(lua_State *L) {
  lua_pushboolean(L, luaL_testudata(L, 1, LBR_FRACTION_CLASS) != NULL);
  return 1;
}

/*** Shortest decimal text of a number that reads back bit for bit.
 * The point is always '.', whatever the locale; integers have no point.
 * @param x number: any
 * @return string: such as "0.1", "1e-07", "-0", "inf", "nan"
 * @usage
 * assert(core.base.number_text(0.1) == "0.1")
 */
static int number_text(lua_State *L) {
  char text[LBR_NUMBER_TEXT];
  if (lua_isinteger(L, 1)) {
    lua_pushfstring(L, "%I", (LUAI_UACINT)lua_tointeger(L, 1));
    return 1;
  }
  lbr_number_text(luaL_checknumber(L, 1), text);
  lua_pushstring(L, text);
  return 1;
}

/*** Number that a decimal text stands for, the same in every locale.
 * @param text string: [+-] digits [. digits] [e [+-] digits], nothing else
 * @return number: nearest double; or nil, message, code ("format", "overflow")
 * @usage
 * assert(core.base.number_read "1.5e3" == 1500)
 * assert(core.base.number_read "1,5" == nil)
 */
static int number_read(lua_State *L) {
  size_t n;
  const char *text = luaL_checklstring(L, 1, &n);
  double value = 0;
  lbr_status status = lbr_number_read(text, n, &value);
  if (status)
    return lbr_refuse(L, status, "number");
  lua_pushnumber(L, value);
  return 1;
}

/*** Content hash of a text: SHA-256 (FIPS PUB 180-4).
 * @param text string: any bytes
 * @return string: 64 hexadecimal digits, lower case
 * @usage
 * assert(core.base.sha256 "abc":sub(1, 8) == "ba7816bf")
 */
static int sha256(lua_State *L) {
  char text[LBR_HASH_TEXT];
  size_t n;
  const char *bytes = luaL_checklstring(L, 1, &n);
  lbr_sha256_text(bytes, n, text);
  lua_pushlstring(L, text, LBR_HASH_TEXT - 1);
  return 1;
}

static const luaL_Reg methods[] = {
    {"number", number}, {"floor", floor_of}, {"round", round_of},
    {"abs", absolute},  {NULL, NULL},
};

static const luaL_Reg operators[] = {
    {"__add", add},      {"__sub", sub},         {"__mul", mul},
    {"__div", divide},   {"__unm", negate},      {"__eq", equal},
    {"__lt", less},      {"__le", less_or_equal}, {"__tostring", to_text},
    {NULL, NULL},
};

static const luaL_Reg functions[] = {
    {"fraction", fraction},
    {"fraction_gcd", fraction_gcd},
    {"is_fraction", is_fraction},
    {"number_read", number_read},
    {"number_text", number_text},
    {"sha256", sha256},
    {"try_add", try_add},
    {"try_divide", try_divide},
    {"try_fraction", try_fraction},
    {"try_multiply", try_multiply},
    {NULL, NULL},
};

void lbr_add_numbers(lua_State *L) {
  if (luaL_newmetatable(L, LBR_FRACTION_CLASS)) {
    luaL_setfuncs(L, operators, 0);
    lua_newtable(L);
    luaL_setfuncs(L, methods, 0);
    lua_pushcclosure(L, field, 1);
    lua_setfield(L, -2, "__index");
  }
  lua_pop(L, 1);
  luaL_setfuncs(L, functions, 0);
}
