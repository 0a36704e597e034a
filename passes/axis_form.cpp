// To and from the axis form; see axis_form.h.
//
// Where pulses are needed on the way back is decided in poles.cpp.
#include "passes/axis_form.h"

#include <fmt/format.h>

#include <algorithm>
#include <cmath>
#include <limits>
#include <stdexcept>

#include "circuit/long_list.h"
#include "passes/poles.h"
#include "passes/rename_swaps.h"

namespace isinglass {

namespace {

const Axis x_axis = Axis::UnitX();
const Axis y_axis = Axis::UnitY();
const Axis z_axis = Axis::UnitZ();

/// Whether control may leave the block from within (break, continue, end), directly or in a nested block.
bool may_leave(const Circuit& circuit, std::uint32_t block) {
  for (const Operation& op : circuit.blocks[block]) {
    if (op.kind == Kind::classical) {
      const auto kind = circuit.statements[op.payload].kind;
      if (kind == ClassicalStatement::Kind::leave_loop || kind == ClassicalStatement::Kind::next_round ||
          kind == ClassicalStatement::Kind::end_program) {
        return true;
      }
    }
    if (op.kind == Kind::branch) {
      for (const Branch::Arm& arm : circuit.branches[op.payload].arms) {
        if (may_leave(circuit, arm.block)) return true;
      }
    }
  }
  return false;
}

bool may_leave(const Circuit& circuit, const Operation& op) {
  if (op.kind == Kind::classical) {
    const auto kind = circuit.statements[op.payload].kind;
    return kind == ClassicalStatement::Kind::leave_loop || kind == ClassicalStatement::Kind::next_round ||
           kind == ClassicalStatement::Kind::end_program;
  }
  if (op.kind != Kind::branch) return false;
  for (const Branch::Arm& arm : circuit.branches[op.payload].arms) {
    if (may_leave(circuit, arm.block)) return true;
  }
  return false;
}

/// Reads one block of gates into items.
class Reader {
 public:
  Reader(AxisForm& form, AxisBlock& block)
      : form_(form),
        block_(block),
        frame_(form.shell.wires, Su2::Identity()),
        phase_(form.shell.wires, 0),
        phase_origin_(form.shell.wires) {}

  void read(const Circuit& circuit, const Operation& op) {
    origin_ = op.origin;
    if (!op.is_unitary()) {
      fence(circuit, op);
      return;
    }
    if (op.operand_count > 2) {
      throw std::logic_error(fmt::format("axis form: {} with {} controls must be expanded first",
                                         name(op.kind), op.control_count()));
    }
    if (op.control_count() == 0) {
      plain(op);
    } else {
      controlled(op);
    }
  }

  void finish() {
    for (std::uint32_t w = 0; w < frame_.size(); ++w) settle(w);
    block_.end_frames = frame_;
  }

 private:
  /// rotation(axis, angle); equal angles come in runs, as gates of two wires are made of several.
  Su2 turn(const Axis& axis, double angle) {
    if (angle != angle_) {
      angle_ = angle;
      cosine_ = std::cos(angle / 2);
      sine_ = std::sin(angle / 2);
    }
    return {cosine_, sine_ * axis.x(), sine_ * axis.y(), sine_ * axis.z()};
  }

  void apply(std::uint32_t wire, const Su2& q) {
    if (!(q.x() == 0 && q.y() == 0)) settle(wire);
    frame_[wire] = q * frame_[wire];
  }

  /// exp(-i angle/2 axis.sigma) with the axis as the gate sees it.
  void rotate(std::uint32_t wire, const Axis& axis, Angle angle) {
    if (angle.is_known()) return apply(wire, turn(axis, angle.constant));
    if (axis == z_axis) {
      apply(wire, rotation_z(angle.constant));
      phase_[wire] = form_.shell.forms.sum(phase_[wire], angle.form);
      phase_origin_[wire] = origin_;
      return;
    }
    settle(wire);
    symbolic(wire, axis, angle, origin_);
  }

  void symbolic(std::uint32_t wire, const Axis& axis, Angle angle, Origin origin) {
    Item item;
    item.what = Item::What::rotation;
    item.wire[0] = wire;
    item.axis[0] = frame_[wire].conjugate() * axis;
    item.angle = angle;
    item.origin = origin;
    block_.items.push_back(item);
  }

  /// Writes the symbolic rotation about z that has gathered on the wire: the next gate does not commute with
  /// it.
  void settle(std::uint32_t wire) {
    if (phase_[wire] == 0) return;
    symbolic(wire, z_axis, {0, phase_[wire]}, phase_origin_[wire]);
    phase_[wire] = 0;
  }

  void interact(std::uint32_t a, const Axis& axis_a, std::uint32_t b, const Axis& axis_b, Angle angle) {
    if (axis_a != z_axis) settle(a);
    if (axis_b != z_axis) settle(b);
    Item item;
    item.wire[0] = a;
    item.wire[1] = b;
    item.axis[0] = frame_[a].conjugate() * axis_a;
    item.axis[1] = frame_[b].conjugate() * axis_b;
    item.origin = origin_;
    if (angle.is_known()) {
      const double halves = half_turns(angle.constant);
      angle.constant -= halves * pi;
      if (std::fmod(halves, 2.0) != 0) {
        apply(a, rotation(axis_a, pi));
        apply(b, rotation(axis_b, pi));
      }
      if (std::abs(angle.constant) < 1e-13) return;
    }
    item.angle = angle;
    block_.items.push_back(item);
  }

  void plain(const Operation& op) {
    const std::uint32_t a = op.operand[0];
    const std::uint32_t b = op.operand[1];
    const Angle t = op.angle(0);
    switch (op.kind) {
      case Kind::phase:
        return;
      case Kind::x:
        return apply(a, {0, 1, 0, 0});
      case Kind::y:
        return apply(a, {0, 0, 1, 0});
      case Kind::z:
        return apply(a, {0, 0, 0, 1});
      case Kind::h:
        return apply(a, {0, std::sqrt(0.5), 0, std::sqrt(0.5)});
      case Kind::p:
      case Kind::rz:
        return rotate(a, z_axis, t);
      case Kind::r:
        return turned(a, op.angle(1), [&] { rotate(a, x_axis, t); });
      case Kind::u:
        rotate(a, z_axis, op.angle(2));
        rotate(a, y_axis, t);
        return rotate(a, z_axis, op.angle(1));
      case Kind::swap:
        interact(a, x_axis, b, x_axis, {pi / 2});
        interact(a, y_axis, b, y_axis, {pi / 2});
        return interact(a, z_axis, b, z_axis, {pi / 2});
      case Kind::zz:
        return interact(a, z_axis, b, z_axis, t);
      case Kind::xx:
        return turned(a, op.angle(1),
                      [&] { turned(b, op.angle(2), [&] { interact(a, x_axis, b, x_axis, t); }); });
      default:
        throw std::logic_error("axis form: not a unitary kind");
    }
  }

  /// rz(phi) inner rz(-phi): what `inner` does about x happens about the equatorial axis at phi.
  template <typename Inner>
  void turned(std::uint32_t wire, Angle phi, Inner inner) {
    if (phi == Angle{}) return inner();
    rotate(wire, z_axis, form_.shell.forms.negated(phi));
    inner();
    rotate(wire, z_axis, phi);
  }

  /// Controlled exp(-i angle/2 n.sigma) = exp(-i angle/4 n.sigma) exp(+i angle/4 Z(x)n.sigma): one
  /// interaction.
  void controlled_rotation(std::uint32_t control, std::uint32_t target, const Axis& n, Angle angle) {
    const Angle half = form_.shell.forms.scaled(angle, 0.5);
    rotate(target, n, half);
    interact(control, z_axis, target, n, form_.shell.forms.negated(half));
  }

  void controlled(const Operation& op) {
    const std::uint32_t c = op.operand[0];
    const std::uint32_t t = op.operand[1];
    Forms& forms = form_.shell.forms;
    const Angle full{pi};
    const Angle theta = op.angle(0);
    switch (op.kind) {
      case Kind::phase:
        if (op.operand_count == 1) return rotate(c, z_axis, theta);
        rotate(c, z_axis, forms.scaled(theta, 0.5));
        return controlled_rotation(c, t, z_axis, theta);
      case Kind::x:
        rotate(c, z_axis, {pi / 2});
        return controlled_rotation(c, t, x_axis, full);
      case Kind::y:
        rotate(c, z_axis, {pi / 2});
        return controlled_rotation(c, t, y_axis, full);
      case Kind::z:
        rotate(c, z_axis, {pi / 2});
        return controlled_rotation(c, t, z_axis, full);
      case Kind::h:
        rotate(c, z_axis, {pi / 2});
        return controlled_rotation(c, t, {std::sqrt(0.5), 0, std::sqrt(0.5)}, full);
      case Kind::p:
        rotate(c, z_axis, forms.scaled(theta, 0.5));
        return controlled_rotation(c, t, z_axis, theta);
      case Kind::rz:
        return controlled_rotation(c, t, z_axis, theta);
      case Kind::r:
        return turned(t, op.angle(1), [&] { controlled_rotation(c, t, x_axis, theta); });
      case Kind::u:
        return controlled_u(op, c, t);
      default:
        throw std::logic_error("axis form: not a one-target kind");
    }
  }

  // u(t, f, l) = e^{i(t+f+l)/2} rz(f) ry(t) rz(l).
  void controlled_u(const Operation& op, std::uint32_t c, std::uint32_t t) {
    Forms& forms = form_.shell.forms;
    const Angle theta = op.angle(0);
    const Angle phi = op.angle(1);
    const Angle lambda = op.angle(2);
    const Angle sum = forms.sum(phi, lambda);
    rotate(c, z_axis, forms.scaled(forms.sum(theta, sum), 0.5));
    if (op.has_known_angles()) {
      const AxisAngle whole =
          axis_angle(rotation_z(phi.constant) * rotation_y(theta.constant) * rotation_z(lambda.constant));
      return controlled_rotation(c, t, whole.axis, {whole.angle});
    }
    // rz(f) ry(t) rz(l) = [rz(f) ry(t) rz(-f)] rz(f + l): two controlled rotations.
    controlled_rotation(c, t, z_axis, sum);
    turned(t, phi, [&] { controlled_rotation(c, t, y_axis, theta); });
  }

  void fence(const Circuit& circuit, const Operation& op) {
    Fence fence;
    fence.operation = op;
    if (may_leave(circuit, op)) {
      for (std::uint32_t w = 0; w < circuit.wires; ++w) fence.wires.push_back(w);
    } else {
      const auto operands = circuit.operands(op);
      fence.wires.assign(operands.begin(), operands.end());
    }
    for (const std::uint32_t w : fence.wires) {
      settle(w);
      fence.frames.push_back(frame_[w]);
      frame_[w] = Su2::Identity();
    }
    Item item;
    item.what = Item::What::fence;
    item.fence = static_cast<std::uint32_t>(block_.fences.size());
    block_.fences.push_back(std::move(fence));
    block_.items.push_back(item);
  }

  AxisForm& form_;
  AxisBlock& block_;
  std::vector<Su2> frame_;            // product of the one-qubit gates since the wire's last fence
  std::vector<std::uint32_t> phase_;  // linear form of an rz after the frame that is not written yet
  std::vector<Origin> phase_origin_;
  Origin origin_;
  double angle_ = 0, cosine_ = 1, sine_ = 0;  // of turn(), and of half of it
};

/// Whether the fence leaves the one-qubit frame before it without meaning, whole or up to rz.
bool forgets_frame(const Operation& op) {
  return op.kind == Kind::reset;
}
bool forgets_phase(const Operation& op) {
  return op.kind == Kind::measure || op.kind == Kind::reset;
}
bool carries_phase(const Operation& op) {
  return op.kind == Kind::barrier || op.kind == Kind::delay;
}

/// 0 and not -0; rounding around 0 is 0.
double tidy(double x) {
  return std::abs(x) < 1e-15 ? 0.0 : x;
}

/// Writes one block of items as native operations.
class Writer {
 public:
  Writer(const AxisBlock& source, Circuit& circuit, Block& out, const Promise& promise)
      : source_(source), circuit_(circuit), out_(out), promise_(promise), wires_(circuit.wires) {}

  void write() {
    plan();
    state_.resize(wires_);
    std::size_t place = 0;
    for (const Item& item : source_.items) {
      origin_ = item.origin;
      switch (item.what) {
        case Item::What::interaction:
          interaction(item, place);
          place += 2;
          break;
        case Item::What::rotation:
          symbolic_rotation(item, place);
          place += 1;
          break;
        case Item::What::fence:
          fence(source_.fences[item.fence], place);
          place += source_.fences[item.fence].wires.size();
          break;
      }
    }
    for (std::uint32_t w = 0; w < wires_; ++w) end(w, place + w);
  }

 private:
  static constexpr std::size_t no_turn = std::numeric_limits<std::size_t>::max();

  /// What pulses have done to a wire so far: ideal = rz(phase) frame, the phase being symbolic.
  struct State {
    Su2 frame = Su2::Identity();
    Angle phase;
    Axis pole = Axis::UnitZ();
    bool is_measured = false;        // the last act was a measurement
    std::size_t turn = no_turn;      // in out_: the last act was this pulse by an unknown angle
    Axis turn_axis = Axis::UnitZ();  // about this axis
  };

  /// Lists the needs of every wire, stretch by stretch, and solves them.
  void plan() {
    std::vector<std::vector<Need>> open(wires_);
    std::vector<std::size_t> longest(wires_, 0);  // stretch of each wire, or more: a reservation
    std::size_t place = 0;
    std::size_t total = wires_;
    for (const Item& item : source_.items) {
      total += item.what == Item::What::fence ? source_.fences[item.fence].wires.size()
                                              : static_cast<std::size_t>(item.wire_count());
      for (int side = 0; side < item.wire_count(); ++side) ++longest[item.wire[side]];
    }
    reserve_long(poles_, total);
    poles_.resize(total);
    for (std::uint32_t w = 0; w < wires_; ++w) reserve_long(open[w], longest[w] + 1);
    const auto close = [&](std::uint32_t wire, const Su2& frame, bool is_free) {
      Need need;
      need.what = Need::What::end;
      need.axis = frame.conjugate() * z_axis;
      need.place = static_cast<std::uint32_t>(place++);
      need.is_free = is_free;
      open[wire].push_back(need);
      choose_poles(open[wire], poles_);
      open[wire].clear();
    };
    for (const Item& item : source_.items) {
      if (item.what == Item::What::fence) {
        const Fence& fence = source_.fences[item.fence];
        for (std::size_t i = 0; i < fence.wires.size(); ++i) {
          close(fence.wires[i], fence.frames[i], forgets_frame(fence.operation));
        }
        continue;
      }
      for (int side = 0; side < item.wire_count(); ++side) {
        Need need;
        need.what = item.is_interaction() ? Need::What::interaction : Need::What::rotation;
        need.axis = item.axis[side];
        need.place = static_cast<std::uint32_t>(place++);
        open[item.wire[side]].push_back(need);
      }
    }
    const bool is_forgotten = source_.is_body && promise_.keep_bits_only;
    for (std::uint32_t w = 0; w < wires_; ++w) close(w, source_.end_frames[w], is_forgotten);
  }

  /// Pulses the wire until its pole is `pole`.
  void reach(std::uint32_t wire, const Axis& pole) {
    State& state = state_[wire];
    if ((state.pole - pole).squaredNorm() < rounding * rounding) return;
    if (state.turn != no_turn && joins(state.turn_axis, state.pole, pole)) {
      Operation& op = out_[state.turn];
      op.value[0] = tidy(wrapped(op.value[0] + swing(wire, state.turn_axis, pole)));
      return;
    }
    state.turn = no_turn;
    const Axis seen = state.frame * pole;
    const double across = std::hypot(seen.x(), seen.y());
    const double theta = std::atan2(across, seen.z());
    const double phi = across > 1e-15 ? std::atan2(-seen.x(), seen.y()) : 0.0;
    state.frame = (rotation_xy(theta, phi) * state.frame).normalized();
    state.pole = pole;
    pulse(wire, {theta}, phi);
    state.is_measured = false;
  }

  /// Turns the wire's frame about `axis` until its pole is `pole`, both poles perpendicular to the axis, and
  /// returns by what angle: somebody else's pulse does it.
  double swing(std::uint32_t wire, const Axis& axis, const Axis& pole) {
    State& state = state_[wire];
    const Axis about = state.frame * axis;
    const Axis from = state.frame * pole;
    const double angle = std::atan2(about.dot(from.cross(z_axis)), from.z());
    state.frame = (rotation(about, angle) * state.frame).normalized();
    state.pole = pole;
    return angle;
  }

  void pulse(std::uint32_t wire, Angle theta, double phi) {
    out_.push_back(circuit_.make(Kind::r, {wire}, {theta, physical(wire, phi)}, origin_));
  }

  /// The phase that the machine plays for one that the frame calls phi.
  Angle physical(std::uint32_t wire, double phi) {
    Angle angle = circuit_.forms.difference({phi}, state_[wire].phase);
    angle.constant = tidy(wrapped(angle.constant));
    return angle;
  }

  double longitude(std::uint32_t wire, const Axis& axis) const {
    const Axis seen = state_[wire].frame * axis;
    return std::atan2(seen.y(), seen.x());
  }

  void interaction(const Item& item, std::size_t place) {
    double phi[2];
    for (int side = 0; side < 2; ++side) {
      reach(item.wire[side], poles_[place + static_cast<std::size_t>(side)]);
      phi[side] = longitude(item.wire[side], item.axis[side]);
    }
    Angle theta = item.angle;
    if (theta.is_known() && theta.constant < 0) {
      theta.constant = -theta.constant;
      phi[0] += pi;
    }
    if (theta.is_known()) theta.constant = std::min(theta.constant, pi / 2);  // sums round beyond it
    out_.push_back(circuit_.make(Kind::xx, {item.wire[0], item.wire[1]},
                                 {theta, physical(item.wire[0], phi[0]), physical(item.wire[1], phi[1])},
                                 item.origin));
    for (const std::uint32_t wire : item.wire) {
      state_[wire].is_measured = false;
      state_[wire].turn = no_turn;
    }
  }

  void symbolic_rotation(const Item& item, std::size_t place) {
    const std::uint32_t wire = item.wire[0];
    State& state = state_[wire];
    const Axis& axis = item.axis[0];
    Angle angle = item.angle;
    const Axis& pole = poles_[place];
    const bool takes_along = joins(axis, state.pole, pole) && (state.pole - pole).norm() > rounding &&
                             !(state.turn != no_turn && joins(state.turn_axis, state.pole, pole));
    if (takes_along) {
      angle.constant = tidy(wrapped(angle.constant + swing(wire, axis, pole)));
    } else {
      reach(wire, pole);
    }
    state.turn = no_turn;
    const Axis seen = state.frame * axis;
    if (std::abs(seen.z()) > 0.5) {
      const Angle turn = seen.z() > 0 ? angle : circuit_.forms.negated(angle);
      state.phase = circuit_.forms.sum(state.phase, turn);
    } else {
      pulse(wire, angle, std::atan2(seen.y(), seen.x()));
      state.turn = out_.size() - 1;
      state.turn_axis = axis;
    }
    state.is_measured = false;
  }

  /// Brings the wire to rz(returned) away from the ideal state and starts a new stretch.
  Angle close(std::uint32_t wire, const Su2& frame, std::size_t place) {
    reach(wire, poles_[place]);
    State& state = state_[wire];
    const Su2 rest = frame * state.frame.conjugate();
    Angle residue = state.phase;
    residue.constant = wrapped(residue.constant + 2 * std::atan2(rest.z(), rest.w()));
    state = State{};
    return residue;
  }

  static bool is_zero(Angle angle) { return angle.is_known() && std::abs(angle.constant) < 1e-13; }

  void emit_phase(std::uint32_t wire, Angle residue) {
    if (!is_zero(residue)) out_.push_back(circuit_.make(Kind::rz, {wire}, {residue}, origin_));
  }

  void fence(const Fence& fence, std::size_t place) {
    const Operation& op = fence.operation;
    origin_ = op.origin;
    for (std::size_t i = 0; i < fence.wires.size(); ++i) {
      const std::uint32_t wire = fence.wires[i];
      const Angle residue = close(wire, fence.frames[i], place + i);
      if (carries_phase(op)) {
        state_[wire].frame = rotation_z(-residue.constant);
        state_[wire].phase = {0, residue.form};
      } else if (!forgets_phase(op)) {
        emit_phase(wire, residue);
      }
      state_[wire].is_measured = op.kind == Kind::measure;
    }
    out_.push_back(op);
  }

  void end(std::uint32_t wire, std::size_t place) {
    origin_ = {};
    reach(wire, poles_[place]);
    const bool is_forgotten = source_.is_body && (promise_.keep_bits_only || state_[wire].is_measured);
    const Angle residue = close(wire, source_.end_frames[wire], place);
    if (!is_forgotten) emit_phase(wire, residue);
  }

  const AxisBlock& source_;
  Circuit& circuit_;
  Block& out_;
  const Promise& promise_;
  std::uint32_t wires_;
  std::vector<Axis> poles_;
  std::vector<State> state_;
  Origin origin_;
};

Circuit shell_of(const Circuit& circuit) {
  Circuit shell;
  shell.registers = circuit.registers;
  shell.wires = circuit.wires;
  shell.source_qubits = circuit.source_qubits;
  shell.end_wire = circuit.end_wire;
  shell.inputs = circuit.inputs;
  shell.forms = circuit.forms;
  shell.variables = circuit.variables;
  shell.bits = circuit.bits;
  shell.blocks.resize(circuit.blocks.size());
  shell.statements = circuit.statements;
  shell.branches = circuit.branches;
  shell.pool = circuit.pool;
  shell.origins = circuit.origins;
  shell.pragmas = circuit.pragmas;
  shell.externs = circuit.externs;
  return shell;
}

}  // namespace

double half_turns(double angle) {
  return std::abs(angle) <= pi / 2 + rounding ? 0.0 : std::round(angle / pi);
}

bool are_parallel(const Axis& a, const Axis& b) {
  return a.cross(b).squaredNorm() < rounding * rounding;
}

bool are_perpendicular(const Axis& a, const Axis& b) {
  return std::abs(a.dot(b)) < rounding;
}

AxisForm axis_form(const Circuit& circuit) {
  AxisForm form;
  form.shell = shell_of(circuit);
  form.blocks.resize(circuit.blocks.size());
  const bool may_rename = may_rename_wires(circuit);
  for (std::size_t b = 0; b < circuit.blocks.size(); ++b) {
    AxisBlock& block = form.blocks[b];
    block.is_body = b == 0;
    block.may_rename = b == 0 && may_rename;
    reserve_long(block.items, circuit.blocks[b].size());
    Reader reader(form, block);
    for (const Operation& op : circuit.blocks[b]) reader.read(circuit, op);
    reader.finish();
  }
  return form;
}

Circuit native_form(AxisForm form, const Promise& promise) {
  Circuit circuit = std::move(form.shell);
  for (std::size_t b = 0; b < form.blocks.size(); ++b) {
    reserve_long(circuit.blocks[b], form.blocks[b].items.size() * 2);
    Writer(form.blocks[b], circuit, circuit.blocks[b], promise).write();
  }
  return circuit;
}

Circuit better_of(Circuit circuit, Circuit changed, const Cost& cost) {
  return tally_of(changed, cost).error < tally_of(circuit, cost).error ? changed : circuit;
}

namespace {

/// Renames the operands of the operation and of every block below it.
void rename(AxisForm& form, Operation& op, const std::vector<std::uint32_t>& name) {
  Circuit& shell = form.shell;
  std::vector<std::uint32_t> operands(shell.operands(op).begin(), shell.operands(op).end());
  for (std::uint32_t& wire : operands) wire = name[wire];
  shell.set_operands(op, operands);
  if (op.kind != Kind::branch) return;
  for (const Branch::Arm& arm : shell.branches[op.payload].arms) {
    AxisBlock& block = form.blocks[arm.block];
    for (Item& item : block.items) {
      for (int side = 0; side < item.wire_count(); ++side) item.wire[side] = name[item.wire[side]];
    }
    std::vector<Su2> frames(block.end_frames.size());
    for (std::size_t w = 0; w < frames.size(); ++w) frames[name[w]] = block.end_frames[w];
    block.end_frames = std::move(frames);
    for (Fence& fence : block.fences) {
      for (std::uint32_t& wire : fence.wires) wire = name[wire];
      rename(form, fence.operation, name);
    }
  }
}

}  // namespace

Pusher::Pusher(std::uint32_t wires) : pushed_(wires, Su2::Identity()), name_(wires) {
  for (std::uint32_t w = 0; w < wires; ++w) name_[w] = w;
}

void Pusher::arrive(Item& item) const {
  for (int side = 0; side < item.wire_count(); ++side) {
    item.wire[side] = name_[item.wire[side]];
    item.axis[side] = pushed_[item.wire[side]].conjugate() * item.axis[side];
  }
}

void Pusher::arrive(Fence& fence, AxisForm& form) {
  for (std::size_t i = 0; i < fence.wires.size(); ++i) {
    const std::uint32_t wire = name_[fence.wires[i]];
    fence.wires[i] = wire;
    fence.frames[i] = fence.frames[i] * pushed_[wire];
    pushed_[wire] = Su2::Identity();
  }
  if (is_renaming_) rename(form, fence.operation, name_);
}

void Pusher::push(std::uint32_t wire, const Su2& u) {
  pushed_[wire] = (pushed_[wire] * u).normalized();
}

void Pusher::exchange(std::uint32_t a, std::uint32_t b) {
  // With P pushed so far: P SWAP = SWAP P', where P' has its wires exchanged.
  std::swap(pushed_[a], pushed_[b]);
  for (std::uint32_t& name : name_) {
    if (name == a) {
      name = b;
    } else if (name == b) {
      name = a;
    }
  }
  is_renaming_ = true;
}

void Pusher::finish(AxisBlock& block, AxisForm& form) {
  std::vector<Su2> frames(block.end_frames.size());
  for (std::size_t w = 0; w < frames.size(); ++w) {
    frames[name_[w]] = block.end_frames[w] * pushed_[name_[w]];
  }
  block.end_frames = std::move(frames);
  if (!is_renaming_) return;
  for (std::uint32_t& wire : form.shell.end_wire) wire = name_[wire];
}

}  // namespace isinglass
