// Evaluation of run-time classical code; see memory.h.
#include "verify/memory.h"

#include <bit>
#include <cmath>
#include <cstdlib>
#include <map>

namespace isinglass {

namespace {

using Type = Value::Type;

std::uint64_t mask(unsigned width) {
  return width >= 64 ? ~std::uint64_t(0) : (std::uint64_t(1) << width) - 1;
}

Value natural(std::uint64_t n, unsigned width = 64) {
  return {Type::natural, width, n & mask(width), 0};
}
Value integer(std::int64_t n, unsigned width = 64) {
  return {Type::integer, width, static_cast<std::uint64_t>(n) & mask(width), 0};
}
Value real(double x) {
  return {Type::real, 64, 0, x};
}
Value boolean(bool b) {
  return {Type::boolean, 1, b ? 1u : 0u, 0};
}

std::int64_t as_signed(const Value& v) {
  if (v.type != Type::integer || v.width >= 64) return static_cast<std::int64_t>(v.whole);
  const std::uint64_t sign = std::uint64_t(1) << (v.width - 1);
  return static_cast<std::int64_t>((v.whole ^ sign) - sign);
}

double turn_of(unsigned width) {
  return 2 * pi / std::ldexp(1.0, static_cast<int>(width));
}

/// A whole number that may be negative, whatever its type.
std::int64_t whole(const Value& v) {
  return v.type == Type::real ? static_cast<std::int64_t>(v.real) : as_signed(v);
}

struct TypeName {
  Type type;
  unsigned width;
  std::vector<std::uint32_t> shape;
};

TypeName parsed_type(const std::string& text) {
  const auto starts = [&](const char* word) { return text.rfind(word, 0) == 0; };
  if (starts("array[")) {
    int depth = 0;
    std::size_t cut = 6;
    for (; cut < text.size(); ++cut) {
      if (text[cut] == '[') ++depth;
      if (text[cut] == ']') --depth;
      if (depth == 0 && text[cut] == ',') break;
    }
    TypeName base = parsed_type(text.substr(6, cut - 6));
    for (const char* p = text.c_str() + std::min(cut, text.size()); *p;) {
      if (*p >= '0' && *p <= '9') {
        char* end = nullptr;
        base.shape.push_back(static_cast<std::uint32_t>(std::strtoul(p, &end, 10)));
        p = end;
      } else {
        ++p;
      }
    }
    return base;
  }
  const std::size_t open = text.find('[');
  const unsigned width = open == std::string::npos
                             ? 0
                             : static_cast<unsigned>(std::strtoul(text.c_str() + open + 1, nullptr, 10));
  if (width > 64) throw Unsupported("values of type " + text);
  if (starts("bool")) return {Type::boolean, 1, {}};
  if (starts("bit")) return {Type::bits, width ? width : 1, {}};
  if (starts("uint")) return {Type::natural, width ? width : 64, {}};
  if (starts("int")) return {Type::integer, width ? width : 64, {}};
  if (starts("float")) return {Type::real, 64, {}};
  // Without a width an angle is a real number that is never reduced, as the language room has it.
  if (starts("angle") && width == 0) return {Type::real, 64, {}};
  if (starts("angle")) return {Type::angle, width, {}};
  throw Unsupported("values of type " + text);
}

Value literal(std::string text) {
  if (text == "true" || text == "false") return boolean(text == "true");
  std::erase(text, '_');
  if (!text.empty() && text[0] == '"') {
    Value v{Type::bits, 0, 0, 0};
    for (const char c : text) {
      if (c != '0' && c != '1') continue;
      v.whole = v.whole << 1 | static_cast<std::uint64_t>(c - '0');
      ++v.width;
    }
    if (v.width > 64) throw Unsupported("bit strings of more than 64 bits");
    return v;
  }
  static const std::map<std::string, double> constants = {{"pi", pi},
                                                          {"π", pi},
                                                          {"tau", 2 * pi},
                                                          {"τ", 2 * pi},
                                                          {"euler", std::numbers::e},
                                                          {"ℇ", std::numbers::e}};
  if (const auto known = constants.find(text); known != constants.end()) return real(known->second);
  if (text.size() > 2 && text[0] == '0' && std::isalpha(static_cast<unsigned char>(text[1]))) {
    const int base = text[1] == 'x' || text[1] == 'X' ? 16 : text[1] == 'o' ? 8 : 2;
    return integer(static_cast<std::int64_t>(std::strtoull(text.c_str() + 2, nullptr, base)));
  }
  char* end = nullptr;
  if (text.find_first_of(".eE") == std::string::npos) {
    const auto n = std::strtoull(text.c_str(), &end, 10);
    if (end != text.c_str() && *end == 0) return integer(static_cast<std::int64_t>(n));
  }
  const double x = std::strtod(text.c_str(), &end);
  if (end == text.c_str() || *end != 0) throw Unsupported("the literal " + text);
  return real(x);
}

bool is_pattern(const Value& v) {
  return v.type == Type::bits || v.type == Type::natural || v.type == Type::angle;
}

/// The type both operands of an arithmetic operator are brought to.
Value::Type joint(const Value& a, const Value& b) {
  if (a.type == Type::real || b.type == Type::real) return Type::real;
  if (a.type == Type::natural || b.type == Type::natural) return Type::natural;
  return Type::integer;
}

Value arithmetic(const std::string& op, const Value& a, const Value& b) {
  if (a.type == Type::angle || b.type == Type::angle) {
    const unsigned width = a.type == Type::angle ? a.width : b.width;
    const auto made = [&](std::uint64_t k) { return Value{Type::angle, width, k & mask(width), 0}; };
    const std::uint64_t x = a.type == Type::real ? cast(a, Type::angle, width).whole : a.whole;
    const std::uint64_t y = b.type == Type::real ? cast(b, Type::angle, width).whole : b.whole;
    if (op == "+") return made(x + y);
    if (op == "-") return made(x - y);
    if (op == "*" && a.type != b.type) return made(x * y);
    if (op == "/" && y != 0) return a.type == b.type ? natural(x / y, width) : made(x / y);
    throw Unsupported("angle operands of " + op);
  }
  const Type type = joint(a, b);
  if (type == Type::real) {
    const double x = number(a);
    const double y = number(b);
    if (op == "+") return real(x + y);
    if (op == "-") return real(x - y);
    if (op == "*") return real(x * y);
    if (op == "/") return real(x / y);
    if (op == "%") return real(std::fmod(x, y));
    return real(std::pow(x, y));
  }
  const unsigned width =
      std::max(a.type == Type::boolean ? 1 : a.width, b.type == Type::boolean ? 1 : b.width);
  const auto made = [&](std::int64_t n) {
    return type == Type::natural ? natural(static_cast<std::uint64_t>(n), width) : integer(n, width);
  };
  const std::int64_t x = as_signed(a);
  const std::int64_t y = as_signed(b);
  if (op == "+")
    return made(static_cast<std::int64_t>(static_cast<std::uint64_t>(x) + static_cast<std::uint64_t>(y)));
  if (op == "-")
    return made(static_cast<std::int64_t>(static_cast<std::uint64_t>(x) - static_cast<std::uint64_t>(y)));
  if (op == "*")
    return made(static_cast<std::int64_t>(static_cast<std::uint64_t>(x) * static_cast<std::uint64_t>(y)));
  if (op == "**") {
    if (y < 0) throw Unsupported("a negative power of an integer");
    std::uint64_t product = 1;
    for (std::int64_t k = 0; k < y && k < 64 * 64; ++k) product *= static_cast<std::uint64_t>(x);
    return made(static_cast<std::int64_t>(product));
  }
  if (y == 0) throw Unsupported("a division by zero");
  if (type == Type::natural) {
    const auto ux = static_cast<std::uint64_t>(x);
    const auto uy = static_cast<std::uint64_t>(y);
    return natural(op == "/" ? ux / uy : ux % uy, width);
  }
  if (y == -1) return made(op == "/" ? static_cast<std::int64_t>(-static_cast<std::uint64_t>(x)) : 0);
  return made(op == "/" ? x / y : x % y);
}

bool compared(const std::string& op, const Value& a, const Value& b) {
  const auto by = [&](auto x, auto y) {
    if (op == "==") return x == y;
    if (op == "!=") return x != y;
    if (op == "<") return x < y;
    if (op == "<=") return x <= y;
    if (op == ">") return x > y;
    return x >= y;
  };
  if (a.type == Type::angle && b.type == Type::angle && a.width == b.width) return by(a.whole, b.whole);
  if (a.type == Type::real || b.type == Type::real) return by(number(a), number(b));
  const bool signs = a.type == Type::integer || b.type == Type::integer;
  return signs ? by(as_signed(a), as_signed(b)) : by(a.whole, b.whole);
}

Value bitwise(const std::string& op, const Value& a, const Value& b) {
  // Booleans and bits mix; else the left operand's type decides, wider of the two.
  Value result = is_pattern(a) || !is_pattern(b) ? a : b;
  result.width = std::max(a.width, b.width);
  if (op == "&") result.whole = a.whole & b.whole;
  if (op == "|") result.whole = a.whole | b.whole;
  if (op == "^") result.whole = a.whole ^ b.whole;
  return result;
}

Value shifted(const std::string& op, const Value& a, const Value& by) {
  Value result = a;
  const std::uint64_t n = by.whole;
  result.whole = n >= 64 ? 0 : op == "<<" ? a.whole << n & mask(a.width) : a.whole >> n;
  return result;
}

Value rotated(const Value& a, std::int64_t n) {
  const auto width = static_cast<std::int64_t>(a.width);
  n = ((n % width) + width) % width;
  Value result = a;
  if (n != 0) result.whole = (a.whole << n | a.whole >> (width - n)) & mask(a.width);
  return result;
}

Value called(const std::string& name, const std::vector<Value>& args) {
  if (args.size() == 1) {
    const double x = number(args[0]);
    if (name == "sin") return real(std::sin(x));
    if (name == "cos") return real(std::cos(x));
    if (name == "tan") return real(std::tan(x));
    if (name == "arcsin") return real(std::asin(x));
    if (name == "arccos") return real(std::acos(x));
    if (name == "arctan") return real(std::atan(x));
    if (name == "exp") return real(std::exp(x));
    if (name == "log" || name == "ln") return real(std::log(x));
    if (name == "sqrt") return real(std::sqrt(x));
    if (name == "floor") return real(std::floor(x));
    if (name == "ceiling") return real(std::ceil(x));
    if (name == "popcount") return natural(static_cast<std::uint64_t>(std::popcount(args[0].whole)));
  }
  if (args.size() == 2) {
    if (name == "mod") return arithmetic("%", args[0], args[1]);
    if (name == "pow") return arithmetic("**", args[0], args[1]);
    if (name == "rotl") return rotated(args[0], whole(args[1]));
    if (name == "rotr") return rotated(args[0], -whole(args[1]));
  }
  throw Unsupported("a call of " + name);
}

Value bits_at(const Value& v, const std::vector<unsigned>& positions) {
  Value result{Type::bits, static_cast<unsigned>(positions.size()), 0, 0};
  for (std::size_t k = 0; k < positions.size(); ++k) {
    if (positions[k] >= v.width) throw Unsupported("an index out of range");
    result.whole |= (v.whole >> positions[k] & 1) << k;
  }
  return result;
}

}  // namespace

double number(const Value& v) {
  if (v.type == Type::real) return v.real;
  if (v.type == Type::angle) return static_cast<double>(v.whole) * turn_of(v.width);
  if (v.type == Type::integer) return static_cast<double>(as_signed(v));
  return static_cast<double>(v.whole);
}

bool truth(const Value& v) {
  return v.type == Type::real ? v.real != 0 : v.whole != 0;
}

Value cast(const Value& v, Type type, unsigned width) {
  switch (type) {
    case Type::boolean:
      return boolean(truth(v));
    case Type::real:
      return real(number(v));
    case Type::angle: {
      if (v.type == Type::real || v.type == Type::integer) {
        const double turns = number(v) / (2 * pi);
        const double fraction = turns - std::floor(turns);
        const double steps = std::nearbyint(std::ldexp(fraction, static_cast<int>(width)));
        const std::uint64_t k = steps >= 18446744073709551615.0 ? 0 : static_cast<std::uint64_t>(steps);
        return {Type::angle, width, k & mask(width), 0};
      }
      if (v.type == Type::angle && v.width != width) {
        const std::uint64_t k = v.width < width ? v.whole << (width - v.width) : v.whole >> (v.width - width);
        return {Type::angle, width, k & mask(width), 0};
      }
      return {Type::angle, width, v.whole & mask(width), 0};
    }
    case Type::bits:
      return {Type::bits, width, v.whole & mask(width), 0};
    case Type::integer:
      return integer(whole(v), width);
    case Type::natural:
      return natural(static_cast<std::uint64_t>(whole(v)), width);
  }
  return v;
}

Memory::Memory(const Circuit& circuit, std::span<const double> inputs)
    : circuit_(&circuit), inputs_(inputs), bits_(circuit.bits), slots_(circuit.variables.size()) {
  for (std::size_t k = 0; k < slots_.size(); ++k) {
    const Variable& variable = circuit.variables[k];
    if (variable.bits > 0) continue;
    const TypeName type = parsed_type(variable.type);
    std::size_t elements = 1;
    for (const auto size : type.shape) elements *= size;
    slots_[k] = {type.type, type.width, type.shape,
                 std::vector<Value>(elements, Value{type.type, type.width, 0, 0})};
  }
}

Value Memory::get(std::uint32_t index) const {
  const Variable& variable = circuit_->variables[index];
  if (variable.bits == 0) {
    if (!slots_[index].shape.empty()) throw Unsupported("a whole array as a value");
    return slots_[index].values[0];
  }
  if (variable.bits > 64) throw Unsupported("the value of a register of more than 64 bits");
  Value v{Type::bits, variable.bits, 0, 0};
  for (std::uint32_t k = 0; k < variable.bits; ++k) {
    if (bits_[variable.first_bit + k]) v.whole |= std::uint64_t(1) << k;
  }
  return v;
}

std::size_t Memory::element(const Slot& slot, std::span<const Expression> indices) const {
  if (indices.size() < slot.shape.size()) throw Unsupported("a part of an array as a value");
  std::size_t at = 0;
  for (std::size_t d = 0; d < slot.shape.size(); ++d) {
    std::int64_t k = whole(evaluate(indices[d]));
    if (k < 0) k += slot.shape[d];
    if (k < 0 || k >= static_cast<std::int64_t>(slot.shape[d])) throw Unsupported("an index out of range");
    at = at * slot.shape[d] + static_cast<std::size_t>(k);
  }
  return at;
}

std::vector<unsigned> Memory::positions(const Expression& index, unsigned width) const {
  std::vector<unsigned> result;
  const auto add = [&](std::int64_t k) {
    if (k < 0) k += width;
    if (k < 0 || k >= static_cast<std::int64_t>(width)) throw Unsupported("an index out of range");
    result.push_back(static_cast<unsigned>(k));
  };
  if (index.kind == Expression::Kind::range || index.kind == Expression::Kind::set) {
    for (const Value& v : round_values(index)) add(whole(v));
  } else {
    add(whole(evaluate(index)));
  }
  return result;
}

Value Memory::evaluate(const Expression& e) const {
  switch (e.kind) {
    case Expression::Kind::literal:
      return literal(e.text);
    case Expression::Kind::variable:
      return get(e.variable);
    case Expression::Kind::input: {
      const TypeName type = parsed_type(circuit_->inputs[e.variable].type);
      return cast(real(inputs_[e.variable]), type.type, type.width);
    }
    case Expression::Kind::index: {
      const Expression& base = e.arguments[0];
      std::span<const Expression> indices(e.arguments.data() + 1, e.arguments.size() - 1);
      Value v;
      if (base.kind == Expression::Kind::variable && !slots_[base.variable].shape.empty()) {
        const Slot& slot = slots_[base.variable];
        v = slot.values[element(slot, indices)];
        indices = indices.subspan(slot.shape.size());
      } else if (base.kind == Expression::Kind::variable && circuit_->variables[base.variable].bits > 64) {
        const Variable& variable = circuit_->variables[base.variable];
        const auto at = positions(indices[0], variable.bits);
        if (at.size() > 64) throw Unsupported("a slice of more than 64 bits");
        v = {Type::bits, static_cast<unsigned>(at.size()), 0, 0};
        for (std::size_t k = 0; k < at.size(); ++k) {
          if (bits_[variable.first_bit + at[k]]) v.whole |= std::uint64_t(1) << k;
        }
        indices = indices.subspan(1);
      } else {
        v = evaluate(base);
      }
      for (const Expression& index : indices) v = bits_at(v, positions(index, v.width));
      return v;
    }
    case Expression::Kind::unary: {
      const Value v = evaluate(e.arguments[0]);
      if (e.text == "!") return boolean(!truth(v));
      if (e.text == "~") return {v.type, v.width, ~v.whole & mask(v.width), 0};
      if (e.text != "-") throw Unsupported("the operator " + e.text);
      if (v.type == Type::real) return real(-v.real);
      if (v.type == Type::boolean || v.type == Type::bits) return integer(-as_signed(v));
      return {v.type, v.width, (0 - v.whole) & mask(v.width), 0};
    }
    case Expression::Kind::binary: {
      const std::string& op = e.text;
      if (op == "&&") return boolean(truth(evaluate(e.arguments[0])) && truth(evaluate(e.arguments[1])));
      if (op == "||") return boolean(truth(evaluate(e.arguments[0])) || truth(evaluate(e.arguments[1])));
      const Value a = evaluate(e.arguments[0]);
      const Value b = evaluate(e.arguments[1]);
      if (op == "==" || op == "!=" || op == "<" || op == "<=" || op == ">" || op == ">=") {
        return boolean(compared(op, a, b));
      }
      if (op == "&" || op == "|" || op == "^") return bitwise(op, a, b);
      if (op == "<<" || op == ">>") return shifted(op, a, b);
      if (op == "++") {
        return {Type::bits, a.width + b.width, a.whole | (a.width < 64 ? b.whole << a.width : 0), 0};
      }
      return arithmetic(op, a, b);
    }
    case Expression::Kind::call: {
      std::vector<Value> args;
      for (const Expression& argument : e.arguments) args.push_back(evaluate(argument));
      return called(e.text, args);
    }
    case Expression::Kind::cast: {
      const TypeName type = parsed_type(e.text);
      return cast(evaluate(e.arguments[0]), type.type, type.width);
    }
    case Expression::Kind::range:
    case Expression::Kind::set:
      throw Unsupported("a range as a value");
  }
  throw Unsupported("an expression");
}

std::vector<Value> Memory::round_values(const Expression& e) const {
  std::vector<Value> values;
  if (e.kind == Expression::Kind::set) {
    for (const Expression& element : e.arguments) values.push_back(evaluate(element));
    return values;
  }
  if (e.kind == Expression::Kind::range) {
    const std::int64_t first = whole(evaluate(e.arguments[0]));
    const std::int64_t step = whole(evaluate(e.arguments[1]));
    const std::int64_t last = whole(evaluate(e.arguments[2]));
    if (step == 0) throw Unsupported("a range of step 0");
    for (std::int64_t k = first; step > 0 ? k <= last : k >= last; k += step) {
      if (values.size() > 1'000'000) throw Unsupported("a range of more than 10^6 values");
      values.push_back(integer(k));
    }
    return values;
  }
  if (e.kind == Expression::Kind::variable && !slots_[e.variable].shape.empty()) {
    return slots_[e.variable].values;
  }
  const Value v = evaluate(e);
  for (unsigned k = 0; k < v.width; ++k) values.push_back({Type::bits, 1, v.whole >> k & 1, 0});
  return values;
}

void Memory::set_variable(std::uint32_t index, const Value& value) {
  const Variable& variable = circuit_->variables[index];
  if (variable.bits == 0) {
    Slot& slot = slots_[index];
    if (!slot.shape.empty()) throw Unsupported("an assignment to a whole array");
    slot.values[0] = cast(value, slot.type, slot.width);
    return;
  }
  if (variable.bits > 64) throw Unsupported("an assignment to a register of more than 64 bits");
  for (std::uint32_t k = 0; k < variable.bits; ++k) bits_[variable.first_bit + k] = value.whole >> k & 1;
}

void Memory::assign(const Expression& target, const Value& value) {
  if (target.kind == Expression::Kind::variable) return set_variable(target.variable, value);
  if (target.kind != Expression::Kind::index || target.arguments[0].kind != Expression::Kind::variable) {
    throw Unsupported("an assignment to an expression");
  }
  const std::uint32_t index = target.arguments[0].variable;
  const Variable& variable = circuit_->variables[index];
  std::span<const Expression> indices(target.arguments.data() + 1, target.arguments.size() - 1);
  if (variable.bits > 0) {
    const auto at = positions(indices[0], variable.bits);
    for (std::size_t k = 0; k < at.size(); ++k) bits_[variable.first_bit + at[k]] = value.whole >> k & 1;
    return;
  }
  Slot& slot = slots_[index];
  Value& place = slot.values[slot.shape.empty() ? 0 : element(slot, indices)];
  indices = indices.subspan(slot.shape.size());
  if (indices.empty()) {
    place = cast(value, slot.type, slot.width);
    return;
  }
  const auto at = positions(indices[0], slot.width);
  for (std::size_t k = 0; k < at.size(); ++k) {
    const std::uint64_t bit = std::uint64_t(1) << at[k];
    place.whole = value.whole >> k & 1 ? place.whole | bit : place.whole & ~bit;
  }
}

void Memory::run(const ClassicalStatement& statement) {
  switch (statement.kind) {
    case ClassicalStatement::Kind::raw:
      return;
    case ClassicalStatement::Kind::call:
      evaluate(statement.value);
      return;
    case ClassicalStatement::Kind::assign: {
      const std::string& op = statement.operation;
      if (op == "=") return assign(statement.target, evaluate(statement.value));
      Expression both;
      both.kind = Expression::Kind::binary;
      both.text = op.substr(0, op.size() - 1);
      both.arguments = {statement.target, statement.value};
      return assign(statement.target, evaluate(both));
    }
    default:
      throw std::logic_error("statements that steer the flow are not run by the memory");
  }
}

std::string Memory::key(std::span<const std::uint32_t> variables) const {
  std::string text;
  for (const std::uint32_t index : variables) {
    const Variable& variable = circuit_->variables[index];
    for (std::uint32_t k = 0; k < variable.bits; ++k) text += bits_[variable.first_bit + k] ? '1' : '0';
    for (const Value& v : slots_[index].values) {
      text += ' ';
      text += v.type == Type::real ? std::to_string(v.real) : std::to_string(v.whole);
    }
    text += ';';
  }
  return text;
}

std::vector<double> with_derived(const Circuit& circuit, std::vector<double> values) {
  values.resize(circuit.inputs.size());
  Circuit nothing;  // derived inputs name other inputs and no variables
  nothing.inputs = circuit.inputs;
  for (std::size_t k = 0; k < values.size(); ++k) {
    if (circuit.inputs[k].is_derived) {
      values[k] = number(Memory(nothing, values).evaluate(circuit.inputs[k].expression));
    }
  }
  return values;
}

}  // namespace isinglass
