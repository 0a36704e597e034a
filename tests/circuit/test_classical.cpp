// Expressions printed as OpenQASM 3 with as few parentheses as their meaning allows.
#include <doctest/doctest.h>

#include "circuit/circuit.h"

using namespace isinglass;

namespace {

Expression of(Expression::Kind kind, std::string text, std::vector<Expression> arguments = {}) {
  Expression e;
  e.kind = kind;
  e.text = std::move(text);
  e.arguments = std::move(arguments);
  return e;
}
Expression number(const std::string& text) {
  return of(Expression::Kind::literal, text);
}
Expression binary(const std::string& op, Expression a, Expression b) {
  return of(Expression::Kind::binary, op, {std::move(a), std::move(b)});
}

}  // namespace

TEST_CASE("parentheses only where the meaning needs them") {
  const Circuit none;
  const auto text = [&](const Expression& e) { return printed(e, none); };
  const Expression sum = binary("+", number("1"), number("2"));
  CHECK(text(binary("*", sum, number("3"))) == "(1 + 2) * 3");
  CHECK(text(binary("+", sum, number("3"))) == "1 + 2 + 3");
  CHECK(text(binary("-", number("3"), sum)) == "3 - (1 + 2)");
  CHECK(text(binary("==", binary("&", number("1"), number("2")), number("3"))) == "(1 & 2) == 3");
  CHECK(text(binary("&", number("1"), binary("==", number("2"), number("3")))) == "1 & 2 == 3");
  const Expression power = binary("**", number("2"), number("3"));
  CHECK(text(binary("**", power, number("4"))) == "(2 ** 3) ** 4");
  CHECK(text(binary("**", number("4"), power)) == "4 ** 2 ** 3");
  CHECK(text(of(Expression::Kind::unary, "-", {power})) == "-2 ** 3");
  CHECK(text(binary("**", of(Expression::Kind::unary, "-", {number("2")}), number("3"))) == "(-2) ** 3");
  CHECK(text(binary("**", number("-2"), number("3"))) == "(-2) ** 3");
  CHECK(text(of(Expression::Kind::unary, "!", {binary("&&", number("1"), number("2"))})) == "!(1 && 2)");
  CHECK(text(of(Expression::Kind::call, "sin", {sum})) == "sin(1 + 2)");
  CHECK(text(of(Expression::Kind::cast, "float[64]", {sum})) == "float[64](1 + 2)");
}

TEST_CASE("variables, indices, ranges and sets") {
  Circuit c;
  add_bits(c, "c", 4);
  c.inputs.push_back({"t", "float", false, {}});
  const Expression variable = of(Expression::Kind::variable, "");
  CHECK(printed(of(Expression::Kind::index, "", {variable, number("2")}), c) == "c[2]");
  CHECK(printed(of(Expression::Kind::index, "",
                   {variable, of(Expression::Kind::range, "", {number("0"), number("2"), number("3")})}),
                c) == "c[0:2:3]");
  CHECK(printed(of(Expression::Kind::set, "", {number("1"), of(Expression::Kind::input, "")}), c) ==
        "{1, t}");
}
