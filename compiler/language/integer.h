// Whole numbers of any size: the integers of the language have no bound while compiling.
//
// A number that fits 64 bits is held in place; only larger ones own a magnitude. Arithmetic is exact;
// division truncates toward zero as in C99.
#pragma once

#include <compare>
#include <cstdint>
#include <optional>
#include <string>
#include <string_view>
#include <vector>

namespace isinglass {

class Integer {
 public:
  Integer() = default;
  Integer(std::int64_t value) : small_(value) {}  // NOLINT: numbers convert

  /// Digits of base 2, 8, 10 or 16, without prefix; underscores are skipped.
  static Integer parsed(std::string_view digits, unsigned base);
  /// 2^exponent.
  static Integer power_of_two(std::size_t exponent);
  /// The number truncated toward zero; nothing for infinities and NaN.
  static std::optional<Integer> truncated(double value);

  bool is_negative() const { return limbs_.empty() ? small_ < 0 : negative_; }
  bool is_zero() const { return limbs_.empty() && small_ == 0; }
  /// The value if it fits 64 bits.
  std::optional<std::int64_t> small() const { return limbs_.empty() ? std::optional(small_) : std::nullopt; }
  /// Nearest double, ties to even; infinite beyond its range.
  double to_double() const;
  std::string to_string() const;

  /// Bits of the magnitude: 0 for 0, else 1 + floor(log2 |x|).
  std::size_t length() const;
  /// Bit `index` of the magnitude. Meant for numbers >= 0.
  bool bit(std::size_t index) const;
  void set_bit(std::size_t index, bool value);
  std::size_t popcount() const;

  /// The representative of this number modulo 2^width in [0, 2^width), and in [-2^(width-1), 2^(width-1)).
  Integer modulo(std::size_t width) const;
  Integer wrapped(std::size_t width) const;

  Integer operator-() const;
  friend Integer operator+(const Integer& a, const Integer& b);
  friend Integer operator-(const Integer& a, const Integer& b);
  friend Integer operator*(const Integer& a, const Integer& b);
  /// Quotient and remainder by a divisor that is not 0; the remainder has the sign of the dividend.
  friend Integer operator/(const Integer& a, const Integer& b);
  friend Integer operator%(const Integer& a, const Integer& b);
  /// Of numbers >= 0.
  friend Integer operator&(const Integer& a, const Integer& b);
  friend Integer operator|(const Integer& a, const Integer& b);
  friend Integer operator^(const Integer& a, const Integer& b);
  Integer shifted_left(std::size_t places) const;
  /// Of a number >= 0.
  Integer shifted_right(std::size_t places) const;

  friend std::strong_ordering operator<=>(const Integer& a, const Integer& b);
  friend bool operator==(const Integer& a, const Integer& b) { return (a <=> b) == 0; }

 private:
  using Limbs = std::vector<std::uint32_t>;  // least significant first
  Limbs magnitude() const;
  static Integer made(Limbs limbs, bool negative);
  static int compare(const Limbs& a, const Limbs& b);
  static Limbs sum(const Limbs& a, const Limbs& b);
  static Limbs difference(const Limbs& a, const Limbs& b);
  static std::pair<Limbs, Limbs> divided(const Limbs& a, const Limbs& b);
  template <class Operation>
  static Integer bitwise(const Integer& a, const Integer& b, Operation operation);

  std::int64_t small_ = 0;
  bool negative_ = false;  // of a large number
  Limbs limbs_;            // empty for a number that fits 64 bits
};

/// base^exponent for exponent >= 0.
Integer power(Integer base, std::uint64_t exponent);

}  // namespace isinglass
