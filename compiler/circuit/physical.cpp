// Which wires are pinned to which ions; see physical.h.
#include "circuit/physical.h"

#include <algorithm>
#include <charconv>

namespace isinglass {

namespace {

/// k of a register named `$k`.
std::uint32_t ion_named(const Register& reg) {
  std::uint32_t ion = no_ion;
  if (reg.name.starts_with('$')) std::from_chars(reg.name.data() + 1, reg.name.data() + reg.name.size(), ion);
  return ion;
}

}  // namespace

std::vector<std::uint32_t> pinned_ions(const Circuit& circuit) {
  std::vector<std::uint32_t> ions(circuit.wires, no_ion);
  for (const Register& reg : circuit.registers) {
    if (reg.size == 1) ions[reg.first] = ion_named(reg);
  }
  return ions;
}

bool has_pinned(const Circuit& circuit) {
  return std::any_of(circuit.registers.begin(), circuit.registers.end(),
                     [](const Register& reg) { return ion_named(reg) != no_ion; });
}

std::uint32_t ions_wanted(const Circuit& circuit) {
  std::uint32_t wanted = circuit.source_qubits;
  for (const Register& reg : circuit.registers) {
    const std::uint32_t ion = ion_named(reg);
    if (ion != no_ion) wanted = std::max(wanted, ion + 1);
  }
  return wanted;
}

}  // namespace isinglass
