// The stages of the compiler in their order; see compile.h.
#include "support/compile.h"

#include <stdexcept>

#include "circuit/physical.h"
#include "language/language.h"
#include "output/native.h"
#include "targets/target.h"

namespace isinglass::support {

Circuit circuit_of(const std::string& text) {
  Reading reading = read("test.qasm", text);
  if (reading.ok()) return std::move(*reading.circuit);
  std::string said;
  for (const Message& message : reading.messages) said += printed(message);
  throw std::runtime_error(said + "\nin\n" + text);
}

Compiled compile(const std::string& source, PassContext context, std::uint32_t spare) {
  Compiled result;
  result.source = circuit_of(source);
  context.promise.zero_start = context.promise.zero_start || result.source.measures();
  context.spare_wires = spare;
  result.promise = context.promise;
  result.optimized = optimize(result.source, context);
  const Target target = typical(ions_wanted(result.source) + spare);
  result.placed = place(result.optimized, target);
  result.text = native_program(result.placed, {"test.qasm", target.name});
  return result;
}

}  // namespace isinglass::support
