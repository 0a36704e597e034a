// Two circuits as sums over paths: networks of NOTs and phases written anew, with faults, and comparisons by
// way of what the compiler came by.
#include "verify/paths.h"

#include <doctest/doctest.h>

#include <algorithm>
#include <vector>

#include "passes/cubic_networks.h"
#include "passes/optimize.h"
#include "support/families_arithmetic.h"
#include "support/random_circuits.h"
#include "support/simulator.h"
#include "verify/memory.h"

namespace isinglass {
namespace {

using support::Random;

PathResult paths(const Circuit& a, const Circuit& b, const Promise& promise = {}) {
  const CheckOptions options;
  return by_paths({a, b, promise, options}, {});
}

/// NOTs, swaps and phases with up to two controls, and some gates that make variables.
Circuit random_network(Random& random, std::uint32_t wires, int gates) {
  constexpr Kind kinds[] = {Kind::x,    Kind::x, Kind::x, Kind::z, Kind::p,  Kind::rz,
                            Kind::swap, Kind::h, Kind::y, Kind::r, Kind::zz, Kind::phase};
  Circuit circuit;
  add_register(circuit, "q", wires);
  for (int g = 0; g < gates; ++g) {
    const Kind kind = kinds[random.below(12)];
    const int operands = std::max(1, random.below(3) + target_count(kind));
    std::vector<Angle> angles;
    for (int k = 0; k < angle_count(kind); ++k) {
      angles.push_back({random.chance(0.3) ? random.below(8) * pi / 4 : random.real(-3, 3)});
    }
    circuit.body().push_back(circuit.make(
        kind, random.distinct(std::min<int>(operands, static_cast<int>(wires)), static_cast<int>(wires)),
        angles));
  }
  return circuit;
}

TEST_CASE("paths: what they call the same is the same; gates that commute may change places") {
  Random random(61);
  int same = 0, different = 0;
  for (int trial = 0; trial < 400; ++trial) {
    const Circuit a = random_network(random, 4, random.between(1, 16));
    Circuit b = a;
    Block& block = b.body();
    // Neighbours change places, whether they commute or not, or a gate gets lost, or an angle changes.
    const auto at = static_cast<std::size_t>(random.below(static_cast<int>(block.size())));
    const auto place = block.begin() + static_cast<std::ptrdiff_t>(at);
    switch (trial % 4) {
      case 0:
        break;
      case 1:
        if (at > 0) std::swap(block[at], block[at - 1]);
        break;
      case 2:
        block.erase(place);
        break;
      default:
        if (angle_count(place->kind) > 0) place->value[0] += 0.01;
    }
    const bool are_same = support::distance(a, b) < 1e-9;
    const bool is_shown = paths(a, b).are_same;
    CAPTURE(listed(a));
    CAPTURE(listed(b));
    if (is_shown) CHECK(are_same);
    if (trial % 4 == 0) CHECK(is_shown);
    same += trial % 4 != 0 && is_shown;
    different += !are_same;
  }
  CHECK(same > 50);
  CHECK(different > 100);
}

TEST_CASE("paths: a start in zero, ancillas and renamed ends") {
  Circuit a;
  add_register(a, "q", 3);
  Circuit b = a;
  a.body().push_back(a.make(Kind::x, {0, 1, 2}));  // does nothing to |000>
  CHECK(!paths(a, b).are_same);
  CHECK(paths(a, b, {true, false}).are_same);
  a.body() = {a.make(Kind::swap, {0, 2})};
  CHECK(!paths(a, b).are_same);
  b.end_wire = {2, 1, 0};
  CHECK(paths(a, b).are_same);
  b.wires = 4;
  b.body() = {b.make(Kind::x, {0, 3}), b.make(Kind::z, {3, 1}), b.make(Kind::x, {0, 3})};
  a.body().push_back(a.make(Kind::z, {2, 1}));
  CHECK(paths(a, b).are_same);
  b.body().pop_back();  // the ancilla stays dirty
  CHECK(!paths(a, b).are_same);
}

TEST_CASE("paths: long polynomials end the comparison") {
  Circuit wide;
  add_register(wide, "q", 40);
  for (std::uint32_t k = 0; k < 12; ++k) {
    // products of sums: 2^13 monomials
    wide.body().push_back(wide.make(Kind::x, {k, k + 13}));
    wide.body().push_back(wide.make(Kind::x, {k + 13, k + 26, k + 27}));
    wide.body().push_back(wide.make(Kind::x, {k + 27, k + 14}));
  }
  CHECK_THROWS_AS(paths(wide, wide), Unsupported);
}

TEST_CASE("by way of a network written anew, what follows gate by gate is shown for 24 qubits") {
  const Circuit source = support::gf_multiplier(8);
  Steps steps;
  const Circuit result = optimize(source, {}, nullptr, &steps);
  REQUIRE(steps.size() > 2);
  CHECK(compare(source, result, {}).answer == Answer::not_shown);
  const Verdict verdict = compare_along(source, steps, result, {});
  CHECK(verdict.answer == Answer::same);
  CHECK(verdict.method == "steps");
  CHECK(verdict.distance < 1e-10);
  // A fault in any of the steps: nothing is shown then.
  for (std::size_t fault = 0; fault <= steps.size(); ++fault) {
    Steps faulty = steps;
    Circuit compiled = result;
    Circuit& spoilt = fault < steps.size() ? faulty[fault] : compiled;
    spoilt.body().erase(spoilt.body().begin() + 20);
    CHECK(compare_along(source, faulty, compiled, {}).answer != Answer::same);
  }
}

}  // namespace
}  // namespace isinglass
