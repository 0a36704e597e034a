// Angles that may depend on named inputs: constant + sum of coefficient * input, all in radians.
//
// An Operation stores an angle as a number and the index of an interned linear form, so that circuits without
// inputs pay nothing for them. Form 0 is "no inputs". Passes add, negate and scale angles without knowing the
// values of the inputs; only numeric passes ask is_known().
#pragma once

#include <cstdint>
#include <map>
#include <numbers>
#include <span>
#include <string>
#include <utility>
#include <vector>

namespace isinglass {

inline constexpr double pi = std::numbers::pi;

/// constant + forms[form], in radians. Form 0 is the zero form: then the angle is a known number.
struct Angle {
  double constant = 0;
  std::uint32_t form = 0;

  bool is_known() const { return form == 0; }
  bool operator==(const Angle&) const = default;
};

/// One summand of a linear form: coefficient * (input with this index). The coefficient is never 0.
struct Term {
  std::uint32_t input;
  double coefficient;
  auto operator<=>(const Term&) const = default;
};

/// The linear forms that occur in one circuit, each stored once. Value type: a copied circuit has its own.
class Forms {
 public:
  Forms();

  std::uint32_t of_input(std::uint32_t input);
  std::uint32_t sum(std::uint32_t a, std::uint32_t b);
  std::uint32_t scaled(std::uint32_t a, double factor);

  /// Sorted by input; empty for form 0.
  std::span<const Term> terms(std::uint32_t form) const { return table_[form]; }
  std::size_t size() const { return table_.size(); }

  /// Value of the form where inputs[i] is the value of input i.
  double value(std::uint32_t form, std::span<const double> inputs) const;

  Angle sum(Angle a, Angle b) { return {a.constant + b.constant, sum(a.form, b.form)}; }
  Angle difference(Angle a, Angle b) { return sum(a, negated(b)); }
  Angle scaled(Angle a, double factor) { return {a.constant * factor, scaled(a.form, factor)}; }
  Angle negated(Angle a) { return {-a.constant, a.form == 0 ? 0 : scaled(a.form, -1.0)}; }
  double value(Angle a, std::span<const double> inputs) const {
    return a.constant + (a.form == 0 ? 0.0 : value(a.form, inputs));
  }

 private:
  std::uint32_t intern(std::vector<Term> terms);

  std::vector<std::vector<Term>> table_;
  std::map<std::vector<Term>, std::uint32_t> index_;
};

/// x minus the nearest multiple of the period. Exact like std::remainder where x is large, and much faster
/// where it is not: then within a rounding of x.
double reduced(double x, double period);

/// x brought into (-pi, pi]; values within 1e-15 of -pi become pi so that printing is stable.
double wrapped(double x);

/// Whether x is a multiple of `period` up to `tolerance` (absolute, radians).
bool is_multiple(double x, double period, double tolerance = 1e-12);

}  // namespace isinglass
