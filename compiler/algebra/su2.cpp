// Euler forms of one-qubit unitaries; see su2.h.
#include "algebra/su2.h"

#include <cmath>
#include <numbers>

namespace isinglass {

namespace {

constexpr double pi = std::numbers::pi;

/// x in [-2 pi, 2 pi] brought into (-pi, pi].
double folded(double x) {
  if (x > pi) return x - 2 * pi;
  if (x <= -pi) return x + 2 * pi;
  return x;
}

}  // namespace

Su2 rotation(const Axis& n, double theta) {
  const double s = std::sin(theta / 2);
  return {std::cos(theta / 2), s * n.x(), s * n.y(), s * n.z()};
}

Su2 rotation_x(double theta) {
  return {std::cos(theta / 2), std::sin(theta / 2), 0, 0};
}

Su2 rotation_y(double theta) {
  return {std::cos(theta / 2), 0, std::sin(theta / 2), 0};
}

Su2 rotation_z(double theta) {
  return {std::cos(theta / 2), 0, 0, std::sin(theta / 2)};
}

Su2 rotation_xy(double theta, double phi) {
  const double s = std::sin(theta / 2);
  return {std::cos(theta / 2), s * std::cos(phi), s * std::sin(phi), 0};
}

Axis equatorial(double phi) {
  return {std::cos(phi), std::sin(phi), 0};
}

Matrix2 matrix_of(const Su2& q) {
  Matrix2 m;
  m << Complex(q.w(), -q.z()), Complex(-q.y(), -q.x()), Complex(q.y(), -q.x()), Complex(q.w(), q.z());
  return m;
}

PhasedSu2 su2_of(const Matrix2& u) {
  const Complex determinant = u(0, 0) * u(1, 1) - u(0, 1) * u(1, 0);
  const double phase = std::arg(determinant) / 2;
  const Matrix2 s = u * std::polar(1.0, -phase);
  // The average over the entries that unitarity makes equal evens rounding out.
  Su2 q((s(0, 0) + s(1, 1)).real() / 2, -(s(0, 1) + s(1, 0)).imag() / 2, (s(1, 0) - s(0, 1)).real() / 2,
        (s(1, 1) - s(0, 0)).imag() / 2);
  return {phase, q.normalized()};
}

// rz(alpha) r(theta, phi) = (cos(theta/2) cos(alpha/2); sin(theta/2) cos(phi + alpha/2),
//                            sin(theta/2) sin(phi + alpha/2), cos(theta/2) sin(alpha/2)).
PulseForm pulse_form(const Su2& q) {
  constexpr double tiny = 1e-15;
  const double across = std::hypot(q.x(), q.y());
  const double along = std::hypot(q.w(), q.z());
  PulseForm form;
  form.theta = 2 * std::atan2(across, along);
  const double half = along > tiny ? std::atan2(q.z(), q.w()) : 0.0;  // alpha / 2
  form.alpha = folded(2 * half);
  form.phi = across > tiny ? folded(std::atan2(q.y(), q.x()) - half) : 0.0;
  return form;
}

AxisAngle axis_angle(const Su2& q) {
  const double length = q.vec().norm();
  if (length < 1e-300) return {Axis::UnitZ(), q.w() < 0 ? 2 * pi : 0.0};
  return {q.vec() / length, 2 * std::atan2(length, q.w())};
}

}  // namespace isinglass
