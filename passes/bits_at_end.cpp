// NOTs and swaps between the last real gate and the final measurements are arithmetic on bits.
//
//     --*--M=c[0]        --M=c[0]
//       |           ==>                c[1] = c[1] ^ c[0];
//     --X--M=c[1]        --M=c[1]
//
// A gate that only permutes basis states, phases apart, commutes with measuring them. Looking back from the
// end such gates are taken off as long as all their wires are measured last, each into a bit of its own; the
// bits are then computed in the order of the gates. It is done only where the program has no classical code
// that could read the bits too early, and where some gate on several wires goes. (Common practice.)
#include "passes/bits_at_end.h"

#include <algorithm>
#include <string>
#include <utility>

#include "circuit/physical.h"

namespace isinglass {

namespace {

class Bits {
 public:
  explicit Bits(Circuit& circuit)
      : circuit_(circuit),
        swaps_(!has_pinned(circuit)),
        bit_(circuit.wires, no_bit),
        is_open_(circuit.wires),
        is_last_(circuit.wires, true) {}

  void run() {
    Block& body = circuit_.body();
    for (const Operation& op : body) {
      if (op.kind == Kind::branch || op.kind == Kind::classical) return;
    }
    find_measurements();
    std::vector<bool> is_taken(body.size(), false);
    bool any_interaction = false;
    for (std::size_t i = body.size(); i-- > 0;) {
      const Operation& op = body[i];
      if (op.kind == Kind::barrier) continue;
      if (op.kind == Kind::measure && is_last_[op.operand[0]]) {
        is_last_[op.operand[0]] = false;
        continue;
      }
      if (op.is_unitary() && op.operand_count > 0 && all_open(op) && permutes(op)) {
        is_taken[i] = true;
        any_interaction = any_interaction || (op.operand_count > 1 && op.kind != Kind::swap);
        maps_.push_back(op);
      } else {
        for (const std::uint32_t wire : circuit_.operands(op)) is_open_[wire] = false;
      }
    }
    if (!any_interaction) return;
    Block kept;
    for (std::size_t i = 0; i < body.size(); ++i) {
      if (!is_taken[i]) kept.push_back(body[i]);
    }
    body = std::move(kept);
    for (auto op = maps_.rbegin(); op != maps_.rend(); ++op) write(*op);
  }

 private:
  /// A wire is open where its last operation, barriers apart, measures it into a bit that no other does.
  void find_measurements() {
    std::vector<int> writers(circuit_.bits, 0);
    for (const Operation& op : circuit_.body()) {
      if (op.kind == Kind::barrier) continue;
      for (const std::uint32_t wire : circuit_.operands(op)) bit_[wire] = no_bit;
      if (op.kind != Kind::measure || op.payload == no_bit) continue;
      bit_[op.operand[0]] = op.payload;
      ++writers[op.payload];
    }
    for (std::uint32_t w = 0; w < circuit_.wires; ++w) {
      is_open_[w] = bit_[w] != no_bit && writers[bit_[w]] == 1;
    }
  }

  bool all_open(const Operation& op) const {
    const auto operands = circuit_.operands(op);
    return std::all_of(operands.begin(), operands.end(), [&](std::uint32_t w) { return is_open_[w]; });
  }

  bool permutes(const Operation& op) const {
    switch (op.kind) {
      case Kind::phase:
      case Kind::z:
      case Kind::p:
      case Kind::rz:
      case Kind::zz:
      case Kind::x:
      case Kind::y:
        return true;
      case Kind::swap:
        return op.control_count() == 0 && swaps_;
      default:
        return false;
    }
  }

  Expression variable_of(std::uint32_t flat) const {
    for (std::uint32_t v = 0; v < circuit_.variables.size(); ++v) {
      const Variable& variable = circuit_.variables[v];
      if (flat < variable.first_bit || flat >= variable.first_bit + variable.bits) continue;
      Expression name;
      name.kind = Expression::Kind::variable;
      name.variable = v;
      if (variable.is_scalar) return name;
      Expression index;
      index.kind = Expression::Kind::index;
      Expression place;
      place.text = std::to_string(flat - variable.first_bit);
      index.arguments = {name, place};
      return index;
    }
    return {};
  }

  Expression bit_of(std::uint32_t wire) const { return variable_of(bit_[wire]); }

  static Expression binary(std::string operation, Expression left, Expression right) {
    Expression expression;
    expression.kind = Expression::Kind::binary;
    expression.text = std::move(operation);
    expression.arguments = {std::move(left), std::move(right)};
    return expression;
  }

  void assign(std::uint32_t wire, Expression value, Origin origin) {
    ClassicalStatement statement;
    statement.target = bit_of(wire);
    statement.value = std::move(value);
    Operation op = circuit_.make(Kind::classical, {}, {}, origin);
    op.payload = static_cast<std::uint32_t>(circuit_.statements.size());
    circuit_.statements.push_back(std::move(statement));
    circuit_.body().push_back(op);
  }

  void write(const Operation& op) {
    if (op.kind == Kind::swap) return exchange(op);
    if (op.kind != Kind::x && op.kind != Kind::y) return;  // phases
    const std::uint32_t target = circuit_.targets(op)[0];
    const auto controls = circuit_.controls(op);
    if (controls.empty()) {
      Expression flipped;
      flipped.kind = Expression::Kind::unary;
      flipped.text = "~";
      flipped.arguments = {bit_of(target)};
      return assign(target, flipped, op.origin);
    }
    Expression condition = bit_of(controls[0]);
    for (const std::uint32_t control : controls.subspan(1)) {
      condition = binary("&", condition, bit_of(control));
    }
    assign(target, binary("^", bit_of(target), condition), op.origin);
  }

  /// a ^= b, b ^= a, a ^= b.
  void exchange(const Operation& op) {
    const std::uint32_t a = op.operand[0];
    const std::uint32_t b = op.operand[1];
    for (const auto& [target, other] : {std::pair{a, b}, std::pair{b, a}, std::pair{a, b}}) {
      assign(target, binary("^", bit_of(target), bit_of(other)), op.origin);
    }
  }

  Circuit& circuit_;
  bool swaps_;                      // whether a swap may be done on bits: not of physical qubits
  std::vector<std::uint32_t> bit_;  // into which a wire is measured at its end
  std::vector<bool> is_open_;
  std::vector<bool> is_last_;    // the wire's final measurement is still to come, looking back
  std::vector<Operation> maps_;  // taken off, the last first
};

}  // namespace

Circuit bits_at_end(Circuit circuit, const PassContext&) {
  Bits(circuit).run();
  return circuit;
}

}  // namespace isinglass
