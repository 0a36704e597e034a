// The least power under a peak limit, against a search of all directions.
#include "targets/peak_limit.h"

#include <doctest/doctest.h>

#include <cmath>
#include <limits>
#include <numbers>
#include <random>

using namespace isinglass;

namespace {

PeakProblem random_problem(int seed, bool with_still) {
  std::mt19937 random(static_cast<unsigned>(seed));
  std::normal_distribution<double> normal;
  const auto noise = [&] { return normal(random); };
  PeakProblem problem{
      Eigen::MatrixXd::NullaryExpr(7, 3, noise), Eigen::MatrixXd::NullaryExpr(3, 3, noise), {}, 2, 0};
  // Orthonormal columns: |y| is the root mean square of the heights.
  problem.knots = std::sqrt(7.0) * Eigen::MatrixXd(problem.knots.householderQr().householderQ()).leftCols(3);
  problem.form += problem.form.transpose().eval();
  if (with_still) {
    problem.still = Eigen::MatrixXd::NullaryExpr(3, 3, noise);
    problem.still += problem.still.transpose().eval();
    problem.still.diagonal().array() -= problem.still.trace() / 3;  // of both signs: it can vanish
  }
  return problem;
}

// The y in the direction of u that reaches the angle.
Eigen::VectorXd reaching(const PeakProblem& problem, const Eigen::VectorXd& u) {
  return u * std::sqrt(problem.chi / std::abs(u.dot(problem.form * u)));
}

double peak(const PeakProblem& problem, const Eigen::VectorXd& y) {
  return (problem.knots * y).cwiseAbs().maxCoeff();
}

// The least norm over a fine grid of directions; without a limit when it is 0.
double least_norm(const PeakProblem& problem) {
  constexpr int steps = 150;
  double least = std::numeric_limits<double>::infinity();
  for (int i = 0; i <= steps; ++i) {
    const double height = double(i) / steps;  // half the sphere: y and -y are alike
    double before = 0;
    for (int k = 0; k <= 4 * steps; ++k) {
      const double turn = 2 * std::numbers::pi * k / (4 * steps), part = std::sqrt(1 - height * height);
      const Eigen::Vector3d u(part * std::cos(turn), part * std::sin(turn), height);
      const double still = problem.still.size() > 0 ? u.dot(problem.still * u) : 0;
      const bool allowed = problem.still.size() == 0 || (k > 0 && still * before <= 0);
      before = still;
      if (!allowed) continue;
      const Eigen::VectorXd y = reaching(problem, u);
      if (problem.limit > 0 && peak(problem, y) > problem.limit) continue;
      least = std::min(least, y.norm());
    }
  }
  return least;
}

Eigen::VectorXd free_best(const PeakProblem& problem) {
  return reaching(problem, problem.still.size() > 0 ? largest_where_still(problem.form, problem.still).y
                                                    : largest(problem.form).y);
}

}  // namespace

// Source: computed (all directions of a fine grid).
TEST_CASE("the gentlest pulse under a peak limit is the best of all directions") {
  int tight = 0, missed = 0;
  for (const bool with_still : {false, true}) {
    for (int seed = 1; seed <= 60; ++seed) {
      CAPTURE(with_still);
      CAPTURE(seed);
      PeakProblem problem = random_problem(seed, with_still);
      const Eigen::VectorXd free = free_best(problem);
      CHECK(free.norm() == doctest::Approx(least_norm(problem)).epsilon(0.02));
      for (const double part : {0.97, 0.9, 0.8}) {
        problem.limit = part * peak(problem, free);
        const double least = least_norm(problem);
        if (std::isinf(least)) continue;
        ++tight;
        const auto found = gentlest_under_peak(problem, free);
        if (!found) {
          ++missed;
          continue;
        }
        CHECK(peak(problem, *found) <= problem.limit);
        CHECK(std::abs(found->dot(problem.form * *found)) == doctest::Approx(problem.chi));
        if (with_still) CHECK(std::abs(found->dot(problem.still * *found)) < 1e-5 * found->squaredNorm());
        if (found->norm() > 1.02 * least) ++missed;
      }
    }
  }
  CHECK(tight > 100);
  // The problem is not convex: now and then a local minimum is all that is found.
  CHECK(missed < tight / 10);
}
