// A walk over an expression with the language's own operators; see evaluate.h.
#include "language/evaluate.h"

#include <charconv>
#include <numbers>

namespace isinglass {

namespace {

Value literal_value(const std::string& text) {
  if (text == "true" || text == "false") return of_bool(text == "true");
  if (text == "pi") return of_real(pi);
  if (text == "tau") return of_real(2 * pi);
  if (text.starts_with('"')) {
    const std::string digits = text.substr(1, text.size() - 2);
    return of_bits(Integer::parsed(digits, 2), static_cast<std::uint32_t>(digits.size()));
  }
  if (text.ends_with(" im")) {
    Value value = of_real(0, {Base::complex, 0});
    std::from_chars(text.data(), text.data() + text.size(), value.imaginary);
    return value;
  }
  if (text.find_first_of(".en") != std::string::npos) {
    double value = 0;
    std::from_chars(text.data(), text.data() + text.size(), value);
    return of_real(value);
  }
  return of_int(Integer::parsed(text, 10));
}

std::size_t index_of(const Value& value, std::size_t size) {
  const auto index = value.integer.small();
  const auto limit = static_cast<std::int64_t>(size);
  if (!value.is_known() || !index || *index < -limit || *index >= limit)
    throw Fault{"an index is out of range", {}};
  return static_cast<std::size_t>(*index < 0 ? *index + limit : *index);
}

}  // namespace

Value evaluate(const Expression& expression, const std::function<Value(const Expression&)>& leaf,
               const Rules& rules) {
  using K = Expression::Kind;
  const auto argument = [&](std::size_t i) { return evaluate(expression.arguments[i], leaf, rules); };
  switch (expression.kind) {
    case K::literal:
      return literal_value(expression.text);
    case K::variable:
    case K::input:
      return leaf(expression);
    case K::unary:
      return unary(expression.text, argument(0), rules);
    case K::binary:
      return binary(expression.text, argument(0), argument(1), rules);
    case K::call: {
      std::vector<Value> values;
      for (std::size_t i = 0; i < expression.arguments.size(); ++i) values.push_back(argument(i));
      return call(expression.text, values, rules);
    }
    case K::cast:
      return cast(argument(0), type_of(expression.text), rules);
    case K::index: {
      // Cells of arrays are leaves of their own; else it is a bit of a number.
      Value cell = leaf(expression);
      if (cell.type.base != Base::none) return cell;
      const Value value = argument(0);
      if (expression.arguments.size() != 2 || value.type.width == 0 || !value.is_known()) {
        throw Fault{"this index cannot be evaluated", {}};
      }
      const std::size_t bit = index_of(argument(1), value.type.width);
      Value result = of_bool(value.integer.modulo(value.type.width).bit(bit));
      result.type = {Base::bit, 0};
      return result;
    }
    case K::range:
    case K::set:
      break;
  }
  throw Fault{"a single value is expected here", {}};
}

}  // namespace isinglass
