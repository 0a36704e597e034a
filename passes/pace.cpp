// Foretelling how long passes take; see pace.h.
#include "passes/pace.h"

#include <algorithm>

namespace isinglass {

double Pace::expected(const Pass& pass, std::size_t gates) const {
  const std::lock_guard lock(mutex_);
  const auto seen = slowest_.find(pass.name);
  const double known = seen == slowest_.end() ? 0.0 : seen->second;
  const double as_listed = 1e-6 * pass.us_a_gate * std::max(1.0, taken_ / listed_);
  return std::max(known, as_listed) * static_cast<double>(gates);
}

void Pace::saw(const Pass& pass, std::size_t gates, double seconds) {
  constexpr std::size_t few = 1000;  // what a pass takes whatever the gates would count too much
  if (gates < few) return;
  const std::lock_guard lock(mutex_);
  listed_ += 1e-6 * pass.us_a_gate * static_cast<double>(gates);
  taken_ += seconds;
  double& slowest = slowest_[pass.name];
  slowest = std::max(slowest, seconds / static_cast<double>(gates));
}

}  // namespace isinglass
