// One-qubit stretches with angles that depend on inputs: as few pulses as have a form affine in the inputs.
#include <doctest/doctest.h>

#include <cmath>
#include <string>

#include "passes/lower.h"
#include "passes/optimize.h"
#include "passes/poles.h"
#include "support/random_circuits.h"
#include "support/simulator.h"

using namespace isinglass;
using support::Random;

namespace {

/// One wire, inputs s and t.
Circuit bare(std::uint32_t wires = 1) {
  Circuit circuit;
  add_register(circuit, "q", wires);
  for (const char* name : {"s", "t"}) circuit.inputs.push_back({name, "float", false, {}, {}});
  return circuit;
}

Angle input(Circuit& circuit, std::uint32_t which, double factor = 1, double more = 0) {
  return {more, circuit.forms.scaled(circuit.forms.of_input(which), factor)};
}

void add(Circuit& circuit, Kind kind, std::uint32_t wire, std::initializer_list<Angle> angles = {}) {
  circuit.body().push_back(circuit.make(kind, {wire}, angles));
}

std::size_t pulses_of(const Circuit& circuit) {
  return tally_of(circuit).r;
}

double difference(Random& random, const Circuit& a, const Circuit& b) {
  const std::vector<double> inputs = {random.real(-3, 3), random.real(-3, 3)};
  return support::distance(a, b, inputs);
}

/// A known gate: often one of a few quarter turns, so that special cases are frequent.
void add_known(Random& random, Circuit& circuit, std::uint32_t wire) {
  const auto quarter = [&] { return Angle{pi / 2 * random.between(0, 3)}; };
  switch (random.below(6)) {
    case 0:
      return add(circuit, Kind::h, wire);
    case 1:
      return add(circuit, Kind::rz, wire, {quarter()});
    case 2:
      return add(circuit, Kind::r, wire, {quarter(), quarter()});
    case 3:
      return add(circuit, Kind::rz, wire, {{random.real(-3, 3)}});
    case 4:
      return add(circuit, Kind::r, wire, {{pi}, {random.real(-3, 3)}});
    default:
      return add(circuit, Kind::r, wire, {{random.real(-3, 3)}, quarter()});
  }
}

void add_symbolic(Random& random, Circuit& circuit, std::uint32_t wire) {
  const Angle angle = input(circuit, static_cast<std::uint32_t>(random.below(2)),
                            random.chance(0.5) ? 1 : -0.5, random.chance(0.5) ? 0 : random.real(-3, 3));
  if (random.chance(0.4)) return add(circuit, Kind::rz, wire, {angle});
  add(circuit, Kind::r, wire, {angle, {pi / 2 * random.between(0, 3)}});
}

}  // namespace

TEST_CASE("stretches with an affine closed form: one pulse or none") {
  struct Row {
    const char* what;
    void (*build)(Circuit&);
    std::size_t pulses;
  };
  const Row rows[] = {
      {"same axis, known after",
       [](Circuit& c) {
         add(c, Kind::r, 0, {input(c, 0), {0}});
         add(c, Kind::r, 0, {{pi / 2}, {0}});
       },
       1},
      {"same axis, known before and after",
       [](Circuit& c) {
         add(c, Kind::r, 0, {{0.3}, {0.7}});
         add(c, Kind::r, 0, {input(c, 0, 2), {0.7}});
         add(c, Kind::r, 0, {{1.1}, {0.7}});
       },
       1},
      {"opposite axis",
       [](Circuit& c) {
         add(c, Kind::r, 0, {input(c, 0), {0.7}});
         add(c, Kind::r, 0, {{1.1}, {0.7 + pi}});
       },
       1},
      {"a half turn before, about any axis",
       [](Circuit& c) {
         add(c, Kind::r, 0, {{pi}, {0.3}});
         add(c, Kind::r, 0, {input(c, 0), {1.9}});
       },
       1},
      {"a half turn after, about any axis",
       [](Circuit& c) {
         add(c, Kind::r, 0, {input(c, 0), {1.9}});
         add(c, Kind::r, 0, {{pi}, {0.3}});
       },
       1},
      {"half turns on both sides",
       [](Circuit& c) {
         add(c, Kind::r, 0, {{pi}, {0.4}});
         add(c, Kind::r, 0, {input(c, 0), {1.9}});
         add(c, Kind::r, 0, {{pi}, {0.3}});
       },
       1},
      {"h rz h",
       [](Circuit& c) {
         add(c, Kind::h, 0);
         add(c, Kind::rz, 0, {input(c, 0)});
         add(c, Kind::h, 0);
       },
       1},
      {"quarter turns of the same sense around an rz",
       [](Circuit& c) {
         add(c, Kind::r, 0, {{pi / 2}, {0}});
         add(c, Kind::rz, 0, {input(c, 0)});
         add(c, Kind::r, 0, {{pi / 2}, {0}});
       },
       1},
      {"quarter turns about different axes around an rz",
       [](Circuit& c) {
         add(c, Kind::r, 0, {{pi / 2}, {0.4}});
         add(c, Kind::rz, 0, {input(c, 0)});
         add(c, Kind::r, 0, {{-pi / 2}, {1.3}});
       },
       1},
      {"an rz alone",
       [](Circuit& c) {
         add(c, Kind::r, 0, {{pi}, {0.4}});
         add(c, Kind::rz, 0, {input(c, 0)});
         add(c, Kind::r, 0, {{pi}, {1.4}});
       },
       0},
      {"two inputs about one axis and a known turn between",
       [](Circuit& c) {
         add(c, Kind::r, 0, {input(c, 0), {0.4}});
         add(c, Kind::r, 0, {{0.8}, {0.4}});
         add(c, Kind::r, 0, {input(c, 1), {0.4}});
       },
       1},
      {"a phase of the pulse that is an input, and the same axis again",
       [](Circuit& c) {
         add(c, Kind::r, 0, {{0.6}, input(c, 1)});
         add(c, Kind::r, 0, {input(c, 0), input(c, 1)});
         add(c, Kind::r, 0, {{0.9}, input(c, 1, 1, pi)});
       },
       1},
  };
  Random random(3);
  for (const Row& row : rows) {
    Circuit source = bare();
    row.build(source);
    CAPTURE(std::string(row.what));
    for (const Effort effort : {Effort::quick, Effort::steady}) {
      PassContext context;
      context.effort = effort;
      const Circuit result = optimize(source, context);
      CAPTURE(listed(result));
      CHECK(pulses_of(result) == row.pulses);
      CHECK(difference(random, source, result) < 1e-9);
    }
  }
}

// The unitary is A R(t) B with A, B known. The z of the Bloch vector that |0> goes to is a + b cos t + c sin
// t. One pulse about a known axis makes it cos(t + d) or a constant; so one pulse does it where a = 0 and b,
// c have length 1, or where b = c = 0; no pulse where the constant is 1. Everything else takes two. The
// numbers come from the simulator.
TEST_CASE("one unknown angle: exactly as many pulses as it takes") {
  Random random(5);
  int counted[3] = {0, 0, 0};
  for (int trial = 0; trial < 3000; ++trial) {
    Circuit source = bare();
    for (int i = random.below(4); i > 0; --i) add_known(random, source, 0);
    const Angle angle = input(source, 1);
    if (random.chance(0.5)) {
      add(source, Kind::rz, 0, {angle});
    } else {
      add(source, Kind::r, 0, {angle, {random.real(-3, 3)}});
    }
    for (int i = random.below(4); i > 0; --i) add_known(random, source, 0);

    const auto height = [&](double t) {
      const std::vector<double> inputs = {0, t};
      return 2 * std::norm(support::unitary(source, inputs)(0, 0)) - 1;
    };
    const double a = (height(0) + height(pi)) / 2;
    const double length = std::hypot((height(0) - height(pi)) / 2, (height(pi / 2) - height(-pi / 2)) / 2);
    constexpr double rough = 1e-7;
    std::size_t needed = 2;
    if (length < rough) needed = a > 1 - rough ? 0 : 1;
    if (std::abs(a) < rough && length > 1 - rough) needed = 1;

    const Circuit result = lower(source, {});
    CAPTURE(listed(source));
    CAPTURE(listed(result));
    CHECK(pulses_of(result) == needed);
    CHECK(difference(random, source, result) < 1e-9);
    ++counted[needed];
  }
  for (const int count : counted) CHECK(count > 200);
}

TEST_CASE("random stretches with unknown angles, between interactions and alone") {
  Random random(7);
  for (int trial = 0; trial < 1500; ++trial) {
    const auto wires = static_cast<std::uint32_t>(random.between(1, 3));
    Circuit source = bare(wires);
    for (int i = random.between(2, 25); i > 0; --i) {
      const auto wire = static_cast<std::uint32_t>(random.below(static_cast<int>(wires)));
      const double what = random.real();
      if (wires > 1 && what < 0.3) {
        const auto pair = random.distinct(2, static_cast<int>(wires));
        source.body().push_back(
            source.make(Kind::xx, {pair[0], pair[1]},
                        {random.chance(0.3) ? input(source, 0) : Angle{random.real(0.1, 1.5)},
                         {pi / 2 * random.between(0, 3)},
                         {random.real(-3, 3)}}));
      } else if (what < 0.65) {
        add_symbolic(random, source, wire);
      } else {
        add_known(random, source, wire);
      }
    }
    const Circuit result = lower(source, {});
    CAPTURE(listed(source));
    CAPTURE(listed(result));
    check_invariants(result);
    CHECK(difference(random, source, result) < 1e-9);
    // Every gate but rz as a pulse of its own is one way to do it.
    std::size_t plainly = 0;
    for (const Operation& op : source.body()) plainly += op.operand_count == 1 && op.kind != Kind::rz;
    CHECK(pulses_of(result) <= plainly);
    CHECK(pulses_of(lower(result, {})) <= pulses_of(result));
  }
}

// The walk along numeric axes must find a pole for any axis, however near the old pole it lies and however
// far rounding has taken it from unit length.
TEST_CASE("an axis close to the pole finds a pole of its own") {
  for (const double tilt : {1e-2, 1e-3, 3e-4, 1e-4, 3e-5, 1e-5, 1e-6, 1e-7, 1e-9, 0.0}) {
    for (const double stretch : {1.0, 1 + 1e-9, 1 - 1e-9, 1 + 1e-8, 1 - 1e-8}) {
      for (int turn = 0; turn < 12; ++turn) {
        CAPTURE(tilt);
        CAPTURE(stretch);
        const Axis axis =
            Axis(tilt * std::cos(turn), tilt * std::sin(turn), std::sqrt(1 - tilt * tilt)) * stretch;
        std::vector<Axis> poles(2);
        choose_poles(std::vector<Need>{{axis, 0}, {Axis::UnitZ(), 1, Need::What::end, true}}, poles);
        CHECK(std::abs(poles[0].dot(axis)) < 1e-8);
        CHECK(poles[0].norm() == doctest::Approx(1));
      }
    }
  }
}
