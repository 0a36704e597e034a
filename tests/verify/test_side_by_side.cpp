// Two circuits followed side by side without amplitudes: rewritten stretches, moved frames, renamed swaps.
#include <doctest/doctest.h>

#include <algorithm>

#include "passes/optimize.h"
#include "support/random_circuits.h"
#include "support/simulator.h"
#include "verify/equivalence.h"

namespace isinglass {
namespace {

using support::Family;
using support::Random;
using support::RandomCircuit;

Verdict without_amplitudes(const Circuit& a, const Circuit& b, const Promise& promise = {}) {
  CheckOptions options;
  options.most_state_wires = 0;
  return compare(a, b, promise, options);
}

TEST_CASE("following: 40 qubits of random native gates after optimization, and with one fault") {
  Random random(41);
  for (int n = 0; n < 3; ++n) {
    RandomCircuit wanted;
    wanted.qubits = 40;
    wanted.gates = 400;
    wanted.family = n == 0 ? Family::toffolis : Family::native;
    const Circuit source = random_circuit(random, wanted);
    PassContext quick;
    quick.effort = Effort::quick;
    Circuit other = optimize(source, quick);
    const Verdict same = compare(source, other, {});
    CHECK(same.answer == Answer::same);
    CHECK(same.method == "following");
    const auto at = static_cast<std::ptrdiff_t>(random.below(static_cast<int>(other.body().size())));
    other.body().insert(other.body().begin() + at, other.make(Kind::r, {7}, {{1e-4}, {0.3}}));
    CHECK(compare(source, other, {}).answer != Answer::same);
  }
}

TEST_CASE("following: small circuits, held against the tests' simulator, with faults and exchanged ends") {
  Random random(42);
  int shown = 0;
  for (int n = 0; n < 200; ++n) {
    RandomCircuit wanted;
    wanted.qubits = 4;
    wanted.gates = 12;
    wanted.family = n % 2 == 0 ? Family::any : Family::clifford_t;
    const Circuit a = random_circuit(random, wanted);
    PassContext context;
    context.effort = Effort::quick;
    Circuit b = optimize(a, context);
    if (n % 4 == 1) std::swap(b.end_wire[0], b.end_wire[2]);
    if (n % 4 == 2) b.body().insert(b.body().begin(), b.make(Kind::r, {1}, {{0.01}, {1}}));
    if (n % 4 == 3 && b.body().size() > 1) b.body().pop_back();
    const bool are_same = support::distance(a, b) < 1e-9;
    const Answer answer = without_amplitudes(a, b).answer;
    CHECK(answer != (are_same ? Answer::different : Answer::same));
    shown += answer != Answer::not_shown;
  }
  CHECK(shown > 180);
}

namespace following {

Circuit measured_at_end(Random& random, int qubits, std::uint32_t measured, Family family) {
  RandomCircuit wanted;
  wanted.qubits = qubits;
  wanted.gates = 14;
  wanted.family = family;
  Circuit circuit = random_circuit(random, wanted);
  add_bits(circuit, "c", measured);
  for (std::uint32_t k = 0; k < measured; ++k) {
    Operation op = circuit.make(Kind::measure, {k});
    op.payload = k;
    circuit.body().push_back(op);
  }
  return circuit;
}

/// One fault at a random place before the measurements: a small turn, a phase, a gate left out, or none.
void spoil(Random& random, Circuit& circuit, std::uint32_t qubits) {
  Block& body = circuit.body();
  const auto gates =
      std::count_if(body.begin(), body.end(), [](const Operation& op) { return op.is_unitary(); });
  if (gates == 0) return;
  const auto at = body.begin() + random.below(static_cast<int>(gates));
  const auto wire = static_cast<std::uint32_t>(random.below(static_cast<int>(qubits)));
  switch (random.below(5)) {
    case 0:
      body.insert(at, circuit.make(Kind::r, {wire}, {{0.3}, {1}}));
      break;
    case 1:
      body.insert(at, circuit.make(Kind::rz, {wire}, {{0.4}}));
      break;
    case 2:
      body.insert(at, circuit.make(Kind::zz, {wire, (wire + 1) % qubits}, {{0.5}}));
      break;
    case 3:
      body.erase(at);
      break;
    default:
      break;
  }
}

}  // namespace following

// Source: computed (state vectors, which share nothing with the following but the fusing of gates).
TEST_CASE("following: never another answer than state vectors give, from any start, to any measurements") {
  Random random(44);
  int same = 0, shown = 0;
  for (int n = 0; n < 600; ++n) {
    const Family families[] = {Family::native, Family::clifford, Family::toffolis, Family::any};
    const auto measured = static_cast<std::uint32_t>(random.below(5));
    Circuit a = following::measured_at_end(random, 4, measured, families[n % 4]);
    PassContext context;
    context.effort = n % 5 == 0 ? Effort::steady : Effort::quick;
    context.promise = {random.chance(0.7), false};
    Circuit b = optimize(a, context);
    if (n % 2 == 1) following::spoil(random, b, 4);
    const Answer dense = compare(a, b, context.promise).answer;
    const Answer answer = without_amplitudes(a, b, context.promise).answer;
    REQUIRE(dense != Answer::not_shown);
    CHECK((answer == Answer::not_shown || answer == dense));
    same += dense == Answer::same;
    shown += answer == Answer::same;
  }
  CHECK(same > 250);
  CHECK(shown > same * 8 / 10);
}

TEST_CASE("following: what known starts hide is seen through") {
  // Controls that are 0, on 40 qubits, in the way of everything else.
  Circuit a;
  add_register(a, "q", 40);
  for (std::uint32_t k = 0; k + 1 < 40; ++k) a.body().push_back(a.make(Kind::x, {k + 1, k}));
  Circuit b = a;
  b.body().clear();
  for (std::uint32_t k = 0; k + 1 < 40; k += 2) {
    for (Circuit* circuit : {&a, &b}) {
      circuit->body().push_back(circuit->make(Kind::h, {k}));
      circuit->body().push_back(circuit->make(Kind::x, {k, k + 1}));
    }
  }
  CHECK(compare(a, b, {true, false}).method == "following");
  CHECK(compare(a, b, {true, false}).answer == Answer::same);
  CHECK(compare(a, b, {false, false}).answer != Answer::same);
}

TEST_CASE("along: what cannot be followed at once is followed in steps, and the steps are not believed") {
  Random random(45);
  RandomCircuit wanted;
  wanted.qubits = 26;
  wanted.gates = 500;
  wanted.family = Family::clifford_t;
  int at_once = 0, in_steps = 0;
  for (int n = 0; n < 6; ++n) {
    const Circuit source = random_circuit(random, wanted);
    Steps steps;
    const Circuit compiled = optimize(source, {}, nullptr, &steps);
    at_once += compare(source, compiled, {}).answer == Answer::same;
    in_steps += compare_along(source, steps, compiled, {}).answer == Answer::same;
    Circuit wrong = compiled;
    wrong.body().insert(wrong.body().begin() + 100, wrong.make(Kind::r, {3}, {{1e-3}, {0.2}}));
    CHECK(compare_along(source, steps, wrong, {}).answer != Answer::same);
    if (steps.empty()) continue;
    Steps wrong_steps = steps;
    wrong_steps[steps.size() / 2].body().push_back(wrong.make(Kind::rz, {3}, {{1e-3}}));
    CHECK(compare_along(source, wrong_steps, wrong, {}).answer != Answer::same);
    CHECK(compare_along(source, {&wrong, 1}, wrong, {}).answer != Answer::same);
  }
  MESSAGE(at_once << " of 6 at once, " << in_steps << " in steps");
  CHECK(in_steps > at_once);
}

TEST_CASE("following: programs from zero that end in measurements") {
  Random random(43);
  int shown = 0;
  for (int n = 0; n < 100; ++n) {
    RandomCircuit wanted;
    wanted.qubits = 4;
    wanted.gates = 12;
    wanted.family = n % 2 == 0 ? Family::native : Family::clifford;
    Circuit a = random_circuit(random, wanted);
    add_bits(a, "c", 2);
    for (std::uint32_t k = 0; k < 2; ++k) {
      Operation op = a.make(Kind::measure, {k});
      op.payload = k;
      a.body().push_back(op);
    }
    PassContext context;
    context.effort = Effort::quick;
    context.promise = {true, false};
    Circuit b = optimize(a, context);
    if (n % 3 == 1) b.body().insert(b.body().begin(), b.make(Kind::r, {1}, {{0.3}, {1}}));
    const Answer dense = compare(a, b, context.promise).answer;
    const Answer answer = without_amplitudes(a, b, context.promise).answer;
    REQUIRE(dense != Answer::not_shown);
    CHECK((answer == Answer::not_shown || answer == dense));
    shown += answer == Answer::same;
  }
  CHECK(shown > 50);
}

}  // namespace
}  // namespace isinglass
