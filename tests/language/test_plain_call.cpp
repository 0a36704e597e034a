// The fast lane for plain gate calls: it takes exactly what the grammar would read the same way.
#include <doctest/doctest.h>
#include <rapidcheck.h>

#include <cmath>

#include "language/tree_text.h"

using namespace isinglass;
using isinglass::tree_text::Collector;
using isinglass::tree_text::read;

namespace {

std::string taken(std::string text, int version = 3) {
  const Collector it = read(std::move(text), version, true);
  std::string result;
  for (const std::string& one : it.plain) result += one + ";";
  if (!it.statements.empty()) result += " and " + std::to_string(it.statements.size());
  if (!it.messages.empty()) result += " !" + std::to_string(it.messages.size());
  return result;
}

/// A number as the standard computes with it: integers stay integers in version 3.
struct Value {
  double real = 0;
  bool is_integer = false;
  std::int64_t integer = 0;
  double as_real() const { return is_integer ? static_cast<double>(integer) : real; }
};

/// Direct evaluation of the tree that the grammar makes, apart from the compiler's own.
Value evaluated(const syntax::Expression& it, int version) {
  using Kind = syntax::Expression::Kind;
  using syntax::Operator;
  switch (it.kind) {
    case Kind::integer:
      if (version == 2) return {std::stod(it.text)};
      return {0, true, std::stoll(it.text)};
    case Kind::real:
      return {std::stod(it.text)};
    case Kind::name:
      REQUIRE(it.text == "pi");
      return {3.141592653589793};
    case Kind::unary: {
      const Value value = evaluated(it.arguments[0], version);
      return {-value.real, value.is_integer, -value.integer};
    }
    default:
      break;
  }
  REQUIRE(it.kind == Kind::binary);
  const Value a = evaluated(it.arguments[0], version);
  const Value b = evaluated(it.arguments[1], version);
  if (a.is_integer && b.is_integer) {
    if (it.op == Operator::plus) return {0, true, a.integer + b.integer};
    if (it.op == Operator::minus) return {0, true, a.integer - b.integer};
    if (it.op == Operator::times) return {0, true, a.integer * b.integer};
    REQUIRE(it.op == Operator::divide);
    return {0, true, a.integer / b.integer};
  }
  if (it.op == Operator::plus) return {a.as_real() + b.as_real()};
  if (it.op == Operator::minus) return {a.as_real() - b.as_real()};
  if (it.op == Operator::times) return {a.as_real() * b.as_real()};
  REQUIRE(it.op == Operator::divide);
  return {a.as_real() / b.as_real()};
}

/// Reads the text twice, through the fast lane and by the grammar alone, and compares call by call.
struct Comparison : StatementSink {
  int version = 3;
  const std::vector<syntax::Statement>* by_grammar = nullptr;
  std::size_t next = 0;
  std::size_t compared = 0;

  int language() const override { return version; }
  bool plain_call(const PlainCall& call, const PlainNames& names) override {
    // As a real consumer: what is not declared is declined.
    const auto known = [&](std::uint32_t name) { return names[name].size() <= 2 || names[name] == "_g1"; };
    if (!known(call.gate)) return false;
    for (const PlainOperand& one : call.operands) {
      if (!known(one.name)) return false;
    }
    const syntax::Statement& other = by_grammar->at(next++);
    const auto& gate = std::get<syntax::GateCall>(other.what);
    ++compared;
    RC_ASSERT(gate.modifiers.empty());
    RC_ASSERT(!gate.duration.has_value());
    RC_ASSERT(gate.name.text == names[call.gate]);
    RC_ASSERT(gate.parentheses == call.parentheses);
    RC_ASSERT(gate.angles.size() == call.angles.size());
    for (std::size_t i = 0; i < call.angles.size(); ++i) {
      const double value = evaluated(gate.angles[i], version).as_real();
      RC_ASSERT(value == call.angles[i]);
    }
    RC_ASSERT(gate.operands.size() == call.operands.size());
    for (std::size_t i = 0; i < call.operands.size(); ++i) {
      const PlainOperand& one = call.operands[i];
      const std::string name(names[one.name]);
      const std::string expected = one.index < 0 ? name : name + "[" + std::to_string(one.index) + "]";
      RC_ASSERT(tree_text::shown(gate.operands[i]) == expected);
    }
    RC_ASSERT(call.at.line == other.at.line);
    RC_ASSERT(call.at.column == other.at.column);
    RC_ASSERT(call.at.offset == other.at.offset);
    return true;
  }
  void statement(syntax::Statement&& statement) override {
    RC_ASSERT(tree_text::shown(statement) == tree_text::shown(by_grammar->at(next++)));
  }
  void syntax_message(Message, std::vector<std::string>) override {}
};

/// One of `usual` nine times out of ten, else one of `odd`.
std::string pick(std::vector<std::string> usual, std::vector<std::string> odd) {
  return *rc::gen::elementOf(*rc::gen::inRange(0, 10) > 0 ? std::move(usual) : std::move(odd));
}

/// Text that is a plain call, or nearly one: made of the pieces that such calls consist of, in mostly right
/// order.
std::string nearly_plain() {
  const std::string blank = pick({"", "", " "}, {"\t", "  "});
  std::string text =
      pick({"h", "cx", "rz", "U", "u3", "_g1"}, {"measure", "box", "gphase", "reset", "e\u00E9"});
  text += blank;
  if (*rc::gen::inRange(0, 3) > 0) {
    text += "(";
    const int count = *rc::gen::inRange(0, 4);
    for (int i = 0; i < count; ++i) {
      if (i > 0) text += "," + blank;
      const int factors = *rc::gen::inRange(1, 5);
      for (int k = 0; k < factors; ++k) {
        if (k > 0) text += pick({"*", "/", "+", "-", " - "}, {"**", "^"});
        text += pick({"", "", "-"}, {"- ", "--"});
        text +=
            pick({"pi", "1", "2", "3", "7", "0.5", "1.", ".25", "1e-3", "2E5", "08"},
                 {"1_000", "0x1F", "7 ns", "1.e2", "(2)", "tau", "2im", "123456789012", "1.2.3", "3x", "0"});
      }
    }
    text += ")" + blank;
  }
  const int operands = *rc::gen::inRange(0, 8) == 0 ? 0 : *rc::gen::inRange(1, 4);
  for (int i = 0; i < operands; ++i) {
    text += i > 0 ? "," : " ";
    text += blank;
    text += pick({"q", "r1"}, {"$0", "qubit"});
    text += pick({"", "[0]", "[12]", " [ 3 ] "},
                 {"[-1]", "[0:1]", "[{0}]", "[1_0]", "[0x2]", "[99999999999]", "[i]", "[]"});
  }
  return text + pick({";", ";", ";", " ;", ";\n", "; // \u03C6\n"}, {"\n;", "", ";;", "; /* c */ "});
}

}  // namespace

TEST_CASE("plain calls are taken, other statements are not") {
  CHECK(taken("h q;") == "h q;");
  CHECK(taken("cx q[0], q[1];\nccx a , b[ 2 ],c ;") == "cx q[0] q[1];ccx a b[2] c;");
  CHECK(taken("g() q;rz(0.5)q[0];") == "g() q;rz(0.5) q[0];");
  CHECK(taken("// c\n  \t h q; // d\n\r\nx q;") == "h q;x q;");
  CHECK(taken("h q[i]; h q[0:1]; h $0; ctrl @ x a, b; rx(a) q; h;") == " and 6");
  CHECK(taken("rx(2**2) q; rx((1)) q; rx(2ns) q; rx(1_0) q; rx(sin(1)) q; rx(tau) q;") == " and 6");
  CHECK(taken("rx(1/0) q; rx(4000000000) q; rx(1[0]) q;") == " and 3");
  CHECK(taken("h q") == " !1");
}

TEST_CASE("angles follow the version's arithmetic") {
  CHECK(taken("rx(1/2) q;", 3) == "rx(0) q;");
  CHECK(taken("rx(1/2) q;", 2) == "rx(0.5) q;");
  CHECK(taken("rx(pi*1/2) q;", 3) == "rx(1.5707963267948966) q;");
  CHECK(taken("rx(1/2*pi) q;", 3) == "rx(0) q;");
  CHECK(taken("rx(3*pi/4) q;", 3) == "rx(2.356194490192345) q;");
  CHECK(taken("rx(-pi/2) q;", 3) == "rx(-1.5707963267948966) q;");
  CHECK(taken("rx(-7/2) q;", 3) == "rx(-3) q;");
  CHECK(taken("rx(1-2-3) q;", 3) == "rx(-4) q;");
  CHECK(taken("rx(1.+.5*2e1) q;", 3) == "rx(11) q;");
}

TEST_CASE("a declined call comes again by the grammar") {
  const Collector it = read("h q; x r;", 3, false);
  CHECK(it.plain.empty());
  CHECK(it.statements.size() == 2);
}

TEST_CASE("the fast lane and the grammar agree on every text") {
  std::size_t compared = 0;
  const auto holds = rc::check([&] {
    std::string text;
    for (int i = 0; i < 20; ++i) text += nearly_plain();
    Comparison comparison;
    comparison.version = *rc::gen::element(2, 3);
    const Collector grammar = read(text, comparison.version, false);
    comparison.by_grammar = &grammar.statements;
    Sources sources;
    read_statements(sources, sources.add("test.qasm", text), comparison);
    RC_ASSERT(comparison.next == grammar.statements.size());
    compared += comparison.compared;
  });
  CHECK(holds);
  CHECK(compared > 100);
}
