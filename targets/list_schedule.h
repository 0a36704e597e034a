// When the operations of one block start: list scheduling under the machine's limits.
#pragma once

#include <cstdint>
#include <vector>

#include "circuit/circuit.h"
#include "targets/target.h"

namespace isinglass {

struct BlockTimes {
  std::vector<std::uint32_t> order;  // operations as they start; keeps dependences among equal times
  std::vector<double> at;            // per operation, us
  std::vector<double> takes;         // per operation, us
  double end = 0;                    // when the last one is over
};

/// Starts at `begin` (us). arm_us[b] = how long child block b takes (those of later blocks must be known).
///
/// Whenever something ends, what is ready starts, the operation with the longest way to the end of the block
/// first (Hu, "Parallel sequencing and assembly line problems", Operations Research 9, 841 (1961)). Readouts
/// on their own and branches wait for the running light to end; nothing of less urgency delays them then.
BlockTimes list_schedule(const Circuit& circuit, const Block& block, const Target& target, double begin,
                         const std::vector<double>& arm_us);

/// Moves the first pulse of each ion as late as its next operation and the beams permit, so that the ion
/// waits in |0>, where nothing can happen to it.
void delay_first_pulses(BlockTimes& times, const Circuit& circuit, const Block& block, const Target& target);

}  // namespace isinglass
