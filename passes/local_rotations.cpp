// Gates to local Pauli rotations and back, and the walk over the pieces of a circuit; see local_rotations.h.
#include "passes/local_rotations.h"

#include <cmath>
#include <numeric>

#include "passes/rename_swaps.h"

namespace isinglass {

namespace {

constexpr double quarter = pi / 2;

/// Writes the rotations of one operation.
class Expansion {
 public:
  Expansion(Circuit& circuit, const Operation& op, std::vector<LocalRotation>& rotations)
      : circuit_(circuit), forms_(circuit.forms), op_(op), rotations_(rotations) {}

  bool run() {
    const int controls = op_.control_count();
    if (op_.kind == Kind::phase) return phase(controls);
    if (!op_.is_unitary() || controls > 1) return false;
    const auto operands = circuit_.operands(op_);
    is_controlled_ = controls == 1;
    control_ = operands[0];
    target_ = operands[static_cast<std::size_t>(controls)];
    if (target_count(op_.kind) == 2) return !is_controlled_ && two_targets(operands[0], operands[1]);
    one_target();
    return true;
  }

 private:
  void add(std::uint32_t wire, Letter letter, Angle angle) { add(wire, letter, wire, Letter::I, angle); }
  void add(std::uint32_t a, Letter la, std::uint32_t b, Letter lb, Angle angle) {
    if (angle == Angle{}) return;
    rotations_.push_back({{a, b}, {la, lb}, angle, op_.origin});
  }
  Angle half(Angle angle) { return forms_.scaled(angle, 0.5); }
  Angle negated(Angle angle) { return forms_.negated(angle); }

  /// exp(-i angle/2 letter) on the target, where the control is 1.
  void turn(Letter letter, Angle angle) {
    if (!is_controlled_) return add(target_, letter, angle);
    add(target_, letter, half(angle));
    add(control_, Letter::Z, target_, letter, negated(half(angle)));
  }
  /// e^{i angle}, where the control is 1.
  void shift(Angle angle) {
    if (is_controlled_) add(control_, Letter::Z, angle);
  }
  /// The Pauli matrix itself: e^{i pi/2} exp(-i pi/2 letter).
  void flip(Letter letter) {
    shift({quarter});
    turn(letter, {pi});
  }

  bool phase(int controls) {
    const auto operands = circuit_.operands(op_);
    const Angle angle = op_.angle(0);
    if (controls > 2) return false;
    if (controls == 1) add(operands[0], Letter::Z, angle);
    if (controls == 2) {
      add(operands[0], Letter::Z, half(angle));
      add(operands[1], Letter::Z, half(angle));
      add(operands[0], Letter::Z, operands[1], Letter::Z, negated(half(angle)));
    }
    return true;
  }

  /// exp(-i angle/2 (cos phi X + sin phi Y)) with any letters that fit phi, else between frame changes.
  void equatorial(Angle angle, Angle phi) {
    if (const auto quarters = quarters_of(phi)) {
      turn(*quarters % 2 == 0 ? Letter::X : Letter::Y, *quarters < 2 ? angle : negated(angle));
      return;
    }
    add(target_, Letter::Z, negated(phi));
    turn(Letter::X, angle);
    add(target_, Letter::Z, phi);
  }

  void one_target() {
    const Angle a = op_.angle(0), b = op_.angle(1), c = op_.angle(2);
    switch (op_.kind) {
      case Kind::x:
        return flip(Letter::X);
      case Kind::y:
        return flip(Letter::Y);
      case Kind::z:
        return flip(Letter::Z);
      case Kind::h:  // Z seen from an axis turned by pi/4 about Y
        if (!is_controlled_) {
          add(target_, Letter::Y, {quarter});
          return add(target_, Letter::X, {pi});
        }
        add(target_, Letter::Y, {-quarter / 2});
        flip(Letter::Z);
        return add(target_, Letter::Y, {quarter / 2});
      case Kind::p:
        shift(half(a));
        return turn(Letter::Z, a);
      case Kind::rz:
        return turn(Letter::Z, a);
      case Kind::r:
        return equatorial(a, b);
      default:  // u
        shift(half(forms_.sum(a, forms_.sum(b, c))));
        turn(Letter::Z, c);
        turn(Letter::Y, a);
        return turn(Letter::Z, b);
    }
  }

  bool two_targets(std::uint32_t first, std::uint32_t second) {
    const Angle angle = op_.angle(0);
    if (op_.kind == Kind::zz) {
      add(first, Letter::Z, second, Letter::Z, angle);
      return true;
    }
    if (op_.kind == Kind::swap) {
      for (const Letter letter : {Letter::X, Letter::Y, Letter::Z})
        add(first, letter, second, letter, {quarter});
      return true;
    }
    const auto qa = quarters_of(op_.angle(1)), qb = quarters_of(op_.angle(2));
    if (!qa) add(first, Letter::Z, negated(op_.angle(1)));
    if (!qb) add(second, Letter::Z, negated(op_.angle(2)));
    const int a = qa.value_or(0), b = qb.value_or(0);
    add(first, a % 2 == 0 ? Letter::X : Letter::Y, second, b % 2 == 0 ? Letter::X : Letter::Y,
        (a < 2) == (b < 2) ? angle : negated(angle));
    if (!qa) add(first, Letter::Z, op_.angle(1));
    if (!qb) add(second, Letter::Z, op_.angle(2));
    return true;
  }

  Circuit& circuit_;
  Forms& forms_;
  const Operation& op_;
  std::vector<LocalRotation>& rotations_;
  bool is_controlled_ = false;
  std::uint32_t control_ = 0, target_ = 0;
};

double phase_of(Letter letter) {
  return letter == Letter::Y ? quarter : 0;
}

/// Renames the wires of an operation and of all blocks under it.
void rename(Circuit& circuit, Operation& op, const std::vector<std::uint32_t>& where) {
  const auto operands = circuit.operands(op);
  std::vector<std::uint32_t> renamed(operands.begin(), operands.end());
  for (std::uint32_t& wire : renamed) wire = where[wire];
  circuit.set_operands(op, renamed);
  if (op.kind != Kind::branch) return;
  for (const Branch::Arm& arm : circuit.branches[op.payload].arms) {
    for (std::size_t i = 0; i < circuit.blocks[arm.block].size(); ++i) {
      Operation inner = circuit.blocks[arm.block][i];
      rename(circuit, inner, where);
      circuit.blocks[arm.block][i] = inner;
    }
  }
}

bool is_identity(const std::vector<std::uint32_t>& where) {
  for (std::uint32_t wire = 0; wire < where.size(); ++wire) {
    if (where[wire] != wire) return false;
  }
  return true;
}

Block rewritten_block(Circuit& circuit, const Block& block, bool may_rename, const PieceRewriter& rewrite) {
  std::vector<std::uint32_t> where(circuit.wires);  // where what the source has on a wire is by now
  std::iota(where.begin(), where.end(), 0u);
  bool renames = false;
  Block result;
  result.reserve(block.size());
  std::vector<LocalRotation> piece;
  std::size_t begin = 0;  // the operations of the piece are [begin, i)
  const auto copy_renamed = [&](Operation op) {
    if (renames) rename(circuit, op, where);
    result.push_back(op);
  };
  const auto finish_piece = [&](std::size_t end) {
    std::optional<RewrittenPiece> rewritten;
    if (!piece.empty()) rewritten = rewrite(circuit, std::move(piece), may_rename);
    piece.clear();
    if (!rewritten) {
      for (std::size_t i = begin; i < end; ++i) copy_renamed(block[i]);
      return;
    }
    for (LocalRotation& rotation : rewritten->rotations) {
      for (std::uint32_t& wire : rotation.wire) wire = where[wire];
      append_gates(circuit, rotation, result);
    }
    if (rewritten->moved.empty()) return;
    std::vector<std::uint32_t> moved = where;
    for (const auto& [from, to] : rewritten->moved) moved[from] = where[to];
    where = std::move(moved);
    renames = !is_identity(where);
  };
  for (std::size_t i = 0; i < block.size(); ++i) {
    if (append_rotations(circuit, block[i], piece)) continue;
    finish_piece(i);
    copy_renamed(block[i]);
    begin = i + 1;
  }
  finish_piece(block.size());
  if (renames) {
    for (std::uint32_t& wire : circuit.end_wire) wire = where[wire];
  }
  return result;
}

}  // namespace

std::optional<int> quarters_of(Angle angle) {
  if (!angle.is_known() || !is_multiple(angle.constant, quarter)) return std::nullopt;
  return static_cast<int>(std::llround(angle.constant / quarter) & 3);
}

bool append_rotations(Circuit& circuit, const Operation& op, std::vector<LocalRotation>& rotations) {
  return Expansion(circuit, op, rotations).run();
}

void append_gates(Circuit& circuit, const LocalRotation& rotation, Block& block) {
  const auto [a, b] = rotation.wire;
  Angle angle = rotation.angle;
  const auto pulse = [&](std::uint32_t wire, double theta, double phi) {
    block.push_back(circuit.make(Kind::r, {wire}, {{theta}, {phi}}, rotation.origin));
  };
  if (!rotation.is_pair()) {
    const Letter letter = rotation.letter[0];
    if (letter == Letter::Z) {
      block.push_back(circuit.make(Kind::rz, {a}, {angle}, rotation.origin));
    } else {
      block.push_back(circuit.make(Kind::r, {a}, {angle, {phase_of(letter)}}, rotation.origin));
    }
    return;
  }
  if (angle.is_known()) {
    // exp(-i pi/2 P) is P up to phase: half turns of the pair are half turns of each wire.
    const double turns = std::round(angle.constant / pi);
    angle.constant -= turns * pi;
    if (std::fmod(turns, 2) != 0) {
      for (int side = 0; side < 2; ++side) {
        LocalRotation flip{
            {rotation.wire[side], 0}, {rotation.letter[side], Letter::I}, {pi}, rotation.origin};
        append_gates(circuit, flip, block);
      }
    }
    if (std::abs(angle.constant) < 1e-12) return;
  }
  // Z = ry(-pi/2) X ry(pi/2)
  for (int side = 0; side < 2; ++side) {
    if (rotation.letter[side] == Letter::Z) pulse(rotation.wire[side], quarter, quarter);
  }
  block.push_back(circuit.make(Kind::xx, {a, b},
                               {angle, {phase_of(rotation.letter[0])}, {phase_of(rotation.letter[1])}},
                               rotation.origin));
  for (int side = 0; side < 2; ++side) {
    if (rotation.letter[side] == Letter::Z) pulse(rotation.wire[side], quarter, -quarter);
  }
}

void rewrite_pieces(Circuit& circuit, const PieceRewriter& rewrite) {
  const bool may_rename = may_rename_wires(circuit);
  // The children first: renaming in the program's block then reaches into finished blocks.
  for (std::size_t b = circuit.blocks.size(); b-- > 0;) {
    const Block block = std::move(circuit.blocks[b]);
    circuit.blocks[b].clear();
    Block result = rewritten_block(circuit, block, b == 0 && may_rename, rewrite);
    circuit.blocks[b] = std::move(result);
  }
}

}  // namespace isinglass
