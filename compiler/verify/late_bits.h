// Arithmetic on bits after the last measurement, brought back onto the wires.
//
//     --M=c[0]                                 --*--M=c[0]
//     --M=c[1]   c[1] = c[1] ^ c[0];   ==>     --X--M=c[1]
//
// Measuring and then flipping a bit is flipping a basis state and then measuring. Two programs that measure
// at their end can so be compared by their wires alone, wherever each of them does its last flips.
#pragma once

#include <optional>

#include "circuit/circuit.h"

namespace isinglass {

/// The same program without classical code: flips of a measured bit, under the condition that other measured
/// bits are 1, become x with controls before the measurements. Empty where there is no classical code, where
/// it is anything else, or where a wire or a bit is used again after its measurement.
std::optional<Circuit> with_late_bits_on_wires(const Circuit& circuit);

}  // namespace isinglass
