// Bits that are computed after the measurements, brought back onto the wires.
#include <doctest/doctest.h>

#include "passes/bits_at_end.h"
#include "passes/optimize.h"
#include "support/random_circuits.h"
#include "verify/equivalence.h"
#include "verify/late_bits.h"
#include "verify/outcomes.h"

namespace isinglass {
namespace {

using support::Family;
using support::Random;
using support::RandomCircuit;

Circuit measured_classical_end(Random& random, int qubits) {
  RandomCircuit wanted;
  wanted.qubits = qubits;
  wanted.gates = 10;
  wanted.family = Family::clifford;
  Circuit circuit = random_circuit(random, wanted);
  for (int n = 0; n < 6; ++n) {
    const auto wires = random.distinct(3, qubits);
    const auto controls = static_cast<std::size_t>(random.below(3));
    circuit.body().push_back(
        circuit.make(Kind::x, std::vector<std::uint32_t>(
                                  wires.begin(), wires.begin() + 1 + static_cast<std::ptrdiff_t>(controls))));
  }
  add_bits(circuit, "c", static_cast<std::uint32_t>(qubits));
  for (std::uint32_t k = 0; k < static_cast<std::uint32_t>(qubits); ++k) {
    Operation op = circuit.make(Kind::measure, {k});
    op.payload = k;
    circuit.body().push_back(op);
  }
  return circuit;
}

/// Probabilities of the values of all bits.
std::unordered_map<std::string, double> distribution(const Circuit& circuit) {
  std::vector<std::uint32_t> shown(circuit.variables.size());
  for (std::uint32_t v = 0; v < shown.size(); ++v) shown[v] = v;
  const std::vector<bool> kept(circuit.source_qubits, false);
  std::unordered_map<std::string, double> result;
  for (const auto& [bits, ending] : endings_of(circuit, {}, {}, shown, kept, false, {}).by_bits)
    result[bits] = ending.probability;
  return result;
}

}  // namespace

// Source: computed (every outcome run through, the classical code executed).
TEST_CASE("late bits: on the wires they give the same distribution") {
  Random random(46);
  int moved = 0;
  for (int n = 0; n < 60; ++n) {
    const Circuit source = measured_classical_end(random, 4);
    const Circuit late = bits_at_end(source, {});
    const auto back = with_late_bits_on_wires(late);
    if (!back) continue;
    ++moved;
    CHECK(std::none_of(back->body().begin(), back->body().end(),
                       [](const Operation& op) { return op.kind == Kind::classical; }));
    check_invariants(*back);
    const auto expected = distribution(late);
    const auto found = distribution(*back);
    for (const auto& [bits, probability] : expected)
      CHECK(found.at(bits) == doctest::Approx(probability).epsilon(1e-9));
    CHECK(found.size() == expected.size());
  }
  CHECK(moved > 40);
}

TEST_CASE("late bits: 60 measured qubits whose last gates became arithmetic are decided") {
  Circuit ghz;
  add_register(ghz, "q", 60);
  add_bits(ghz, "c", 60);
  ghz.body().push_back(ghz.make(Kind::h, {0}));
  for (std::uint32_t k = 0; k + 1 < 60; ++k) ghz.body().push_back(ghz.make(Kind::x, {k, k + 1}));
  for (std::uint32_t k = 0; k < 60; ++k) {
    Operation op = ghz.make(Kind::measure, {k});
    op.payload = k;
    ghz.body().push_back(op);
  }
  PassContext context;
  context.promise.zero_start = true;
  const Circuit compiled = optimize(ghz, context);
  CHECK(std::any_of(compiled.body().begin(), compiled.body().end(),
                    [](const Operation& op) { return op.kind == Kind::classical; }));
  CHECK(compare(ghz, compiled, context.promise).answer == Answer::same);
  Circuit wrong = compiled;
  wrong.body().pop_back();
  CHECK(compare(ghz, wrong, context.promise).answer != Answer::same);
}

TEST_CASE("late bits: code that is more than flips is left alone") {
  Random random(47);
  Circuit circuit = bits_at_end(measured_classical_end(random, 4), {});
  REQUIRE(with_late_bits_on_wires(circuit));
  Circuit used_again = circuit;  // a gate behind the measurements
  used_again.body().push_back(used_again.make(Kind::h, {0}));
  CHECK_FALSE(with_late_bits_on_wires(used_again));
  Circuit other = circuit;  // c[0] = 1
  Expression one;
  one.text = "1";
  other.statements.back().value = one;
  CHECK_FALSE(with_late_bits_on_wires(other));
  Circuit joined = circuit;  // |= in place of ^
  joined.statements.back().value.kind = Expression::Kind::binary;
  joined.statements.back().value.text = "|";
  CHECK_FALSE(with_late_bits_on_wires(joined));
  Circuit plain;
  add_register(plain, "q", 1);
  CHECK_FALSE(with_late_bits_on_wires(plain));
}

}  // namespace isinglass
