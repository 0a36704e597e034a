// Binding of inputs: the same unitary as the plan with the numbers put in, and every angle in range.
#include <doctest/doctest.h>

#include "language/bind.h"
#include "support/random_circuits.h"
#include "support/simulator.h"

using namespace isinglass;
using namespace isinglass::support;

namespace {

/// A plan of native operations with symbolic angles everywhere, phases included.
Circuit random_plan(Random& random, int qubits, int gates) {
  Circuit plan;
  add_register(plan, "q", static_cast<std::uint32_t>(qubits));
  for (const char* name : {"a", "b", "c"}) plan.inputs.push_back({name, "float", false, {}});
  const auto angle = [&]() -> Angle {
    Angle result{random_angle(random), 0};
    if (random.chance(0.6)) {
      const auto input = plan.forms.of_input(static_cast<std::uint32_t>(random.below(3)));
      result.form = plan.forms.scaled(input, random.real(-3, 3));
    }
    return result;
  };
  for (int i = 0; i < gates; ++i) {
    const auto wires = random.distinct(2, qubits);
    switch (random.below(4)) {
      case 0:
        plan.body().push_back(plan.make(Kind::rz, {wires[0]}, {angle()}));
        break;
      case 1:
        plan.body().push_back(plan.make(Kind::r, {wires[0]}, {angle(), angle()}));
        break;
      case 2:
        plan.body().push_back(plan.make(Kind::barrier, {wires[0], wires[1]}));
        break;
      default:
        plan.body().push_back(plan.make(Kind::xx, {wires[0], wires[1]}, {angle(), angle(), angle()}));
    }
  }
  return plan;
}

void check_ranges(const Circuit& bound) {
  for (const Operation& op : bound.body()) {
    CHECK(op.has_known_angles());
    if (op.kind == Kind::r || op.kind == Kind::xx) {
      CHECK(op.value[0] > 0);
      CHECK(op.value[0] <= (op.kind == Kind::r ? pi : pi / 2));
      CHECK(std::abs(op.value[1]) <= pi);
      CHECK(std::abs(op.value[2]) <= pi);
    }
  }
}

}  // namespace

TEST_CASE("a bound plan is the plan with the numbers put in") {
  Random random(20);
  for (int round = 0; round < 300; ++round) {
    const Circuit plan = random_plan(random, random.between(2, 4), random.between(1, 30));
    Binder binder(plan);
    for (int set = 0; set < 3; ++set) {
      std::vector<double> values(3);
      for (double& value : values)
        value = random.chance(0.2) ? random_nice_angle(random) : random.real(-20, 20);
      const Circuit& bound =
          binder.bind(std::vector<std::vector<double>>{{values[0]}, {values[1]}, {values[2]}});
      CHECK_NOTHROW(check_invariants(bound));
      INFO(listed(plan) << listed(bound));
      CHECK(distance(plan, bound, values) < 1e-9);
      check_ranges(bound);
    }
  }
}
