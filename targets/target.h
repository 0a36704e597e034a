// The machine as the compiler sees it: for each ion and each pair what an operation takes and what it costs
// in error, and what can happen at once.
//
// A Target comes from figures of a calibration, or is computed from the trap; afterwards nobody asks which.
// Every error is a probability that something went wrong (the process infidelity 1 - Fe, "total Pauli error";
// see README.md beside this file for the conversion from average infidelities). Times in microseconds.
#pragma once

#include <algorithm>
#include <cmath>
#include <cstdint>
#include <functional>
#include <numbers>
#include <string>
#include <vector>

#include "circuit/cost.h"

namespace isinglass {

/// A number as it was stated or computed, with one standard deviation. Figures with the same `origin` come
/// from one statement (a default for all ions, say) and are wrong together; 0 means without uncertainty.
struct Figure {
  double value = 0;
  double deviation = 0;
  std::uint32_t origin = 0;
  bool operator==(const Figure&) const = default;
};

/// What happens on one ion alone.
struct IonFigures {
  double prepare_us = 10;
  double pulse_us = 5;  // an r of any angle
  double measure_us = 120;
  double reset_us = 20;
  Figure prepare_error{5e-4};
  Figure pulse_error{2e-4};
  Figure measure_error{3e-3};  // the bit is wrong
  Figure reset_error{5e-4};
  Figure t2_us{1e6};      // coherence time: an ion waiting for t dephases with (1 - exp(-t / T2)) / 2
  bool addressed = true;  // whether light reaches this ion; if not, it can hold no qubit

  bool operator==(const IonFigures&) const = default;
  /// Probability of a phase flip while waiting for `us`.
  double idle_error(double us) const { return -0.5 * std::expm1(-us / t2_us.value); }
  /// Its derivative in T2: longer coherence, smaller error.
  double idle_error_slope(double us) const {
    return -0.5 * std::exp(-us / t2_us.value) * us / (t2_us.value * t2_us.value);
  }
};

/// The interaction of one pair. Its error grows with the angle: with s = |theta| / (pi/2),
/// floor + root * sqrt(s) + slope * s + square * s^2. (Dephasing is constant; scattering goes with the root
/// when the light is scaled at fixed time; motion and heating with s; a relative error of the angle with
/// s^2.)
struct PairFigures {
  bool reachable = true;
  double takes_us = 200;  // whatever the angle: the light is scaled, not the time
  Figure floor{1e-3};
  Figure root{0};
  Figure slope{4e-3};
  Figure square{0};

  bool operator==(const PairFigures&) const = default;
  double error(double theta) const {
    const double s = std::abs(theta) / (std::numbers::pi / 2);
    return std::min(1.0, floor.value + root.value * std::sqrt(s) + slope.value * s + square.value * s * s);
  }
};

struct Target {
  std::string name;
  std::string sha256;  // of the file it was read from; empty for a typical machine
  std::uint32_t ions = 0;
  std::vector<IonFigures> ion;
  std::vector<PairFigures> pairs;  // of a < b in the order of pair_index; empty: all are like every_pair
  PairFigures every_pair;

  std::uint32_t beams = 32;                // ions that are lit at once: an r needs one beam, an xx two
  std::uint32_t interactions_at_once = 1;  // xx on disjoint pairs at the same time
  Figure crosstalk{0.005};                 // field on the next ion of the chain / field on the addressed ion
  bool reads_alone = true;                 // while ions are read or reset, no ion is driven
  bool has_reset = true;
  bool has_feed_forward = true;  // can act on bits measured earlier in the same run
  double feed_forward_us = 50;   // from the last bit it needs to the first pulse of a branch

  /// Row-wise upper triangle: (0,1), (0,2), ..., (1,2), ... a != b in any order.
  std::size_t pair_index(std::uint32_t a, std::uint32_t b) const {
    if (a > b) std::swap(a, b);
    return std::size_t{a} * (2 * std::size_t{ions} - a - 1) / 2 + (b - a - 1);
  }
  const PairFigures& pair(std::uint32_t a, std::uint32_t b) const {
    return pairs.empty() ? every_pair : pairs[pair_index(a, b)];
  }
  /// For writing: from then on each pair has figures of its own.
  PairFigures& pair(std::uint32_t a, std::uint32_t b) {
    if (pairs.empty()) pairs.assign(std::size_t{ions} * (ions - 1) / 2, every_pair);
    return pairs[pair_index(a, b)];
  }

  /// Probability that light of an operation by `theta` leaks to one neighbour and turns it: a rotation by
  /// crosstalk * theta, whose error is sin^2 of half of it.
  double leak_error(double theta) const {
    const double s = std::sin(crosstalk.value * theta / 2);
    return s * s;
  }
  /// Its derivative in the crosstalk.
  double leak_error_slope(double theta) const { return theta / 2 * std::sin(crosstalk.value * theta); }
};

/// A machine file describes at most so many ions.
inline constexpr std::uint32_t most_described_ions = 512;

/// The machine that is assumed without --target: `ions` ions, any number, every pair reachable, the figures
/// above.
Target typical(std::uint32_t ions);

/// Reads a machine description (TOML; keys in README.md beside this file), by figures or by the trap; in the
/// latter case the figures are computed on `threads` threads (0 = as many as cores), or found where they were
/// kept, and `progress` hears now and then the part done. Throws Failure: file_trouble when it cannot be
/// read, target_cannot with line and column of each fault when it is wrong.
Target read_target(const std::string& path, int threads = 0,
                   const std::function<void(double)>& progress = {});

/// What passes need to know: averages over the addressed ions and the reachable pairs.
Cost cost_of(const Target& target);

}  // namespace isinglass
