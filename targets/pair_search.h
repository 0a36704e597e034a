// The light for every pair of a chain: for each the shortest allowed time that the peak limit permits, and in
// that time the detuning and pulse of least error.
#pragma once

#include <functional>
#include <optional>
#include <utility>
#include <vector>

#include "targets/chain.h"
#include "targets/error_model.h"
#include "targets/pulses.h"

namespace isinglass {

/// What the light can do.
struct LightLimits {
  LightForm form;
  std::vector<double> durations;   // s, ascending
  std::optional<double> detuning;  // Hz; without it the best is sought
  double peak_hz = 0;              // highest |rabi|
};

/// Whether the segments suffice to close the paths of all modes of a chain.
bool can_close(const LightForm& form, int ions);
/// Whether they suffice for all slopes, too, when the form asks for robustness.
bool is_fully_robust(const LightForm& form, int ions);

/// Called now and then with the part done, 0 to 1; from any thread, one call at a time.
using ReportProgress = std::function<void(double)>;

/// What was found for the pairs, in their order.
struct FoundLight {
  std::vector<std::optional<LitPair>> light;  // for a full interaction, theta = pi/2; empty = not reachable
  // The lowest rms amplitude that any pair without light needs in the longest time; 0 when all have light.
  double least_rms_hz = 0;
};

/// Finds them on `threads` threads. The result depends neither on the number of threads nor on which other
/// pairs are asked for.
FoundLight find_light(const Chain& chain, const Eigen::MatrixXd& eta, const LightLimits& limits,
                      const Noise& noise, const std::vector<std::pair<int, int>>& pairs, int threads,
                      const ReportProgress& progress = {});

}  // namespace isinglass
