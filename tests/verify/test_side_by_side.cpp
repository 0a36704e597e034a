// Two circuits followed side by side without amplitudes: rewritten stretches, moved frames, renamed swaps.
#include <doctest/doctest.h>

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
