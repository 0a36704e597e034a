// When each operation of a placed circuit happens, what goes wrong with it, and the totals.
#pragma once

#include <array>
#include <cstdint>
#include <vector>

#include "targets/place.h"
#include "targets/target.h"

namespace isinglass {

enum class TimedKind : std::uint8_t {
  prepare,
  r,
  xx,
  rz,  // takes no time and has no error; listed where the circuit keeps it
  measure,
  reset,
  wait,  // an ion that holds a state and does nothing, or a delay of the source
  barrier,
  compute,  // a classical statement
  decide,   // a branch: its arms are blocks of their own
};
std::string_view name(TimedKind kind);

inline constexpr std::uint32_t no_operation = 0xffffffffu;

/// One entry of the timed list. Times in microseconds from the beginning of its block.
struct TimedOperation {
  double at = 0;
  double takes = 0;
  double error = 0;      // probability, leaked light included; of a decide: of its worst arm
  double crosstalk = 0;  // the part of it that is leaked light
  std::uint32_t operation = no_operation;  // index in the block of Placed::circuit
  std::uint32_t ion[2] = {0, 0};           // one for most kinds, two for xx; see ion_count
  std::uint8_t ion_count = 0;              // barrier, wait with more ions, decide: see the circuit's operands
  TimedKind kind = TimedKind::wait;
};

/// In the order of `at`. A decide takes the feed-forward delay and its longest arm; its arms begin after the
/// delay.
struct TimedBlock {
  std::vector<TimedOperation> operations;
  double takes = 0;
};

enum class Source : std::uint8_t { prepare, r, xx, idle, crosstalk, measure };
inline constexpr std::size_t source_count = 6;
std::string_view name(Source source);

/// Counts of the worst case: of the arms of a branch the worse one (figure by figure, the errors together),
/// of a loop one round.
struct Totals {
  std::size_t xx = 0;
  double xx_units = 0;  // sum of theta / (pi/2); an angle with inputs counts 1
  std::size_t r = 0;
  std::size_t xx_depth = 0;  // longest chain of xx that share ions
  std::size_t pairs = 0;     // different pairs that interact anywhere: what must be calibrated
  double duration = 0;       // us
  double success = 1;        // product of 1 - error over all entries
  double error = 0;          // 1 - success
  /// Shares of `error`, in proportion to -log(1 - error) of the entries: they add up to `error` exactly.
  /// Errors of reset count as `prepare`.
  std::array<double, source_count> error_by_source{};
  /// 95 % interval of `success` from the deviations of the target's figures; equal to `success` without any.
  double success_low = 1;
  double success_high = 1;
};

struct Timed {
  std::vector<TimedBlock> blocks;  // in the order of Circuit::blocks; blocks[0] is the program
  Totals totals;
};

/// Times the placed circuit: list scheduling by the longest way to the end. Dependences between operations
/// that share an ion, a bit or a variable are kept; beams, interactions at once, and readout on its own are
/// respected. Ions wait in |0> as long as they can before their first pulse. Grows linearly with the number
/// of operations.
Timed schedule(const Placed& placed, const Target& target, const Promise& promise);

}  // namespace isinglass
