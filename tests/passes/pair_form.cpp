// Stretches on one pair with unknown angles and quarter turns: written as promised, with fewer interactions.
#include <doctest/doctest.h>

#include "passes/local_rotations.h"
#include "passes/pair_stretches.h"
#include "passes/stretch_rotations.h"
#include "support/random_circuits.h"
#include "support/simulator.h"

using namespace isinglass;
using support::Random;

namespace {

constexpr Letter letters[] = {Letter::X, Letter::Y, Letter::Z};

Circuit with_inputs(std::uint32_t wires) {
  Circuit circuit;
  add_register(circuit, "q", wires);
  for (const char* name : {"r", "s", "t"}) circuit.inputs.push_back({name, "float", false, {}, {}});
  return circuit;
}

Turn pair_turn(Letter la, Letter lb, Angle angle) {
  return {0, 1, la, lb, false, angle, {}};
}

/// The turns one after the other, or written as stretches.
Circuit circuit_of(Circuit circuit, const std::vector<Turn>& turns, bool as_stretches, bool may_rename) {
  WrittenSequence result;
  if (as_stretches) {
    result = written({turns, {0, 1}}, 2, may_rename, {}, circuit);
  } else {
    for (const Turn& turn : turns) {
      const Angle angle = turn.negative ? circuit.forms.negated(turn.angle) : turn.angle;
      result.rotations.push_back({{turn.a, turn.b}, {turn.la, turn.lb}, angle, {}});
    }
    result.home = {0, 1};
  }
  for (const LocalRotation& rotation : result.rotations) append_gates(circuit, rotation, circuit.body());
  for (std::uint32_t& wire : circuit.end_wire) wire = result.home[wire];
  return circuit;
}

}  // namespace

TEST_CASE("a rotation that a quarter turn takes to one letter is free, and one about its string as well") {
  Circuit circuit = with_inputs(2);
  const Angle t = {0, circuit.forms.of_input(2)};
  const Angle s = {0.3, circuit.forms.of_input(1)};
  const Angle quarter = {pi / 2};
  struct Row {
    std::vector<Turn> turns;
    int plain, renamed;
  };
  const std::vector<Row> rows = {
      {{pair_turn(Letter::X, Letter::X, t), pair_turn(Letter::Z, Letter::X, quarter)}, 1, 1},
      {{pair_turn(Letter::Z, Letter::X, quarter), pair_turn(Letter::X, Letter::X, t)}, 1, 1},
      {{pair_turn(Letter::X, Letter::X, t), pair_turn(Letter::X, Letter::X, quarter)}, 1, 1},
      {{pair_turn(Letter::X, Letter::X, t), pair_turn(Letter::Z, Letter::Z, quarter)}, 2, 2},
      // Two quarter turns are SWAP and one more, which is free of charge where wires are renamed.
      {{pair_turn(Letter::Y, Letter::X, t), pair_turn(Letter::Z, Letter::X, quarter),
        pair_turn(Letter::X, Letter::Z, quarter)},
       2,
       1},
      {{pair_turn(Letter::X, Letter::X, t), pair_turn(Letter::Y, Letter::Y, s)}, 2, 2},
      // Rotations that do not commute: both on one wire after the quarter turn.
      {{pair_turn(Letter::X, Letter::X, t),
        {0, 0, Letter::Z, Letter::I, false, s, {}},
        pair_turn(Letter::Z, Letter::X, quarter)},
       1,
       1},
  };
  for (std::size_t i = 0; i < rows.size(); ++i) {
    CAPTURE(i);
    for (const bool may_rename : {false, true}) {
      const Price price = price_of(rows[i].turns, 2, may_rename, {});
      CHECK(price.interactions == (may_rename ? rows[i].renamed : rows[i].plain));
      const Circuit result = circuit_of(circuit, rows[i].turns, true, may_rename);
      CHECK(static_cast<int>(tally_of(result).xx) == price.interactions);
      const std::vector<double> inputs = {0.4, -1.1, 0.7};
      CHECK(support::distance(circuit_of(circuit, rows[i].turns, false, false), result, inputs) < 1e-9);
    }
  }
}

TEST_CASE("random turns on a pair with unknown angles: written as promised, never more than one by one") {
  Random random(29);
  int fewer = 0, lower = 0;
  for (int trial = 0; trial < 4000; ++trial) {
    Circuit circuit = with_inputs(2);
    std::vector<Turn> turns;
    int pairs = 0;
    for (int i = random.between(2, 9); i > 0; --i) {
      Angle angle = {pi / 2 * random.between(1, 3)};
      const int what = random.below(4);
      if (what >= 2) angle = {random.chance(0.3) ? 0.0 : random.real(-2, 2), 0};
      if (what == 3) angle.form = circuit.forms.of_input(static_cast<std::uint32_t>(random.below(3)));
      const Letter la = letters[random.below(3)], lb = letters[random.below(3)];
      const bool is_pair = random.chance(0.7);
      const auto a = static_cast<std::uint8_t>(random.below(2));
      const auto b = static_cast<std::uint8_t>(is_pair ? 1 - a : 0);
      turns.push_back({a, b, la, is_pair ? lb : Letter::I, random.chance(0.5), angle, {}});
      pairs += is_pair && !is_multiple(angle.form == 0 ? angle.constant : 1, pi);
    }
    const bool may_rename = random.chance(0.5);
    const Price price = price_of(turns, 2, may_rename, {});
    CHECK(price.interactions <= pairs);
    fewer += price.interactions < pairs;
    const Circuit result = circuit_of(circuit, turns, true, may_rename);
    // Fewer only where an input cancels, which the price does not see.
    CHECK(static_cast<int>(tally_of(result).xx) <= price.interactions);
    lower += static_cast<int>(tally_of(result).xx) < price.interactions;
    const std::vector<double> inputs = {random.real(-3, 3), random.real(-3, 3), random.real(-3, 3)};
    CHECK(support::distance(circuit_of(circuit, turns, false, false), result, inputs) < 1e-8);
  }
  CHECK(fewer > 1000);
  CHECK(lower < 20);
}
