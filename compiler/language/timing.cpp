// Durations, delays and boxes. See reader.h.
#include <fmt/format.h>

#include <algorithm>
#include <cmath>
#include <map>

#include "language/reader.h"

namespace isinglass {

void Reader::delay(const syntax::Delay& delay, syntax::Span at) {
  const Value length = evaluated(delay.length);
  if (length.type.base != Base::duration && length.type.base != Base::stretch) {
    fail(delay.length.at, fmt::format("the length of a delay is a duration, not {}", text_of(length.type)),
         {"help: write a unit, as in 100ns"});
  }
  if (!length.is_known()) fail(delay.length.at, "a duration must be known while compiling");
  if (length.real < 0) fail(delay.length.at, "a delay cannot be negative");
  std::vector<std::uint32_t> wires;
  for (const SyntaxExpression& operand : delay.operands) {
    const Qubits qubits = qubits_of(operand);
    wires.insert(wires.end(), qubits.wires.begin(), qubits.wires.end());
  }
  if (delay.operands.empty()) {
    for (std::uint32_t wire = 0; wire < circuit_.wires; ++wire) wires.push_back(wire);
  }
  std::sort(wires.begin(), wires.end());
  wires.erase(std::unique(wires.begin(), wires.end()), wires.end());
  if (wires.empty()) return;
  Operation op = circuit_.make(Kind::delay, wires);
  op.value[0] = length.real / 1e3;  // microseconds
  append(std::move(op), at);
}

/// Nothing crosses the boundary of a box: barriers on the qubits that it touches stand before and after it.
Ending Reader::box(const syntax::Box& box, syntax::Span at) {
  if (capture_ != nullptr) fail(at, "a gate has no boxes");
  double limit = -1;
  if (box.length) {
    const Value length = evaluated(*box.length);
    if (length.type.base != Base::duration || !length.is_known()) {
      fail(box.length->at, "the length of a box is a duration that is known while compiling");
    }
    if (length.real < 0) fail(box.length->at, "the length of a box cannot be negative");
    limit = length.real;
  }
  const std::size_t first = circuit_.blocks[block_].size();
  const Ending ending = run_block(box.body);
  auto& operations = circuit_.blocks[block_];
  std::vector<std::uint32_t> wires;
  for (std::size_t i = first; i < operations.size(); ++i) {
    const auto operands = circuit_.operands(operations[i]);
    wires.insert(wires.end(), operands.begin(), operands.end());
  }
  std::sort(wires.begin(), wires.end());
  wires.erase(std::unique(wires.begin(), wires.end()), wires.end());
  if (wires.empty()) return ending;
  if (limit >= 0) {
    const double needed = length_of(block_, first);
    if (needed > limit + 1e-6) {
      warn(box.length->at,
           fmt::format("what is in the box takes about {} us, longer than its length of {} us", needed / 1e3,
                       limit / 1e3));
    }
  }
  Operation barrier = circuit_.make(Kind::barrier, wires);
  barrier.origin = Origins::line(at.source == 0 ? at.line : 0);
  operations.insert(operations.begin() + static_cast<std::ptrdiff_t>(first), barrier);
  append(circuit_.make(Kind::barrier, wires), at);
  return ending;
}

/// Nanoseconds that the operations of a block from `first` on take when each starts as early as it can, by
/// the figures in ReadOptions.
double Reader::length_of(std::uint32_t block, std::size_t first) const {
  std::map<std::uint32_t, double> ready;
  const auto& operations = circuit_.blocks[block];
  double end = 0;
  for (std::size_t i = first; i < operations.size(); ++i) {
    const Operation& op = operations[i];
    const auto operands = circuit_.operands(op);
    double start = 0;
    for (const std::uint32_t wire : operands) start = std::max(start, ready[wire]);
    double takes = 0;
    if (op.kind == Kind::delay) takes = op.value[0] * 1e3;
    if (op.is_unitary() && !operands.empty()) {
      takes = operands.size() == 1 ? options_.one_qubit_ns : options_.more_qubits_ns;
    }
    if (op.kind == Kind::p || op.kind == Kind::rz || op.kind == Kind::z) {
      if (operands.size() == 1) takes = 0;  // a change of frame
    }
    for (const std::uint32_t wire : operands) ready[wire] = start + takes;
    end = std::max(end, start + takes);
  }
  return end;
}

/// durationof({ ... }): the block is run into an arm that is thrown away.
Value Reader::duration_of(const SyntaxExpression& expression) {
  if (capture_ != nullptr) fail(expression.at, "a gate has no durations");
  const std::size_t emitted = emitted_;
  const auto frame_block = block_;
  const auto bits = circuit_.bits;
  const std::uint32_t arm = open_arm();
  scopes_.open();
  run_list(expression.body);
  close_scope();
  close_arm();
  const auto& operations = circuit_.blocks[arm];
  const bool has_running = std::any_of(operations.begin(), operations.end(), [](const Operation& op) {
    return op.kind == Kind::branch || op.kind == Kind::measure || op.kind == Kind::reset ||
           op.kind == Kind::classical;
  });
  const double length = length_of(arm, 0);
  while (circuit_.blocks.size() > arm) {
    circuit_.blocks.pop_back();
    phase_.pop_back();
  }
  emitted_ = emitted;
  if (has_running || frame_block != block_ || bits != circuit_.bits) {
    fail(expression.at, "durationof needs a block of gates and delays only");
  }
  return of_real(length, {Base::duration, 0});
}

}  // namespace isinglass
