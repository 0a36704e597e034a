// Expressions, types, constants, indices and qubit operands. See reader.h.
#include <fmt/format.h>

#include <algorithm>
#include <charconv>
#include <cmath>

#include "language/reader.h"

namespace isinglass {

namespace {

constexpr std::uint32_t most_width = 1u << 24;
constexpr std::uint32_t most_split_bits = 10;

Integer integer_of(std::string_view text) {
  if (text.size() > 2 && text[0] == '0') {
    if (text[1] == 'x' || text[1] == 'X') return Integer::parsed(text.substr(2), 16);
    if (text[1] == 'o') return Integer::parsed(text.substr(2), 8);
    if (text[1] == 'b' || text[1] == 'B') return Integer::parsed(text.substr(2), 2);
  }
  return Integer::parsed(text, 10);
}

double real_of(std::string_view text) {
  double value = 0;
  if (std::from_chars(text.data(), text.data() + text.size(), value).ec == std::errc::result_out_of_range) {
    // Too small or too large for a double: strtod tells which.
    value = std::strtod(std::string(text).c_str(), nullptr);
  }
  return value;
}

/// The variables' bits that a run-time expression depends on, one of them at a time.
const Expression* first_variable(const Expression& expression) {
  if (expression.kind == Expression::Kind::variable) return &expression;
  if (expression.kind == Expression::Kind::index &&
      expression.arguments[0].kind == Expression::Kind::variable) {
    const bool literal_index =
        expression.arguments.size() == 2 && expression.arguments[1].kind == Expression::Kind::literal;
    if (literal_index) return &expression;
  }
  for (const Expression& argument : expression.arguments) {
    if (const Expression* found = first_variable(argument)) return found;
  }
  return nullptr;
}

}  // namespace

// Types and constants.

Value Reader::constant(const SyntaxExpression& expression, const char* what) {
  const bool before = std::exchange(read_variable_, false);
  const Value value = evaluated(expression);
  const bool is_constant = !std::exchange(read_variable_, before) && value.is_known();
  if (!is_constant) {
    fail(expression.at, fmt::format("{} must be a constant", what),
         {"help: declare what it depends on as `const`"});
  }
  return value;
}

std::uint32_t Reader::size_of(const SyntaxExpression& expression, std::uint32_t least, const char* what) {
  const Value value = constant(expression, what);
  const bool is_whole = value.type.base == Base::integer || value.type.base == Base::natural ||
                        value.type.base == Base::boolean || value.type.base == Base::bit;
  if (!is_whole) fail(expression.at, fmt::format("{} must be an integer, not {}", what, text_of(value.type)));
  const auto small = value.integer.small();
  if (!small || *small > most_width) {
    fail(expression.at, fmt::format("{} of {} is too large", what, value.integer.to_string()));
  }
  if (*small < least) {
    fail(expression.at,
         fmt::format("{} must be at least {}, not {}", what, least, value.integer.to_string()));
  }
  return static_cast<std::uint32_t>(*small);
}

Type Reader::scalar_type(const syntax::Type& type) {
  using K = syntax::Type::Kind;
  const auto sized = [&](Base base) {
    return Type{base, type.width.empty() ? 0 : size_of(type.width[0], 1, "a width")};
  };
  switch (type.kind) {
    case K::bit:
      if (type.width.empty()) return {Base::bit, 0};
      return {Base::bits, size_of(type.width[0], 0, "the size of a register")};
    case K::boolean:
      return {Base::boolean, 0};
    case K::integer:
      return sized(Base::integer);
    case K::uinteger:
      return sized(Base::natural);
    case K::real:
      return sized(Base::real);
    case K::angle:
      return sized(Base::angle);
    case K::complex:
      return {Base::complex, type.element.empty() ? 0 : scalar_type(type.element[0]).width};
    case K::duration:
      return {Base::duration, 0};
    case K::stretch:
      return {Base::stretch, 0};
    case K::nothing:
    case K::none:
      return {Base::none, 0};
    case K::qubit:
      fail(type.at, "qubits are declared at the outermost level only");
    case K::array:
      break;
  }
  fail(type.at, "an array cannot stand here; a scalar type is expected");
}

std::vector<std::uint32_t> Reader::array_shape(const syntax::Type& type) {
  std::vector<std::uint32_t> shape;
  for (const SyntaxExpression& size : type.dimensions) {
    shape.push_back(size_of(size, 0, "the size of a dimension"));
  }
  if (shape.size() > 7) fail(type.at, "an array has at most 7 dimensions");
  return shape;
}

// Values.

Value Reader::evaluated(const SyntaxExpression& expression) {
  if (!fixed_.empty()) {
    const auto fixed = fixed_.find(&expression);
    if (fixed != fixed_.end()) {
      const Value& value = fixed->second;
      const bool is_variable = value.runs && value.expression->kind == Expression::Kind::variable;
      return is_variable ? variable_value(value.expression->variable, value.type) : value;
    }
  }
  try {
    return evaluated_unchecked(expression);
  } catch (const Fault& fault) {
    throw_fault(expression.at, fault);
  }
}

Value Reader::literal_value(const SyntaxExpression& expression) {
  using K = SyntaxExpression::Kind;
  switch (expression.kind) {
    case K::integer: {
      if (expression.text.size() > 20'000) fail(expression.at, "this integer is longer than 20,000 digits");
      return of_int(integer_of(expression.text));
    }
    case K::real: {
      const double value = real_of(expression.text);
      if (!std::isfinite(value)) fail(expression.at, "this number is too large for a float");
      return of_real(value, {Base::real, 0});
    }
    case K::imaginary: {
      Value value = of_real(0, {Base::complex, 0});
      value.imaginary = real_of(expression.text);
      return value;
    }
    case K::boolean:
      return of_bool(expression.text == "true");
    default:
      return of_bits(Integer::parsed(expression.text, 2), static_cast<std::uint32_t>(expression.text.size()));
  }
}

Value Reader::evaluated_unchecked(const SyntaxExpression& expression) {
  using K = SyntaxExpression::Kind;
  switch (expression.kind) {
    case K::integer:
    case K::real:
    case K::imaginary:
    case K::boolean:
    case K::bit_string:
      return literal_value(expression);
    case K::timing:
      return timing_value(expression);
    case K::name: {
      Symbol& symbol = found(expression.text, expression.at, "variable");
      if (symbol.kind == Symbol::Kind::constant && !symbol.is_array()) return symbol.cells[0];
      return read(located(expression), expression.at);
    }
    case K::unary:
      return unary(syntax::spelling(expression.op), evaluated(expression.arguments[0]), rules());
    case K::binary: {
      if (expression.op == syntax::Operator::concatenate) return read(located(expression), expression.at);
      const Value left = evaluated(expression.arguments[0]);
      const bool is_and = expression.op == syntax::Operator::logical_and;
      if ((is_and || expression.op == syntax::Operator::logical_or) && left.is_known()) {
        // What is not needed is not run: it may be a call.
        const Value truth = converted(left, {Base::boolean, 0}, rules());
        if (truth_of(truth) != is_and) return truth;
      }
      const Value right = evaluated(expression.arguments[1]);
      const bool is_mixed = (left.type.base == Base::bits) != (right.type.base == Base::bits);
      Value result = binary(syntax::spelling(expression.op), left, right, rules());
      if (is_mixed && result.type.base == Base::boolean && version_ != 20) {
        const Type bits = left.type.base == Base::bits ? left.type : right.type;
        warn(expression.at, "a register is compared with a number as the unsigned number that it holds",
             {fmt::format("help: the standard wants a cast, as in uint[{}](c)", bits.width)});
      }
      return result;
    }
    case K::call:
      return call_value(expression);
    case K::cast: {
      const Type type = scalar_type(expression.type[0]);
      return cast(evaluated(expression.arguments[0]), type, rules());
    }
    case K::index: {
      const SyntaxExpression& base = expression.arguments[0];
      const bool is_variable = base.kind == K::name || base.kind == K::index;
      if (is_variable) return read(located(expression), expression.at);
      // A bit of a value that has no name.
      Symbol unnamed;
      unnamed.kind = Symbol::Kind::constant;
      unnamed.cells = {evaluated(base)};
      unnamed.type = unnamed.cells[0].type;
      if (!unnamed.cells[0].is_known()) fail(base.at, "only a variable or a known value has an index");
      return read(indexed(whole(unnamed), expression), expression.at);
    }
    case K::durationof:
      return duration_of(expression);
    case K::measure:
      fail(expression.at, "a measurement is no value inside an expression",
           {"help: assign it to a bit first, as in `bit b = measure q;`"});
    case K::hardware:
      fail(expression.at, fmt::format("{} is a qubit; a value is expected here", expression.text));
    case K::defcal_call:
      fail(expression.at, "calls of calibrations are not supported: they program the layer below gates");
    case K::range:
    case K::set:
    case K::absent:
      break;
  }
  fail(expression.at, "a single value is expected here");
}

Value Reader::truth(const SyntaxExpression& expression) {
  const Value value = evaluated(expression);
  if (value.type.base == Base::bits && version_ != 20) {
    warn(expression.at, fmt::format("{} as a condition is read as \"not all 0\"", text_of(value.type)),
         {"help: the standard wants a bool, as in bool(c)"});
  }
  return at_place(expression.at, [&] {
    Value truth = converted(value, {Base::boolean, 0}, rules());
    // One bit is a condition as it stands.
    return truth;
  });
}

Value Reader::size_value(const SyntaxExpression& expression) {
  if (expression.arguments.empty() || expression.arguments.size() > 2) {
    fail(expression.at, "sizeof takes an array and, perhaps, the number of a dimension");
  }
  const SyntaxExpression& argument = expression.arguments[0];
  std::vector<std::uint32_t> shape;
  const bool before = read_variable_;
  if (argument.kind == SyntaxExpression::Kind::name) {
    const Symbol& symbol = found(argument.text, argument.at, "variable");
    if (symbol.kind == Symbol::Kind::qubits && !symbol.is_scalar) {
      shape = {static_cast<std::uint32_t>(symbol.wires.size())};
    } else if (symbol.type.base == Base::bits && !symbol.is_array()) {
      shape = {symbol.type.width};
    } else {
      shape = symbol.shape;
    }
  } else {
    shape = located(argument).shape;
  }
  if (shape.empty()) fail(argument.at, "sizeof takes an array");
  std::int64_t dimension = 0;
  if (expression.arguments.size() == 2) {
    const auto given = constant(expression.arguments[1], "a dimension").integer.small();
    dimension = given.value_or(-1);
  }
  if (dimension < 0 || dimension >= static_cast<std::int64_t>(shape.size())) {
    fail(expression.at,
         fmt::format("this array has {} dimension{}", shape.size(), shape.size() == 1 ? "" : "s"));
  }
  read_variable_ = before;
  return of_int(Integer(shape[static_cast<std::size_t>(dimension)]), {Base::natural, 0});
}

Value Reader::call_value(const SyntaxExpression& expression) {
  const Symbol* symbol = scopes_.find(expression.text);
  std::vector<const SyntaxExpression*> arguments;
  for (const SyntaxExpression& argument : expression.arguments) arguments.push_back(&argument);
  if (symbol != nullptr && symbol->kind == Symbol::Kind::subroutine) {
    read_variable_ = true;
    return call_subroutine(*symbol, arguments, expression.at);
  }
  if (symbol != nullptr && symbol->kind == Symbol::Kind::external) {
    read_variable_ = true;
    return call_extern(*symbol, arguments, expression.at);
  }
  if (symbol != nullptr && symbol->kind == Symbol::Kind::broken) throw Trouble{};
  if (expression.text == "sizeof" && version_ != 20) return size_value(expression);
  if (expression.text == "pow" && version_ == 32) {
    fail(expression.at, "`pow` is no function from OpenQASM 3.2 on", {"help: write a ** b"});
  }
  if (is_function(expression.text, version_ == 20)) {
    std::vector<Value> values;
    for (const SyntaxExpression& argument : expression.arguments) values.push_back(evaluated(argument));
    return call(expression.text, values, rules());
  }
  if (symbol != nullptr && symbol->kind == Symbol::Kind::gate) {
    fail(expression.at, fmt::format("`{}` is a gate: it gives no value", expression.text));
  }
  std::vector<std::string> notes;
  const std::string similar = scopes_.similar(expression.text, true);
  if (!similar.empty()) notes.push_back(fmt::format("help: did you mean `{}`?", similar));
  fail(expression.at, fmt::format("function `{}` is not declared", expression.text), std::move(notes));
}

Value Reader::timing_value(const SyntaxExpression& expression) {
  const double number = real_of(expression.text);
  double unit = 1;
  switch (expression.unit) {
    case syntax::Unit::us:
      unit = 1e3;
      break;
    case syntax::Unit::ms:
      unit = 1e6;
      break;
    case syntax::Unit::s:
      unit = 1e9;
      break;
    case syntax::Unit::dt:
      unit = options_.dt_ns;
      break;
    default:
      break;
  }
  const double length = number * unit;
  if (!std::isfinite(length)) fail(expression.at, "this duration is too large");
  return of_real(length, {Base::duration, 0});
}

// Angles.

namespace {

/// The pattern of an angle[n] times its grid, by casts that the standard's table has.
Value in_radians(const Value& angle) {
  Expression pattern = *angle.expression;
  for (const Base base : {Base::bits, Base::natural}) {
    Expression cast;
    cast.kind = Expression::Kind::cast;
    cast.text = text_of(Type{base, angle.type.width});
    cast.arguments = {std::move(pattern)};
    pattern = std::move(cast);
  }
  const double grid = 2 * pi / std::ldexp(1.0, static_cast<int>(angle.type.width));
  return of_expression(operation("*", {std::move(pattern), literal(text_of(grid))}), {Base::real, 0}, false);
}

}  // namespace

Angle Reader::derived_angle(const Value& value) {
  Expression expression = *value.expression;
  if (capture_ != nullptr) {
    gate_derived_->push_back(std::move(expression));
    const auto index = gate_parameters_ + static_cast<std::uint32_t>(gate_derived_->size()) - 1;
    return {0, forms_->of_input(index)};
  }
  // A derived input is told in declared inputs only.
  const std::function<void(Expression&)> expand = [&](Expression& node) {
    if (node.kind == Expression::Kind::input && circuit_.inputs[node.variable].is_derived) {
      node = Expression(circuit_.inputs[node.variable].expression);
      return;
    }
    for (Expression& argument : node.arguments) expand(argument);
  };
  expand(expression);
  const std::string text = printed(expression, circuit_);
  const auto [place, is_new] = derived_.try_emplace(text, static_cast<std::uint32_t>(circuit_.inputs.size()));
  if (is_new) {
    Input input;
    input.name = native_name("derived", {});
    input.type = "float";
    input.is_derived = true;
    input.expression = std::move(expression);
    circuit_.inputs.push_back(std::move(input));
  }
  return {0, forms_->of_input(place->second)};
}

Angle Reader::wrapped_angle(Angle angle) {
  if (angle.is_known()) {
    const double value = wrapped(angle.constant);
    return {value < -pi + 1e-9 ? pi : value, 0};
  }
  const Type type = {Base::real, 0};
  Value value = of_real(angle.constant, type);
  value.form = angle.form;
  // a - tau * ceiling((a - pi) / tau) lies in (-pi, pi].
  const Expression a = expression_of(value, rules());
  Expression ceiling;
  ceiling.kind = Expression::Kind::call;
  ceiling.text = "ceiling";
  ceiling.arguments = {operation("/", {operation("-", {a, literal("pi")}), literal("tau")})};
  Expression result = operation("-", {a, operation("*", {literal("tau"), std::move(ceiling)})});
  return derived_angle(of_expression(std::move(result), type, false));
}

Angle Reader::angle_of(const Value& value, syntax::Span at) {
  if (value.is_known()) return at_place(at, [&] { return Angle{radians_of(value), 0}; });
  const Base base = value.type.base;
  const bool is_angle = base == Base::real || base == Base::angle || base == Base::integer ||
                        base == Base::natural || base == Base::boolean || base == Base::bit;
  if (value.is_affine() && is_angle) return {value.real, value.form};
  if (!is_angle) fail(at, fmt::format("an angle is expected here, not {}", text_of(value.type)));
  if (!value.runs) {
    // Sums and multiples of an angle[n] would stay on its grid: the native program adds its radians.
    if (base == Base::angle && value.type.width > 0) return derived_angle(in_radians(value));
    if (value.expression->kind == Expression::Kind::input) {
      return {0, forms_->of_input(value.expression->variable)};
    }
    return derived_angle(value);
  }
  split_on(*value.expression, at);
}

/// An angle or count that depends on running bits: one arm for every value of the first of them.
void Reader::split_on(const Expression& expression, syntax::Span at) {
  const Expression* node = first_variable(expression);
  if (node == nullptr) fail(at, "an angle must be known while compiling, an input, or depend on a few bits");
  const bool is_index = node->kind == Expression::Kind::index;
  const std::uint32_t variable = is_index ? node->arguments[0].variable : node->variable;
  const Variable& native = circuit_.variables[variable];
  Split split;
  split.at = at;
  split.variable = variable;
  if (native.bits > 0) {
    std::uint32_t bit = is_index ? static_cast<std::uint32_t>(std::stoul(node->arguments[1].text)) : 0;
    while (fixed_bits_.contains(native.first_bit + bit) && bit + 1 < native.bits) ++bit;
    split.bit = native.first_bit + bit;
    split.count = 2;
    split.type = {Base::bit, 0};
    split.selector = *bit_value(variable, bit).expression;
  } else {
    split.type = type_of(native.type);
    const bool is_small = split.type.width > 0 && split.type.width <= most_split_bits;
    const bool is_truth = split.type.base == Base::boolean;
    if (native.type.starts_with("array") || (!is_small && !is_truth) || split.type.base == Base::real) {
      fail(at,
           fmt::format("an angle that depends on `{}`, a {} known only while running, cannot be compiled",
                       native.name, native.type),
           {fmt::format("help: give it a type of at most {} bits, such as uint[4], or branch on it",
                        most_split_bits),
            "note: in a rotation (p, rx, ry, rz, cp ...) whose angle is a sum over its bits it may have 64"});
    }
    split.count = is_truth ? 2 : 1u << split.type.width;
    split.selector = *node;
    if (is_index) split.selector = node->arguments[0];
  }
  if (fixed_variables_.contains(variable) || (split.bit != no_bit && fixed_bits_.contains(split.bit))) {
    fail(at, fmt::format("this depends on `{}` in a way that no branch can settle", native.name));
  }
  if (fixed_bits_.size() + fixed_variables_.size() >= most_split_bits) {
    fail(at, fmt::format("this depends on more than {} running bits; it would need too many branches",
                         most_split_bits));
  }
  throw split;
}

Angle Reader::angle_of(const SyntaxExpression& expression) {
  return angle_of(evaluated(expression), expression.at);
}

// Indices.

std::int64_t Reader::known_int(const SyntaxExpression& expression, const char* what) {
  const Value value = evaluated(expression);
  const Base base = value.type.base;
  if (base != Base::integer && base != Base::natural && base != Base::boolean && base != Base::bit) {
    fail(expression.at, fmt::format("{} is an integer, not {}", what, text_of(value.type)));
  }
  if (!value.is_known()) {
    if (value.runs) split_on(*value.expression, expression.at);
    fail(expression.at, fmt::format("{} must be known while compiling", what));
  }
  const auto small = value.integer.small();
  if (!small) fail(expression.at, fmt::format("{} of {} is out of range", what, value.integer.to_string()));
  return *small;
}

std::vector<std::uint32_t> Reader::range_indices(const SyntaxExpression& range, std::uint32_t size,
                                                 const char* what) {
  const auto item = [&](std::size_t i, std::int64_t otherwise) {
    const SyntaxExpression& part = range.arguments[i];
    return part.kind == SyntaxExpression::Kind::absent ? otherwise : known_int(part, "an index");
  };
  const std::int64_t step = item(1, 1);
  if (step == 0) fail(range.at, "the step of a range cannot be 0");
  const auto end = static_cast<std::int64_t>(size) - 1;
  const std::int64_t first = item(0, step > 0 ? 0 : end);
  const std::int64_t last = item(2, step > 0 ? end : 0);
  const auto limit = static_cast<std::int64_t>(size);
  std::vector<std::uint32_t> result;
  if (step > 0 ? first > last : first < last) return result;
  for (std::int64_t i = first; step > 0 ? i <= last : i >= last;) {
    if (i < -limit || i >= limit) {
      fail(range.at, fmt::format("index {} is out of range: the {} has {} element{}", i, what, size,
                                 size == 1 ? "" : "s"));
    }
    result.push_back(static_cast<std::uint32_t>(i < 0 ? i + limit : i));
    if (__builtin_add_overflow(i, step, &i)) break;
  }
  return result;
}

std::vector<std::uint32_t> Reader::indices(const SyntaxExpression& item, std::uint32_t size, bool& is_one,
                                           const char* what) {
  is_one = false;
  if (item.kind == SyntaxExpression::Kind::range) {
    auto result = range_indices(item, size, what);
    if (result.empty()) fail(item.at, "this range selects nothing");
    return result;
  }
  const auto one = [&](const SyntaxExpression& expression) {
    const Value value = evaluated(expression);
    if (!value.is_known() && (value.type.base == Base::integer || value.type.base == Base::natural)) {
      Split split;
      split.node = &expression;
      split.count = size;
      split.selector = expression_of(value, rules());
      split.type = value.type;
      split.at = expression.at;
      throw split;
    }
    const std::int64_t index = known_int(expression, "an index");
    const auto limit = static_cast<std::int64_t>(size);
    if (index < -limit || index >= limit) {
      fail(expression.at, fmt::format("index {} is out of range: the {} has {} element{}", index, what, size,
                                      size == 1 ? "" : "s"));
    }
    return static_cast<std::uint32_t>(index < 0 ? index + limit : index);
  };
  if (item.kind == SyntaxExpression::Kind::set) {
    std::vector<std::uint32_t> result;
    for (const SyntaxExpression& element : item.arguments) result.push_back(one(element));
    if (result.empty()) fail(item.at, "this set selects nothing");
    return result;
  }
  is_one = true;
  return {one(item)};
}

// Qubits.

Symbol& Reader::hardware_qubit(const SyntaxExpression& expression) {
  if (capture_ != nullptr) fail(expression.at, "a gate acts on its own qubits only, not on physical ones");
  const auto ion = Integer::parsed(std::string_view(expression.text).substr(1), 10).small();
  if (!ion || *ion >= most_qubits) {
    fail(expression.at, fmt::format("no machine has an ion {}: physical qubits are $0 to ${}",
                                    expression.text.substr(1), most_qubits - 1));
  }
  const std::string name = fmt::format("${}", *ion);  // $01 is $1
  Symbol* known = scopes_.find_anywhere(name);
  if (known != nullptr) return *known;
  Symbol symbol;
  symbol.kind = Symbol::Kind::qubits;
  symbol.name = name;
  symbol.at = expression.at;
  symbol.is_scalar = true;
  symbol.wires = {circuit_.wires};
  add_register(circuit_, name, 1, true);
  hardware_.push_back(std::make_unique<Symbol>(std::move(symbol)));
  return scopes_.add_everywhere(*hardware_.back());
}

Qubits Reader::qubits_of(const SyntaxExpression& expression) {
  using K = SyntaxExpression::Kind;
  if (expression.kind == K::name || expression.kind == K::hardware) {
    const Symbol& symbol = expression.kind == K::hardware ? hardware_qubit(expression)
                                                          : found(expression.text, expression.at, "qubit");
    if (symbol.kind != Symbol::Kind::qubits) {
      fail(expression.at, fmt::format("`{}` is not a qubit", expression.text));
    }
    return {symbol.wires, symbol.is_scalar};
  }
  if (expression.kind == K::index) {
    const SyntaxExpression& item = expression.arguments[1];
    if (expression.arguments.size() != 2) fail(expression.at, "qubits have one index");
    // The frequent case, a plain index of a named register, without copying the register.
    const SyntaxExpression& base_expression = expression.arguments[0];
    Qubits copied;
    const std::vector<std::uint32_t>* wires = &copied.wires;
    bool is_scalar = false;
    if (base_expression.kind == K::name) {
      const Symbol& symbol = found(base_expression.text, base_expression.at, "qubit");
      if (symbol.kind != Symbol::Kind::qubits) {
        fail(base_expression.at, fmt::format("`{}` is not a qubit register", base_expression.text));
      }
      wires = &symbol.wires;
      is_scalar = symbol.is_scalar;
    } else {
      copied = qubits_of(base_expression);
      is_scalar = copied.is_scalar;
    }
    if (is_scalar) {
      fail(expression.at,
           capture_ != nullptr ? "the qubits of a gate have no index" : "a single qubit has no index");
    }
    bool is_one = true;
    const auto chosen = indices(item, static_cast<std::uint32_t>(wires->size()), is_one, "register");
    Qubits result;
    result.is_scalar = is_one;
    for (const std::uint32_t index : chosen) result.wires.push_back((*wires)[index]);
    return result;
  }
  if (expression.kind == K::binary && expression.op == syntax::Operator::concatenate) {
    Qubits result = qubits_of(expression.arguments[0]);
    const Qubits right = qubits_of(expression.arguments[1]);
    result.wires.insert(result.wires.end(), right.wires.begin(), right.wires.end());
    result.is_scalar = false;
    return result;
  }
  fail(expression.at, "a qubit or a register of qubits is expected here");
}

}  // namespace isinglass
