// First every knot gets a price; knots above the limit are made dearer until none is left. With prices the
// problem is an eigenvalue problem again, the prices are the multipliers of the peak conditions, and each
// round bounds the power that any pulse needs. Where that does not arrive (the best pulse need not be an
// extreme eigenvector) an augmented Lagrangian with Newton steps goes on from the best rounds: J. Nocedal, S.
// J. Wright, Numerical Optimization, chapter 17 (from memory).
#include "targets/peak_limit.h"

#include <algorithm>
#include <array>
#include <cmath>
#include <limits>
#include <utility>
#include <vector>

namespace isinglass {
namespace {

// Ascending.
Eigen::VectorXd eigenvalues(const Eigen::MatrixXd& form) {
  return Eigen::SelfAdjointEigenSolver<Eigen::MatrixXd>(form, Eigen::EigenvaluesOnly).eigenvalues();
}

// A unit eigenvector of an eigenvalue known to rounding, by inverse iteration: a fraction of the work of
// finding all of them.
Extreme eigenvector(const Eigen::MatrixXd& form, double value) {
  const Eigen::Index d = form.rows();
  Eigen::MatrixXd shifted = form;
  shifted.diagonal().array() -= value + 1e-13 * form.norm();
  const Eigen::PartialPivLU<Eigen::MatrixXd> factors(shifted);
  Eigen::VectorXd y = Eigen::VectorXd::LinSpaced(d, 1, 2).normalized();
  for (int step = 0; step < 3; ++step) y = factors.solve(y).normalized();
  if (y.allFinite()) return {y, y.dot(form * y)};
  const Eigen::SelfAdjointEigenSolver<Eigen::MatrixXd> whole(form);
  Eigen::Index nearest = 0;
  (whole.eigenvalues().array() - value).abs().minCoeff(&nearest);
  return {whole.eigenvectors().col(nearest), whole.eigenvalues()[nearest]};
}

double value(const Eigen::MatrixXd& form, const Eigen::VectorXd& y) {
  return y.dot(form * y);
}

// The unit combination of two vectors on which `form`, of opposite signs on them, vanishes.
Eigen::VectorXd balanced(const Eigen::MatrixXd& form, const Eigen::VectorXd& plus,
                         const Eigen::VectorXd& minus) {
  const double a = value(form, plus), c = value(form, minus), b = plus.dot(form * minus);
  // a + 2 b t + c t^2 = 0 with a >= 0 >= c.
  const double root = std::sqrt(b * b - a * c);
  const double t = c == 0 ? 0 : (-b - root) / c;
  return (plus + t * minus).normalized();
}

// max y^T form y over unit y with y^T zero y = 0, by its dual: the least of max eigenvalue(form - x zero)
// over x, a convex function whose slope is minus y^T zero y. The value is 0 when there is no such y.
Extreme largest_with_zero(const Eigen::MatrixXd& form, const Eigen::MatrixXd& zero) {
  struct Point {
    double x = 0, slope = 0, bound = 0;
    Eigen::VectorXd y;
  };
  const auto at = [&](double x) {
    const Eigen::MatrixXd tilted = form - x * zero;
    const double bound = eigenvalues(tilted)[form.rows() - 1];
    Point point{x, 0, bound, eigenvector(tilted, bound).y};
    point.slope = value(zero, point.y);
    return point;
  };
  Point low = at(0);
  Point high = low;
  double reach = form.norm() / zero.norm();
  for (int k = 0; k < 12 && low.slope < 0; ++k, reach *= 3) low = at(-reach);
  for (int k = 0; k < 12 && high.slope > 0; ++k, reach *= 3) high = at(reach);
  if (low.slope < 0 || high.slope > 0) return {low.y, 0};
  Extreme best;
  for (int round = 0; round < 30; ++round) {
    best.y = balanced(zero, low.y, high.y);
    best.value = value(form, best.y);
    if (best.value > 0.995 * std::min(low.bound, high.bound)) break;
    // Where the two tangents meet lies the new point.
    const double gap = high.x - low.x;
    const double meet = (high.bound - low.bound + high.slope * gap) / ((high.slope - low.slope) * gap);
    const double part = std::clamp(std::isfinite(meet) ? meet : 0.5, 0.05, 0.95);
    const Point middle = at(low.x + part * gap);
    (middle.slope >= 0 ? low : high) = middle;
  }
  return best;
}

// Least |u|^2 with u^T form u = 1, |knots u| <= 1 and u^T still u = 0 from a start nearby: a local minimum.
class Descent {
 public:
  Descent(const Eigen::MatrixXd& knots, Eigen::MatrixXd form, Eigen::MatrixXd still)
      : knots_(knots), form_(std::move(form)), still_(std::move(still)) {
    if (still_.size() > 0) still_ *= form_.norm() / still_.norm();
  }

  // Empty when it ends at a point that breaks a condition.
  std::optional<Eigen::VectorXd> from(Eigen::VectorXd u) {
    constexpr int rounds = 25;
    price_ = Eigen::VectorXd::Zero(knots_.rows());
    pull_.fill(0);
    rho_ = 10;
    double broken = std::numeric_limits<double>::infinity();
    for (int round = 0; round < rounds; ++round) {
      const double before = u.squaredNorm();
      settle(u);
      const Terms now = terms(u);
      const double worst = std::max({now.over.maxCoeff(), std::abs(now.angle[0]), std::abs(now.angle[1])});
      if (worst < done && std::abs(u.squaredNorm() - before) < 1e-4) return u;
      price_ = (price_ + rho_ * now.over).cwiseMax(0);
      for (std::size_t k = 0; k < 2; ++k) pull_[k] += rho_ * now.angle[k];
      if (worst > 0.3 * broken) rho_ *= 4;
      broken = worst;
    }
    return broken < done ? std::optional(u) : std::nullopt;
  }

 private:
  static constexpr double done = 1e-7;

  struct Terms {
    Eigen::VectorXd height;       // knots u
    Eigen::VectorXd over;         // height^2 - 1
    Eigen::VectorXd turned[2];    // form u, still u
    std::array<double, 2> angle;  // u^T form u - 1, u^T still u
  };
  Terms terms(const Eigen::VectorXd& u) const {
    Terms t;
    t.height = knots_ * u;
    t.over = t.height.cwiseAbs2().array() - 1;
    t.turned[0] = form_ * u;
    t.angle[0] = u.dot(t.turned[0]) - 1;
    t.angle[1] = 0;
    if (still_.size() > 0) {
      t.turned[1] = still_ * u;
      t.angle[1] = u.dot(t.turned[1]);
    }
    return t;
  }

  double height_of(const Eigen::VectorXd& u, const Terms& t) const {
    double sum = u.squaredNorm() + (price_ + rho_ * t.over).cwiseMax(0).squaredNorm() / (2 * rho_);
    for (std::size_t k = 0; k < 2; ++k) sum += pull_[k] * t.angle[k] + rho_ / 2 * t.angle[k] * t.angle[k];
    return sum;
  }

  // Newton's method on the augmented Lagrangian, kept downhill by a shift of the curvature.
  void settle(Eigen::VectorXd& u) const {
    constexpr int steps = 12;
    double shift = 1e-3;
    Terms now = terms(u);
    double height = height_of(u, now);
    for (int step = 0; step < steps; ++step) {
      const Eigen::VectorXd force = (price_ + rho_ * now.over).cwiseMax(0);
      Eigen::VectorXd slope = 2 * u + 2 * knots_.transpose() * force.cwiseProduct(now.height);
      const Eigen::VectorXd stiffness =
          (force.array() > 0).select(2 * force.array() + 4 * rho_ * now.height.array().square(), 0);
      Eigen::MatrixXd curvature = knots_.transpose() * stiffness.asDiagonal() * knots_;
      curvature.diagonal().array() += 2;
      for (std::size_t k = 0; k < (still_.size() > 0 ? 2u : 1u); ++k) {
        const double pull = pull_[k] + rho_ * now.angle[k];
        slope += 2 * pull * now.turned[k];
        curvature += 2 * pull * (k == 0 ? form_ : still_);
        curvature += 4 * rho_ * now.turned[k] * now.turned[k].transpose();
      }
      if (slope.norm() < 1e-9) return;
      for (;; shift *= 8) {
        Eigen::MatrixXd raised = curvature;
        raised.diagonal().array() += shift;
        const Eigen::LLT<Eigen::MatrixXd> cholesky(raised);
        if (cholesky.info() == Eigen::Success) {
          const Eigen::VectorXd next = u - cholesky.solve(slope);
          const Terms then = terms(next);
          const double lower = height_of(next, then);
          if (lower < height) {
            const bool arrived = height - lower < 1e-12;
            u = next;
            now = then;
            height = lower;
            shift = std::max(shift / 8, 1e-9);
            if (arrived) return;
            break;
          }
        }
        if (shift > 1e8) return;
      }
    }
  }

  const Eigen::MatrixXd& knots_;
  Eigen::MatrixXd form_;
  Eigen::MatrixXd still_;
  Eigen::VectorXd price_;
  std::array<double, 2> pull_{};
  double rho_ = 10;
};

// Rounds of prices, then descents from the best of them.
class PeakSearch {
 public:
  explicit PeakSearch(const PeakProblem& problem) : problem_(problem) {}

  std::optional<Eigen::VectorXd> run(const Eigen::VectorXd& free) {
    if (!price_rounds(free)) return std::nullopt;
    if (!settled_) descend();
    return found_;
  }

 private:
  // False when it is proven that no pulse keeps the limit.
  bool price_rounds(Eigen::VectorXd y) {
    constexpr int rounds = 14;
    constexpr double aim = 0.99;  // of the limit, so that the approach from above ends
    const Eigen::Index d = y.size();
    const auto count = double(problem_.knots.rows());
    Eigen::VectorXd price = Eigen::VectorXd::Ones(problem_.knots.rows());
    for (int round = 0; round < rounds; ++round) {
      const Eigen::VectorXd height = (problem_.knots * y).cwiseAbs() / problem_.limit;
      note(y, height.maxCoeff());
      if (settled_) return true;
      price = (price.array() * (height.array() / aim).square()).max(1);
      const Eigen::VectorXd extra = (price.array() - 1) / count;
      const Eigen::MatrixXd power =
          Eigen::MatrixXd::Identity(d, d) + problem_.knots.transpose() * extra.asDiagonal() * problem_.knots;
      const Eigen::LLT<Eigen::MatrixXd> cholesky(power);
      const Eigen::MatrixXd frame = cholesky.matrixU().solve(Eigen::MatrixXd::Identity(d, d));
      const Eigen::MatrixXd framed = frame.transpose() * problem_.form * frame;
      const Extreme best = problem_.still.size() > 0
                               ? largest_where_still(framed, frame.transpose() * problem_.still * frame)
                               : largest(framed);
      if (best.value == 0) return true;
      y = frame * best.y * std::sqrt(problem_.chi / std::abs(best.value));
      // |y|^2 + sum extra height^2 is at least chi / value for every y that reaches chi, and no height of a
      // good one is above the limit.
      const double limit = problem_.limit * problem_.limit;
      const double least = problem_.chi / std::abs(best.value) * 0.99 - extra.sum() * limit;
      if (least > limit) return false;
    }
    return true;
  }

  void note(const Eigen::VectorXd& y, double highest) {
    if (highest < lowest_height_) {
      lowest_height_ = highest;
      lowest_ = y;
    }
    if (highest > 1) return;
    const double before = found_ ? found_->norm() : std::numeric_limits<double>::infinity();
    if (y.norm() < before) found_ = y;
    settled_ = y.norm() > 0.998 * before;  // easing gains no more
  }

  // From the best of the rounds, and from the strongest pulses of either sign: the problem has local minima.
  void descend() {
    std::vector<Eigen::VectorXd> starts{lowest_};
    if (found_) starts.push_back(*found_);
    const Eigen::SelfAdjointEigenSolver<Eigen::MatrixXd> solver(problem_.form);
    starts.push_back(solver.eigenvectors().leftCols(1));
    starts.push_back(solver.eigenvectors().rightCols(1));
    for (const Eigen::VectorXd& start : starts) descend_from(start);
  }

  void descend_from(const Eigen::VectorXd& start) {
    constexpr double inside = 1 - 1e-6;  // room for rounding
    const double unit = problem_.limit * inside;
    const double reached = start.dot(problem_.form * start);
    const double sign = reached > 0 ? 1 : -1;
    Descent descent(problem_.knots, sign * unit * unit / problem_.chi * problem_.form, problem_.still);
    const auto u = descent.from(start * std::sqrt(problem_.chi / std::abs(reached)) / unit);
    if (!u) return;
    Eigen::VectorXd y = *u * unit;
    y *= std::sqrt(problem_.chi / std::abs(y.dot(problem_.form * y)));
    if ((problem_.knots * y).cwiseAbs().maxCoeff() > problem_.limit) return;
    if (!found_ || y.norm() < found_->norm()) found_ = y;
  }

  const PeakProblem& problem_;
  std::optional<Eigen::VectorXd> found_;
  Eigen::VectorXd lowest_;
  double lowest_height_ = std::numeric_limits<double>::infinity();
  bool settled_ = false;
};

}  // namespace

Extreme largest(const Eigen::MatrixXd& form) {
  const Eigen::VectorXd values = eigenvalues(form);
  const double low = values[0], high = values[values.size() - 1];
  return eigenvector(form, std::abs(low) > std::abs(high) ? low : high);
}

Extreme largest_where_still(const Eigen::MatrixXd& form, const Eigen::MatrixXd& still) {
  const Extreme plus = largest_with_zero(form, still);
  Extreme minus = largest_with_zero(-form, still);
  minus.value = -minus.value;
  return std::abs(minus.value) > plus.value ? minus : plus;
}

std::optional<Eigen::VectorXd> gentlest_under_peak(const PeakProblem& problem, const Eigen::VectorXd& free) {
  return PeakSearch(problem).run(free);
}

}  // namespace isinglass
