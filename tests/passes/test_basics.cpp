// Each pass of the basic rooms alone and the whole, on random circuits, against the tests' own simulator.
#include <doctest/doctest.h>

#include <cmath>
#include <string>
#include <vector>

#include "circuit/cost.h"
#include "passes/expand_controls.h"
#include "passes/lower.h"
#include "passes/merge_rotations.h"
#include "passes/optimize.h"
#include "passes/rename_swaps.h"
#include "passes/two_qubit_stretches.h"
#include "support/random_circuits.h"
#include "support/simulator.h"

using namespace isinglass;
using support::Family;

namespace {

constexpr Family families[] = {Family::any,      Family::native, Family::clifford, Family::clifford_t,
                               Family::toffolis, Family::pauli,  Family::symbolic};

std::vector<double> some_inputs(support::Random& random, const Circuit& circuit) {
  std::vector<double> values;
  for (std::size_t i = 0; i < circuit.inputs.size(); ++i) values.push_back(random.real(-3, 3));
  return values;
}

Circuit lowered(const Circuit& source) {
  return lower(expand_controls(source, {}), {});
}

/// Checks what optimize() promises about the form of its result.
void check_normal_form(const Circuit& circuit) {
  check_invariants(circuit);
  std::vector<int> pulses(circuit.wires, 0);
  for (const Operation& op : circuit.body()) {
    if (op.is_unitary()) CHECK(op.is_native());
    if (op.kind == Kind::r) {
      // A symbolic frame change may need a pulse on either side.
      if (circuit.inputs.empty()) CHECK(++pulses[op.operand[0]] == 1);
      if (op.form[0] == 0) CHECK((op.value[0] > 0 && op.value[0] <= pi));
    }
    if (op.kind == Kind::xx) {
      for (int i = 0; i < 2; ++i) pulses[op.operand[i]] = 0;
      if (op.form[0] == 0) CHECK((op.value[0] > 0 && op.value[0] <= pi / 2));
    }
    for (int i = 0; i < 3; ++i) {
      if (op.form[i] == 0) CHECK((op.value[i] > -pi && op.value[i] <= pi));
    }
  }
}

/// A pass on a circuit of any kind or, with is_lowered, on its lowered form.
struct Subject {
  const char* name;
  Circuit (*run)(Circuit, const PassContext&);
  bool is_lowered;
};

constexpr Subject subjects[] = {
    {"rename-swaps", rename_swaps, false},
    {"expand-controls", expand_controls, false},
    {"merge-rotations", merge_rotations, true},
    {"two-qubit-stretches", two_qubit_stretches, true},
    {"mirrored-stretches", mirrored_stretches, true},
};

support::RandomCircuit wanted(support::Random& random, Family family) {
  support::RandomCircuit wanted;
  wanted.qubits = random.between(2, 5);
  wanted.gates = random.between(1, 30);
  wanted.most_controls = random.below(4);
  wanted.family = family;
  return wanted;
}

}  // namespace

TEST_CASE("each pass keeps the unitary of random circuits and does not add to the error") {
  for (const Subject& subject : subjects) {
    support::Random random(11);
    for (const Family family : families) {
      for (int trial = 0; trial < 60; ++trial) {
        Circuit source = support::random_circuit(random, wanted(random, family));
        if (subject.is_lowered) source = lowered(source);
        const Circuit result = subject.run(source, {});
        check_invariants(result);
        CAPTURE(std::string(subject.name));
        CAPTURE(listed(result));
        CAPTURE(listed(source));
        CHECK(support::distance(source, result, some_inputs(random, source)) < 1e-9);
        if (subject.is_lowered) {
          CHECK(tally_of(result).error <= tally_of(source).error + 1e-12);
          check_normal_form(result);
        }
      }
    }
  }
}

TEST_CASE("lowering keeps the unitary and gives the normal form") {
  support::Random random(12);
  for (const Family family : families) {
    for (int trial = 0; trial < 100; ++trial) {
      const Circuit source = support::random_circuit(random, wanted(random, family));
      const Circuit result = lowered(source);
      CAPTURE(listed(source));
      CHECK(support::distance(source, result, some_inputs(random, source)) < 1e-9);
      check_normal_form(result);
    }
  }
}

TEST_CASE("the whole keeps the unitary of random circuits") {
  support::Random random(13);
  for (const Effort effort : {Effort::quick, Effort::steady}) {
    PassContext context;
    context.effort = effort;
    for (const Family family : families) {
      for (int trial = 0; trial < 60; ++trial) {
        const Circuit source = support::random_circuit(random, wanted(random, family));
        const Circuit result = optimize(source, context);
        CAPTURE(listed(source));
        CHECK(support::distance(source, result, some_inputs(random, source)) < 1e-9);
        check_normal_form(result);
        CHECK(tally_of(result).error <= tally_of(lowered(source)).error + 1e-12);
      }
    }
  }
}
