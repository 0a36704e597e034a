// The arithmetic of the language; see value.h. Where the standard leaves a choice, README.md says which one
// was made.
#include "language/value.h"

#include <fmt/format.h>

#include <algorithm>
#include <array>
#include <cmath>
#include <complex>
#include <limits>

namespace isinglass {

namespace {

using Real = double;
using Complex = std::complex<double>;

constexpr std::size_t most_bits = 65'536;  // of a whole number

bool is_whole(Base base) {
  return base == Base::bit || base == Base::boolean || base == Base::integer || base == Base::natural;
}
bool is_number(Base base) {
  return is_whole(base) || base == Base::real || base == Base::complex;
}
bool is_time(Base base) {
  return base == Base::duration || base == Base::stretch;
}
bool is_free_angle(Type type) {
  return type.base == Base::angle && type.width == 0;
}
bool is_patterned(Type type) {
  return type.base == Base::bit || type.base == Base::bits || type.base == Base::natural ||
         (type.base == Base::angle && type.width > 0);
}

[[noreturn]] void refuse(std::string text, std::string help = {}) {
  throw Fault{std::move(text), std::move(help)};
}

[[noreturn]] void refuse_operands(std::string_view op, Type a, Type b) {
  refuse(fmt::format("`{}` does not take {} and {}", op, text_of(a), text_of(b)));
}

Type wider(Type a, Type b) {
  if (a.width == 0 || b.width == 0) return {a.base, 0};
  return {a.base, std::max(a.width, b.width)};
}

std::uint32_t machine(std::uint32_t width) {
  return width == 0 ? 64 : width;
}

/// The type in which two whole numbers meet: C99's rules without promotion to a machine int.
Type whole_type(Type a, Type b) {
  const auto number = [](Type t) {
    return t.base == Base::bit || t.base == Base::boolean ? Type{Base::integer, 1} : t;
  };
  const bool small_a = a.base == Base::bit || a.base == Base::boolean;
  const bool small_b = b.base == Base::bit || b.base == Base::boolean;
  if (small_a && small_b) return {Base::integer, 0};
  if (small_a) return number(b);
  if (small_b) return a;
  if (a.base == b.base) {
    if (machine(a.width) == machine(b.width)) return {a.base, std::max(a.width, b.width)};
    return machine(a.width) > machine(b.width) ? a : b;
  }
  const Type natural = a.base == Base::natural ? a : b;
  const Type integer = a.base == Base::natural ? b : a;
  return machine(natural.width) >= machine(integer.width) ? natural : integer;
}

Type number_type(Type a, Type b) {
  const auto part = [](Type t) { return t.base == Base::real || t.base == Base::complex; };
  if (!part(a) && !part(b)) return whole_type(a, b);
  const Base base = a.base == Base::complex || b.base == Base::complex ? Base::complex : Base::real;
  if (part(a) && part(b)) return wider({base, a.width}, {base, b.width});
  return {base, part(a) ? a.width : b.width};
}

Integer limited(Integer value) {
  if (!value.small() && value.length() > most_bits) refuse("the number grows beyond 65,536 bits");
  return value;
}

/// A whole number brought into the range of its type.
Integer fitted(const Integer& value, Type type) {
  if (type.base == Base::integer) return type.width == 0 ? limited(value) : value.wrapped(type.width);
  if (type.base == Base::natural) {
    if (type.width == 0) return value.is_negative() ? value.modulo(64) : limited(value);
    return value.modulo(type.width);
  }
  return value;
}

double rounded_to(double value, std::uint32_t width) {
  return width != 0 && width <= 32 ? static_cast<double>(static_cast<float>(value)) : value;
}

Value known(Type type) {
  Value value;
  value.type = type;
  return value;
}

Value of_whole(const Integer& integer, Type type) {
  Value value = known(type);
  value.integer = fitted(integer, type);
  return value;
}

Value of_complex(Complex number, std::uint32_t width) {
  Value value = known({Base::complex, width});
  value.real = rounded_to(number.real(), width);
  value.imaginary = rounded_to(number.imag(), width);
  return value;
}

double turns(double radians) {
  const double turn = radians / (2 * pi);
  return turn - std::floor(turn);
}

/// The pattern of angle[width] nearest to the radians, ties to even.
Integer pattern_of(double radians, std::uint32_t width) {
  if (!std::isfinite(radians)) refuse("an angle must be finite");
  const double scaled = std::ldexp(turns(radians), static_cast<int>(width));
  const double nearest = width <= 52 ? std::nearbyint(scaled) : scaled;
  return Integer::truncated(nearest)->modulo(width);
}

double radians_of_pattern(const Integer& pattern, std::uint32_t width) {
  return std::ldexp(pattern.to_double(), -static_cast<int>(width)) * 2 * pi;
}

/// The real number a known value stands for.
double real_of(const Value& value) {
  switch (value.type.base) {
    case Base::real:
    case Base::duration:
    case Base::stretch:
      return value.real;
    case Base::angle:
      return value.type.width == 0 ? value.real : radians_of_pattern(value.integer, value.type.width);
    default:
      return value.integer.to_double();
  }
}

Complex complex_of(const Value& value) {
  return value.type.base == Base::complex ? Complex(value.real, value.imaginary) : Complex(real_of(value), 0);
}

/// Principal power of complex numbers, exact for small whole exponents.
Complex complex_power(Complex base, Complex exponent) {
  if (exponent.imag() == 0 && exponent.real() == std::trunc(exponent.real()) &&
      std::abs(exponent.real()) <= 64) {
    Complex result = 1;
    for (int i = 0; i < static_cast<int>(std::abs(exponent.real())); ++i) result *= base;
    return exponent.real() < 0 ? Complex(1) / result : result;
  }
  return std::pow(base, exponent);
}

Integer integer_power(const Integer& base, const Integer& exponent, Type type) {
  if (exponent.is_negative()) {
    refuse("a whole number cannot be raised to a negative power",
           "write one of the two as a float, as in 2.0**-1");
  }
  const bool trivial = base.length() <= 1;
  const auto small = exponent.small();
  if (type.width == 0) {
    if (!trivial &&
        (!small || static_cast<double>(*small) * static_cast<double>(base.length() - 1) > most_bits)) {
      refuse("the number grows beyond 65,536 bits");
    }
    if (trivial)
      return base.is_negative() && !exponent.bit(0) ? Integer(1) : (exponent.is_zero() ? Integer(1) : base);
    return power(base, static_cast<std::uint64_t>(*small));
  }
  // Sized: by repeated squaring, reduced as it goes.
  Integer result(1);
  Integer factor = fitted(base, type);
  const std::size_t bits = exponent.length();
  for (std::size_t i = 0; i < bits; ++i) {
    if (exponent.bit(i)) result = fitted(result * factor, type);
    factor = fitted(factor * factor, type);
  }
  return result;
}

Value whole_arithmetic(std::string_view op, const Value& a, const Value& b, Type type) {
  const Integer x = type.base == Base::natural ? fitted(a.integer, type) : a.integer;
  const Integer y = type.base == Base::natural && op != "**" ? fitted(b.integer, type) : b.integer;
  if (op == "+") return of_whole(x + y, type);
  if (op == "-") return of_whole(x - y, type);
  if (op == "*") return of_whole(x * y, type);
  if (op == "**") return of_whole(integer_power(x, y, type), type);
  if (y.is_zero()) refuse(op == "/" ? "division by zero" : "remainder of a division by zero");
  return of_whole(op == "/" ? x / y : x % y, type);
}

Value real_arithmetic(std::string_view op, double x, double y, Type type) {
  double result = 0;
  if (op == "+") {
    result = x + y;
  } else if (op == "-") {
    result = x - y;
  } else if (op == "*") {
    result = x * y;
  } else if (op == "/") {
    if (y == 0) refuse("division by zero");
    result = x / y;
  } else if (op == "%") {
    if (y == 0) refuse("remainder of a division by zero");
    result = std::fmod(x, y);
  } else {
    result = std::pow(x, y);
    if (std::isnan(result) && !std::isnan(x) && !std::isnan(y)) {
      refuse("a power with a negative base and a fractional exponent is not real",
             "make the base complex, as in (-1.0 + 0 im)**0.5");
    }
  }
  return of_real(rounded_to(result, type.width), type);
}

Value complex_arithmetic(std::string_view op, Complex x, Complex y, std::uint32_t width) {
  if (op == "+") return of_complex(x + y, width);
  if (op == "-") return of_complex(x - y, width);
  if (op == "*") return of_complex(x * y, width);
  if (op == "**") return of_complex(complex_power(x, y), width);
  if (y == Complex(0)) refuse("division by zero");
  return of_complex(x / y, width);
}

bool ordered(std::string_view op, int order) {
  if (op == "==") return order == 0;
  if (op == "!=") return order != 0;
  if (op == "<") return order < 0;
  if (op == "<=") return order <= 0;
  if (op == ">") return order > 0;
  return order >= 0;
}

template <class T>
int order_of(const T& a, const T& b) {
  return a < b ? -1 : (b < a ? 1 : 0);
}

bool is_comparison(std::string_view op) {
  return op == "==" || op == "!=" || op == "<" || op == "<=" || op == ">" || op == ">=";
}
bool is_bitwise(std::string_view op) {
  return op == "&" || op == "|" || op == "^";
}
bool is_shift(std::string_view op) {
  return op == "<<" || op == ">>";
}

/// The operator applied to what cannot be known yet.
Value postponed(std::string_view op, const Value& a, const Value& b, Type type, const Rules& rules) {
  return of_expression(operation(std::string(op), {expression_of(a, rules), expression_of(b, rules)}), type,
                       a.runs || b.runs);
}

Angle affine_of(const Value& value) {
  return {value.form != 0 ? value.real : real_of(value), value.form};
}

Value of_affine(Angle angle, Type type) {
  Value value = of_real(angle.constant, type);
  value.form = angle.form;
  return value;
}

/// Sums and multiples of affine values stay affine; nothing else does.
std::optional<Value> affine(std::string_view op, const Value& a, const Value& b, Type type,
                            const Rules& rules) {
  Forms* const forms = type.base == Base::duration ? rules.lengths : rules.forms;
  if (forms == nullptr || a.expression || b.expression) return std::nullopt;
  if (type.base != Base::real && type.base != Base::duration && !is_free_angle(type)) return std::nullopt;
  if (op == "+") return of_affine(forms->sum(affine_of(a), affine_of(b)), type);
  if (op == "-") return of_affine(forms->difference(affine_of(a), affine_of(b)), type);
  if (op == "*" && b.form == 0) return of_affine(forms->scaled(affine_of(a), real_of(b)), type);
  if (op == "*" && a.form == 0) return of_affine(forms->scaled(affine_of(b), real_of(a)), type);
  if (op == "/" && b.form == 0) {
    const double divisor = real_of(b);
    if (divisor == 0) refuse("division by zero");
    const Angle whole = affine_of(a);
    // The constant is divided and not multiplied by the reciprocal, as it is when nothing is symbolic.
    return of_affine({whole.constant / divisor, forms->scaled(whole.form, 1 / divisor)}, type);
  }
  return std::nullopt;
}

Value angle_binary(std::string_view op, const Value& left, const Value& right, const Rules& rules) {
  const bool angle_left = left.type.base == Base::angle;
  const bool angle_right = right.type.base == Base::angle;
  const auto fits = [](const Value& v) {
    return v.type.base == Base::angle || v.type.base == Base::real || is_whole(v.type.base);
  };
  if (!fits(left) || !fits(right)) refuse_operands(op, left.type, right.type);
  if (op == "**" || op == "%") {
    if ((angle_left && left.type.width > 0) || (angle_right && right.type.width > 0) || op == "%") {
      refuse_operands(op, left.type, right.type);
    }
    const Type type = {Base::real, 0};
    return binary(op, angle_left ? converted(left, type, rules) : left,
                  angle_right ? converted(right, type, rules) : right, rules);
  }
  const bool sized = (angle_left && left.type.width > 0) || (angle_right && right.type.width > 0);
  const bool loose = (angle_left && left.type.width == 0) || (angle_right && right.type.width == 0);
  const bool additive = op == "+" || op == "-" || is_comparison(op);
  Type type = {Base::angle, 0};
  if (sized && !loose) {
    type.width = std::max(angle_left ? left.type.width : 0, angle_right ? right.type.width : 0);
  }
  if (additive) {
    const Value a = converted(left, type, rules);
    const Value b = converted(right, type, rules);
    if (!a.is_known() || !b.is_known()) {
      if (!is_comparison(op)) {
        if (auto value = affine(op, a, b, type, rules)) return *value;
        return postponed(op, a, b, type, rules);
      }
      return postponed(op, a, b, {Base::boolean, 0}, rules);
    }
    if (is_comparison(op)) {
      const int order =
          type.width > 0 ? order_of(a.integer, b.integer) : order_of(turns(a.real), turns(b.real));
      return of_bool(ordered(op, order));
    }
    if (type.width == 0) return real_arithmetic(op, a.real, b.real, type);
    Value value = known(type);
    value.integer = (op == "+" ? a.integer + b.integer : a.integer - b.integer).modulo(type.width);
    return value;
  }
  if (op == "/" && angle_left && angle_right) {
    const Type result = {Base::natural, type.width};
    const Value a = converted(left, type, rules);
    const Value b = converted(right, type, rules);
    if (!a.is_known() || !b.is_known()) return postponed(op, a, b, result, rules);
    if (type.width > 0) {
      if (b.integer.is_zero()) refuse("division by zero");
      return of_whole(a.integer / b.integer, result);
    }
    if (turns(b.real) == 0) refuse("division by zero");
    return of_whole(*Integer::truncated(turns(a.real) / turns(b.real)), result);
  }
  if (op != "*" && op != "/") refuse_operands(op, left.type, right.type);
  if (op == "/" && !angle_left) refuse_operands(op, left.type, right.type);
  const Value& factor = angle_left ? right : left;
  if (type.width == 0) {
    if (left.is_known() && right.is_known()) return real_arithmetic(op, real_of(left), real_of(right), type);
    if (auto value = affine(op, left, right, type, rules)) return *value;
    return postponed(op, left, right, type, rules);
  }
  if (!is_whole(factor.type.base)) {
    refuse(fmt::format("`{}` does not take {} and {}", op, text_of(left.type), text_of(right.type)),
           "an angle with a width is multiplied or divided by a uint only");
  }
  const Value& angle = angle_left ? left : right;
  if (!left.is_known() || !right.is_known()) return postponed(op, left, right, type, rules);
  Value value = known(type);
  if (op == "*") {
    value.integer = (angle.integer * factor.integer).modulo(type.width);
  } else {
    if (factor.integer.is_zero()) refuse("division by zero");
    if (factor.integer.is_negative()) refuse("an angle with a width is divided by a uint only");
    value.integer = angle.integer / factor.integer;
  }
  return value;
}

Value time_binary(std::string_view op, const Value& a, const Value& b, const Rules& rules) {
  const bool time_a = is_time(a.type.base);
  const bool time_b = is_time(b.type.base);
  const auto scalar = [](const Value& v) { return v.type.base == Base::real || is_whole(v.type.base); };
  Type type = {Base::duration, 0};
  if (time_a && time_b && (op == "+" || op == "-" || op == "/" || is_comparison(op))) {
    if (is_comparison(op)) type = {Base::boolean, 0};
    if (op == "/") type = {Base::real, 0};
  } else if (!((op == "*" && (scalar(a) || scalar(b))) || (op == "/" && time_a && scalar(b)))) {
    refuse_operands(op, a.type, b.type);
  }
  if (!a.is_known() || !b.is_known()) {
    if (type.base != Base::duration) {
      refuse(
          "the length of a stretch is found when the whole program is read; it can be used in delays only");
    }
    for (const Value* v : {&a, &b}) {
      if (!v->is_known() && !is_time(v->type.base)) refuse("a duration must be known while compiling");
    }
    if (auto value = affine(op, a, b, type, rules)) return *value;
    refuse("a duration must be known while compiling");
  }
  if (is_comparison(op)) return of_bool(ordered(op, order_of(a.real, b.real)));
  return real_arithmetic(op, real_of(a), real_of(b), type);
}

/// bit[n] and an int are compared as the unsigned number that the register holds.
Value register_comparison(std::string_view op, const Value& left, const Value& right, const Rules& rules) {
  const bool register_left = left.type.base == Base::bits;
  const Value& bits = register_left ? left : right;
  const Value& number = register_left ? right : left;
  const Type type = {Base::natural, std::max(bits.type.width, 1u)};
  if (bits.is_known()) {
    const Value value = of_int(bits.integer, {Base::integer, 0});
    return register_left ? binary(op, value, number, rules) : binary(op, number, value, rules);
  }
  if (number.is_known() && is_whole(number.type.base) &&
      (number.integer.is_negative() || number.integer.length() > bits.type.width)) {
    // No value of the register equals it: the answer is known, and the literal need not fit anywhere.
    const int order = number.integer.is_negative() ? 1 : -1;
    return of_bool(ordered(op, register_left ? order : -order));
  }
  Value as_number = cast(bits, type, rules);
  Value other = number.is_known() && is_whole(number.type.base) ? of_int(number.integer) : number;
  return register_left ? postponed(op, as_number, other, {Base::boolean, 0}, rules)
                       : postponed(op, other, as_number, {Base::boolean, 0}, rules);
}

Value comparison(std::string_view op, const Value& a, const Value& b, const Rules& rules) {
  if (a.type.base == Base::bits || b.type.base == Base::bits) {
    if (a.type.base == b.type.base) {
      if (a.type.width != b.type.width) {
        refuse(fmt::format("{} and {} cannot be compared: their widths differ", text_of(a.type),
                           text_of(b.type)));
      }
      if (!a.is_known() || !b.is_known()) return postponed(op, a, b, {Base::boolean, 0}, rules);
      return of_bool(ordered(op, order_of(a.integer, b.integer)));
    }
    const Base other = a.type.base == Base::bits ? b.type.base : a.type.base;
    if (!is_whole(other)) refuse_operands(op, a.type, b.type);
    return register_comparison(op, a, b, rules);
  }
  if (!is_number(a.type.base) || !is_number(b.type.base)) refuse_operands(op, a.type, b.type);
  const Type type = number_type(a.type, b.type);
  if (type.base == Base::complex && op != "==" && op != "!=") refuse_operands(op, a.type, b.type);
  if (!a.is_known() || !b.is_known()) return postponed(op, a, b, {Base::boolean, 0}, rules);
  if (type.base == Base::complex) return of_bool((complex_of(a) == complex_of(b)) == (op == "=="));
  if (type.base == Base::real) {
    const double x = real_of(a);
    const double y = real_of(b);
    if (std::isnan(x) || std::isnan(y)) return of_bool(op == "!=");
    return of_bool(ordered(op, order_of(x, y)));
  }
  // Exact for numbers of any size; only a negative number that meets a uint is taken modulo, as C99 does.
  const auto met = [type](const Integer& x) {
    return type.base == Base::natural && x.is_negative() ? x.modulo(machine(type.width)) : x;
  };
  return of_bool(ordered(op, order_of(met(a.integer), met(b.integer))));
}

/// The operands of & | ^ brought to one type: a plain number adapts to the width of its partner.
Type pattern_type(std::string_view op, const Value& a, const Value& b) {
  const auto truth = [](Base base) { return base == Base::bit || base == Base::boolean; };
  if (truth(a.type.base) && truth(b.type.base)) return {Base::bit, 0};
  const auto free = [](const Value& v) {
    return v.type.base == Base::integer && v.type.width == 0 && v.is_known() && !v.integer.is_negative();
  };
  if (free(a) && free(b)) return {Base::integer, 0};
  if (free(a) && is_patterned(b.type)) return b.type;
  if (free(b) && is_patterned(a.type)) return a.type;
  if (!is_patterned(a.type) || !is_patterned(b.type)) {
    refuse(fmt::format("`{}` does not take {} and {}", op, text_of(a.type), text_of(b.type)),
           "bit operations are for bit[n], uint[n] and angle[n] of the same width; cast an int first");
  }
  if (a.type != b.type) {
    refuse(fmt::format("`{}` does not take {} and {}", op, text_of(a.type), text_of(b.type)),
           "bit operations need operands of the same type and width");
  }
  return a.type;
}

Value bitwise(std::string_view op, const Value& a, const Value& b, const Rules& rules) {
  const Type type = pattern_type(op, a, b);
  if (!a.is_known() || !b.is_known()) {
    const auto met = [&](const Value& v) {
      if (!v.is_known() || v.type == type || type.base == Base::bit) return v;
      Value pattern = known(type);
      pattern.integer = v.integer;
      return pattern;
    };
    return postponed(op, met(a), met(b), type, rules);
  }
  for (const Value* v : {&a, &b}) {
    if (type.width > 0 && v->integer.length() > type.width) {
      refuse(fmt::format("{} does not fit {}", v->integer.to_string(), text_of(type)));
    }
  }
  Value value = known(type);
  value.integer =
      op == "&" ? a.integer & b.integer : (op == "|" ? a.integer | b.integer : a.integer ^ b.integer);
  return value;
}

Value shift(std::string_view op, const Value& a, const Value& b, const Rules& rules) {
  const bool free = a.type.base == Base::integer && a.type.width == 0;
  if ((!free && !is_patterned(a.type)) || !is_whole(b.type.base) || a.type.base == Base::bit) {
    refuse(fmt::format("`{}` does not take {} and {}", op, text_of(a.type), text_of(b.type)),
           "shifts are for bit[n], uint[n] and angle[n]; cast an int first");
  }
  if (!a.is_known() || !b.is_known()) return postponed(op, a, b, a.type, rules);
  if (b.integer.is_negative()) refuse("a shift by a negative number of places");
  if (free && a.integer.is_negative()) refuse("a shift of a negative number");
  Value value = known(a.type);
  const auto places = b.integer.small();
  const std::uint32_t width = a.type.width == 0 && a.type.base != Base::bits ? 0 : a.type.width;
  if (op == ">>") {
    value.integer = places && *places < static_cast<std::int64_t>(most_bits)
                        ? a.integer.shifted_right(static_cast<std::size_t>(*places))
                        : Integer(0);
    return value;
  }
  if (width == 0 && a.type.base != Base::bits) {
    if (!places || *places > static_cast<std::int64_t>(most_bits))
      refuse("the number grows beyond 65,536 bits");
    value.integer = fitted(a.integer.shifted_left(static_cast<std::size_t>(*places)), {Base::integer, 0});
    if (a.type.base == Base::natural) value.integer = value.integer.modulo(64);
    return value;
  }
  const bool gone = !places || *places >= static_cast<std::int64_t>(width);
  value.integer = gone ? Integer(0) : a.integer.shifted_left(static_cast<std::size_t>(*places)).modulo(width);
  return value;
}

Value logical(std::string_view op, const Value& a, const Value& b, const Rules& rules) {
  const Value x = converted(a, {Base::boolean, 0}, rules);
  const Value y = converted(b, {Base::boolean, 0}, rules);
  const bool is_and = op == "&&";
  if (x.is_known()) return truth_of(x) == is_and ? y : x;
  if (y.is_known()) return truth_of(y) == is_and ? x : y;
  return postponed(op, x, y, {Base::boolean, 0}, rules);
}

}  // namespace

std::string text_of(Type type) {
  const auto sized = [&](std::string_view word) {
    return type.width == 0 ? std::string(word) : fmt::format("{}[{}]", word, type.width);
  };
  switch (type.base) {
    case Base::none:
      return "void";
    case Base::bit:
      return "bit";
    case Base::bits:
      return fmt::format("bit[{}]", type.width);
    case Base::boolean:
      return "bool";
    case Base::integer:
      return sized("int");
    case Base::natural:
      return sized("uint");
    case Base::real:
      return sized("float");
    case Base::angle:
      return sized("angle");
    case Base::complex:
      return type.width == 0 ? "complex" : fmt::format("complex[float[{}]]", type.width);
    case Base::duration:
      return "duration";
    case Base::stretch:
      return "stretch";
  }
  return "?";
}

Type type_of(std::string_view text) {
  static constexpr std::array<std::pair<std::string_view, Base>, 10> words = {{{"bit", Base::bit},
                                                                               {"bool", Base::boolean},
                                                                               {"int", Base::integer},
                                                                               {"uint", Base::natural},
                                                                               {"float", Base::real},
                                                                               {"angle", Base::angle},
                                                                               {"complex", Base::complex},
                                                                               {"duration", Base::duration},
                                                                               {"stretch", Base::stretch},
                                                                               {"void", Base::none}}};
  if (text.starts_with("array[")) text.remove_prefix(6);
  for (const std::string_view prefix : {"readonly ", "mutable "}) {
    if (text.starts_with(prefix)) return type_of(text.substr(prefix.size()));
  }
  std::size_t end = 0;
  while (end < text.size() && text[end] >= 'a' && text[end] <= 'z') ++end;
  const auto word = std::find_if(words.begin(), words.end(),
                                 [&](const auto& entry) { return entry.first == text.substr(0, end); });
  if (word == words.end()) return {};
  Type type = {word->second, 0};
  text.remove_prefix(end);
  if (text.starts_with("[float[")) text.remove_prefix(6);
  if (text.starts_with("[")) {
    if (type.base == Base::bit) type.base = Base::bits;
    for (std::size_t i = 1; i < text.size() && text[i] >= '0' && text[i] <= '9'; ++i) {
      type.width = type.width * 10 + static_cast<std::uint32_t>(text[i] - '0');
    }
  }
  return type;
}

Value of_bool(bool value) {
  Value result = known({Base::boolean, 0});
  result.integer = value ? 1 : 0;
  return result;
}

Value of_int(Integer value, Type type) {
  return of_whole(value, type);
}

Value of_real(double value, Type type) {
  Value result = known(type);
  result.real = value;
  return result;
}

Value of_bits(Integer value, std::uint32_t width) {
  Value result = known({Base::bits, width});
  result.integer = std::move(value);
  return result;
}

Value of_expression(Expression expression, Type type, bool runs) {
  Value result = known(type);
  result.expression = std::make_shared<const Expression>(std::move(expression));
  result.runs = runs;
  return result;
}

double radians_of(const Value& value) {
  if (value.type.base == Base::bits || value.type.base == Base::complex || is_time(value.type.base) ||
      value.type.base == Base::none) {
    refuse(fmt::format("an angle is expected here, not {}", text_of(value.type)));
  }
  const double radians = value.form != 0 ? value.real : real_of(value);
  if (!std::isfinite(radians)) refuse("this angle is not a finite number");
  return radians;
}

bool truth_of(const Value& value) {
  switch (value.type.base) {
    case Base::real:
      return value.real != 0;
    case Base::complex:
      return value.real != 0 || value.imaginary != 0;
    case Base::angle:
      return value.type.width == 0 ? turns(value.real) != 0 : !value.integer.is_zero();
    default:
      return !value.integer.is_zero();
  }
}

Value unary(std::string_view op, const Value& a, const Rules& rules) {
  const Base base = a.type.base;
  if (op == "!") {
    const Value truth = converted(a, {Base::boolean, 0}, rules);
    if (truth.is_known()) return of_bool(!truth_of(truth));
    return of_expression(operation("!", {expression_of(truth, rules)}), truth.type, truth.runs);
  }
  if (op == "~") {
    const bool pattern =
        is_patterned(a.type) && (base == Base::bit || base == Base::bits || a.type.width > 0);
    if (!pattern && base != Base::boolean) {
      refuse(fmt::format("`~` does not take {}", text_of(a.type)),
             "bit operations are for bit[n], uint[n] and angle[n]; cast an int first");
    }
    const std::uint32_t width = base == Base::bit || base == Base::boolean ? 1 : a.type.width;
    if (!a.is_known()) return of_expression(operation("~", {expression_of(a, rules)}), a.type, a.runs);
    Value value = known(a.type);
    value.integer = Integer::power_of_two(width) - Integer(1) - a.integer;
    return value;
  }
  if (!is_number(base) && base != Base::angle && !is_time(base)) {
    refuse(fmt::format("`-` does not take {}", text_of(a.type)));
  }
  Type type = a.type;
  if (base == Base::bit || base == Base::boolean) type = {Base::integer, 0};
  if (is_time(base)) type = {Base::duration, 0};
  if (a.is_affine()) {
    return of_affine((is_time(base) ? rules.lengths : rules.forms)->negated(affine_of(a)), type);
  }
  if (!a.is_known()) return of_expression(operation("-", {expression_of(a, rules)}), type, a.runs);
  Value value = known(type);
  value.real = -a.real;
  value.imaginary = -a.imaginary;
  if (base == Base::angle) {
    if (type.width > 0) value.integer = (-a.integer).modulo(type.width);
  } else if (is_whole(base)) {
    value.integer = fitted(-a.integer, type);
  }
  return value;
}

Value binary(std::string_view op, const Value& a, const Value& b, const Rules& rules) {
  const Base x = a.type.base;
  const Base y = b.type.base;
  if (op == "&&" || op == "||") return logical(op, a, b, rules);
  if (x == Base::none || y == Base::none) refuse("a value is expected, but the call returns none");
  if (is_time(x) || is_time(y)) return time_binary(op, a, b, rules);
  if (is_bitwise(op)) return bitwise(op, a, b, rules);
  if (is_shift(op)) return shift(op, a, b, rules);
  if (x == Base::angle || y == Base::angle) return angle_binary(op, a, b, rules);
  if (is_comparison(op)) return comparison(op, a, b, rules);
  if (!is_number(x) || !is_number(y)) {
    const bool bits = x == Base::bits || y == Base::bits;
    refuse(fmt::format("`{}` does not take {} and {}", op, text_of(a.type), text_of(b.type)),
           bits ? "cast the bits to a number of their width first, as in uint[4](b)" : "");
  }
  Type type = number_type(a.type, b.type);
  if (rules.version2 && is_whole(type.base)) type = {Base::real, 0};
  if (type.base == Base::complex && op == "%") refuse_operands(op, a.type, b.type);
  if (!a.is_known() || !b.is_known()) {
    if (auto value = affine(op, a, b, type, rules)) return *value;
    return postponed(op, a, b, type, rules);
  }
  if (type.base == Base::complex) return complex_arithmetic(op, complex_of(a), complex_of(b), type.width);
  if (type.base == Base::real) return real_arithmetic(op, real_of(a), real_of(b), type);
  return whole_arithmetic(op, a, b, type);
}

bool is_function(std::string_view name, bool version2) {
  static constexpr std::array<std::string_view, 18> version3_names = {
      "arccos", "arcsin",   "arctan", "ceiling", "cos", "exp",  "floor", "log",  "mod",
      "pow",    "popcount", "rotl",   "rotr",    "sin", "sqrt", "tan",   "real", "imag"};
  static constexpr std::array<std::string_view, 6> version2_names = {"sin", "cos", "tan",
                                                                     "exp", "ln",  "sqrt"};
  const auto has = [name](const auto& names) {
    return std::find(names.begin(), names.end(), name) != names.end();
  };
  return version2 ? has(version2_names) : has(version3_names);
}

namespace {

void expect_arguments(std::string_view name, const std::vector<Value>& arguments, std::size_t count) {
  if (arguments.size() != count) {
    refuse(
        fmt::format("{} takes {} argument{}, not {}", name, count, count == 1 ? "" : "s", arguments.size()));
  }
}

Value rotated(std::string_view name, const Value& a, const Value& n, const Rules& rules) {
  const bool pattern = a.type.base == Base::bits || (a.type.base == Base::natural && a.type.width > 0);
  if (!pattern || !is_whole(n.type.base)) refuse_operands(name, a.type, n.type);
  if (!a.is_known() || !n.is_known()) {
    Expression call;
    call.kind = Expression::Kind::call;
    call.text = name;
    call.arguments = {expression_of(a, rules), expression_of(n, rules)};
    return of_expression(std::move(call), a.type, a.runs || n.runs);
  }
  Value value = known(a.type);
  const std::uint32_t width = a.type.width;
  if (width == 0) return value;
  const Integer distance = name == "rotl" ? n.integer : -n.integer;
  Integer places = distance % Integer(width);
  if (places.is_negative()) places = places + Integer(width);
  const auto left = static_cast<std::size_t>(*places.small());
  value.integer = (a.integer.shifted_left(left) | a.integer.shifted_right(width - left)).modulo(width);
  return value;
}

Value complex_function(std::string_view name, const Value& a) {
  const Complex z = complex_of(a);
  if (name == "exp") return of_complex(std::exp(z), a.type.width);
  if (name == "sqrt") return of_complex(std::sqrt(z), a.type.width);
  if (name == "cos") return of_complex(std::cos(z), a.type.width);
  if (name == "sin") return of_complex(std::sin(z), a.type.width);
  if (name == "log") return of_complex(std::log(z), a.type.width);
  refuse(fmt::format("{} does not take {}", name, text_of(a.type)));
}

double real_function(std::string_view name, double x) {
  const auto within = [&](bool holds) {
    if (!holds) refuse(fmt::format("{} is not defined for {}", name, text_of(x)));
  };
  if (name == "arccos" || name == "arcsin") within(x >= -1 && x <= 1);
  if (name == "sqrt") within(x >= 0);
  if (name == "log" || name == "ln") within(x > 0);
  if (name == "arccos") return std::acos(x);
  if (name == "arcsin") return std::asin(x);
  if (name == "arctan") return std::atan(x);
  if (name == "ceiling") return std::ceil(x);
  if (name == "floor") return std::floor(x);
  if (name == "cos") return std::cos(x);
  if (name == "sin") return std::sin(x);
  if (name == "tan") return std::tan(x);
  if (name == "exp") return std::exp(x);
  if (name == "sqrt") return std::sqrt(x);
  return std::log(x);
}

Value postponed_call(std::string_view name, const std::vector<Value>& arguments, Type type,
                     const Rules& rules) {
  Expression expression;
  expression.kind = Expression::Kind::call;
  expression.text = name;
  bool runs = false;
  for (const Value& argument : arguments) {
    expression.arguments.push_back(expression_of(argument, rules));
    runs = runs || argument.runs;
  }
  return of_expression(std::move(expression), type, runs);
}

}  // namespace

Value call(std::string_view name, const std::vector<Value>& arguments, const Rules& rules) {
  if (name == "mod" || name == "pow") {
    expect_arguments(name, arguments, 2);
    const Value& a = arguments[0];
    const Value& b = arguments[1];
    if (!is_number(a.type.base) || !is_number(b.type.base)) refuse_operands(name, a.type, b.type);
    if (a.is_known() && b.is_known()) return binary(name == "mod" ? "%" : "**", a, b, rules);
    return postponed_call(name, arguments, number_type(a.type, b.type), rules);
  }
  if (name == "rotl" || name == "rotr") {
    expect_arguments(name, arguments, 2);
    return rotated(name, arguments[0], arguments[1], rules);
  }
  expect_arguments(name, arguments, 1);
  const Value& a = arguments[0];
  if (name == "popcount") {
    if (!is_patterned(a.type)) {
      refuse(fmt::format("popcount does not take {}", text_of(a.type)), "cast it to bit[n] first");
    }
    if (!a.is_known()) return postponed_call(name, arguments, {Base::natural, 0}, rules);
    return of_int(Integer(static_cast<std::int64_t>(a.integer.popcount())), {Base::natural, 0});
  }
  if (name == "real" || name == "imag") {
    if (!is_number(a.type.base)) refuse(fmt::format("{} does not take {}", name, text_of(a.type)));
    const Type type = {Base::real, a.type.base == Base::complex ? a.type.width : 0};
    if (!a.is_known()) return postponed_call(name, arguments, type, rules);
    return of_real(name == "real" ? complex_of(a).real() : complex_of(a).imag(), type);
  }
  if (!is_number(a.type.base) && a.type.base != Base::angle) {
    refuse(fmt::format("{} does not take {}", name, text_of(a.type)));
  }
  const Type type = {a.type.base == Base::complex ? Base::complex : Base::real,
                     a.type.base == Base::complex || a.type.base == Base::real ? a.type.width : 0};
  if (!a.is_known()) return postponed_call(name, arguments, type, rules);
  if (a.type.base == Base::complex) return complex_function(name, a);
  return of_real(rounded_to(real_function(name, real_of(a)), type.width), type);
}

bool converts(Type from, Type to) {
  if (from == to) return from.base != Base::none;
  const bool number_from = is_number(from.base);
  switch (to.base) {
    case Base::boolean:
    case Base::bit:
      return (number_from && from.base != Base::complex) ||
             (from.base == Base::bits && to.base == Base::boolean);
    case Base::integer:
    case Base::natural:
      return (number_from && from.base != Base::complex) ||
             (from.base == Base::bits && from.width == to.width);
    case Base::real:
      return (number_from && from.base != Base::complex) || is_free_angle(from);
    case Base::complex:
      return number_from;
    case Base::angle:
      return (number_from && from.base != Base::complex) || from.base == Base::angle ||
             (from.base == Base::bits && from.width == to.width);
    case Base::bits:
      return (from.base == Base::natural || from.base == Base::integer || from.base == Base::angle) &&
             from.width == to.width && to.width > 0;
    case Base::duration:
    case Base::stretch:
      return is_time(from.base);
    case Base::none:
      return false;
  }
  return false;
}

namespace {

/// What a conversion does to a known value whose types are known to fit.
Value changed(const Value& a, Type to) {
  Value value = known(to);
  switch (to.base) {
    case Base::boolean:
    case Base::bit:
      value.integer = truth_of(a) ? 1 : 0;
      return value;
    case Base::integer:
    case Base::natural: {
      if (a.type.base == Base::real || a.type.base == Base::angle) {
        const auto whole = Integer::truncated(real_of(a));
        if (!whole) refuse(fmt::format("{} has no value as {}", text_of(a.real), text_of(to)));
        value.integer = fitted(*whole, to);
      } else {
        value.integer = fitted(a.integer, to);
      }
      return value;
    }
    case Base::real:
      value.real = rounded_to(real_of(a), to.width);
      return value;
    case Base::complex:
      return of_complex(complex_of(a), to.width);
    case Base::angle:
      if (a.type.base == Base::bits) {
        value.integer = a.integer;
      } else if (to.width == 0) {
        value.real = real_of(a);
      } else if (a.type.base == Base::angle && a.type.width > 0) {
        value.integer = to.width >= a.type.width ? a.integer.shifted_left(to.width - a.type.width)
                                                 : a.integer.shifted_right(a.type.width - to.width);
      } else {
        value.integer = pattern_of(real_of(a), to.width);
      }
      return value;
    case Base::bits:
      value.integer = a.integer.modulo(to.width);
      return value;
    default:
      value.real = a.real;
      return value;
  }
}

Value retyped(const Value& value, Type type, const Rules& rules, bool is_explicit) {
  if (value.type == type) return value;
  if (value.is_known()) return changed(value, type);
  if (value.is_affine() && (type.base == Base::real || is_free_angle(type) || is_time(type.base))) {
    Value result = value;
    result.type = type;
    return result;
  }
  // Where the two types print and compute alike no cast is written.
  const auto truth = [](Base base) { return base == Base::bit || base == Base::boolean; };
  if (truth(value.type.base) && truth(type.base)) {
    Value result = value;
    result.type = type;
    return result;
  }
  if (!is_explicit && value.type.base == Base::angle && type.base == Base::real) {
    Value result = value;
    result.type = type;
    return result;
  }
  if (value.type.base == Base::bits && type.width == 0 &&
      (type.base == Base::integer || type.base == Base::natural)) {
    // The standard casts registers at equal width only: by way of a uint of that width.
    return retyped(retyped(value, {Base::natural, std::max(value.type.width, 1u)}, rules, true), type, rules,
                   true);
  }
  Expression expression;
  expression.kind = Expression::Kind::cast;
  expression.text = text_of(type);
  expression.arguments = {expression_of(value, rules)};
  return of_expression(std::move(expression), type, value.runs);
}

}  // namespace

Value converted(const Value& value, Type type, const Rules& rules, bool* narrowed) {
  if (value.type == type) return value;
  if (!converts(value.type, type)) {
    std::string help;
    if (value.type.base == Base::bits && (type.base == Base::integer || type.base == Base::natural)) {
      help = fmt::format("cast at equal width, as in {}", text_of(Type{type.base, value.type.width}));
    } else if (value.type.base == Base::bits && type.base == Base::bits) {
      help = "registers are assigned at equal width only";
    } else if (type.base == Base::bits && is_whole(value.type.base)) {
      help = fmt::format("write a cast or a bit string of {} characters", type.width);
    }
    refuse(fmt::format("{} does not convert to {}", text_of(value.type), text_of(type)), help);
  }
  Value result = retyped(value, type, rules, false);
  if (narrowed != nullptr && value.is_known()) {
    const bool both_whole = is_whole(value.type.base) && is_whole(type.base);
    const bool from_real = value.type.base == Base::real && is_whole(type.base);
    // That a uint wraps is the language's rule and no surprise.
    if (both_whole && type.base != Base::natural) *narrowed = value.integer != result.integer;
    if (from_real) *narrowed = value.real != result.integer.to_double();
  }
  return result;
}

Value cast(const Value& value, Type type, const Rules& rules) {
  const Base from = value.type.base;
  const Base to = type.base;
  if (value.type == type) return value;
  bool allowed = false;
  if (from == Base::bits) {
    const bool whole = to == Base::integer || to == Base::natural;
    allowed = to == Base::boolean || ((whole || to == Base::angle) && type.width == value.type.width) ||
              (whole && type.width == 0) || (to == Base::bit && value.type.width == 1);
    if (!allowed && (whole || to == Base::angle || to == Base::bits)) {
      refuse(fmt::format("{} does not cast to {}", text_of(value.type), text_of(type)),
             "a register is cast at equal width only");
    }
  } else if (to == Base::bits) {
    const bool free = value.is_known() && from == Base::integer && value.type.width == 0;
    allowed = from == Base::bit || from == Base::boolean ||
              ((from == Base::integer || from == Base::natural || from == Base::angle) &&
               value.type.width == type.width) ||
              (free && !value.integer.is_negative() && value.integer.length() <= type.width);
    if (!allowed && (is_whole(from) || from == Base::angle)) {
      refuse(fmt::format("{} does not cast to {}", text_of(value.type), text_of(type)),
             "a number is cast to a register of equal width only");
    }
  } else if (from == Base::angle) {
    allowed = to == Base::angle || to == Base::boolean || to == Base::bit || to == Base::real;
  } else {
    allowed = converts(value.type, type);
  }
  if (!allowed) refuse(fmt::format("{} does not cast to {}", text_of(value.type), text_of(type)));
  return retyped(value, type, rules, true);
}

Expression literal(std::string text) {
  Expression expression;
  expression.text = std::move(text);
  return expression;
}

Expression operation(std::string text, std::vector<Expression> arguments) {
  Expression expression;
  expression.kind = arguments.size() == 1 ? Expression::Kind::unary : Expression::Kind::binary;
  expression.text = std::move(text);
  expression.arguments = std::move(arguments);
  return expression;
}

std::string text_of(double value) {
  std::string text = fmt::format("{}", value);
  if (text.find_first_of(".en") == std::string::npos) text += ".0";
  return text;
}

namespace {

Expression signed_literal(const std::string& text) {
  if (!text.starts_with('-')) return literal(text);
  return operation("-", {literal(text.substr(1))});
}

Expression real_literal(double value) {
  if (!std::isfinite(value)) refuse("a value that is not finite cannot be kept for the running program");
  return signed_literal(text_of(value));
}

Expression cast_of(Type type, Expression argument) {
  Expression expression;
  expression.kind = Expression::Kind::cast;
  expression.text = text_of(type);
  expression.arguments = {std::move(argument)};
  return expression;
}

std::string bit_string(const Integer& value, std::uint32_t width) {
  std::string text = "\"";
  for (std::uint32_t i = width; i-- > 0;) text += value.bit(i) ? '1' : '0';
  return text + "\"";
}

Expression affine_expression(const Value& value, const Rules& rules) {
  Expression sum;
  bool is_first = true;
  const auto add = [&](Expression term, bool negative) {
    if (is_first) {
      sum = negative ? operation("-", {std::move(term)}) : std::move(term);
    } else {
      sum = operation(negative ? "-" : "+", {std::move(sum), std::move(term)});
    }
    is_first = false;
  };
  for (const Term& term : rules.forms->terms(value.form)) {
    Expression input;
    input.kind = Expression::Kind::input;
    input.variable = term.input;
    const double size = std::abs(term.coefficient);
    add(size == 1 ? input : operation("*", {literal(text_of(size)), input}), term.coefficient < 0);
  }
  if (value.real != 0) add(literal(text_of(std::abs(value.real))), value.real < 0);
  return sum;
}

}  // namespace

Expression expression_of(const Value& value, const Rules& rules) {
  if (value.expression) return *value.expression;
  if (value.is_affine() && is_time(value.type.base))
    refuse("the length of a stretch can be used in delays only");
  if (value.is_affine()) return affine_expression(value, rules);
  switch (value.type.base) {
    case Base::bit:
      return literal(value.integer.is_zero() ? "0" : "1");
    case Base::bits:
      return literal(bit_string(value.integer, value.type.width));
    case Base::boolean:
      return literal(value.integer.is_zero() ? "false" : "true");
    case Base::integer:
    case Base::natural: {
      Expression number = signed_literal(value.integer.to_string());
      const bool bare = value.type == Type{Base::integer, 0};
      return bare ? number : cast_of(value.type, std::move(number));
    }
    case Base::real:
      return real_literal(value.real);
    case Base::angle:
      if (value.type.width == 0) return real_literal(value.real);
      return cast_of(value.type, literal(bit_string(value.integer, value.type.width)));
    case Base::complex:
      return operation(
          "+", {real_literal(value.real), operation("*", {real_literal(value.imaginary), literal("1 im")})});
    case Base::duration:
    case Base::stretch:
      return literal(text_of(value.real) + "ns");
    case Base::none:
      break;
  }
  refuse("a value is expected, but the call returns none");
}

}  // namespace isinglass
