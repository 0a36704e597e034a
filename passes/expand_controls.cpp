// Gates with several controls, written with gates on two wires: the plain way, exact and without ancillas.
//
//     --*--        -----*-----*---*--
//     --*--   ==>  --*--X--*--X---|--        V V = U
//     --U--        --V-----V^-1---V--
//
// Barenco et al., "Elementary gates for quantum computation", Phys. Rev. A 52, 3457 (1995), lemma 7.5; inner
// NOTs borrow an idle wire (lemma 7.3), which keeps the growth polynomial. Phases and rotations halve by
// halving the angle, which symbolic angles allow; other gates are turned into those first.
#include "passes/expand_controls.h"

#include <algorithm>

namespace isinglass {

namespace {

using Wires = std::vector<std::uint32_t>;

class Expander {
 public:
  Expander(Circuit& circuit, Block& out) : circuit_(circuit), out_(out) {}

  void expand(const Operation& op) {
    if (!op.is_unitary() || op.operand_count <= 2) {
      out_.push_back(op);
      return;
    }
    origin_ = op.origin;
    Wires controls(circuit_.controls(op).begin(), circuit_.controls(op).end());
    const Wires targets(circuit_.targets(op).begin(), circuit_.targets(op).end());
    gate(op, controls, targets);
  }

 private:
  void emit(Kind kind, const Wires& operands, std::initializer_list<Angle> angles = {}) {
    out_.push_back(circuit_.make(kind, operands, std::span(angles.begin(), angles.size()), origin_));
  }

  void gate(const Operation& op, Wires& controls, const Wires& targets) {
    Forms& forms = circuit_.forms;
    const Angle t = op.angle(0);
    switch (op.kind) {
      case Kind::phase: {
        const std::uint32_t last = controls.back();
        controls.pop_back();
        return phase(controls, last, t);
      }
      case Kind::x:
        return flip(controls, targets[0]);
      case Kind::y:  // S X S^-1
        emit(Kind::p, {targets[0]}, {{-pi / 2}});
        flip(controls, targets[0]);
        return emit(Kind::p, {targets[0]}, {{pi / 2}});
      case Kind::z:
        return phase(controls, targets[0], {pi});
      case Kind::h:  // ry(pi/4) Z ry(-pi/4)
        emit(Kind::r, {targets[0]}, {{-pi / 4}, {pi / 2}});
        phase(controls, targets[0], {pi});
        return emit(Kind::r, {targets[0]}, {{pi / 4}, {pi / 2}});
      case Kind::p:
        return phase(controls, targets[0], t);
      case Kind::rz:
        return turn(controls, targets[0], t);
      case Kind::r:
        return turn_in_plane(controls, targets[0], t, op.angle(1));
      case Kind::u: {  // e^{i(t+f+l)/2} [rz(f) ry(t) rz(-f)] rz(f + l)
        const Angle sum = forms.sum(op.angle(1), op.angle(2));
        const std::uint32_t last = controls.back();
        controls.pop_back();
        phase(controls, last, forms.scaled(forms.sum(t, sum), 0.5));
        controls.push_back(last);
        turn(controls, targets[0], sum);
        return turn_in_plane(controls, targets[0], t, forms.sum(op.angle(1), {pi / 2}));
      }
      case Kind::swap:
        emit(Kind::x, {targets[1], targets[0]});
        controls.push_back(targets[0]);
        flip(controls, targets[1]);
        return emit(Kind::x, {targets[1], targets[0]});
      case Kind::zz:
        return turn_pair(controls, targets, t);
      case Kind::xx:
        for (const int side : {0, 1}) tilt(targets[side], op.angle(1 + side), -1);
        turn_pair(controls, targets, t);
        for (const int side : {0, 1}) tilt(targets[side], op.angle(1 + side), +1);
        return;
      default:
        return;
    }
  }

  /// Before (sign -1) and after (+1) a rotation about z: makes it one about cos phi X + sin phi Y.
  void tilt(std::uint32_t wire, Angle phi, double sign) {
    emit(Kind::r, {wire}, {{sign * pi / 2}, circuit_.forms.sum(phi, {pi / 2})});
  }

  void turn_in_plane(const Wires& controls, std::uint32_t target, Angle theta, Angle phi) {
    tilt(target, phi, -1);
    turn(controls, target, theta);
    tilt(target, phi, +1);
  }

  /// Controlled exp(-i t/2 Z(x)Z).
  void turn_pair(const Wires& controls, const Wires& targets, Angle theta) {
    emit(Kind::x, {targets[0], targets[1]});
    turn(controls, targets[1], theta);
    emit(Kind::x, {targets[0], targets[1]});
  }

  /// rz(theta) on the target when all controls are 1: half turns between NOTs.
  void turn(const Wires& controls, std::uint32_t target, Angle theta) {
    if (controls.size() == 1) return emit(Kind::rz, {controls[0], target}, {theta});
    const Angle half = circuit_.forms.scaled(theta, 0.5);
    const Wires inner(controls.begin(), controls.end() - 1);
    emit(Kind::rz, {controls.back(), target}, {half});
    flip_borrowing(inner, controls.back(), target);
    emit(Kind::rz, {controls.back(), target}, {circuit_.forms.negated(half)});
    flip_borrowing(inner, controls.back(), target);
    turn(inner, target, half);
  }

  /// e^{i lambda} when the target and all controls are 1.
  void phase(const Wires& controls, std::uint32_t target, Angle lambda) {
    if (controls.empty()) return emit(Kind::p, {target}, {lambda});
    if (controls.size() == 1) return emit(Kind::p, {controls[0], target}, {lambda});
    const Angle half = circuit_.forms.scaled(lambda, 0.5);
    const Wires inner(controls.begin(), controls.end() - 1);
    emit(Kind::p, {controls.back(), target}, {half});
    flip_borrowing(inner, controls.back(), target);
    emit(Kind::p, {controls.back(), target}, {circuit_.forms.negated(half)});
    flip_borrowing(inner, controls.back(), target);
    phase(inner, target, half);
  }

  void flip(const Wires& controls, std::uint32_t target) {
    if (controls.size() == 1) return emit(Kind::x, {controls[0], target});
    emit(Kind::h, {target});
    phase(controls, target, {pi});
    emit(Kind::h, {target});
  }

  /// NOT with controls, where the wire `borrowed` is neither control nor target and comes back as it was.
  void flip_borrowing(const Wires& controls, std::uint32_t target, std::uint32_t borrowed) {
    if (controls.size() <= 2) return flip(controls, target);
    const auto half = static_cast<std::ptrdiff_t>((controls.size() + 1) / 2);
    const Wires first(controls.begin(), controls.begin() + half);
    Wires second(controls.begin() + half, controls.end());
    const std::uint32_t spare_of_second = first.front();
    second.push_back(borrowed);
    for (int round = 0; round < 2; ++round) {
      flip_borrowing(first, borrowed, target);
      flip_borrowing(second, target, spare_of_second);
    }
  }

  Circuit& circuit_;
  Block& out_;
  Origin origin_;
};

}  // namespace

Circuit expand_controls(Circuit circuit, const PassContext&) {
  for (Block& block : circuit.blocks) {
    const bool is_expanded = std::none_of(block.begin(), block.end(), [](const Operation& op) {
      return op.is_unitary() && op.operand_count > 2;
    });
    if (is_expanded) continue;
    const Block source = std::move(block);
    block.clear();
    Expander expander(circuit, block);
    for (const Operation& op : source) expander.expand(op);
  }
  return circuit;
}

}  // namespace isinglass
