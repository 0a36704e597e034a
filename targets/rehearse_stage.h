// What both ways of rehearsing share: the program on the wires of a simulation, its matrices, what can be
// asked of it.
#pragma once

#include <complex>
#include <cstdint>
#include <map>
#include <string>
#include <vector>

#include "targets/leaks.h"
#include "targets/rehearse.h"
#include "verify/memory.h"
#include "verify/state.h"

namespace isinglass {

inline constexpr std::uint32_t nowhere = 0xffffffffu;

/// cos(phi) X + sin(phi) Y on a wire.
Kernel equator(std::uint32_t wire, double phi);
/// 1, 2, 3: X, Y, Z on a wire.
Kernel pauli(std::uint32_t wire, unsigned which);

struct Stage {
  const Placed& placed;
  const Timed& timed;
  const Target& target;
  const Promise& promise;
  std::vector<double> inputs;                // derived ones included
  std::vector<std::uint32_t> wire_of;        // ion to wire, or nowhere
  std::uint32_t wires = 0;                   // ions that take part
  std::uint32_t references = 0;              // of fragments: wire wires + q is the partner of source qubit q
  std::vector<std::vector<Kernel>> kernels;  // per block and operation; without a matrix where not unitary
  std::vector<std::uint32_t> shown;          // variables that tell outcomes apart
  bool is_straight = true;                   // no branches, no classical statements
  bool reads_at_end = true;  // straight, each bit written once, nothing after the measurement of an ion
  bool resets = false;
  bool measures = false;
  bool is_unitary = true;  // straight, neither measures nor resets

  /// Throws as rehearse() does.
  Stage(const Placed& placed, const Timed& timed, const Target& target, const Promise& promise,
        const RehearseOptions& options);

  const Operation* operation(std::uint32_t block, const TimedOperation& entry) const {
    return entry.operation == no_operation ? nullptr : &placed.circuit.blocks[block][entry.operation];
  }
  double angle(const Operation& op, int which) const {
    return placed.circuit.forms.value(op.angle(which), inputs);
  }

  /// Probability of the operation's own error, and of each of its leaks.
  static double own_error(const TimedOperation& entry) {
    return 1 - (1 - entry.error) / (1 - entry.crosstalk);
  }
  static double leak_error(const TimedOperation& entry, const Leaks& leaks);

  /// |0...0>, or for a fragment Bell pairs between its qubits and the references.
  State first_state() const;
  /// After all unitary operations of the program, without errors; measurements are left out.
  State last_state() const;

  /// The values of the bits as RehearsedOutcome::bits writes them.
  std::string text(const Memory& memory) const;

 private:
  void number_wires(std::uint32_t most);
  void look_through();
  Kernel matrix(const Operation& op) const;
};

/// Probability of each text of bits.
using Distribution = std::map<std::string, double>;

/// Fills outcomes and distance.
void compare(Rehearsal& result, const Distribution& without_noise, const Distribution& with_noise);

/// Exact, for Stage::reads_at_end or is_unitary: density matrices of stage.wires + stage.references.
Rehearsal rehearse_exactly(const Stage& stage, const RehearseOptions& options);
/// Shot by shot, for every program.
Rehearsal rehearse_by_shots(const Stage& stage, const RehearseOptions& options);

}  // namespace isinglass
