// The whole way from a source circuit to the machine's gates: orders of passes that compete, and what they
// say.
#pragma once

#include <string>
#include <vector>

#include "circuit/circuit.h"
#include "circuit/cost.h"
#include "passes/pass.h"

namespace isinglass {

/// What one pass did in one candidate order.
struct TraceRow {
  std::string order;  // the candidate order that ran it
  std::string pass;
  Tally before;  // of the circuit lowered plainly, where it still holds source gates: see is_lowered
  Tally after;
  bool is_lowered = true;        // false: the pass worked on source gates, whose tally is not known yet
  std::size_t gates_before = 0;  // operations of all blocks
  std::size_t gates_after = 0;
  double seconds = 0;
};

/// How one candidate order ended.
struct TraceResult {
  std::string order;
  Tally tally;
  double infidelity = 0;  // added by approximation, at most; the winner has the least error + infidelity
  double seconds = 0;
  bool is_done = false;  // false: time ran out before it had a result; tally is empty then
  bool is_winner = false;
  bool is_complete = true;  // false: time ran out before its fixed point
};

/// Filled by optimize(); rows in the order of the candidates, then in the order they ran.
struct Trace {
  std::vector<TraceRow> rows;
  std::vector<TraceResult> results;
};

/// What the winner went through: the circuit after each pass that changed it. Whoever checks the result can
/// follow it in small steps.
using Steps = std::vector<Circuit>;

/// Source circuit (any kinds, any number of controls) to lowered circuit: r, xx, rz and what is not unitary,
/// in normal form: between two other operations on a wire at most one r with 0 < theta <= pi; xx with
/// 0 < theta <= pi/2; known phases in (-pi, pi]; rz only where the promise keeps it (before a branch, at the
/// end). Swaps are renamed: see Circuit::end_wire. Symbolic angles stay symbolic and have no range.
/// Several orders of passes run, each to a fixed point or the deadline; the one with the lowest estimated
/// error under context.cost wins. The same seed gives the same circuit as long as the deadline does not cut
/// in.
Circuit optimize(const Circuit& source, const PassContext& context, Trace* trace = nullptr,
                 Steps* steps = nullptr);

}  // namespace isinglass
