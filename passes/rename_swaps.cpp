// A swap is no work where the wires can change their names instead.
//
//     a --x--A--        a ----B--
//         |        ==>
//     b --x--B--        b ----A--       and the ends change places
//
// Only in the body: the arms of a branch must bring every qubit back to its wire; not in a program that may
// end early, whose ends must agree; and not where the source says which ion is which qubit: a swap of
// physical qubits is work. (Common practice.)
#include "passes/rename_swaps.h"

#include <algorithm>
#include <utility>

#include "circuit/long_list.h"
#include "circuit/physical.h"

namespace isinglass {

namespace {

void rename(Circuit& circuit, Operation& op, const std::vector<std::uint32_t>& name) {
  if (op.operand_count <= 3) {
    for (std::uint32_t k = 0; k < op.operand_count; ++k) op.operand[k] = name[op.operand[k]];
  } else {
    std::vector<std::uint32_t> operands(circuit.operands(op).begin(), circuit.operands(op).end());
    for (std::uint32_t& wire : operands) wire = name[wire];
    circuit.set_operands(op, operands);
  }
  if (op.kind != Kind::branch) return;
  for (const Branch::Arm& arm : circuit.branches[op.payload].arms) {
    for (Operation& inner : circuit.blocks[arm.block]) rename(circuit, inner, name);
  }
}

bool is_swap(const Operation& op) {
  return op.kind == Kind::swap && op.operand_count == 2;
}

}  // namespace

bool may_end_early(const Circuit& circuit) {
  const auto ends = [](const ClassicalStatement& statement) {
    return statement.kind == ClassicalStatement::Kind::end_program;
  };
  // Most programs have no such statement at all, and are not searched for where it stands.
  if (std::none_of(circuit.statements.begin(), circuit.statements.end(), ends)) return false;
  return std::any_of(circuit.blocks.begin(), circuit.blocks.end(), [&](const Block& block) {
    return std::any_of(block.begin(), block.end(), [&](const Operation& op) {
      return op.kind == Kind::classical && ends(circuit.statements[op.payload]);
    });
  });
}

bool may_rename_wires(const Circuit& circuit) {
  return !may_end_early(circuit) && !has_pinned(circuit);
}

std::optional<Circuit> rename_swaps_beside(const Circuit& circuit, const PassContext& context) {
  const Block& body = circuit.body();
  if (!may_rename_wires(circuit) || std::none_of(body.begin(), body.end(), is_swap)) return std::nullopt;
  return rename_swaps(circuit, context);
}

Circuit rename_swaps(Circuit circuit, const PassContext&) {
  if (!may_rename_wires(circuit)) return circuit;
  std::vector<std::uint32_t> name(circuit.wires);
  for (std::uint32_t w = 0; w < circuit.wires; ++w) name[w] = w;
  Block kept;
  reserve_long(kept, circuit.body().size());
  for (Operation op : circuit.body()) {
    if (is_swap(op)) {
      std::swap(name[op.operand[0]], name[op.operand[1]]);
      continue;
    }
    rename(circuit, op, name);
    kept.push_back(op);
  }
  circuit.body() = std::move(kept);
  for (std::uint32_t& wire : circuit.end_wire) wire = name[wire];
  return circuit;
}

}  // namespace isinglass
