// Templates and modifiers of gates; see gate.h.
#include "language/gate.h"

#include <algorithm>
#include <cmath>

#include "language/unitary.h"
#include "language/value.h"

namespace isinglass {

namespace {

constexpr std::size_t most_power_wires = 6;

bool is_self_inverse(Kind kind) {
  return kind == Kind::x || kind == Kind::y || kind == Kind::z || kind == Kind::h || kind == Kind::swap;
}

/// Kinds exp(-i angle/2 G) with G^2 = 1, whose first angle is that angle.
bool is_rotation(Kind kind) {
  return kind == Kind::rz || kind == Kind::r || kind == Kind::zz || kind == Kind::xx;
}

/// Kinds whose powers multiply the first angle.
bool is_one_parameter(Kind kind) {
  return kind == Kind::phase || kind == Kind::p || is_rotation(kind);
}

bool is_diagonal(Kind kind) {
  return kind == Kind::phase || kind == Kind::p || kind == Kind::z || kind == Kind::rz || kind == Kind::zz;
}

bool has_known_angles(const Acts& acts) {
  return std::all_of(acts.begin(), acts.end(), [](const Act& act) {
    return act.angles[0].is_known() && act.angles[1].is_known() && act.angles[2].is_known();
  });
}

std::vector<std::uint32_t> wires_of(const Acts& acts) {
  std::vector<std::uint32_t> wires;
  for (const Act& act : acts) wires.insert(wires.end(), act.wires.begin(), act.wires.end());
  std::sort(wires.begin(), wires.end());
  wires.erase(std::unique(wires.begin(), wires.end()), wires.end());
  return wires;
}

/// The wires that control every act of the list.
std::vector<std::uint32_t> common_controls(const Acts& acts) {
  std::vector<std::uint32_t> common;
  if (acts.empty()) return common;
  for (std::size_t i = 0; i < acts[0].control_count(); ++i) {
    const std::uint32_t wire = acts[0].wires[i];
    const bool everywhere = std::all_of(acts.begin(), acts.end(), [wire](const Act& act) {
      const auto end = act.wires.begin() + static_cast<std::ptrdiff_t>(act.control_count());
      return std::find(act.wires.begin(), end, wire) != end;
    });
    if (everywhere) common.push_back(wire);
  }
  return common;
}

void remove_wires(Acts& acts, const std::vector<std::uint32_t>& wires) {
  for (Act& act : acts) {
    std::erase_if(act.wires, [&](std::uint32_t wire) {
      return std::find(wires.begin(), wires.end(), wire) != wires.end();
    });
  }
}

Acts numeric_power(const Acts& acts, double exponent) {
  const auto wires = wires_of(acts);
  if (!has_known_angles(acts)) {
    throw Fault{"a fractional power of this gate needs angles that are known while compiling", {}};
  }
  if (wires.size() > most_power_wires) {
    throw Fault{"a fractional power is computed for gates of at most 6 qubits, controls not counted", {}};
  }
  return synthesized(principal_power(matrix_of(acts, wires), exponent), wires);
}

Act made(Kind kind, std::vector<std::uint32_t> wires, std::array<Angle, 3> angles) {
  return {kind, angles, std::move(wires)};
}

/// Fractional powers of single acts in closed form; the controls are stripped already.
Acts single_power(const Act& act, double exponent, Forms& forms, const std::function<Angle(Angle)>& wrap) {
  const auto half_turn = [&](double factor) { return Angle{exponent * pi * factor, 0}; };
  switch (act.kind) {
    case Kind::phase:
    case Kind::p:
      return {made(act.kind, act.wires, {forms.scaled(wrap(act.angles[0]), exponent)})};
    case Kind::z:
      return {made(Kind::p, act.wires, {half_turn(1)})};
    case Kind::x:
    case Kind::y:
      return {made(Kind::phase, {}, {half_turn(0.5)}),
              made(Kind::r, act.wires, {half_turn(1), Angle{act.kind == Kind::x ? 0 : pi / 2, 0}})};
    case Kind::swap:
      return {made(Kind::phase, {}, {half_turn(0.25)}), made(Kind::xx, act.wires, {half_turn(0.5)}),
              made(Kind::xx, act.wires, {half_turn(0.5), Angle{pi / 2, 0}, Angle{pi / 2, 0}}),
              made(Kind::zz, act.wires, {half_turn(0.5)})};
    case Kind::rz:
    case Kind::r:
    case Kind::zz:
    case Kind::xx: {
      // Eigenphases -angle/2 and angle/2, each brought into (-pi, pi].
      const Angle plus = wrap(forms.scaled(act.angles[0], -0.5));
      const Angle minus = wrap(forms.scaled(act.angles[0], 0.5));
      Act rotation = act;
      rotation.angles[0] = forms.scaled(forms.difference(minus, plus), exponent);
      const Angle phase = forms.scaled(forms.sum(minus, plus), exponent / 2);
      if (phase.is_known() && phase.constant == 0) return {rotation};
      return {made(Kind::phase, {}, {phase}), rotation};
    }
    default:
      return numeric_power({act}, exponent);
  }
}

}  // namespace

Angle substituted(const GateTemplate& gate, Angle angle, std::span<const Angle> arguments, Forms& forms) {
  if (angle.form == 0) return angle;
  const auto terms = gate.forms.terms(angle.form);
  // The constant last, so that a*x with constant 0 is exactly a*x.
  Angle total = forms.scaled(arguments[terms[0].input], terms[0].coefficient);
  for (std::size_t i = 1; i < terms.size(); ++i) {
    total = forms.sum(total, forms.scaled(arguments[terms[i].input], terms[i].coefficient));
  }
  total.constant += angle.constant;
  return total;
}

Acts instance(const GateTemplate& gate, std::span<const Angle> arguments,
              std::span<const std::uint32_t> wires, Forms& forms) {
  Acts acts = gate.acts;
  for (Act& act : acts) {
    for (Angle& angle : act.angles) angle = substituted(gate, angle, arguments, forms);
    for (std::uint32_t& wire : act.wires) wire = wires[wire];
  }
  return acts;
}

Acts inverted(Acts acts, Forms& forms) {
  std::reverse(acts.begin(), acts.end());
  for (Act& act : acts) {
    if (is_one_parameter(act.kind)) act.angles[0] = forms.negated(act.angles[0]);
    if (act.kind == Kind::u) {
      const auto [theta, phi, lambda] = act.angles;
      act.angles = {forms.negated(theta), forms.negated(lambda), forms.negated(phi)};
    }
  }
  return acts;
}

Acts controlled(Acts acts, std::span<const std::uint32_t> controls, bool negated) {
  for (Act& act : acts) {
    if (act.kind != Kind::barrier) act.wires.insert(act.wires.begin(), controls.begin(), controls.end());
  }
  if (!negated) return acts;
  Acts result;
  for (const std::uint32_t wire : controls) result.push_back(made(Kind::x, {wire}, {}));
  result.insert(result.end(), std::make_move_iterator(acts.begin()), std::make_move_iterator(acts.end()));
  for (const std::uint32_t wire : controls) result.push_back(made(Kind::x, {wire}, {}));
  return result;
}

Acts repeated(Acts acts, std::int64_t count, Forms& forms, std::size_t most) {
  std::erase_if(acts, [](const Act& act) { return act.kind == Kind::barrier; });
  if (count == 0 || acts.empty()) return {};
  if (count < 0) {
    acts = inverted(std::move(acts), forms);
    count = -count;
  }
  if (count == 1) return acts;
  const auto factor = static_cast<double>(count);
  if (acts.size() == 1 && is_self_inverse(acts[0].kind)) return count % 2 == 0 ? Acts{} : acts;
  const bool commuting =
      std::all_of(acts.begin(), acts.end(), [](const Act& act) { return is_diagonal(act.kind); });
  if (commuting || (acts.size() == 1 && is_one_parameter(acts[0].kind))) {
    for (Act& act : acts) {
      if (act.kind == Kind::z) act = made(Kind::p, act.wires, {Angle{pi, 0}});
      act.angles[0] = forms.scaled(act.angles[0], factor);
    }
    return acts;
  }
  const auto controls = common_controls(acts);
  Acts inner = acts;
  remove_wires(inner, controls);
  const auto wires = wires_of(inner);
  const double volume = factor * static_cast<double>(acts.size());
  const bool small = wires.size() <= most_power_wires && has_known_angles(acts);
  if (small && volume > 4 * std::pow(4.0, static_cast<double>(wires.size()))) {
    return controlled(synthesized(principal_power(matrix_of(inner, wires), factor), wires), controls, false);
  }
  if (volume > static_cast<double>(most)) throw Fault{"this power repeats its gate too often", {}};
  Acts result;
  result.reserve(acts.size() * static_cast<std::size_t>(count));
  for (std::int64_t i = 0; i < count; ++i) result.insert(result.end(), acts.begin(), acts.end());
  return result;
}

Acts powered(Acts acts, double exponent, Forms& forms, const std::function<Angle(Angle)>& wrap) {
  std::erase_if(acts, [](const Act& act) { return act.kind == Kind::barrier; });
  if (acts.empty()) return {};
  const auto controls = common_controls(acts);
  remove_wires(acts, controls);
  // A list of bare phases is one phase.
  if (std::all_of(acts.begin(), acts.end(), [](const Act& act) { return act.wires.empty(); })) {
    for (std::size_t i = 1; i < acts.size(); ++i) {
      acts[0].angles[0] = forms.sum(acts[0].angles[0], acts[i].angles[0]);
    }
    acts.resize(1);
  }
  Acts result =
      acts.size() == 1 ? single_power(acts[0], exponent, forms, wrap) : numeric_power(acts, exponent);
  return controlled(std::move(result), controls, false);
}

}  // namespace isinglass
