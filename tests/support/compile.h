// The whole compiler as a library, in one call, for property tests.
#pragma once

#include <string>

#include "circuit/circuit.h"
#include "passes/optimize.h"
#include "targets/place.h"

namespace isinglass::support {

struct Compiled {
  Circuit source;
  Circuit optimized;
  Placed placed;
  std::string text;  // the native program
  Promise promise;   // that was kept: a program that measures starts in |0...0>
};

/// Reads, optimizes, places on a typical machine with `spare` ions more than qubits, and writes. Throws
/// std::runtime_error with the messages where the source is refused.
Compiled compile(const std::string& source, PassContext context = {}, std::uint32_t spare = 0);

/// A text read by the language room; throws as above.
Circuit circuit_of(const std::string& text);

}  // namespace isinglass::support
