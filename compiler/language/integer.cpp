// Exact arithmetic on whole numbers; see integer.h. Schoolbook methods: the numbers of programs are short.
#include "language/integer.h"

#include <algorithm>
#include <bit>
#include <cmath>
#include <limits>

namespace isinglass {

namespace {

void trim(std::vector<std::uint32_t>& limbs) {
  while (!limbs.empty() && limbs.back() == 0) limbs.pop_back();
}

unsigned digit_value(char digit) {
  if (digit >= '0' && digit <= '9') return static_cast<unsigned>(digit - '0');
  return static_cast<unsigned>((digit | 0x20) - 'a') + 10;
}

}  // namespace

Integer::Limbs Integer::magnitude() const {
  if (!limbs_.empty()) return limbs_;
  const auto value =
      small_ < 0 ? ~static_cast<std::uint64_t>(small_) + 1 : static_cast<std::uint64_t>(small_);
  Limbs limbs = {static_cast<std::uint32_t>(value), static_cast<std::uint32_t>(value >> 32)};
  trim(limbs);
  return limbs;
}

Integer Integer::made(Limbs limbs, bool negative) {
  trim(limbs);
  Integer result;
  if (limbs.size() <= 2) {
    std::uint64_t value = 0;
    for (std::size_t i = limbs.size(); i-- > 0;) value = value << 32 | limbs[i];
    const auto most = static_cast<std::uint64_t>(std::numeric_limits<std::int64_t>::max());
    if (value <= most) {
      result.small_ = negative ? -static_cast<std::int64_t>(value) : static_cast<std::int64_t>(value);
      return result;
    }
    if (negative && value == most + 1) {
      result.small_ = std::numeric_limits<std::int64_t>::min();
      return result;
    }
  }
  result.negative_ = negative;
  result.limbs_ = std::move(limbs);
  return result;
}

Integer Integer::parsed(std::string_view digits, unsigned base) {
  Limbs limbs;
  std::int64_t small = 0;
  bool fits = true;
  const auto absorb = [&limbs, base](unsigned digit) {
    std::uint64_t carry = digit;
    for (std::uint32_t& limb : limbs) {
      carry += static_cast<std::uint64_t>(limb) * base;
      limb = static_cast<std::uint32_t>(carry);
      carry >>= 32;
    }
    if (carry) limbs.push_back(static_cast<std::uint32_t>(carry));
  };
  for (const char digit : digits) {
    if (digit == '_') continue;
    const unsigned value = digit_value(digit);
    if (fits) {
      std::int64_t next = 0;
      if (__builtin_mul_overflow(small, static_cast<std::int64_t>(base), &next) ||
          __builtin_add_overflow(next, static_cast<std::int64_t>(value), &next)) {
        fits = false;
        limbs = Integer(small).magnitude();
        absorb(value);
      } else {
        small = next;
      }
    } else {
      absorb(value);
    }
  }
  return fits ? Integer(small) : made(std::move(limbs), false);
}

Integer Integer::power_of_two(std::size_t exponent) {
  return Integer(1).shifted_left(exponent);
}

std::optional<Integer> Integer::truncated(double value) {
  if (!std::isfinite(value)) return std::nullopt;
  value = std::trunc(value);
  if (std::abs(value) < 0x1p62) return Integer(static_cast<std::int64_t>(value));
  int exponent = 0;
  const double fraction = std::frexp(std::abs(value), &exponent);
  const Integer mantissa(static_cast<std::int64_t>(std::ldexp(fraction, 53)));
  const Integer magnitude = mantissa.shifted_left(static_cast<std::size_t>(exponent - 53));
  return value < 0 ? -magnitude : magnitude;
}

double Integer::to_double() const {
  if (limbs_.empty()) return static_cast<double>(small_);
  const std::size_t bits = length();
  if (bits > 1100) return negative_ ? -HUGE_VAL : HUGE_VAL;
  // The top 64 bits, the lowest of them sticky, round correctly when converted to 53.
  const std::size_t drop = bits - 64;
  std::uint64_t top = 0;
  for (std::size_t i = 0; i < 64; ++i) top |= static_cast<std::uint64_t>(bit(drop + i)) << i;
  for (std::size_t i = 0; i < drop; ++i) {
    if (bit(i)) {
      top |= 1;
      break;
    }
  }
  const double value = std::ldexp(static_cast<double>(top), static_cast<int>(drop));
  return negative_ ? -value : value;
}

std::string Integer::to_string() const {
  if (limbs_.empty()) return std::to_string(small_);
  std::string text;
  Limbs rest = limbs_;
  while (!rest.empty()) {
    std::uint64_t carry = 0;
    for (std::size_t i = rest.size(); i-- > 0;) {
      carry = carry << 32 | rest[i];
      rest[i] = static_cast<std::uint32_t>(carry / 1'000'000'000);
      carry %= 1'000'000'000;
    }
    trim(rest);
    for (int i = 0; i < 9 && (carry != 0 || !rest.empty()); ++i, carry /= 10) {
      text += static_cast<char>('0' + carry % 10);
    }
  }
  if (negative_) text += '-';
  std::reverse(text.begin(), text.end());
  return text;
}

std::size_t Integer::length() const {
  const Limbs limbs = magnitude();
  if (limbs.empty()) return 0;
  return 32 * (limbs.size() - 1) + static_cast<std::size_t>(std::bit_width(limbs.back()));
}

bool Integer::bit(std::size_t index) const {
  if (limbs_.empty()) {
    if (index >= 64) return false;
    const auto value =
        small_ < 0 ? ~static_cast<std::uint64_t>(small_) + 1 : static_cast<std::uint64_t>(small_);
    return (value >> index & 1) != 0;
  }
  return index / 32 < limbs_.size() && (limbs_[index / 32] >> (index % 32) & 1) != 0;
}

void Integer::set_bit(std::size_t index, bool value) {
  if (bit(index) == value) return;
  Limbs limbs = magnitude();
  if (limbs.size() <= index / 32) limbs.resize(index / 32 + 1);
  limbs[index / 32] ^= 1u << (index % 32);
  *this = made(std::move(limbs), is_negative());
}

std::size_t Integer::popcount() const {
  std::size_t count = 0;
  for (const std::uint32_t limb : magnitude()) count += static_cast<std::size_t>(std::popcount(limb));
  return count;
}

Integer Integer::modulo(std::size_t width) const {
  if (limbs_.empty() && small_ >= 0 && (width >= 63 || small_ >> width == 0)) return *this;
  Limbs limbs = magnitude();
  limbs.resize((width + 31) / 32);
  if (width % 32 != 0) limbs.back() &= (1u << (width % 32)) - 1;
  const Integer remainder = made(std::move(limbs), false);
  if (!is_negative() || remainder.is_zero()) return remainder;
  return power_of_two(width) - remainder;
}

Integer Integer::wrapped(std::size_t width) const {
  if (limbs_.empty() && (width >= 64 || (small_ >= -(std::int64_t(1) << (width - 1)) &&
                                         small_ < std::int64_t(1) << (width - 1)))) {
    return *this;
  }
  const Integer pattern = modulo(width);
  return pattern.bit(width - 1) ? pattern - power_of_two(width) : pattern;
}

Integer Integer::operator-() const {
  if (limbs_.empty() && small_ != std::numeric_limits<std::int64_t>::min()) return Integer(-small_);
  return made(magnitude(), !is_negative());
}

int Integer::compare(const Limbs& a, const Limbs& b) {
  if (a.size() != b.size()) return a.size() < b.size() ? -1 : 1;
  for (std::size_t i = a.size(); i-- > 0;) {
    if (a[i] != b[i]) return a[i] < b[i] ? -1 : 1;
  }
  return 0;
}

Integer::Limbs Integer::sum(const Limbs& a, const Limbs& b) {
  Limbs result;
  std::uint64_t carry = 0;
  for (std::size_t i = 0; i < std::max(a.size(), b.size()) || carry; ++i) {
    carry += static_cast<std::uint64_t>(i < a.size() ? a[i] : 0) + (i < b.size() ? b[i] : 0);
    result.push_back(static_cast<std::uint32_t>(carry));
    carry >>= 32;
  }
  return result;
}

Integer::Limbs Integer::difference(const Limbs& a, const Limbs& b) {
  Limbs result = a;
  std::int64_t borrow = 0;
  for (std::size_t i = 0; i < a.size(); ++i) {
    std::int64_t limb = static_cast<std::int64_t>(a[i]) - (i < b.size() ? b[i] : 0) - borrow;
    borrow = limb < 0;
    if (borrow) limb += std::int64_t(1) << 32;
    result[i] = static_cast<std::uint32_t>(limb);
  }
  trim(result);
  return result;
}

std::pair<Integer::Limbs, Integer::Limbs> Integer::divided(const Limbs& a, const Limbs& b) {
  Limbs quotient(a.size(), 0);
  Limbs remainder;
  if (b.size() == 1) {
    std::uint64_t carry = 0;
    for (std::size_t i = a.size(); i-- > 0;) {
      carry = carry << 32 | a[i];
      quotient[i] = static_cast<std::uint32_t>(carry / b[0]);
      carry %= b[0];
    }
    remainder = {static_cast<std::uint32_t>(carry)};
  } else {
    // Bit by bit: long divisors are rare enough.
    for (std::size_t i = 32 * a.size(); i-- > 0;) {
      std::uint32_t carry = a[i / 32] >> (i % 32) & 1;
      for (std::uint32_t& limb : remainder) {
        const std::uint32_t out = limb >> 31;
        limb = limb << 1 | carry;
        carry = out;
      }
      if (carry) remainder.push_back(carry);
      if (compare(remainder, b) >= 0) {
        remainder = difference(remainder, b);
        quotient[i / 32] |= 1u << (i % 32);
      }
    }
  }
  trim(quotient);
  trim(remainder);
  return {std::move(quotient), std::move(remainder)};
}

Integer operator+(const Integer& a, const Integer& b) {
  std::int64_t result = 0;
  if (a.limbs_.empty() && b.limbs_.empty() && !__builtin_add_overflow(a.small_, b.small_, &result)) {
    return Integer(result);
  }
  const Integer::Limbs left = a.magnitude();
  const Integer::Limbs right = b.magnitude();
  if (a.is_negative() == b.is_negative()) return Integer::made(Integer::sum(left, right), a.is_negative());
  if (Integer::compare(left, right) >= 0) {
    return Integer::made(Integer::difference(left, right), a.is_negative());
  }
  return Integer::made(Integer::difference(right, left), b.is_negative());
}

Integer operator-(const Integer& a, const Integer& b) {
  std::int64_t result = 0;
  if (a.limbs_.empty() && b.limbs_.empty() && !__builtin_sub_overflow(a.small_, b.small_, &result)) {
    return Integer(result);
  }
  return a + -b;
}

Integer operator*(const Integer& a, const Integer& b) {
  std::int64_t result = 0;
  if (a.limbs_.empty() && b.limbs_.empty() && !__builtin_mul_overflow(a.small_, b.small_, &result)) {
    return Integer(result);
  }
  const Integer::Limbs left = a.magnitude();
  const Integer::Limbs right = b.magnitude();
  Integer::Limbs product(left.size() + right.size(), 0);
  for (std::size_t i = 0; i < left.size(); ++i) {
    std::uint64_t carry = 0;
    for (std::size_t j = 0; j < right.size(); ++j) {
      carry += static_cast<std::uint64_t>(left[i]) * right[j] + product[i + j];
      product[i + j] = static_cast<std::uint32_t>(carry);
      carry >>= 32;
    }
    product[i + right.size()] = static_cast<std::uint32_t>(carry);
  }
  return Integer::made(std::move(product), a.is_negative() != b.is_negative());
}

Integer operator/(const Integer& a, const Integer& b) {
  if (a.limbs_.empty() && b.limbs_.empty() && b.small_ != -1) return Integer(a.small_ / b.small_);
  return Integer::made(Integer::divided(a.magnitude(), b.magnitude()).first,
                       a.is_negative() != b.is_negative());
}

Integer operator%(const Integer& a, const Integer& b) {
  if (a.limbs_.empty() && b.limbs_.empty()) return b.small_ == -1 ? Integer(0) : Integer(a.small_ % b.small_);
  return Integer::made(Integer::divided(a.magnitude(), b.magnitude()).second, a.is_negative());
}

template <class Operation>
Integer Integer::bitwise(const Integer& a, const Integer& b, Operation operation) {
  Limbs left = a.magnitude();
  Limbs right = b.magnitude();
  left.resize(std::max(left.size(), right.size()));
  right.resize(left.size());
  for (std::size_t i = 0; i < left.size(); ++i) left[i] = operation(left[i], right[i]);
  return made(std::move(left), false);
}

Integer operator&(const Integer& a, const Integer& b) {
  return Integer::bitwise(a, b, [](std::uint32_t x, std::uint32_t y) { return x & y; });
}
Integer operator|(const Integer& a, const Integer& b) {
  return Integer::bitwise(a, b, [](std::uint32_t x, std::uint32_t y) { return x | y; });
}
Integer operator^(const Integer& a, const Integer& b) {
  return Integer::bitwise(a, b, [](std::uint32_t x, std::uint32_t y) { return x ^ y; });
}

Integer Integer::shifted_left(std::size_t places) const {
  if (is_zero()) return *this;
  if (limbs_.empty() && small_ > 0 &&
      places + static_cast<std::size_t>(std::bit_width(static_cast<std::uint64_t>(small_))) < 64) {
    return Integer(small_ << places);
  }
  const Limbs limbs = magnitude();
  Limbs result(places / 32 + limbs.size() + 1, 0);
  for (std::size_t i = 0; i < limbs.size(); ++i) {
    const std::uint64_t wide = static_cast<std::uint64_t>(limbs[i]) << (places % 32);
    result[i + places / 32] |= static_cast<std::uint32_t>(wide);
    result[i + places / 32 + 1] |= static_cast<std::uint32_t>(wide >> 32);
  }
  return made(std::move(result), is_negative());
}

Integer Integer::shifted_right(std::size_t places) const {
  if (limbs_.empty()) return places >= 64 ? Integer(0) : Integer(small_ >> places);
  if (places / 32 >= limbs_.size()) return {};
  Limbs result(limbs_.begin() + static_cast<std::ptrdiff_t>(places / 32), limbs_.end());
  if (places % 32 != 0) {
    for (std::size_t i = 0; i < result.size(); ++i) {
      const std::uint32_t above = i + 1 < result.size() ? result[i + 1] : 0;
      result[i] = result[i] >> (places % 32) | above << (32 - places % 32);
    }
  }
  return made(std::move(result), negative_);
}

std::strong_ordering operator<=>(const Integer& a, const Integer& b) {
  if (a.limbs_.empty() && b.limbs_.empty()) return a.small_ <=> b.small_;
  if (a.is_negative() != b.is_negative()) {
    return a.is_negative() ? std::strong_ordering::less : std::strong_ordering::greater;
  }
  const int order = Integer::compare(a.magnitude(), b.magnitude());
  return (a.is_negative() ? -order : order) <=> 0;
}

Integer power(Integer base, std::uint64_t exponent) {
  Integer result(1);
  for (; exponent > 0; exponent >>= 1) {
    if (exponent & 1) result = result * base;
    if (exponent > 1) base = base * base;
  }
  return result;
}

}  // namespace isinglass
