// Numerical search inside circuits: exact, never worse, and the counts that it is there for.
#include "passes/search_blocks.h"

#include <doctest/doctest.h>

#include "passes/expand_controls.h"
#include "passes/lower.h"
#include "passes/optimize.h"
#include "support/random_circuits.h"
#include "support/simulator.h"

using namespace isinglass;

namespace {

PassContext deep() {
  PassContext context;
  context.effort = Effort::deep;
  context.deadline = std::chrono::steady_clock::now() + std::chrono::minutes(5);
  return context;
}

Circuit lowered(const Circuit& source) {
  return lower(expand_controls(source, {}), {});
}

Circuit gate(Kind kind, std::vector<std::uint32_t> operands, std::vector<Angle> angles = {}) {
  Circuit circuit;
  add_register(circuit, "q", 3);
  circuit.body().push_back(circuit.make(kind, operands, angles));
  return circuit;
}

void check_found(const Circuit& source, std::size_t xx, double units, const PassContext& context) {
  const Circuit before = lowered(source);
  const Circuit after = search_blocks(before, context);
  check_invariants(after);
  CAPTURE(listed(before));
  if (context.promise.zero_start) {
    CHECK(support::distance_from_zero(source, after) < 1e-9);
  } else {
    CHECK(support::distance(source, after) < 1e-9);
  }
  CHECK(tally_of(after).xx <= xx);
  if (units > 0) CHECK(tally_of(after).xx_units <= units);
}

}  // namespace

TEST_CASE("blocks of three wires reach the known counts (source: computed)") {
  check_found(gate(Kind::x, {0, 1, 2}), 5, 3.05, deep());
  check_found(gate(Kind::zz, {0, 1, 2}, {{0.4}}), 3, -1, deep());
}

TEST_CASE("deep effort searches small blocks") {
  Circuit source = gate(Kind::x, {0, 1, 2});
  source.body().push_back(source.make(Kind::x, {0, 1}));  // together a Peres gate: four (source: computed)
  PassContext context = deep();
  context.deadline = std::chrono::steady_clock::now() + std::chrono::seconds(6);
  const Circuit result = optimize(source, context);
  CHECK(support::distance(source, result) < 1e-9);
  CHECK(tally_of(result).xx <= 4);
}

TEST_CASE("deep effort searches on until a glance before its time is over") {
  const Circuit source = gate(Kind::x, {0, 1, 2});
  PassContext context = deep();
  const auto start = std::chrono::steady_clock::now();
  context.deadline = start + std::chrono::seconds(2);
  const Circuit result = optimize(source, context);
  CHECK(std::chrono::steady_clock::now() > context.deadline - std::chrono::milliseconds(200));
  CHECK(support::distance(source, result) < 1e-9);
}

TEST_CASE("a random three-qubit unitary is cut down to eleven (computed)") {
  support::Random random(41);
  const Circuit source = support::random_circuit(random, {3, 60, 0, support::Family::native});
  REQUIRE(tally_of(lowered(source)).xx > 14);
  check_found(source, 11, -1, deep());
}

TEST_CASE("a known start takes three interactions for three qubits (computed)") {
  support::Random random(42);
  PassContext context = deep();
  context.promise.zero_start = true;
  const Circuit source = support::random_circuit(random, {3, 30, 0, support::Family::native});
  check_found(source, 3, -1, context);
}

TEST_CASE("random circuits stay exact and get no worse") {
  support::Random random(43);
  for (int trial = 0; trial < 4; ++trial) {
    const support::Family family = trial % 2 ? support::Family::native : support::Family::toffolis;
    const Circuit source = support::random_circuit(random, {4, trial % 2 ? 16 : 4, 2, family});
    const Circuit before = lowered(source);
    PassContext context = deep();
    context.promise.zero_start = trial % 3 == 0;
    context.deadline = std::chrono::steady_clock::now() + std::chrono::seconds(1);
    const Circuit after = search_blocks(before, context);
    check_invariants(after);
    CAPTURE(listed(source));
    CHECK(support::distance_from_zero(source, after) < 1e-9);
    if (!context.promise.zero_start) CHECK(support::distance(source, after) < 1e-9);
    CHECK(tally_of(after).error <= tally_of(before).error + 1e-12);
  }
}

TEST_CASE("the deadline is honoured") {
  support::Random random(44);
  const Circuit before = lowered(support::random_circuit(random, {6, 120, 0, support::Family::native}));
  PassContext context = deep();
  const auto start = std::chrono::steady_clock::now();
  context.deadline = start + std::chrono::milliseconds(300);
  search_blocks(before, context);
  CHECK(std::chrono::steady_clock::now() - start < std::chrono::seconds(5));
}
