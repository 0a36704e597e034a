// Binding: numbers put into the inputs of a compiled program give the unitary of the plan at these numbers,
// with every angle in the emitted range.
#include <doctest/doctest.h>

#include <cmath>
#include <random>

#include "circuit/message.h"
#include "language/bind.h"
#include "language/meaning.h"
#include "support/simulator.h"

using namespace isinglass;

namespace {

struct Plan {
  Circuit circuit;
  std::vector<std::vector<double>> values;
  std::vector<double> numbers;
};

/// Random r, xx and rz on `qubits` wires whose angles are affine in two inputs.
Plan random_plan(std::mt19937_64& random, unsigned qubits, int length) {
  Plan plan;
  Circuit& circuit = plan.circuit;
  add_register(circuit, "q", qubits);
  for (const char* name : {"a", "b"}) circuit.inputs.push_back({name, "float", false, {}});
  std::uniform_real_distribution<double> any(-9, 9);
  plan.numbers = {any(random), any(random)};
  plan.values = {{plan.numbers[0]}, {plan.numbers[1]}};
  const auto angle = [&]() -> Angle {
    Angle result{any(random), 0};
    for (std::uint32_t input = 0; input < 2; ++input) {
      if (random() % 2 == 0)
        result =
            circuit.forms.sum(result, {0, circuit.forms.scaled(circuit.forms.of_input(input), any(random))});
    }
    if (random() % 8 == 0) result = {pi * static_cast<double>(random() % 5) / 2, 0};
    return result;
  };
  for (int i = 0; i < length; ++i) {
    const auto first = static_cast<std::uint32_t>(random() % qubits);
    const auto second = static_cast<std::uint32_t>((first + 1 + random() % (qubits - 1)) % qubits);
    switch (random() % 4) {
      case 0:
        circuit.body().push_back(circuit.make(Kind::r, {first}, {angle(), angle()}));
        break;
      case 1:
        circuit.body().push_back(circuit.make(Kind::rz, {first}, {angle()}));
        break;
      case 2:
        circuit.body().push_back(circuit.make(Kind::barrier, {first, second}));
        break;
      default:
        circuit.body().push_back(circuit.make(Kind::xx, {first, second}, {angle(), angle(), angle()}));
    }
  }
  return plan;
}

}  // namespace

TEST_CASE("a bound plan has the plan's unitary and only angles in range") {
  std::mt19937_64 random(5);
  for (int trial = 0; trial < 300; ++trial) {
    Plan plan = random_plan(random, 2 + static_cast<unsigned>(random() % 2), 12);
    Binder binder(plan.circuit);
    const Circuit& bound = binder.bind(plan.values);
    check_invariants(bound);
    CHECK(bound.inputs.empty());
    for (const Operation& op : bound.body()) {
      if (op.kind == Kind::r) CHECK((op.value[0] > 0 && op.value[0] <= pi));
      if (op.kind == Kind::xx) CHECK((op.value[0] > 0 && op.value[0] <= pi / 2 + 1e-15));
      for (int i = op.kind == Kind::rz ? 0 : 1; op.is_unitary() && i < angle_count(op.kind); ++i) {
        CHECK((op.value[i] > -pi && op.value[i] <= pi));
      }
    }
    CHECK(support::distance(support::unitary(plan.circuit, plan.numbers), support::unitary(bound)) < 1e-10);
  }
}

TEST_CASE("a binder is used again: the second set does not see the first") {
  std::mt19937_64 random(6);
  Plan plan = random_plan(random, 3, 20);
  Binder binder(plan.circuit);
  binder.bind({{{1.0}, {2.0}}});
  const Circuit& bound = binder.bind(plan.values);
  CHECK(support::distance(support::unitary(plan.circuit, plan.numbers), support::unitary(bound)) < 1e-10);
}

TEST_CASE("derived inputs, arrays and types of inputs") {
  const std::string source =
      "OPENQASM 3.1;\ninput float t; input array[float[64], 2] v; input angle[4] w; input uint[3] n;\n"
      "gate r(t, f) q { U(0, 0, -f) q; U(t, -pi/2, pi/2) q; U(0, 0, f) q; gphase(-t/2); }\n"
      "qubit q; r(t*t, v[1]) q; r(sin(t) + 1, w) q; r(n * pi / 8, 0.5) q;";
  const Circuit plan = meaning::circuit_of(source);
  REQUIRE(plan.body().size() == 3);
  Binder binder(plan);
  REQUIRE(binder.inputs().size() == 4);
  CHECK(binder.inputs()[1].count == 2);
  CHECK(binder.inputs()[2].type == "angle[4]");
  const std::vector<std::vector<double>> values = {{1.2}, {0.1, 0.7}, {0.8}, {3}};
  const Circuit& bound = binder.bind(values);
  CHECK(bound.body()[0].value[0] == doctest::Approx(1.44));
  CHECK(bound.body()[0].value[1] == doctest::Approx(0.7));
  CHECK(bound.body()[1].value[1] == doctest::Approx(pi / 4));  // 0.8 on a grid of pi/8
  CHECK(bound.body()[2].value[0] == doctest::Approx(3 * pi / 8));
  const auto fails = [&](std::vector<std::vector<double>> wrong) {
    CHECK_THROWS_AS(binder.bind(wrong), Failure);
  };
  fails({{1.2}, {0.1, 0.7}, {0.8}});
  fails({{1.2}, {0.1}, {0.8}, {3}});
  fails({{1.2}, {0.1, 0.7}, {0.8}, {8}});
  fails({{1.2}, {0.1, 0.7}, {0.8}, {2.5}});
  fails({{std::nan("")}, {0.1, 0.7}, {0.8}, {3}});
}

TEST_CASE("inputs in conditions become literals") {
  const Circuit plan = meaning::circuit_of(
      "OPENQASM 3.1;\ninput int[8] n; qubit q; bit c; c = measure q; if (n > 3 && c) { reset q; }");
  Binder binder(plan);
  const Circuit& bound = binder.bind({{{5.0}}});
  CHECK(printed(bound.branches[0].condition, bound) == "int[8](5) > 3 && c");
}

TEST_CASE("a flip is performed before a measurement, and a turn is not") {
  Circuit plan;
  add_register(plan, "q", 2);
  add_bits(plan, "c", 2);
  plan.inputs.push_back({"t", "float", false, {}});
  plan.body().push_back(plan.make(Kind::xx, {0, 1}, {Angle{0, plan.forms.of_input(0)}, Angle{}, Angle{}}));
  for (const std::uint32_t wire : {0u, 1u}) {
    Operation op = plan.make(Kind::measure, {wire});
    op.payload = wire;
    plan.body().push_back(op);
  }
  Binder binder(plan);
  const Circuit& bound = binder.bind({{{pi}}});  // xx(pi) flips both
  REQUIRE(bound.body().size() == 4);
  CHECK(bound.body()[0].kind == Kind::r);
  CHECK(bound.body()[0].value[0] == pi);
  CHECK(bound.body()[1].kind == Kind::measure);
}
