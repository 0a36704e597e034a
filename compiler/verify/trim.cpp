// Renumbering of wires; see trim.h.
#include "verify/trim.h"

namespace isinglass {

namespace {

std::vector<bool> touched_wires(const Circuit& circuit) {
  std::vector<bool> touched(circuit.wires);
  for (const Block& block : circuit.blocks) {
    for (const Operation& op : block) {
      if (op.kind == Kind::barrier || op.kind == Kind::delay || op.kind == Kind::branch) continue;
      for (const auto w : circuit.operands(op)) touched[w] = true;
    }
  }
  return touched;
}

/// The circuit with only the qubits and wires that are `used`; those keep their order.
Circuit trimmed(Circuit circuit, const std::vector<bool>& used_wire, const std::vector<bool>& used_qubit) {
  constexpr std::uint32_t gone = ~std::uint32_t(0);
  std::vector<std::uint32_t> number(circuit.wires, gone);
  std::uint32_t next = 0;
  std::uint32_t qubits = 0;
  for (std::uint32_t w = 0; w < circuit.wires; ++w) {
    if (!used_wire[w]) continue;
    number[w] = next++;
    if (w < circuit.source_qubits) ++qubits;
  }
  for (Block& block : circuit.blocks) {
    for (Operation& op : block) {
      std::vector<std::uint32_t> operands;
      for (const auto w : circuit.operands(op)) {
        if (number[w] != gone) operands.push_back(number[w]);
      }
      circuit.set_operands(op, operands);
    }
  }
  std::vector<std::uint32_t> end_wire;
  for (std::uint32_t q = 0; q < circuit.source_qubits; ++q) {
    if (used_qubit[q]) end_wire.push_back(number[circuit.end_wire[q]]);
  }
  circuit.registers.clear();
  circuit.end_wire = std::move(end_wire);
  circuit.wires = next;
  circuit.source_qubits = qubits;
  return circuit;
}

}  // namespace

std::pair<Circuit, Circuit> without_idle_wires(const Circuit& source, const Circuit& compiled) {
  std::vector<bool> left = touched_wires(source);
  std::vector<bool> right = touched_wires(compiled);
  std::vector<bool> used_qubit(source.source_qubits);
  for (std::uint32_t q = 0; q < source.source_qubits; ++q) {
    // A qubit that moves leaves its start wire, which then must be empty, and fills its end wire.
    if (source.end_wire[q] != q) left[q] = left[source.end_wire[q]] = true;
    if (compiled.end_wire[q] != q) right[q] = right[compiled.end_wire[q]] = true;
  }
  for (std::uint32_t q = 0; q < source.source_qubits; ++q) {
    used_qubit[q] = left[q] || right[q];
    left[q] = right[q] = used_qubit[q];
  }
  return {trimmed(source, left, used_qubit), trimmed(compiled, right, used_qubit)};
}

}  // namespace isinglass
