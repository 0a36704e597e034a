// Numerical synthesis of small unitaries, against the counts that are known.
#include "passes/small_search.h"

#include <doctest/doctest.h>

#include "support/random_circuits.h"
#include "support/simulator.h"

using namespace isinglass;
using support::Matrix;

namespace {

Matrix simulated(const SmallCircuit& circuit) {
  const auto qubits = static_cast<unsigned>(circuit.locals.size());
  Matrix result(1 << qubits, 1 << qubits);
  const Matrix pauli[3] = {support::pauli_x(), support::pauli_y(), support::pauli_z()};
  const auto along = [&](const Axis& axis) {
    return Matrix(axis.x() * pauli[0] + axis.y() * pauli[1] + axis.z() * pauli[2]);
  };
  for (int column = 0; column < 1 << qubits; ++column) {
    support::State state(qubits, static_cast<std::uint64_t>(column));
    for (const Coupling& c : circuit.couplings) {
      const std::uint32_t on[] = {c.qubit[0], c.qubit[1]};
      state.apply(support::rotation(c.angle, support::product(along(c.axis[0]), along(c.axis[1]))), on);
    }
    for (std::uint32_t q = 0; q < qubits; ++q) {
      const Su2& local = circuit.locals[q];
      const Matrix m = Matrix::Identity(2, 2) * local.w() - support::Complex(0, 1) * along(local.vec());
      state.apply(m, std::span(&q, 1));
    }
    for (int row = 0; row < 1 << qubits; ++row)
      result(row, column) = state.amplitudes[static_cast<std::size_t>(row)];
  }
  return result;
}

SmallSearch search(int starts = 8, double seconds = 20) {
  SmallSearch s;
  s.starts = starts;
  s.until = std::chrono::steady_clock::now() + std::chrono::milliseconds(static_cast<int>(1000 * seconds));
  return s;
}

SmallTarget gate(Kind kind, int controls, double a = 0, double b = 0) {
  const Matrix m = support::controlled(support::gate_matrix(kind, a, b), controls);
  return {3, m, 0};
}

void check_shortest(const SmallTarget& target, int xx, double units) {
  CHECK(least_couplings(target) <= xx);
  const auto found = shortest(target, xx, search(), {});
  REQUIRE(found);
  CHECK(found->couplings.size() == static_cast<std::size_t>(xx));
  CHECK(support::distance(simulated(*found), target.matrix) < 1e-11);
  double sum = 0;
  for (const Coupling& c : found->couplings) sum += std::abs(c.angle) / (pi / 2);
  if (units > 0) CHECK(sum <= units + 2e-3);
}

}  // namespace

TEST_CASE("known three-qubit gates are found again (source of counts and units: computed)") {
  check_shortest(gate(Kind::r, 2, pi, 0), 4, 2.5438);  // doubly controlled iX
  check_shortest(gate(Kind::zz, 1, 0.8), 3, -1);       // controlled rzz
  check_shortest(gate(Kind::x, 2), 5, 3.0438);         // Toffoli
  const Matrix givens =
      support::gate_matrix(Kind::xx, 0.7, 0, pi / 2) *  // exp(-i t/2 (XY - YX)/...), two commuting parts
      support::gate_matrix(Kind::xx, -0.7, pi / 2, 0);
  check_shortest({3, support::controlled(givens, 1), 0}, 4, -1);  // controlled Givens rotation
}

TEST_CASE("a state of three qubits takes three interactions (computed)") {
  support::Random random(5);
  for (int trial = 0; trial < 5; ++trial) {
    SmallTarget target{3, support::haar_unitary(random, 3), 7};
    const auto found = shortest(target, 3, search(), {});
    REQUIRE(found);
    CHECK(found->couplings.size() == 3);
    const Matrix reached = simulated(*found);
    CHECK(support::distance(reached.col(0), target.matrix.col(0)) < 1e-11);
  }
  Matrix ghz = Matrix::Identity(8, 8);
  ghz.col(0).setZero();
  ghz(0, 0) = ghz(7, 0) = std::sqrt(0.5);
  const auto found = shortest({3, ghz, 7}, 2, search(), {});
  REQUIRE(found);
  CHECK(found->couplings.size() == 2);
}

TEST_CASE("a random three-qubit unitary takes eleven interactions, the parameter bound (computed)") {
  support::Random random(6);
  const SmallTarget target{3, support::haar_unitary(random, 3), 0};
  std::vector<std::pair<int, int>> pairs;
  const std::pair<int, int> cycle[] = {{0, 1}, {1, 2}, {0, 2}};
  for (int i = 0; i < 11; ++i) pairs.push_back(cycle[i % 3]);
  const auto found = fitted(target, pairs, search(8), {});
  REQUIRE(found);
  CHECK(found->couplings.size() == 11);
  CHECK(support::distance(simulated(*found), target.matrix) < 1e-11);
  pairs.pop_back();
  CHECK(!fitted(target, pairs, search(3), {}));
}

TEST_CASE("ranks bound the interactions from below (computed)") {
  const Matrix identity = Matrix::Identity(8, 8);
  CHECK(least_couplings({3, identity, 0}) == 0);
  // A Toffoli has rank 2 across each of three cuts, and one coupling crosses two of them.
  CHECK(least_couplings(gate(Kind::x, 2)) == 2);
  // The cyclic exchange of three qubits has rank 4 across each: two couplings across each of three cuts.
  Matrix cycle = Matrix::Zero(8, 8);
  for (int i = 0; i < 8; ++i) cycle((i << 1 | i >> 2) & 7, i) = 1;
  CHECK(least_couplings({3, cycle, 0}) == 3);
}

TEST_CASE("a search makes no more starts than it may, and leaves out what can be left out") {
  support::Random random(8);
  const SmallTarget target{3, support::haar_unitary(random, 3), 0};
  std::int64_t budget = 5;
  SmallSearch bounded = search(8);
  bounded.budget = &budget;
  CHECK(!fitted(target, {{0, 1}, {1, 2}, {0, 2}, {0, 1}}, bounded, {}));
  CHECK(budget == 0);
  // Two couplings about the same axes with others around them: one of the two can go, whichever it is.
  for (const std::size_t twin : {0u, 3u}) {
    SmallCircuit circuit;
    circuit.locals.assign(3, Su2::Identity());
    const Axis axes[] = {Axis::UnitX(), Axis::UnitZ(), Axis::UnitY()};
    const std::pair<int, int> pairs[] = {{0, 1}, {1, 2}, {0, 2}, {0, 1}};
    for (std::size_t j = 0; j < 4; ++j) {
      Coupling coupling;
      coupling.qubit[0] = static_cast<std::uint8_t>(pairs[j].first);
      coupling.qubit[1] = static_cast<std::uint8_t>(pairs[j].second);
      coupling.axis[0] = axes[j % 3];
      coupling.axis[1] = axes[(j + 1) % 3];
      coupling.angle = 0.4 + 0.2 * static_cast<double>(j);
      circuit.couplings.push_back(coupling);
      if (j == twin) circuit.couplings.push_back(coupling);
    }
    const SmallTarget whole{3, matrix_of(circuit), 0};
    const auto shorter = with_one_fewer(whole, circuit, search(1), {});
    REQUIRE(shorter);
    CHECK(shorter->couplings.size() == 4);
    CHECK(support::distance(simulated(*shorter), whole.matrix) < 1e-11);
  }
}

TEST_CASE("angles are made small, and of more starts the best is kept") {
  // 0.9 and -0.6 about the same axes, with an interaction between them that commutes: 0.3 is enough.
  SmallCircuit wasteful;
  wasteful.locals.assign(3, Su2::Identity());
  const std::pair<std::pair<int, int>, double> couplings[] = {{{0, 1}, 0.9}, {{1, 2}, 0.5}, {{0, 1}, -0.6}};
  for (const auto& [pair, angle] : couplings) {
    Coupling coupling;
    coupling.qubit[0] = static_cast<std::uint8_t>(pair.first);
    coupling.qubit[1] = static_cast<std::uint8_t>(pair.second);
    coupling.axis[0] = coupling.axis[1] = Axis::UnitX();
    coupling.angle = angle;
    wasteful.couplings.push_back(coupling);
  }
  const SmallTarget target{3, matrix_of(wasteful), 0};
  const SmallCircuit better = with_less_angle(target, wasteful, search(1), {});
  CHECK(support::distance(simulated(better), target.matrix) < 1e-11);
  double sum = 0;
  for (const Coupling& c : better.couplings) sum += std::abs(c.angle);
  CHECK(sum < 0.81);

  // Eleven couplings leave the angles of a random unitary some freedom: every start ends elsewhere.
  support::Random random(9);
  const SmallTarget wanted{3, support::haar_unitary(random, 3), 0};
  std::vector<std::pair<int, int>> pairs;
  const std::pair<int, int> cycle[] = {{0, 1}, {1, 2}, {0, 2}};
  for (int i = 0; i < 11; ++i) pairs.push_back(cycle[i % 3]);
  for (const std::uint64_t seed : {1u, 2u, 3u}) {
    double least = 1;
    for (int starts = 1; starts <= 3; ++starts) {
      SmallSearch some = search(starts);
      some.seed = seed;
      const auto found = fitted(wanted, pairs, some, {});
      REQUIRE(found);
      CHECK(error_of(*found, {}) <= least);
      least = error_of(*found, {});
    }
  }
}

TEST_CASE("invariants do not change under one-qubit gates, and tell gates apart") {
  support::Random random(7);
  const SmallTarget toffoli = gate(Kind::x, 2);
  SmallTarget turned = toffoli;
  for (int side = 0; side < 2; ++side) {
    const Matrix low = support::product(support::haar_unitary(random, 1), support::haar_unitary(random, 1));
    const Matrix local = support::product(low, support::haar_unitary(random, 1));
    turned.matrix = side == 0 ? Matrix(local * turned.matrix) : Matrix(turned.matrix * local);
  }
  CHECK(local_invariants(turned) == local_invariants(toffoli));
  CHECK(local_invariants(gate(Kind::swap, 1)) != local_invariants(toffoli));
}
