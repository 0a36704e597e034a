// The pulse of least power that reaches an angle under a limit of its peak.
//
// In the coordinates y of a PulseSpace: least |y|^2 with |y^T form y| = chi, |knots y| <= limit everywhere
// and, when asked, y^T still y = 0. Neither the forms nor the problem are convex.
#pragma once

#include <Eigen/Dense>
#include <optional>

namespace isinglass {

struct PeakProblem {
  Eigen::MatrixXd knots;  // heights at all knots or steps for a y, rad/s; the largest is at least |y|
  Eigen::MatrixXd form;   // symmetric: y^T form y is the signed angle
  Eigen::MatrixXd still;  // symmetric, or of no size: y^T still y must vanish
  double chi = 0;         // > 0
  double limit = 0;       // rad/s
};

/// The extreme eigenvector of a symmetric form, of unit length, and the eigenvalue of largest size.
struct Extreme {
  Eigen::VectorXd y;
  double value = 0;
};
Extreme largest(const Eigen::MatrixXd& form);
/// The same among unit vectors with y^T still y = 0, within 1 %; value is 0 when there is none.
Extreme largest_where_still(const Eigen::MatrixXd& form, const Eigen::MatrixXd& still);

/// A y that satisfies all conditions, its power a local minimum; empty when none was found. `free` is the y
/// of least power without the peak limit.
std::optional<Eigen::VectorXd> gentlest_under_peak(const PeakProblem& problem, const Eigen::VectorXd& free);

}  // namespace isinglass
