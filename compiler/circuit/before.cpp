// The textbook cost of the source; see before.h.
#include "circuit/before.h"

#include <algorithm>

namespace isinglass {

namespace {

/// Gates of a textbook lowering.
struct Gates {
  std::size_t one = 0;
  std::size_t two = 0;
  Gates operator+(Gates other) const { return {one + other.one, two + other.two}; }
};

/// The rule triples the count with every further control; beyond this a gate's count stands still.
constexpr std::size_t most = 1'000'000'000'000;

Gates capped(Gates g) {
  return {std::min(g.one, most), std::min(g.two, most)};
}

Gates twice(Gates g) {
  return {2 * g.one, 2 * g.two};
}

/// x with k controls, and u with k controls: lemma 7.5 of Barenco et al.
Gates controlled_x(std::size_t k);
Gates controlled_u(std::size_t k) {
  if (k == 0) return {1, 0};
  Gates sum{4, 2};  // the innermost: A, CNOT, B, CNOT, C and a phase on the control
  // Two controlled roots (2 CNOTs each), 2 X(k-1), CU(k-1); from the inside out.
  for (std::size_t i = 2; i <= k; ++i) sum = capped(sum + Gates{8, 4} + twice(controlled_x(i - 1)));
  return sum;
}

Gates controlled_x(std::size_t k) {
  if (k == 0) return {1, 0};
  if (k == 1) return {0, 1};
  if (k == 2) return {9, 6};  // 2 h and 7 t
  // X(k) = CU(k) from k = 3 on.
  Gates sum = controlled_u(3);
  for (std::size_t i = 4; i <= k; ++i) sum = capped(Gates{8, 4} + twice(sum) + sum);
  return sum;
}

Gates textbook(const Operation& op) {
  const auto controls = static_cast<std::size_t>(std::max(op.control_count(), 0));
  switch (op.kind) {
    case Kind::phase:  // a controlled phase of g has one control fewer than its wires
      if (controls == 0) return {};
      return controls == 1 ? Gates{1, 0} : controls == 2 ? Gates{3, 2} : controlled_u(controls - 1);
    case Kind::x:
      return controlled_x(controls);
    case Kind::y:
    case Kind::z:
    case Kind::h:
      return controls == 0 ? Gates{1, 0} : controlled_x(controls) + Gates{2, 0};
    case Kind::p:
      return controls == 1 ? Gates{3, 2} : controlled_u(controls);
    case Kind::rz:
      return controls == 1 ? Gates{2, 2} : controlled_u(controls);
    case Kind::r:
    case Kind::u:
      return controlled_u(controls);
    case Kind::swap:
      return controls == 0 ? Gates{0, 3} : controlled_x(controls + 1) + Gates{0, 2};
    case Kind::zz:
      return Gates{0, 2} + controlled_u(controls);
    case Kind::xx:
      return Gates{4, 2} + controlled_u(controls);
    default:
      return {};
  }
}

struct Counter {
  const Circuit& circuit;

  /// Counts a block; `depth[wire]` is the two-qubit depth so far and is carried on.
  Gates count(std::uint32_t block, std::vector<std::size_t>& depth) const {
    Gates sum;
    for (const Operation& op : circuit.blocks[block]) {
      if (op.kind == Kind::branch) {
        sum = sum + count(circuit.branches[op.payload], depth);
        continue;
      }
      const Gates gates = textbook(op);
      sum = sum + gates;
      if (gates.two == 0) continue;
      std::size_t reached = 0;
      for (const std::uint32_t wire : circuit.operands(op)) reached = std::max(reached, depth[wire]);
      for (const std::uint32_t wire : circuit.operands(op)) depth[wire] = reached + gates.two;
    }
    return sum;
  }

  Gates count(const Branch& branch, std::vector<std::size_t>& depth) const {
    Gates worst;
    std::vector<std::size_t> deepest = depth;
    for (const Branch::Arm& arm : branch.arms) {
      std::vector<std::size_t> here = depth;
      const Gates gates = count(arm.block, here);
      worst = {std::max(worst.one, gates.one), std::max(worst.two, gates.two)};
      for (std::size_t w = 0; w < here.size(); ++w) deepest[w] = std::max(deepest[w], here[w]);
    }
    depth = std::move(deepest);
    return worst;
  }
};

}  // namespace

std::size_t two_qubit_gates(const Operation& op) {
  return textbook(op).two;
}

Before before_of(const Circuit& source) {
  std::vector<std::size_t> depth(source.wires, 0);
  const Gates gates = Counter{source}.count(0, depth);
  const std::size_t deepest = depth.empty() ? 0 : *std::max_element(depth.begin(), depth.end());
  return {gates.one, gates.two, deepest};
}

}  // namespace isinglass
