// The program on the wires of a simulation; and the way that fits it. See rehearse.h.
#include "targets/rehearse_stage.h"

#include <fmt/format.h>

#include <algorithm>
#include <cmath>

#include "circuit/message.h"

namespace isinglass {

Kernel equator(std::uint32_t wire, double phi) {
  return {{}, {wire}, {0, std::polar(1.0, -phi), std::polar(1.0, phi), 0}};
}

Kernel pauli(std::uint32_t wire, unsigned which) {
  const Amplitude i(0, 1);
  if (which == 1) return {{}, {wire}, {0, 1, 1, 0}};
  if (which == 2) return {{}, {wire}, {0, -i, i, 0}};
  return {{}, {wire}, {1, 0, 0, -1}};
}

Stage::Stage(const Placed& p, const Timed& t, const Target& machine, const Promise& kept,
             const RehearseOptions& options)
    : placed(p), timed(t), target(machine), promise(kept) {
  const Circuit& circuit = placed.circuit;
  std::size_t declared = 0;
  for (const Input& input : circuit.inputs) declared += input.is_derived ? 0 : 1;
  if (options.inputs.size() != declared) {
    throw Failure(Exit::usage,
                  fmt::format("the rehearsal needs a value for each of the program's {} inputs", declared));
  }
  inputs = with_derived(circuit, options.inputs);
  number_wires(options.most_wires);
  for (std::uint32_t v = 0; v < circuit.variables.size(); ++v) {
    if (circuit.variables[v].bits > 0 && !circuit.variables[v].source.empty()) shown.push_back(v);
  }
  look_through();
}

Kernel Stage::matrix(const Operation& op) const {
  Operation known = op;
  for (int a = 0; a < 3; ++a) known.set_angle(a, {placed.circuit.forms.value(op.angle(a), inputs), 0});
  std::vector<std::uint32_t> targets;
  for (const std::uint32_t ion : placed.circuit.operands(op)) targets.push_back(wire_of[ion]);
  return {{}, std::move(targets), matrix_of(known)};
}

void Stage::number_wires(std::uint32_t most) {
  const Circuit& circuit = placed.circuit;
  std::vector<bool> wanted = placed.in_use;
  for (const Block& block : circuit.blocks) {
    for (const Operation& op : block) {
      for (const std::uint32_t ion : circuit.operands(op)) wanted[ion] = true;
    }
  }
  wire_of.assign(circuit.wires, nowhere);
  for (std::uint32_t ion = 0; ion < circuit.wires; ++ion) {
    if (wanted[ion]) wire_of[ion] = wires++;
  }
  if (wires > most) {
    throw Failure(Exit::target_cannot,
                  fmt::format("the rehearsal can hold {} ions, the program uses {}", most, wires));
  }
}

void Stage::look_through() {
  const Circuit& circuit = placed.circuit;
  std::vector<bool> is_read(circuit.wires, false);
  std::vector<bool> is_written(circuit.bits, false);
  kernels.resize(circuit.blocks.size());
  for (std::size_t b = 0; b < circuit.blocks.size(); ++b) {
    kernels[b].resize(circuit.blocks[b].size());
    for (std::size_t i = 0; i < circuit.blocks[b].size(); ++i) {
      const Operation& op = circuit.blocks[b][i];
      if (op.is_unitary()) kernels[b][i] = matrix(op);
      if (op.kind == Kind::branch || op.kind == Kind::classical) is_straight = false;
      if (op.kind == Kind::reset) resets = true;
      if (op.kind == Kind::barrier || op.kind == Kind::delay) continue;
      for (const std::uint32_t ion : circuit.operands(op)) {
        if (is_read[ion]) reads_at_end = false;
      }
      if (op.kind != Kind::measure) continue;
      measures = true;
      is_read[op.operand[0]] = true;
      if (op.payload == no_bit) continue;
      if (is_written[op.payload]) reads_at_end = false;
      is_written[op.payload] = true;
    }
  }
  reads_at_end = reads_at_end && is_straight;
  is_unitary = is_straight && !measures && !resets;
  // A fragment must work on every input: each qubit begins as half of a Bell pair.
  if (!promise.zero_start && is_unitary) references = circuit.source_qubits;
}

double Stage::leak_error(const TimedOperation& entry, const Leaks& leaks) {
  return leaks.count == 0 ? 0 : 1 - std::pow(1 - entry.crosstalk, 1.0 / leaks.count);
}

State Stage::first_state() const {
  State state(wires + references, 0);
  state.set(0, 0, 1);
  const double h = std::sqrt(0.5);
  for (std::uint32_t q = 0; q < references; ++q) {
    const std::uint32_t wire = wire_of[placed.start[q]];
    state.apply({{}, {wire}, {h, h, h, -h}});
    state.apply({{wire}, {wires + q}, {0, 1, 1, 0}});
  }
  return state;
}

State Stage::last_state() const {
  State state = first_state();
  for (const Kernel& kernel : kernels[0]) {
    if (!kernel.matrix.empty()) state.apply(kernel);
  }
  return state;
}

std::string Stage::text(const Memory& memory) const {
  std::string all;
  for (const std::uint32_t v : shown) {
    const Variable& variable = placed.circuit.variables[v];
    all += (all.empty() ? "" : " ") + variable.source + "=";
    Expression name;
    name.kind = Expression::Kind::variable;
    name.variable = v;
    for (std::uint32_t bit = variable.bits; bit-- > 0;) {
      Expression one;
      one.kind = Expression::Kind::index;
      one.arguments = {name, {}};
      one.arguments[1].text = std::to_string(bit);
      all += truth(memory.evaluate(variable.is_scalar ? name : one)) ? '1' : '0';
    }
  }
  return all;
}

void compare(Rehearsal& result, const Distribution& without_noise, const Distribution& with_noise) {
  std::map<std::string, RehearsedOutcome> both;
  for (const auto& [bits, p] : without_noise) both[bits].without_noise = p;
  for (const auto& [bits, p] : with_noise) both[bits].with_noise = p;
  double distance = 0;
  for (auto& [bits, outcome] : both) {
    outcome.bits = bits;
    distance += std::abs(outcome.with_noise - outcome.without_noise) / 2;
    result.outcomes.push_back(outcome);
  }
  result.distance = distance;
  std::stable_sort(result.outcomes.begin(), result.outcomes.end(), [](const auto& a, const auto& b) {
    return std::pair(a.without_noise, a.with_noise) > std::pair(b.without_noise, b.with_noise);
  });
}

std::string_view name(Rehearsal::Method method) {
  return method == Rehearsal::Method::density_matrix ? "density matrix" : "trajectories";
}

std::string_view left_out_by_the_model() {
  return "Errors are taken as random and independent: coherent errors that add up, drift between "
         "calibrations, "
         "leakage out of the qubit, heating beyond the gates' own figures and loss of ions are left out. "
         "Machines "
         "usually do somewhat worse than such a model, programs with much structure more so.";
}

Rehearsal rehearse(const Placed& placed, const Timed& timed, const Target& target, const Promise& promise,
                   const RehearseOptions& options) {
  const Stage stage(placed, timed, target, promise, options);
  const bool is_small = stage.wires + stage.references <= options.most_density_wires;
  const bool can_be_exact = is_small && (stage.is_unitary || stage.reads_at_end);
  Rehearsal result = can_be_exact ? rehearse_exactly(stage, options) : rehearse_by_shots(stage, options);
  result.estimate = timed.totals.success;
  return result;
}

}  // namespace isinglass
