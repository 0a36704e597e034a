// One-qubit unitaries as unit quaternions, and the form the machine performs: a pulse and a frame change.
//
// An element of SU(2) is written q = (w, v) and means w - i (v_x X + v_y Y + v_z Z), so that a rotation by
// theta about the unit vector n is (cos theta/2, n sin theta/2), products of quaternions are products of
// matrices, and q * d turns Bloch vectors: U (d.sigma) U^-1 = (q*d).sigma. q and -q differ by a global phase.
#pragma once

#include <Eigen/Core>
#include <Eigen/Geometry>
#include <complex>

namespace isinglass {

using Complex = std::complex<double>;
using Matrix2 = Eigen::Matrix2cd;
using Matrix4 = Eigen::Matrix4cd;
using Axis = Eigen::Vector3d;  // a unit vector on the Bloch sphere
using Su2 = Eigen::Quaterniond;

/// exp(-i theta/2 n.sigma); n a unit vector, theta in radians.
Su2 rotation(const Axis& n, double theta);
/// exp(-i theta/2 X), and so on.
Su2 rotation_x(double theta);
Su2 rotation_y(double theta);
Su2 rotation_z(double theta);
/// r(theta, phi) = exp(-i theta/2 (cos phi X + sin phi Y)).
Su2 rotation_xy(double theta, double phi);

/// The unit vector (cos phi, sin phi, 0).
Axis equatorial(double phi);

/// The matrix of q, with determinant 1.
Matrix2 matrix_of(const Su2& q);

/// U = e^{i phase} q with q in SU(2); U must be unitary up to rounding (it is normalised).
struct PhasedSu2 {
  double phase = 0;
  Su2 q = Su2::Identity();
};
PhasedSu2 su2_of(const Matrix2& u);

/// q = +- rz(alpha) r(theta, phi), the pulse first in time: theta in [0, pi], phi and alpha in (-pi, pi].
/// Exact at both edges: phi = 0 where theta is 0, alpha = 0 where theta is pi.
struct PulseForm {
  double theta = 0;
  double phi = 0;
  double alpha = 0;
};
PulseForm pulse_form(const Su2& q);

/// q = rotation(axis, angle) with angle in [0, 2 pi], the sign of q kept; axis = +z where the angle is 0.
struct AxisAngle {
  Axis axis = Axis::UnitZ();
  double angle = 0;
};
AxisAngle axis_angle(const Su2& q);

}  // namespace isinglass
