// The compiled program as OpenQASM 3 that any reader can run.
#pragma once

#include <ostream>
#include <span>
#include <string>

#include "circuit/annotation.h"
#include "targets/place.h"

namespace isinglass {

/// What the file tells besides the program.
struct NativeHeading {
  std::string source;                            // name of the source file
  std::string target;                            // name of the machine
  std::span<const Annotation> annotations = {};  // see annotations.h
};

/// Writes the program: r and xx defined in standard gates, `qubit[N] ion`, the classical variables, where
/// each source qubit starts and ends (pragmas), then the sequence. Angles in full precision (they read back
/// to the same number), with inputs as expressions. Throws std::logic_error on an operation that is not
/// native.
void write_native(std::ostream& out, const Placed& placed, const NativeHeading& heading);

/// The same as a text.
std::string native_program(const Placed& placed, const NativeHeading& heading);

/// The same for a circuit on ions and where its source qubits start, without a copy of it: for programs bound
/// again and again.
void write_native(std::ostream& out, const Circuit& circuit, std::span<const std::uint32_t> start,
                  const NativeHeading& heading);
std::string native_program(const Circuit& circuit, std::span<const std::uint32_t> start,
                           const NativeHeading& heading);

}  // namespace isinglass
