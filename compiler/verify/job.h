// What the methods of comparing share: the two circuits, what is to be kept, and what was measured.
#pragma once

#include <algorithm>
#include <array>
#include <random>
#include <span>
#include <vector>

#include "verify/equivalence.h"
#include "verify/state.h"

namespace isinglass {

struct Job {
  const Circuit& source;
  const Circuit& compiled;
  const Promise& promise;
  const CheckOptions& options;
};

/// Values of the inputs, by their index in either circuit; equal where the names are equal.
struct InputValues {
  std::vector<double> source;
  std::vector<double> compiled;
};

/// What one comparison measured; the largest values over all that were made.
struct Deviation {
  double distance = 0;    // norm of the difference of the states
  double infidelity = 0;  // 1 - |overlap|^2; for programs between the distributions as well
  double cut = 0;         // weight of runs that were left out

  void include(const Deviation& other) {
    distance = std::max(distance, other.distance);
    infidelity = std::max(infidelity, other.infidelity);
    cut = std::max(cut, other.cut);
  }
};

/// One Haar-random state a qubit.
std::vector<std::array<Amplitude, 2>> random_product(std::uint32_t qubits, std::mt19937_64& engine);

}  // namespace isinglass
