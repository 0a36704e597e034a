// Pulses: their kernels against quadrature, closure of every mode, robustness, the peak limit and the search.
#include <doctest/doctest.h>

#include <random>

#include "targets/moments.h"
#include "targets/pair_search.h"
#include "targets/trap_support.h"

using namespace isinglass;
using namespace isinglass::support;
using Complex = std::complex<double>;

namespace {

constexpr double full_chi = std::numbers::pi / 4;

// Gauss quadrature on many small parts: slow, plain, and independent of the recursions.
template <typename Function>
Complex integral(double from, double to, int parts, Function&& function) {
  Complex sum = 0;
  const double h = (to - from) / parts;
  for (int k = 0; k < parts; ++k)
    for (const auto [at, weight] : gauss_rule()) sum += h * weight * function(from + h * (k + at));
  return sum;
}

Pulse random_pulse(Shape shape, int segments, double duration, double detuning, unsigned seed) {
  std::mt19937 random(seed);
  std::uniform_real_distribution<double> height(-1e5, 1e5);
  Pulse pulse{shape, duration, detuning, Eigen::VectorXd(segments + (shape == Shape::ramps ? 1 : 0))};
  for (double& value : pulse.rabi) value = height(random);
  if (shape == Shape::ramps) pulse.rabi[0] = pulse.rabi[segments] = 0;
  return pulse;
}

}  // namespace

// Source: computed (Gauss quadrature on many parts).
TEST_CASE("moments agree with quadrature for small, middling and large frequencies") {
  for (const double z : {0.0, 1e-12, -1e-5, 0.3, -1.99, 2.01, 7.0, -40.0, 180.0}) {
    CAPTURE(z);
    const Moments m = moments(z);
    for (int n = 0; n < 5; ++n) {
      const Complex slow =
          integral(0, 1, 60, [&](double u) { return std::pow(u, n) * std::polar(1.0, z * u); });
      CHECK(std::abs(m[static_cast<std::size_t>(n)] - slow) < 1e-14);
    }
    for (const double b : {0.0, 1e-9, -0.5, 1.9, z, -z, z + 1e-7, 2.2, -31.0}) {
      CAPTURE(b);
      const OrderedMoments w = ordered_moments(z, b);
      for (int n = 0; n < 3; ++n) {
        for (int k = 0; k < 3; ++k) {
          const Complex slow = integral(0, 1, 24, [&](double u) {
            return std::pow(u, n) * std::polar(1.0, z * u) *
                   integral(0, u, 24, [&](double v) { return std::pow(v, k) * std::polar(1.0, -b * v); });
          });
          CHECK(std::abs(w[static_cast<std::size_t>(n)][static_cast<std::size_t>(k)] - slow) < 1e-14);
        }
      }
    }
  }
}

// Source: computed (the equations of motion of loop and area, by quadrature), also exactly on a mode.
TEST_CASE("loops, areas and excursions of any pulse agree with direct integration") {
  const Eigen::VectorXd modes = (Eigen::VectorXd(3) << 2.85e6, 2.93e6, 3.0e6).finished();
  for (const Shape shape : {Shape::steps, Shape::ramps}) {
    for (const double detuning : {2.93e6, 2.9301e6, 2.7e6}) {
      const Pulse pulse = random_pulse(shape, 7, 20e-6, detuning, 5);
      const Response seen = response(pulse, modes);
      const Eigen::VectorXd dwell = excursion(pulse, modes);
      const auto path = paths(pulse, modes, {0, 7.3e-6, 20e-6});
      for (Eigen::Index m = 0; m < 3; ++m) {
        const double w = 2 * std::numbers::pi * modes[m];
        // loop, and area = 2 int Im(g conj(loop)) dt, g = d loop / dt, by Gauss steps within the segments.
        Complex loop = 0;
        double area = 0, squares = 0;
        constexpr int parts = 7 * 120;
        const double h = pulse.duration / parts;
        const auto g = [&](double t) { return drive_at(pulse, t) * std::polar(1.0, w * t); };
        for (int k = 0; k < parts; ++k) {
          const double start = -pulse.duration / 2 + h * k;
          for (const auto [at, weight] : gauss_rule()) {
            const double t = start + h * at;
            const Complex here = loop + integral(start, t, 1, g);
            area += 2 * h * weight * (g(t) * std::conj(here)).imag();
            squares += h * weight * std::norm(here);
          }
          loop += integral(start, start + h, 1, g);
        }
        CHECK(std::abs(seen.loop[m] - loop) < 1e-11);
        CHECK(std::abs(seen.area[m] - area) < 1e-10);
        CHECK(dwell[m] == doctest::Approx(squares).epsilon(1e-2));
        CHECK(std::abs(path(0, m)) == 0);
        CHECK(std::abs(path(2, m) - loop) < 1e-11);
        const Complex third = integral(-pulse.duration / 2, 7.3e-6 - pulse.duration / 2, 400, g);
        CHECK(std::abs(path(1, m) - third) < (shape == Shape::ramps ? 1e-4 : 1e-2));
      }
    }
  }
}

TEST_CASE("peak, rms and mean of a pulse") {
  const Pulse steps{Shape::steps, 1e-5, 3e6, (Eigen::VectorXd(4) << 1, -3, 0, 2).finished()};
  CHECK(steps.peak() == 3);
  CHECK(steps.rms() == doctest::Approx(std::sqrt(14.0 / 4)));
  CHECK(steps.mean_absolute() == doctest::Approx(1.5));
  CHECK(steps.at(0.3e-5) == doctest::Approx(-3));
  const Pulse ramps{Shape::ramps, 1e-5, 3e6, (Eigen::VectorXd(4) << 0, 2, -2, 0).finished()};
  CHECK(ramps.rms() == doctest::Approx(std::sqrt(4.0 / 3)));
  CHECK(ramps.mean_absolute() == doctest::Approx(1));
  CHECK(ramps.at(0.5e-5) == doctest::Approx(0));
  // phi = pi/2 - mu tau/2: 30 half turns are none.
  CHECK(ramps.phase() == doctest::Approx(std::numbers::pi / 2));
}

// Every pair of 2, 5, 10, 15 and 20 ions: closed to 1e-24 and the angle to 1e-13, where attainable.
TEST_CASE("all paths close and every pair gets its angle") {
  struct Row {
    int ions;
    double duration;
    int reachable;
  };
  for (const Row& row : {Row{2, 200e-6, 1}, Row{5, 200e-6, 10}, Row{10, 300e-6, 45}, Row{15, 300e-6, 105},
                         Row{20, 300e-6, 190}}) {
    CAPTURE(row.ions);
    const Chain chain = standard_chain(row.ions);
    const Eigen::MatrixXd eta = standard_eta(chain);
    for (const Shape shape : {Shape::ramps, Shape::steps}) {
      const LightLimits limits{{shape, std::max(4 * row.ions, 12), Robust::none}, {row.duration}, {}, 800e3};
      std::vector<std::pair<int, int>> pairs;
      for (int a = 0; a < row.ions; ++a)
        for (int b = a + 1; b < row.ions; ++b) pairs.emplace_back(a, b);
      const FoundLight found = find_light(chain, eta, limits, {}, pairs, 2);
      int reached = 0;
      double worst_residual = 0, worst_angle = 0;
      for (const auto& lit : found.light) {
        if (!lit) continue;
        ++reached;
        const Response seen = response(lit->pulse, chain.transverse_hz);
        worst_residual = std::max(worst_residual, residual(seen, eta, lit->a, lit->b));
        const double chi = (lit->turned ? -1 : 1) * weights(eta, lit->a, lit->b).dot(seen.area);
        worst_angle = std::max(worst_angle, std::abs(chi + full_chi));
        CHECK(lit->pulse.peak() <= 800e3);
      }
      CHECK(reached >= row.reachable);
      CHECK(worst_residual <= 1e-24);
      CHECK(worst_angle <= 1e-13);
    }
  }
}

// Source: computed; brute sum over the printed amplitudes, in extended precision.
TEST_CASE("closure holds for the amplitudes as they are given") {
  const Chain chain = standard_chain(5);
  const Eigen::MatrixXd eta = standard_eta(chain);
  const PulseSpace space(chain.transverse_hz, {Shape::steps, 20, Robust::none}, 200e-6, 2.9e6);
  const auto best = space.gentlest(weights(eta, 1, 3), full_chi, 1e6);
  REQUIRE(best);
  const Pulse pulse = space.pulse(best->y);
  const long double two_pi = 2 * std::numbers::pi_v<long double>;
  for (Eigen::Index m = 0; m < 5; ++m) {
    // Steps: int cos(mu t) e^{i w t} between the edges, from the antiderivative.
    std::complex<long double> loop = 0;
    const long double plus = two_pi * (chain.transverse_hz[m] + static_cast<long double>(pulse.detuning));
    const long double minus = two_pi * (chain.transverse_hz[m] - static_cast<long double>(pulse.detuning));
    for (int s = 0; s < 20; ++s) {
      for (const auto& [edge, sign] : {std::pair{s + 1, 1.0L}, std::pair{s, -1.0L}}) {
        const long double t = (static_cast<long double>(edge) / 20 - 0.5L) * pulse.duration;
        const std::complex<long double> i{0, 1};
        loop += sign * two_pi * static_cast<long double>(pulse.rabi[s]) *
                (std::polar(0.5L, plus * t) / (i * plus) + std::polar(0.5L, minus * t) / (i * minus));
      }
    }
    CHECK(std::norm(loop) * eta.row(1).maxCoeff() * eta.row(1).maxCoeff() < 1e-24);
  }
}

TEST_CASE("robust pulses: the slopes vanish, the angle stays") {
  const Chain chain = standard_chain(5);
  const Eigen::MatrixXd eta = standard_eta(chain);
  const Eigen::VectorXd weight = weights(eta, 0, 3);
  double shift[3], angle[3];
  for (const Robust robust : {Robust::none, Robust::motion, Robust::motion_and_angle}) {
    const PulseSpace space(chain.transverse_hz, {Shape::ramps, 32, robust}, 300e-6, 2.953e6);
    const auto best = space.gentlest(weight, full_chi, 1e6);
    REQUIRE(best);
    const Pulse pulse = space.pulse(best->y);
    const auto at = [&](double offset) {
      return response(pulse, (chain.transverse_hz.array() + offset).matrix());
    };
    CHECK(residual(at(0), eta, 0, 3) < 1e-24);
    const auto k = static_cast<std::size_t>(robust);
    shift[k] = residual(at(100), eta, 0, 3);
    angle[k] = std::abs(weight.dot(at(100).area) - weight.dot(at(-100).area));
    // The slopes of the space against differences.
    const double h = 2 * std::numbers::pi;
    const double slope = (weight.dot(at(1).area) - weight.dot(at(-1).area)) / (2 * h);
    CHECK(space.chi_slope(weight, best->y) == doctest::Approx(slope).epsilon(1e-5).scale(1e-5));
    const Eigen::VectorXd squares = ((at(1).loop - at(-1).loop) / (2 * h)).cwiseAbs2();
    CHECK((space.loop_slope_squares(best->y) - squares).cwiseAbs().maxCoeff() <
          1e-5 * squares.maxCoeff() + 1e-14);
  }
  CHECK(shift[1] < 0.1 * shift[0]);
  CHECK(angle[2] < 1e-4);
  CHECK(angle[2] < 0.05 * angle[1]);
}

TEST_CASE("with too few segments for all slopes the closed pulses of smallest slope are taken") {
  const Chain chain = standard_chain(6);
  const Eigen::MatrixXd eta = standard_eta(chain);
  CHECK(can_close({Shape::ramps, 20, Robust::motion}, 6));
  CHECK_FALSE(is_fully_robust({Shape::ramps, 20, Robust::motion}, 6));
  CHECK(is_fully_robust({Shape::ramps, 26, Robust::motion}, 6));
  CHECK_FALSE(can_close({Shape::ramps, 12, Robust::none}, 6));
  double shift[2];
  for (const Robust robust : {Robust::none, Robust::motion}) {
    const PulseSpace space(chain.transverse_hz, {Shape::ramps, 20, robust}, 300e-6, 2.96e6);
    const auto best = space.gentlest(weights(eta, 2, 3), full_chi, 1e7);
    REQUIRE(best);
    const Response seen = response(space.pulse(best->y), (chain.transverse_hz.array() + 50).matrix());
    CHECK(residual(response(space.pulse(best->y), chain.transverse_hz), eta, 2, 3) < 1e-24);
    // A gentler light moves less, too: compare at equal power.
    shift[static_cast<std::size_t>(robust)] = residual(seen, eta, 2, 3) / best->y.squaredNorm();
  }
  CHECK(shift[1] < shift[0]);
}

TEST_CASE("the peak limit is kept and costs power") {
  const Chain chain = standard_chain(5);
  const Eigen::MatrixXd eta = standard_eta(chain);
  const PulseSpace space(chain.transverse_hz, {Shape::steps, 20, Robust::none}, 300e-6, 2.871864e6);
  const Eigen::VectorXd weight = weights(eta, 1, 2);
  const auto free = space.gentlest(weight, full_chi, 1e9);
  REQUIRE(free);
  const double peak = space.pulse(free->y).peak();
  const auto limited = space.gentlest(weight, full_chi, 0.9 * peak);
  REQUIRE(limited);
  CHECK(space.pulse(limited->y).peak() <= 0.9 * peak);
  CHECK(limited->y.norm() > free->y.norm());
  CHECK(limited->y.norm() < 1.1 * free->y.norm());
  CHECK(std::abs(std::abs(limited->chi) - full_chi) < 1e-12);
  CHECK_FALSE(space.gentlest(weight, full_chi, 0.3 * peak));
}

TEST_CASE("the search takes the shortest time, leaves out what cannot be, and does not depend on company") {
  const Chain chain = standard_chain(6);
  const Eigen::MatrixXd eta = standard_eta(chain);
  const Noise noise{100, 20, 0.1, 1, 0, 0};
  LightLimits limits{{Shape::ramps, 30, Robust::motion}, {60e-6, 100e-6, 200e-6}, {}, 130e3};
  std::vector<std::pair<int, int>> pairs;
  for (int a = 0; a < 6; ++a)
    for (int b = a + 1; b < 6; ++b) pairs.emplace_back(a, b);
  double last = 0;
  const FoundLight all = find_light(chain, eta, limits, noise, pairs, 2, [&](double part) {
    CHECK(part <= 1);
    last = std::max(last, part);
  });
  CHECK(last == 1);
  for (std::size_t k = 0; k < pairs.size(); ++k) {
    const auto& lit = all.light[k];
    if (!lit) continue;
    CHECK(lit->pulse.peak() <= 130e3);
    // The mirrored pair has the same light.
    const auto mirror = std::pair{5 - lit->b, 5 - lit->a};
    for (std::size_t l = 0; l < pairs.size(); ++l)
      if (std::pair{Eigen::Index(pairs[l].first), Eigen::Index(pairs[l].second)} == mirror)
        CHECK(all.light[l]->pulse.rabi == lit->pulse.rabi);
  }
  // Whoever has a longer time cannot do with a shorter one.
  LightLimits shorter = limits;
  shorter.durations = {60e-6, 100e-6};
  const FoundLight hasty = find_light(chain, eta, shorter, noise, pairs, 2);
  for (std::size_t k = 0; k < pairs.size(); ++k)
    CHECK(hasty.light[k].has_value() == (all.light[k] && all.light[k]->pulse.duration < 150e-6));
  const FoundLight alone = find_light(chain, eta, limits, noise, {{1, 3}}, 1);
  const auto& together = all.light[6];  // (0,1) to (0,5), (1,2), (1,3)
  REQUIRE(alone.light[0].has_value() == together.has_value());
  if (together) CHECK(alone.light[0]->pulse.rabi == together->pulse.rabi);

  limits.peak_hz = 20e3;
  const FoundLight none = find_light(chain, eta, limits, noise, {{2, 3}}, 1);
  CHECK_FALSE(none.light[0]);
  CHECK(none.least_rms_hz > 20e3);
}
