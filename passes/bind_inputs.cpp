// Binding of inputs; see bind_inputs.h.
#include "passes/bind_inputs.h"

#include <fmt/format.h>

#include <cmath>
#include <stdexcept>
#include <vector>

#include "algebra/su2.h"

namespace isinglass {

namespace {

constexpr double nothing = 1e-15;  // an angle below this, after reduction, is rounding of zero

/// Replaces inputs by their values; says whether there was one.
bool substitute(Expression& expression, std::span<const double> values) {
  bool found = expression.kind == Expression::Kind::input;
  if (found && !values.empty()) {
    const double value = values[expression.variable];
    expression = Expression{};
    expression.text = fmt::format("{}", std::abs(value));
    if (expression.text.find_first_of(".en") == std::string::npos) expression.text += ".0";
    if (value < 0) {
      Expression minus;
      minus.kind = Expression::Kind::unary;
      minus.text = "-";
      minus.arguments.push_back(std::move(expression));
      expression = std::move(minus);
    }
    return true;
  }
  for (Expression& argument : expression.arguments) found = substitute(argument, values) || found;
  return found;
}

}  // namespace

Binding::Binding(const Circuit& plan) : plan_(plan) {
  for (const Block& block : plan.blocks) {
    for (const Operation& op : block) {
      if (op.is_unitary() && !op.is_native()) {
        throw std::logic_error(fmt::format("a plan holds r, xx and rz, not {}", name(op.kind)));
      }
    }
  }
  bound_ = plan;
  bound_.inputs.clear();
  bound_.forms = Forms();
  for (auto& statement : bound_.statements) {
    has_classical_inputs_ =
        substitute(statement.value, {}) || substitute(statement.target, {}) || has_classical_inputs_;
  }
  for (auto& branch : bound_.branches) {
    has_classical_inputs_ = substitute(branch.condition, {}) || has_classical_inputs_;
  }
}

const Circuit& Binding::bind(std::span<const double> values) {
  values_ = values;
  forms_.resize(plan_.forms.size());
  for (std::uint32_t form = 0; form < forms_.size(); ++form) forms_[form] = plan_.forms.value(form, values);
  if (has_classical_inputs_) bind_expressions();
  for (std::size_t block = 0; block < plan_.blocks.size(); ++block) bind_block(block);
  return bound_;
}

void Binding::bind_expressions() {
  bound_.statements = plan_.statements;
  bound_.branches = plan_.branches;
  for (auto& statement : bound_.statements) {
    substitute(statement.value, values_);
    substitute(statement.target, values_);
  }
  for (auto& branch : bound_.branches) substitute(branch.condition, values_);
}

void Binding::bind_block(std::size_t block) {
  out_ = &bound_.blocks[block];
  out_->clear();
  has_empty_pulse_ = false;
  ions_.assign(plan_.wires, Ion{});
  for (const Operation& op : plan_.blocks[block]) {
    switch (op.kind) {
      case Kind::r:
        bind_pulse(op);
        break;
      case Kind::xx:
        bind_interaction(op);
        break;
      case Kind::rz:
        ions_[op.operand[0]].turn += value(op, 0);
        break;
      default:
        bind_fence(op);
    }
  }
  for (std::uint32_t wire = 0; wire < plan_.wires; ++wire) settle(wire);
  if (has_empty_pulse_) {
    std::erase_if(*out_, [](const Operation& op) { return op.kind == Kind::r && op.value[0] == 0; });
  }
}

/// The phase that an operation must have before what waits on the ion: P^-1 r(theta, phi) P.
double Binding::seen_phase(const Ion& ion, double phi) {
  return ion.is_flipped ? ion.turn - phi : phi - ion.turn;
}

void Binding::bind_pulse(const Operation& op) {
  double theta = std::remainder(value(op, 0), 4 * pi);
  double phi = seen_phase(ions_[op.operand[0]], value(op, 1));
  // r(theta + 2 pi) = -r(theta): the sign is a global phase.
  if (std::abs(theta) > pi) theta -= std::copysign(2 * pi, theta);
  if (theta < 0) {
    theta = -theta;
    phi += pi;
  }
  if (theta > nothing) add_pulse(op.operand[0], theta, phi, op.origin);
}

void Binding::add_pulse(std::uint32_t wire, double theta, double phi, Origin origin) {
  Ion& ion = ions_[wire];
  if (ion.pulse != 0) {  // two pulses in a row are one, and a frame change that joins what waits
    Operation& last = (*out_)[ion.pulse - 1];
    const PulseForm both = pulse_form(rotation_xy(theta, phi) * rotation_xy(last.value[0], last.value[1]));
    last.value[0] = both.theta;
    last.value[1] = both.phi;
    last.origin = bound_.origins.merged(last.origin, origin);
    ion.turn += ion.is_flipped ? -both.alpha : both.alpha;
    if (both.theta < nothing) {
      last.value[0] = 0;
      has_empty_pulse_ = true;
    }
    return;
  }
  Operation pulse;
  pulse.kind = Kind::r;
  pulse.operand[0] = wire;
  pulse.operand_count = 1;
  pulse.value[0] = theta;
  pulse.value[1] = wrapped(phi);
  pulse.origin = origin;
  out_->push_back(pulse);
  ion.pulse = static_cast<std::uint32_t>(out_->size());
}

void Binding::bind_interaction(const Operation& op) {
  Ion* const ions[2] = {&ions_[op.operand[0]], &ions_[op.operand[1]]};
  double phi[2] = {seen_phase(*ions[0], value(op, 1)), seen_phase(*ions[1], value(op, 2))};
  double theta = std::remainder(value(op, 0), 2 * pi);  // xx(theta + 2 pi) = -xx(theta)
  if (theta < 0) {
    theta = -theta;
    phi[0] += pi;
  }
  if (theta > pi / 2) {
    // xx(theta) = xx(pi) xx(theta - pi), and xx(pi, a, b) is the flip rz(2 a) X (x) rz(2 b) X.
    for (int i = 0; i < 2; ++i) {
      ions[i]->turn += ions[i]->is_flipped ? -2 * phi[i] : 2 * phi[i];
      ions[i]->is_flipped = !ions[i]->is_flipped;
      ions[i]->origin = op.origin;
    }
    theta = pi - theta;
    phi[0] += pi;
  }
  if (theta <= nothing) return;
  Operation& put = out_->emplace_back(op);
  put.value[0] = theta;
  put.value[1] = wrapped(phi[0]);
  put.value[2] = wrapped(phi[1]);
  put.form[0] = put.form[1] = put.form[2] = 0;
  ions[0]->pulse = ions[1]->pulse = 0;
}

void Binding::bind_fence(const Operation& op) {
  if (op.kind == Kind::classical) {  // it may leave the block, or the round of a loop
    for (std::uint32_t wire = 0; wire < plan_.wires; ++wire) settle(wire);
  }
  for (const std::uint32_t wire : plan_.operands(op)) {
    if (op.kind == Kind::branch) {
      settle(wire);
    } else if (op.kind != Kind::reset) {
      settle_flip(wire);
    }
    // A frame change passes a barrier or a delay, and means nothing once the ion was read or reset.
    if (op.kind == Kind::measure || op.kind == Kind::reset) ions_[wire] = Ion{};
    ions_[wire].pulse = 0;
  }
  out_->push_back(op);
}

/// Performs the flip that waits; what remains is a frame change.
void Binding::settle_flip(std::uint32_t wire) {
  Ion& ion = ions_[wire];
  if (!ion.is_flipped) return;
  // rz(turn) X = A(turn / 2), a pulse by pi; with the pulse before it, it is one pulse and a frame change.
  const double phi = ion.turn / 2;
  ion.is_flipped = false;
  ion.turn = 0;
  add_pulse(wire, pi, phi, ion.origin);
}

void Binding::settle(std::uint32_t wire) {
  settle_flip(wire);
  Ion& ion = ions_[wire];
  const double turn = wrapped(ion.turn);
  ion = Ion{};
  if (std::abs(turn) <= nothing) return;
  Operation frame;
  frame.kind = Kind::rz;
  frame.operand[0] = wire;
  frame.operand_count = 1;
  frame.value[0] = turn;
  out_->push_back(frame);
}

}  // namespace isinglass
