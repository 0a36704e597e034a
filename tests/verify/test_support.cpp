// The tests' own simulator and generators, checked against facts that no code of the tree decides.
#include <doctest/doctest.h>

#include "support/random_circuits.h"
#include "support/simulator.h"

namespace isinglass::support {
namespace {

TEST_CASE("simulator: matrices agree with the vocabulary's formulas") {
  Random random(1);
  for (int n = 0; n < 200; ++n) {
    RandomCircuit wanted;
    wanted.gates = 1;
    wanted.most_controls = 0;
    Circuit circuit = random_circuit(random, wanted);
    const Operation& op = circuit.body()[0];
    const auto entries = matrix_of(op);
    const Matrix own = gate_matrix(op.kind, op.value[0], op.value[1], op.value[2]);
    REQUIRE(entries.size() == static_cast<std::size_t>(own.size()));
    for (Eigen::Index r = 0; r < own.rows(); ++r) {
      for (Eigen::Index c = 0; c < own.cols(); ++c) {
        CHECK(std::abs(entries[static_cast<std::size_t>(r * own.cols() + c)] - own(r, c)) < 1e-12);
      }
    }
  }
}

TEST_CASE("simulator: a swap renamed is a swap performed, and the wrong end wire is not") {
  Circuit performed;
  add_register(performed, "q", 2);
  performed.body().push_back(performed.make(Kind::h, {0}));
  performed.body().push_back(performed.make(Kind::swap, {0, 1}));
  Circuit renamed;
  add_register(renamed, "q", 2);
  renamed.body().push_back(renamed.make(Kind::h, {0}));
  CHECK(distance(performed, renamed) > 0.5);
  renamed.end_wire = {1, 0};
  CHECK(distance(performed, renamed) < 1e-12);
}

TEST_CASE("simulator: an ancilla left dirty is noticed") {
  Circuit plain;
  add_register(plain, "q", 1);
  Circuit dirty = plain;
  dirty.wires = 2;
  CHECK(distance(plain, dirty) < 1e-12);
  dirty.body().push_back(dirty.make(Kind::x, {0, 1}));
  CHECK(distance(plain, dirty) > 0.5);
}

TEST_CASE("generators: every family gives well-formed circuits with unitary matrices") {
  Random random(2);
  for (const Family family :
       {Family::any, Family::native, Family::clifford, Family::clifford_t, Family::toffolis, Family::pauli}) {
    for (int n = 0; n < 20; ++n) {
      RandomCircuit wanted;
      wanted.family = family;
      wanted.qubits = random.between(1, 4);
      const Circuit circuit = random_circuit(random, wanted);
      check_invariants(circuit);
      const Matrix u = unitary(circuit);
      CHECK((u.adjoint() * u - Matrix::Identity(u.rows(), u.cols())).norm() < 1e-10);
    }
  }
}

TEST_CASE("generators: texts come with unitary meanings, and seeds repeat") {
  Random random(3);
  Random same(3);
  for (int n = 0; n < 100; ++n) {
    const int qubits = random.between(2, 5);
    CHECK(qubits == same.between(2, 5));
    const Source source = random_source(random, qubits, 10);
    CHECK(source.text == random_source(same, qubits, 10).text);
    const Matrix u = unitary(source);
    CHECK((u.adjoint() * u - Matrix::Identity(u.rows(), u.cols())).norm() < 1e-10);
  }
}

}  // namespace
}  // namespace isinglass::support
