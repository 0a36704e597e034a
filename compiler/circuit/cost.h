// What operations cost, as far as passes need to know: the target's error model in a handful of numbers.
// Passes compare candidates with it; the exact estimate after placement is the targets room's.
#pragma once

#include <cmath>

#include "circuit/circuit.h"

namespace isinglass {

/// Error probabilities, as plain fractions, of the average ion and pair of the target.
struct Cost {
  double pulse = 2e-4;              // one r pulse
  double interaction_floor = 1e-3;  // an xx of vanishing angle
  double interaction_slope = 4e-3;  // added per unit of angle (pi/2)
  double idle_per_us = 1e-6;        // dephasing of a waiting ion
  double interaction_us = 200;
  double pulse_us = 5;

  /// theta in radians, |theta| <= pi/2; a symbolic angle counts as pi/2.
  double interaction(double theta) const {
    return interaction_floor + interaction_slope * std::abs(theta) / (pi / 2);
  }
};

/// The figures of merit of a lowered circuit: counts, and the error estimate that decides between candidates.
struct Tally {
  std::size_t xx = 0;
  double xx_units = 0;  // sum of theta / (pi/2); a symbolic angle counts 1
  std::size_t r = 0;
  double error = 0;  // sum of the operations' errors under the Cost
};

/// Counts native operations of all blocks (each block once).
Tally tally_of(const Circuit& circuit, const Cost& cost = {});

}  // namespace isinglass
