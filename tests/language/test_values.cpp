// Types, values, operators and casts: what constant expressions are worth. Expected values are computed by
// hand from the rules of the OpenQASM 3 standard; the random ones by the evaluation in this file.
#include <doctest/doctest.h>
#include <fmt/format.h>

#include <cmath>
#include <cstdint>
#include <random>

#include "language/integer.h"
#include "language/meaning.h"
#include "language/value.h"

using namespace isinglass;
using meaning::errors_of;
using meaning::holds;
using meaning::number;

// The compiler's own wide integers, as the independent other side.
__extension__ typedef __int128 Integer128;
__extension__ typedef unsigned __int128 Natural128;

namespace {

std::vector<std::string> errors_in(const std::string& statements) {
  return errors_of("OPENQASM 3.1;\ninclude \"stdgates.inc\";\nqubit q;\n" + statements + "\n");
}

}  // namespace

TEST_CASE("whole numbers of any size: arithmetic agrees with 128-bit arithmetic") {
  std::mt19937_64 random(1);
  const auto to_integer = [](Integer128 value) {
    const bool negative = value < 0;
    Natural128 magnitude = negative ? -static_cast<Natural128>(value) : static_cast<Natural128>(value);
    Integer result = Integer(static_cast<std::int64_t>(magnitude & 0x7fffffffffffffff));
    magnitude >>= 63;
    result = result + Integer(static_cast<std::int64_t>(magnitude & 0x7fffffffffffffff)).shifted_left(63);
    magnitude >>= 63;
    result = result + Integer(static_cast<std::int64_t>(magnitude)).shifted_left(126);
    return negative ? -result : result;
  };
  for (int i = 0; i < 20000; ++i) {
    const auto pick = [&] {
      const auto value = static_cast<std::int64_t>(random());
      return value >> (random() % 64);
    };
    const std::int64_t a = pick();
    const std::int64_t b = pick();
    const std::int64_t c = pick();
    const Integer x = Integer(a) * Integer(b);
    const Integer128 wide = static_cast<Integer128>(a) * b;
    REQUIRE(x == to_integer(wide));
    REQUIRE(Integer(a) + Integer(b) == to_integer(static_cast<Integer128>(a) + b));
    REQUIRE(Integer(a) - Integer(b) == to_integer(static_cast<Integer128>(a) - b));
    REQUIRE((x < Integer(c)) == (wide < c));
    if (c != 0) {
      REQUIRE(x / Integer(c) == to_integer(wide / c));
      REQUIRE(x % Integer(c) == to_integer(wide % c));
      REQUIRE((x / Integer(c)) * Integer(c) + x % Integer(c) == x);
    }
    REQUIRE(x.to_double() == static_cast<double>(wide));
    const std::size_t width = 1 + random() % 100;
    const Natural128 mask = (static_cast<Natural128>(1) << width) - 1;
    const auto pattern = static_cast<Natural128>(wide) & mask;
    REQUIRE(x.modulo(width) == to_integer(static_cast<Integer128>(pattern)));
  }
}

TEST_CASE("whole numbers of any size: digits, powers, long division") {
  CHECK(Integer::parsed("ff_ff", 16) == Integer(65535));
  CHECK(power(Integer(2), 300).to_string() ==
        "203703597633448608626844568840937816105146839366593625063614044935438129976333670618339"
        "7376");
  CHECK(Integer::parsed("123456789012345678901234567890", 10).to_string() ==
        "123456789012345678901234567890");
  CHECK(power(Integer(3), 100) / power(Integer(3), 60) == power(Integer(3), 40));
  CHECK((power(Integer(3), 100) + Integer(7)) % power(Integer(3), 60) == Integer(7));
  CHECK((-power(Integer(2), 70)).to_double() == -0x1p70);
  CHECK(power(Integer(2), 100).shifted_right(98) == Integer(4));
  CHECK(Integer(-1).modulo(70) == power(Integer(2), 70) - Integer(1));
  CHECK(*Integer::truncated(-0x1.8p70) == -(Integer(3).shifted_left(69)));
  CHECK((power(Integer(2), 64) ^ Integer(1)).popcount() == 2);
}

TEST_CASE("literals") {
  CHECK(number("0x1F") == 31);
  CHECK(number("0o17 + 0b101 + 1_000") == 1020);
  CHECK(number("1. + .5 + 2e1 + 2.0E-1") == doctest::Approx(21.7));
  CHECK(holds("\"0010\"[1] && !\"0010\"[0]"));  // rightmost character is index 0
  CHECK(holds(
      "2**300 == 203703597633448608626844568840937816105146839366593625063614044935438129976333670618339"
      "7376"));
  CHECK(holds("2**300 > 2**299 && -2**300 < 1"));
  CHECK(number("π") == pi);
  CHECK(number("τ/2 + tau - 2*pi") == doctest::Approx(pi));
  CHECK(number("euler - ℇ") == 0);
}

TEST_CASE("precedence and the traps of operators") {
  CHECK(number("-2**2") == -4);
  CHECK(number("2**3**2") == 512);
  CHECK(number("1/2") == 0);
  CHECK(number("3/5*pi") == 0);
  CHECK(number("-7/2") == -3);
  CHECK(number("-7%2") == -1);
  CHECK(number("7%-2") == 1);
  CHECK(number("1/2.0") == 0.5);
  CHECK(errors_in("rz(6 & 4 == 4) q;").size() == 1);  // 6 & (4 == 4): an int and a bool
  CHECK(number("1 << 2 + 1") == 8);
  CHECK(number("1 | 6 ^ 6 & 4") == 3);
  CHECK(holds("true || false && false"));
  CHECK(holds("!false == true"));
  CHECK(number("8 - 3 - 2") == 3);
  CHECK(number("2.0**0.5") == doctest::Approx(std::sqrt(2.0)));
  CHECK(errors_in("rz(2**-1) q;").size() == 1);
  CHECK(errors_in("rz(1/0) q;").size() == 1);
  CHECK(errors_in("rz(1%0) q;").size() == 1);
  CHECK(errors_in("rz(1.0/0) q;").size() == 1);
}

TEST_CASE("functions on constants") {
  CHECK(number("arccos(0.5)") == doctest::Approx(pi / 3));
  CHECK(number("arccos(3/5)") == doctest::Approx(pi / 2));  // 3/5 is 0
  CHECK(number("arcsin(1)") == doctest::Approx(pi / 2));
  CHECK(number("arctan(1.0)") == doctest::Approx(pi / 4));
  CHECK(number("ceiling(1.2) + floor(-1.2)") == 0);
  CHECK(number("cos(0) + sin(pi/2) + tan(pi/4)") == doctest::Approx(3));
  CHECK(number("exp(1) - euler") == doctest::Approx(0));
  CHECK(number("log(euler)") == doctest::Approx(1));
  CHECK(number("mod(7, 3) + mod(5.5, 2.0)") == doctest::Approx(2.5));
  CHECK(number("popcount(\"0111\")") == 3);
  CHECK(number("sqrt(16)") == 4);
  CHECK(holds("rotl(\"0001\", 1) == \"0010\" && rotl(\"1000\", 1) == \"0001\""));
  CHECK(holds("rotl(\"0011\", -1) == rotr(\"0011\", 1) && rotr(\"0011\", 1) == \"1001\""));
  CHECK(holds("rotl(\"0011\", 5) == \"0110\""));
  CHECK(number("real(2.0 + 3.0im) + imag(2.0 + 3.0im)") == 5);
  CHECK(number("pow(2, 10) + pow(2.0, -1) + pow(pow(2, 2), 2)") == 1040.5);
  CHECK(holds("pow(2, 3) == 8 && -pow(2, 2) == -4"));
  CHECK(errors_in("rz(pow(2)) q;").size() == 1);
  CHECK(errors_in("rz(pow) q;").size() == 1);
  CHECK(meaning::errors_of("OPENQASM 3.2;\nconst int n = pow(2, 3);") ==
        std::vector<std::string>{"2:15: error: `pow` is no function from OpenQASM 3.2 on"});
  CHECK(meaning::errors_of("OPENQASM 3.0;\nconst int n = pow(2, 3);").empty());
  CHECK(errors_in("rz(arccos(2)) q;").size() == 1);
  CHECK(errors_in("rz(sqrt(-1)) q;").size() == 1);
  CHECK(errors_in("rz(sin()) q;").size() == 1);
  CHECK(errors_in("rz(sine(1)) q;").size() == 1);
}

TEST_CASE("integers of a width: two's complement, wrapping") {
  CHECK(number("int[1](\"1\")") == -1);
  CHECK(number("int[2](\"10\")") == -2);
  CHECK(number("uint[2](\"10\")") == 2);
  CHECK(holds("x + y == 4", "const uint[4] x = 15; const uint[4] y = 5;"));
  CHECK(holds("x - y == 6", "const uint[4] x = 1; const uint[4] y = 11;"));
  CHECK(holds("x * x == -112", "const int[8] x = 12;") == true);  // 144 - 256
  CHECK(
      holds("x + y == 300", "const uint[16] x = 100; const uint[8] y = 200;"));  // the wider operand decides
  CHECK(holds("-x == 1", "const uint[1] x = 1;"));
  CHECK(holds("int[8](x) == -1", "const uint[8] x = 255;"));  // bit by bit
  CHECK(holds("uint[8](x) == 255", "const int[8] x = -1;"));
  CHECK(holds("uint[4](x) == 15", "const int[8] x = -1;"));
  CHECK(number("x**y", "const uint[4] x = 3; const uint[4] y = 5;") == 3);  // 243 mod 16
  CHECK(holds("x == 255", "uint[8] x = 0; x -= 1;"));
  CHECK(errors_in("int[0] x;").size() == 1);
}

TEST_CASE("floats and complex numbers") {
  CHECK(number("x", "const float[32] x = 0.1;") == static_cast<double>(0.1f));
  CHECK(number("int(2.9) + int(-2.9)") == 0);
  CHECK(holds("(1.0 + 2.0im) * (3.0 - 1.0im) == 5.0 + 5.0im"));
  CHECK(number("imag((-1.0 + 0.0im)**0.5)") == doctest::Approx(1));
  CHECK(number("real(sqrt(-4.0 + 0im))") == doctest::Approx(0));
  CHECK(errors_in("const float x = (-1.0)**0.5;").size() == 1);
  CHECK(errors_in("const bool x = (1.0 + 1.0im) < (2.0 + 1.0im);").size() == 1);
}

TEST_CASE("angles: patterns of turns, ties to even, wrapping") {
  CHECK(number("angle[4](pi)") == doctest::Approx(pi));
  CHECK(holds("bit[4](angle[4](pi)) == \"1000\""));     // the most significant bit is half a turn
  CHECK(holds("bit[4](angle[4](pi/16)) == \"0000\""));  // half a step: to the even one
  CHECK(holds("bit[4](angle[4](3*pi/16)) == \"0010\""));
  CHECK(holds("bit[4](angle[4](5*pi/16)) == \"0010\""));
  CHECK(holds("bit[4](angle[4](-pi/2)) == \"1100\""));
  CHECK(holds("bit[4](-a) == \"1110\"", "const angle[4] a = pi/4;"));
  CHECK(holds("bit[4](a + b) == \"0010\"", "const angle[4] a = 3*pi/2; const angle[4] b = 3*pi/4;"));
  CHECK(holds("bit[4](a * 3) == bit[4](3 * a) && bit[4](3 * a) == \"0110\"", "const angle[4] a = pi/4;"));
  CHECK(holds("bit[4](a / 3) == \"0010\"", "const angle[4] a = 3*pi/4;"));
  CHECK(number("a / b", "const angle[4] a = pi; const angle[4] b = pi/4;") == 4);
  CHECK(holds("a < b", "const angle[4] a = pi/2; const angle[4] b = pi;"));
  CHECK(holds("bit[8](angle[8](a)) == \"01000000\"", "const angle[4] a = pi/2;"));  // zeros below
  CHECK(holds("bit[4](a << 1) == \"1000\"", "const angle[4] a = pi/2;"));
  CHECK(holds("a[2] && !a[3]", "const angle[4] a = pi/2;"));
  CHECK(holds("bool(a)", "const angle[4] a = pi/2;"));
  // Float arguments are not reduced: rx, ry and rz have a period of 4 pi.
  CHECK(number("-pi/2") == -pi / 2);
  CHECK(number("3*pi + pi/2") == doctest::Approx(3.5 * pi));
  CHECK(errors_in("const angle[4] a = pi; const float b = 1.5; rz(a * b) q;").size() == 1);
}

TEST_CASE("bits: scalars, registers, casts at equal width") {
  CHECK(errors_in("if (\"0110\" & \"0011\" == \"0010\") h q;").size() == 1);  // bits & bool: == binds tighter
  CHECK(holds("(\"0110\" & \"0011\") == \"0010\""));
  CHECK(holds("(\"0110\" | \"0011\") == \"0111\" && (\"0110\" ^ \"0011\") == \"0101\""));
  CHECK(holds("~\"0110\" == \"1001\""));
  CHECK(holds("(\"0110\" << 1) == \"1100\" && (\"0110\" << 2) == \"1000\" && (\"0110\" >> 2) == \"0001\""));
  CHECK(holds("uint[4](\"1010\") == 10 && bit[4](10) == \"1010\""));
  CHECK(holds("bool(\"0000\") == false && bool(\"0100\")"));
  CHECK(holds("bit[4](true) == \"0001\""));
  CHECK(number("b + b", "bit b = 1;") == 2);
  CHECK(holds("b[0:1] == \"10\" && b[{2, 0}] == \"01\" && b[-1] == false", "bit[4] b = \"0110\";"));
  CHECK(errors_in("const uint[3] x = uint[3](\"1010\");").size() == 1);
  CHECK(errors_in("const bit[3] x = \"1010\";").size() == 1);
  CHECK(errors_in("bit[4] a = \"0000\"; bit[4] b = \"0000\"; rz(uint[4](a + b)) q;").size() == 1);
  CHECK(errors_in("const int[4] a = 1; const int[4] b = 2; rz(a & b) q;").size() == 1);
}

TEST_CASE("assignment: bits and slices of registers and numbers") {
  CHECK(number("x", "uint[8] x = 0; x[4:7] = \"1010\";") == 160);
  CHECK(number("x", "int[4] x = 0; x[3] = 1;") == -8);
  CHECK(holds("b == \"1001\"", "bit[4] b = \"0000\"; b[0] = 1; b[-1] = true;"));
  CHECK(holds("b == \"0101\"", "bit[4] b = \"0000\"; b[0:2:2] = \"11\";"));
  CHECK(number("x", "int x = 7; x += 3; x -= 1; x *= 2; x /= 4; x **= 2; x %= 10;") == 6);
  CHECK(number("x", "uint[8] x = 12; x &= 10; x |= 1; x ^= 3; x <<= 2; x >>= 1;") == 20);
}

TEST_CASE("constants: what they are made of") {
  CHECK(number("n", "const int m = 3; const int n = 2*m + 1;") == 7);
  CHECK(errors_in("int n = 3; const int m = n;").size() == 1);
  CHECK(errors_in("int n = 3; qubit[n] r;") ==
        std::vector<std::string>{"4:18: error: the size of a register must be a constant"});
  CHECK(errors_in("const int n = 2.5;").size() == 1);
  CHECK(errors_in("const int n;").size() == 1);
  CHECK(errors_in("const int n = 3; n = 4;").size() == 1);
  CHECK(errors_in("def f() -> int { return 3; } const int n = f();").size() == 1);
}

TEST_CASE("arrays: cells, slices, copies, sizes") {
  const std::string a = "array[int[8], 2, 3] a = {{1, 2, 3}, {4, 5, 6}};";
  CHECK(number("a[1, 0] + a[0, -1]", a) == 7);
  CHECK(number("sizeof(a) + 10*sizeof(a, 1)", a) == 32);
  CHECK(number("b[2]", a + "array[int[8], 3] b = a[1];") == 6);
  CHECK(number("a[0, 0] + a[0, 2]", a + "a[0] = a[1];") == 10);
  CHECK(number("b[1]", a + "array[int[8], 2] b; b = a[0, 1:2];") == 3);
  CHECK(number("c[4]",
               "array[int[8], 3] a = {1, 2, 3}; array[int[8], 2] b = {4, 5}; array[int[8], 5] c = a ++ b;") ==
        5);
  CHECK(number("a[1]", "array[float[64], 2] a; a[1] = 0.25;") == 0.25);
  CHECK(errors_in("array[int[8], 2] a = {1, 2}; rz(a[2]) q;").size() == 1);
  CHECK(errors_in("array[int[8], 2] a = {1, 2, 3};").size() == 1);
  CHECK(errors_in("array[int[8], 1, 1, 1, 1, 1, 1, 1, 1] a;").size() == 1);
  CHECK(errors_in("array[int[8], 2] a = {1, 2}; array[int[8], 3] b = a;").size() == 1);
  CHECK(errors_in("{ array[int[8], 2] a; }").size() == 1);
  CHECK(errors_in("array[bit, 2] a;").size() == 1);
}

TEST_CASE("aliases of classical registers: the left operand takes the low indices") {
  // With a = "01" and b = "11", a ++ b reads "1101".
  CHECK(holds("c == \"1101\"", "bit[2] a = \"01\"; bit[2] b = \"11\"; let c = a ++ b;"));
  CHECK(holds("a == \"11\"",
              "bit[2] a = \"01\"; bit[2] b = \"11\"; let c = a ++ b; c[1] = 1;"));  // a reference
  CHECK(errors_in("bit[2] a; let c = a ++ a;").size() == 1);
}

TEST_CASE("random expressions of floats and integers: the reader's value and this test's agree") {
  std::mt19937 random(7);
  const auto below = [&](int n) { return static_cast<int>(random() % static_cast<unsigned>(n)); };
  struct Made {
    std::string text;
    std::int64_t value;
    bool good;
  };
  // Every operator stands in parentheses or is left bare where the next one binds less.
  const auto integer = [&](const auto& self, int depth) -> Made {
    if (depth == 0) {
      const int value = below(20);
      return {std::to_string(value), value, true};
    }
    const Made a = self(self, depth - 1);
    const Made b = self(self, depth - 1);
    const std::string left = "(" + a.text + ")";
    const std::string right = "(" + b.text + ")";
    const bool good = a.good && b.good;
    switch (below(9)) {
      case 0:
        return {left + " + " + right, a.value + b.value, good};
      case 1:
        return {left + " - " + right, a.value - b.value, good};
      case 2:
        return {left + " * " + right, a.value * b.value,
                good && std::abs(a.value) < 1000000 && std::abs(b.value) < 1000000};
      case 3:
        return {left + " / " + right, b.value == 0 ? 0 : a.value / b.value, good && b.value != 0};
      case 4:
        return {left + " % " + right, b.value == 0 ? 0 : a.value % b.value, good && b.value != 0};
      case 5:
        return {"-" + left, -a.value, a.good};
      case 6:
        return {"int(" + left + " < " + right + ")", a.value < b.value, good};
      case 7:
        return {left + " + 2 * " + right, a.value + 2 * b.value, good};
      default:
        return {"mod(" + left + ", " + right + ")", b.value == 0 ? 0 : a.value % b.value,
                good && b.value != 0};
    }
  };
  std::string program = "OPENQASM 3.1;\ninclude \"stdgates.inc\";\nqubit q;\n";
  std::vector<std::int64_t> expected;
  while (expected.size() < 5000) {
    const Made made = integer(integer, 1 + below(5));
    if (!made.good || std::abs(made.value) > (std::int64_t(1) << 52)) continue;
    program += "rz(" + made.text + ") q;\n";
    expected.push_back(made.value);
  }
  const Circuit circuit = meaning::circuit_of(program);
  REQUIRE(circuit.body().size() == expected.size());
  for (std::size_t i = 0; i < expected.size(); ++i) {
    REQUIRE(circuit.body()[i].value[0] == static_cast<double>(expected[i]));
  }
}

TEST_CASE("random expressions of uint[w]: everything wraps") {
  std::mt19937_64 random(11);
  std::string program = "OPENQASM 3.1;\ninclude \"stdgates.inc\";\nqubit q;\n";
  std::vector<std::uint64_t> expected;
  for (int i = 0; i < 1000; ++i) {
    const unsigned width = 1 + static_cast<unsigned>(random() % 30);
    const std::uint64_t mask = (std::uint64_t(1) << width) - 1;
    const std::uint64_t a = random() & mask;
    const std::uint64_t b = random() & mask;
    const std::uint64_t c = random() & mask;
    const unsigned places = static_cast<unsigned>(random() % (width + 2));
    program += fmt::format(
        "const uint[{0}] a{1} = {2}; const uint[{0}] b{1} = {3}; const uint[{0}] c{1} = {4};\n"
        "rz(((a{1} + b{1} * c{1}) ^ ~(a{1} - c{1})) | (b{1} << {5})) q;\n",
        width, i, a, b, c, places);
    const std::uint64_t shifted = places >= width ? 0 : (b << places) & mask;
    expected.push_back((((a + b * c) ^ ~(a - c)) & mask) | shifted);
  }
  const Circuit circuit = meaning::circuit_of(program);
  REQUIRE(circuit.body().size() == expected.size());
  for (std::size_t i = 0; i < expected.size(); ++i) {
    REQUIRE(circuit.body()[i].value[0] == static_cast<double>(expected[i]));
  }
}
