// What each pass alone is there for, and what it must leave alone, in the smallest circuits that show it.
#include <doctest/doctest.h>

#include <algorithm>
#include <array>
#include <cmath>
#include <numeric>

#include "measured.h"
#include "passes/approximate.h"
#include "passes/bits_at_end.h"
#include "passes/boolean_values.h"
#include "passes/constructions.h"
#include "passes/expand_controls.h"
#include "passes/known_start.h"
#include "passes/lower.h"
#include "passes/merge_distant.h"
#include "passes/merge_gates.h"
#include "passes/merge_rotations.h"
#include "passes/optimize.h"
#include "passes/pair_toffolis.h"
#include "passes/rename_swaps.h"
#include "passes/search_blocks.h"
#include "passes/trim_end.h"
#include "passes/trim_start.h"
#include "passes/two_qubit_stretches.h"
#include "support/random_circuits.h"
#include "support/simulator.h"

using namespace isinglass;

namespace {

using Wires = std::vector<std::uint32_t>;

Circuit on(std::uint32_t qubits) {
  Circuit circuit;
  add_register(circuit, "q", qubits);
  return circuit;
}

void add(Circuit& circuit, Kind kind, const Wires& operands, const std::vector<Angle>& angles = {},
         std::uint32_t line = 0) {
  circuit.body().push_back(circuit.make(kind, operands, angles, {line}));
}

void measure(Circuit& circuit, std::uint32_t wire, std::uint32_t bit) {
  add(circuit, Kind::measure, {wire});
  circuit.body().back().payload = bit;
}

Wires range(std::uint32_t count, std::uint32_t first = 0) {
  Wires wires(count);
  std::iota(wires.begin(), wires.end(), first);
  return wires;
}

/// An if on bit 0 whose one arm holds the operations; it touches all their wires.
void branch_on_first_bit(Circuit& circuit, const Block& arm) {
  Branch branch;
  Expression name;
  name.kind = Expression::Kind::variable;
  Expression place;
  place.text = "0";
  branch.condition.kind = Expression::Kind::index;
  branch.condition.arguments = {name, place};
  branch.arms.push_back({{}, static_cast<std::uint32_t>(circuit.blocks.size())});
  Wires touched;
  for (const Operation& op : arm) {
    for (const std::uint32_t wire : circuit.operands(op)) {
      if (std::find(touched.begin(), touched.end(), wire) == touched.end()) touched.push_back(wire);
    }
  }
  circuit.blocks.push_back(arm);
  Operation op = circuit.make(Kind::branch, touched);
  op.payload = static_cast<std::uint32_t>(circuit.branches.size());
  circuit.branches.push_back(branch);
  circuit.body().push_back(op);
}

void end_program(Circuit& circuit, Block& block) {
  Operation op = circuit.make(Kind::classical, {});
  op.payload = static_cast<std::uint32_t>(circuit.statements.size());
  circuit.statements.emplace_back();
  circuit.statements.back().kind = ClassicalStatement::Kind::end_program;
  block.push_back(op);
}

std::size_t count_of(const Circuit& circuit, Kind kind) {
  std::size_t count = 0;
  for (const Block& block : circuit.blocks) {
    count += static_cast<std::size_t>(
        std::count_if(block.begin(), block.end(), [&](const Operation& op) { return op.kind == kind; }));
  }
  return count;
}

std::size_t on_several_wires(const Circuit& circuit) {
  return static_cast<std::size_t>(
      std::count_if(circuit.body().begin(), circuit.body().end(),
                    [](const Operation& op) { return op.is_unitary() && op.operand_count > 1; }));
}

support::State random_start(support::Random& random, std::uint32_t wires) {
  support::State state(wires);
  for (std::uint32_t q = 0; q < wires; ++q) {
    state.apply(support::haar_unitary(random, 1), std::span(&q, 1));
  }
  return state;
}

/// Largest difference of what both make of a random product state (of their bits, and the kept qubits).
double outcome_distance(const Circuit& a, const Circuit& b, const Wires& kept, bool zero_start = false) {
  support::Random random(71);
  const support::State start = zero_start ? support::State(a.wires) : random_start(random, a.wires);
  return support::distance(support::outcomes_of(a, start, kept), support::outcomes_of(b, start, kept));
}

PassContext zero_start() {
  PassContext context;
  context.promise.zero_start = true;
  return context;
}

}  // namespace

// ---- approximate

TEST_CASE("approximation leaves all but known interactions of the body, and as many as pay") {
  PassContext context;
  context.tolerance = 1e-2;
  SUBCASE("fences stay") {
    Circuit circuit = on(2);
    add_bits(circuit, "c", 2);
    add(circuit, Kind::xx, {0, 1}, {{1e-3}, {0}, {0}});
    measure(circuit, 0, 0);
    measure(circuit, 1, 1);
    const Circuit result = approximated(circuit, context).circuit;
    CHECK(count_of(result, Kind::xx) == 0);
    CHECK(count_of(result, Kind::measure) == 2);
  }
  SUBCASE("angles of inputs stay") {
    Circuit circuit = on(2);
    circuit.inputs.push_back({"t", "float", false, {}});
    add(circuit, Kind::xx, {0, 1}, {{0, circuit.forms.of_input(0)}, {0}, {0}});
    CHECK(count_of(approximated(circuit, context).circuit, Kind::xx) == 1);
  }
  SUBCASE("arms stay: they may run again and again") {
    Circuit circuit = on(2);
    add_bits(circuit, "c", 1);
    measure(circuit, 0, 0);
    branch_on_first_bit(circuit, {circuit.make(Kind::xx, {0, 1}, {{1e-3}, {0}, {0}})});
    CHECK(count_of(approximated(circuit, context).circuit, Kind::xx) == 1);
    add(circuit, Kind::xx, {0, 1}, {{2e-3}, {0}, {0}});
    CHECK(count_of(approximated(circuit, context).circuit, Kind::xx) == 1);
  }
  SUBCASE("the first of two pays, the second does not") {
    // Each saves 1.13e-3; leaving out one costs 0.05^2 / 4 = 0.63e-3, both 2.5e-3 (computed).
    Circuit circuit = on(4);
    add(circuit, Kind::xx, {0, 1}, {{0.05}, {0}, {0}});
    add(circuit, Kind::xx, {2, 3}, {{0.05}, {0}, {0}});
    const Approximation result = approximated(circuit, context);
    CHECK(count_of(result.circuit, Kind::xx) == 1);
    CHECK(result.infidelity == doctest::Approx(0.05 * 0.05 / 4));
  }
}

// ---- bits-at-end

TEST_CASE("bits: permutations before the last measurements are done on the bits") {
  const auto check = [](Kind kind, const Wires& operands, const std::vector<Angle>& angles, bool goes) {
    Circuit circuit = on(4);
    add_bits(circuit, "a", 2);
    add_bits(circuit, "b", 1, true);
    add_bits(circuit, "c", 1);
    for (const std::uint32_t q : range(4)) add(circuit, Kind::h, {q});
    add(circuit, Kind::r, {0}, {{0.4}, {1}});
    add(circuit, Kind::r, {1}, {{0.9}, {2}});
    add(circuit, kind, operands, angles);
    add(circuit, Kind::x, {3, 1});  // goes in any case
    for (const std::uint32_t q : range(4)) measure(circuit, q, 3 - q);
    const Circuit result = bits_at_end(circuit, {});
    check_invariants(result);
    CAPTURE(std::string(name(kind)));
    CHECK(on_several_wires(result) == (goes ? 0u : 1u));
    CHECK(outcome_distance(circuit, result, {}) < 1e-12);
  };
  check(Kind::x, {0, 1}, {}, true);
  check(Kind::x, {3, 0, 1}, {}, true);
  check(Kind::x, {2, 3, 1, 0}, {}, true);
  check(Kind::y, {1, 2}, {}, true);
  check(Kind::z, {1, 2}, {}, true);
  check(Kind::p, {0, 2, 3}, {{0.4}}, true);
  check(Kind::rz, {0, 2}, {{0.4}}, true);
  check(Kind::zz, {0, 2}, {{0.4}}, true);
  check(Kind::phase, {0, 2}, {{0.4}}, true);
  check(Kind::swap, {0, 2}, {}, true);
  check(Kind::swap, {0, 1, 2}, {}, false);
  check(Kind::h, {0, 1}, {}, false);
  check(Kind::xx, {0, 1}, {{0.3}, {0}, {0}}, false);
}

TEST_CASE("bits: swaps alone stay gates, which are renamed") {
  Circuit circuit = on(2);
  add_bits(circuit, "c", 2);
  add(circuit, Kind::swap, {0, 1});
  measure(circuit, 0, 0);
  measure(circuit, 1, 1);
  CHECK(count_of(bits_at_end(circuit, {}), Kind::classical) == 0);
}

TEST_CASE("bits: what is read too early, measured twice or used again stays") {
  const auto entangled = [] {
    Circuit circuit = on(2);
    add_bits(circuit, "c", 3);
    add(circuit, Kind::r, {0}, {{1.1}, {0.4}});
    add(circuit, Kind::r, {1}, {{0.7}, {0.2}});
    return circuit;
  };
  const auto check_same = [](const Circuit& circuit) {
    const Circuit result = bits_at_end(circuit, {});
    CHECK(on_several_wires(result) == on_several_wires(circuit));
    CHECK(outcome_distance(circuit, result, {0, 1}) < 1e-12);
  };
  SUBCASE("classical code reads the bit") {
    Circuit circuit = entangled();
    add(circuit, Kind::x, {0, 1});
    measure(circuit, 0, 0);
    measure(circuit, 1, 1);
    ClassicalStatement copy;  // c[2] = c[1]
    for (const auto& [side, bit] : {std::pair{&copy.target, "2"}, std::pair{&copy.value, "1"}}) {
      Expression name;
      name.kind = Expression::Kind::variable;
      Expression place;
      place.text = bit;
      side->kind = Expression::Kind::index;
      side->arguments = {name, place};
    }
    circuit.statements.push_back(copy);
    add(circuit, Kind::classical, {});
    check_same(circuit);
  }
  SUBCASE("the wires are used after their measurement") {
    Circuit circuit = entangled();
    measure(circuit, 0, 0);
    measure(circuit, 1, 1);
    add(circuit, Kind::x, {0, 1});
    check_same(circuit);
  }
  SUBCASE("one of the wires is not measured") {
    Circuit circuit = entangled();
    add(circuit, Kind::x, {0, 1});
    measure(circuit, 0, 0);
    check_same(circuit);
  }
  SUBCASE("both are measured into one bit") {
    Circuit circuit = entangled();
    add(circuit, Kind::x, {0, 1});
    measure(circuit, 1, 1);
    measure(circuit, 0, 1);
    check_same(circuit);
  }
}

// ---- Boolean functions

TEST_CASE("Boolean functions: equal identifiers mean equal functions, and marks and sums keep their word") {
  support::Random random(72);
  for (int trial = 0; trial < 40; ++trial) {
    BooleanValues values;
    constexpr int variables = 6;
    struct Known {
      BooleanValues::Value value;
      std::uint64_t table;  // bit k: the function where the variables are the bits of k
    };
    std::vector<Known> all = {{BooleanValues::zero, 0}, {BooleanValues::one, ~std::uint64_t{0}}};
    for (int v = 0; v < variables; ++v) {
      std::uint64_t table = 0;
      for (int k = 0; k < 64; ++k) table |= std::uint64_t(k >> v & 1) << k;
      all.push_back({values.fresh(), table});
    }
    for (int step = 0; step < 60; ++step) {
      const Known a = all[static_cast<std::size_t>(random.below(static_cast<int>(all.size())))];
      const Known b = all[static_cast<std::size_t>(random.below(static_cast<int>(all.size())))];
      const BooleanValues::Value sum = values.sum(a.value, b.value);
      CHECK(values.sum(b.value, a.value) == sum);
      CHECK(values.mark(sum) == (values.mark(a.value) ^ values.mark(b.value)));
      CHECK(values.mark(values.complement(a.value)) == values.mark(a.value));
      all.push_back({sum, a.table ^ b.table});
      all.push_back({values.sum(sum, b.value), a.table});
      all.push_back({values.product(a.value, b.value), a.table & b.table});
    }
    for (const Known& a : all) {
      for (const Known& b : all) {
        if (a.value == b.value) CHECK(a.table == b.table);
      }
    }
  }
}

TEST_CASE("Boolean functions: short ones are equal whenever they are, long ones are themselves") {
  BooleanValues values;
  const auto a = values.fresh();
  const auto b = values.fresh();
  const auto c = values.fresh();
  const auto ab = values.product(a, b);
  CHECK(values.product(a, a) == a);
  CHECK(values.product(a, values.complement(a)) == BooleanValues::zero);
  CHECK(values.product(values.sum(a, b), c) == values.sum(values.product(a, c), values.product(b, c)));
  CHECK(values.product(ab, values.sum(a, b)) == BooleanValues::zero);
  CHECK(values.has_constant(values.complement(ab)));
  CHECK(!values.has_constant(ab));
  // Four products are too many for one sum: a name of its own, and what was added can be taken back.
  BooleanValues::Value carry = ab;
  for (int term = 0; term < 4; ++term) {
    const auto more = values.product(values.fresh(), values.fresh());
    const auto sum = values.sum(carry, more);
    CHECK(values.sum(sum, more) == carry);
    CHECK(values.sum(sum, carry) == more);
    carry = sum;
  }
  // Thirteen variables are too many for one term: a name of its own, the same one when made the same way.
  BooleanValues::Value all = BooleanValues::one;
  std::vector<BooleanValues::Value> variables;
  for (int v = 0; v < 12; ++v) {
    variables.push_back(values.fresh());
    all = values.product(all, variables.back());
  }
  const auto last = values.fresh();
  const auto long_product = values.product(all, last);
  CHECK(long_product != BooleanValues::zero);
  CHECK(long_product != all);
  CHECK(values.product(last, all) == long_product);
}

// ---- choose-constructions

TEST_CASE("idle wires: nothing that was touched is clean, nothing outside an arm is lent to it") {
  SUBCASE("touched before and after") {
    Circuit circuit = on(7);
    for (const std::uint32_t q : range(7)) add(circuit, Kind::h, {q});
    add(circuit, Kind::x, range(5));
    for (const std::uint32_t q : range(7)) add(circuit, Kind::h, {q});
    const Circuit result = choose_constructions(circuit, zero_start());
    CHECK(support::distance_from_zero(circuit, result) < 1e-9);
    CHECK(tally_of(lower(result, {})).xx == 20);  // k = 4 with dirty wires (computed)
  }
  SUBCASE("an arm") {
    Circuit circuit = on(8);
    add_bits(circuit, "c", 1);
    measure(circuit, 0, 0);
    branch_on_first_bit(circuit, {circuit.make(Kind::x, range(5))});
    PassContext context = zero_start();
    context.spare_wires = 3;
    const Circuit result = choose_constructions(circuit, context);
    check_invariants(result);
    for (const Operation& op : result.blocks[1]) {
      for (const std::uint32_t wire : result.operands(op)) CHECK(wire < 5);
    }
    CHECK(tally_of(lower(result, {})).xx == 27);  // k = 4 without idle wires (computed)
  }
  SUBCASE("as many dirty wires as help") {
    Circuit circuit = on(11);
    add(circuit, Kind::x, range(7));
    CHECK(tally_of(lower(choose_constructions(circuit, {}), {})).xx == 36);  // k = 6 (computed)
  }
  SUBCASE("spare ions are claimed once") {
    Circuit circuit = on(4);
    add(circuit, Kind::x, range(4));
    PassContext context;
    context.spare_wires = 1;
    Circuit result = choose_constructions(circuit, context);
    CHECK(result.wires == 5);
    result.body().push_back(result.make(Kind::x, range(4)));
    result = choose_constructions(result, context);
    CHECK(result.wires == 5);
    add(circuit, Kind::x, range(4));
    CHECK(support::distance(circuit, result) < 1e-9);
  }
}

// ---- constructions

TEST_CASE("of the two rotations that a unitary is, the one by the smaller angle is controlled") {
  support::Random random(73);
  for (int trial = 0; trial < 200; ++trial) {
    Circuit circuit = on(3);
    const double t = random.real(-7, 7);
    const double f = random.real(-7, 7);
    const double l = random.real(-7, 7);
    add(circuit, Kind::u, {0, 1, 2}, {{t}, {f}, {l}});
    const Tally tally = tally_of(lower(choose_constructions(circuit, {}), {}));
    CHECK(tally.xx <= 5);
    // |cos(angle / 2)| of ry(t) between rz(f) and rz(l); the closed form of the doubly controlled rotation
    // (computed), and at most a controlled phase of pi.
    const double angle = 2 * std::acos(std::min(1.0, std::abs(std::cos(t / 2) * std::cos((f + l) / 2))));
    const double closed = 4 * std::asin(std::sqrt(std::sin(angle / 4))) / (pi / 2);
    CHECK(tally.xx_units <= closed + 1 + 1e-9);
  }
}

TEST_CASE("more controls: the target of a phase's rotation helps the controls, garbage is used once") {
  const auto simplified = [](const Circuit& source, const IdleWires& idle) {
    Circuit result = source;
    result.body().clear();
    for (const Operation& op : source.body()) simplify(result, op, idle, {}, result.body());
    check_invariants(result);
    return result;
  };
  const auto check = [&](const Circuit& source, const IdleWires& idle, std::size_t xx) {
    const Circuit result = simplified(source, idle);
    support::Random random(74);
    support::State before = random_start(random, source.wires);
    support::State after = before;
    for (const Operation& op : source.body()) support::apply(before, source, op);
    for (const Operation& op : result.body()) support::apply(after, result, op);
    support::Complex overlap = 0;
    for (std::size_t i = 0; i < before.amplitudes.size(); ++i) {
      overlap += std::conj(before.amplitudes[i]) * after.amplitudes[i];
    }
    CHECK(std::abs(overlap) == doctest::Approx(1).epsilon(1e-12));
    CHECK(tally_of(lower(result, {})).xx == xx);
  };
  // Computed with these constructions: a rotation by k - 1 controls and the phase of those, which may borrow
  // the rotation's target.
  const std::pair<std::uint32_t, std::size_t> phases[] = {{3, 13}, {4, 27}, {5, 47}, {6, 75}, {9, 215}};
  for (const auto& [k, xx] : phases) {
    Circuit source = on(k + 1);
    add(source, Kind::p, range(k + 1), {{0.3}});
    CAPTURE(k);
    check(source, {}, xx);
  }
  Circuit source = on(13);
  add(source, Kind::x, range(8));
  check(source, {{}, range(5, 8)}, 44);  // 8 + 2 (4 + 4 + 10) (computed)
}

// ---- expand-controls

TEST_CASE("many controls are expanded exactly") {
  support::Random random(75);
  for (int kind = 0; kind <= static_cast<int>(Kind::xx); ++kind) {
    const auto what = static_cast<Kind>(kind);
    for (int controls = 3; controls <= 6 - target_count(what); ++controls) {
      Circuit circuit = on(6);
      std::vector<Angle> angles;
      for (int a = 0; a < angle_count(what); ++a) angles.push_back({random.real(-6, 6)});
      add(circuit, what, random.distinct(controls + target_count(what), 6), angles);
      const Circuit result = expand_controls(circuit, {});
      CAPTURE(listed(circuit));
      CHECK(support::distance(circuit, result) < 1e-9);
      for (const Operation& op : result.body()) CHECK(op.operand_count <= 2);
    }
  }
}

// ---- pair-toffolis

TEST_CASE("a target that may no longer hold 0 takes an exact Toffoli") {
  Circuit swapped = on(4);
  for (const std::uint32_t q : {0u, 1u, 3u}) add(swapped, Kind::r, {q}, {{0.7 + q}, {0.3}});
  add(swapped, Kind::swap, {2, 3});
  add(swapped, Kind::x, {0, 1, 2});
  CHECK(support::distance_from_zero(swapped, pair_toffolis(swapped, zero_start())) < 1e-12);

  Circuit branched = on(4);
  add_bits(branched, "c", 1);
  for (const std::uint32_t q : {0u, 1u, 3u}) add(branched, Kind::r, {q}, {{0.7 + q}, {0.3}});
  measure(branched, 3, 0);
  branch_on_first_bit(branched, {branched.make(Kind::h, {2})});
  add(branched, Kind::x, {0, 1, 2});
  const Circuit result = pair_toffolis(branched, zero_start());
  CHECK(outcome_distance(branched, result, {0, 1, 2}, true) < 1e-12);
}

// ---- known-start

TEST_CASE("a known bit as control or target leaves what is left of the gate") {
  const auto check = [](Kind kind, const Wires& operands, const std::vector<Angle>& angles, bool holds_one,
                        std::uint32_t most_operands) {
    Circuit circuit = on(3);
    if (holds_one) add(circuit, Kind::x, {2});
    add(circuit, Kind::h, {0});
    add(circuit, Kind::r, {1}, {{0.7}, {0.3}});
    add(circuit, kind, operands, angles);
    const Circuit result = known_start(circuit, zero_start());
    CAPTURE(listed(circuit));
    CAPTURE(listed(result));
    CHECK(support::distance_from_zero(circuit, result) < 1e-12);
    for (const Operation& op : result.body()) CHECK(op.operand_count <= most_operands);
  };
  for (const bool holds_one : {false, true}) {
    check(Kind::x, {2, 0}, {}, holds_one, 1);
    check(Kind::x, {2, 0, 1}, {}, holds_one, holds_one ? 2 : 1);
    check(Kind::rz, {0, 2}, {{0.8}}, holds_one, 1);
    check(Kind::rz, {0, 1, 2}, {{0.8}}, holds_one, 2);
    check(Kind::z, {0, 2}, {}, holds_one, 1);
    check(Kind::p, {0, 2}, {{0.8}}, holds_one, 1);
    check(Kind::x, {0, 2}, {}, holds_one, 2);
  }
}

TEST_CASE("a known start with angles of inputs: each pass that uses it, and the whole") {
  support::Random random(76);
  const std::vector<double> values = {0.37, -1.21, 2.05};
  const auto whole = [](Circuit circuit, const PassContext& context) { return optimize(circuit, context); };
  for (int trial = 0; trial < 300; ++trial) {
    const Circuit source =
        support::random_circuit(random, {random.between(2, 4), 14, 1, support::Family::symbolic});
    const Circuit native = lower(expand_controls(source, {}), {});
    CAPTURE(listed(source));
    CHECK(support::distance_from_zero(source, known_start(source, zero_start()), values) < 1e-9);
    CHECK(support::distance_from_zero(source, trim_start(native, zero_start()), values) < 1e-9);
    if (trial % 4 == 0) {
      CHECK(support::distance_from_zero(source, whole(source, zero_start()), values) < 1e-9);
    }
  }
}

// ---- merging

TEST_CASE("equal gates meet whatever the order of symmetric wires, and not across an early end") {
  Circuit circuit = on(3);
  add_bits(circuit, "c", 1);
  add(circuit, Kind::zz, {0, 1}, {{0.3}});
  add(circuit, Kind::zz, {1, 0}, {{0.4}});
  add(circuit, Kind::swap, {2, 0, 1});
  add(circuit, Kind::swap, {2, 1, 0});
  CHECK(merge_gates(circuit, {}).body().size() == 1);
  circuit.body().clear();
  add(circuit, Kind::h, {2});
  measure(circuit, 0, 0);
  Block arm = {circuit.make(Kind::x, {0})};
  end_program(circuit, arm);
  branch_on_first_bit(circuit, arm);
  add(circuit, Kind::h, {2});
  CHECK(count_of(merge_gates(circuit, {}), Kind::h) == 2);
}

TEST_CASE("equal gates: dense circuits of few kinds and angles on few wires stay exact") {
  support::Random random(79);
  constexpr Kind kinds[] = {Kind::x, Kind::y,  Kind::z,    Kind::h,  Kind::p,     Kind::rz,
                            Kind::r, Kind::zz, Kind::swap, Kind::xx, Kind::phase, Kind::u};
  constexpr double angles[] = {0, pi / 2, pi, 2 * pi, 0.3, -0.3};
  std::size_t before = 0;
  std::size_t after = 0;
  for (int trial = 0; trial < 600; ++trial) {
    const int qubits = random.between(2, 3);
    Circuit circuit = on(static_cast<std::uint32_t>(qubits));
    const Kind some[] = {kinds[random.below(12)], kinds[random.below(12)], kinds[random.below(12)]};
    for (int g = 0; g < 24; ++g) {
      const Kind kind = some[random.below(3)];
      std::vector<Angle> its;
      for (int a = 0; a < angle_count(kind); ++a) its.push_back({angles[random.below(6)]});
      const int controls = random.between(0, qubits - target_count(kind));
      add(circuit, kind, random.distinct(controls + target_count(kind), qubits), its);
    }
    const Circuit result = merge_gates(circuit, {});
    CAPTURE(listed(circuit));
    CHECK(support::distance(circuit, result) < 1e-9);
    before += circuit.body().size();
    after += result.body().size();
  }
  CHECK(6 * after < 5 * before);
}

TEST_CASE("interactions about the same axes meet: either way round, and when others between them have gone") {
  Circuit circuit = on(2);
  add(circuit, Kind::xx, {0, 1}, {{0.3}, {0.1}, {0.5}});
  add(circuit, Kind::xx, {1, 0}, {{0.4}, {0.5}, {0.1}});
  CHECK(count_of(merge_rotations(lower(circuit, {}), {}), Kind::xx) == 1);
  CHECK(support::distance(circuit, merge_rotations(lower(circuit, {}), {})) < 1e-12);
  circuit.body().clear();
  for (const double sign : {1.0, -1.0}) {
    for (const double phi : {0.0, 0.4, 0.8}) {
      const double axis = sign > 0 ? phi : 0.8 - phi;
      add(circuit, Kind::xx, {0, 1}, {{0.3}, {axis}, {axis}});
      if (sign < 0) circuit.body().back().set_angle(0, {-0.3});
    }
  }
  CHECK(count_of(merge_rotations(lower(circuit, {}), {}), Kind::xx) == 0);
}

TEST_CASE("interactions about the same axes: with quick effort gates are lowered on the way") {
  Circuit circuit = on(2);
  add(circuit, Kind::x, {0, 1});
  PassContext context;
  context.effort = Effort::quick;
  const Circuit result = merge_rotations(circuit, context);
  for (const Operation& op : result.body()) CHECK(op.is_native());
}

TEST_CASE("interactions about the same axes and inputs that cancel leave the known part of the angle") {
  Circuit circuit = on(2);
  circuit.inputs.push_back({"t", "float", false, {}});
  const std::uint32_t t = circuit.forms.of_input(0);
  add(circuit, Kind::r, {0}, {{0.3, t}, {0}});
  add(circuit, Kind::xx, {0, 1}, {{0.4}, {0}, {0}});
  add(circuit, Kind::r, {0}, {{0.2, circuit.forms.scaled(t, -1)}, {0}});
  add(circuit, Kind::xx, {0, 1}, {{0.4}, {1}, {0}});
  const Circuit result = merge_rotations(lower(circuit, {}), {});
  CHECK(tally_of(result).r < tally_of(lower(circuit, {})).r);
  CHECK(support::distance(circuit, result, std::vector<double>{0.7}) < 1e-12);
}

TEST_CASE("lines of the source: what has merged comes from all of them") {
  const auto lines_of_xx = [](const Circuit& circuit) {
    std::vector<std::uint32_t> lines;
    for (const Operation& op : circuit.body()) {
      if (op.kind == Kind::xx || op.kind == Kind::zz) lines = circuit.origins.lines(op.origin);
    }
    return lines;
  };
  const std::vector<std::uint32_t> both = {3, 7};
  Circuit zz = on(2);
  add(zz, Kind::zz, {0, 1}, {{0.3}}, 3);
  add(zz, Kind::zz, {0, 1}, {{0.4}}, 7);
  CHECK(lines_of_xx(merge_gates(zz, {})) == both);
  CHECK(lines_of_xx(lower(merge_distant_rotations(zz, {}), {})) == both);
  CHECK(lines_of_xx(merge_rotations(lower(zz, {}), {})) == both);
  Circuit swapped = on(2);  // two controlled NOTs, the second the other way round: one interaction and a name
  add(swapped, Kind::x, {0, 1}, {}, 3);
  add(swapped, Kind::x, {1, 0}, {}, 7);
  CHECK(tally_of(mirrored_stretches(lower(swapped, {}), {})).xx == 1);
  CHECK(lines_of_xx(mirrored_stretches(lower(swapped, {}), {})) == both);
}

// ---- stretches of two wires

TEST_CASE("stretches of two wires: gathered from either side; only the mirrored ones are renamed") {
  Circuit circuit = on(3);
  // The first commutes with the one on 1 and 2, the last three do not: it joins them from the left.
  add(circuit, Kind::xx, {0, 1}, {{0.3}, {0}, {0}});
  add(circuit, Kind::xx, {1, 2}, {{0.7}, {0}, {0.3}});
  for (const double angle : {0.5, 0.9, 1.3}) {
    add(circuit, Kind::r, {0}, {{angle}, {0.2}});
    add(circuit, Kind::r, {1}, {{angle}, {1.2}});
    add(circuit, Kind::xx, {0, 1}, {{angle}, {0.4}, {0.8}});
  }
  const Circuit result = two_qubit_stretches(lower(circuit, {}), {});
  CHECK(tally_of(result).xx == 4);
  CHECK(support::distance(circuit, result) < 1e-12);
  Circuit swap = on(2);
  add(swap, Kind::swap, {0, 1});
  CHECK(two_qubit_stretches(lower(swap, {}), {}).end_wire == swap.end_wire);
  CHECK(tally_of(two_qubit_stretches(lower(swap, {}), {})).xx == 3);
  CHECK(tally_of(mirrored_stretches(lower(swap, {}), {})).xx == 0);
}

// ---- lower, and the form it goes through

TEST_CASE("pulses that only turn qubits which nobody looks at again are not written") {
  Circuit circuit = on(2);
  add_bits(circuit, "c", 1);
  add(circuit, Kind::xx, {0, 1}, {{0.4}, {0}, {0}});
  add(circuit, Kind::r, {1}, {{0.4}, {0.3}});
  measure(circuit, 0, 0);
  PassContext context;
  CHECK(tally_of(lower(circuit, context)).r == 1);
  context.promise.keep_bits_only = true;
  CHECK(tally_of(lower(circuit, context)).r == 0);
}

namespace {

/// Fewest pulses on the first wire of interactions with the others about x, y or z, from pole z to pole z: by
/// trying all poles along the axes before every interaction. A pole must be perpendicular to the interaction.
int fewest_pulses(const std::string& axes) {
  constexpr int far = 1000;
  std::array<int, 3> cost = {far, far, 0};
  for (const char axis : axes) {
    std::array<int, 3> next = {far, far, far};
    for (int pole = 0; pole < 3; ++pole) {
      if (pole == axis - 'x') continue;
      for (int old = 0; old < 3; ++old) next[pole] = std::min(next[pole], cost[old] + (old != pole ? 1 : 0));
    }
    cost = next;
  }
  return std::min({cost[2], cost[0] + 1, cost[1] + 1});
}

}  // namespace

TEST_CASE("the fewest pulses: interactions whose axes lie in a plane need none between them") {
  support::Random random(77);
  for (int trial = 0; trial < 300; ++trial) {
    const int count = random.between(1, 9);
    Circuit circuit = on(static_cast<std::uint32_t>(count) + 1);
    std::string axes;
    for (int i = 0; i < count; ++i) {
      const char axis = static_cast<char>('x' + random.below(3));
      const auto other = static_cast<std::uint32_t>(i + 1);
      axes += axis;
      // The wire turned such that x becomes the axis, and back.
      const double theta = axis == 'y' ? 0 : pi / 2;
      if (axis == 'z') add(circuit, Kind::r, {0}, {{theta}, {pi / 2}});
      add(circuit, Kind::xx, {0, other}, {{0.3}, {axis == 'y' ? pi / 2 : 0}, {0}});
      if (axis == 'z') add(circuit, Kind::r, {0}, {{-theta}, {pi / 2}});
    }
    const Circuit result = lower(circuit, {});
    CAPTURE(axes);
    CHECK(support::distance(circuit, result) < 1e-9);
    int pulses = 0;
    for (const Operation& op : result.body()) pulses += op.kind == Kind::r && op.operand[0] == 0;
    CHECK(pulses == fewest_pulses(axes));
  }
}

TEST_CASE("the fewest pulses: a rotation by an input about the axis of the frame is none") {
  Circuit circuit = on(2);
  circuit.inputs.push_back({"t", "float", false, {}});
  const Angle t{0, circuit.forms.of_input(0)};
  add(circuit, Kind::xx, {0, 1}, {{0.3}, {0}, {0}});
  add(circuit, Kind::rz, {0}, {t});
  add(circuit, Kind::xx, {0, 1}, {{0.4}, {0}, {0}});
  const Circuit result = lower(circuit, {});
  CHECK(tally_of(result).r == 0);
  CHECK(support::distance(circuit, result, std::vector<double>{0.7}) < 1e-12);
}

// ---- competition

TEST_CASE("approximation is reported, and spent once however long the search goes on") {
  support::Random random(78);
  Circuit circuit = on(4);
  for (int i = 0; i < 40; ++i) {
    add(circuit, Kind::xx, random.distinct(2, 4),
        {{i % 4 == 0 ? 1.0 : random.real(1e-3, 3e-3)}, {random.real(-3, 3)}, {random.real(-3, 3)}});
  }
  const support::Matrix wanted = support::unitary(circuit);
  for (const Effort effort : {Effort::steady, Effort::deep}) {
    PassContext context;
    context.effort = effort;
    context.tolerance = 1e-5;
    context.deadline = std::chrono::steady_clock::now() + std::chrono::milliseconds(1500);
    Trace trace;
    const Circuit result = optimize(circuit, context, &trace);
    CHECK(tally_of(result).xx < 40);
    const double lost = 1 - std::norm((wanted.adjoint() * support::unitary(result)).trace()) / (16.0 * 16.0);
    CHECK(lost <= context.tolerance);
    for (const TraceResult& row : trace.results) {
      CHECK(row.infidelity <= context.tolerance);
      if (!row.is_winner) continue;
      CHECK(row.infidelity > 0);
      CHECK(lost <= row.infidelity + 1e-12);
    }
  }
}

TEST_CASE("the whole goes round until no pass of its rounds gains any more") {
  support::Random random(85);
  for (int trial = 0; trial < 60; ++trial) {
    const auto family = trial % 2 ? support::Family::native : support::Family::clifford_t;
    const Circuit source = support::random_circuit(random, {random.between(3, 4), 40, 1, family});
    Trace trace;
    const Circuit result = optimize(source, {}, &trace);
    if (trace.results.front().is_winner) continue;  // the quick order does not go round
    const double error = tally_of(result).error;
    CAPTURE(listed(source));
    for (const auto pass : {merge_rotations, two_qubit_stretches, mirrored_stretches}) {
      CHECK(tally_of(pass(result, {})).error >= error * (1 - 1e-6));
    }
  }
}

// ---- small blocks

TEST_CASE("small blocks: wires keep their names in arms and where the program may end early") {
  // A swap written out and one more interaction: renaming leaves that one.
  const auto swapped = [](Circuit& circuit) {
    return Block{circuit.make(Kind::swap, {0, 1}), circuit.make(Kind::xx, {1, 2}, {{0.7}, {0}, {0}})};
  };
  const auto searched = [](const Circuit& circuit) {
    PassContext context;
    context.effort = Effort::deep;
    context.deadline = std::chrono::steady_clock::now() + std::chrono::minutes(1);
    return search_blocks(lower(circuit, context), context);
  };
  Circuit free = on(3);
  free.body() = swapped(free);
  const Circuit renamed = searched(free);
  CHECK(tally_of(renamed).xx == 1);
  CHECK(support::distance(free, renamed) < 1e-9);

  Circuit early = on(3);
  add_bits(early, "c", 1);
  measure(early, 0, 0);
  Block arm = {early.make(Kind::z, {0})};
  end_program(early, arm);
  branch_on_first_bit(early, arm);
  for (const Operation& op : swapped(early)) early.body().push_back(op);
  const Circuit kept = searched(early);
  CHECK(kept.end_wire == early.end_wire);
  CHECK(outcome_distance(early, kept, {1, 2}) < 1e-9);

  Circuit inner = on(3);
  add_bits(inner, "c", 1);
  measure(inner, 0, 0);
  branch_on_first_bit(inner, swapped(inner));
  const Circuit in_arm = searched(inner);
  CHECK(in_arm.end_wire == inner.end_wire);
  CHECK(outcome_distance(inner, in_arm, {0, 1, 2}) < 1e-9);
}

namespace {

Circuit searched(const Circuit& circuit, PassContext context = {}) {
  context.effort = Effort::deep;
  context.deadline = std::chrono::steady_clock::now() + std::chrono::minutes(1);
  return search_blocks(lower(circuit, context), context);
}

}  // namespace

TEST_CASE("small blocks end at wires that others have used in between") {
  for (const bool is_symbolic : {false, true}) {
    // The first and the last are inverse, but for the one between them.
    Circuit circuit = on(4);
    circuit.inputs.push_back({"t", "float", false, {}});
    add(circuit, Kind::xx, {0, 1}, {{0.5}, {0}, {0}});
    add(circuit, Kind::xx, {1, 2}, {{0.4}, {0}, {0}});
    add(circuit, Kind::xx, {0, is_symbolic ? 1u : 3u},
        {{0.7, is_symbolic ? circuit.forms.of_input(0) : 0}, {pi / 2}, {0}});
    add(circuit, Kind::xx, {1, 2}, {{0.3}, {0}, {0.1}});
    add(circuit, Kind::xx, {0, 1}, {{0.5}, {pi}, {0}});
    CHECK(support::distance(circuit, searched(circuit), std::vector<double>{0.3}) < 1e-9);
  }
}

TEST_CASE("small blocks: outputs may move on by one, and only untouched wires hold 0") {
  // Two iSWAPs are two CZs and a cyclic exchange of the three wires.
  Circuit moved = on(3);
  for (const auto& [a, b] : {std::pair{0u, 1u}, std::pair{1u, 2u}}) {
    add(moved, Kind::xx, {a, b}, {{pi / 2}, {0}, {0}});
    add(moved, Kind::xx, {a, b}, {{pi / 2}, {pi / 2}, {pi / 2}});
  }
  const Circuit result = searched(moved);
  CHECK(tally_of(result).xx == 2);
  CHECK(support::distance(moved, result) < 1e-9);

  support::Random random(80);
  Circuit used = on(4);
  for (const Wires& pair :
       {Wires{0, 3}, Wires{1, 3}, Wires{2, 3}, Wires{0, 1}, Wires{1, 2}, Wires{0, 2}, Wires{0, 1}}) {
    add(used, Kind::xx, pair, {{random.real(0.3, 1.2)}, {random.real(-3, 3)}, {random.real(-3, 3)}});
    for (const std::uint32_t q : pair) add(used, Kind::r, {q}, {{random.real(0.3, 2)}, {random.real(-3, 3)}});
  }
  CHECK(support::distance_from_zero(used, searched(used, zero_start())) < 1e-9);
}

// ---- the start

TEST_CASE("a known start with two interactions on one pair takes one") {
  Circuit circuit = on(2);
  add(circuit, Kind::xx, {0, 1}, {{0.4}, {0.3}, {0.2}});
  add(circuit, Kind::r, {0}, {{0.7}, {0.2}});
  add(circuit, Kind::xx, {0, 1}, {{0.9}, {1.3}, {0.2}});
  const Circuit result = trim_start(lower(circuit, {}), zero_start());
  CHECK(tally_of(result).xx == 1);
  CHECK(support::distance_from_zero(circuit, result) < 1e-12);
}

// ---- the end

TEST_CASE("interactions right before resets of both their wires go") {
  Circuit circuit = on(3);
  add(circuit, Kind::h, {2});
  add(circuit, Kind::xx, {0, 1}, {{0.4}, {0.3}, {0.2}});
  add(circuit, Kind::reset, {0});
  add(circuit, Kind::reset, {1});
  CHECK(count_of(trim_end(lower(circuit, {}), {}), Kind::xx) == 0);
}

TEST_CASE("swaps of physical qubits are work") {
  Circuit circuit;
  add_register(circuit, "$0", 1, true);
  add_register(circuit, "$1", 1, true);
  add(circuit, Kind::swap, {0, 1});
  CHECK(count_of(rename_swaps(circuit, {}), Kind::swap) == 1);
  CHECK(tally_of(optimize(circuit, {})).xx == 3);
}

TEST_CASE("swaps of a program's body are names from there on, in arms, too") {
  Circuit circuit = on(3);
  add_bits(circuit, "c", 3);
  add(circuit, Kind::r, {0}, {{0.4}, {0}});
  add(circuit, Kind::swap, {0, 1});
  add(circuit, Kind::swap, {1, 2});
  measure(circuit, 0, 0);
  branch_on_first_bit(circuit, {circuit.make(Kind::r, {1}, {{0.9}, {0.2}}), circuit.make(Kind::x, {1, 2})});
  add(circuit, Kind::r, {2}, {{0.3}, {0.1}});
  const Circuit result = rename_swaps(circuit, {});
  check_invariants(result);
  CHECK(count_of(result, Kind::swap) == 0);
  CHECK(outcome_distance(circuit, result, {0, 1, 2}) < 1e-12);
}
