// The sources are small and taken to add. Motion and drift use the exact fidelity of displaced oscillators,
// drift averaged over its normal distribution; the rest are leading orders.
#include "targets/error_model.h"

#include <array>
#include <cmath>
#include <complex>
#include <numbers>

namespace isinglass {
namespace {

using Complex = std::complex<double>;
using std::numbers::pi;

// Gauss-Hermite rule of 9 points for a normal distribution of width 1: the middle and four of each side.
struct NormalPoint {
  double at;
  double weight;
};
constexpr std::array<NormalPoint, 5> normal_rule{{{0.0, 0.40634920634920635},
                                                  {1.0232556637891326, 0.24409750289493909},
                                                  {2.0768479786778302, 0.049916406765217877},
                                                  {3.2054290028564703, 0.0027891413212317701},
                                                  {4.5127458633997826, 2.2345844007746580e-05}}};

double sign_of(const LitPair& lit) {
  return lit.turned ? -1 : 1;
}

Eigen::VectorXd weights(const Eigen::MatrixXd& eta, Eigen::Index a, Eigen::Index b) {
  return eta.row(a).cwiseProduct(eta.row(b)).transpose();
}

Pulse scaled(Pulse pulse, double factor) {
  pulse.rabi *= factor;
  return pulse;
}

// Process infidelity of motion and angle when all modes are shifted by `offset`.
double motion_error(const LitPair& lit, double theta, const Eigen::VectorXd& mode_hz,
                    const Eigen::MatrixXd& eta, double mean_phonons, double offset) {
  const Response seen = response(lit.pulse, (mode_hz.array() + offset).matrix());
  Eigen::Matrix2Xcd alpha(2, mode_hz.size());
  const Complex minus_i{0, -1};
  for (Eigen::Index m = 0; m < mode_hz.size(); ++m) {
    alpha(0, m) = minus_i * eta(lit.a, m) * seen.loop[m];
    alpha(1, m) = minus_i * eta(lit.b, m) * seen.loop[m] * sign_of(lit);
  }
  const double chi = sign_of(lit) * weights(eta, lit.a, lit.b).dot(seen.area);
  return 1 - entanglement_fidelity(alpha, chi + theta / 2, mean_phonons);
}

double drift_error(const LitPair& lit, double theta, const Eigen::VectorXd& mode_hz,
                   const Eigen::MatrixXd& eta, const Noise& noise, double motion) {
  if (noise.mode_drift_hz == 0) return 0;
  double mean = 0;
  for (const auto [at, weight] : normal_rule) {
    if (at == 0) {
      mean += weight * motion;
      continue;
    }
    for (const double side : {-1.0, 1.0})
      mean += weight *
              motion_error(lit, theta, mode_hz, eta, noise.mean_phonons, side * at * noise.mode_drift_hz);
  }
  return mean - motion;
}

double heating_error(const LitPair& lit, const Eigen::VectorXd& mode_hz, const Eigen::MatrixXd& eta,
                     const Noise& noise) {
  if (noise.heating_per_s == 0) return 0;
  const Eigen::VectorXd squares = (eta.row(lit.a).cwiseAbs2() + eta.row(lit.b).cwiseAbs2()).transpose();
  return 2 * noise.heating_per_s * squares.dot(excursion(lit.pulse, mode_hz));
}

// By parts, int Omega(t) cos(mu t) dt is a sum over the jumps of Omega (over mu) and of its slope (over
// mu^2). The jumps are taken to add in square, because the interaction turns the carrier's axis between them.
double carrier_error(const Pulse& pulse) {
  const double mu = 2 * pi * pulse.detuning;
  const Eigen::Index values = pulse.rabi.size();
  const Eigen::VectorXd omega = 2 * pi * pulse.rabi;
  double sum = 0;
  if (pulse.shape == Shape::steps) {
    const double h = pulse.duration / double(values);
    for (Eigen::Index k = 0; k <= values; ++k) {
      const double jump = (k < values ? omega[k] : 0) - (k > 0 ? omega[k - 1] : 0);
      sum += std::pow(jump / mu * std::sin(mu * (double(k) * h - pulse.duration / 2)), 2);
    }
  } else {
    const double h = pulse.duration / double(values - 1);
    for (Eigen::Index k = 0; k < values; ++k) {
      const double after = k + 1 < values ? (omega[k + 1] - omega[k]) / h : 0;
      const double before = k > 0 ? (omega[k] - omega[k - 1]) / h : 0;
      sum += std::pow((after - before) / (mu * mu) * std::cos(mu * (double(k) * h - pulse.duration / 2)), 2);
    }
  }
  return 2 * sum;  // both ions
}

// A neighbour k of a lit ion sees crosstalk * Omega, so that ion i and k interact by crosstalk * chi_ik.
double crosstalk_error(const LitPair& lit, const Eigen::VectorXd& mode_hz, const Eigen::MatrixXd& eta,
                       const Noise& noise) {
  if (noise.crosstalk == 0) return 0;
  const Response seen = response(lit.pulse, mode_hz);
  double sum = 0;
  for (const Eigen::Index lit_ion : {lit.a, lit.b}) {
    for (const Eigen::Index k : {lit_ion - 1, lit_ion + 1}) {
      if (k < 0 || k >= eta.rows() || k == lit.a || k == lit.b) continue;
      for (const Eigen::Index partner : {lit.a, lit.b}) {
        const double chi = noise.crosstalk * weights(eta, partner, k).dot(seen.area);
        sum += std::pow(std::sin(chi), 2);
      }
    }
  }
  return sum;
}

}  // namespace

double ErrorBudget::total() const {
  return motion + drift + heating + scattering + dephasing + carrier + crosstalk;
}

double entanglement_fidelity(const Eigen::Matrix2Xcd& alpha, double chi_error, double mean_phonons) {
  Complex sum = 0;
  for (int one = 0; one < 4; ++one) {
    for (int two = 0; two < 4; ++two) {
      const double s1 = one & 1 ? -1 : 1, s2 = one & 2 ? -1 : 1;
      const double t1 = two & 1 ? -1 : 1, t2 = two & 2 ? -1 : 1;
      Complex exponent{0, chi_error * (s1 * s2 - t1 * t2)};
      for (Eigen::Index m = 0; m < alpha.cols(); ++m) {
        const Complex first = s1 * alpha(0, m) + s2 * alpha(1, m);
        const Complex second = t1 * alpha(0, m) + t2 * alpha(1, m);
        exponent +=
            Complex{-std::norm(first - second) * (mean_phonons + 0.5), (std::conj(second) * first).imag()};
      }
      sum += std::exp(exponent);
    }
  }
  return sum.real() / 16;
}

ErrorBudget error_budget(const LitPair& lit, double theta, const Eigen::VectorXd& mode_hz,
                         const Eigen::MatrixXd& eta, const Noise& noise) {
  ErrorBudget budget;
  budget.motion = motion_error(lit, theta, mode_hz, eta, noise.mean_phonons, 0);
  budget.drift = drift_error(lit, theta, mode_hz, eta, noise, budget.motion);
  budget.heating = heating_error(lit, mode_hz, eta, noise);
  // Two tones on two ions.
  budget.scattering = 4 * noise.scattering_per_pi_pulse * 2 * lit.pulse.mean_absolute() * lit.pulse.duration;
  if (noise.t2_s > 0) {
    const double flip = -std::expm1(-lit.pulse.duration / noise.t2_s) / 2;
    budget.dephasing = 1 - (1 - flip) * (1 - flip);
  }
  budget.carrier = carrier_error(lit.pulse);
  budget.crosstalk = crosstalk_error(lit, mode_hz, eta, noise);
  return budget;
}

ErrorLaw error_law(const LitPair& full, const Eigen::VectorXd& mode_hz, const Eigen::MatrixXd& eta,
                   const Noise& noise) {
  constexpr double part = 0.25;  // drift is fitted at a full and at a quarter interaction
  Noise quiet = noise;
  quiet.crosstalk = 0;
  const ErrorBudget whole = error_budget(full, pi / 2, mode_hz, eta, quiet);
  LitPair quarter = full;
  quarter.pulse = scaled(full.pulse, std::sqrt(part));
  const ErrorBudget small = error_budget(quarter, part * pi / 2, mode_hz, eta, quiet);
  // drift = slope s + square s^2 through both points.
  const double square = std::max(0.0, (whole.drift - small.drift / part) / (1 - part));
  const double slope = whole.drift - square;
  return {whole.dephasing, whole.scattering, whole.motion + whole.heating + whole.carrier + slope, square};
}

}  // namespace isinglass
