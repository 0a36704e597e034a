// Multi-controlled constructions: each is exact, with the counts and angles that are known to be reachable.
#include <doctest/doctest.h>

#include <numeric>

#include "passes/constructions.h"
#include "passes/lower.h"
#include "support/random_circuits.h"
#include "support/simulator.h"

using namespace isinglass;

namespace {

using Wires = std::vector<std::uint32_t>;

Wires range(std::uint32_t count, std::uint32_t first = 0) {
  Wires wires(count);
  std::iota(wires.begin(), wires.end(), first);
  return wires;
}

Circuit one_operation(Kind kind, std::uint32_t controls, std::vector<Angle> angles = {},
                      std::uint32_t idle = 0) {
  Circuit circuit;
  const std::uint32_t operands = controls + static_cast<std::uint32_t>(target_count(kind));
  add_register(circuit, "q", operands + idle);
  circuit.body().push_back(circuit.make(kind, range(operands), angles));
  return circuit;
}

/// The same circuit with its operations simplified, borrowing the given wires.
Circuit simplified(const Circuit& source, const IdleWires& idle = {}) {
  Circuit result = source;
  result.body().clear();
  for (const Operation& op : source.body()) simplify(result, op, idle, {}, result.body());
  check_invariants(result);
  return result;
}

Tally lowered(const Circuit& circuit) {
  return tally_of(lower(circuit, {}));
}

/// Largest difference on the part where the last `clean` source wires start in |0>; infinite if they do not
/// end so.
double distance_with_clean(Circuit a, Circuit b, std::uint32_t clean) {
  for (Circuit* circuit : {&a, &b}) {
    circuit->source_qubits -= clean;
    circuit->end_wire.resize(circuit->source_qubits);
  }
  return support::distance(support::unitary(a), support::unitary(b));
}

struct Reach {
  int xx;
  double units;
};

void check_reach(const Circuit& source, const IdleWires& idle, Reach reach) {
  const Circuit result = simplified(source, idle);
  const auto clean = static_cast<std::uint32_t>(idle.clean.size());
  CHECK(distance_with_clean(source, result, clean) < 1e-9);
  const Tally tally = lowered(result);
  CHECK(tally.xx == static_cast<std::size_t>(reach.xx));
  if (reach.units > 0) CHECK(tally.xx_units == doctest::Approx(reach.units).epsilon(1e-4));
}

}  // namespace

TEST_CASE("known circuits take the known number of interactions") {
  // Source of the counts and units: "computed" in the list of known circuits, unless said otherwise.
  SUBCASE("Toffoli: five (Yu, Duan, Ying, arXiv:1301.3372), 3.0438 units (computed)") {
    check_reach(one_operation(Kind::x, 2), {}, {5, 3.0438});
    check_reach(one_operation(Kind::z, 2), {}, {5, 3.0438});
    check_reach(one_operation(Kind::phase, 3, {{pi}}), {}, {5, 3.0438});
    check_reach(one_operation(Kind::y, 2), {}, {5, 3.0438});
    check_reach(one_operation(Kind::h, 2), {}, {5, 3.0438});
  }
  SUBCASE("Fredkin: six, 4.5 units (computed)") {
    check_reach(one_operation(Kind::swap, 1), {}, {6, 4.5});
  }
  SUBCASE("doubly controlled iX: four, 2.5438 units (computed)") {
    check_reach(one_operation(Kind::r, 2, {{-pi}, {0}}), {}, {4, 2.5438});
  }
  SUBCASE("controlled zz: three (computed)") {
    check_reach(one_operation(Kind::zz, 1, {{0.7}}), {}, {3, -1});
    check_reach(one_operation(Kind::xx, 1, {{0.7}, {0.3}, {-1.1}}), {}, {3, -1});
  }
  SUBCASE("triply controlled Z without ancilla: thirteen, 6.1475 units (computed)") {
    check_reach(one_operation(Kind::z, 3), {}, {13, 6.1475});
    check_reach(one_operation(Kind::x, 3), {}, {13, 6.1475});
  }
}

TEST_CASE("doubly controlled rotations and phases of any angle follow the closed form") {
  for (double angle = -6.2; angle < 6.28; angle += 0.37) {
    const double x = std::asin(std::sqrt(std::sin(std::abs(angle) / 4)));  // computed
    const double units = 4 * x / (pi / 2);
    const Circuit turn = one_operation(Kind::rz, 2, {{angle}});
    const Circuit simple = simplified(turn);
    CHECK(support::distance(turn, simple) < 1e-12);
    CHECK(lowered(simple).xx_units <= units + 1.25);
    if (std::abs(angle) > pi) continue;
    check_reach(turn, {}, {4, units});
    check_reach(one_operation(Kind::r, 2, {{angle}, {0.9}}), {}, {4, units});
    check_reach(one_operation(Kind::p, 2, {{angle}}), {}, {5, units + std::abs(angle) / 4 / (pi / 2)});
  }
}

TEST_CASE("a doubly controlled rotation beyond pi takes what costs less") {
  check_reach(one_operation(Kind::rz, 2, {{2 * pi}}), {}, {1, 1});
  check_reach(one_operation(Kind::rz, 3, {{2 * pi}}), {}, {5, 3.0438});
  check_reach(one_operation(Kind::rz, 2, {{4 * pi}}), {}, {0, 0});
  check_reach(one_operation(Kind::p, 3, {{2 * pi}}), {}, {0, 0});
}

TEST_CASE("k controls with clean wires take 6 (k - 2) + 5 interactions (computed)") {
  for (std::uint32_t k = 3; k <= 6; ++k) {
    CAPTURE(k);
    const std::uint32_t clean = k - 2;
    const Circuit source = one_operation(Kind::x, k, {}, clean);
    check_reach(source, {range(clean, k + 1), {}}, {static_cast<int>(6 * (k - 2) + 5), -1});
  }
}

TEST_CASE("half the clean wires do as well") {
  check_reach(one_operation(Kind::x, 4, {}, 1), {{5}, {}}, {17, -1});
  check_reach(one_operation(Kind::p, 4, {{0.3}}, 1), {{5}, {}}, {17, -1});
  check_reach(one_operation(Kind::rz, 4, {{0.3}}, 1), {{5}, {}}, {14, -1});  // 14 without any, too
  check_reach(one_operation(Kind::x, 5, {}, 2), {{6, 7}, {}}, {23, -1});
}

TEST_CASE("k controls with dirty wires stay below 8 k - 6 (Iten et al., PRA 93, 032318, from memory)") {
  const int reached[] = {13, 20, 28, 36};  // computed with these constructions, k = 3, 4, 5, 6
  for (std::uint32_t k = 3; k <= 6; ++k) {
    CAPTURE(k);
    const Circuit source = one_operation(Kind::x, k, {}, k - 2);
    check_reach(source, {{}, range(k - 2, k + 1)}, {reached[k - 3], -1});
    CHECK(reached[k - 3] < static_cast<int>(8 * k - 6));
  }
}

TEST_CASE("without idle wires: k = 3 thirteen, beyond below 2^(k+1) - 3 (from memory)") {
  const int reached[] = {13, 27, 47, 75};
  for (std::uint32_t k = 3; k <= 6; ++k) {
    CAPTURE(k);
    check_reach(one_operation(Kind::x, k), {}, {reached[k - 3], -1});
  }
}

TEST_CASE("with one dirty wire the count grows hardly faster than the controls") {
  const auto reached = [](std::uint32_t k) {
    return lowered(simplified(one_operation(Kind::x, k, {}, 1), {{}, {k + 1}})).xx;
  };
  CHECK(reached(120) < 2.5 * static_cast<double>(reached(60)));
}

TEST_CASE("any controlled operation, any angle: exact") {
  support::Random random(11);
  for (int trial = 0; trial < 400; ++trial) {
    const auto kind = static_cast<Kind>(random.below(12));
    const auto controls = static_cast<std::uint32_t>(random.between(0, 5 - target_count(kind)));
    std::vector<Angle> angles;
    for (int i = 0; i < angle_count(kind); ++i) angles.push_back({support::random_angle(random)});
    const auto clean = static_cast<std::uint32_t>(random.below(3));
    const auto dirty = static_cast<std::uint32_t>(random.below(3));
    const Circuit source = one_operation(kind, controls, angles, clean + dirty);
    const std::uint32_t used = source.wires - clean - dirty;
    const Circuit result = simplified(source, {range(clean, used + dirty), range(dirty, used)});
    CAPTURE(listed(source));
    CHECK(distance_with_clean(source, result, clean) < 1e-9);
    for (const Operation& op : result.body()) CHECK(op.operand_count <= 2);
  }
}

TEST_CASE("symbolic angles stay symbolic and exact") {
  support::Random random(12);
  const Kind kinds[] = {Kind::phase, Kind::p, Kind::rz, Kind::r, Kind::u, Kind::zz, Kind::xx};
  for (int trial = 0; trial < 120; ++trial) {
    const Kind kind = kinds[random.below(7)];
    const auto controls = static_cast<std::uint32_t>(random.between(1, 4 - target_count(kind)));
    Circuit source =
        one_operation(kind, controls, std::vector<Angle>(static_cast<std::size_t>(angle_count(kind))), 1);
    for (const char* name : {"a", "b"}) source.inputs.push_back({name, "float", false, {}});
    Operation& op = source.body()[0];
    for (int i = 0; i < angle_count(kind); ++i) {
      Angle angle{random.real(-3, 3)};
      if (i == 0 || random.chance(0.5)) angle.form = source.forms.of_input(static_cast<std::uint32_t>(i) % 2);
      op.set_angle(i, angle);
    }
    const Circuit result = simplified(source, {{}, {source.wires - 1}});
    const double values[] = {random.real(-3, 3), random.real(-3, 3)};
    CAPTURE(listed(source));
    CHECK(support::distance(source, result, values) < 1e-9);
  }
}

TEST_CASE("the forms of the Toffoli leave the phases they name") {
  using C = std::complex<double>;
  const std::uint32_t a = 0;
  const std::uint32_t b = 1;
  const std::uint32_t t = 2;
  for (const Toffoli form :
       {Toffoli::exact_minus, Toffoli::exact_plus, Toffoli::minus_i, Toffoli::plus_i, Toffoli::relative}) {
    Circuit circuit = one_operation(Kind::x, 2);
    circuit.body().clear();
    append_toffoli(circuit, form, a, b, t, {}, circuit.body());
    support::Matrix expected = support::Matrix::Zero(8, 8);
    for (int i = 0; i < 8; ++i) {
      const bool va = i & 1;
      const bool vb = i & 2;
      const bool vt = i & 4;
      C phase = 1;
      if (form == Toffoli::minus_i && va && vb) phase = C(0, -1);
      if (form == Toffoli::plus_i && va && vb) phase = C(0, 1);
      if (form == Toffoli::relative && !va && vb && vt) phase = -1;
      expected(va && vb ? i ^ 4 : i, i) = phase;
    }
    CHECK(support::distance(support::unitary(circuit), expected) < 1e-12);
    const int counts[] = {5, 5, 4, 4, 3};
    CHECK(lowered(circuit).xx == static_cast<std::size_t>(counts[static_cast<int>(form)]));
    const double units[] = {3.0438, 3.0438, 2.5438, 2.5438, 2.0};  // computed
    CHECK(lowered(circuit).xx_units == doctest::Approx(units[static_cast<int>(form)]).epsilon(1e-4));
  }
}

TEST_CASE("the pass finds idle wires where the promise allows it") {
  Circuit source;
  add_register(source, "q", 6);
  source.body().push_back(source.make(Kind::h, {0}));
  source.body().push_back(source.make(Kind::x, range(4)));  // wires 4 and 5 still in |0>
  source.body().push_back(source.make(Kind::x, {3, 4}));
  PassContext context;

  context.promise.zero_start = true;
  const Circuit from_zero = choose_constructions(source, context);
  CHECK(support::distance_from_zero(source, from_zero) < 1e-9);
  CHECK(lowered(from_zero).xx == 11 + 1);

  context.promise.zero_start = false;
  const Circuit from_any = choose_constructions(source, context);
  CHECK(support::distance(source, from_any) < 1e-9);
  CHECK(lowered(from_any).xx == 13 + 1);

  context.spare_wires = 3;
  const Circuit with_spare = choose_constructions(source, context);
  check_invariants(with_spare);
  CHECK(with_spare.wires == 7);
  CHECK(with_spare.source_qubits == 6);
  CHECK(support::distance(source, with_spare) < 1e-9);
  CHECK(lowered(with_spare).xx == 11 + 1);
}

TEST_CASE("a clean wire is not lent a second time as a dirty one") {
  for (std::uint32_t k = 4; k <= 7; ++k) {
    for (const std::uint32_t idle : {1u, 2u, 3u}) {
      Circuit source;
      add_register(source, "q", k + 1 + idle);
      for (std::uint32_t w = 0; w <= k; ++w) {
        source.body().push_back(source.make(Kind::r, {w}, {{1.9 + 0.1 * w}, {0.3 * w}}));
      }
      source.body().push_back(source.make(Kind::x, range(k + 1)));
      PassContext context;
      context.promise.zero_start = true;
      const Circuit result = choose_constructions(source, context);
      CAPTURE(k);
      CAPTURE(idle);
      check_invariants(result);
      CHECK(support::distance_from_zero(source, result) < 1e-9);
    }
  }
}

TEST_CASE("random circuits through the pass alone") {
  support::Random random(13);
  for (int trial = 0; trial < 60; ++trial) {
    const int qubits = random.between(3, 6);
    const Circuit source = support::random_circuit(random, {qubits, 6, 4, support::Family::any});
    PassContext context;
    context.spare_wires = static_cast<std::uint32_t>(random.below(2));
    context.promise.zero_start = random.chance(0.5);
    const Circuit result = choose_constructions(source, context);
    check_invariants(result);
    CAPTURE(listed(source));
    CHECK(support::distance_from_zero(source, result) < 1e-8);
    if (!context.promise.zero_start) CHECK(support::distance(source, result) < 1e-8);
    for (const Operation& op : result.body()) CHECK(op.operand_count <= 2);
  }
}
