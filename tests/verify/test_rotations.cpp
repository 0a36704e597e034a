// Pauli rotations without amplitudes: what they call the same is the same by the tests' own simulator, what
// they call different is different, and on the families they are made for they reach an end.
#include <doctest/doctest.h>

#include "support/random_circuits.h"
#include "support/simulator.h"
#include "verify/equivalence.h"

namespace isinglass {
namespace {

using support::Family;
using support::Random;
using support::RandomCircuit;

/// Options under which only the rotations are left as a method.
CheckOptions rotations_only() {
  CheckOptions options;
  options.most_state_wires = 0;
  options.most_followed_wires = 0;
  return options;
}

Verdict by_rotations(const Circuit& a, const Circuit& b, const Promise& promise = {}) {
  return compare(a, b, promise, rotations_only());
}

/// Neighbours that commute exchanged at random, many times over; decided with small matrices.
Circuit shuffled(Circuit circuit, Random& random) {
  Block& body = circuit.body();
  for (std::size_t round = 0; round < 10 * body.size(); ++round) {
    const auto k = static_cast<std::size_t>(random.below(static_cast<int>(body.size()) - 1));
    Circuit ab = circuit;
    Circuit ba = circuit;
    ab.body() = {body[k], body[k + 1]};
    ba.body() = {body[k + 1], body[k]};
    if ((support::wire_unitary(ab) - support::wire_unitary(ba)).norm() < 1e-12)
      std::swap(body[k], body[k + 1]);
  }
  return circuit;
}

TEST_CASE("rotations: every gate kind with controls undone by itself and not by its neighbour") {
  Random random(21);
  int same = 0;
  for (int n = 0; n < 200; ++n) {
    RandomCircuit wanted;
    wanted.qubits = 4;
    wanted.gates = 6;
    const Circuit a = random_circuit(random, wanted);
    const Verdict verdict = by_rotations(a, a);
    CHECK(verdict.answer == Answer::same);
    CHECK(verdict.method == "rotations");
    // A control spelled out: the circuit against itself in a basis change.
    Circuit b = a;
    for (std::uint32_t w = 0; w < 4; ++w) {
      b.body().insert(b.body().begin(), b.make(Kind::h, {w}));
      b.body().insert(b.body().begin(), b.make(Kind::h, {w}));
    }
    CHECK(by_rotations(a, b).answer == Answer::same);
    b.body().push_back(b.make(Kind::rz, {1}, {{1e-5}}));
    CHECK(by_rotations(a, b).answer != Answer::same);
    same += by_rotations(a, a).answer == Answer::same;
  }
  CHECK(same == 200);
}

TEST_CASE("rotations: commuting gates in another order") {
  Random random(22);
  for (const Family family : {Family::clifford, Family::clifford_t, Family::native, Family::pauli}) {
    for (int n = 0; n < 10; ++n) {
      RandomCircuit wanted;
      wanted.qubits = 4;
      wanted.gates = 15;
      wanted.family = family;
      const Circuit a = random_circuit(random, wanted);
      const Circuit b = shuffled(a, random);
      REQUIRE(support::distance(a, b) < 1e-10);
      CHECK(by_rotations(a, b).answer == Answer::same);
    }
  }
}

TEST_CASE("rotations: one-qubit stretches in other Euler angles, two-qubit stretches in another spelling") {
  Random random(23);
  for (int n = 0; n < 50; ++n) {
    Circuit a;
    add_register(a, "q", 3);
    Circuit b = a;
    for (int k = 0; k < 10; ++k) {
      const auto w = random.distinct(2, 3);
      const double t = random.real(-3, 3);
      const double f = random.real(-3, 3);
      const double l = random.real(-3, 3);
      a.body().push_back(a.make(Kind::u, {w[0]}, {{t}, {f}, {l}}));
      // The same as two pulses and a frame: U(t, f, l) = rz(f + l) after a pulse about an axis turned by -l.
      b.body().push_back(b.make(Kind::r, {w[0]}, {{0.4 * t}, {pi / 2 - l}}));
      b.body().push_back(b.make(Kind::r, {w[0]}, {{0.6 * t}, {pi / 2 - l}}));
      b.body().push_back(b.make(Kind::rz, {w[0]}, {{f + l}}));
      a.body().push_back(a.make(Kind::x, {w[0], w[1]}));
      b.body().push_back(b.make(Kind::h, {w[1]}));
      b.body().push_back(b.make(Kind::z, {w[1], w[0]}));
      b.body().push_back(b.make(Kind::h, {w[1]}));
    }
    REQUIRE(support::distance(a, b) < 1e-10);
    CHECK(by_rotations(a, b).answer == Answer::same);
  }
}

TEST_CASE("rotations: never the wrong answer on circuits with a fault") {
  Random random(24);
  for (const Family family : {Family::any, Family::clifford, Family::clifford_t, Family::native}) {
    for (int n = 0; n < 60; ++n) {
      RandomCircuit wanted;
      wanted.qubits = 3;
      wanted.gates = 10;
      wanted.family = family;
      const Circuit a = random_circuit(random, wanted);
      Circuit b = a;
      const auto at = static_cast<std::size_t>(random.below(static_cast<int>(b.body().size())));
      if (random.chance(0.5)) {
        b.body().erase(b.body().begin() + static_cast<std::ptrdiff_t>(at));
      } else {
        b.end_wire = {1, 0, 2};
      }
      const bool are_same = support::distance(a, b) < 1e-9;
      const Answer answer = by_rotations(a, b).answer;
      CHECK(answer != (are_same ? Answer::different : Answer::same));
      const bool same_from_zero = support::distance_from_zero(a, b) < 1e-9;
      const Answer from_zero = by_rotations(a, b, {true, false}).answer;
      CHECK(from_zero != (same_from_zero ? Answer::different : Answer::same));
    }
  }
}

TEST_CASE("rotations: Clifford circuits of 60 qubits are decided either way") {
  Random random(25);
  RandomCircuit wanted;
  wanted.qubits = 60;
  wanted.gates = 2000;
  wanted.family = Family::clifford;
  const Circuit a = random_circuit(random, wanted);
  Circuit b = a;
  CHECK(by_rotations(a, b).answer == Answer::same);
  b.body().push_back(b.make(Kind::z, {17}));
  const Verdict verdict = by_rotations(a, b);
  CHECK(verdict.answer == Answer::different);
  CHECK(verdict.method == "rotations");
}

TEST_CASE("rotations: ancillas and final measurements") {
  Circuit a;
  add_register(a, "q", 2);
  a.body().push_back(a.make(Kind::p, {0, 1}, {{0.6}}));
  // The same phase kicked onto an ancilla that holds the AND of both; AND by a Toffoli and undone.
  Circuit b = a;
  b.wires = 3;
  b.body().clear();
  b.body().push_back(b.make(Kind::x, {0, 1, 2}));
  b.body().push_back(b.make(Kind::p, {2}, {{0.6}}));
  REQUIRE(support::distance(a, [&] {
            Circuit c = b;
            c.body().push_back(c.make(Kind::x, {0, 1, 2}));
            return c;
          }()) < 1e-12);
  CHECK(by_rotations(a, b).answer != Answer::same);
  b.body().push_back(b.make(Kind::x, {0, 1, 2}));
  CHECK(by_rotations(a, b).answer == Answer::same);

  Circuit m = a;
  add_bits(m, "c", 2);
  m.body().insert(m.body().begin(), m.make(Kind::h, {0}));
  m.body().insert(m.body().begin(), m.make(Kind::h, {1}));
  Circuit n = m;
  n.body().push_back(n.make(Kind::rz, {1}, {{0.9}}));
  n.body().push_back(n.make(Kind::z, {0, 1}));
  n.body().push_back(n.make(Kind::p, {0}, {{pi / 2}}));
  for (std::uint32_t k = 0; k < 2; ++k) {
    for (Circuit* circuit : {&m, &n}) {
      Operation op = circuit->make(Kind::measure, {k});
      op.payload = k;
      circuit->body().push_back(op);
    }
  }
  CHECK(by_rotations(m, n, {true, false}).answer == Answer::same);
  CHECK(by_rotations(m, n, {false, false}).answer == Answer::same);
  n.body().insert(n.body().begin(), n.make(Kind::r, {0}, {{0.1}, {pi / 2}}));
  CHECK(by_rotations(m, n, {false, false}).answer != Answer::same);
}

}  // namespace
}  // namespace isinglass
