// Local rotations and merging across distance, against the tests' own simulator.
#include <doctest/doctest.h>

#include "passes/local_rotations.h"
#include "passes/merge_distant.h"
#include "support/random_circuits.h"
#include "support/simulator.h"

using namespace isinglass;
using support::Family;

namespace {

const std::vector<double> values = {0.37, -1.21, 2.05};  // of the inputs of symbolic circuits

std::size_t rotations_of(const Circuit& circuit) {
  Circuit copy = circuit;
  std::vector<LocalRotation> all;
  for (const Operation& op : circuit.body()) append_rotations(copy, op, all);
  std::size_t count = 0;
  for (const LocalRotation& rotation : all) count += !quarters_of(rotation.angle);
  return count;
}

Circuit on(std::uint32_t qubits) {
  Circuit circuit;
  add_register(circuit, "q", qubits);
  return circuit;
}

}  // namespace

TEST_CASE("every gate with a form as local rotations keeps its unitary") {
  support::Random random(11);
  for (int round = 0; round < 400; ++round) {
    support::RandomCircuit wanted{3, 8, 3, round % 2 == 0 ? Family::any : Family::symbolic};
    const Circuit source = support::random_circuit(random, wanted);
    Circuit result = source;
    int rewritten = 0;
    rewrite_pieces(result, [&](Circuit&, std::vector<LocalRotation> piece, bool) {
      ++rewritten;
      return std::optional<RewrittenPiece>({std::move(piece), {}});
    });
    CHECK_NOTHROW(check_invariants(result));
    CHECK(support::distance(source, result, values) < 1e-9);
  }
}

TEST_CASE("pieces may move wires: what follows is renamed, in branches too") {
  Circuit circuit = on(2);
  add_bits(circuit, "c", 1);
  circuit.body() = {circuit.make(Kind::swap, {0, 1})};
  Operation measure = circuit.make(Kind::measure, {0});
  measure.payload = 0;
  circuit.body().push_back(measure);
  circuit.blocks.push_back({circuit.make(Kind::x, {1})});
  Branch branch;
  branch.arms.push_back({{}, 1});
  circuit.branches.push_back(branch);
  circuit.body().push_back(circuit.make(Kind::branch, {0, 1}));
  rewrite_pieces(circuit, [&](Circuit&, std::vector<LocalRotation> piece, bool may_rename) {
    if (!may_rename) return std::optional<RewrittenPiece>();
    CHECK(piece.size() == 3);
    return std::optional<RewrittenPiece>({{}, {{0, 1}, {1, 0}}});
  });
  CHECK(circuit.body().size() == 2);
  CHECK(circuit.body()[0].operand[0] == 1);
  CHECK(circuit.blocks[1][0].operand[0] == 0);
  CHECK(circuit.end_wire == std::vector<std::uint32_t>{1, 0});
}

TEST_CASE("pieces move no wires in a program that may end early, nor in arms") {
  Circuit circuit = on(2);
  circuit.body() = {circuit.make(Kind::swap, {0, 1})};
  Branch branch;
  branch.arms.push_back({{}, 1});
  circuit.branches.push_back(branch);
  circuit.blocks.push_back({circuit.make(Kind::swap, {0, 1})});
  circuit.body().push_back(circuit.make(Kind::branch, {0, 1}));
  int may = 0;
  const auto count = [&](Circuit&, std::vector<LocalRotation>, bool may_rename) {
    may += may_rename;
    return std::optional<RewrittenPiece>();
  };
  rewrite_pieces(circuit, count);
  CHECK(may == 1);  // the body's
  circuit.statements.emplace_back();
  circuit.statements[0].kind = ClassicalStatement::Kind::end_program;
  circuit.blocks[1].push_back(circuit.make(Kind::classical, {}));
  rewrite_pieces(circuit, count);
  CHECK(may == 1);
}

TEST_CASE("pieces may move wires one after the other") {
  // Every swap is a piece whose wires are moved instead; between them what the wires hold is told apart.
  Circuit source = on(3);
  add_bits(source, "c", 1);
  const auto add = [&](Kind kind, std::initializer_list<std::uint32_t> operands,
                       std::initializer_list<Angle> angles = {}) {
    source.body().push_back(source.make(kind, operands, angles));
  };
  for (const std::uint32_t q : {0u, 1u, 2u}) {
    add(Kind::r, {q}, {{0.4 + 0.5 * q}, {0.3}});
    add(Kind::barrier, {q});
  }
  for (const std::uint32_t q : {0u, 1u, 0u}) {
    add(Kind::swap, {q, q + 1});
    add(Kind::barrier, {q});
  }
  Circuit result = source;
  rewrite_pieces(result, [](Circuit&, std::vector<LocalRotation> piece, bool) {
    if (!piece[0].is_pair()) return std::optional<RewrittenPiece>();
    const auto [a, b] = piece[0].wire;
    return std::optional<RewrittenPiece>({{}, {{a, b}, {b, a}}});
  });
  CHECK(result.body().size() == source.body().size() - 3);
  const auto without_barriers = [](Circuit circuit) {
    std::erase_if(circuit.body(), [](const Operation& op) { return op.kind == Kind::barrier; });
    return circuit;
  };
  CHECK(support::distance(without_barriers(source), without_barriers(result)) < 1e-12);
}

TEST_CASE("rotations merge through what commutes with them") {
  Circuit circuit = on(2);
  circuit.inputs.resize(2);
  circuit.inputs[0].name = "a";
  circuit.inputs[1].name = "b";
  const Angle a{0, circuit.forms.of_input(0)}, b{0.5, circuit.forms.of_input(1)};
  circuit.body() = {circuit.make(Kind::rz, {0}, {a}),     circuit.make(Kind::x, {0, 1}),
                    circuit.make(Kind::rz, {1}, {{0.3}}), circuit.make(Kind::x, {0, 1}),
                    circuit.make(Kind::h, {1}),           circuit.make(Kind::rz, {0}, {b})};
  const Circuit merged = merge_distant_rotations(circuit, {});
  CHECK(rotations_of(circuit) == 3);
  CHECK(rotations_of(merged) == 2);
  CHECK(support::distance(circuit, merged, values) < 1e-9);
}

TEST_CASE("rotations do not merge through what anticommutes, and a merged pair may free others") {
  Circuit circuit = on(1);
  circuit.body() = {circuit.make(Kind::rz, {0}, {{0.3}}), circuit.make(Kind::r, {0}, {{0.2}, {0}}),
                    circuit.make(Kind::rz, {0}, {{0.4}})};
  CHECK(rotations_of(merge_distant_rotations(circuit, {})) == 3);
  circuit.body().insert(circuit.body().begin() + 2, circuit.make(Kind::r, {0}, {{-0.2}, {0}}));
  const Circuit merged = merge_distant_rotations(circuit, {});
  CHECK(rotations_of(merged) == 1);
  CHECK(support::distance(circuit, merged) < 1e-9);
}

TEST_CASE("rotations look back over many others, and again when some have become Clifford") {
  Circuit circuit = on(8);
  circuit.body().push_back(circuit.make(Kind::rz, {0}, {{0.3}}));
  for (std::uint32_t a = 0; a < 8; ++a) {
    for (std::uint32_t b = 0; b < a; ++b) circuit.body().push_back(circuit.make(Kind::zz, {a, b}, {{0.1}}));
  }
  circuit.body().push_back(circuit.make(Kind::rz, {0}, {{0.4}}));
  CHECK(rotations_of(merge_distant_rotations(circuit, {})) == 29);
  // Four T gates are a Z, behind which the rotations about X have opposite signs.
  Circuit flipped = on(1);
  flipped.body().push_back(flipped.make(Kind::r, {0}, {{0.3}, {0}}));
  for (int t = 0; t < 4; ++t) flipped.body().push_back(flipped.make(Kind::p, {0}, {{pi / 4}}));
  flipped.body().push_back(flipped.make(Kind::r, {0}, {{0.4}, {0}}));
  const Circuit merged = merge_distant_rotations(flipped, {});
  CHECK(rotations_of(merged) == 1);
  CHECK(support::distance(flipped, merged) < 1e-12);
}

TEST_CASE("merging: random circuits of every family keep their unitary and never gain rotations") {
  support::Random random(12);
  int merged_some = 0;
  for (int round = 0; round < 600; ++round) {
    const Family families[] = {Family::any, Family::native, Family::clifford_t, Family::pauli,
                               Family::symbolic};
    support::RandomCircuit wanted{2 + round % 4, 25, 1, families[round % 5]};
    const Circuit source = support::random_circuit(random, wanted);
    PassContext context;
    context.effort = round % 3 == 0 ? Effort::quick : Effort::steady;
    const Circuit merged = merge_distant_rotations(source, context);
    CHECK(support::distance(source, merged, values) < 1e-8);
    CHECK(rotations_of(merged) <= rotations_of(source));
    merged_some += rotations_of(merged) < rotations_of(source);
  }
  CHECK(merged_some > 300);
}
