// Are two circuits the same program? The answer, how it was found, and what that proves.
#pragma once

#include <chrono>
#include <cstdint>
#include <span>
#include <string>
#include <string_view>

#include "circuit/circuit.h"

namespace isinglass {

enum class Answer : std::uint8_t {
  same,       // shown, in the way and as surely as the explanation says
  different,  // a difference larger than the tolerance was found
  not_shown,  // neither: no method that was tried reached an end
};

std::string_view name(Answer answer);  // "same", "different", "not shown"

struct Verdict {
  Answer answer = Answer::not_shown;
  std::string method;       // one word: unitary, state, states, branches, rotations, windows, ...
  std::string explanation;  // one or two sentences: what was checked and what that proves
  double distance = 0;  // largest deviation found of an amplitude, root of a probability or entry; 0 if none
};

/// How hard to try. The defaults decide 12 qubits exactly and 22 qubits by states in seconds.
struct CheckOptions {
  /// Deviations of amplitudes up to this are rounding (10^5 gates add up to some 1e-11); above it the
  /// programs differ. An angle that is wrong by less than twice this in one place cannot be seen.
  double tolerance = 1e-8;
  /// What the compiler was allowed to lose (`--tolerance`): infidelity of the whole unitary or state.
  double infidelity = 0;
  unsigned most_unitary_wires = 11;  // whole unitaries up to here
  unsigned most_state_wires = 22;    // state vectors up to here
  unsigned most_followed_wires =
      8;           // held together when large circuits are followed side by side; 0: not done
  int states = 4;  // random input states where the unitary is too large
  std::size_t most_branches = 4096;  // runs that differ in an outcome of a measurement
  std::size_t most_rounds = 64;  // of a loop on measured bits; longer runs are left out, and the words say so
  unsigned threads = 1;
  std::uint64_t seed = 1;
  /// Methods that would run longer give up at this time.
  std::chrono::steady_clock::time_point deadline = std::chrono::steady_clock::time_point::max();
};

/// Whether `compiled` keeps what `promise` says of `source`. Both have the same source qubits, inputs (by
/// name) and source variables (by name); ancillas (wires from source_qubits on) must start and end in |0>;
/// end_wire of both is followed. Compared up to one global phase, for measuring programs one for each value
/// of the bits.
Verdict compare(const Circuit& source, const Circuit& compiled, const Promise& promise,
                const CheckOptions& options = {});

/// The same, with what the compiler went through at hand. The steps are not believed: where state vectors
/// would take long, source, steps and compiled are compared each with the next by the methods that need none.
/// If every step is the same program, so is the whole; else this is compare().
Verdict compare_along(const Circuit& source, std::span<const Circuit> steps, const Circuit& compiled,
                      const Promise& promise, const CheckOptions& options = {});

}  // namespace isinglass
