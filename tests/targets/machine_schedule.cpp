// Times and totals: small programs by hand, random ones by an independent recount of every rule.
#include <doctest/doctest.h>
#include <fmt/format.h>

#include <algorithm>
#include <cmath>
#include <map>
#include <set>

#include "support/random_circuits.h"
#include "targets/dependence.h"
#include "targets/schedule.h"

using namespace isinglass;
using support::Random;

namespace {

constexpr Promise whole{true, false};
constexpr Promise fragment{false, false};

/// A machine with round figures for counting by hand.
Target simple(std::uint32_t ions) {
  Target target = typical(ions);
  target.crosstalk.value = 0;
  for (IonFigures& ion : target.ion) {
    ion.prepare_us = 10;
    ion.pulse_us = 5;
    ion.measure_us = 100;
    ion.reset_us = 20;
    ion.t2_us.value = 1e6;
  }
  for (PairFigures& pair : target.pairs) pair.takes_us = 200;
  target.feed_forward_us = 50;
  return target;
}

Placed as_it_is(const Circuit& circuit, const Target& target) {
  Placed placed;
  placed.circuit = circuit;
  placed.circuit.wires = target.ions;
  placed.in_use.assign(target.ions, false);
  for (std::uint32_t w = 0; w < circuit.wires; ++w) placed.in_use[w] = true;
  for (std::uint32_t q = 0; q < circuit.source_qubits; ++q) placed.start.push_back(q);
  return placed;
}

std::vector<TimedOperation> entries(const TimedBlock& block, TimedKind kind) {
  std::vector<TimedOperation> found;
  for (const TimedOperation& entry : block.operations) {
    if (entry.kind == kind) found.push_back(entry);
  }
  return found;
}

Operation r(Circuit& c, std::uint32_t ion) {
  return c.make(Kind::r, {ion}, {{pi / 2}, {0}});
}
Operation xx(Circuit& c, std::uint32_t a, std::uint32_t b, double theta = pi / 2) {
  return c.make(Kind::xx, {a, b}, {{theta}, {0}, {0}});
}
Operation measure(Circuit& c, std::uint32_t ion, std::uint32_t bit) {
  Operation op = c.make(Kind::measure, {ion});
  op.payload = bit;
  return op;
}

}  // namespace

TEST_CASE("a Bell program by hand") {
  Circuit c;
  add_register(c, "q", 2);
  add_bits(c, "c", 2);
  c.body() = {r(c, 0), xx(c, 0, 1), r(c, 1), measure(c, 0, 0), measure(c, 1, 1)};
  const Target target = simple(2);
  const Timed timed = schedule(as_it_is(c, target), target, whole);
  // prepare 0-10, r 10-15, xx 15-215, r on ion 1 215-220, both readouts 220-320; ion 0 waits 215-220.
  CHECK(timed.totals.duration == doctest::Approx(320));
  CHECK(timed.totals.xx == 1);
  CHECK(timed.totals.r == 2);
  CHECK(timed.totals.xx_units == doctest::Approx(1));
  CHECK(timed.totals.xx_depth == 1);
  CHECK(timed.totals.pairs == 1);
  const auto waits = entries(timed.blocks[0], TimedKind::wait);
  REQUIRE(waits.size() == 1);
  CHECK(waits[0].ion[0] == 0);
  CHECK(waits[0].at == doctest::Approx(215));
  CHECK(waits[0].takes == doctest::Approx(5));
  for (const auto& reading : entries(timed.blocks[0], TimedKind::measure))
    CHECK(reading.at == doctest::Approx(220));
  const double idle = 0.5 * (1 - std::exp(-5 / 1e6));
  const double success =
      std::pow(1 - 5e-4, 2) * std::pow(1 - 2e-4, 2) * (1 - 5e-3) * (1 - idle) * std::pow(1 - 3e-3, 2);
  CHECK(timed.totals.success == doctest::Approx(success).epsilon(1e-12));
  CHECK(timed.totals.error == doctest::Approx(1 - success).epsilon(1e-10));
}

TEST_CASE("one interaction at a time, or two") {
  Circuit c;
  add_register(c, "q", 4);
  c.body() = {xx(c, 0, 1), xx(c, 2, 3), xx(c, 1, 2)};
  Target target = simple(4);
  CHECK(schedule(as_it_is(c, target), target, fragment).totals.duration == doctest::Approx(600));
  target.interactions_at_once = 2;
  CHECK(schedule(as_it_is(c, target), target, fragment).totals.duration == doctest::Approx(400));
  CHECK(schedule(as_it_is(c, target), target, fragment).totals.xx_depth == 2);
  target.beams = 3;  // two interactions need four
  CHECK(schedule(as_it_is(c, target), target, fragment).totals.duration == doctest::Approx(600));
}

TEST_CASE("beams limit pulses at once") {
  Circuit c;
  add_register(c, "q", 6);
  for (std::uint32_t ion = 0; ion < 6; ++ion) c.body().push_back(r(c, ion));
  Target target = simple(6);
  CHECK(schedule(as_it_is(c, target), target, fragment).totals.duration == doctest::Approx(5));
  target.beams = 2;
  CHECK(schedule(as_it_is(c, target), target, fragment).totals.duration == doctest::Approx(15));
}

TEST_CASE("the interaction with the longest way to go is first") {
  Circuit c;
  add_register(c, "q", 5);
  // In program order 0-1 would be first; but 2-3 has pulses behind it that hide beside it.
  c.body() = {xx(c, 0, 1), xx(c, 2, 3), r(c, 3), c.make(Kind::delay, {3}, {{150.0}})};
  const Target target = simple(5);
  CHECK(schedule(as_it_is(c, target), target, fragment).totals.duration == doctest::Approx(400));
}

TEST_CASE("ions wait in |0> as long as they can") {
  Circuit c;
  add_register(c, "q", 3);
  add_bits(c, "c", 3);
  c.body() = {r(c, 2), xx(c, 0, 1), xx(c, 1, 2), measure(c, 0, 0), measure(c, 1, 1), measure(c, 2, 2)};
  const Target target = simple(3);
  const Timed timed = schedule(as_it_is(c, target), target, whole);
  // The pulse on ion 2 ends where its interaction begins, at 210.
  CHECK(entries(timed.blocks[0], TimedKind::r)[0].at == doctest::Approx(205));
  // In a fragment the input state waits either way: the pulse is at the start.
  CHECK(entries(schedule(as_it_is(c, target), target, fragment).blocks[0], TimedKind::r)[0].at == 0);
}

TEST_CASE("idle errors count what holds a state, to the end if it is kept") {
  Circuit c;
  add_register(c, "q", 3);
  c.body() = {xx(c, 0, 1)};
  const Target target = simple(3);
  const double wait = target.ion[0].idle_error(200);
  const auto idle = [&](const Promise& promise) {
    return schedule(as_it_is(c, target), target, promise)
        .totals.error_by_source[static_cast<int>(Source::idle)];
  };
  CHECK(idle(fragment) == doctest::Approx(wait).epsilon(0.01));  // qubit 2 for 200 us
  CHECK(idle(whole) == 0);                                       // it is in |0>
  c.body().push_back(r(c, 2));
  c.body().push_back(xx(c, 1, 2));
  CHECK(idle(whole) == doctest::Approx(wait).epsilon(0.01));  // qubit 0 is kept
  CHECK(idle({true, true}) == 0);                             // bits are all that matters
}

TEST_CASE("crosstalk by hand") {
  Target target = simple(5);
  target.crosstalk.value = 0.02;
  Circuit c;
  add_register(c, "q", 2);
  c.body() = {r(c, 1)};
  // Ion 0 holds a qubit, ion 2 nothing: one neighbour, turned by 0.02 * pi/2.
  const double leak_r = std::pow(std::sin(0.02 * pi / 4), 2);
  CHECK(schedule(as_it_is(c, target), target, fragment).totals.error_by_source[4] ==
        doctest::Approx(leak_r).epsilon(1e-3));
  // Light on 0 and 1 leaks to 2 alone; on 1 and 3 to 0, 2 and 2, 4.
  c.body() = {xx(c, 0, 1)};
  CHECK(schedule(as_it_is(c, target), target, fragment).blocks[0].operations[0].crosstalk ==
        doctest::Approx(leak_r).epsilon(1e-9));
  add_register(c, "p", 2);
  c.body() = {xx(c, 1, 3)};
  const Timed far = schedule(as_it_is(c, target), target, fragment);
  CHECK(entries(far.blocks[0], TimedKind::xx)[0].crosstalk == doctest::Approx(4 * leak_r).epsilon(1e-3));
}

TEST_CASE("feed-forward: the branch waits for its bit and for the classical side") {
  Circuit c;
  add_register(c, "q", 3);
  add_bits(c, "c", 1);
  c.blocks.resize(2);
  c.blocks[1] = {r(c, 1), xx(c, 1, 2)};
  Branch branch;
  branch.condition.kind = Expression::Kind::index;
  branch.condition.arguments.resize(2);
  branch.condition.arguments[0].kind = Expression::Kind::variable;
  branch.condition.arguments[1].text = std::string(1, '0');
  branch.arms = {{{}, 1}};
  c.branches = {branch};
  c.body() = {measure(c, 0, 0), c.make(Kind::branch, {1, 2}), r(c, 2)};
  const Target target = simple(3);
  const Timed timed = schedule(as_it_is(c, target), target, fragment);
  // measure 0-100, decide 100 with 50 of delay and an arm of 205, then r 355-360.
  const auto decide = entries(timed.blocks[0], TimedKind::decide);
  REQUIRE(decide.size() == 1);
  CHECK(decide[0].at == doctest::Approx(100));
  CHECK(decide[0].takes == doctest::Approx(255));
  CHECK(timed.totals.duration == doctest::Approx(360));
  CHECK(timed.totals.xx == 1);
  CHECK(timed.totals.r == 2);
  CHECK(entries(timed.blocks[1], TimedKind::xx)[0].at == doctest::Approx(5));
  CHECK(decide[0].error == doctest::Approx(2e-4 + 5e-3).epsilon(0.01));
}

TEST_CASE("light is off while ions are read, unless the machine can do both") {
  Circuit c;
  add_register(c, "q", 3);
  add_bits(c, "c", 2);
  c.body() = {measure(c, 0, 0), xx(c, 1, 2), measure(c, 1, 1)};
  Target target = simple(3);
  CHECK(schedule(as_it_is(c, target), target, fragment).totals.duration == doctest::Approx(300));
  target.reads_alone = false;
  target.ion[0].measure_us = 150;
  CHECK(schedule(as_it_is(c, target), target, fragment).totals.duration == doctest::Approx(300));
  // Alone, both readouts come together at the end.
  target.reads_alone = true;
  CHECK(schedule(as_it_is(c, target), target, fragment).totals.duration == doctest::Approx(350));
}

TEST_CASE("the interval follows from stated deviations") {
  Circuit c;
  add_register(c, "q", 2);
  c.body() = {xx(c, 0, 1), xx(c, 0, 1, pi / 4)};
  Target target = simple(2);
  Timed timed = schedule(as_it_is(c, target), target, fragment);
  CHECK(timed.totals.success_low == doctest::Approx(timed.totals.success).epsilon(1e-15));
  target.pair(0, 1).slope = {4e-3, 1e-3, 1};
  timed = schedule(as_it_is(c, target), target, fragment);
  // d loss = 1e-3 * 1 / (1 - 5e-3) + 1e-3 * 0.5 / (1 - 3e-3): the two share one statement and add up.
  const double spread = 1.96 * (1e-3 / (1 - 5e-3) + 0.5e-3 / (1 - 3e-3));
  CHECK(timed.totals.success_low == doctest::Approx(timed.totals.success * std::exp(-spread)).epsilon(1e-12));
  CHECK(timed.totals.success_high == doctest::Approx(timed.totals.success * std::exp(spread)).epsilon(1e-12));
  // A second, independent statement adds in squares.
  target.pair(0, 1).floor = {1e-3, 1e-3, 2};
  timed = schedule(as_it_is(c, target), target, fragment);
  const double floor = 1.96 * (1e-3 / (1 - 5e-3) + 1e-3 / (1 - 3e-3));
  CHECK(timed.totals.success_low ==
        doctest::Approx(timed.totals.success * std::exp(-std::hypot(spread, floor))).epsilon(1e-12));
}

TEST_CASE("coherence time and crosstalk that are not known well widen the interval") {
  Circuit c;
  add_register(c, "q", 3);
  c.body() = {xx(c, 0, 1), c.make(Kind::delay, {0}), xx(c, 0, 1)};
  c.body()[1].value[0] = 3000;
  Target target = simple(3);
  for (IonFigures& ion : target.ion) ion.t2_us.value = 5e4;
  target.crosstalk.value = 0.05;
  const auto log_success = [&](double t2_us, double crosstalk) {
    Target other = target;
    for (IonFigures& ion : other.ion) ion.t2_us.value = t2_us;
    other.crosstalk.value = crosstalk;
    return std::log(schedule(as_it_is(c, other), other, fragment).totals.success);
  };
  // One deviation away, by difference.
  const double t2 = (log_success(5e4 + 1, 0.05) - log_success(5e4 - 1, 0.05)) / 2 * 500;
  const double leak = (log_success(5e4, 0.05 + 1e-6) - log_success(5e4, 0.05 - 1e-6)) / 2e-6 * 0.004;
  CHECK(t2 > 1e-4);
  CHECK(leak < -1e-5);
  for (IonFigures& ion : target.ion) ion.t2_us = {5e4, 500, 1};
  target.crosstalk = {0.05, 0.004, 2};
  const Totals totals = schedule(as_it_is(c, target), target, fragment).totals;
  CHECK(std::log(totals.success_high / totals.success) ==
        doctest::Approx(1.96 * std::hypot(t2, leak)).epsilon(1e-4));
}

namespace {

Circuit random_program(Random& random, int qubits, int gates) {
  Circuit c = support::random_measured_circuit(random, {qubits, gates, 0, support::Family::native}, qubits);
  // Some barriers and delays in between.
  Block body;
  for (const Operation& op : c.body()) {
    if (random.chance(0.05))
      body.push_back(c.make(Kind::barrier, random.distinct(std::min(qubits, 3), qubits)));
    if (random.chance(0.05)) {
      Operation delay = c.make(Kind::delay, random.distinct(1, qubits));
      delay.value[0] = random.real(0, 50);
      body.push_back(delay);
    }
    body.push_back(op);
  }
  c.body() = body;
  return c;
}

bool overlap(const TimedOperation& a, const TimedOperation& b) {
  return a.at < b.at + b.takes - 1e-9 && b.at < a.at + a.takes - 1e-9;
}

}  // namespace

TEST_CASE("random programs keep every rule of the machine") {
  Random random(5);
  for (int round = 0; round < 200; ++round) {
    const int qubits = random.between(2, 6);
    const Circuit c = random_program(random, qubits, 40);
    Target target = simple(static_cast<std::uint32_t>(qubits));
    for (IonFigures& ion : target.ion) ion.pulse_us = random.between(2, 9);
    for (PairFigures& pair : target.pairs) pair.takes_us = random.between(50, 300);
    target.beams = static_cast<std::uint32_t>(random.between(2, 5));
    target.interactions_at_once = static_cast<std::uint32_t>(random.between(1, 2));
    target.reads_alone = random.chance(0.5);
    target.crosstalk.value = 0.01;
    const Promise promise{random.chance(0.5), random.chance(0.3)};
    const Placed placed = as_it_is(c, target);
    const Timed timed = schedule(placed, target, promise);
    const auto& list = timed.blocks[0].operations;

    std::vector<double> at(c.body().size(), -1);
    std::vector<double> end(c.body().size(), -1);
    double success = 1;
    double last = 0;
    double previous = 0;
    for (const TimedOperation& entry : list) {
      CHECK(entry.at >= previous);
      previous = entry.at;
      success *= 1 - entry.error;
      last = std::max(last, entry.at + entry.takes);
      if (entry.operation == no_operation) continue;
      CHECK(at[entry.operation] == -1);
      at[entry.operation] = entry.at;
      end[entry.operation] = entry.at + entry.takes;
    }
    CHECK(std::count(at.begin(), at.end(), -1) == 0);  // everything happens, once
    CHECK(last == doctest::Approx(timed.totals.duration));
    CHECK(success == doctest::Approx(timed.totals.success).epsilon(1e-9));
    double shares = 0;
    for (const double share : timed.totals.error_by_source) shares += share;
    CHECK(shares == doctest::Approx(timed.totals.error).epsilon(1e-12));

    // Order on shared wires and bits.
    std::map<std::uint32_t, std::size_t> last_on;
    for (std::size_t i = 0; i < c.body().size(); ++i) {
      std::vector<std::uint32_t> things(c.operands(c.body()[i]).begin(), c.operands(c.body()[i]).end());
      if (c.body()[i].kind == Kind::measure && c.body()[i].payload != no_bit) {
        things.push_back(1000 + c.body()[i].payload);
      }
      for (const std::uint32_t thing : things) {
        if (last_on.contains(thing)) CHECK(at[i] >= end[last_on[thing]] - 1e-9);
        last_on[thing] = i;
      }
    }

    // Limits: what overlaps the beginning of each operation.
    const auto is_light = [](const TimedOperation& e) {
      return e.kind == TimedKind::r || e.kind == TimedKind::xx;
    };
    const auto is_reading = [](const TimedOperation& e) {
      return e.kind == TimedKind::measure || e.kind == TimedKind::reset;
    };
    for (const TimedOperation& a : list) {
      std::uint32_t beams = 0;
      std::uint32_t interactions = 0;
      for (const TimedOperation& b : list) {
        if (b.at <= a.at + 1e-9 && a.at < b.at + b.takes - 1e-9) {
          beams += b.kind == TimedKind::xx ? 2 : b.kind == TimedKind::r ? 1 : 0;
          interactions += b.kind == TimedKind::xx ? 1 : 0;
        }
        if (target.reads_alone && is_light(a) && is_reading(b)) CHECK(!overlap(a, b));
      }
      CHECK(beams <= target.beams);
      CHECK(interactions <= target.interactions_at_once);
    }
  }
}

TEST_CASE("list scheduling is never worse than one after another") {
  Random random(6);
  for (int round = 0; round < 50; ++round) {
    const Circuit c = random_program(random, 5, 30);
    const Target target = simple(5);
    const Timed timed = schedule(as_it_is(c, target), target, fragment);
    double serial = 0;
    double interactions = 0;
    for (const TimedOperation& e : timed.blocks[0].operations) {
      if (e.operation != no_operation) serial += e.takes;
      if (e.kind == TimedKind::xx) interactions += e.takes;
    }
    CHECK(timed.totals.duration <= serial + 1e-9);
    CHECK(timed.totals.duration >= interactions - 1e-9);
  }
}

TEST_CASE("a statement that nobody can see through is a fence") {
  Circuit c;
  add_register(c, "q", 2);
  ClassicalStatement end;
  end.kind = ClassicalStatement::Kind::end_program;
  c.statements = {end};
  Operation stop;
  stop.kind = Kind::classical;
  c.body() = {r(c, 0), stop, r(c, 1)};
  const Dependences graph(c, c.body());
  CHECK(graph.predecessors[1] >= 1);
  CHECK(graph.predecessors[2] >= 1);
}
