// What a program can end in: for every value of its bits the states of the qubits that are kept.
//
// A program is run once for every sequence of measurement outcomes. Measurements after which nothing more
// happens to their wire and bit are not split into runs: they are read off the final amplitudes.
#pragma once

#include <array>
#include <chrono>
#include <optional>
#include <string>
#include <unordered_map>
#include <vector>

#include "verify/memory.h"
#include "verify/state.h"

namespace isinglass {

/// What the source's qubits start in; other wires start in |0>.
struct Start {
  /// One state a source qubit; empty: all |0>.
  std::vector<std::array<Amplitude, 2>> product;
  /// Each source qubit is half of a Bell pair: the other halves are kept wires, so that the outcome tells
  /// what the program does to every input.
  bool with_references = false;
};

/// The runs that end with the same bits: one vector over the kept qubits (then the references) for each run,
/// not normalized; with nothing kept only the probability.
struct Ending {
  std::vector<std::vector<Amplitude>> states;
  double probability = 0;
};

struct Endings {
  std::unordered_map<std::string, Ending> by_bits;
  double stray = 0;      // weight in which a wire that is no source qubit did not end in |0>
  double cut = 0;        // weight of runs that were left out because a loop went on too long
  std::size_t runs = 0;  // paths through the program
};

struct RunLimits {
  std::size_t most_runs = 4096;
  std::size_t most_rounds = 64;
  std::chrono::steady_clock::time_point deadline = std::chrono::steady_clock::time_point::max();
};

/// Runs a circuit from `start`. shown: the variables whose values tell endings apart; kept: the source qubits
/// whose states are kept; ends_clean: whether stray ancillas are counted (else they are traced out). Throws
/// Unsupported when a limit is reached or the classical code is beyond Memory.
Endings endings_of(const Circuit& circuit, const Start& start, std::span<const double> inputs,
                   std::span<const std::uint32_t> shown, const std::vector<bool>& kept, bool ends_clean,
                   const RunLimits& limits);

/// For each source qubit, whether its last act at the top level of the program is something else than a
/// measurement, so that it has a state to keep.
std::vector<bool> kept_qubits(const Circuit& circuit);

}  // namespace isinglass
