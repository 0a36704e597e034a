// Integration by parts lowers the power and divides by the frequency. Where the frequency is small that would
// lose digits, so small frequencies go through the power series (one integral) or Gauss quadrature (two).
#include "targets/moments.h"

#include <cmath>

namespace isinglass {
namespace {

using Complex = std::complex<double>;
constexpr Complex i1{0, 1};

// Below this frequency the recursions lose more digits than the series do.
constexpr double small_frequency = 2;

Moments moments_by_series(double z) {
  Moments result{};
  Complex term = 1;  // (i z)^j / j!
  for (int j = 0; j < 30; ++j) {
    for (std::size_t n = 0; n < result.size(); ++n) result[n] += term / double(j + int(n) + 1);
    term *= i1 * z / double(j + 1);
  }
  return result;
}

OrderedMoments ordered_by_quadrature(double a, double b) {
  OrderedMoments result{};
  for (const auto [u, outer] : gauss_rule()) {
    for (const auto [part, inner] : gauss_rule()) {
      const double v = u * part;
      const Complex value = outer * inner * u * std::polar(1.0, a * u - b * v);
      const double u_power[3] = {1, u, u * u};
      const double v_power[3] = {1, v, v * v};
      for (std::size_t n = 0; n < 3; ++n)
        for (std::size_t m = 0; m < 3; ++m) result[n][m] += value * (u_power[n] * v_power[m]);
    }
  }
  return result;
}

}  // namespace

const std::array<GaussPoint, 16>& gauss_rule() {
  // Positive nodes on [-1, 1] and their weights.
  static constexpr double nodes[8] = {0.0950125098376374402, 0.2816035507792589132, 0.4580167776572273863,
                                      0.6178762444026437484, 0.7554044083550030339, 0.8656312023878317439,
                                      0.9445750230732325761, 0.9894009349916499326};
  static constexpr double weights[8] = {0.1894506104550684963, 0.1826034150449235889, 0.1691565193950025382,
                                        0.1495959888165767321, 0.1246289712555338720, 0.0951585116824927848,
                                        0.0622535239386478929, 0.0271524594117540949};
  static const auto rule = [] {
    std::array<GaussPoint, 16> points{};
    for (std::size_t k = 0; k < 8; ++k) {
      points[7 - k] = {0.5 * (1 - nodes[k]), 0.5 * weights[k]};
      points[8 + k] = {0.5 * (1 + nodes[k]), 0.5 * weights[k]};
    }
    return points;
  }();
  return rule;
}

Moments moments(double z) {
  if (std::abs(z) < small_frequency) return moments_by_series(z);
  Moments result{};
  const Complex end = std::polar(1.0, z);
  const Complex divisor = 1.0 / (i1 * z);
  result[0] = (end - 1.0) * divisor;
  for (std::size_t n = 1; n < result.size(); ++n) result[n] = (end - double(n) * result[n - 1]) * divisor;
  return result;
}

OrderedMoments ordered_moments(double a, double b) {
  OrderedMoments w{};
  const Moments both = moments(a - b);
  if (std::abs(b) >= std::max(std::abs(a), small_frequency)) {
    // The inner integral by parts.
    const Moments outer = moments(a);
    const Complex divisor = i1 / b;
    for (std::size_t n = 0; n < 3; ++n) {
      w[n][0] = (both[n] - outer[n]) * divisor;
      for (std::size_t m = 1; m < 3; ++m) w[n][m] = (both[n + m] - double(m) * w[n][m - 1]) * divisor;
    }
  } else if (std::abs(a) >= small_frequency) {
    // The outer integral by parts, the order of integration exchanged.
    const Moments inner = moments(-b);
    const Complex end = std::polar(1.0, a);
    const Complex divisor = -i1 / a;
    for (std::size_t m = 0; m < 3; ++m) {
      w[0][m] = (end * inner[m] - both[m]) * divisor;
      for (std::size_t n = 1; n < 3; ++n)
        w[n][m] = (end * inner[m] - both[n + m] - double(n) * w[n - 1][m]) * divisor;
    }
  } else {
    w = ordered_by_quadrature(a, b);
  }
  return w;
}

}  // namespace isinglass
