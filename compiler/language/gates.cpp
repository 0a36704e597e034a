// Gate definitions and calls: templates, modifiers, broadcasting, and operations into the circuit. See
// reader.h.
#include <fmt/format.h>

#include <algorithm>
#include <cmath>

#include "language/evaluate.h"
#include "language/reader.h"
#include "language/running_angle.h"
#include "language/unitary.h"

namespace isinglass {

namespace {

const char* plural(std::size_t count) {
  return count == 1 ? "" : "s";
}

}  // namespace

// Into the circuit.

void Reader::append(Operation&& op, syntax::Span at) {
  if (++operations_ > options_.most_operations) {
    throw Overflow{{at,
                    fmt::format("the program unrolls to more than {} operations", options_.most_operations),
                    {"note: loops, calls and gates whose course is known are written out by the compiler"}}};
  }
  ++emitted_;
  if (at.source == 0) op.origin = Origins::line(at.line);
  circuit_.blocks[block_].push_back(op);
}

void Reader::emit(Kind kind, std::span<const std::uint32_t> wires, std::span<const Angle> angles,
                  syntax::Span at) {
  if (capture_ != nullptr) {
    Act act;
    act.kind = kind;
    std::copy(angles.begin(), angles.end(), act.angles.begin());
    act.wires.assign(wires.begin(), wires.end());
    capture_->push_back(std::move(act));
    if (capture_->size() > options_.most_operations) {
      throw Overflow{
          {at, fmt::format("the gate unrolls to more than {} operations", options_.most_operations), {}}};
    }
    return;
  }
  if (kind == Kind::phase && wires.empty()) {
    ++emitted_;
    phase_[block_] = circuit_.forms.sum(phase_[block_], angles[0]);
    return;
  }
  append(circuit_.make(kind, wires, angles), at);
}

void Reader::emit_template(const GateTemplate& gate, std::span<const Angle> arguments,
                           std::span<const std::uint32_t> wires, syntax::Span at) {
  std::array<Angle, 3> angles;
  std::vector<std::uint32_t>& operands = operand_buffer_;
  for (const Act& act : gate.acts) {
    for (std::size_t i = 0; i < 3; ++i) angles[i] = substituted(gate, act.angles[i], arguments, *forms_);
    for (const Angle& angle : angles) {
      if (!std::isfinite(angle.constant)) fail(at, "this angle is not a finite number");
    }
    operands.clear();
    for (const std::uint32_t wire : act.wires) operands.push_back(wires[wire]);
    emit(act.kind, operands, angles, at);
  }
}

// Definitions.

namespace {

/// Native programs define r and xx in standard gates. Where a definition is exactly one of these, it is that
/// operation, so that a native program reads back as what it is.
void recognize_native(std::string_view name, GateTemplate& gate) {
  const bool is_r = name == "r" && gate.parameters == 2 && gate.operands == 1;
  const bool is_xx = name == "xx" && gate.parameters == 3 && gate.operands == 2;
  if ((!is_r && !is_xx) || gate.acts.size() > 100) return;
  const std::vector<std::uint32_t> wires =
      is_r ? std::vector<std::uint32_t>{0} : std::vector<std::uint32_t>{0, 1};
  // Both sides are trigonometric polynomials of low degree: agreement at these points is agreement.
  for (const std::array<double, 3>& point : {std::array<double, 3>{0.3, 1.1, -0.7},
                                             {2.9, -2.3, 0.4},
                                             {-1.7, 0.6, 2.2},
                                             {5.1, 2.8, -1.9},
                                             {0.9, -0.2, 3.0}}) {
    std::vector<Angle> arguments;
    Operation op;
    op.kind = is_r ? Kind::r : Kind::xx;
    for (std::uint32_t i = 0; i < gate.parameters; ++i) {
      arguments.push_back({point[i], 0});
      op.set_angle(static_cast<int>(i), arguments.back());
    }
    Forms forms;
    const Eigen::MatrixXcd defined = matrix_of(instance(gate, arguments, wires, forms), wires);
    const auto native = matrix_of(op);
    for (Eigen::Index row = 0; row < defined.rows(); ++row) {
      for (Eigen::Index column = 0; column < defined.cols(); ++column) {
        const auto entry = native[static_cast<std::size_t>(row * defined.cols() + column)];
        if (std::abs(defined(row, column) - entry) > 1e-12) return;
      }
    }
  }
  Act act;
  act.kind = is_r ? Kind::r : Kind::xx;
  act.wires = wires;
  for (std::uint32_t i = 0; i < gate.parameters; ++i) act.angles[i] = {0, gate.forms.of_input(i)};
  gate.acts = {act};
}

}  // namespace

void Reader::define_gate(const syntax::GateDefinition& definition, syntax::Span at) {
  if (scopes_.depth() != 1 || block_ != 0) fail(at, "gates are defined at the outermost level only");
  Symbol symbol;
  symbol.kind = Symbol::Kind::gate;
  symbol.name = definition.name.text;
  symbol.at = definition.name.at;
  templates_.emplace_back();
  GateTemplate& gate = templates_.back();
  gate.parameters = static_cast<std::uint32_t>(definition.parameters.size());
  gate.operands = static_cast<std::uint32_t>(definition.qubits.size());
  symbol.gate = &gate;
  symbol.is_opaque = definition.opaque;
  const std::size_t errors_before = errors_;
  if (definition.qubits.empty()) report({definition.name.at, "a gate acts on at least one qubit", {}});
  if (!definition.opaque) {
    const std::size_t outer_frame = std::exchange(scopes_.frame, scopes_.depth() + 1);
    const std::string outer_gate = std::exchange(gate_name_, definition.name.text);
    scopes_.open();
    capture_ = &gate.acts;
    forms_ = &gate.forms;
    gate_derived_ = &symbol.derived;
    gate_parameters_ = gate.parameters;
    const auto restore = [&] {
      capture_ = nullptr;
      forms_ = &circuit_.forms;
      gate_derived_ = nullptr;
      close_scope();
      scopes_.frame = outer_frame;
      gate_name_ = outer_gate;
    };
    try {
      declare_gate_arguments(definition);
      run_list(definition.body.statements);
    } catch (const Trouble& trouble) {
      report(trouble);
    } catch (...) {
      restore();
      throw;
    }
    restore();
  }
  if (errors_ != errors_before) {
    symbol.kind = Symbol::Kind::broken;
  } else if (symbol.derived.empty()) {
    recognize_native(symbol.name, gate);
  }
  declare(std::move(symbol));
}

void Reader::declare_gate_arguments(const syntax::GateDefinition& definition) {
  for (std::uint32_t i = 0; i < definition.parameters.size(); ++i) {
    Symbol parameter;
    parameter.kind = Symbol::Kind::input;
    parameter.name = definition.parameters[i].text;
    parameter.at = definition.parameters[i].at;
    parameter.type = {Base::angle, 0};
    Value value;
    value.type = parameter.type;
    value.form = forms_->of_input(i);
    parameter.cells = {value};
    declare(std::move(parameter));
  }
  for (std::uint32_t i = 0; i < definition.qubits.size(); ++i) {
    Symbol qubit;
    qubit.kind = Symbol::Kind::qubits;
    qubit.name = definition.qubits[i].text;
    qubit.at = definition.qubits[i].at;
    qubit.wires = {i};
    qubit.is_scalar = true;
    declare(std::move(qubit));
  }
}

// Calls.

/// The template's arguments: the call's angles, and what the body derives from them.
std::vector<Angle> Reader::gate_arguments(const Symbol& symbol, std::vector<Angle> arguments,
                                          syntax::Span at) {
  // What the body derives from its parameters otherwise than by sums and multiples.
  for (const Expression& expression : symbol.derived) {
    const Value value = at_place(at, [&] {
      return evaluate(
          expression,
          [&](const Expression& leaf) {
            if (leaf.kind != Expression::Kind::input) return Value{};
            Value argument = of_real(arguments[leaf.variable].constant, {Base::angle, 0});
            argument.form = arguments[leaf.variable].form;
            return argument;
          },
          rules());
    });
    arguments.push_back(angle_of(value, at));
  }
  return arguments;
}

std::vector<Reader::Control> Reader::controls_of(const syntax::GateCall& call) {
  std::vector<Control> controls;
  for (const syntax::Modifier& modifier : call.modifiers) {
    const bool negated = modifier.kind == syntax::Modifier::Kind::negctrl;
    if (modifier.kind != syntax::Modifier::Kind::ctrl && !negated) continue;
    std::int64_t count = 1;
    if (modifier.argument) {
      count = known_int(*modifier.argument, "the number of controls");
      if (count < 1) fail(modifier.argument->at, "the number of controls must be positive");
      if (count > 100'000) fail(modifier.argument->at, fmt::format("{} controls are too many", count));
    }
    controls.push_back({static_cast<std::uint32_t>(count), negated});
  }
  return controls;
}

/// Applies the modifiers from the innermost outwards. `controls` are the control wires, in operand order.
Acts Reader::modified(const syntax::GateCall& call, Acts acts, const std::vector<Control>& controls,
                      std::span<const std::uint32_t> wires) {
  std::size_t next = controls.size();
  std::size_t end = 0;
  for (const Control& control : controls) end += control.count;
  for (std::size_t i = call.modifiers.size(); i-- > 0;) {
    const syntax::Modifier& modifier = call.modifiers[i];
    switch (modifier.kind) {
      case syntax::Modifier::Kind::inv:
        acts = inverted(std::move(acts), *forms_);
        break;
      case syntax::Modifier::Kind::pow:
        acts = at_place(modifier.at, [&] { return power_of(modifier, std::move(acts)); });
        break;
      default: {
        const Control& control = controls[--next];
        end -= control.count;
        acts = controlled(std::move(acts), wires.subspan(end, control.count), control.negated);
      }
    }
  }
  return acts;
}

Acts Reader::power_of(const syntax::Modifier& modifier, Acts acts) {
  const Value value = evaluated(*modifier.argument);
  if (!value.is_known()) {
    if (value.runs) split_on(*value.expression, modifier.argument->at);
    fail(modifier.argument->at, "a power must be known while compiling or depend on a few bits");
  }
  const Base base = value.type.base;
  double exponent = 0;
  if (base == Base::integer || base == Base::natural || base == Base::boolean || base == Base::bit) {
    const auto whole = value.integer.small();
    if (!whole) fail(modifier.argument->at, "this power is too large");
    if (*whole == 0 && modifier.argument->kind == SyntaxExpression::Kind::binary &&
        modifier.argument->op == syntax::Operator::divide) {
      warn(modifier.argument->at, "integers divide to an integer: this power is 0, the identity",
           {"help: write one of the two as a float, as in 1.0/2"});
    }
    return repeated(std::move(acts), *whole, *forms_, options_.most_operations);
  }
  if (base != Base::real && base != Base::angle) {
    fail(modifier.argument->at, fmt::format("a power is a number, not {}", text_of(value.type)));
  }
  exponent = radians_of(value);
  if (exponent == std::trunc(exponent) && std::abs(exponent) < 0x1p53) {
    return repeated(std::move(acts), static_cast<std::int64_t>(exponent), *forms_, options_.most_operations);
  }
  return powered(std::move(acts), exponent, *forms_, [this](Angle angle) { return wrapped_angle(angle); });
}

void Reader::check_distinct(const std::vector<std::uint32_t>& wires, const std::vector<std::size_t>& owner,
                            const std::vector<SyntaxExpression>& operands) {
  for (std::size_t i = 1; i < wires.size(); ++i) {
    for (std::size_t j = 0; j < i; ++j) {
      if (wires[i] != wires[j]) continue;
      const std::string name = capture_ != nullptr ? operands[owner[i]].text : circuit_.wire_name(wires[i]);
      throw GivenTwice{{operands[owner[i]].at, fmt::format("qubit `{}` is given twice", name), {}}};
    }
  }
}

void Reader::call_gate(const syntax::GateCall& call, syntax::Span at) {
  const bool is_phase = call.name.text == "gphase";
  static const GateTemplate phase_template = [] {
    GateTemplate gate;
    gate.parameters = 1;
    Act act;
    act.kind = Kind::phase;
    act.angles[0] = {0, gate.forms.of_input(0)};
    gate.acts.push_back(act);
    return gate;
  }();
  if (!gate_name_.empty() && call.name.text == gate_name_) {
    fail(call.name.at, fmt::format("gate `{}` cannot call itself", gate_name_));
  }
  Symbol phase_symbol;
  const Symbol* symbol = &phase_symbol;
  if (is_phase) {
    phase_symbol.kind = Symbol::Kind::gate;
    phase_symbol.name = "gphase";
    phase_symbol.gate = &phase_template;
  } else {
    symbol = &found(call.name.text, call.name.at, "gate");
  }
  if (symbol->kind == Symbol::Kind::subroutine || symbol->kind == Symbol::Kind::external) {
    return call_old_form(call, *symbol, at);
  }
  if (symbol->kind != Symbol::Kind::gate)
    fail(call.name.at, fmt::format("`{}` is not a gate", call.name.text));
  if (symbol->is_opaque) {
    fail(call.name.at, fmt::format("`{}` is opaque: nothing says what it does", call.name.text),
         {"help: define it as a gate"});
  }
  if (call.duration) {
    warn(call.duration->at, "the machine decides how long a gate takes; the duration given here is ignored");
  }
  if (call.angles.size() != symbol->gate->parameters) {
    fail(call.name.at, fmt::format("`{}` takes {} angle{}, not {}", symbol->name, symbol->gate->parameters,
                                   plural(symbol->gate->parameters), call.angles.size()));
  }
  std::vector<Value> values;
  for (const SyntaxExpression& angle : call.angles) values.push_back(evaluated(angle));
  const std::vector<Control> controls = controls_of(call);
  std::size_t expected = symbol->gate->operands;
  for (const Control& control : controls) expected += control.count;
  if (call.operands.size() != expected) {
    fail(call.name.at, fmt::format("`{}`{} takes {} qubit{}, not {}", call.name.text,
                                   controls.empty() ? "" : " with its controls", expected, plural(expected),
                                   call.operands.size()));
  }
  std::vector<Qubits> operands;
  for (const SyntaxExpression& operand : call.operands) operands.push_back(qubits_of(operand));
  if (call_by_bits(call, *symbol, values, controls, operands, at)) return;
  std::vector<Angle> angles;
  for (std::size_t i = 0; i < values.size(); ++i) angles.push_back(angle_of(values[i], call.angles[i].at));
  apply_gate(call, *symbol, gate_arguments(*symbol, std::move(angles), call.name.at), controls, operands, at);
}

/// A rotation by a sum over running bits: each bit has its gate, under a condition. False where it is none.
bool Reader::call_by_bits(const syntax::GateCall& call, const Symbol& symbol,
                          const std::vector<Value>& values, const std::vector<Control>& controls,
                          const std::vector<Qubits>& operands, syntax::Span at) {
  std::size_t which = values.size();
  for (std::size_t i = 0; i < values.size(); ++i) {
    if (!values[i].runs) continue;
    if (which != values.size()) return false;
    which = i;
  }
  if (which == values.size() || !symbol.derived.empty()) return false;
  const auto sum = running_angle(*values[which].expression, circuit_, rules());
  if (!sum || sum->bits.size() < 2) return false;
  std::vector<Angle> angles(values.size());
  for (std::size_t i = 0; i < values.size(); ++i) {
    if (i != which) angles[i] = angle_of(values[i], call.angles[i].at);
    if (!angles[i].is_known()) return false;
  }
  const RotationTest test = rotation_in(*symbol.gate, angles, which);
  if (!test.is_rotation || (sum->wraps && !test.has_period_2pi)) return false;
  for (const syntax::Modifier& modifier : call.modifiers) {
    // A whole power is a rotation too; principal fractions are not.
    if (modifier.kind != syntax::Modifier::Kind::pow) continue;
    const Value power = evaluated(*modifier.argument);
    if (!power.is_known() || !(power.type.base == Base::integer || power.type.base == Base::natural))
      return false;
  }
  const auto apply = [&](Angle angle) {
    angles[which] = angle;
    apply_gate(call, symbol, angles, controls, operands, at);
  };
  if (sum->fixed != Angle{}) apply(sum->fixed);
  for (const auto& [bit, weight] : sum->bits) {
    Branch branch;
    branch.condition = bit;
    branch.arms.push_back({{}, open_arm()});
    apply({weight, 0});
    close_arm();
    append_branch(std::move(branch), at);
  }
  return true;
}

void Reader::apply_gate(const syntax::GateCall& call, const Symbol& symbol, std::span<const Angle> arguments,
                        const std::vector<Control>& controls, const std::vector<Qubits>& operands,
                        syntax::Span at) {
  if (call.modifiers.empty()) {
    for_each_call(call, operands, [&](const std::vector<std::uint32_t>& wires) {
      emit_template(*symbol.gate, arguments, wires, at);
    });
    return;
  }
  const std::size_t expected = call.operands.size();
  // Modified once on numbered wires, then copied to where it is called.
  std::vector<std::uint32_t> numbered(expected);
  for (std::uint32_t i = 0; i < expected; ++i) numbered[i] = i;
  const std::span<const std::uint32_t> formal(numbered);
  const Acts acts = modified(
      call, instance(*symbol.gate, arguments, formal.subspan(expected - symbol.gate->operands), *forms_),
      controls, formal);
  for_each_call(call, operands, [&](const std::vector<std::uint32_t>& wires) {
    std::vector<std::uint32_t> placed;
    for (const Act& act : acts) {
      placed.clear();
      for (const std::uint32_t wire : act.wires) placed.push_back(wires[wire]);
      emit(act.kind, placed, act.angles, at);
    }
  });
}

/// Registers of equal length are taken qubit by qubit; single qubits are repeated.
void Reader::for_each_call(const syntax::GateCall& call, const std::vector<Qubits>& operands,
                           const std::function<void(const std::vector<std::uint32_t>&)>& one) {
  std::size_t length = 0;
  bool any_register = false;
  for (std::size_t i = 0; i < operands.size(); ++i) {
    if (operands[i].is_scalar) continue;
    if (any_register && operands[i].wires.size() != length) {
      fail(call.operands[i].at, fmt::format("registers of different lengths, {} and {}, in one call", length,
                                            operands[i].wires.size()));
    }
    length = operands[i].wires.size();
    any_register = true;
  }
  std::vector<std::size_t> owner(operands.size());
  for (std::size_t i = 0; i < operands.size(); ++i) owner[i] = i;
  std::vector<std::uint32_t> wires(operands.size());
  for (std::size_t k = 0; k < (any_register ? length : 1); ++k) {
    for (std::size_t i = 0; i < operands.size(); ++i)
      wires[i] = operands[i].wires[operands[i].is_scalar ? 0 : k];
    check_distinct(wires, owner, call.operands);
    one(wires);
  }
}

/// `f(a) q;`, a subroutine called the way of early drafts.
void Reader::call_old_form(const syntax::GateCall& call, const Symbol& symbol, syntax::Span at) {
  if (!call.modifiers.empty()) fail(call.name.at, "modifiers are for gates only, not for subroutines");
  if (!call.operands.empty()) {
    warn(at, fmt::format("`{}` is a subroutine: its qubits belong into the parentheses", symbol.name),
         {fmt::format("help: write {}(..., q)", symbol.name)});
  }
  std::vector<const SyntaxExpression*> arguments;
  for (const SyntaxExpression& angle : call.angles) arguments.push_back(&angle);
  for (const SyntaxExpression& operand : call.operands) arguments.push_back(&operand);
  if (symbol.kind == Symbol::Kind::external) {
    call_extern(symbol, arguments, at);
  } else {
    call_subroutine(symbol, arguments, at);
  }
}

}  // namespace isinglass
