// Numbers of interactions and total angles that known circuits must come down to. One unit = xx of pi/2.
#include <doctest/doctest.h>

#include <algorithm>
#include <cmath>
#include <string>
#include <vector>

#include "circuit/cost.h"
#include "passes/optimize.h"
#include "support/families_textbook.h"
#include "support/random_circuits.h"
#include "support/simulator.h"

using namespace isinglass;

namespace {

Circuit on(std::uint32_t qubits) {
  Circuit circuit;
  add_register(circuit, "q", qubits);
  return circuit;
}

void add(Circuit& circuit, Kind kind, std::initializer_list<std::uint32_t> operands,
         std::initializer_list<Angle> angles = {}) {
  circuit.body().push_back(circuit.make(kind, operands, angles));
}

/// Tally of the optimized circuit, which up to 6 qubits must do the same.
Tally optimized(const Circuit& source, Effort effort = Effort::steady,
                const std::vector<double>& inputs = {}) {
  PassContext context;
  context.effort = effort;
  const Circuit result = optimize(source, context);
  check_invariants(result);
  if (source.wires <= 6) CHECK(support::distance(source, result, inputs) < 1e-10);
  return tally_of(result);
}

std::vector<std::pair<std::uint32_t, std::uint32_t>> random_edges(support::Random& random, int qubits,
                                                                  int edges) {
  std::vector<std::pair<std::uint32_t, std::uint32_t>> result;
  while (static_cast<int>(result.size()) < edges) {
    const auto pair = random.distinct(2, qubits);
    const std::pair edge{std::min(pair[0], pair[1]), std::max(pair[0], pair[1])};
    if (std::find(result.begin(), result.end(), edge) == result.end()) result.push_back(edge);
  }
  return result;
}

/// exp(-i t/2 ZZ) the textbook way, between two cx.
void ladder(Circuit& circuit, std::uint32_t a, std::uint32_t b, Angle t) {
  add(circuit, Kind::x, {a, b});
  add(circuit, Kind::rz, {b}, {t});
  add(circuit, Kind::x, {a, b});
}

}  // namespace

TEST_CASE("Bell 1, GHZ n - 1 (computed)") {
  for (const Effort effort : {Effort::quick, Effort::steady}) {
    for (const std::uint32_t n : {2u, 3u, 5u, 6u, 12u, 32u}) {
      Circuit chain = on(n);
      Circuit star = on(n);
      add(chain, Kind::h, {0});
      add(star, Kind::h, {0});
      for (std::uint32_t q = 1; q < n; ++q) {
        add(chain, Kind::x, {q - 1, q});
        add(star, Kind::x, {0, q});
      }
      for (const Circuit& circuit : {chain, star}) {
        const Tally tally = optimized(circuit, effort);
        CHECK(tally.xx == n - 1);
        CHECK(tally.xx_units == doctest::Approx(n - 1));
      }
    }
  }
}

TEST_CASE("a swap is renamed, however it is written (computed)") {
  Circuit circuit = on(3);
  add(circuit, Kind::swap, {0, 2});
  CHECK(optimized(circuit, Effort::quick).xx == 0);
  CHECK(optimized(circuit).xx == 0);
  Circuit written = on(2);
  add(written, Kind::x, {0, 1});
  add(written, Kind::x, {1, 0});
  add(written, Kind::x, {0, 1});
  CHECK(optimized(written).xx == 0);
}

TEST_CASE("controlled one-qubit gates and two-qubit rotations take one interaction (computed)") {
  const Angle t{0.7};
  for (const Effort effort : {Effort::quick, Effort::steady}) {
    const auto check = [&](Kind kind, std::initializer_list<Angle> angles, double units) {
      Circuit circuit = on(2);
      add(circuit, kind, {0, 1}, angles);
      const Tally tally = optimized(circuit, effort);
      CAPTURE(std::string(name(kind)));
      CHECK(tally.xx == 1);
      CHECK(tally.xx_units == doctest::Approx(units));
    };
    check(Kind::x, {}, 1);
    check(Kind::y, {}, 1);
    check(Kind::z, {}, 1);
    check(Kind::h, {}, 1);
    check(Kind::p, {t}, 0.7 / pi);
    check(Kind::rz, {t}, 0.7 / pi);
    check(Kind::r, {t, {0.3}}, 0.7 / pi);
    check(Kind::zz, {t}, 1.4 / pi);
    check(Kind::xx, {t, {0.2}, {0.4}}, 1.4 / pi);
    check(Kind::phase, {t}, 0.7 / pi);
  }
  Circuit circuit = on(2);
  add(circuit, Kind::u, {0, 1}, {{0.3}, {0.5}, {0.9}});
  CHECK(optimized(circuit).xx == 1);
}

TEST_CASE("the same with angles that depend on inputs") {
  for (const Effort effort : {Effort::quick, Effort::steady}) {
    for (const Kind kind : {Kind::p, Kind::rz, Kind::zz}) {
      Circuit circuit = on(2);
      circuit.inputs.push_back({"t", "float", false, {}});
      const Angle t{0.25, circuit.forms.scaled(circuit.forms.of_input(0), 2)};
      add(circuit, kind, {0, 1}, {t});
      add(circuit, kind, {0, 1}, {t});
      CHECK(optimized(circuit, effort, {0.6}).xx == 1);
      add(circuit, kind, {0, 1}, {circuit.forms.scaled(t, -2)});
      CHECK(optimized(circuit, effort, {0.6}).xx == 0);
    }
    Circuit textbook = on(2);
    textbook.inputs.push_back({"t", "float", false, {}});
    ladder(textbook, 0, 1, {0, textbook.forms.of_input(0)});
    if (effort == Effort::steady) CHECK(optimized(textbook, effort, {0.6}).xx == 1);
  }
}

TEST_CASE("random two-qubit stretches: 3 xx, mean total 1.50 units, 1.2722 with renaming") {
  // Haar averages from Watts, O'Connor, Vala, Entropy 2013 (from memory); computed.
  support::Random random(21);
  double kept = 0;
  double renamed = 0;
  constexpr int samples = 1000;
  for (int i = 0; i < samples; ++i) {
    const Circuit circuit = support::random_pair(random);
    const Tally tally = optimized(circuit);
    CHECK(tally.xx == 3);
    renamed += tally.xx_units;
    // In the arm of a branch wires may not change their names.
    Circuit inner = circuit;
    inner.blocks.push_back(inner.body());
    inner.body().clear();
    inner.branches.push_back({});
    inner.branches[0].arms.push_back({{}, 1});
    Operation op = inner.make(Kind::branch, {0, 1});
    inner.body().push_back(op);
    const Tally still = tally_of(optimize(inner, {}));
    CHECK(still.xx == 3);
    kept += still.xx_units;
  }
  CHECK(std::abs(kept / samples - 1.50) < 0.02);
  CHECK(renamed / samples < 1.29);
  CHECK(renamed / samples > 1.25);
}

TEST_CASE("QFT: n(n-1)/2 xx and n - 2 + 2^(1-n) units (computed)") {
  for (std::uint32_t n = 2; n <= 32; ++n) {
    for (const Effort effort : {Effort::quick, Effort::steady}) {
      if (effort == Effort::steady && n > 16 && n != 32) continue;
      const Tally tally = optimized(support::fourier(n), effort);
      CAPTURE(n);
      CHECK(tally.xx == n * (n - 1) / 2);
      CHECK(tally.xx_units == doctest::Approx(n - 2 + std::pow(2.0, 1.0 - n)).epsilon(1e-9));
    }
  }
}

TEST_CASE("Toffoli: at most 5 xx") {
  // Yu, Duan, Ying, arXiv:1301.3372: 5 two-qubit gates are necessary and sufficient.
  Circuit circuit = on(3);
  add(circuit, Kind::x, {0, 1, 2});
  CHECK(optimized(circuit).xx == 5);
  CHECK(optimized(circuit, Effort::quick).xx == 5);
}

TEST_CASE("QAOA on a graph: one xx per edge and layer (computed)") {
  support::Random random(22);
  for (const bool is_symbolic : {false, true}) {
    for (const int layers : {1, 3}) {
      Circuit circuit = on(10);
      const auto edges = random_edges(random, 10, 15);
      if (is_symbolic) circuit.inputs = {{"g", "float", false, {}}, {"b", "float", false, {}}};
      for (std::uint32_t q = 0; q < 10; ++q) add(circuit, Kind::h, {q});
      for (int layer = 0; layer < layers; ++layer) {
        const Angle gamma = is_symbolic ? Angle{0, circuit.forms.of_input(0)} : Angle{random.real(0.1, 1.4)};
        const Angle beta = is_symbolic ? Angle{0, circuit.forms.of_input(1)} : Angle{random.real(0.1, 1.4)};
        for (const auto& [a, b] : edges) ladder(circuit, a, b, gamma);
        for (std::uint32_t q = 0; q < 10; ++q) add(circuit, Kind::r, {q}, {beta, {0}});
      }
      CAPTURE(is_symbolic);
      CHECK(optimized(circuit).xx == edges.size() * static_cast<std::size_t>(layers));
    }
  }
}

TEST_CASE("product formula of an Ising model on a graph: one xx per coupling and step (computed)") {
  support::Random random(23);
  Circuit circuit = on(9);
  const auto edges = random_edges(random, 9, 14);
  std::vector<double> strength;
  for (std::size_t e = 0; e < edges.size(); ++e) strength.push_back(random.real(0.05, 0.5));
  constexpr int steps = 4;
  for (int step = 0; step < steps; ++step) {
    for (std::size_t e = 0; e < edges.size(); ++e)
      ladder(circuit, edges[e].first, edges[e].second, {strength[e]});
    for (std::uint32_t q = 0; q < 9; ++q) add(circuit, Kind::r, {q}, {{0.3}, {0}});
  }
  CHECK(optimized(circuit).xx == edges.size() * steps);
}

TEST_CASE("Heisenberg couplings on a chain: three interactions a bond and step, twos kept together") {
  // XX, YY and ZZ of one pair commute and are one stretch (computed): 3 xx, whatever the ladders look like.
  Circuit circuit = on(5);
  for (std::uint32_t q = 0; q + 1 < 5; ++q) {
    for (const int basis : {0, 1, 2}) {
      for (const std::uint32_t w : {q, q + 1}) {
        if (basis == 0) add(circuit, Kind::h, {w});
        if (basis == 1) add(circuit, Kind::r, {w}, {{pi / 2}, {0}});
      }
      ladder(circuit, q, q + 1, {0.2});
      for (const std::uint32_t w : {q, q + 1}) {
        if (basis == 0) add(circuit, Kind::h, {w});
        if (basis == 1) add(circuit, Kind::r, {w}, {{-pi / 2}, {0}});
      }
    }
  }
  const Tally tally = optimized(circuit);
  CHECK(tally.xx == 3 * 4);
  CHECK(tally.xx_units == doctest::Approx(12 * 0.2 / (pi / 2)));
}

TEST_CASE("a known start and a final measurement save what they can (computed)") {
  PassContext context;
  context.promise.zero_start = true;
  // Any state of two qubits takes one interaction.
  support::Random random(24);
  const Circuit word = support::random_pair(random);
  const Circuit made = optimize(word, context);
  CHECK(tally_of(made).xx == 1);
  CHECK(support::distance_from_zero(word, made) < 1e-10);
  // Controlled phases right before the measurement of all qubits go.
  Circuit phases = on(3);
  add_bits(phases, "c", 3);
  for (std::uint32_t q = 0; q < 3; ++q) add(phases, Kind::h, {q});
  add(phases, Kind::p, {0, 1}, {{0.3}});
  add(phases, Kind::z, {0, 1, 2});
  for (std::uint32_t q = 0; q < 3; ++q) {
    add(phases, Kind::measure, {q});
    phases.body().back().payload = q;
  }
  CHECK(tally_of(optimize(phases, context)).xx == 0);
}

TEST_CASE("small angles are never taken for nothing") {
  for (const double small : {1e-3, 1e-6, 1e-9}) {
    Circuit circuit = on(2);
    add(circuit, Kind::zz, {0, 1}, {{small}});
    add(circuit, Kind::r, {0}, {{0.4}, {0.1}});
    add(circuit, Kind::xx, {0, 1}, {{2 * small}, {0.3}, {0.5}});
    add(circuit, Kind::r, {1}, {{0.9}, {0.2}});
    add(circuit, Kind::zz, {0, 1}, {{3 * small}});
    add(circuit, Kind::xx, {0, 1}, {{small}, {0.9}, {-0.5}});
    CHECK(optimized(circuit).xx == 3);
  }
}
