// Orders of passes, and the competition between them; see optimize.h.
#include "passes/optimize.h"

#include <algorithm>
#include <atomic>
#include <chrono>
#include <cstring>
#include <initializer_list>
#include <iterator>
#include <mutex>
#include <stdexcept>
#include <thread>
#include <utility>

#include "passes/approximate.h"
#include "passes/pace.h"

namespace isinglass {

namespace {

using Clock = std::chrono::steady_clock;
using Names = std::vector<std::string_view>;

/// A candidate: passes on source gates, among them one that leaves no gate on three wires, the last one
/// lowering what is left; then passes on the machine's gates round and round until a round gains nothing, and
/// "lower" for the normal form.
struct Order {
  std::string_view name;
  Names on_source;
  Names on_native;
  std::string_view only_if = {};  // the order ends where this pass changes nothing: others do the same
};

// One sweep and no more: merging takes gates on two wires and lowers them on its way.
const Order quick_order = {"quick", {"rename-swaps", "choose-constructions", "merge-rotations"}, {}};

// Where effort deep goes on from the best of all: once over its small blocks,
const Order block_order = {
    "small blocks",
    {"search-blocks", "lower"},
    {"merge-rotations", "two-qubit-stretches", "trim-start", "trim-end", "mirrored-stretches"}};
// then over and over until its time is up.
const Order search_order = {
    "search",
    {"rotation-networks", "lower"},
    {"merge-rotations", "two-qubit-stretches", "trim-start", "trim-end", "mirrored-stretches"}};

// What every order but the quick one begins with, on the source's own gates.
const Names first_of_all = {"rename-swaps", "known-start", "bits-at-end", "merge-gates"};
// What every order but the quick one comes back to, on the machine's gates.
const Names rounds = {"merge-rotations", "two-qubit-stretches", "trim-start", "trim-end",
                      "mirrored-stretches"};

Names operator+(Names names, const Names& more) {
  names.insert(names.end(), more.begin(), more.end());
  return names;
}

const std::vector<Order>& steady_orders() {
  static const Names lower = {"lower"};
  // Toffolis found, before anything blurs them, and paired; the orders without this compete.
  static const Names paired = Names{"recover-toffolis"} + first_of_all + Names{"pair-toffolis"};
  static const Names cubic =
      Names{"recover-toffolis"} + first_of_all + Names{"cubic-networks", "rename-swaps", "pair-toffolis"};
  static const std::vector<Order> orders = {
      {"blocks", paired + Names{"choose-constructions"} + lower, rounds},
      {"distant", paired + Names{"choose-constructions", "merge-distant"} + lower,
       rounds + Names{"merge-distant"}},
      {"paired phases", paired + Names{"expand-controls", "merge-distant"} + lower,
       rounds + Names{"merge-distant"}},
      {"phases", first_of_all + Names{"expand-controls", "merge-distant"} + lower,
       rounds + Names{"merge-distant"}},
      {"cubic", cubic + Names{"choose-constructions"} + lower, rounds, "cubic-networks"},
      {"plain", first_of_all + Names{"expand-controls"} + lower, rounds},
      {"networks", first_of_all + Names{"expand-controls", "merge-distant", "rotation-networks"} + lower,
       rounds},
  };
  return orders;
}

/// All that happens on two wires is one stretch or a few.
bool is_one_stretch(const Circuit& circuit) {
  return circuit.wires <= 2 && circuit.inputs.empty();
}

double seconds_since(Clock::time_point start) {
  return std::chrono::duration<double>(Clock::now() - start).count();
}

std::size_t size_of(const Circuit& circuit) {
  std::size_t size = 0;
  for (const Block& block : circuit.blocks) size += block.size();
  return size;
}

const Pass& pass_named(std::string_view name) {
  for (const Pass& pass : all_passes()) {
    if (pass.name == name) return pass;
  }
  throw std::logic_error("no pass named " + std::string(name));
}

bool are_alike(const Circuit& a, const Circuit& b) {
  return a.wires == b.wires && a.end_wire == b.end_wire &&
         std::ranges::equal(a.blocks, b.blocks, [](const Block& left, const Block& right) {
           return left.size() == right.size() &&
                  std::memcmp(left.data(), right.data(), left.size() * sizeof(Operation)) == 0;
         });
}

/// Runs one order and writes down what each pass did.
class Candidate {
 public:
  Candidate(const Order& order, const PassContext& context, unsigned threads, Pace& pace, bool keeps_steps)
      : order_(&order), context_(context), pace_(&pace), keeps_steps_(keeps_steps) {
    context_.threads = threads;
    if (&order == &quick_order) context_.effort = Effort::quick;
  }

  /// The first candidate runs whatever the time, so that there is a result; the others as long as what comes
  /// next can be expected to end in time.
  void run(const Circuit& source, bool is_first) {
    source_ = &source;
    result_.order = order_->name;
    const auto start = Clock::now();
    const Clock::time_point deadline = context_.deadline;
    for (const std::string_view name : order_->on_source) {
      if (!is_first && !is_time_for({name})) return;
      // A pass that searches until its deadline leaves a fifth of the time to those after it.
      if (deadline != Clock::time_point::max()) context_.deadline = start + (deadline - start) / 5 * 4;
      const bool is_changed = step(name, false);
      context_.deadline = deadline;
      is_idle_ = name == order_->only_if && !is_changed;
      if (is_idle_) return;
    }
    result_.tally = rows_.back().after;
    if (!order_->on_native.empty()) {
      result_.is_complete = improve();
      if (context_.tolerance > 0) shorten();
      if (rows_.back().pass != "lower") step("lower", true);  // the normal form, whatever the last pass left
      result_.tally = rows_.back().after;
    }
    if (source_) circuit_ = *std::exchange(source_, nullptr);
    result_.is_done = true;
    result_.seconds = seconds_since(start);
  }

  const TraceResult& result() const { return result_; }
  /// Whether it ended early because another order does the same.
  bool is_idle() const { return is_idle_; }
  std::vector<TraceRow>& rows() { return rows_; }
  Circuit& circuit() { return circuit_; }
  Steps& steps() { return steps_; }
  void add_infidelity(double infidelity) { result_.infidelity += infidelity; }
  /// This one went on from where the other ended.
  void go_on_from(Candidate& other) {
    steps_.insert(steps_.begin(), std::make_move_iterator(other.steps_.begin()),
                  std::make_move_iterator(other.steps_.end()));
    other.steps_.clear();
  }

 private:
  static constexpr int most_rounds = 20;

  /// What the passes so far have made of the source.
  const Circuit& now() const { return source_ ? *source_ : circuit_; }

  /// Returns false where time ran out first.
  bool improve() {
    double error = tally_of(now(), context_.cost).error;
    for (int round = 0; round < most_rounds; ++round) {
      for (const std::string_view name : order_->on_native) {
        if (!is_time_for({name, "lower"})) return false;
        step(name, true);
      }
      const double after = tally_of(now(), context_.cost).error;
      if (after >= error * (1 - 1e-9)) return true;
      error = after;
    }
    return true;
  }

  /// Whether these passes, one after the other, will end before the deadline.
  bool is_time_for(std::initializer_list<std::string_view> names) const {
    if (context_.deadline == Clock::time_point::max()) return true;
    double seconds = 0;
    for (const std::string_view name : names) seconds += pace_->expected(pass_named(name), size_of(now()));
    return seconds < -seconds_since(context_.deadline);
  }

  /// Spends the tolerance, once, and goes round again with what that has opened.
  void shorten() {
    if (!is_time_for({"approximate", "lower"})) return;
    result_.infidelity = approximated(now(), context_).infidelity;
    step("approximate", true);
    result_.is_complete = improve() && result_.is_complete;
  }

  /// Runs a pass; false where it says that it changed nothing.
  bool step(std::string_view name, bool is_lowered) {
    TraceRow row;
    row.order = order_->name;
    row.pass = name;
    row.is_lowered = is_lowered;
    row.gates_before = size_of(now());
    if (is_lowered) row.before = tally_of(now(), context_.cost);
    const auto start = Clock::now();
    const bool is_changed = apply(pass_named(name));
    row.seconds = seconds_since(start);
    // One that searched until its time was over has not shown what it needs.
    if (!context_.out_of_time()) pace_->saw(pass_named(name), row.gates_before, row.seconds);
    row.gates_after = size_of(now());
    if (is_lowered || name == order_->on_source.back()) row.after = tally_of(now(), context_.cost);
    rows_.push_back(std::move(row));
    return is_changed;
  }

  /// The source is copied only for a pass that cannot do without.
  bool apply(const Pass& pass) {
    if (pass.run_beside && (source_ || pass.name == order_->only_if)) {
      std::optional<Circuit> changed = pass.run_beside(now(), context_);
      if (!changed) return false;
      circuit_ = std::move(*changed);
    } else {
      circuit_ = pass.run(source_ ? *source_ : std::move(circuit_), context_);
    }
    source_ = nullptr;
    if (keeps_steps_) remember();
    return true;
  }

  /// Keeps what has changed. Where that gets too much, every other step goes: the check takes larger ones
  /// then.
  void remember() {
    constexpr std::size_t most_operations = std::size_t{1} << 22;  // 256 MiB
    if (!steps_.empty() && are_alike(steps_.back(), circuit_)) return;
    steps_.push_back(circuit_);
    std::size_t operations = 0;
    for (const Circuit& step : steps_) operations += size_of(step);
    if (operations <= most_operations) return;
    Steps kept;
    for (std::size_t k = 1; k < steps_.size(); k += 2) kept.push_back(std::move(steps_[k]));
    steps_ = std::move(kept);
  }

  const Order* order_;
  PassContext context_;
  Pace* pace_;
  const Circuit* source_ = nullptr;  // until a pass has changed it: then circuit_ holds what it has become
  Circuit circuit_;
  std::vector<TraceRow> rows_;
  TraceResult result_;
  bool is_idle_ = false;
  bool keeps_steps_;
  Steps steps_;
};

bool is_better(const TraceResult& a, const TraceResult& b) {
  if (a.is_done != b.is_done) return a.is_done;
  return a.tally.error + a.infidelity < b.tally.error + b.infidelity;
}

/// The first of equals wins, so that the outcome does not hang on which thread was faster.
Candidate& best_of(std::vector<Candidate>& candidates) {
  return *std::min_element(candidates.begin(), candidates.end(),
                           [](auto& a, auto& b) { return is_better(a.result(), b.result()); });
}

/// Runs all candidates on up to `threads` threads. An exception of one is thrown on when all have ended. Of
/// those that have ended only the best keeps its steps.
void run_all(std::vector<Candidate>& candidates, const Circuit& source, unsigned threads) {
  std::atomic<std::size_t> next = 0;
  std::vector<std::exception_ptr> failures(candidates.size());
  std::mutex ended_lock;
  std::vector<bool> has_ended(candidates.size(), false);
  const auto drop_steps_of_losers = [&] {
    std::size_t best = candidates.size();
    for (std::size_t i = 0; i < candidates.size(); ++i) {
      if (has_ended[i] &&
          (best == candidates.size() || is_better(candidates[i].result(), candidates[best].result())))
        best = i;
    }
    for (std::size_t i = 0; i < candidates.size(); ++i) {
      if (has_ended[i] && i != best) candidates[i].steps().clear();
    }
  };
  const auto work = [&] {
    for (std::size_t i = next++; i < candidates.size(); i = next++) {
      try {
        candidates[i].run(source, i == 0);
        const std::lock_guard lock(ended_lock);
        has_ended[i] = true;
        drop_steps_of_losers();
      } catch (...) {
        failures[i] = std::current_exception();
      }
    }
  };
  std::vector<std::jthread> helpers;
  for (unsigned t = 1; t < std::min<std::size_t>(threads, candidates.size()); ++t) helpers.emplace_back(work);
  work();
  helpers.clear();  // joins
  for (const std::exception_ptr& failure : failures) {
    if (failure) std::rethrow_exception(failure);
  }
}

}  // namespace

namespace {

/// Orders that one search is tried in; the quick one first, which ends whatever the time.
std::vector<Candidate> candidates_for(const Circuit& source, const PassContext& context, Pace& pace,
                                      bool keep_steps) {
  std::vector<Candidate> candidates;
  candidates.emplace_back(quick_order, context, 1, pace, keep_steps);
  if (context.effort == Effort::quick) return candidates;
  for (const Order& order : steady_orders()) {
    candidates.emplace_back(order, context, 1, pace, keep_steps);
    if (is_one_stretch(source)) break;  // and the first order finds its best form
  }
  return candidates;
}

/// Searches on with other random choices as long as there is time for more than a glance.
void search_on(Candidate& best, const PassContext& context, Pace& pace, bool keep_steps,
               std::vector<Candidate>& found) {
  PassContext more = context;
  more.tolerance = 0;  // is spent
  const auto try_order = [&](const Order& order, const PassContext& given) {
    Candidate candidate(order, given, context.threads, pace, keep_steps);
    Candidate& before = found.empty() ? best : found.back();
    candidate.run(before.circuit(), false);
    candidate.add_infidelity(before.result().infidelity);
    if (!is_better(candidate.result(), before.result())) return;
    candidate.go_on_from(before);
    found.push_back(std::move(candidate));
  };
  PassContext blocks = more;
  blocks.deadline = Clock::now() + (context.deadline - Clock::now()) / 3;
  try_order(block_order, blocks);
  const auto glance = std::chrono::milliseconds(100);
  while (Clock::now() + glance < context.deadline) {
    ++more.seed;
    try_order(search_order, more);
  }
}

}  // namespace

Circuit optimize(const Circuit& source, const PassContext& context, Trace* trace, Steps* steps) {
  Pace pace;
  std::vector<Candidate> candidates = candidates_for(source, context, pace, steps != nullptr);
  run_all(candidates, source, context.threads);
  Candidate& best = best_of(candidates);
  std::vector<Candidate> found;
  const bool may_search = context.effort == Effort::deep && context.deadline != Clock::time_point::max();
  if (may_search && !is_one_stretch(source)) search_on(best, context, pace, steps != nullptr, found);
  Candidate& winner = found.empty() ? best : found.back();
  if (steps) *steps = std::move(winner.steps());
  if (trace) {
    for (std::vector<Candidate>* group : {&candidates, &found}) {
      for (Candidate& candidate : *group) {
        if (candidate.is_idle()) continue;
        for (TraceRow& row : candidate.rows()) trace->rows.push_back(std::move(row));
        trace->results.push_back(candidate.result());
        trace->results.back().is_winner = &candidate == &winner;
      }
    }
  }
  return std::move(winner.circuit());
}

}  // namespace isinglass
