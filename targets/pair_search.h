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

/// Free amplitudes that the form leaves after every condition of a chain of `ions`; below 1 nothing can be
/// reached.
int freedom(const LightForm& form, int ions);

/// Called now and then with the part done, 0 to 1; from any thread, one call at a time.
using Progress = std::function<void(double)>;

/// What was found for the pairs, in their order.
struct FoundLight {
  std::vector<std::optional<LitPair>> light;  // for a full interaction, theta = pi/2; empty = not reachable
  double least_peak_hz =
      0;  // the lowest peak that the reachable or nearly reachable pairs ask for; 0 when unknown
};

/// Finds them on `threads` threads. The result depends neither on the number of threads nor on which other
/// pairs are asked for.
FoundLight find_light(const Chain& chain, const Eigen::MatrixXd& eta, const LightLimits& limits,
                      const Noise& noise, const std::vector<std::pair<int, int>>& pairs, int threads,
                      const Progress& progress = {});

}  // namespace isinglass
