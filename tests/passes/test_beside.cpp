// Passes that can work on a circuit that is still wanted give the same as on a copy of it.
#include <doctest/doctest.h>

#include <string>

#include "passes/expand_controls.h"
#include "passes/lower.h"
#include "passes/pass.h"
#include "support/random_circuits.h"

using namespace isinglass;
using support::Family;

namespace {

constexpr Family families[] = {Family::any, Family::native, Family::clifford, Family::toffolis,
                               Family::symbolic};

/// What `run_beside` means: its result, or the circuit as it was.
Circuit beside(const Pass& pass, const Circuit& circuit, const PassContext& context) {
  const std::string before = listed(circuit);
  std::optional<Circuit> changed = pass.run_beside(circuit, context);
  CHECK(listed(circuit) == before);
  return changed ? std::move(*changed) : circuit;
}

}  // namespace

TEST_CASE("a pass beside the circuit gives what it gives on a copy") {
  int tried = 0;
  for (const Pass& pass : all_passes()) {
    if (pass.run_beside == nullptr) continue;
    ++tried;
    support::Random random(31);
    for (const Family family : families) {
      for (int trial = 0; trial < 40; ++trial) {
        support::RandomCircuit wanted;
        wanted.qubits = random.between(2, 5);
        wanted.gates = random.between(1, 30);
        wanted.most_controls = random.below(4);
        wanted.family = family;
        Circuit source = support::random_circuit(random, wanted);
        if (pass.name == "merge-rotations") source = lower(expand_controls(std::move(source), {}), {});
        PassContext context;
        context.effort = trial % 2 == 0 ? Effort::quick : Effort::steady;
        CAPTURE(std::string(pass.name));
        CAPTURE(listed(source));
        CHECK(listed(beside(pass, source, context)) == listed(pass.run(source, context)));
      }
    }
  }
  CHECK(tried == 4);
}

TEST_CASE("interactions meet however many runs lie between, closed ones forgotten") {
  // 3 wires: wire 0's run stays open, while runs on 1 and 2 open and close thousands of times.
  Circuit circuit;
  add_register(circuit, "q", 4);
  Block& body = circuit.body();
  body.push_back(circuit.make(Kind::xx, {0, 3}, {{0.25}, {0}, {0}}));
  for (int i = 0; i < 20'000; ++i) {
    body.push_back(circuit.make(Kind::xx, {1, 2}, {{0.1}, {0.01 * i}, {0.3}}));
    body.push_back(circuit.make(Kind::r, {2}, {{0.7}, {0.2}}));
  }
  body.push_back(circuit.make(Kind::xx, {0, 3}, {{0.5}, {0}, {0}}));
  for (const Pass& pass : all_passes()) {
    if (pass.name != "merge-rotations") continue;
    const Circuit merged = pass.run(circuit, {});
    std::vector<double> angles;
    for (const Operation& op : merged.body()) {
      if (op.kind == Kind::xx && op.operand[0] == 0) angles.push_back(op.value[0]);
    }
    REQUIRE(angles.size() == 1);
    CHECK(angles[0] == doctest::Approx(0.75));
  }
}
