// Each pass of the basic rooms alone and the whole, on random circuits, against the tests' own simulator.
#include <doctest/doctest.h>

#include <cmath>
#include <string>
#include <vector>

#include "circuit/cost.h"
#include "measured.h"
#include "passes/approximate.h"
#include "passes/bits_at_end.h"
#include "passes/cubic_networks.h"
#include "passes/expand_controls.h"
#include "passes/known_start.h"
#include "passes/lower.h"
#include "passes/merge_gates.h"
#include "passes/merge_rotations.h"
#include "passes/optimize.h"
#include "passes/rename_swaps.h"
#include "passes/trim_end.h"
#include "passes/trim_start.h"
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
    {"known-start", known_start, false},
    {"bits-at-end", bits_at_end, false},
    {"merge-gates", merge_gates, false},
    {"cubic-networks", cubic_networks, false},
    {"expand-controls", expand_controls, false},
    {"merge-rotations", merge_rotations, true},
    {"two-qubit-stretches", two_qubit_stretches, true},
    {"mirrored-stretches", mirrored_stretches, true},
    {"trim-start", trim_start, true},
    {"trim-end", trim_end, true},
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

namespace {

/// Measurements at the end of some qubits, after the random ones in between, and now and then a barrier.
Circuit random_program(support::Random& random, int qubits) {
  support::RandomCircuit plan;
  plan.qubits = qubits;
  plan.gates = random.between(1, 25);
  plan.most_controls = random.below(3);
  plan.family = families[static_cast<std::size_t>(random.below(6))];
  Circuit circuit = random.chance(0.5) ? support::random_measured_circuit(random, plan, qubits)
                                       : support::random_circuit(random, plan);
  if (circuit.bits == 0) add_bits(circuit, "c", static_cast<std::uint32_t>(qubits));
  for (std::uint32_t q = 0; q < static_cast<std::uint32_t>(qubits); ++q) {
    if (random.chance(0.2)) continue;
    if (random.chance(0.1)) circuit.body().push_back(circuit.make(Kind::barrier, {q}));
    Operation op = circuit.make(Kind::measure, {q});
    op.payload = random.chance(0.05) ? no_bit : q;
    circuit.body().push_back(op);
  }
  return circuit;
}

support::State random_start(support::Random& random, const Circuit& source, bool is_zero) {
  support::State state(source.wires);
  for (std::uint32_t q = 0; q < source.source_qubits && !is_zero; ++q) {
    state.apply(support::haar_unitary(random, 1), std::span(&q, 1));
  }
  return state;
}

struct Kept {
  const char* name;
  Promise promise;
};

constexpr Kept promises[] = {{"any start", {false, false}},
                             {"zero start", {true, false}},
                             {"zero start, bits only", {true, true}},
                             {"any start, bits only", {false, true}}};

}  // namespace

TEST_CASE("each pass and the whole keep what a measuring program promises") {
  support::Random random(14);
  const auto check = [&](const char* name, auto&& run, bool is_lowered, int trials) {
    for (const Kept& kept : promises) {
      PassContext context;
      context.promise = kept.promise;
      for (int trial = 0; trial < trials; ++trial) {
        Circuit source = random_program(random, random.between(2, 4));
        if (is_lowered) source = lower(expand_controls(source, context), context);
        const Circuit result = run(source, context);
        check_invariants(result);
        const auto looked_at =
            kept.promise.keep_bits_only ? std::vector<std::uint32_t>{} : support::unmeasured_at_end(source);
        const support::State start = random_start(random, source, kept.promise.zero_start);
        CAPTURE(std::string(name));
        CAPTURE(std::string(kept.name));
        CAPTURE(listed(source));
        CAPTURE(listed(result));
        CHECK(support::distance(support::outcomes_of(source, start, looked_at),
                                support::outcomes_of(result, start, looked_at)) < 1e-9);
      }
    }
  };
  check(
      "lower", [](const Circuit& c, const PassContext& p) { return lower(expand_controls(c, p), p); }, false,
      60);
  for (const Subject& subject : subjects) check(subject.name, subject.run, subject.is_lowered, 60);
  check(
      "whole", [](const Circuit& c, const PassContext& p) { return optimize(c, p); }, false, 100);
}

TEST_CASE("approximation stays within its tolerance, gains, and does nothing without") {
  support::Random random(15);
  for (int trial = 0; trial < 200; ++trial) {
    Circuit source;
    add_register(source, "q", 4);
    const int gates = random.between(1, 30);
    for (int g = 0; g < gates; ++g) {
      const auto pair = random.distinct(2, 4);
      // Angles from far below to far above what is worth its error.
      const double theta = std::pow(10.0, random.real(-4, 0.2));
      source.body().push_back(source.make(
          Kind::xx, pair, std::vector<Angle>{{theta}, {random.real(-3, 3)}, {random.real(-3, 3)}}));
    }
    source = lower(source, {});
    PassContext context;
    CHECK(tally_of(approximate(source, context)).xx == tally_of(source).xx);
    context.tolerance = std::pow(10.0, random.real(-6, -2));
    const Approximation result = approximated(source, context);
    const support::Matrix a = support::unitary(source);
    const support::Matrix b = support::unitary(result.circuit);
    const double fidelity = std::norm((a.adjoint() * b).trace()) / (16.0 * 16.0);
    CAPTURE(listed(source));
    CHECK(result.infidelity <= context.tolerance);
    CHECK(1 - fidelity <= result.infidelity + 1e-12);
    CHECK(tally_of(result.circuit).error + result.infidelity <= tally_of(source).error);
    const Circuit whole = optimize(source, context);
    const double kept = std::norm((a.adjoint() * support::unitary(whole)).trace()) / (16.0 * 16.0);
    CHECK(1 - kept <= context.tolerance + 1e-12);
  }
  // A pair of interactions with one worth leaving out: 1e-3 of error against (1e-3)^2 / 4.
  Circuit two;
  add_register(two, "q", 2);
  two.body().push_back(two.make(Kind::xx, {0, 1}, {{1.2}, {0}, {0}}));
  two.body().push_back(two.make(Kind::zz, {0, 1}, {{1e-3}}));
  PassContext context;
  CHECK(tally_of(optimize(two, context)).xx == 2);
  context.tolerance = 1e-5;
  CHECK(tally_of(optimize(two, context)).xx == 1);
  context.tolerance = 1e-8;
  CHECK(tally_of(optimize(two, context)).xx == 2);
}

TEST_CASE(
    "orders compete: the least error wins, whatever the threads; time that is over still gives a result") {
  support::Random random(16);
  for (int trial = 0; trial < 20; ++trial) {
    const Circuit source =
        support::random_circuit(random, wanted(random, families[static_cast<std::size_t>(random.below(7))]));
    CAPTURE(listed(source));
    PassContext context;
    Trace trace;
    const Circuit alone = optimize(source, context, &trace);
    int winners = 0;
    for (const TraceResult& result : trace.results) {
      winners += result.is_winner ? 1 : 0;
      CHECK(result.is_done);
      CHECK(tally_of(alone).error <= result.tally.error);
    }
    CHECK(winners == 1);
    context.threads = 3;
    CHECK(listed(optimize(source, context)) == listed(alone));
    for (const Effort effort : {Effort::steady, Effort::deep}) {
      PassContext late;
      late.effort = effort;
      late.deadline = std::chrono::steady_clock::now();
      const Circuit hurried = optimize(source, late);
      check_normal_form(hurried);
      CHECK(support::distance(source, hurried, some_inputs(random, source)) < 1e-9);
    }
  }
  // Effort deep keeps to its time and keeps the unitary.
  PassContext deep;
  deep.effort = Effort::deep;
  deep.threads = 2;
  deep.deadline = std::chrono::steady_clock::now() + std::chrono::milliseconds(1500);
  support::RandomCircuit plan;
  plan.qubits = 4;
  plan.gates = 40;
  const Circuit source = support::random_circuit(random, plan);
  CHECK(support::distance(source, optimize(source, deep)) < 1e-9);
}

TEST_CASE("a program that may end early keeps the names of its wires") {
  // if (c) end; swap, and a mirrored pair after it: both ends must find the qubits on the same wires.
  Circuit source;
  add_register(source, "q", 2);
  const std::uint32_t c = add_bits(source, "c", 1, true);
  Operation measure = source.make(Kind::measure, {0});
  measure.payload = 0;
  source.body().push_back(measure);
  source.statements.push_back({});
  source.statements[0].kind = ClassicalStatement::Kind::end_program;
  source.blocks.push_back({source.make(Kind::classical, {})});
  Branch branch;
  branch.condition.kind = Expression::Kind::variable;
  branch.condition.variable = c;
  branch.arms.push_back({{}, 1});
  source.branches.push_back(branch);
  source.body().push_back(source.make(Kind::branch, {}));
  source.body().push_back(source.make(Kind::swap, {0, 1}));
  source.body().push_back(source.make(Kind::r, {0}, {{0.3}, {0.1}}));
  source.body().push_back(source.make(Kind::swap, {0, 1}));
  source.body().push_back(source.make(Kind::x, {0, 1}));
  source.body().push_back(source.make(Kind::swap, {0, 1}));
  for (const Effort effort : {Effort::quick, Effort::steady}) {
    PassContext context;
    context.effort = effort;
    const Circuit result = optimize(source, context);
    CHECK(result.end_wire == source.end_wire);
    CHECK(tally_of(result).xx >= 2);
  }
  // Without the early end all is renamed: one interaction is left.
  source.statements[0].kind = ClassicalStatement::Kind::raw;
  CHECK(tally_of(optimize(source, {})).xx == 1);
}
