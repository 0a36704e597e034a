// Durations, delays, boxes and the stretches in them. See reader.h.
//
// The time of a gate is that of its textbook lowering on the machine: a gate on one qubit is a pulse, or
// nothing where it only changes the frame; one on several is so many interactions as it counts CNOTs
// (circuit/before.h), each between two pulses. The compiler usually does better: lengths are upper estimates.
#include <fmt/format.h>

#include <algorithm>
#include <cmath>
#include <map>

#include "circuit/before.h"
#include "language/reader.h"

namespace isinglass {

void Reader::delay(const syntax::Delay& delay, syntax::Span at) {
  const Value length = evaluated(delay.length);
  if (length.type.base != Base::duration && length.type.base != Base::stretch) {
    fail(delay.length.at, fmt::format("the length of a delay is a duration, not {}", text_of(length.type)),
         {"help: write a unit, as in 100ns"});
  }
  if (length.expression) fail(delay.length.at, "a duration must be known while compiling");
  if (length.is_known() && length.real < 0) fail(delay.length.at, "a delay cannot be negative");
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
  op.form[0] = length.form;
  if (can_stretch(op)) {
    op.payload = static_cast<std::uint32_t>(delays_.size());
    delays_.push_back(delay.length.at);
  }
  append(std::move(op), at);
}

/// Nothing crosses the boundary of a box: barriers on the qubits that it touches stand before and after it.
Ending Reader::box(const syntax::Box& box, syntax::Span at) {
  if (capture_ != nullptr) fail(at, "a gate has no boxes");
  std::optional<double> limit;
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
  std::vector<std::uint32_t> wires;
  std::vector<std::size_t> inside;
  bool stretches = false;
  bool branches = false;
  bool shrinks = false;  // a delay that is shorter where a stretch is longer
  for (std::size_t i = first; i < circuit_.blocks[block_].size(); ++i) {
    const Operation& op = circuit_.blocks[block_][i];
    const auto operands = circuit_.operands(op);
    wires.insert(wires.end(), operands.begin(), operands.end());
    inside.push_back(i);
    stretches = stretches || can_stretch(op);
    branches = branches || op.kind == Kind::branch;
    for (const Term& term : lengths_.terms(op.kind == Kind::delay ? op.form[0] : 0)) {
      shrinks = shrinks || term.coefficient < 0;
    }
  }
  std::sort(wires.begin(), wires.end());
  wires.erase(std::unique(wires.begin(), wires.end()), wires.end());
  if (wires.empty()) return ending;
  if (stretches && branches) {
    fail(at,
         "the stretches of a box with branches cannot be solved: how long a branch takes is known only while "
         "running");
  }
  if (limit && !shrinks) {
    const Length needed = length_of(block_, first);
    if (needed.ns > *limit + 1e-6) {
      const std::string text =
          fmt::format("what is in the box takes about {:.6g} us, longer than its length of {:.6g} us",
                      needed.ns / 1e3, *limit / 1e3);
      if (stretches) fail(box.length->at, text);
      warn(box.length->at, text);
      limit.reset();
    } else if (!stretches && !branches && needed.ns < *limit - 1e-6) {
      // Who ends last waits for the end of the box, and the others for him.
      Operation wait = circuit_.make(Kind::delay, {needed.wire});
      wait.value[0] = (*limit - needed.ns) / 1e3;
      append(std::move(wait), at);
    }
  }
  if (stretches) spans_.push_back({pieces_of(block_, inside), limit, box.length ? box.length->at : at});
  boxes_.push_back(limit);
  Operation barrier = circuit_.make(Kind::barrier, wires);
  barrier.origin = Origins::line(at.source == 0 ? at.line : 0);
  barrier.payload = static_cast<std::uint32_t>(boxes_.size());
  auto& operations = circuit_.blocks[block_];
  operations.insert(operations.begin() + static_cast<std::ptrdiff_t>(first), barrier);
  append(Operation(barrier), at);
  return ending;
}

const GateTimes& Reader::times() {
  if (!times_) {
    times_asked_ = true;
    times_ = options_.times ? options_.times() : GateTimes();
  }
  return *times_;
}

/// Nanoseconds; of a delay that can stretch its least length.
double Reader::time_of(const Operation& op) {
  if (op.kind == Kind::delay) return op.value[0] * 1e3;
  if (op.kind == Kind::measure) return times().measure;
  if (op.kind == Kind::reset) return times().reset;
  if (!op.is_unitary() || op.operand_count == 0) return 0;
  const bool is_frame =
      op.kind == Kind::p || op.kind == Kind::rz || op.kind == Kind::z || op.kind == Kind::phase;
  if (op.operand_count == 1) return is_frame ? 0 : times().pulse;
  if (op.is_native()) return times().interaction;
  return static_cast<double>(two_qubit_gates(op)) * (times().interaction + 2 * times().pulse);
}

/// Nanoseconds that the operations of a block from `first` on take when each starts as early as it can.
Reader::Length Reader::length_of(std::uint32_t block, std::size_t first) {
  std::map<std::uint32_t, double> ready;
  Length end;
  for (std::size_t i = first; i < circuit_.blocks[block].size(); ++i) {
    const Operation& op = circuit_.blocks[block][i];
    const auto operands = circuit_.operands(op);
    double start = 0;
    for (const std::uint32_t wire : operands) start = std::max(start, ready[wire]);
    const double takes = time_of(op);
    for (const std::uint32_t wire : operands) ready[wire] = start + takes;
    if (!operands.empty() && start + takes >= end.ns) end = {start + takes, operands.back()};
  }
  return end;
}

/// durationof({ ... }): the block is run into an arm that is thrown away.
Value Reader::duration_of(const SyntaxExpression& expression) {
  if (capture_ != nullptr) fail(expression.at, "a gate has no durations");
  const std::size_t emitted = emitted_;
  const std::size_t spans = spans_.size();
  const auto frame_block = block_;
  const auto bits = circuit_.bits;
  const std::uint32_t arm = open_arm();
  scopes_.open();
  run_list(expression.body);
  close_scope();
  close_arm();
  bool has_running = false;
  bool stretches = false;
  for (const Operation& op : circuit_.blocks[arm]) {
    has_running =
        has_running || op.kind == Kind::branch || op.kind == Kind::measure || op.kind == Kind::classical;
    stretches = stretches || can_stretch(op);
  }
  const double length = length_of(arm, 0).ns;
  while (circuit_.blocks.size() > arm) {
    circuit_.blocks.pop_back();
    phase_.pop_back();
  }
  emitted_ = emitted;
  spans_.resize(spans);
  if (has_running || frame_block != block_ || bits != circuit_.bits) {
    fail(expression.at, "durationof needs a block of gates, resets and delays only");
  }
  if (stretches) fail(expression.at, "durationof needs a block without stretches: they are solved later");
  return of_real(length, {Base::duration, 0});
}

// Stretches.

std::vector<TimedPiece> Reader::pieces_of(std::uint32_t block, const std::vector<std::size_t>& which) {
  std::vector<TimedPiece> pieces;
  for (const std::size_t i : which) {
    const Operation& op = circuit_.blocks[block][i];
    const auto operands = circuit_.operands(op);
    if (operands.empty()) continue;
    TimedPiece piece;
    piece.wires.assign(operands.begin(), operands.end());
    piece.fixed = time_of(op);
    if (op.kind == Kind::delay) piece.form = op.form[0];
    if (op.kind == Kind::barrier && op.payload != 0 && boxes_[op.payload - 1]) {
      piece.inner = op.payload;
      piece.inner_length = *boxes_[op.payload - 1];
    }
    pieces.push_back(std::move(piece));
  }
  return pieces;
}

/// Outside of boxes: what stands between two barriers, where all wires that a delay shares work with are in
/// both.
void Reader::add_spans_between_barriers(std::uint32_t block) {
  const auto& operations = circuit_.blocks[block];
  // Where each delay outside of boxes has its barriers: the last before and the first after it on all its
  // wires.
  std::map<std::size_t, std::pair<std::size_t, std::size_t>> between;
  const auto visit = [&](bool forwards) {
    std::map<std::uint32_t, std::size_t> barrier_on;
    std::set<std::uint32_t> open;  // boxes
    for (std::size_t k = 0; k < operations.size(); ++k) {
      const std::size_t i = forwards ? k : operations.size() - 1 - k;
      const Operation& op = operations[i];
      const auto operands = circuit_.operands(op);
      if (op.kind == Kind::barrier) {
        if (op.payload != 0 && !open.insert(op.payload).second) open.erase(op.payload);
        for (const std::uint32_t wire : operands) barrier_on[wire] = i;
      }
      if (!can_stretch(op) || !open.empty()) continue;
      std::set<std::size_t> barriers;
      for (const std::uint32_t wire : operands) {
        const auto found = barrier_on.find(wire);
        barriers.insert(found == barrier_on.end() ? operations.size() : found->second);
      }
      if (barriers.size() != 1 || *barriers.begin() == operations.size()) continue;
      if (forwards) {
        between[i] = {*barriers.begin(), operations.size()};
      } else if (const auto known = between.find(i); known != between.end()) {
        known->second.second = *barriers.begin();
      }
    }
  };
  visit(true);
  visit(false);
  std::map<std::pair<std::size_t, std::size_t>, syntax::Span> ranges;
  for (const auto& [i, range] : between) {
    if (range.second < operations.size()) ranges.try_emplace(range, delays_[operations[i].payload]);
  }
  for (const auto& [range, at] : ranges) {
    const auto before = circuit_.operands(operations[range.first]);
    const auto after = circuit_.operands(operations[range.second]);
    const std::set<std::uint32_t> starts(before.begin(), before.end());
    std::set<std::uint32_t> wires;
    for (const std::uint32_t wire : after) {
      if (starts.contains(wire)) wires.insert(wire);
    }
    std::vector<std::size_t> inside;
    bool is_closed = true;
    for (std::size_t i = range.first + 1; i < range.second && is_closed; ++i) {
      const auto operands = circuit_.operands(operations[i]);
      const auto shared = std::count_if(operands.begin(), operands.end(),
                                        [&](std::uint32_t wire) { return wires.contains(wire); });
      if (shared == 0) continue;
      inside.push_back(i);
      is_closed =
          shared == static_cast<std::ptrdiff_t>(operands.size()) && operations[i].kind != Kind::branch;
    }
    if (is_closed) spans_.push_back({pieces_of(block, inside), std::nullopt, at});
  }
}

void Reader::solve_stretches() {
  std::vector<double> longer;
  if (!stretches_.empty()) {
    for (std::uint32_t block = 0; block < circuit_.blocks.size(); ++block) add_spans_between_barriers(block);
    std::vector<StretchProblem> problems;
    longer = solved(stretches_, spans_, lengths_, problems);
    for (const StretchProblem& problem : problems) report({problem.at, problem.text, {}});
  }
  if (delays_.empty() && boxes_.empty()) return;
  for (Block& block : circuit_.blocks) {
    for (Operation& op : block) {
      if (op.kind == Kind::barrier) op.payload = 0;
      if (!can_stretch(op)) continue;
      op.value[0] += lengths_.value(op.form[0], longer) / 1e3;
      if (op.value[0] < 0) {
        if (op.value[0] < -1e-6) report({delays_[op.payload], "a delay cannot be negative", {}});
        op.value[0] = 0;
      }
      op.form[0] = 0;
      op.payload = 0;
    }
  }
}

}  // namespace isinglass
