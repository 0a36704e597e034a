// Gives every multi-controlled operation its cheapest construction.
//
//   before   c-c-c-x q0 q1 q2 q3            (a wire q4 still in |0>)
//   after    q4 ^= q0 q1 up to phases (3 interactions), c-c-x q4 q2 q3 (5), q4 ^= q0 q1 undone (3)
//
// Idea. The constructions (constructions.cpp) differ in the wires they may borrow. Here the idle wires are
// found: clean are the target's spare ions and, in a program that starts in |0...0>, wires that nothing has
// touched yet; dirty are all other wires of the program. Inside a branch only the branch's own wires are
// borrowed.
#include <algorithm>
#include <limits>

#include "passes/constructions.h"

namespace isinglass {

namespace {

constexpr std::size_t never = std::numeric_limits<std::size_t>::max();

bool needs_construction(const Operation& op) {
  return op.operand_count > 2 && op.is_unitary();
}

/// Position of the first operation of the program's body on each wire.
std::vector<std::size_t> first_touches(const Circuit& circuit) {
  std::vector<std::size_t> first(circuit.wires, never);
  const Block& body = circuit.body();
  for (std::size_t i = body.size(); i-- > 0;) {
    if (body[i].kind == Kind::barrier) continue;
    for (const std::uint32_t wire : circuit.operands(body[i])) first[wire] = i;
  }
  return first;
}

/// For every block the wires it may touch: all for the body, those of the branch for an arm.
std::vector<std::vector<std::uint32_t>> wires_of_blocks(const Circuit& circuit) {
  std::vector<std::vector<std::uint32_t>> wires(circuit.blocks.size());
  for (std::uint32_t wire = 0; wire < circuit.wires; ++wire) wires[0].push_back(wire);
  for (const Block& block : circuit.blocks) {
    for (const Operation& op : block) {
      if (op.kind != Kind::branch) continue;
      const auto touched = circuit.operands(op);
      for (const Branch::Arm& arm : circuit.branches[op.payload].arms) {
        wires[arm.block].assign(touched.begin(), touched.end());
      }
    }
  }
  return wires;
}

class Chooser {
 public:
  Chooser(Circuit& circuit, const PassContext& context)
      : circuit_(circuit),
        cost_(context.cost),
        zero_start_(context.promise.zero_start),
        first_touch_(first_touches(circuit)),
        wires_of_(wires_of_blocks(circuit)) {
    const std::uint32_t claimed = circuit.wires - circuit.source_qubits;
    spare_ = context.spare_wires > claimed ? context.spare_wires - claimed : 0;
    // Untouched wires that stay untouched longest come first.
    for (std::uint32_t wire = 0; wire < circuit.wires; ++wire) by_first_touch_.push_back(wire);
    std::stable_sort(by_first_touch_.begin(), by_first_touch_.end(),
                     [&](auto a, auto b) { return first_touch_[a] > first_touch_[b]; });
  }

  void run() {
    for (std::size_t b = 0; b < circuit_.blocks.size(); ++b) {
      const Block before = std::move(circuit_.blocks[b]);
      Block after;
      after.reserve(before.size());
      for (std::size_t i = 0; i < before.size(); ++i) {
        if (needs_construction(before[i])) {
          simplify(circuit_, before[i], idle_at(b, i, before[i]), cost_, after);
        } else {
          after.push_back(before[i]);
        }
      }
      claim_spare_wires(after);
      circuit_.blocks[b] = std::move(after);
    }
  }

 private:
  /// As many as the operation could use. Spare ions are numbered from circuit.wires on.
  IdleWires idle_at(std::size_t block, std::size_t position, const Operation& op) const {
    const auto operands = circuit_.operands(op);
    const std::size_t useful = operands.size();
    const auto is_operand = [&](std::uint32_t wire) {
      return std::find(operands.begin(), operands.end(), wire) != operands.end();
    };
    IdleWires idle;
    if (op.control_count() < 2) return idle;
    if (block == 0) {
      for (std::uint32_t i = 0; i < spare_ && idle.clean.size() < useful; ++i) {
        idle.clean.push_back(source_wires_ + i);
      }
      for (const std::uint32_t wire : by_first_touch_) {
        if (!zero_start_ || idle.clean.size() >= useful || first_touch_[wire] < position) break;
        if (!is_operand(wire)) idle.clean.push_back(wire);
      }
    }
    for (const std::uint32_t wire : wires_of_[block]) {
      if (idle.dirty.size() >= useful) break;
      const bool is_clean = std::find(idle.clean.begin(), idle.clean.end(), wire) != idle.clean.end();
      if (!is_operand(wire) && !is_clean) idle.dirty.push_back(wire);
    }
    return idle;
  }

  void claim_spare_wires(const Block& block) {
    for (const Operation& op : block) {
      for (const std::uint32_t wire : circuit_.operands(op)) {
        circuit_.wires = std::max(circuit_.wires, wire + 1);
      }
    }
  }

  Circuit& circuit_;
  Cost cost_;
  bool zero_start_;
  std::vector<std::size_t> first_touch_;
  std::vector<std::vector<std::uint32_t>> wires_of_;
  std::vector<std::uint32_t> by_first_touch_;
  std::uint32_t spare_ = 0;
  std::uint32_t source_wires_ = circuit_.wires;  // before spare ions were claimed
};

}  // namespace

Circuit choose_constructions(Circuit circuit, const PassContext& context) {
  for (const Block& block : circuit.blocks) {
    if (std::none_of(block.begin(), block.end(), needs_construction)) continue;
    Chooser(circuit, context).run();
    break;
  }
  return circuit;
}

std::optional<Circuit> choose_constructions_beside(const Circuit& circuit, const PassContext& context) {
  for (const Block& block : circuit.blocks) {
    if (std::any_of(block.begin(), block.end(), needs_construction)) {
      return choose_constructions(circuit, context);
    }
  }
  return std::nullopt;
}

}  // namespace isinglass
