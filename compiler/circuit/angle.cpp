// Interning and arithmetic of linear forms; see angle.h.
#include "circuit/angle.h"

#include <cmath>

namespace isinglass {

Forms::Forms() : table_(1) {}

std::uint32_t Forms::intern(std::vector<Term> terms) {
  if (terms.empty()) return 0;
  const auto [place, is_new] = index_.try_emplace(terms, static_cast<std::uint32_t>(table_.size()));
  if (is_new) table_.push_back(std::move(terms));
  return place->second;
}

std::uint32_t Forms::of_input(std::uint32_t input) {
  return intern({Term{input, 1.0}});
}

std::uint32_t Forms::sum(std::uint32_t a, std::uint32_t b) {
  if (a == 0) return b;
  if (b == 0) return a;
  const auto& left = table_[a];
  const auto& right = table_[b];
  std::vector<Term> merged;
  std::size_t i = 0;
  std::size_t j = 0;
  while (i < left.size() || j < right.size()) {
    if (j == right.size() || (i < left.size() && left[i].input < right[j].input)) {
      merged.push_back(left[i++]);
    } else if (i == left.size() || right[j].input < left[i].input) {
      merged.push_back(right[j++]);
    } else {
      const double coefficient = left[i].coefficient + right[j].coefficient;
      // Cancelled terms leave rounding dust; it must not keep a known angle symbolic.
      const double scale = std::abs(left[i].coefficient) + std::abs(right[j].coefficient);
      if (std::abs(coefficient) > 1e-14 * scale) merged.push_back({left[i].input, coefficient});
      ++i;
      ++j;
    }
  }
  return intern(std::move(merged));
}

std::uint32_t Forms::scaled(std::uint32_t a, double factor) {
  if (a == 0 || factor == 0) return 0;
  std::vector<Term> terms = table_[a];
  for (Term& term : terms) term.coefficient *= factor;
  return intern(std::move(terms));
}

double Forms::value(std::uint32_t form, std::span<const double> inputs) const {
  double total = 0;
  for (const Term& term : table_[form]) total += term.coefficient * inputs[term.input];
  return total;
}

double reduced(double x, double period) {
  constexpr double most_periods = 64;
  const double periods = x / period;
  if (std::abs(periods) <= 0.5) return x;
  if (std::abs(periods) > most_periods) return std::remainder(x, period);
  return x - std::nearbyint(periods) * period;
}

double wrapped(double x) {
  const double y = reduced(x, 2 * pi);
  return y <= -pi + 1e-15 ? pi : y;
}

bool is_multiple(double x, double period, double tolerance) {
  return std::abs(std::remainder(x, period)) <= tolerance;
}

}  // namespace isinglass
