// Gates whose controls are known need not ask.
//
//     |0> --*--           |0> -----
//           |      ==>                        |0> --X--*--        |0> --X--
//         --X--               -----                    |    ==>
//                                                    --X--            --X--
//
// A wire that starts in |0> (all of them where the promise says so, ancillas always, any wire after a reset)
// holds a known bit until a gate makes something else of it. A control that holds 0 takes its gate away, one
// that holds 1 goes itself; phases of known wires are global. Only the program's body is followed. (Common
// practice.)
#include "passes/known_start.h"

#include <algorithm>
#include <optional>

namespace isinglass {

namespace {

class Follower {
 public:
  Follower(Circuit& circuit, bool zero_start) : circuit_(circuit), bit_(circuit.wires) {
    for (std::uint32_t w = 0; w < circuit.wires; ++w) {
      if (zero_start || w >= circuit.source_qubits) bit_[w] = false;
    }
  }

  void run() {
    Block kept;
    kept.reserve(circuit_.body().size());
    for (Operation op : circuit_.body()) {
      if (op.is_unitary() ? gate(op) : other(op)) kept.push_back(op);
    }
    circuit_.body() = std::move(kept);
  }

 private:
  /// Simplifies the gate and follows what it does; false where nothing of it is left.
  bool gate(Operation& op) {
    if (op.kind == Kind::z) {  // as a phase, whose operands are all alike
      op.kind = Kind::phase;
      op.set_angle(0, {pi});
    } else if (op.kind == Kind::p) {
      op.kind = Kind::phase;
    }
    if (!resolve_controls(op)) return false;
    const auto targets = circuit_.targets(op);
    switch (op.kind) {
      case Kind::phase:
        return op.operand_count > 0;
      case Kind::rz:
        return turn(op, targets[0]);
      case Kind::x:
        if (op.control_count() == 0 && bit_[targets[0]]) {
          bit_[targets[0]] = !*bit_[targets[0]];
        } else {
          bit_[targets[0]].reset();
        }
        return true;
      case Kind::swap:
        return exchange(op, targets[0], targets[1]);
      case Kind::zz:
        return true;  // moves no bit
      default:
        for (const std::uint32_t wire : targets) bit_[wire].reset();
        return true;
    }
  }

  bool resolve_controls(Operation& op) {
    const auto operands = circuit_.operands(op);
    const auto controls = static_cast<std::size_t>(op.control_count());
    std::vector<std::uint32_t> left;
    for (std::size_t i = 0; i < operands.size(); ++i) {
      const auto known = bit_[operands[i]];
      if (i < controls && known == false) return false;
      if (i >= controls || !known) left.push_back(operands[i]);
    }
    if (left.size() < operands.size()) circuit_.set_operands(op, left);
    return true;
  }

  /// rz of a known wire is a phase of the controls.
  bool turn(Operation& op, std::uint32_t target) {
    if (!bit_[target]) return true;
    const auto controls = circuit_.controls(op);
    if (controls.empty()) return false;
    const std::vector<std::uint32_t> left(controls.begin(), controls.end());
    op.kind = Kind::phase;
    op.set_angle(0, circuit_.forms.scaled(op.angle(0), *bit_[target] ? 0.5 : -0.5));
    circuit_.set_operands(op, left);
    return true;
  }

  bool exchange(const Operation& op, std::uint32_t a, std::uint32_t b) {
    if (bit_[a] && bit_[a] == bit_[b]) return false;
    if (op.control_count() == 0) {
      std::swap(bit_[a], bit_[b]);
    } else {
      bit_[a].reset();
      bit_[b].reset();
    }
    return true;
  }

  bool other(const Operation& op) {
    if (op.kind == Kind::reset) {
      std::optional<bool>& bit = bit_[op.operand[0]];
      const bool is_needless = bit == false;
      bit = false;
      return !is_needless;
    }
    if (op.kind == Kind::branch) {
      for (const std::uint32_t wire : circuit_.operands(op)) bit_[wire].reset();
    }
    return true;
  }

  Circuit& circuit_;
  std::vector<std::optional<bool>> bit_;  // what each wire holds, where it is known
};

}  // namespace

Circuit known_start(Circuit circuit, const PassContext& context) {
  Follower(circuit, context.promise.zero_start).run();
  return circuit;
}

}  // namespace isinglass
