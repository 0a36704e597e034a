// Programs with branches and loops on measured bits, as the compiler's own comparison sees them.
#include <doctest/doctest.h>

#include "support/random_circuits.h"
#include "verify/equivalence.h"
#include "verify/memory.h"

namespace isinglass {
namespace {

const Promise from_zero{true, false};
const Promise any_input{false, false};

Expression literal(std::string text) {
  Expression e;
  e.text = std::move(text);
  return e;
}

Expression variable(std::uint32_t index) {
  Expression e;
  e.kind = Expression::Kind::variable;
  e.variable = index;
  return e;
}

Expression bit_of(std::uint32_t index, int bit) {
  Expression e;
  e.kind = Expression::Kind::index;
  e.arguments = {variable(index), literal(std::to_string(bit))};
  return e;
}

Expression binary(std::string op, Expression a, Expression b) {
  Expression e;
  e.kind = Expression::Kind::binary;
  e.text = std::move(op);
  e.arguments = {std::move(a), std::move(b)};
  return e;
}

void measure(Circuit& circuit, std::uint32_t block, std::uint32_t wire, std::uint32_t bit) {
  Operation op = circuit.make(Kind::measure, {wire});
  op.payload = bit;
  circuit.blocks[block].push_back(op);
}

/// Appends a branch to a block and returns the numbers of its new arms.
std::vector<std::uint32_t> branch(Circuit& circuit, std::uint32_t block, Branch::Kind kind,
                                  Expression condition, std::vector<std::uint32_t> wires, std::size_t arms) {
  Branch b;
  b.kind = kind;
  b.condition = std::move(condition);
  std::vector<std::uint32_t> blocks;
  for (std::size_t k = 0; k < arms; ++k) {
    blocks.push_back(static_cast<std::uint32_t>(circuit.blocks.size()));
    b.arms.push_back({{}, blocks.back()});
    circuit.blocks.emplace_back();
  }
  Operation op = circuit.make(Kind::branch, wires);
  op.payload = static_cast<std::uint32_t>(circuit.branches.size());
  circuit.branches.push_back(std::move(b));
  circuit.blocks[block].push_back(op);
  return blocks;
}

/// Teleportation of q[0] to q[2]: corrections on measured bits.
Circuit teleport(bool is_wrong = false) {
  Circuit c;
  add_register(c, "q", 3);
  const auto bits = add_bits(c, "c", 2);
  c.body() = {c.make(Kind::h, {1}), c.make(Kind::x, {1, 2}), c.make(Kind::x, {0, 1}), c.make(Kind::h, {0})};
  measure(c, 0, 0, 0);
  measure(c, 0, 1, 1);
  const auto x = branch(c, 0, Branch::Kind::if_else, binary("==", bit_of(bits, 1), literal("1")), {2}, 1);
  c.blocks[x[0]].push_back(c.make(Kind::x, {2}));
  const auto z = branch(c, 0, Branch::Kind::if_else, bit_of(bits, is_wrong ? 1 : 0), {2}, 1);
  c.blocks[z[0]].push_back(c.make(Kind::z, {2}));
  return c;
}

/// The same with the corrections under quantum control before the measurements.
Circuit teleport_coherently() {
  Circuit c;
  add_register(c, "q", 3);
  add_bits(c, "c", 2);
  c.body() = {c.make(Kind::h, {1}), c.make(Kind::x, {1, 2}), c.make(Kind::x, {0, 1}),
              c.make(Kind::h, {0}), c.make(Kind::x, {1, 2}), c.make(Kind::z, {0, 2})};
  measure(c, 0, 0, 0);
  measure(c, 0, 1, 1);
  return c;
}

TEST_CASE("programs: teleportation with feed-forward is teleportation under quantum control") {
  for (const Promise& promise : {from_zero, any_input}) {
    const Verdict verdict = compare(teleport(), teleport_coherently(), promise);
    CHECK(verdict.answer == Answer::same);
    CHECK(verdict.method == "branches");
  }
  CHECK(compare(teleport(), teleport(true), any_input).answer == Answer::different);
}

TEST_CASE("programs: a branch may be split, its order may not be changed") {
  Circuit a;
  add_register(a, "q", 2);
  const auto bits = add_bits(a, "c", 1);
  a.body().push_back(a.make(Kind::r, {0}, {{0.9}, {0.2}}));
  measure(a, 0, 0, 0);
  Circuit b = a;
  const auto arms = branch(a, 0, Branch::Kind::if_else, variable(bits), {1}, 2);
  a.blocks[arms[0]] = {a.make(Kind::h, {1}), a.make(Kind::p, {1}, {{0.4}})};
  a.blocks[arms[1]] = {a.make(Kind::r, {1}, {{0.3}, {0}})};
  // Two branches for one, the else part as a negated condition.
  Expression negated;
  negated.kind = Expression::Kind::unary;
  negated.text = "!";
  negated.arguments = {variable(bits)};
  const auto first = branch(b, 0, Branch::Kind::if_else, variable(bits), {1}, 1);
  const auto second = branch(b, 0, Branch::Kind::if_else, negated, {1}, 1);
  b.blocks[first[0]] = {b.make(Kind::h, {1}), b.make(Kind::p, {1}, {{0.4}})};
  b.blocks[second[0]] = {b.make(Kind::r, {1}, {{0.3}, {0}})};
  CHECK(compare(a, b, from_zero).answer == Answer::same);
  std::swap(b.blocks[first[0]][0], b.blocks[first[0]][1]);
  CHECK(compare(a, b, any_input).answer == Answer::different);
}

/// Repeats a coin until it falls on 1; `angle` is the bias.
Circuit until_success(double angle) {
  Circuit c;
  add_register(c, "q", 2);
  const auto bits = add_bits(c, "c", 1);
  Expression condition = binary("==", variable(bits), literal("0"));
  const auto loop = branch(c, 0, Branch::Kind::while_loop, condition, {0, 1}, 1);
  c.blocks[loop[0]] = {c.make(Kind::reset, {0}), c.make(Kind::r, {0}, {{angle}, {0.4}}),
                       c.make(Kind::r, {1}, {{0.1}, {0}})};
  measure(c, loop[0], 0, 0);
  return c;
}

TEST_CASE("programs: loops on measured bits are followed until nothing is left") {
  const Verdict same = compare(until_success(pi / 2), until_success(-pi / 2), from_zero);
  CHECK(same.answer == Answer::same);
  CHECK(compare(until_success(pi / 2), until_success(pi / 2 + 1e-3), from_zero).answer == Answer::different);
  // A coin that hardly ever falls on 1: the words say what was left out.
  CheckOptions options;
  options.most_rounds = 10;
  const Verdict cut = compare(until_success(0.1), until_success(0.1), from_zero, options);
  CHECK(cut.answer == Answer::same);
  CHECK(cut.explanation.find("left out") != std::string::npos);
}

TEST_CASE("programs: variables, counting and switches") {
  Circuit a;
  add_register(a, "q", 3);
  add_bits(a, "c", 2);
  Variable n;
  n.name = n.source = "n";
  n.type = "uint[2]";
  a.variables.push_back(n);
  a.body() = {a.make(Kind::h, {0}), a.make(Kind::h, {1})};
  measure(a, 0, 0, 0);
  measure(a, 0, 1, 1);
  const auto say = [](Circuit& c, Expression target, Expression value) {
    ClassicalStatement s;
    s.target = std::move(target);
    s.value = std::move(value);
    Operation op = c.make(Kind::classical, {});
    op.payload = static_cast<std::uint32_t>(c.statements.size());
    c.statements.push_back(std::move(s));
    c.body().push_back(op);
  };
  const auto sum = [&](Expression x, Expression y) { return binary("+", std::move(x), std::move(y)); };
  Expression cast;
  cast.kind = Expression::Kind::cast;
  cast.text = "uint[2]";
  cast.arguments = {bit_of(0, 0)};
  Expression other = cast;
  other.arguments = {bit_of(0, 1)};
  Circuit b = a;
  say(a, variable(1), sum(cast, other));
  say(b, variable(1), sum(other, cast));
  const auto with_switch = [&](Circuit& c, std::vector<double> angles) {
    const auto arms = branch(c, 0, Branch::Kind::switch_case, variable(1), {2}, 3);
    Branch& s = c.branches.back();
    s.arms[0].labels = {literal("0")};
    s.arms[1].labels = {literal("1")};
    for (std::size_t k = 0; k < 3; ++k) c.blocks[arms[k]].push_back(c.make(Kind::r, {2}, {{angles[k]}, {0}}));
  };
  Circuit wrong = b;
  with_switch(a, {0.1, 0.2, 0.3});
  with_switch(b, {0.1, 0.2, 0.3});
  with_switch(wrong, {0.1, 0.3, 0.2});
  check_invariants(a);
  CHECK(compare(a, b, from_zero).answer == Answer::same);
  CHECK(compare(a, wrong, from_zero).answer == Answer::different);
  // The final value of n counts as well.
  Circuit forgets = b;
  forgets.body().erase(forgets.body().begin() + 4);
  CHECK(compare(b, forgets, from_zero).answer == Answer::different);
}

TEST_CASE("programs: a reset forgets, and what was entangled with it is mixed") {
  Circuit a;
  add_register(a, "q", 2);
  a.body() = {a.make(Kind::h, {0}), a.make(Kind::x, {0, 1}), a.make(Kind::reset, {0})};
  Circuit b;
  add_register(b, "q", 2);
  // Another way to a maximally mixed q[1]: it stays in a phase-flipped pair until the partner is reset.
  b.body() = {b.make(Kind::h, {0}), b.make(Kind::x, {0, 1}), b.make(Kind::z, {1}), b.make(Kind::reset, {0})};
  CHECK(compare(a, b, from_zero).answer == Answer::same);
  b.body().push_back(b.make(Kind::x, {0}));
  CHECK(compare(a, b, from_zero).answer == Answer::different);
  b.body().pop_back();
  b.body()[0] = b.make(Kind::r, {0}, {{1.5}, {0}});
  CHECK(compare(a, b, from_zero).answer == Answer::different);
}

TEST_CASE("programs: the end of a program ends it") {
  Circuit a;
  add_register(a, "q", 2);
  const auto bits = add_bits(a, "c", 2);
  a.body().push_back(a.make(Kind::h, {0}));
  measure(a, 0, 0, 0);
  const auto arm = branch(a, 0, Branch::Kind::if_else, bit_of(bits, 0), {}, 1);
  ClassicalStatement end;
  end.kind = ClassicalStatement::Kind::end_program;
  a.statements.push_back(end);
  Operation op = a.make(Kind::classical, {});
  a.blocks[arm[0]].push_back(op);
  a.body().push_back(a.make(Kind::x, {1}));
  measure(a, 0, 1, 1);
  Circuit b = a;
  b.blocks[arm[0]].clear();
  CHECK(compare(a, a, from_zero).answer == Answer::same);
  CHECK(compare(a, b, from_zero).answer == Answer::different);
}

TEST_CASE("programs: what is beyond the evaluator is not shown, never guessed") {
  Circuit a = teleport();
  Expression call;
  call.kind = Expression::Kind::call;
  call.text = "decode";
  call.arguments = {bit_of(0, 0)};
  a.branches[0].condition = call;
  const Verdict verdict = compare(a, a, from_zero);
  CHECK(verdict.answer == Answer::not_shown);
  CHECK(verdict.explanation.find("decode") != std::string::npos);
}

TEST_CASE("memory: casts and operators of the standard") {
  Circuit c;
  const auto value = [&](const Expression& e) { return Memory(c, {}).evaluate(e); };
  const auto cast_to = [](std::string type, Expression e) {
    Expression cast;
    cast.kind = Expression::Kind::cast;
    cast.text = std::move(type);
    cast.arguments = {std::move(e)};
    return cast;
  };
  // int[2] of "10" is -2; uint[3] wraps; angle[4] of pi/2 is a quarter of 16; bits of an integer count from
  // the low end (the standard's text; from memory).
  CHECK(number(value(cast_to("int[2]", literal("\"10\"")))) == -2);
  CHECK(number(value(binary("+", cast_to("uint[3]", literal("7")), cast_to("uint[3]", literal("2"))))) == 1);
  CHECK(value(cast_to("angle[4]", binary("/", literal("pi"), literal("2")))).whole == 4);
  CHECK(number(value(binary("/", literal("3"), literal("5")))) == 0);
  CHECK(number(value(binary("/", literal("3.0"), literal("5")))) == doctest::Approx(0.6));
  CHECK(number(value(binary("<<", cast_to("uint[4]", literal("9")), literal("1")))) == 2);
  CHECK(truth(value(binary("<", literal("-1"), literal("1")))) == true);
  CHECK_THROWS_AS(value(binary("/", literal("1"), literal("0"))), Unsupported);
}

}  // namespace
}  // namespace isinglass
