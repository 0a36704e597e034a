// The whole way from a circuit to the text of the compiled program, on random circuits of every kind: the
// text, run by the tests' own interpreter, has the unitary that the tests' own simulator gives the circuit.
#include <doctest/doctest.h>

#include "circuit/circuit.h"
#include "output/native.h"
#include "passes/optimize.h"
#include "support/interpreter.h"
#include "support/random_circuits.h"
#include "support/simulator.h"
#include "targets/place.h"
#include "targets/target.h"

namespace isinglass {
namespace {

using support::Family;
using support::Program;
using support::Random;
using support::RandomCircuit;

std::string compiled(const Circuit& circuit, const PassContext& context, const Target& target) {
  return native_program(place(optimize(circuit, context), target), {"random.qasm", target.name});
}

/// `qubit[n] q;`, for the names that placement pragmas use.
Program names(std::uint32_t qubits) {
  return Program("qubit[" + std::to_string(qubits) + "] q;");
}

double deviation(const Circuit& circuit, const std::string& text) {
  const Program program(text);
  return support::distance(support::unitary(circuit),
                           support::unitary(program, placement_of(program, names(circuit.source_qubits))));
}

void check_family(Family family, int count, Effort effort, std::uint64_t seed) {
  Random random(seed);
  for (int n = 0; n < count; ++n) {
    RandomCircuit wanted;
    wanted.family = family;
    wanted.qubits = random.between(2, 5);
    wanted.gates = random.between(1, 14);
    wanted.most_controls = 3;
    const Circuit circuit = random_circuit(random, wanted);
    PassContext context;
    context.effort = effort;
    const std::uint32_t spare = random.chance(0.3) ? 2 : 0;
    context.spare_wires = spare;
    const Target target = typical(circuit.source_qubits + spare);
    const std::string text = compiled(circuit, context, target);
    const double d = deviation(circuit, text);
    if (d > 1e-8) {
      FAIL_CHECK("deviation " << d << " in family " << static_cast<int>(family) << ", seed " << seed
                              << ", circuit " << n << "\n"
                              << listed(circuit) << "\n"
                              << text);
      return;
    }
  }
}

TEST_CASE("whole: circuits of all gate kinds, quick") {
  check_family(Family::any, 250, Effort::quick, 1);
}
TEST_CASE("whole: circuits of all gate kinds, steady") {
  check_family(Family::any, 150, Effort::steady, 2);
}
TEST_CASE("whole: Clifford circuits") {
  check_family(Family::clifford, 150, Effort::steady, 3);
}
TEST_CASE("whole: Clifford and T circuits") {
  check_family(Family::clifford_t, 150, Effort::steady, 4);
}
TEST_CASE("whole: reversible circuits") {
  check_family(Family::toffolis, 100, Effort::steady, 5);
}
TEST_CASE("whole: exponentials of Pauli strings") {
  check_family(Family::pauli, 100, Effort::steady, 6);
}
TEST_CASE("whole: circuits of native gates") {
  check_family(Family::native, 100, Effort::quick, 7);
}

TEST_CASE("whole: a fault in the text is seen") {
  Random random(8);
  RandomCircuit wanted;
  wanted.qubits = 3;
  const Circuit circuit = random_circuit(random, wanted);
  std::string text = compiled(circuit, {}, typical(3));
  CHECK(deviation(circuit, text) < 1e-8);
  CHECK(deviation(circuit, text + "r(0.00001, 0) ion[0];\n") > 1e-7);
  const std::size_t at = text.rfind("xx(");
  REQUIRE(at != std::string::npos);
  text.erase(at, text.find('\n', at) - at);
  CHECK(deviation(circuit, text) > 1e-7);
}

}  // namespace
}  // namespace isinglass
