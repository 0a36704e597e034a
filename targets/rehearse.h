// The rehearsal: the timed program run in simulation with the errors of the same model that the totals are
// estimated from, so that one sees what the answer looks like on the machine, and whether the estimate holds.
#pragma once

#include <cstdint>
#include <functional>
#include <string>
#include <string_view>
#include <vector>

#include "targets/schedule.h"

namespace isinglass {

struct RehearseOptions {
  std::size_t shots = 1000;
  std::uint64_t seed = 1;  // same seed, same result, whatever the number of threads
  unsigned threads = 1;
  std::vector<double> inputs;            // values of the declared inputs, in their order
  std::function<void(double)> progress;  // told the share that is done, from one thread at a time
  std::uint32_t most_density_wires = 8;  // density matrices up to here, else trajectories
  std::uint32_t most_wires = 22;         // beyond: refused
};

/// One value of the program's bits: "c=0110" (bit 0 last), several variables with blanks in between.
struct RehearsedOutcome {
  std::string bits;
  double without_noise = 0;
  double with_noise = 0;
};

struct Rehearsal {
  enum class Method : std::uint8_t { density_matrix, trajectories };
  Method method = Method::trajectories;
  std::size_t shots = 0;  // of trajectories; 0 where the result is exact

  double estimate = 0;  // Totals::success, beside which the next two stand
  /// Trajectories: share of the shots in which no error happened, and its standard deviation; else negative.
  double no_error = -1;
  double no_error_deviation = 0;
  /// Programs without measurement: fidelity of the final state, or for a fragment (any input) the
  /// entanglement fidelity of the whole; and its standard deviation. Negative where qubits are measured.
  double fidelity = -1;
  double fidelity_deviation = 0;

  /// The likeliest first (without noise, then with); all that occurred.
  std::vector<RehearsedOutcome> outcomes;
  double distance = 0;  // total variation distance of the two distributions
};

std::string_view name(Rehearsal::Method method);

/// What the model, and so the rehearsal, leaves out; sentences for people.
std::string_view left_out_by_the_model();

/// Errors as in the totals: Paulis at random after r and xx, flips of preparation, reset and readout, phase
/// flips while waiting, leaked light as a turn by pi with the probability of its angle. Throws Failure: usage
/// when inputs lack values, target_cannot when the program has more ions than a simulation can hold;
/// Unsupported (see verify/memory.h) for classical code that cannot be run here.
Rehearsal rehearse(const Placed& placed, const Timed& timed, const Target& target, const Promise& promise,
                   const RehearseOptions& options);

}  // namespace isinglass
