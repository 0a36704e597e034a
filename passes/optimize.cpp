// Orders of passes, and the competition between them; see optimize.h.
#include "passes/optimize.h"

#include <chrono>

#include "passes/expand_controls.h"
#include "passes/lower.h"
#include "passes/rename_swaps.h"

namespace isinglass {

namespace {

using Clock = std::chrono::steady_clock;

double seconds_since(Clock::time_point start) {
  return std::chrono::duration<double>(Clock::now() - start).count();
}

std::size_t size_of(const Circuit& circuit) {
  std::size_t size = 0;
  for (const Block& block : circuit.blocks) size += block.size();
  return size;
}

/// Runs passes one after the other and writes the trace.
class Runner {
 public:
  Runner(std::string order, const PassContext& context, std::vector<TraceRow>& rows)
      : order_(std::move(order)), context_(context), rows_(rows) {}

  Circuit run(std::string_view pass_name, Circuit circuit, bool is_lowered) {
    const Pass* pass = nullptr;
    for (const Pass& candidate : all_passes()) {
      if (candidate.name == pass_name) pass = &candidate;
    }
    TraceRow row;
    row.order = order_;
    row.pass = pass_name;
    row.is_lowered = is_lowered;
    row.gates_before = size_of(circuit);
    if (is_lowered) row.before = tally_of(circuit, context_.cost);
    const auto start = Clock::now();
    circuit = pass->run(std::move(circuit), context_);
    row.seconds = seconds_since(start);
    row.gates_after = size_of(circuit);
    if (is_lowered) row.after = tally_of(circuit, context_.cost);
    rows_.push_back(std::move(row));
    return circuit;
  }

 private:
  std::string order_;
  const PassContext& context_;
  std::vector<TraceRow>& rows_;
};

}  // namespace

Circuit optimize(const Circuit& source, const PassContext& context, Trace* trace) {
  Trace ignored;
  Trace& told = trace ? *trace : ignored;
  const auto start = Clock::now();
  Runner runner("plain", context, told.rows);
  Circuit circuit = runner.run("rename-swaps", source, false);
  circuit = runner.run("expand-controls", std::move(circuit), false);
  circuit = runner.run("lower", std::move(circuit), false);
  told.results.push_back({"plain", tally_of(circuit, context.cost), seconds_since(start), true, true});
  return circuit;
}

}  // namespace isinglass
