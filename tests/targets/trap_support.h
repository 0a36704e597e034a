// Chains and numerical integration that the tests of the trap share.
#pragma once

#include <cmath>
#include <complex>
#include <numbers>

#include "targets/chain.h"
#include "targets/error_model.h"
#include "targets/pulses.h"

namespace isinglass::support {

/// 171Yb+, 3 MHz transverse, smallest spacing 4.5 um: the settings of the table of attainable light.
inline Chain standard_chain(int ions) {
  Trap trap{*species_named("171Yb+"), ions, 1e3, 0, 3e6};
  if (ions == 1) return solve_chain(trap);
  const double loose = solve_chain(trap).smallest_spacing();
  trap.axial_hz *= std::pow(4.5e-6 / loose, -1.5);
  return solve_chain(trap);
}

/// 355 nm, counter-propagating.
inline Eigen::MatrixXd standard_eta(const Chain& chain) {
  return lamb_dicke(chain, wave_number_difference(355e-9, std::numbers::pi));
}

inline Eigen::VectorXd weights(const Eigen::MatrixXd& eta, Eigen::Index a, Eigen::Index b) {
  return eta.row(a).cwiseProduct(eta.row(b)).transpose();
}

/// Omega(t) cos(mu t) in rad/s with t counted from the middle of the pulse.
inline double drive_at(const Pulse& pulse, double t) {
  return 2 * std::numbers::pi * pulse.at(t + pulse.duration / 2) *
         std::cos(2 * std::numbers::pi * pulse.detuning * t);
}

/// sum of |alpha|^2 over both ions and all modes.
inline double residual(const Response& seen, const Eigen::MatrixXd& eta, Eigen::Index a, Eigen::Index b) {
  return (eta.row(a).cwiseAbs2() + eta.row(b).cwiseAbs2()).dot(seen.loop.cwiseAbs2().transpose());
}

}  // namespace isinglass::support
