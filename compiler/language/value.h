// Types and values of the language, and what its operators, functions and casts do with them.
//
// A value is known while compiling (a number), affine in the program's inputs (an angle or float), or an
// expression that only the running program can evaluate. The functions here accept all three and keep as much
// known as they can. A breach of the type rules is thrown as a Fault; the reader adds the place.
#pragma once

#include <cstdint>
#include <memory>
#include <string>
#include <string_view>
#include <vector>

#include "circuit/angle.h"
#include "circuit/classical.h"
#include "language/integer.h"

namespace isinglass {

enum class Base : std::uint8_t {
  none,  // void
  bit,   // the scalar
  bits,  // bit[width], width 0 allowed
  boolean,
  integer,  // int[width]
  natural,  // uint[width]
  real,     // float[width]
  angle,
  complex,  // complex[float[width]]
  duration,
  stretch,
};

/// A scalar type. Width 0 = not given (for bits it is the size). An int without width is exact while
/// compiling; a uint without width wraps at 64 bits; a float without width is a double; an angle without
/// width is a real number of radians that is never reduced.
struct Type {
  Base base = Base::none;
  std::uint32_t width = 0;

  bool operator==(const Type&) const = default;
};

/// As OpenQASM writes it: "uint[8]", "bit", "complex[float[64]]".
std::string text_of(Type type);

/// The type that text_of() wrote; also "array[...]" gives its base type. Base::none if it is none of them.
Type type_of(std::string_view text);

/// A breach of the language's rules, thrown by evaluation and caught where the place in the source is known.
struct Fault {
  std::string text;
  std::string help;  // empty, or advice
};

/// One scalar value. Known: integer holds bit, bits, bool, int, uint and angle[n] (its pattern k, meaning
/// 2 pi k / 2^n); real and imaginary hold float, complex, the unsized angle (radians) and durations
/// (nanoseconds).
struct Value {
  Type type;
  std::uint32_t form =
      0;  // float or unsized angle: + forms[form], affine in the inputs; duration: + lengths[form]
  bool runs = false;  // the expression names variables, so only the running program knows it
  Integer integer;
  double real = 0;
  double imaginary = 0;
  std::shared_ptr<const Expression> expression;  // unless known or affine

  bool is_known() const { return form == 0 && !expression; }
  bool is_affine() const { return form != 0; }
};

Value of_bool(bool value);
Value of_int(Integer value, Type type = {Base::integer, 0});
Value of_real(double value, Type type = {Base::real, 0});
Value of_bits(Integer value, std::uint32_t width);
Value of_expression(Expression expression, Type type, bool runs);

/// A known angle or number in radians. Throws Fault if the value has no such meaning or is not finite.
double radians_of(const Value& value);
/// The truth of a known value that converts to bool.
bool truth_of(const Value& value);

/// What operators need besides their operands.
struct Rules {
  Forms* forms = nullptr;    // where affine values live
  Forms* lengths = nullptr;  // and durations that are affine in the stretches, which are solved at the end
  bool version2 = false;     // OpenQASM 2: `/` divides, `^` is a power
};

/// op: "-", "~", "!".
Value unary(std::string_view op, const Value& a, const Rules& rules);
/// op: one of the language's binary operators.
Value binary(std::string_view op, const Value& a, const Value& b, const Rules& rules);
/// Built-in functions on scalars. Whether there is one of that name:
bool is_function(std::string_view name, bool version2);
Value call(std::string_view name, const std::vector<Value>& arguments, const Rules& rules);

/// Explicit cast as the standard's table allows it, and implicit conversion (assignment, arguments). The
/// latter sets *narrowed when a known value changes by it.
Value cast(const Value& value, Type type, const Rules& rules);
Value converted(const Value& value, Type type, const Rules& rules, bool* narrowed = nullptr);
bool converts(Type from, Type to);

/// The value as an expression of the native program: a literal, with a cast where the bare literal would have
/// another type; an affine value as a sum over inputs.
Expression expression_of(const Value& value, const Rules& rules);

/// Building blocks of expressions.
Expression literal(std::string text);
Expression operation(std::string text, std::vector<Expression> arguments);

/// Digits that read back as the same double, with a point or exponent so that it stays a float.
std::string text_of(double value);

}  // namespace isinglass
