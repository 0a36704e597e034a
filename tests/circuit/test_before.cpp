// The textbook counts of the source against the rule of before.h, written out by hand.
#include <doctest/doctest.h>

#include "circuit/before.h"

using namespace isinglass;

namespace {

std::size_t two_qubit(Kind kind, std::uint32_t controls, std::vector<Angle> angles = {}) {
  Circuit circuit;
  const auto wires = controls + static_cast<std::uint32_t>(target_count(kind));
  add_register(circuit, "q", wires);
  std::vector<std::uint32_t> operands(wires);
  for (std::uint32_t i = 0; i < wires; ++i) operands[i] = i;
  circuit.body().push_back(circuit.make(kind, operands, angles));
  return before_of(circuit).two_qubit;
}

}  // namespace

TEST_CASE("CNOTs of single gates") {
  // Common practice for up to two controls; Barenco et al., lemma 7.5, beyond: CU(3) = 4 + 12 + 8 = 24,
  // CU(4) = 4 + 48 + 24 = 76, CU(5) = 4 + 152 + 76 = 232.
  for (const Kind kind : {Kind::x, Kind::y, Kind::z, Kind::h}) {
    CHECK(two_qubit(kind, 0) == 0);
    CHECK(two_qubit(kind, 1) == 1);
    CHECK(two_qubit(kind, 2) == 6);
    CHECK(two_qubit(kind, 3) == 24);
    CHECK(two_qubit(kind, 4) == 76);
    CHECK(two_qubit(kind, 5) == 232);
  }
  for (const Kind kind : {Kind::p, Kind::rz, Kind::r, Kind::u}) {
    CHECK(two_qubit(kind, 1, {{0.5}}) == 2);
    CHECK(two_qubit(kind, 2, {{0.5}}) == 8);
    CHECK(two_qubit(kind, 3, {{0.5}}) == 24);
  }
  CHECK(two_qubit(Kind::phase, 0, {{0.5}}) == 0);
  CHECK(two_qubit(Kind::phase, 1, {{0.5}}) == 0);
  CHECK(two_qubit(Kind::phase, 2, {{0.5}}) == 2);
  CHECK(two_qubit(Kind::phase, 3, {{0.5}}) == 8);
  CHECK(two_qubit(Kind::swap, 0) == 3);
  CHECK(two_qubit(Kind::swap, 1) == 8);
  CHECK(two_qubit(Kind::zz, 0, {{0.5}}) == 2);
  CHECK(two_qubit(Kind::xx, 0, {{0.5}}) == 2);
  CHECK(two_qubit(Kind::x, 60) == 1'000'000'000'000);
}

TEST_CASE("depth and one-qubit gates") {
  Circuit circuit;
  add_register(circuit, "q", 4);
  circuit.body().push_back(circuit.make(Kind::h, {0}));
  circuit.body().push_back(circuit.make(Kind::x, {0, 1}));
  circuit.body().push_back(circuit.make(Kind::x, {2, 3}));     // beside the first
  circuit.body().push_back(circuit.make(Kind::x, {1, 2, 3}));  // ccx on top of both: 1 + 6
  const Before before = before_of(circuit);
  CHECK(before.one_qubit == 1 + 9);
  CHECK(before.two_qubit == 8);
  CHECK(before.two_qubit_depth == 7);
}

TEST_CASE("of two arms the worse one counts") {
  Circuit circuit;
  add_register(circuit, "q", 2);
  add_bits(circuit, "c", 1);
  circuit.blocks.resize(3);
  circuit.blocks[1] = {circuit.make(Kind::x, {0, 1}), circuit.make(Kind::x, {1, 0})};
  circuit.blocks[2] = {circuit.make(Kind::h, {0}), circuit.make(Kind::h, {1})};
  Branch branch;
  branch.arms = {{{}, 1}, {{}, 2}};
  circuit.branches.push_back(branch);
  Operation op = circuit.make(Kind::branch, {0, 1});
  circuit.body().push_back(op);
  const Before before = before_of(circuit);
  CHECK(before.one_qubit == 2);
  CHECK(before.two_qubit == 2);
  CHECK(before.two_qubit_depth == 2);
}
