// Multi-controlled operations written with the fewest interactions; see constructions.h.
//
//   before   c-c-x a b t
//   after    r(m) t,  [b: Ry(-2x)] [a: Rx(-2x)] [b: Ry(2x)] [a: Rx(2x)] on t,  r(-m) t,  c-p(pi/2) a b
//            (each bracket one controlled rotation: one xx of angle x; sin^2 x = sin(pi/4))
//
// Idea. A commutator A B A^-1 B^-1 of rotations vanishes unless both are there, so controlling A by one wire
// and B by another makes a doubly controlled rotation from four interactions whose angle is free. Its angle
// phi obeys sin(phi/4) = sin(A/2) sin(B/2) sin(angle between the axes); the three are best equal. One more
// control goes into the axis of A, which a controlled rotation tilts. Beyond that the rotation is split
// between two flips of its sign, which may leave phases; these flips are the relative-phase Toffoli and its
// kin. A multi-controlled phase is a rotation and a phase on the controls, by recursion. Clean wires hold the
// AND of some controls; with a dirty wire d a flip is the commutator of a Toffoli from d and a flip of d.
//
// Papers: Barenco et al., "Elementary gates for quantum computation", PRA 52, 3457 (splitting, dirty wires);
// Song, Klappenecker, quant-ph/0312225 (relative-phase Toffoli); Iten et al., PRA 93, 032318 (relative phases
// in chains of dirty wires); Smolin, DiVincenzo, PRA 53, 2855 (controlled swap). The commutator's closed form
// was derived for this program.
#include "passes/constructions.h"

#include <algorithm>
#include <cmath>
#include <limits>
#include <map>
#include <tuple>
#include <utility>

#include "algebra/su2.h"

namespace isinglass {

namespace {

using Wires = std::vector<std::uint32_t>;

// ---- rotations of one qubit
// ---------------------------------------------------------------------------------

/// The angles (theta, phi) of the r that turns the z axis onto the axis of `q`.
std::pair<double, double> tilt_onto_axis(const Su2& q) {
  const double across = std::hypot(q.x(), q.y());
  if (across == 0) return {q.z() < 0 ? pi : 0.0, 0.0};
  return {std::atan2(across, q.z()), std::atan2(q.x(), -q.y())};
}

Su2 commutator_of(const Su2& a, const Su2& b) {
  return a * b * a.conjugate() * b.conjugate();
}

/// The same rotation of period 4 pi with angle in (-2 pi, 2 pi].
double wrapped_rotation(double angle) {
  return 2 * wrapped(angle / 2);
}

// ---- how many interactions each construction takes
// ----------------------------------------------------------

constexpr int many = std::numeric_limits<int>::max() / 8;

/// Counts of the constructions by number of controls, to choose without building. `dirty` wires come back
/// to their state within the construction; `garbage` wires may be left flipped by a flip that is undone
/// later.
class Counts {
 public:
  /// X on the target up to phases.
  int flip(int controls, int garbage, int dirty) {
    if (controls <= 2) return controls == 0 ? 0 : controls == 1 ? 1 : 3;
    const std::tuple key(controls, std::min(garbage, controls), std::min(dirty, controls));
    if (const auto known = flips_.find(key); known != flips_.end()) return known->second;
    const int best =
        std::min(flip_by_rotation(controls, garbage, dirty), flip_by_garbage(controls, garbage, dirty));
    return flips_[key] = best;
  }
  int flip_by_rotation(int controls, int garbage, int dirty) {
    return 2 + rotation(controls - 1, garbage + dirty);
  }
  int flip_by_garbage(int controls, int garbage, int dirty) {
    return garbage == 0 || controls < 3 ? many : 4 + flip(controls - 1, garbage - 1, dirty);
  }

  /// Any rotation of the target, exactly.
  int rotation(int controls, int dirty) { return split_rotation(controls, dirty).count; }
  /// How many of four or more controls should go with the rotation, the others with the flips.
  int best_split(int controls, int dirty) { return split_rotation(controls, dirty).with_rotation; }

  /// A phase on `wires` wires; `is_pi`: of -1, which dirty wires help.
  int phase(int wires, int clean, int dirty, bool is_pi) {
    if (wires <= 2) return wires == 2 ? 1 : 0;
    return std::min({phase_by_rotation(wires, clean, dirty), phase_by_clean(wires, clean, dirty, is_pi, 2),
                     phase_by_clean(wires, clean, dirty, is_pi, 3), phase_by_dirty(wires, dirty, is_pi)});
  }
  int phase_by_rotation(int wires, int clean, int dirty) {
    return rotation(wires - 1, clean + dirty) + phase(wires - 1, clean, dirty + 1, false);
  }
  int phase_by_clean(int wires, int clean, int dirty, bool is_pi, int group) {
    if (clean == 0 || wires <= group) return many;
    return 2 * flip(group, 0, 0) + phase(wires - group + 1, clean - 1, dirty + group, is_pi);
  }
  int phase_by_dirty(int wires, int dirty, bool is_pi) {
    if (!is_pi || dirty == 0 || wires < 4) return many;
    return 8 + 2 * flip(wires - 2, dirty - 1, 2);
  }

  int rotation_by_clean(int controls, int clean, int dirty, int group) {
    if (clean == 0 || controls <= group) return many;
    return 2 * flip(group, 0, 0) + best_rotation(controls - group + 1, clean - 1, dirty + group);
  }
  int best_rotation(int controls, int clean, int dirty) {
    return std::min({rotation(controls, clean + dirty), rotation_by_clean(controls, clean, dirty, 2),
                     rotation_by_clean(controls, clean, dirty, 3)});
  }

 private:
  struct Split {
    int count;
    int with_rotation;
  };
  Split split_rotation(int controls, int dirty) {
    constexpr int closed_form[] = {0, 1, 4, 8};
    if (controls <= 3) return {closed_form[controls], 1};
    const std::pair key(controls, std::min(dirty, controls));
    if (const auto known = splits_.find(key); known != splits_.end()) return known->second;
    Split best{many, 1};
    for (const int b : {1, 2, 3, controls / 2}) {
      if (b > controls / 2) continue;
      const int count = 2 * flip(controls - b, dirty, b) + 2 * rotation(b, controls - b);
      if (count < best.count) best = {count, b};
    }
    splits_[key] = best;
    return best;
  }

  std::map<std::tuple<int, int, int>, int> flips_;
  std::map<std::pair<int, int>, Split> splits_;
};

// ---- writing them
// -------------------------------------------------------------------------------------------

int count(const Wires& wires) {
  return static_cast<int>(wires.size());
}
Wires joined(Wires a, const Wires& b) {
  a.insert(a.end(), b.begin(), b.end());
  return a;
}
Wires without_first(const Wires& wires, std::size_t dropped) {
  return {wires.begin() + static_cast<std::ptrdiff_t>(dropped), wires.end()};
}
Wires first_of(const Wires& wires, std::size_t kept) {
  return {wires.begin(), wires.begin() + static_cast<std::ptrdiff_t>(kept)};
}

/// Appends operations with at most one control to `out`.
class Writer {
 public:
  Writer(Circuit& circuit, Origin origin, const Cost& cost, Block& out)
      : circuit_(circuit), origin_(origin), cost_(cost), out_(out) {}

  void add(Kind kind, std::initializer_list<std::uint32_t> operands,
           std::initializer_list<Angle> angles = {}) {
    out_.push_back(circuit_.make(kind, operands, angles, origin_));
  }
  void turn(std::uint32_t wire, double theta, double phi) {
    if (theta != 0) add(Kind::r, {wire}, {{theta}, {phi}});
  }
  void controlled_x_turn(std::uint32_t control, std::uint32_t target, double angle) {
    add(Kind::r, {control, target}, {{angle}, {0}});
  }
  void controlled_y_turn(std::uint32_t control, std::uint32_t target, double angle) {
    add(Kind::r, {control, target}, {{angle}, {pi / 2}});
  }

  std::size_t mark() const { return out_.size(); }

  /// exp(-i angle/2 Z) on the target where all controls are 1. `dirty` wires may be borrowed.
  void rotation_z(const Wires& controls, std::uint32_t target, Angle angle, const Wires& dirty) {
    if (controls.empty()) return add(Kind::rz, {target}, {angle});
    if (angle.is_known()) {
      const double known = wrapped_rotation(angle.constant);
      if (known == 0) return;
      if (controls.size() <= 3) return known_rotation_z(controls, target, known);
    } else if (controls.size() == 1) {
      return add(Kind::rz, {controls[0], target}, {angle});
    }
    // A rotation and a flipped one cancel unless the flips act.
    const int controls_count = count(controls);
    const int with_rotation = controls_count <= 3 ? 1 : counts_.best_split(controls_count, count(dirty));
    const Wires turning = first_of(controls, static_cast<std::size_t>(with_rotation));
    const Wires flipping = without_first(controls, static_cast<std::size_t>(with_rotation));
    const std::size_t from = mark();
    flip(flipping, target, dirty, turning);
    const std::size_t to = mark();
    rotation_z(turning, target, circuit_.forms.scaled(angle, -0.5), flipping);
    undo(from, to);
    rotation_z(turning, target, circuit_.forms.scaled(angle, 0.5), flipping);
  }

  /// X on the target where all controls are 1, up to a sign or phase of each basis state; flips some wires of
  /// `garbage` depending on controls. `dirty` wires may be borrowed.
  void flip(const Wires& controls, std::uint32_t target, const Wires& garbage, const Wires& dirty) {
    const int k = count(controls);
    const int g = count(garbage);
    const int d = count(dirty);
    if (k == 1) return add(Kind::x, {controls[0], target});
    const std::uint32_t outer = controls[0];
    const Wires inner = without_first(controls, 1);
    controlled_y_turn(outer, target, -pi / 2);
    if (k == 2) {
      add(Kind::z, {inner[0], target});
    } else if (counts_.flip_by_garbage(k, g, d) < counts_.flip_by_rotation(k, g, d)) {
      add(Kind::z, {garbage[0], target});
      flip(inner, garbage[0], without_first(garbage, 1), dirty);
      add(Kind::z, {garbage[0], target});
    } else {
      rotation_z(inner, target, {pi}, joined(garbage, dirty));
    }
    controlled_y_turn(outer, target, pi / 2);
  }

  /// e^{i angle} where all wires are 1.
  void phase(const Wires& wires, Angle angle, const IdleWires& idle) {
    if (wires.empty()) return;
    if (angle.is_known()) angle.constant = wrapped(angle.constant);
    if (angle.is_known() && angle.constant == 0) return;
    if (wires.size() == 1) return add(Kind::p, {wires[0]}, {angle});
    if (wires.size() == 2) return add(Kind::p, {wires[0], wires[1]}, {angle});
    const int n = count(wires);
    const int clean = count(idle.clean);
    const int dirty = count(idle.dirty);
    const bool is_pi = angle.is_known() && is_multiple(angle.constant - pi, 2 * pi);
    const int best = counts_.phase(n, clean, dirty, is_pi);
    for (const int group : {2, 3}) {
      if (counts_.phase_by_clean(n, clean, dirty, is_pi, group) == best) {
        return with_and_on_clean(wires, group, idle, [&](const Wires& fewer, const IdleWires& rest) {
          phase(fewer, angle, rest);
        });
      }
    }
    if (counts_.phase_by_dirty(n, dirty, is_pi) == best) return sign_with_dirty(wires, idle.dirty);
    const Wires controls = first_of(wires, wires.size() - 1);
    const std::uint32_t target = wires.back();
    rotation_z(controls, target, angle, joined(idle.clean, idle.dirty));
    IdleWires rest = idle;
    rest.dirty.push_back(target);
    phase(controls, circuit_.forms.scaled(angle, 0.5), rest);
  }

  /// As rotation_z, with clean wires too.
  void rotation_z(const Wires& controls, std::uint32_t target, Angle angle, const IdleWires& idle) {
    const int k = count(controls);
    const int clean = count(idle.clean);
    const int dirty = count(idle.dirty);
    const int best = counts_.best_rotation(k, clean, dirty);
    for (const int group : {2, 3}) {
      if (counts_.rotation_by_clean(k, clean, dirty, group) == best &&
          best < counts_.rotation(k, clean + dirty)) {
        return with_and_on_clean(controls, group, idle, [&](const Wires& fewer, const IdleWires& rest) {
          rotation_z(fewer, target, angle, rest);
        });
      }
    }
    rotation_z(controls, target, angle, joined(idle.clean, idle.dirty));
  }

  /// The doubly controlled rotation about z: four interactions. The first is by controls `first`, the last by
  /// `second`; 0 < |angle| <= 2 pi.
  void commutator(std::uint32_t first, std::uint32_t second, std::uint32_t target, double angle) {
    const double x = std::asin(std::sqrt(std::sin(std::abs(angle) / 4)));
    const auto [theta, phi] = tilt_onto_axis(commutator_of(rotation_x(2 * x), rotation_y(2 * x)));
    turn(target, theta, phi);
    if (angle > 0) {
      controlled_y_turn(first, target, -2 * x);
      controlled_x_turn(second, target, -2 * x);
      controlled_y_turn(first, target, 2 * x);
      controlled_x_turn(second, target, 2 * x);
    } else {
      controlled_x_turn(first, target, -2 * x);
      controlled_y_turn(second, target, -2 * x);
      controlled_x_turn(first, target, 2 * x);
      controlled_y_turn(second, target, 2 * x);
    }
    turn(target, -theta, phi);
  }

 private:
  /// Appends the inverse of what stands at [from, to) of what was written.
  void undo(std::size_t from, std::size_t to) {
    for (std::size_t i = to; i-- > from;) {
      Operation op = out_[i];
      if (angle_count(op.kind) > 0) op.set_angle(0, circuit_.forms.negated(op.angle(0)));
      out_.push_back(op);
    }
  }

  double cost_of_angles(int count, double angle) const { return count * cost_.interaction(angle); }

  /// One to three controls, 0 < |angle| <= 2 pi. Beyond pi the rest to 2 pi and a sign on the controls (one
  /// control fewer) may be cheaper.
  void known_rotation_z(const Wires& controls, std::uint32_t target, double angle) {
    const double rest = angle > 0 ? angle - 2 * pi : angle + 2 * pi;
    bool by_rest = false;
    if (controls.size() == 1) by_rest = std::abs(angle) > pi;
    if (controls.size() == 2) {
      by_rest = cost_of_angles(4, commutator_angle(2, rest)) * (rest != 0) + cost_.interaction(pi / 2) <
                cost_of_angles(4, commutator_angle(2, angle));
    }
    if (controls.size() == 3) by_rest = is_multiple(rest, 4 * pi);
    if (by_rest) {
      phase(controls, {pi}, {});
      if (is_multiple(rest, 4 * pi)) return;
      angle = rest;
    }
    if (controls.size() == 1) return add(Kind::rz, {controls[0], target}, {{angle}});
    if (controls.size() == 2) return commutator(controls[0], controls[1], target, angle);
    triple_commutator(controls, target, angle);
  }

  static double commutator_angle(int controls, double angle) {
    return std::asin(std::pow(std::sin(std::abs(angle) / 4), 1.0 / controls));
  }

  /// Three controls, eight interactions: the commutator of a rotation by controls[2] and one by
  /// controls[0] whose axis controls[1] tilts; where it is not tilted, the two commute.
  void triple_commutator(const Wires& controls, std::uint32_t target, double angle) {
    const double x = commutator_angle(3, angle);
    const Su2 along = isinglass::rotation_z(2 * x);
    const Su2 across = rotation_y(x) * along * rotation_y(-x);
    const auto [theta, phi] = tilt_onto_axis(commutator_of(across, along));
    const auto tilted = [&](double turned) {
      controlled_y_turn(controls[1], target, -x);
      add(Kind::rz, {controls[0], target}, {{turned}});
      controlled_y_turn(controls[1], target, x);
    };
    const auto straight = [&](double turned) { add(Kind::rz, {controls[2], target}, {{turned}}); };
    turn(target, theta, phi);
    if (angle > 0) {
      straight(-2 * x);
      tilted(-2 * x);
      straight(2 * x);
      tilted(2 * x);
    } else {
      tilted(-2 * x);
      straight(-2 * x);
      tilted(2 * x);
      straight(2 * x);
    }
    turn(target, -theta, phi);
  }

  /// Puts the AND of the first `group` wires on a clean wire, runs `body` with it in their place, undoes it.
  template <class Body>
  void with_and_on_clean(const Wires& wires, int group, const IdleWires& idle, Body body) {
    const std::uint32_t clean = idle.clean[0];
    const Wires grouped = first_of(wires, static_cast<std::size_t>(group));
    Wires fewer = without_first(wires, static_cast<std::size_t>(group));
    fewer.insert(fewer.begin(), clean);
    const std::size_t from = mark();
    flip(grouped, clean, {}, {});
    const std::size_t to = mark();
    body(fewer, IdleWires{without_first(idle.clean, 1), joined(idle.dirty, grouped)});
    undo(from, to);
  }

  /// -1 where all wires are 1, four wires or more: with the dirty wire d, the commutator of a CCZ on d and
  /// two of the wires and a flip of d by the others. The rotation by the wire that the flip does not touch is
  /// last in the one CCZ and first in the other, and cancels: 4 interactions each.
  void sign_with_dirty(const Wires& wires, const Wires& dirty) {
    const std::uint32_t borrowed = dirty[0];
    const std::uint32_t target = wires[0];
    const std::uint32_t control = wires[1];
    const double x = commutator_angle(2, pi);
    const auto [theta, phi] = tilt_onto_axis(commutator_of(rotation_x(2 * x), rotation_y(2 * x)));
    // Half a CCZ: the commutator b^-1 a^-1 b a (first to last, b by `borrowed`) without its last rotation.
    const std::size_t half = mark();
    turn(target, theta, phi);
    controlled_y_turn(borrowed, target, -2 * x);
    controlled_x_turn(control, target, -2 * x);
    controlled_y_turn(borrowed, target, 2 * x);
    add(Kind::p, {borrowed, control}, {{pi / 2}});
    const std::size_t half_end = mark();
    flip(without_first(wires, 2), borrowed, without_first(dirty, 1), {target, control});
    const std::size_t flip_end = mark();
    undo(half, half_end);
    undo(half_end, flip_end);
  }

  Circuit& circuit_;
  Origin origin_;
  const Cost& cost_;
  Block& out_;
  Counts counts_;
};

}  // namespace

void append_toffoli(Circuit& circuit, Toffoli form, std::uint32_t first, std::uint32_t second,
                    std::uint32_t target, Origin origin, Block& out) {
  const Cost cost;
  Writer write(circuit, origin, cost, out);
  if (form == Toffoli::relative) {
    write.controlled_y_turn(first, target, -pi / 2);
    write.add(Kind::z, {second, target});
    write.controlled_y_turn(first, target, pi / 2);
    return;
  }
  const bool is_minus = form == Toffoli::exact_minus || form == Toffoli::minus_i;
  write.turn(target, -pi / 2, pi / 2);
  write.commutator(first, second, target, is_minus ? pi : -pi);
  write.turn(target, pi / 2, pi / 2);
  if (form == Toffoli::exact_minus || form == Toffoli::exact_plus) {
    write.add(Kind::p, {first, second}, {{is_minus ? pi / 2 : -pi / 2}});
  }
}

namespace {

/// Any operation with controls, in terms of Writer's phases and rotations about z.
class Simplifier {
 public:
  Simplifier(Circuit& circuit, const Operation& op, const IdleWires& idle, const Cost& cost, Block& out)
      : circuit_(circuit), op_(op), idle_(idle), write_(circuit, op.origin, cost, out), out_(out) {
    const auto controls = circuit.controls(op);
    const auto targets = circuit.targets(op);
    controls_.assign(controls.begin(), controls.end());
    targets_.assign(targets.begin(), targets.end());
  }

  void run() {
    switch (op_.kind) {
      case Kind::phase:
        return write_.phase(controls_, op_.angle(0), idle_);
      case Kind::z:
        return write_.phase(joined(controls_, targets_), {pi}, idle_);
      case Kind::p:
        return write_.phase(joined(controls_, targets_), op_.angle(0), idle_);
      case Kind::rz:
        return write_.rotation_z(controls_, targets_[0], op_.angle(0), idle_);
      case Kind::x:
        return sign_between(-pi / 2, pi / 2);
      case Kind::y:
        return sign_between(pi / 2, 0);
      case Kind::h:
        return sign_between(-pi / 4, pi / 2);
      case Kind::r:
        return rotation_about_equator(targets_[0], op_.angle(0), op_.angle(1));
      case Kind::u:
        return op_.has_known_angles() ? known_unitary() : symbolic_unitary();
      case Kind::swap:
        return controlled_swap();
      case Kind::zz:
        return parity_rotation();
      case Kind::xx:
        return coupling();
      default:
        out_.push_back(op_);
    }
  }

 private:
  /// A reflection about an axis: a sign on all wires between an r and its inverse.
  void sign_between(double theta, double phi) {
    write_.turn(targets_[0], theta, phi);
    write_.phase(joined(controls_, targets_), {pi}, idle_);
    write_.turn(targets_[0], -theta, phi);
  }

  /// exp(-i theta/2 (cos phi X + sin phi Y)): Ry(pi/2) turns z onto x, rz(phi) turns x by phi.
  void rotation_about_equator(std::uint32_t target, Angle theta, Angle phi) {
    onto_equator(target, phi, true);
    write_.rotation_z(controls_, target, theta, idle_);
    onto_equator(target, phi, false);
  }
  void onto_equator(std::uint32_t target, Angle phi, bool is_before) {
    if (is_before) write_.add(Kind::rz, {target}, {circuit_.forms.negated(phi)});
    write_.turn(target, is_before ? -pi / 2 : pi / 2, pi / 2);
    if (!is_before) write_.add(Kind::rz, {target}, {phi});
  }

  void known_unitary() {
    const auto m = isinglass::matrix_of(op_);
    PhasedSu2 parts = su2_of((Matrix2() << m[0], m[1], m[2], m[3]).finished());
    if (parts.q.w() < 0) {  // the smaller angle
      parts.q.coeffs() *= -1;
      parts.phase += pi;
    }
    const auto [theta, phi] = tilt_onto_axis(parts.q);
    write_.turn(targets_[0], -theta, phi);
    write_.rotation_z(controls_, targets_[0], {axis_angle(parts.q).angle}, idle_);
    write_.turn(targets_[0], theta, phi);
    write_.phase(controls_, {parts.phase}, idle_);
  }

  /// U(t, f, l) = e^{i(t+f+l)/2} [Rz(f) Ry(t) Rz(-f)] Rz(f+l), the bracket a rotation about the equator.
  void symbolic_unitary() {
    Forms& forms = circuit_.forms;
    const Angle sum = forms.sum(op_.angle(1), op_.angle(2));
    write_.rotation_z(controls_, targets_[0], sum, idle_);
    rotation_about_equator(targets_[0], op_.angle(0), forms.sum(op_.angle(1), {pi / 2}));
    write_.phase(controls_, forms.scaled(forms.sum(op_.angle(0), sum), 0.5), idle_);
  }

  /// Controlled swap = CX(b, a) CCX(c, a; b) CX(b, a). With one control the first CX joins the CZ(a, b) that
  /// opens the Toffoli into one controlled unitary: six interactions, three of pi/2 and three of pi/4.
  void controlled_swap() {
    const std::uint32_t a = targets_[0];
    const std::uint32_t b = targets_[1];
    if (controls_.size() == 1) {
      const std::uint32_t c = controls_[0];
      write_.controlled_y_turn(b, a, -pi);  // X, then Z: ZX = iY
      write_.controlled_x_turn(c, b, -pi / 2);
      write_.add(Kind::z, {a, b});
      write_.controlled_x_turn(c, b, pi / 2);
      write_.add(Kind::p, {c, a}, {{pi / 2}});
      write_.add(Kind::x, {b, a});
      return;
    }
    write_.add(Kind::x, {b, a});
    write_.turn(b, -pi / 2, pi / 2);
    write_.phase(joined(controls_, targets_), {pi}, idle_);
    write_.turn(b, pi / 2, pi / 2);
    write_.add(Kind::x, {b, a});
  }

  void parity_rotation() {
    write_.add(Kind::x, {targets_[0], targets_[1]});
    write_.rotation_z(controls_, targets_[1], op_.angle(0), idle_);
    write_.add(Kind::x, {targets_[0], targets_[1]});
  }
  void coupling() {
    onto_equator(targets_[0], op_.angle(1), true);
    onto_equator(targets_[1], op_.angle(2), true);
    parity_rotation();
    onto_equator(targets_[0], op_.angle(1), false);
    onto_equator(targets_[1], op_.angle(2), false);
  }

  Circuit& circuit_;
  Operation op_;
  const IdleWires& idle_;
  Writer write_;
  Block& out_;
  Wires controls_;
  Wires targets_;
};

}  // namespace

void simplify(Circuit& circuit, const Operation& op, const IdleWires& idle, const Cost& cost, Block& out) {
  if (op.operand_count <= 2) {
    out.push_back(op);
    return;
  }
  Simplifier(circuit, op, idle, cost, out).run();
}

}  // namespace isinglass
