#include "targets/global_drive.h"

#include <cmath>
#include <numbers>

namespace isinglass {

using std::numbers::pi;

Eigen::MatrixXd drive_couplings(const Chain& chain, double wave_number_difference, double detuning_hz,
                                double rabi_hz) {
  const double mass = chain.trap.species.mass_u * si::atomic_mass_unit;
  const double recoil = si::hbar * wave_number_difference * wave_number_difference / (2 * mass);
  const double omega = 2 * pi * rabi_hz;
  Eigen::VectorXd reach(chain.ions());
  for (Eigen::Index m = 0; m < reach.size(); ++m) {
    const double apart = detuning_hz - chain.transverse_hz[m];
    if (std::abs(apart) < 1e-9 * detuning_hz)
      throw std::domain_error("the drive sits on a mode of the chain");
    reach[m] = 1 / (4 * pi * pi * apart * (detuning_hz + chain.transverse_hz[m]));
  }
  const auto& b = chain.transverse_vectors;
  Eigen::MatrixXd couplings = omega * omega * recoil / (2 * pi) * (b * reach.asDiagonal() * b.transpose());
  couplings.diagonal().setZero();
  return couplings;
}

std::optional<double> range_exponent(const Eigen::MatrixXd& couplings) {
  const Eigen::Index ions = couplings.rows();
  if (ions < 3) return std::nullopt;
  const double sign = couplings(0, 1) > 0 ? 1 : -1;
  double weight = 0, mean_x = 0, mean_y = 0, xx = 0, xy = 0;
  for (Eigen::Index i = 0; i < ions; ++i) {
    for (Eigen::Index k = i + 1; k < ions; ++k) {
      const double strength = sign * couplings(i, k);
      if (!(strength > 0)) return std::nullopt;
      const double w = 1 / double(ions - (k - i));  // pairs at this distance
      const double x = std::log(double(k - i)), y = std::log(strength);
      weight += w;
      mean_x += w * x;
      mean_y += w * y;
      xx += w * x * x;
      xy += w * x * y;
    }
  }
  return -(xy - mean_x * mean_y / weight) / (xx - mean_x * mean_x / weight);
}

}  // namespace isinglass
