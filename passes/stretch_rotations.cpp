// See stretch_rotations.h.
#include "passes/stretch_rotations.h"

#include <numeric>

#include "algebra/canonical.h"

namespace isinglass {

namespace {

class Writer {
 public:
  Writer(unsigned wires, bool may_rename, bool has_inputs, const Cost& cost, Circuit& circuit)
      : cost_(cost),
        circuit_(circuit),
        forms_(circuit.forms),
        stretches_(wires, may_rename, has_inputs),
        where_(wires) {
    std::iota(where_.begin(), where_.end(), 0u);
  }

  WrittenSequence run(const Sequence& sequence) {
    collect(sequence.turns);
    for (const Step& step : steps_) {
      if (step.stretch == PairStretches::none) {
        single(step.turn.a, step.turn.la, signed_angle(step.turn), step.turn.origin);
      } else {
        write(stretches_[step.stretch], members_[static_cast<std::size_t>(step.stretch)]);
      }
    }
    WrittenSequence result{std::move(rotations_), {}};
    for (const std::uint8_t wire : sequence.home) result.home.push_back(where_[wire]);
    return result;
  }

 private:
  /// A one-wire turn outside of all stretches, or a stretch, at the place of its first turn.
  struct Step {
    int stretch;
    Turn turn;
  };

  void collect(const std::vector<Turn>& turns) {
    for (const Turn& turn : turns) {
      const int stretch = stretches_.add(turn);
      if (stretch == PairStretches::none) {
        steps_.push_back({stretch, turn});
        continue;
      }
      if (static_cast<std::size_t>(stretch) == members_.size()) {
        members_.emplace_back();
        steps_.push_back({stretch, {}});
      }
      members_[static_cast<std::size_t>(stretch)].push_back(turn);
    }
  }

  Angle signed_angle(const Turn& turn) { return turn.negative ? forms_.negated(turn.angle) : turn.angle; }

  void single(unsigned wire, Letter letter, Angle angle, Origin origin) {
    if (angle == Angle{}) return;
    rotations_.push_back({{where_[wire], where_[wire]}, {letter, Letter::I}, angle, origin});
  }

  void pair(unsigned a, Letter la, unsigned b, Letter lb, Angle angle, Origin origin) {
    if (angle.is_known() && is_multiple(angle.constant, 2 * pi, least_interaction)) return;
    rotations_.push_back({{where_[a], where_[b]}, {la, lb}, angle, origin});
  }

  void exchange(unsigned a, unsigned b) { std::swap(where_[a], where_[b]); }

  void write(const PairStretch& stretch, const std::vector<Turn>& turns) {
    Origin origin;
    for (const Turn& turn : turns) origin = circuit_.origins.merged(origin, turn.origin);
    if (stretch.is_commuting()) {
      write_commuting(stretch, turns, origin);
    } else if (stretch.is_symbolic()) {
      write_form(stretch, turns, origin);
    } else {
      write_known(stretch, origin);
    }
  }

  // ---- turns that commute

  struct AxisSum {
    Letter la, lb;
    Angle angle;
  };

  void write_commuting(const PairStretch& stretch, const std::vector<Turn>& turns, Origin origin) {
    const unsigned a = stretch.a(), b = stretch.b();
    std::vector<AxisSum> axes;
    for (const Turn& turn : turns) {
      if (!turn.is_pair()) {
        single(turn.a, turn.la, signed_angle(turn), turn.origin);
        continue;
      }
      const Letter la = turn.a == a ? turn.la : turn.lb, lb = turn.a == a ? turn.lb : turn.la;
      AxisSum* found = nullptr;
      for (AxisSum& axis : axes) {
        if (axis.la == la && axis.lb == lb) found = &axis;
      }
      if (found == nullptr) {
        axes.push_back({la, lb, {}});
        found = &axes.back();
      }
      found->angle = forms_.sum(found->angle, signed_angle(turn));
    }
    if (stretch.is_mirrored(cost_)) {
      write_mirrored(a, b, std::move(axes), origin);
    } else {
      for (const AxisSum& axis : axes) pair(a, axis.la, b, axis.lb, axis.angle, origin);
    }
  }

  /// U = L^-1 SWAP (SWAP L U L^-1) L with L on b such that the axes become XX, YY and ZZ; SWAP then adds pi/2
  /// to all three angles.
  void write_mirrored(unsigned a, unsigned b, std::vector<AxisSum> axes, Origin origin) {
    if (axes.size() == 1) {  // complete it with two more that commute with it
      const Letter other_a = axes[0].la == Letter::X ? Letter::Y : Letter::X;
      const Letter other_b = axes[0].lb == Letter::X ? Letter::Y : Letter::X;
      axes.push_back({other_a, other_b, {}});
    }
    if (axes.size() == 2) axes.push_back({axes[0].la * axes[1].la, axes[0].lb * axes[1].lb, {}});
    Row x, z;  // L^-1 X L and L^-1 Z L, on wire 0 of a register of one
    for (const AxisSum& axis : axes) {
      const auto letter = static_cast<std::uint64_t>(axis.lb);
      if (axis.la == Letter::X) x = {letter & 1, letter >> 1, false};
      if (axis.la == Letter::Z) z = {letter & 1, letter >> 1, false};
    }
    std::vector<Turn> change;
    append_local_clifford(x, z, 0, change);
    for (const Turn& turn : change) single(b, turn.la, turn.angle, origin);
    for (const AxisSum& axis : axes) {
      const auto letter = static_cast<std::uint64_t>(axis.lb);
      Row image{letter & 1, letter >> 1, false};
      for (const Turn& turn : change) {
        const int quarters = *quarters_of(turn.angle);
        for (int q = 0; q < quarters; ++q) conjugate(image, 0, turn.la, 0, Letter::I, false);
      }
      const Angle angle = image.negative ? forms_.negated(axis.angle) : axis.angle;
      pair(a, axis.la, b, axis.la, forms_.sum(angle, {pi / 2}), origin);
    }
    exchange(a, b);
    for (auto turn = change.rbegin(); turn != change.rend(); ++turn) {
      single(b, turn->la, forms_.negated(turn->angle), origin);
    }
  }

  // ---- rotations and a Clifford

  void write_form(const PairStretch& stretch, const std::vector<Turn>& turns, Origin origin) {
    const unsigned wire[2] = {stretch.a(), stretch.b()};
    PairForm form;
    std::vector<Angle> angles;  // of the form's rotations
    for (const Turn& turn : turns) {
      const Turn local = stretch.named(turn);
      const bool is_negative = form.seen(local).negative;
      const int place = form.add(local);
      if (place == PairForm::in_clifford) continue;
      angles.resize(form.rotations().size());
      Angle& sum = angles[static_cast<std::size_t>(place)];
      sum = forms_.sum(sum, is_negative ? forms_.negated(turn.angle) : turn.angle);
    }
    std::array<Row, 4> rows = form.rows();
    for (const PairForm::Step& step : form.steps(stretch.is_mirrored(cost_))) {
      Angle angle;
      if (step.rotation != PairForm::in_clifford) angle = angles[static_cast<std::size_t>(step.rotation)];
      if (step.string.negative) angle = forms_.negated(angle);
      if (step.is_quarter) {
        angle.constant += pi / 2;
        for (Row& row : rows) conjugate(row, step.string);
      }
      const Letter la = step.string.letter(0), lb = step.string.letter(1);
      if (step.string.weight() == 2) {
        pair(wire[0], la, wire[1], lb, angle, origin);
      } else if (la != Letter::I) {
        single(wire[0], la, angle, origin);
      } else {
        single(wire[1], lb, angle, origin);
      }
    }
    std::vector<Turn> change;
    for (unsigned k = 0; k < 2; ++k) {
      append_local_clifford(rows[2 * k], rows[2 * k + 1], rows[2 * k].support() == 1 ? 0 : 1, change);
    }
    for (const Turn& turn : change) single(wire[turn.a], turn.la, turn.angle, origin);
    if (rows[0].support() == 2) exchange(wire[0], wire[1]);
  }

  // ---- any turns of known angles

  void local(unsigned wire, const Su2& unitary, Origin origin) {
    const PulseForm form = pulse_form(unitary);
    single(wire, Letter::Z, {-form.phi}, origin);
    single(wire, Letter::X, {form.theta}, origin);
    single(wire, Letter::Z, {form.phi + form.alpha}, origin);
  }

  void write_known(const PairStretch& stretch, Origin origin) {
    const unsigned a = stretch.a(), b = stretch.b();
    Matrix4 matrix;
    for (int row = 0; row < 4; ++row) {
      for (int column = 0; column < 4; ++column) {
        matrix(row, column) = stretch.matrix()[static_cast<std::size_t>(4 * row + column)];
      }
    }
    const bool is_mirrored = stretch.is_mirrored(cost_);
    if (is_mirrored) matrix = (swap_matrix() * matrix).eval();
    const Canonical form = canonical(matrix);
    local(a, form.before[0], origin);
    local(b, form.before[1], origin);
    const double angle[3] = {2 * form.point.x, 2 * form.point.y, 2 * form.point.z};
    const Letter letter[3] = {Letter::X, Letter::Y, Letter::Z};
    for (int k = 0; k < 3; ++k) {
      if (std::abs(angle[k]) > least_interaction) pair(a, letter[k], b, letter[k], {angle[k]}, origin);
    }
    local(a, form.after[0], origin);
    local(b, form.after[1], origin);
    if (is_mirrored) exchange(a, b);
  }

  const Cost& cost_;
  Circuit& circuit_;
  Forms& forms_;
  PairStretches stretches_;
  std::vector<std::uint32_t> where_;  // where what the sequence has on a wire is by now
  std::vector<Step> steps_;
  std::vector<std::vector<Turn>> members_;  // of each stretch
  std::vector<LocalRotation> rotations_;
};

}  // namespace

WrittenSequence written(const Sequence& sequence, unsigned wires, bool may_rename, const Cost& cost,
                        Circuit& circuit) {
  return Writer(wires, may_rename, has_inputs(sequence.turns), cost, circuit).run(sequence);
}

}  // namespace isinglass
