// Reading a native program back: its pragmas say which ion is which qubit of the source.
#pragma once

#include "circuit/circuit.h"

namespace isinglass {

/// The circuit of a native program (as the language room reads it: one register of ions, pragmas kept)
/// brought onto the wires of `source`: wire q is source qubit q, the other ions follow as ancillas, end_wire
/// is what the `end` pragmas say, and renamed variables carry their source names again. Throws Failure
/// (Exit::source_at_fault) that names the pragma which is missing, unknown or contradicts another. A circuit
/// without any isinglass pragma is taken as it is, if it has as many qubits as the source.
Circuit on_source_wires(Circuit native, const Circuit& source);

}  // namespace isinglass
