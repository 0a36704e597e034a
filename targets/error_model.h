// What an interaction made by light costs in error, split by source. Every figure is a process infidelity 1 -
// Fe: the probability that something went wrong. Formulas and their sources: targets/README.md.
#pragma once

#include <Eigen/Dense>
#include <optional>

#include "targets/pulses.h"

namespace isinglass {

/// What disturbs the interaction.
struct Noise {
  double mode_drift_hz = 0;  // rms offset common to all modes, constant during a gate, normally distributed
  double heating_per_s = 0;  // quanta per second on every mode
  double mean_phonons = 0;   // of every mode at the start
  double t2_s = 0;           // coherence time of an ion; 0 = no dephasing
  double scattering_per_pi_pulse = 0;  // probability that a carrier pi pulse of one tone scatters a photon
  double crosstalk = 0;                // field on the neighbours of a lit ion / field on it
};

/// One pair under light, as far as the errors need to know.
struct LitPair {
  Eigen::Index a = 0;
  Eigen::Index b = 0;
  bool turned = false;  // the light on ion b has its phase turned by pi
  Pulse pulse;
};

struct ErrorBudget {
  double motion = 0;      // paths that do not close at the given temperature, and a wrong angle
  double drift = 0;       // what a common offset of the modes adds
  double heating = 0;     // quanta that arrive during the gate
  double scattering = 0;  // photons scattered by both ions
  double dephasing = 0;   // of both ions during the gate
  double carrier = 0;     // estimate: the off-resonant carrier at steps and kinks of the amplitude
  double crosstalk = 0;   // interactions with the neighbours of both ions
  double total() const;
};

/// The budget of a pulse as it is, meant to reach chi = -theta/2. `eta` rows = ions, columns = modes.
ErrorBudget error_budget(const LitPair& lit, double theta, const Eigen::VectorXd& mode_hz,
                         const Eigen::MatrixXd& eta, const Noise& noise);

/// Error as a function of s = |theta| / (pi/2) when the light of a full interaction is scaled by sqrt(s):
/// floor + root sqrt(s) + slope s + square s^2.
struct ErrorLaw {
  double floor = 0;   // dephasing
  double root = 0;    // scattering
  double slope = 0;   // motion, heating, carrier, and the part of drift that opens the paths
  double square = 0;  // crosstalk, and the part of drift that changes the angle
};

/// The law of the pulse of a full interaction, without crosstalk (which a Target accounts for on its own).
ErrorLaw error_law(const LitPair& full, const Eigen::VectorXd& mode_hz, const Eigen::MatrixXd& eta,
                   const Noise& noise);

/// Entanglement fidelity with exp(i chi0 s s) of a pulse with final displacements alpha (first row ion a,
/// second ion b; a column a mode), angle chi0 + chi_error, and modes at mean_phonons.
double entanglement_fidelity(const Eigen::Matrix2Xcd& alpha, double chi_error, double mean_phonons);

}  // namespace isinglass
