// The couplings that two tones give when they light the whole chain at once, far from every mode.
#pragma once

#include <Eigen/Dense>
#include <optional>

#include "targets/chain.h"

namespace isinglass {

/// J_ij / 2 pi in Hz, zero on the diagonal: J_ij = Omega^2 (hbar dk^2 / 2M) sum_m b_im b_jm / (mu^2 - w_m^2)
/// with Omega = 2 pi rabi_hz and mu = 2 pi detuning_hz; chi grows as -J t. Throws std::domain_error when the
/// drive sits on a mode.
Eigen::MatrixXd drive_couplings(const Chain& chain, double wave_number_difference, double detuning_hz,
                                double rabi_hz);

/// The exponent a of J0 / |i - j|^a fitted to all pairs (least squares of the logarithms, each distance
/// weighing as much as any other); empty when there are fewer than two distances or the couplings have no
/// common sign.
std::optional<double> range_exponent(const Eigen::MatrixXd& couplings);

}  // namespace isinglass
