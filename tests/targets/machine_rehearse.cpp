// The rehearsal: against probabilities by hand, the two ways against each other, and the estimate against
// both.
#include <doctest/doctest.h>
#include <fmt/format.h>

#include <cmath>
#include <map>

#include "circuit/message.h"
#include "support/random_circuits.h"
#include "targets/rehearse.h"

using namespace isinglass;
using support::Random;

namespace {

constexpr Promise whole{true, false};
constexpr Promise fragment{false, false};

Rehearsal rehearsed(const Circuit& c, const Target& target, const Promise& promise,
                    RehearseOptions options = {}) {
  const Placed placed = place(c, target);
  return rehearse(placed, schedule(placed, target, promise), target, promise, options);
}

RehearseOptions by_shots(std::size_t shots, std::uint64_t seed = 1) {
  RehearseOptions options;
  options.shots = shots;
  options.seed = seed;
  options.most_density_wires = 0;
  return options;
}

Operation measure(Circuit& c, std::uint32_t wire, std::uint32_t bit) {
  Operation op = c.make(Kind::measure, {wire});
  op.payload = bit;
  return op;
}

/// Random gates, then all qubits are measured.
Circuit measured(Random& random, int qubits, int gates) {
  Circuit c = support::random_circuit(random, {qubits, gates, 0, support::Family::native});
  add_bits(c, "c", static_cast<std::uint32_t>(qubits));
  for (std::uint32_t q = 0; q < static_cast<std::uint32_t>(qubits); ++q) c.body().push_back(measure(c, q, q));
  return c;
}

std::map<std::string, RehearsedOutcome> by_bits(const Rehearsal& result) {
  std::map<std::string, RehearsedOutcome> found;
  for (const auto& outcome : result.outcomes) found[outcome.bits] = outcome;
  return found;
}

Expression bit_is_one(std::uint32_t variable, int bit) {
  Expression name;
  name.kind = Expression::Kind::variable;
  name.variable = variable;
  Expression e;
  e.kind = Expression::Kind::index;
  e.arguments = {name, {}};
  e.arguments[1].text = std::to_string(bit);
  return e;
}

/// Teleports cos(a/2)|0> - i sin(a/2)|1> from qubit 0 to qubit 2, then measures it.
Circuit teleportation(double a) {
  Circuit c;
  add_register(c, "q", 3);
  add_bits(c, "m", 2);
  add_bits(c, "out", 1, true);
  const auto r = [&](std::uint32_t q, double t, double f) {
    c.body().push_back(c.make(Kind::r, {q}, {{t}, {f}}));
  };
  // cx(a, b) up to phase: ry(-pi/2) a, xx(pi/2), rx(pi/2) a (negative), ry(pi/2) a, rx(-pi/2) b.
  const auto cx = [&](std::uint32_t x, std::uint32_t y) {
    r(x, pi / 2, pi / 2);
    c.body().push_back(c.make(Kind::xx, {x, y}, {{pi / 2}, {0}, {0}}));
    r(x, -pi / 2, 0);
    r(y, -pi / 2, 0);
    r(x, -pi / 2, pi / 2);
  };
  const auto h = [&](std::uint32_t q) {
    r(q, pi / 2, pi / 2);
    r(q, pi, 0);
  };
  r(0, a, 0);
  h(1);
  cx(1, 2);
  cx(0, 1);
  h(0);
  c.body().push_back(measure(c, 0, 0));
  c.body().push_back(measure(c, 1, 1));
  c.blocks.resize(3);
  c.blocks[1] = {c.make(Kind::r, {2}, {{pi}, {0}})};
  c.blocks[2] = {c.make(Kind::rz, {2}, {{pi}})};
  for (const auto& [bit, block] : {std::pair(1, 1u), std::pair(0, 2u)}) {
    Operation op = c.make(Kind::branch, {2});
    op.payload = static_cast<std::uint32_t>(c.branches.size());
    c.branches.push_back({Branch::Kind::if_else, bit_is_one(0, bit), 0, {{{}, block}}});
    c.body().push_back(op);
  }
  c.body().push_back(measure(c, 2, 2));
  return c;
}

}  // namespace

TEST_CASE("one pulse and one readout by hand") {
  Circuit c;
  add_register(c, "q", 1);
  add_bits(c, "c", 1);
  c.body() = {c.make(Kind::r, {0}, {{pi / 3}, {0.4}}), measure(c, 0, 0)};
  Target target = typical(1);
  target.ion[0].prepare_error.value = 0.02;
  target.ion[0].pulse_error.value = 0.03;
  target.ion[0].measure_error.value = 0.05;
  const auto outcomes = by_bits(rehearsed(c, target, whole));
  // sin^2(pi/6) = 1/4. Each Pauli with 1 %: X and Y exchange 0 and 1.
  const auto flipped = [](double one, double p) { return one * (1 - p) + (1 - one) * p; };
  CHECK(outcomes.at("c=1").without_noise == doctest::Approx(0.25));
  CHECK(outcomes.at("c=1").with_noise == doctest::Approx(flipped(flipped(flipped(0.25, 0.02), 0.02), 0.05)));
}

TEST_CASE("waiting dephases with T2") {
  // Ramsey: pi/2, wait, pi/2 back: 0 with (1 + exp(-t/T2)) / 2.
  Circuit c;
  add_register(c, "q", 1);
  add_bits(c, "c", 1);
  Operation delay = c.make(Kind::delay, {0});
  delay.value[0] = 700;
  c.body() = {c.make(Kind::r, {0}, {{pi / 2}, {0}}), delay, c.make(Kind::r, {0}, {{pi / 2}, {pi}}),
              measure(c, 0, 0)};
  Target target = typical(1);
  target.ion[0].t2_us.value = 1000;
  for (Figure* figure :
       {&target.ion[0].prepare_error, &target.ion[0].pulse_error, &target.ion[0].measure_error}) {
    figure->value = 0;
  }
  CHECK(by_bits(rehearsed(c, target, whole)).at("c=0").with_noise ==
        doctest::Approx((1 + std::exp(-0.7)) / 2));
}

TEST_CASE("an interaction's errors by hand") {
  // Of the 15 Paulis, 12 flip at least one of two ions in |00>; 4 each flip the first alone, the second,
  // both.
  Circuit c;
  add_register(c, "q", 2);
  add_bits(c, "c", 2);
  c.body() = {c.make(Kind::xx, {0, 1}, {{pi / 2}, {0}, {0}}), c.make(Kind::xx, {0, 1}, {{-pi / 2}, {0}, {0}}),
              measure(c, 0, 0), measure(c, 1, 1)};
  Target target = typical(2);
  target.crosstalk.value = 0;
  for (IonFigures& ion : target.ion)
    ion.prepare_error.value = ion.measure_error.value = 0, ion.t2_us.value = 1e15;
  target.pair(0, 1).floor.value = 0;
  target.pair(0, 1).slope.value = 0.15;
  const auto outcomes = by_bits(rehearsed(c, target, whole));
  // Twice a channel (1 - 16p/15) rho + 16p/15 * mixed: what is left of |00> is (1 - 0.16)^2.
  const double kept = 0.84 * 0.84;
  CHECK(outcomes.at("c=00").with_noise == doctest::Approx(kept + (1 - kept) / 4));
  CHECK(outcomes.at("c=11").with_noise == doctest::Approx((1 - kept) / 4));
}

TEST_CASE("shots and density matrices agree") {
  Random random(21);
  for (int round = 0; round < 5; ++round) {
    const Circuit c = measured(random, 3, 25);
    Target target = typical(4);
    target.crosstalk.value = 0.1;
    for (PairFigures& pair : target.pairs) pair.slope.value = 0.03;
    for (IonFigures& ion : target.ion) ion.t2_us.value = 2e4, ion.measure_error.value = 0.03;
    const Rehearsal exact = rehearsed(c, target, whole);
    const Rehearsal shots = rehearsed(c, target, whole, by_shots(20000, random.bits()));
    CHECK(exact.method == Rehearsal::Method::density_matrix);
    CHECK(shots.method == Rehearsal::Method::trajectories);
    const auto sampled = by_bits(shots);
    for (const auto& [bits, outcome] : by_bits(exact)) {
      const double noise = 5 * std::sqrt(0.25 / 20000) + 1e-9;  // five standard deviations at most
      const auto found = sampled.find(bits);
      const RehearsedOutcome seen = found == sampled.end() ? RehearsedOutcome{} : found->second;
      CHECK(std::abs(seen.with_noise - outcome.with_noise) < noise);
      CHECK(std::abs(seen.without_noise - outcome.without_noise) < noise);
    }
    CHECK(exact.distance > 0.01);
  }
}

TEST_CASE("the estimate is within 10 % of the rehearsal: 30 small circuits, exactly") {
  // Fragments of 2 to 4 qubits on every input: 1 - entanglement fidelity against the estimated error.
  Random random(22);
  double worst = 0;
  for (int round = 0; round < 30; ++round) {
    const int qubits = 2 + round % 3;
    const Circuit c =
        support::random_circuit(random, {qubits, random.between(4, 16), 0, support::Family::native});
    Target target = typical(static_cast<std::uint32_t>(qubits + round % 2));
    for (PairFigures& pair : target.pairs) pair.slope.value = random.real(1e-3, 8e-3);
    for (IonFigures& ion : target.ion) ion.t2_us.value = random.real(2e5, 2e6);
    target.crosstalk.value = random.real(0, 0.02);
    const Rehearsal result = rehearsed(c, target, fragment);
    REQUIRE(result.method == Rehearsal::Method::density_matrix);
    const double error = 1 - result.estimate;
    CHECK(std::abs((1 - result.fidelity) - error) <= 0.1 * error);
    worst = std::max(worst, std::abs((1 - result.fidelity) - error) / error);
  }
  MESSAGE("largest relative deviation of the estimated error: ", worst);
}

TEST_CASE("the estimate is within 10 % of the shots: whole programs, with feed-forward") {
  Random random(23);
  for (int round = 0; round < 10; ++round) {
    const Circuit c = round == 0 ? teleportation(0.7) : measured(random, 2 + round % 3, 20);
    Target target = typical(5);
    for (PairFigures& pair : target.pairs) pair.slope.value = random.real(1e-3, 2e-2);
    const Rehearsal result = rehearsed(c, target, whole, by_shots(20000, random.bits()));
    const double error = 1 - result.estimate;
    // Of a branch the worst arm is estimated, so that the estimate of the first may lie a little low.
    CHECK(std::abs((1 - result.no_error) - error) <= 0.1 * error + 3 * result.no_error_deviation);
  }
}

TEST_CASE("teleportation arrives") {
  const Circuit c = teleportation(0.9);
  const Rehearsal result = rehearsed(c, typical(3), whole, by_shots(4000));
  double ones = 0;
  double all = 0;
  for (const auto& outcome : result.outcomes) {
    all += outcome.without_noise;
    if (outcome.bits.ends_with("out=1")) ones += outcome.without_noise;
  }
  CHECK(result.outcomes.size() == 8);
  CHECK(all == doctest::Approx(1));
  const double expected = std::pow(std::sin(0.45), 2);
  CHECK(std::abs(ones - expected) < 5 * std::sqrt(expected / 4000));
}

TEST_CASE("the same seed gives the same result on any number of threads") {
  Random random(24);
  const Circuit c = measured(random, 4, 30);
  Target target = typical(4);
  RehearseOptions options = by_shots(500, 99);
  const Rehearsal one = rehearsed(c, target, whole, options);
  options.threads = 3;
  int calls = 0;
  options.progress = [&](double share) {
    CHECK(share > 0);
    CHECK(share <= 1);
    ++calls;
  };
  const Rehearsal three = rehearsed(c, target, whole, options);
  CHECK(calls > 100);
  CHECK(one.no_error == three.no_error);
  REQUIRE(one.outcomes.size() == three.outcomes.size());
  for (std::size_t i = 0; i < one.outcomes.size(); ++i) {
    CHECK(one.outcomes[i].bits == three.outcomes[i].bits);
    CHECK(one.outcomes[i].with_noise == three.outcomes[i].with_noise);
  }
  options.seed = 100;
  CHECK(rehearsed(c, target, whole, options).outcomes.front().with_noise != one.outcomes.front().with_noise);
}

TEST_CASE("without noise nothing is lost") {
  Random random(25);
  Target target = typical(4);
  target.crosstalk.value = 0;
  for (IonFigures& ion : target.ion) {
    ion.prepare_error = ion.pulse_error = ion.measure_error = ion.reset_error = {};
    ion.t2_us.value = 1e300;
  }
  for (PairFigures& pair : target.pairs) pair.floor = pair.slope = {};
  const Rehearsal exact =
      rehearsed(support::random_circuit(random, {3, 20, 0, support::Family::native}), target, fragment);
  CHECK(exact.fidelity == doctest::Approx(1).epsilon(1e-12));
  CHECK(exact.estimate == 1);
  const Rehearsal shots = rehearsed(measured(random, 3, 20), target, whole, by_shots(100));
  CHECK(shots.no_error == 1);
}

TEST_CASE("inputs need values, and too many ions are refused") {
  Circuit c;
  add_register(c, "q", 1);
  c.inputs.push_back({"t", "float", false, {}});
  c.body() = {c.make(Kind::r, {0}, {{0, c.forms.of_input(0)}, {0}})};
  CHECK_THROWS_AS(rehearsed(c, typical(1), fragment), Failure);
  RehearseOptions options;
  options.inputs = {0.4};
  CHECK(rehearsed(c, typical(1), fragment, options).fidelity == doctest::Approx(1 - 2e-4));

  Circuit wide;
  add_register(wide, "q", 30);
  try {
    rehearsed(wide, typical(30), whole);
    FAIL("must throw");
  } catch (const Failure& failure) {
    CHECK(failure.exit == Exit::target_cannot);
    CHECK(failure.messages.front().text == "the rehearsal can hold 22 ions, the program uses 30");
  }
}
