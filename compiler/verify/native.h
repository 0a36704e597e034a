// Bringing a compiled program back onto the wires of its source: its pragmas say which ion is which qubit.
#pragma once

#include <span>

#include "circuit/circuit.h"

namespace isinglass {

/// A circuit whose wires are ions, brought onto the wires of `source`: wire q is source qubit q, which starts
/// on ion start[q]; the other ions follow as ancillas. end_wire of `placed` tells on which ion a qubit ends.
Circuit on_source_wires(const Circuit& placed, std::span<const std::uint32_t> start, const Circuit& source);

/// The circuit of a native program as the language room reads it (one register of ions, pragmas kept)
/// likewise. Its pragmas are
///   pragma isinglass start q[0] ion[3]     where a source qubit starts, one each
///   pragma isinglass end q[0] ion[5]       where it ends, one each
///   pragma isinglass name c c_             a source variable or input and its name in the native program
/// Throws Failure (Exit::source_at_fault) that names the pragma which is missing, unknown or contradicts
/// another. A circuit without any of them is taken as it is if it has as many qubits as the source.
Circuit on_source_wires(const Circuit& native, const Circuit& source);

}  // namespace isinglass
