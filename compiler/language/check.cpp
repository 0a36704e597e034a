// Code that is not run: arms that are not taken, loops without rounds, subroutines that nobody has called
// yet. See reader.h.
//
// Names, types and counts are checked there as well. Of a value only its type is looked at, and the value
// where it is a literal or a constant. What depends on values that only a run has passes: an operation is at
// fault when it has no meaning with the values that are known, nor with other values of the same types, nor
// as an operation of the running program.
#include <fmt/format.h>

#include <algorithm>

#include "language/reader.h"

namespace isinglass {

namespace {

const char* plural(std::size_t count) {
  return count == 1 ? "" : "s";
}

/// Some value of the type that no rule about values objects to.
Value sample_of(Type type) {
  Value value;
  value.type = type;
  value.integer = Integer(type.base == Base::bits && type.width == 0 ? 0 : 1);
  if (type.base == Base::integer && type.width == 1) value.integer = Integer(-1);
  value.real = 1;
  return value;
}

/// A value of the type that only the running program knows.
Value running_of(Type type) {
  return of_expression(literal("0"), type, true);
}

bool is_time(Type type) {
  return type.base == Base::duration || type.base == Base::stretch;
}

bool mentions_any_name(const syntax::Expression& expression,
                       const std::function<bool(const std::string&)>& is_one) {
  if (expression.kind == syntax::Expression::Kind::name && is_one(expression.text)) return true;
  return std::any_of(expression.arguments.begin(), expression.arguments.end(),
                     [&](const auto& argument) { return mentions_any_name(argument, is_one); });
}

}  // namespace

const Reader::Local* Reader::local(const std::string& name) const {
  for (auto level = check_levels_.rbegin(); level != check_levels_.rend(); ++level) {
    const auto found = level->find(name);
    if (found != level->end()) return &found->second;
  }
  return nullptr;
}

/// Once for every piece of syntax, however often it is not run.
void Reader::check_unrun(const syntax::Body& body) {
  if (!checked_.insert(&body).second) return;
  const auto outer = std::exchange(check_levels_, {});
  check_list(body.statements);
  check_levels_ = outer;
}

void Reader::check_list(const Statements& statements) {
  check_levels_.emplace_back();
  for (const syntax::Statement& statement : statements) {
    try {
      check_statement(statement);
    } catch (const Trouble& trouble) {
      report(trouble);
    }
  }
  check_levels_.pop_back();
}

// Types.

/// The scalar type, or none where its width is not known here.
Type Reader::checked_type(const syntax::Type& type) {
  const auto is_local = [this](const std::string& name) { return local(name) != nullptr; };
  bool is_known = true;
  for (const SyntaxExpression& width : type.width) {
    check_expression(width);
    is_known = is_known && !mentions_any_name(width, is_local);
  }
  for (const SyntaxExpression& size : type.dimensions) check_expression(size);
  for (const syntax::Type& element : type.element) {
    const Type inner = checked_type(element);
    if (type.kind == syntax::Type::Kind::array) return inner;
    is_known = is_known && inner.base != Base::none;
  }
  const bool is_scalar = type.kind != syntax::Type::Kind::qubit && type.kind != syntax::Type::Kind::array;
  return is_known && is_scalar ? scalar_type(type) : Type{};
}

Reader::Local Reader::local_of(const syntax::Type& type) {
  Local result;
  result.is_qubit = type.kind == syntax::Type::Kind::qubit;
  result.is_array = type.kind == syntax::Type::Kind::array;
  result.is_scalar = result.is_qubit && type.width.empty();
  result.type = checked_type(type);
  return result;
}

/// The first of these ways in which the operation has a meaning gives its type: with the values that are
/// known, with others, as an operation of the running program.
Reader::Checked Reader::applied(const std::vector<Checked>& operands, syntax::Span at,
                                const std::function<Value(const std::vector<Value>&)>& operation) {
  for (const Checked& operand : operands) {
    if (operand.type.base == Base::none) return {};
  }
  const auto with = [&](const std::function<Value(const Checked&)>& value_of) {
    std::vector<Value> values;
    values.reserve(operands.size());
    for (const Checked& operand : operands) values.push_back(value_of(operand));
    return operation(values);
  };
  const auto known = [](const Checked& o) { return o.value ? *o.value : sample_of(o.type); };
  const auto sample = [](const Checked& o) { return sample_of(o.type); };
  const auto running = [](const Checked& o) {
    return is_time(o.type) ? sample_of(o.type) : running_of(o.type);
  };
  try {
    const Value value = with(known);
    const bool is_known =
        std::all_of(operands.begin(), operands.end(), [](const Checked& o) { return o.value; });
    return {value.type, is_known && value.is_known() ? std::optional(value) : std::nullopt};
  } catch (const Fault&) {
  }
  try {
    return {with(running).type, {}};
  } catch (const Fault&) {
  }
  try {
    return {with(sample).type, {}};
  } catch (const Fault& fault) {
    throw_fault(at, fault);
  }
}

// Expressions.

Reader::Checked Reader::checked_name(const SyntaxExpression& expression) {
  if (const Local* it = local(expression.text)) {
    return it->is_array || it->is_qubit ? Checked{} : Checked{it->type, {}};
  }
  const Symbol& symbol = found(expression.text, expression.at, "variable");
  if (symbol.is_array()) return {};
  if (symbol.kind == Symbol::Kind::constant) return {symbol.type, symbol.cells[0]};
  if (symbol.kind == Symbol::Kind::variable || symbol.kind == Symbol::Kind::input) return {symbol.type, {}};
  return {};
}

Reader::Checked Reader::checked_call(const SyntaxExpression& expression) {
  std::vector<Checked> arguments;
  for (const SyntaxExpression& argument : expression.arguments)
    arguments.push_back(check_expression(argument));
  if (local(expression.text) != nullptr) return {};
  const Symbol* symbol = scopes_.find(expression.text);
  const auto demand = [&](std::size_t wanted) {
    if (arguments.size() == wanted) return;
    fail(expression.at, fmt::format("`{}` takes {} argument{}, not {}", expression.text, wanted,
                                    plural(wanted), arguments.size()));
  };
  if (symbol != nullptr && symbol->kind == Symbol::Kind::subroutine) {
    demand(symbol->definition->parameters.size());
    const syntax::Type& result = symbol->definition->result;
    return {result.kind == syntax::Type::Kind::none ? Type{} : checked_type(result), {}};
  }
  if (symbol != nullptr && symbol->kind == Symbol::Kind::external) {
    demand(symbol->extern_definition->parameters.size());
    const syntax::Type& result = symbol->extern_definition->result;
    return {result.kind == syntax::Type::Kind::none ? Type{} : checked_type(result), {}};
  }
  if (expression.text == "sizeof" && version_ != 20) return {{Base::natural, 0}, {}};
  if (symbol == nullptr && is_function(expression.text, version_ == 20)) {
    return applied(arguments, expression.at,
                   [&](const std::vector<Value>& values) { return call(expression.text, values, rules()); });
  }
  if (symbol == nullptr) found(expression.text, expression.at, "function");
  return {};
}

Reader::Checked Reader::checked_index(const SyntaxExpression& expression) {
  const SyntaxExpression& base = expression.arguments[0];
  check_expression(base);
  bool is_one = true;
  std::optional<std::int64_t> index;
  for (std::size_t i = 1; i < expression.arguments.size(); ++i) {
    const SyntaxExpression& item = expression.arguments[i];
    is_one = is_one && item.kind != SyntaxExpression::Kind::range && item.kind != SyntaxExpression::Kind::set;
    const Checked value = check_expression(item);
    if (!is_one || value.type.base == Base::none) continue;
    const Base of = value.type.base;
    if (of != Base::integer && of != Base::natural && of != Base::boolean && of != Base::bit) {
      fail(item.at, fmt::format("an index is an integer, not {}", text_of(value.type)));
    }
    if (value.value && expression.arguments.size() == 2) index = value.value->integer.small();
  }
  if (base.kind != SyntaxExpression::Kind::name) return {};
  // What is indexed: how many there are, and what one of them is.
  std::optional<std::uint32_t> size;
  Type element;
  const char* what = "register";
  const auto of_number = [&](Type type) {
    const bool has_bits = type.base == Base::bits || type.base == Base::integer ||
                          type.base == Base::natural || type.base == Base::angle;
    if (!has_bits) return;
    if (type.base == Base::bits || type.width > 0) size = type.width;
    element = {Base::bit, 0};
  };
  if (const Local* it = local(base.text)) {
    if (it->is_qubit && it->is_scalar) fail(expression.at, "a single qubit has no index");
    if (!it->is_qubit && !it->is_array) of_number(it->type);
  } else {
    const Symbol& symbol = found(base.text, base.at, "variable");
    if (symbol.kind == Symbol::Kind::qubits) {
      if (symbol.is_scalar) fail(expression.at, "a single qubit has no index");
      size = static_cast<std::uint32_t>(symbol.wires.size());
    } else if (symbol.is_array()) {
      what = "dimension";
      if (expression.arguments.size() == 2) size = symbol.shape[0];
      if (expression.arguments.size() == symbol.shape.size() + 1) element = symbol.type;
    } else if (symbol.kind == Symbol::Kind::variable || symbol.kind == Symbol::Kind::constant) {
      of_number(symbol.type);
    }
  }
  if (is_one && index && size) {
    const auto limit = static_cast<std::int64_t>(*size);
    if (*index < -limit || *index >= limit) {
      fail(expression.arguments[1].at, fmt::format("index {} is out of range: the {} has {} element{}",
                                                   *index, what, *size, plural(*size)));
    }
  }
  return is_one ? Checked{element, {}} : Checked{};
}

Reader::Checked Reader::check_expression(const SyntaxExpression& expression) {
  using K = SyntaxExpression::Kind;
  switch (expression.kind) {
    case K::integer:
    case K::real:
    case K::imaginary:
    case K::boolean:
    case K::bit_string: {
      const Value value = literal_value(expression);
      return {value.type, value};
    }
    case K::timing:
      return {{Base::duration, 0}, timing_value(expression)};
    case K::name:
      return checked_name(expression);
    case K::call:
      return checked_call(expression);
    case K::index:
      return checked_index(expression);
    case K::unary: {
      const Checked operand = check_expression(expression.arguments[0]);
      return applied({operand}, expression.at, [&](const std::vector<Value>& values) {
        return unary(syntax::spelling(expression.op), values[0], rules());
      });
    }
    case K::binary: {
      const Checked left = check_expression(expression.arguments[0]);
      const Checked right = check_expression(expression.arguments[1]);
      if (expression.op == syntax::Operator::concatenate) return {};
      return applied({left, right}, expression.at, [&](const std::vector<Value>& values) {
        return binary(syntax::spelling(expression.op), values[0], values[1], rules());
      });
    }
    case K::cast: {
      const Type type = checked_type(expression.type[0]);
      const Checked value = check_expression(expression.arguments[0]);
      if (type.base == Base::none) return {};
      return applied({value}, expression.at,
                     [&](const std::vector<Value>& values) { return cast(values[0], type, rules()); });
    }
    case K::durationof:
      check_list(expression.body);
      return {{Base::duration, 0}, {}};
    default:
      for (const SyntaxExpression& argument : expression.arguments) check_expression(argument);
      return {};
  }
}

/// Whether the value may be given to a variable, parameter or result of this type.
void Reader::check_fits(const Checked& value, Type type, syntax::Span at) {
  if (type.base == Base::none) return;
  applied({value}, at, [&](const std::vector<Value>& values) { return converted(values[0], type, rules()); });
}

void Reader::check_truth(const SyntaxExpression& condition) {
  check_fits(check_expression(condition), {Base::boolean, 0}, condition.at);
}

void Reader::check_qubits(const SyntaxExpression& operand) {
  check_expression(operand);
  if (operand.kind == SyntaxExpression::Kind::name) {
    const Local* it = local(operand.text);
    const bool is_classical = it != nullptr
                                  ? !it->is_qubit && !it->is_unknown
                                  : found(operand.text, operand.at, "qubit").kind != Symbol::Kind::qubits &&
                                        found(operand.text, operand.at, "qubit").kind != Symbol::Kind::broken;
    if (is_classical) fail(operand.at, fmt::format("`{}` is not a qubit", operand.text));
  }
}

// Statements.

void Reader::check_call(const syntax::GateCall& call) {
  for (const SyntaxExpression& angle : call.angles) {
    const Type type = check_expression(angle).type;
    const Symbol* callee = local(call.name.text) != nullptr ? nullptr : scopes_.find(call.name.text);
    if (type.base == Base::none || (callee != nullptr && callee->kind != Symbol::Kind::gate)) continue;
    if (type.base == Base::bits || type.base == Base::complex || is_time(type)) {
      fail(angle.at, fmt::format("an angle is expected here, not {}", text_of(type)));
    }
  }
  std::size_t controls = 0;
  bool counts = true;
  for (const syntax::Modifier& modifier : call.modifiers) {
    if (modifier.argument) check_expression(*modifier.argument);
    if (modifier.kind != syntax::Modifier::Kind::ctrl && modifier.kind != syntax::Modifier::Kind::negctrl)
      continue;
    counts = counts && !modifier.argument;
    ++controls;
  }
  if (local(call.name.text) != nullptr) {
    for (const SyntaxExpression& operand : call.operands) check_expression(operand);
    return;
  }
  std::size_t angles = 1;
  std::size_t expected = controls;
  if (call.name.text != "gphase") {
    const Symbol& symbol = found(call.name.text, call.name.at, "gate");
    if (symbol.kind != Symbol::Kind::gate || symbol.is_opaque) {
      for (const SyntaxExpression& operand : call.operands) check_expression(operand);
      return;
    }
    angles = symbol.gate->parameters;
    expected += symbol.gate->operands;
  }
  for (const SyntaxExpression& operand : call.operands) check_qubits(operand);
  if (call.angles.size() != angles) {
    fail(call.name.at, fmt::format("`{}` takes {} angle{}, not {}", call.name.text, angles, plural(angles),
                                   call.angles.size()));
  }
  if (counts && call.operands.size() != expected) {
    fail(call.name.at, fmt::format("`{}`{} takes {} qubit{}, not {}", call.name.text,
                                   controls == 0 ? "" : " with its controls", expected, plural(expected),
                                   call.operands.size()));
  }
}

void Reader::check_declaration(const syntax::Declaration& declaration) {
  check_levels_.back()[declaration.name.text].is_unknown = true;  // declared even where its value is wrong
  const Local it = local_of(declaration.type);
  check_levels_.back()[declaration.name.text] = it;
  if (it.is_array) fail(declaration.type.at, "arrays are declared at the outermost level only");
  if (!declaration.value) return;
  const SyntaxExpression& value = *declaration.value;
  const Checked given = check_expression(value);
  if (it.type.base == Base::none) return;
  if (value.kind == SyntaxExpression::Kind::set) fail(value.at, "a list of values is for arrays only");
  const bool is_whole =
      it.type.base == Base::integer || it.type.base == Base::natural || it.type.base == Base::boolean;
  if (declaration.role == syntax::Declaration::Role::constant && is_whole && given.type.base == Base::real) {
    fail(value.at,
         fmt::format("a constant {} does not take {} without a cast", text_of(it.type), text_of(given.type)));
  }
  check_fits(given, it.type, value.at);
}

void Reader::check_assignment(const syntax::Assignment& assignment) {
  const Checked target = check_expression(assignment.target);
  Checked value = check_expression(assignment.value);
  const SyntaxExpression* base = &assignment.target;
  while (base->kind == SyntaxExpression::Kind::index) base = &base->arguments[0];
  if (base->kind == SyntaxExpression::Kind::name && local(base->text) == nullptr) {
    const Symbol& symbol = found(base->text, base->at, "variable");
    if (symbol.kind == Symbol::Kind::constant) {
      fail(assignment.target.at, fmt::format("`{}` is constant", symbol.name));
    }
    if (symbol.kind == Symbol::Kind::qubits) fail(assignment.target.at, "a qubit cannot be assigned");
  }
  if (target.type.base == Base::none) return;
  if (assignment.op != syntax::Operator::none) {
    value = applied({Checked{target.type, {}}, value}, assignment.target.at,
                    [&](const std::vector<Value>& values) {
                      return binary(syntax::spelling(assignment.op), values[0], values[1], rules());
                    });
  }
  check_fits(value, target.type, assignment.value.at);
}

void Reader::check_measurement(const syntax::Measurement& measurement) {
  check_qubits(measurement.qubits);
  if (!measurement.target) return;
  const Base base = check_expression(*measurement.target).type.base;
  if (base != Base::none && base != Base::bit && base != Base::bits && base != Base::boolean) {
    fail(measurement.target->at, "a measurement gives bits; they do not fit here",
         {"help: measure into a bit register and cast it"});
  }
}

void Reader::check_statement(const syntax::Statement& statement) {
  using namespace syntax;
  const auto qubits = [&](const std::vector<SyntaxExpression>& operands) {
    for (const SyntaxExpression& operand : operands) check_qubits(operand);
  };
  if (const auto* s = std::get_if<GateCall>(&statement.what)) return check_call(*s);
  if (const auto* s = std::get_if<syntax::Declaration>(&statement.what)) return check_declaration(*s);
  if (const auto* s = std::get_if<syntax::Alias>(&statement.what)) {
    check_levels_.back()[s->name.text].is_unknown = true;
    check_expression(s->value);
    return;
  }
  if (const auto* s = std::get_if<Assignment>(&statement.what)) return check_assignment(*s);
  if (const auto* s = std::get_if<Measurement>(&statement.what)) return check_measurement(*s);
  if (const auto* s = std::get_if<syntax::Reset>(&statement.what)) return check_qubits(s->qubits);
  if (const auto* s = std::get_if<syntax::Barrier>(&statement.what)) return qubits(s->operands);
  if (const auto* s = std::get_if<Nop>(&statement.what)) return qubits(s->operands);
  if (const auto* s = std::get_if<syntax::Delay>(&statement.what)) {
    const isinglass::Type type = check_expression(s->length).type;
    if (type.base != Base::none && !is_time(type)) {
      fail(s->length.at, fmt::format("the length of a delay is a duration, not {}", text_of(type)),
           {"help: write a unit, as in 100ns"});
    }
    return qubits(s->operands);
  }
  if (const auto* s = std::get_if<ExpressionStatement>(&statement.what)) {
    check_expression(s->value);
    return;
  }
  if (const auto* s = std::get_if<Return>(&statement.what)) {
    if (!s->value) return;
    const Checked value = check_expression(*s->value);
    if (check_result_) check_fits(value, *check_result_, s->value->at);
    return;
  }
  if (const auto* s = std::get_if<Box>(&statement.what)) {
    if (s->length) check_expression(*s->length);
    return check_list(s->body.statements);
  }
  if (const auto* s = std::get_if<Body>(&statement.what)) return check_list(s->statements);
  if (const auto* s = std::get_if<If>(&statement.what)) {
    check_truth(s->condition);
    check_list(s->then.statements);
    if (s->otherwise) check_list(s->otherwise->statements);
    return;
  }
  if (const auto* s = std::get_if<While>(&statement.what)) {
    check_truth(s->condition);
    return check_list(s->body.statements);
  }
  if (const auto* s = std::get_if<For>(&statement.what)) {
    check_expression(s->over);
    const Local variable = local_of(s->type);
    check_levels_.push_back({{s->name.text, variable}});
    check_list(s->body.statements);
    check_levels_.pop_back();
    return;
  }
  if (const auto* s = std::get_if<Switch>(&statement.what)) {
    check_expression(s->selector);
    for (const Switch::Case& arm : s->cases) {
      for (const SyntaxExpression& label : arm.labels) check_expression(label);
      check_list(arm.body.statements);
    }
  }
}

/// The body of a subroutine where it is defined: it sees its parameters, itself, global constants and
/// callables.
void Reader::check_subroutine(const syntax::Subroutine& definition) {
  const std::size_t outer_frame = std::exchange(scopes_.frame, scopes_.depth() + 1);
  check_levels_ = {{}};
  check_result_.reset();
  try {
    for (const syntax::Parameter& parameter : definition.parameters) {
      check_levels_[0][parameter.name.text].is_unknown = true;
      check_levels_[0][parameter.name.text] = local_of(parameter.type);
    }
    if (definition.result.kind != syntax::Type::Kind::none) check_result_ = checked_type(definition.result);
    check_list(definition.body.statements);
  } catch (const Trouble& trouble) {
    report(trouble);
  }
  check_levels_.clear();
  check_result_.reset();
  scopes_.frame = outer_frame;
}

}  // namespace isinglass
