// The compiler's own comparison of programs: what is the same is found the same, every small wrong is found
// wrong. What "same" means here is decided by the tests' own simulator or by construction.
#include "verify/equivalence.h"

#include <doctest/doctest.h>

#include "support/random_circuits.h"
#include "support/simulator.h"

namespace isinglass {
namespace {

using support::Family;
using support::Random;
using support::RandomCircuit;

const Promise any_start{false, false};
const Promise zero_start{true, false};
const Promise bits_only{true, true};

/// The same unitary in other gates: each gate is wrapped by a pair that cancels and spelled by another kind.
Circuit respelled(const Circuit& source, Random& random) {
  Circuit result = source;
  Block& body = result.body();
  body.clear();
  for (const Operation& op : source.body()) {
    const auto wire = static_cast<std::uint32_t>(random.below(static_cast<int>(source.wires)));
    const double angle = random.real(-3, 3);
    body.push_back(result.make(Kind::rz, {wire}, {{angle}}));
    body.push_back(result.make(Kind::p, {wire}, {{-angle}}));
    if (op.kind == Kind::h && op.control_count() == 0) {
      const auto w = source.operands(op)[0];
      body.push_back(result.make(Kind::r, {w}, {{pi / 2}, {pi / 2}}));
      body.push_back(result.make(Kind::rz, {w}, {{pi}}));
      body.push_back(result.make(Kind::rz, {w}, {{pi}}));
      body.push_back(result.make(Kind::x, {w}));
    } else if (op.kind == Kind::swap && op.control_count() == 0) {
      const auto a = source.operands(op)[0];
      const auto b = source.operands(op)[1];
      body.push_back(result.make(Kind::x, {a, b}));
      body.push_back(result.make(Kind::x, {b, a}));
      body.push_back(result.make(Kind::x, {a, b}));
    } else {
      body.push_back(op);
    }
  }
  return result;
}

/// One operation of the body changed so that the unitary certainly changes.
Circuit mutated(Circuit circuit, Random& random) {
  Block& body = circuit.body();
  const auto at = static_cast<std::size_t>(random.below(static_cast<int>(body.size())));
  const auto wire = static_cast<std::uint32_t>(random.below(static_cast<int>(circuit.wires)));
  switch (random.below(3)) {
    case 0:
      body.insert(body.begin() + static_cast<std::ptrdiff_t>(at), circuit.make(Kind::rz, {wire}, {{1e-6}}));
      break;
    case 1:
      body.insert(body.begin() + static_cast<std::ptrdiff_t>(at), circuit.make(Kind::x, {wire}));
      break;
    default:
      body.insert(body.begin() + static_cast<std::ptrdiff_t>(at),
                  circuit.make(Kind::r, {wire}, {{1e-6}, {0.3}}));
      break;
  }
  return circuit;
}

TEST_CASE("verify: random circuits are the same as themselves respelled, and not as mutants") {
  Random random(11);
  for (int n = 0; n < 150; ++n) {
    RandomCircuit wanted;
    wanted.qubits = random.between(1, 5);
    wanted.gates = 15;
    const Circuit source = random_circuit(random, wanted);
    const Circuit other = respelled(source, random);
    REQUIRE(support::distance(source, other) < 1e-9);
    const Verdict same = compare(source, other, any_start);
    CHECK(same.answer == Answer::same);
    CHECK(same.method == "unitary");
    const Verdict different = compare(source, mutated(other, random), any_start);
    CHECK(different.answer == Answer::different);
    CHECK(different.distance > 1e-7);
  }
}

TEST_CASE("verify: a global phase is no difference, a phase under a control is") {
  Circuit a;
  add_register(a, "q", 2);
  a.body().push_back(a.make(Kind::z, {0}));
  Circuit b = a;
  b.body().push_back(b.make(Kind::phase, {}, {{0.7}}));
  CHECK(compare(a, b, any_start).answer == Answer::same);
  b.body().push_back(b.make(Kind::phase, {1}, {{0.7}}));
  CHECK(compare(a, b, any_start).answer == Answer::different);
}

TEST_CASE("verify: from zero only the one state counts") {
  Circuit a;
  add_register(a, "q", 2);
  a.body().push_back(a.make(Kind::h, {1}));
  Circuit b = a;
  b.body().insert(b.body().begin(), b.make(Kind::x, {0, 1}));  // does nothing on |00>
  CHECK(compare(a, b, any_start).answer == Answer::different);
  const Verdict verdict = compare(a, b, zero_start);
  CHECK(verdict.answer == Answer::same);
  CHECK(verdict.method == "state");
}

TEST_CASE("verify: renamed swaps, wrong end wires, dirty ancillas") {
  Circuit a;
  add_register(a, "q", 3);
  a.body().push_back(a.make(Kind::u, {0}, {{0.3}, {0.4}, {0.5}}));
  a.body().push_back(a.make(Kind::swap, {0, 2}));
  Circuit b;
  add_register(b, "q", 3);
  b.body().push_back(b.make(Kind::u, {0}, {{0.3}, {0.4}, {0.5}}));
  CHECK(compare(a, b, any_start).answer == Answer::different);
  b.end_wire = {2, 1, 0};
  CHECK(compare(a, b, any_start).answer == Answer::same);
  b.end_wire = {2, 0, 1};
  CHECK(compare(a, b, any_start).answer == Answer::different);

  Circuit helped = a;
  helped.wires = 5;
  helped.body().push_back(helped.make(Kind::x, {1, 4}));
  CHECK(compare(a, helped, any_start).answer == Answer::different);
  helped.body().push_back(helped.make(Kind::x, {1, 4}));
  CHECK(compare(a, helped, any_start).answer == Answer::same);

  // A qubit may end on what was an ancilla, if its old wire is left in |0>.
  Circuit moved = a;
  moved.wires = 4;
  moved.body().push_back(moved.make(Kind::x, {1, 3}));
  moved.body().push_back(moved.make(Kind::x, {3, 1}));
  moved.end_wire = {0, 3, 2};
  CHECK(compare(a, moved, any_start).answer == Answer::same);
}

TEST_CASE("verify: beyond the unitary, states from random inputs find a single wrong angle") {
  Random random(12);
  RandomCircuit wanted;
  wanted.qubits = 14;
  wanted.gates = 200;
  const Circuit source = random_circuit(random, wanted);
  const Circuit other = respelled(source, random);
  const Verdict same = compare(source, other, any_start);
  CHECK(same.answer == Answer::same);
  CHECK(same.method == "states");
  for (int n = 0; n < 5; ++n) {
    CHECK(compare(source, mutated(other, random), any_start).answer == Answer::different);
  }
}

TEST_CASE("verify: the least wrong angle that is found stands in the options") {
  Circuit a;
  add_register(a, "q", 2);
  a.body().push_back(a.make(Kind::xx, {0, 1}, {{0.3}, {0}, {0}}));
  const CheckOptions options;
  for (const double wrong : {0.5 * options.tolerance, 4 * options.tolerance}) {
    Circuit b = a;
    b.body()[0].value[0] += wrong;
    const bool is_same = compare(a, b, any_start, options).answer == Answer::same;
    CHECK(is_same == (wrong < options.tolerance));
  }
}

TEST_CASE("verify: an allowed infidelity is allowed and not more") {
  Circuit a;
  add_register(a, "q", 2);
  a.body().push_back(a.make(Kind::xx, {0, 1}, {{0.02}, {0}, {0}}));
  Circuit b = a;
  b.body().clear();
  // Infidelity of leaving out an xx of angle t is sin^2(t/2); computed.
  const double lost = std::pow(std::sin(0.01), 2);
  CheckOptions options;
  CHECK(compare(a, b, any_start, options).answer == Answer::different);
  options.infidelity = lost * 1.01;
  CHECK(compare(a, b, any_start, options).answer == Answer::same);
  options.infidelity = lost * 0.99;
  CHECK(compare(a, b, any_start, options).answer == Answer::different);
}

TEST_CASE("verify: inputs are compared by name, with several values") {
  Random random(13);
  for (int n = 0; n < 20; ++n) {
    RandomCircuit wanted;
    wanted.family = Family::symbolic;
    wanted.qubits = 3;
    const Circuit source = random_circuit(random, wanted);
    Circuit other = respelled(source, random);
    CHECK(compare(source, other, any_start).answer == Answer::same);
    const Angle a{0, other.forms.of_input(1)};
    other.body().push_back(other.make(Kind::rz, {0}, {a}));
    CHECK(compare(source, other, any_start).answer == Answer::different);
    other.body().push_back(other.make(Kind::rz, {0}, {other.forms.negated(a)}));
    CHECK(compare(source, other, any_start).answer == Answer::same);
    other.inputs[1].name = "renamed";
    CHECK(compare(source, other, any_start).answer == Answer::different);
  }
}

Operation measurement(const Circuit& circuit, std::uint32_t wire, std::uint32_t bit) {
  Circuit copy = circuit;
  Operation op = copy.make(Kind::measure, {wire});
  op.payload = bit;
  return op;
}

TEST_CASE("verify: measured programs keep bits and what is not measured last") {
  Circuit a;
  add_register(a, "q", 2);
  add_bits(a, "c", 2);
  a.body().push_back(a.make(Kind::h, {0}));
  a.body().push_back(a.make(Kind::x, {0, 1}));
  a.body().push_back(measurement(a, 0, 0));

  Circuit b = a;
  b.body().insert(b.body().end() - 1, b.make(Kind::p, {0}, {{0.7}}));  // a phase before a measurement
  CHECK(compare(a, b, zero_start).answer == Answer::same);
  b.body().push_back(b.make(Kind::rz, {1}, {{0.7}}));  // given the bit, qubit 1 is in a basis state
  CHECK(compare(a, b, zero_start).answer == Answer::same);
  CHECK(compare(a, b, any_start).answer == Answer::different);
  b.body().push_back(b.make(Kind::r, {1}, {{1e-6}, {0}}));
  CHECK(compare(a, b, zero_start).answer == Answer::different);
  CHECK(compare(a, b, bits_only).answer == Answer::same);

  Circuit wrong_bit = a;
  wrong_bit.body().back().payload = 1;
  CHECK(compare(a, wrong_bit, zero_start).answer == Answer::different);
  CHECK(compare(a, wrong_bit, bits_only).answer == Answer::different);
}

TEST_CASE("verify: random measured programs against mutants") {
  Random random(14);
  int found = 0;
  int differ = 0;
  for (int n = 0; n < 60; ++n) {
    RandomCircuit wanted;
    wanted.qubits = random.between(2, 4);
    wanted.gates = 20;
    const Circuit source = random_measured_circuit(random, wanted, 3);
    const Circuit other = [&] {
      Circuit c = source;
      c.body().push_back(c.make(Kind::phase, {}, {{0.3}}));
      return c;
    }();
    for (const Promise& promise : {any_start, zero_start, bits_only}) {
      const Verdict verdict = compare(source, other, promise);
      CHECK(verdict.answer == Answer::same);
    }
    // An x in front of everything on every input state can be hidden only by a reset or nothing at all.
    Circuit wrong = source;
    wrong.body().insert(wrong.body().begin(), wrong.make(Kind::r, {0}, {{0.01}, {0.2}}));
    ++differ;
    if (compare(source, wrong, any_start).answer == Answer::different) ++found;
  }
  CHECK(found > differ * 8 / 10);
}

TEST_CASE("verify: sixteen measured qubits are read off one state vector") {
  Circuit a;
  add_register(a, "q", 16);
  add_bits(a, "c", 16);
  for (std::uint32_t q = 0; q < 16; ++q) a.body().push_back(a.make(Kind::h, {q}));
  for (std::uint32_t q = 0; q + 1 < 16; ++q) a.body().push_back(a.make(Kind::x, {q, q + 1}));
  Circuit b = a;
  for (std::uint32_t q = 0; q < 16; ++q) {
    a.body().push_back(measurement(a, q, q));
    b.body().push_back(measurement(b, q, q));
  }
  b.body().insert(b.body().begin(), b.make(Kind::z, {3}));
  const Verdict verdict = compare(a, b, zero_start);
  CHECK(verdict.answer == Answer::same);  // phases before the measurements
  b.body().insert(b.body().begin(), b.make(Kind::r, {3}, {{0.2}, {1}}));
  CHECK(compare(a, b, zero_start).answer == Answer::different);
}

}  // namespace
}  // namespace isinglass
