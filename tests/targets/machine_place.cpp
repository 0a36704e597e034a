// Placement: good pairs are found, nothing changes the meaning, what is impossible is said.
#include <doctest/doctest.h>
#include <fmt/format.h>

#include <algorithm>
#include <numeric>

#include "circuit/message.h"
#include "circuit/physical.h"
#include "passes/optimize.h"
#include "support/random_circuits.h"
#include "support/simulator.h"
#include "targets/place.h"
#include "targets/schedule.h"

using namespace isinglass;
using support::Random;

namespace {

/// The placed circuit on wires of its own: source qubit q starts on wire q again.
Circuit on_source_wires(const Placed& placed) {
  Circuit circuit = placed.circuit;
  std::vector<std::uint32_t> wire_of(circuit.wires, 0xffffffffu);
  for (std::uint32_t q = 0; q < placed.start.size(); ++q) wire_of[placed.start[q]] = q;
  auto next = static_cast<std::uint32_t>(placed.start.size());
  for (std::uint32_t& wire : wire_of) {
    if (wire == 0xffffffffu) wire = next++;
  }
  for (Block& block : circuit.blocks) {
    for (Operation& op : block) {
      const auto ions = circuit.operands(op);
      std::vector<std::uint32_t> wires;
      for (const std::uint32_t ion : ions) wires.push_back(wire_of[ion]);
      circuit.set_operands(op, wires);
    }
  }
  for (std::uint32_t& wire : circuit.end_wire) wire = wire_of[wire];
  return circuit;
}

void reach_only_neighbours(Target& target) {
  for (std::uint32_t a = 0; a < target.ions; ++a) {
    for (std::uint32_t b = a + 2; b < target.ions; ++b) target.pair(a, b).reachable = false;
  }
}

bool all_reachable(const Placed& placed, const Target& target) {
  for (const Block& block : placed.circuit.blocks) {
    for (const Operation& op : block) {
      if (op.kind == Kind::xx && !target.pair(op.operand[0], op.operand[1]).reachable) return false;
    }
  }
  return true;
}

std::string refusal(const Circuit& circuit, const Target& target) {
  try {
    place(circuit, target);
  } catch (const Failure& failure) {
    CHECK(failure.exit == Exit::target_cannot);
    return failure.messages.front().text;
  }
  return {};
}

}  // namespace

TEST_CASE("on a uniform machine everybody stays where the source put him") {
  Random random(1);
  const Circuit circuit = support::random_circuit(random, {4, 30, 0, support::Family::native});
  const Placed placed = place(circuit, typical(6));
  CHECK(placed.start == std::vector<std::uint32_t>{0, 1, 2, 3});
  CHECK(placed.circuit.wires == 6);
  CHECK(placed.in_use == std::vector<bool>{true, true, true, true, false, false});
}

TEST_CASE("programs of very many qubits keep their order") {
  Circuit circuit;
  add_register(circuit, "q", 20000);
  circuit.body().push_back(circuit.make(Kind::xx, {7, 19999}, {{0.3}, {0}, {0}}));
  const Target target = typical(20001);
  const Placed placed = place(circuit, target);
  CHECK(placed.start[19999] == 19999);
  const Timed timed = schedule(placed, target, {true, true});
  CHECK(timed.totals.xx == 1);
  CHECK(timed.totals.pairs == 1);
}

TEST_CASE("the pair that interacts most gets the best pair") {
  Target target = typical(6);
  target.pair(2, 4).slope.value = 1e-3;
  Circuit circuit;
  add_register(circuit, "q", 3);
  for (int i = 0; i < 10; ++i) circuit.body().push_back(circuit.make(Kind::xx, {0, 2}, {{0.3}, {0}, {0}}));
  circuit.body().push_back(circuit.make(Kind::xx, {0, 1}, {{0.3}, {0}, {0}}));
  const Placed placed = place(circuit, target);
  CHECK(std::min(placed.start[0], placed.start[2]) == 2);
  CHECK(std::max(placed.start[0], placed.start[2]) == 4);
  // The same when the good pair lies far out and everything begins elsewhere.
  Target far = typical(20);
  far.pair(17, 3).floor.value = 1e-5;
  const Placed second = place(circuit, far);
  CHECK(std::min(second.start[0], second.start[2]) == 3);
  CHECK(std::max(second.start[0], second.start[2]) == 17);
}

TEST_CASE("placement is as good as the best of all, on small machines") {
  Random random(7);
  for (int round = 0; round < 20; ++round) {
    Target target = typical(5);
    for (PairFigures& pair : target.pairs) pair.slope.value = random.real(1e-3, 1e-2);
    for (IonFigures& ion : target.ion) ion.pulse_error.value = random.real(1e-4, 1e-3);
    const Circuit circuit = support::random_circuit(random, {4, 30, 0, support::Family::native});
    const auto cost = [&](const std::vector<std::uint32_t>& ion_of) {
      double sum = 0;
      for (const Operation& op : circuit.body()) {
        if (op.kind == Kind::r) sum += target.ion[ion_of[op.operand[0]]].pulse_error.value;
        if (op.kind == Kind::xx)
          sum += target.pair(ion_of[op.operand[0]], ion_of[op.operand[1]]).error(op.value[0]);
      }
      return sum;
    };
    std::vector<std::uint32_t> ions(5);
    std::iota(ions.begin(), ions.end(), 0u);
    double best = 1e9;
    do {
      best = std::min(best, cost(ions));
    } while (std::next_permutation(ions.begin(), ions.end()));
    CHECK(cost(place(circuit, target).start) == doctest::Approx(best).epsilon(1e-9));
  }
}

TEST_CASE("movement keeps the meaning and uses reachable pairs only") {
  Random random(3);
  for (int round = 0; round < 60; ++round) {
    const int qubits = random.between(2, 4);
    const auto ions = static_cast<std::uint32_t>(random.between(qubits, 5));
    Target target = typical(ions);
    reach_only_neighbours(target);
    const Circuit circuit = support::random_circuit(random, {qubits, 20, 0, support::Family::native});
    PlaceOptions options;
    options.seed = random.bits();
    const Placed placed = place(circuit, target, options);
    CHECK_NOTHROW(check_invariants(placed.circuit));
    CHECK(all_reachable(placed, target));
    CHECK(support::distance(circuit, on_source_wires(placed)) < 1e-9);
  }
}

TEST_CASE("movement within a branch is undone at its end") {
  Target target = typical(4);
  reach_only_neighbours(target);
  Circuit circuit;
  add_register(circuit, "q", 4);
  add_bits(circuit, "c", 1);
  circuit.blocks.resize(2);
  for (const std::uint32_t other : {1u, 2u, 3u}) {
    circuit.blocks[1].push_back(circuit.make(Kind::xx, {0, other}, {{0.3 * other}, {0.1}, {0.2}}));
  }
  circuit.branches.push_back({});
  circuit.branches[0].arms = {{{}, 1}};
  circuit.body() = {
      circuit.make(Kind::xx, {0, 2}, {{0.4}, {0}, {0}}), circuit.make(Kind::xx, {0, 3}, {{0.4}, {0}, {0}}),
      circuit.make(Kind::branch, {0, 1, 2, 3}), circuit.make(Kind::xx, {1, 3}, {{0.4}, {0}, {0}})};
  const Placed placed = place(circuit, target);
  CHECK_NOTHROW(check_invariants(placed.circuit));
  CHECK(placed.moves > 0);
  CHECK(all_reachable(placed, target));
  // Straight line: the arm in place of the branch.
  const auto straight = [](Circuit c) {
    Block body;
    for (const Operation& op : c.body()) {
      if (op.kind == Kind::branch) {
        body.insert(body.end(), c.blocks[1].begin(), c.blocks[1].end());
      } else {
        body.push_back(op);
      }
    }
    c.blocks = {body};
    c.branches.clear();
    return c;
  };
  CHECK(support::distance(straight(circuit), straight(on_source_wires(placed))) < 1e-9);
  // And without the arm.
  const auto skipped = [](Circuit c) {
    std::erase_if(c.blocks[0], [](const Operation& op) { return op.kind == Kind::branch; });
    c.blocks.resize(1);
    c.branches.clear();
    return c;
  };
  CHECK(support::distance(skipped(circuit), skipped(on_source_wires(placed))) < 1e-9);
}

TEST_CASE("the same seed gives the same placement") {
  Random random(11);
  Target target = typical(12);
  for (PairFigures& pair : target.pairs) pair.slope.value = random.real(1e-3, 1e-2);
  const Circuit circuit = support::random_circuit(random, {9, 100, 0, support::Family::native});
  CHECK(place(circuit, target).start == place(circuit, target).start);
}

TEST_CASE("what a machine cannot do is refused by name") {
  Circuit circuit;
  add_register(circuit, "q", 4);
  circuit.body().push_back(circuit.make(Kind::xx, {0, 3}, {{0.4}, {0}, {0}}, Origins::line(7)));
  CHECK(refusal(circuit, typical(3)) == "the program needs 4 ions, the machine typical-3 has 3");

  Target dark = typical(5);
  dark.ion[0].addressed = dark.ion[4].addressed = false;
  CHECK(refusal(circuit, dark) == "the program needs 4 ions, the machine typical-5 has 3 that light reaches");

  Target cut = typical(4);
  for (PairFigures& pair : cut.pairs) pair.reachable = false;
  CHECK(refusal(circuit, cut) ==
        "the machine typical-4 cannot bring ions 0 and 3 together (q[0] and q[3], line 7 of the source): no "
        "chain of reachable pairs joins them");

  Target plain = typical(4);
  plain.has_reset = false;
  circuit.body() = {circuit.make(Kind::reset, {2}, {}, Origins::line(9))};
  CHECK(refusal(circuit, plain) ==
        "the program needs reset (line 9 of the source), which the machine typical-4 lacks");
}

TEST_CASE("two islands: what fits on one of them is put there") {
  Target target = typical(6);
  for (std::uint32_t a = 0; a < 6; ++a) {
    for (std::uint32_t b = a + 1; b < 6; ++b) target.pair(a, b).reachable = (a < 3) == (b < 3);
  }
  Circuit circuit;
  add_register(circuit, "q", 6);
  for (const auto& [a, b] : {std::pair(0u, 3u), std::pair(3u, 5u), std::pair(1u, 4u), std::pair(4u, 2u)}) {
    circuit.body().push_back(circuit.make(Kind::xx, {a, b}, {{0.4}, {0}, {0}}));
  }
  const Placed placed = place(circuit, target);
  CHECK(placed.moves == 0);
  CHECK(all_reachable(placed, target));
}

// Physical qubits.

namespace {

/// Its qubits become physical ones: wire w is `$ions[w]`; those beyond the list stay free.
void pin(Circuit& circuit, const std::vector<std::uint32_t>& ions) {
  circuit.registers.clear();
  for (std::uint32_t w = 0; w < circuit.wires; ++w) {
    const bool is_pinned = w < ions.size();
    circuit.registers.push_back(
        {is_pinned ? fmt::format("${}", ions[w]) : fmt::format("free{}", w), w, 1, true});
  }
}

}  // namespace

TEST_CASE("physical qubits start and end on their ions, whatever machine, passes and movement") {
  Random random(23);
  int moved = 0;
  for (int round = 0; round < 200; ++round) {
    const int qubits = random.between(2, 4);
    Circuit source = support::random_circuit(random, {qubits, 14, 1, support::Family::any});
    const std::uint32_t ions = 5;
    auto pinned = random.distinct(random.between(1, qubits), ions);
    pin(source, pinned);
    source.body().push_back(source.make(Kind::swap, {0, 1}));
    Target target = typical(ions);
    const int kind = random.below(3);
    if (kind == 1) target.pair(0, 1).slope.value = 1e-4;  // worth sitting on
    if (kind == 2) {                                      // all but one pair of pinned ions
      pinned.resize(1);
      pin(source, pinned);
      reach_only_neighbours(target);
      target.pair(0, 4).reachable = true;
    }
    PassContext context;
    context.effort = random.chance(0.5) ? Effort::quick : Effort::steady;
    const Placed placed = place(optimize(source, context), target, {.seed = random.bits()});
    CHECK(all_reachable(placed, target));
    moved += placed.moves > 0 ? 1 : 0;
    for (std::uint32_t w = 0; w < pinned.size(); ++w) {
      CHECK(placed.start[w] == pinned[w]);
      CHECK(placed.circuit.end_wire[w] == pinned[w]);
    }
    CHECK(support::distance(source, on_source_wires(placed)) < 1e-8);
  }
  CHECK(moved > 10);
}

TEST_CASE("others move around a physical qubit, which does not move") {
  // 0 - 1 - 2 - 3 in a ring with 4; $2 stays, so that the way from 1 to 3 leads over 0 and 4.
  Target target = typical(5);
  reach_only_neighbours(target);
  target.pair(0, 4).reachable = true;
  Circuit circuit;
  add_register(circuit, "q", 4);
  pin(circuit, {2});
  for (const auto& [a, b] : {std::pair(1u, 2u), std::pair(2u, 3u), std::pair(1u, 3u), std::pair(0u, 1u),
                             std::pair(0u, 2u), std::pair(0u, 3u)}) {
    circuit.body().push_back(circuit.make(Kind::xx, {a, b}, {{0.4}, {0}, {0}}));
  }
  const Placed placed = place(circuit, target);
  CHECK(placed.moves > 0);
  CHECK(placed.start[0] == 2);
  CHECK(placed.circuit.end_wire[0] == 2);
  CHECK(support::distance(circuit, on_source_wires(placed)) < 1e-9);
  // A swap is the only thing with three full interactions on one pair in a row: none touches ion 2.
  const Block& body = placed.circuit.body();
  for (const Operation& op : body) {
    const bool touches = op.operand[0] == 2 || (op.kind == Kind::xx && op.operand[1] == 2);
    if (op.kind == Kind::xx && touches) CHECK(op.value[0] == doctest::Approx(0.4));
  }
}

TEST_CASE("physical qubits that a machine cannot give are refused") {
  Circuit circuit;
  add_register(circuit, "q", 2);
  circuit.body().push_back(circuit.make(Kind::xx, {0, 1}, {{0.4}, {0}, {0}}, Origins::line(7)));
  pin(circuit, {1, 5});
  CHECK(ions_wanted(circuit) == 6);
  CHECK(has_pinned(circuit));
  CHECK(refusal(circuit, typical(5)) == "$5 is ion 5 of the machine, and typical-5 has ions 0 to 4 only");
  Target dark = typical(6);
  dark.ion[5].addressed = false;
  CHECK(refusal(circuit, dark) == "$5 is ion 5 of the machine, which light does not reach on typical-6");
  Target cut = typical(6);
  reach_only_neighbours(cut);
  CHECK(
      refusal(circuit, cut) ==
      "the machine typical-6 cannot bring ions 1 and 5 together ($1 and $5, line 7 of the source): this pair "
      "is not reachable, and physical qubits do not move");
  pin(circuit, {});
  CHECK_FALSE(has_pinned(circuit));
  CHECK(ions_wanted(circuit) == 2);
}

TEST_CASE("where all ions and pairs are alike the source's order stays, however long the program") {
  Random random(41);
  Circuit circuit;
  constexpr std::uint32_t wires = 6;
  add_register(circuit, "q", wires);
  for (int i = 0; i < 20'000; ++i) {  // sums of so many errors round differently on each pair
    const auto pair = random.distinct(2, wires);
    circuit.body().push_back(
        circuit.make(Kind::xx, {pair[0], pair[1]}, {{random.real(0.01, 1.5)}, {0}, {0}}));
  }
  Target target = typical(8);
  const Placed placed = place(circuit, target);
  for (std::uint32_t q = 0; q < wires; ++q) CHECK(placed.start[q] == q);
  CHECK(listed(placed.circuit) == listed(circuit));
  // One better pair of ions, and the busiest pair of wires sits there.
  target.pair(6, 7).slope.value /= 100;
  for (int i = 0; i < 20'000; ++i) circuit.body().push_back(circuit.make(Kind::xx, {2, 4}, {{1}, {0}, {0}}));
  const Placed moved = place(circuit, target);
  CHECK(std::min(moved.start[2], moved.start[4]) == 6);
  CHECK(std::max(moved.start[2], moved.start[4]) == 7);
}
