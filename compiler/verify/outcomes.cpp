// Running a program through all outcomes of its measurements; see outcomes.h.
#include "verify/outcomes.h"

#include <algorithm>
#include <cmath>
#include <map>
#include <set>
#include <utility>

namespace isinglass {

namespace {

// A run of less weight than this changes no amplitude by more than 1e-9 and no sum by anything.
constexpr double negligible = 1e-18;
// Two runs are one where the squared distance of their states is below this share of the weight.
constexpr double parallel = 1e-24;
constexpr std::size_t most_amplitudes = std::size_t(1) << 26;
constexpr int most_deferred = 22;

/// Which operations of the program's top level can wait for the end, where they are read off the amplitudes.
class Deferral {
 public:
  explicit Deferral(const Circuit& circuit) : circuit_(circuit), waits(circuit.body().size()) {
    // What stands after an `end` that may be reached must not happen.
    for (const ClassicalStatement& said : circuit.statements) {
      if (said.kind == ClassicalStatement::Kind::end_program) return;
    }
    std::set<std::uint32_t> busy_wires;
    std::set<std::uint32_t> busy_bits;
    bool open = true;         // nothing but gates, resets and deferred operations so far
    bool any_branch = false;  // a branch may read or write any bit
    const Block& body = circuit.body();
    for (std::size_t k = body.size(); k-- > 0;) {
      const Operation& op = body[k];
      const auto wires = circuit.operands(op);
      if (op.kind == Kind::barrier || op.kind == Kind::delay) continue;
      if (op.kind == Kind::measure) {
        const bool is_last = !busy_wires.contains(wires[0]) && !deferred_wires_.contains(wires[0]);
        const bool bit_is_free = open || (!any_branch && !busy_bits.contains(op.payload));
        if (is_last && bit_is_free && static_cast<int>(deferred_wires_.size()) < most_deferred) {
          waits[k] = true;
          deferred_wires_.insert(wires[0]);
          continue;
        }
        open = false;
        busy_bits.insert(op.payload);
      } else if (op.kind == Kind::classical ||
                 (op.kind == Kind::branch && wires.empty() && is_classical(op))) {
        if (open && is_straight(op)) {
          waits[k] = true;
          continue;
        }
        open = false;
        any_branch = true;
      } else if (op.kind == Kind::branch) {
        open = false;
        any_branch = true;
      }
      busy_wires.insert(wires.begin(), wires.end());
    }
  }

 private:
  /// What neither steers the flow nor calls anything.
  bool is_straight(const Operation& op) const {
    if (op.kind == Kind::classical) {
      const auto kind = circuit_.statements[op.payload].kind;
      return kind == ClassicalStatement::Kind::assign || kind == ClassicalStatement::Kind::raw;
    }
    return is_classical(op);
  }

  /// A branch without loops whose arms hold assignments only.
  bool is_classical(const Operation& op) const {
    const Branch& branch = circuit_.branches[op.payload];
    if (branch.kind == Branch::Kind::while_loop || branch.kind == Branch::Kind::for_loop) return false;
    for (const Branch::Arm& arm : branch.arms) {
      for (const Operation& inner : circuit_.blocks[arm.block]) {
        const bool nested = inner.kind == Kind::branch && is_classical(inner);
        if (!nested && !(inner.kind == Kind::classical && is_straight(inner))) return false;
      }
    }
    return true;
  }

  const Circuit& circuit_;
  std::set<std::uint32_t> deferred_wires_;

 public:
  std::vector<bool> waits;  // by index in the top-level block
};

/// Where a run stands: a stack of blocks, the innermost last.
struct Frame {
  std::uint32_t block;
  std::size_t at = 0;
  const Branch* loop = nullptr;    // while or for
  std::vector<Value> values = {};  // that a for loop goes through
  std::size_t round = 0;
};

struct Run {
  State state;
  Memory memory;
  std::vector<Frame> frames;
};

bool same_place(const Frame& a, const Frame& b) {
  return a.block == b.block && a.at == b.at && a.loop == b.loop && a.round == b.round && a.values == b.values;
}

/// If b is a multiple of a, the weight of both joined into a; else false. What comes after them is then
/// alike, and as a mixture they are one state of their joint weight.
bool absorb(State& a, const State& b) {
  Amplitude overlap = 0;
  double weight_a = 0;
  double weight_b = 0;
  for (std::uint64_t k = 0; k < a.dimension(); ++k) {
    overlap += std::conj(a.get(k)) * b.get(k);
    weight_a += std::norm(a.get(k));
    weight_b += std::norm(b.get(k));
  }
  const Amplitude ratio = overlap / weight_a;
  double off = 0;
  for (std::uint64_t k = 0; k < a.dimension(); ++k) off += std::norm(b.get(k) - ratio * a.get(k));
  if (off > parallel * weight_b) return false;
  const double scale = std::sqrt((weight_a + weight_b) / weight_a);
  for (std::uint64_t k = 0; k < a.dimension(); ++k) a.set(k, 0, scale * a.get(k));
  return true;
}

/// The block that an if or switch enters, if any.
std::optional<std::uint32_t> chosen_block(const Memory& memory, const Branch& branch) {
  if (branch.kind == Branch::Kind::if_else) {
    const std::size_t arm = truth(memory.evaluate(branch.condition)) ? 0 : 1;
    if (arm < branch.arms.size()) return branch.arms[arm].block;
    return {};
  }
  const Value selector = memory.evaluate(branch.condition);
  std::optional<std::uint32_t> otherwise;
  for (const Branch::Arm& arm : branch.arms) {
    if (arm.labels.empty()) otherwise = arm.block;
    for (const Expression& label : arm.labels) {
      const Value value = cast(memory.evaluate(label), selector.type, selector.width);
      if (value.whole == selector.whole) return arm.block;
    }
  }
  return otherwise;
}

class Runner {
 public:
  Runner(const Circuit& circuit, std::span<const double> inputs, std::span<const std::uint32_t> shown,
         const std::vector<bool>& kept, bool ends_clean, const RunLimits& limits)
      : circuit_(circuit),
        inputs_(inputs),
        shown_(shown),
        kept_(kept),
        ends_clean_(ends_clean),
        limits_(limits),
        deferral_(circuit) {}

  Endings result(const Start& start) {
    references_ = start.with_references ? circuit_.source_qubits : 0;
    std::vector<Run> open;
    open.push_back({started(start), Memory(circuit_, inputs_), {{0}}});
    while (!open.empty()) {
      Run run = std::move(open.back());
      open.pop_back();
      follow(run, open);
      // Runs wait at each new round of a loop until all others have come as far; then equal ones are joined,
      // so that a loop which repeats until success does not split without end.
      if (open.empty()) open = std::exchange(waiting_, {});
    }
    return std::move(endings_);
  }

 private:
  /// Goes on with a run until it ends, is cut off, or waits for a new round of a loop.
  void follow(Run& run, std::vector<Run>& open) {
    while (!run.frames.empty()) {
      if (std::optional<Run> other = step(run)) open.push_back(std::move(*other));
      if (std::chrono::steady_clock::now() > limits_.deadline) throw Unsupported("a run in the time given");
      if (std::exchange(starts_round_, false)) return wait(std::move(run));
    }
    if (std::exchange(is_cut_, false)) return;
    if (++endings_.runs > limits_.most_runs) throw Unsupported("so many outcomes of measurements");
    finish(run);
  }

  void wait(Run run) {
    for (Run& other : waiting_) {
      if (std::equal(run.frames.begin(), run.frames.end(), other.frames.begin(), other.frames.end(),
                     same_place) &&
          run.memory == other.memory && absorb(other.state, run.state)) {
        return;
      }
    }
    waiting_.push_back(std::move(run));
  }

  State started(const Start& start) const {
    const std::uint32_t qubits = circuit_.source_qubits;
    State state(circuit_.wires + references_, 0);
    for (std::uint64_t k = 0; k < std::uint64_t(1) << qubits; ++k) {
      if (start.with_references) {
        state.set(k | k << circuit_.wires, 0,
                  std::sqrt(1.0 / static_cast<double>(std::uint64_t(1) << qubits)));
        continue;
      }
      Amplitude a = start.product.empty() && k != 0 ? 0 : 1;
      for (std::size_t q = 0; q < start.product.size(); ++q) a *= start.product[q][k >> q & 1];
      state.set(k, 0, a);
    }
    return state;
  }

  /// Advances the run by one operation or one stretch of gates; returns a second run where an outcome splits
  /// it.
  std::optional<Run> step(Run& run) {
    Frame& frame = run.frames.back();
    const Block& block = circuit_.blocks[frame.block];
    if (frame.at == block.size()) {
      end_of_block(run);
      return {};
    }
    if (frame.block == 0 && deferral_.waits[frame.at]) {
      ++frame.at;
      return {};
    }
    const Operation& op = block[frame.at];
    switch (op.kind) {
      case Kind::measure:
      case Kind::reset:
        ++frame.at;
        return split(run, op);
      case Kind::classical:
        ++frame.at;
        statement(run, circuit_.statements[op.payload]);
        return {};
      case Kind::branch:
        ++frame.at;
        enter(run, circuit_.branches[op.payload]);
        return {};
      default:
        gates(run);
        return {};
    }
  }

  void gates(Run& run) {
    Frame& frame = run.frames.back();
    const Block& block = circuit_.blocks[frame.block];
    std::size_t end = frame.at;
    const auto is_gate = [&](std::size_t k) {
      const Kind kind = block[k].kind;
      return is_unitary(kind) || kind == Kind::barrier || kind == Kind::delay;
    };
    // Deferred operations of the top level do not stop a stretch: they are skipped.
    std::vector<Operation> stretch;
    const auto key = std::pair(frame.block, frame.at);
    auto known = kernels_.find(key);
    while (end < block.size()) {
      const bool waits = frame.block == 0 && deferral_.waits[end];
      if (!waits && !is_gate(end)) break;
      if (!waits && known == kernels_.end()) stretch.push_back(block[end]);
      ++end;
    }
    if (known == kernels_.end()) known = kernels_.emplace(key, fused(circuit_, stretch, inputs_)).first;
    for (const Kernel& kernel : known->second) {
      if (std::chrono::steady_clock::now() > limits_.deadline) throw Unsupported("a run in the time given");
      run.state.apply(kernel);
    }
    frame.at = end;
  }

  std::optional<Run> split(Run& run, const Operation& op) {
    const std::uint32_t wire = circuit_.operands(op)[0];
    const double zero = run.state.weight(wire, false);
    const double one = run.state.weight(wire, true);
    const auto take = [&](Run& taken, bool outcome) {
      taken.state.project(wire, outcome);
      if (op.kind == Kind::measure && op.payload != no_bit) taken.memory.set_bit(op.payload, outcome);
      if (op.kind == Kind::reset && outcome) taken.state.flip(wire);
    };
    if (one <= negligible || zero <= negligible) {
      take(run, one > zero);
      return {};
    }
    if (++splits_ > 2 * limits_.most_runs) throw Unsupported("so many outcomes of measurements");
    Run other = run;
    take(run, false);
    take(other, true);
    return other;
  }

  void statement(Run& run, const ClassicalStatement& said) {
    const auto innermost_loop = [&] {
      while (!run.frames.empty() && run.frames.back().loop == nullptr) run.frames.pop_back();
    };
    switch (said.kind) {
      case ClassicalStatement::Kind::end_program:
        run.frames.clear();
        return;
      case ClassicalStatement::Kind::leave_loop:
        innermost_loop();
        if (!run.frames.empty()) run.frames.pop_back();
        return;
      case ClassicalStatement::Kind::next_round:
        innermost_loop();
        if (!run.frames.empty()) run.frames.back().at = circuit_.blocks[run.frames.back().block].size();
        return;
      default:
        run.memory.run(said);
    }
  }

  void enter(Run& run, const Branch& branch) {
    switch (branch.kind) {
      case Branch::Kind::if_else:
      case Branch::Kind::switch_case:
        if (const auto block = chosen_block(run.memory, branch)) run.frames.push_back({*block});
        return;
      case Branch::Kind::while_loop:
        if (truth(run.memory.evaluate(branch.condition))) {
          run.frames.push_back({branch.arms[0].block, 0, &branch, {}, 0});
        }
        return;
      case Branch::Kind::for_loop: {
        std::vector<Value> values = run.memory.round_values(branch.condition);
        if (values.empty()) return;
        run.memory.set_variable(branch.variable, values[0]);
        run.frames.push_back({branch.arms[0].block, 0, &branch, std::move(values), 0});
        return;
      }
    }
  }

  void end_of_block(Run& run) {
    Frame& frame = run.frames.back();
    ++frame.round;
    if (frame.loop != nullptr && frame.loop->kind == Branch::Kind::for_loop &&
        frame.round < frame.values.size()) {
      run.memory.set_variable(frame.loop->variable, frame.values[frame.round]);
      frame.at = 0;
      return;
    }
    if (frame.loop != nullptr && frame.loop->kind == Branch::Kind::while_loop &&
        truth(run.memory.evaluate(frame.loop->condition))) {
      const double weight = run.state.weight(0, false) + run.state.weight(0, true);
      if (frame.round >= limits_.most_rounds || weight <= negligible) {
        endings_.cut += weight;
        is_cut_ = true;
        run.frames.clear();
        return;
      }
      frame.at = 0;
      starts_round_ = true;
      return;
    }
    run.frames.pop_back();
  }

  /// Sorts the final amplitudes by the deferred outcomes and what is not kept, and files them under their
  /// bits.
  void finish(const Run& run) {
    std::vector<std::uint32_t> kept_wires;
    std::vector<std::uint32_t> deferred;
    std::vector<bool> is_sorted(circuit_.wires + references_);
    for (std::uint32_t q = 0; q < circuit_.source_qubits; ++q) {
      if (kept_[q]) kept_wires.push_back(circuit_.end_wire[q]);
    }
    for (std::uint32_t k = 0; k < references_; ++k) kept_wires.push_back(circuit_.wires + k);
    for (const auto w : kept_wires) is_sorted[w] = true;
    for (std::size_t k = 0; k < deferral_.waits.size(); ++k) {
      const Operation& op = circuit_.body()[k];
      if (!deferral_.waits[k] || op.kind != Kind::measure) continue;
      deferred.push_back(circuit_.operands(op)[0]);
    }
    std::vector<std::uint32_t> ancillas;
    std::vector<std::uint32_t> traced;
    std::vector<bool> is_qubit(circuit_.wires);
    for (const auto w : circuit_.end_wire) is_qubit[w] = true;
    // A kept wire whose measurement is deferred must be split by its outcome as well.
    for (const auto w : deferred) is_sorted[w] = true;
    for (std::uint32_t w = 0; w < circuit_.wires; ++w) {
      if (is_sorted[w]) continue;
      (ends_clean_ && !is_qubit[w] ? ancillas : traced).push_back(w);
    }
    const auto spread = [](std::uint64_t k, const std::vector<std::uint32_t>& wires) {
      std::uint64_t index = 0;
      for (std::size_t j = 0; j < wires.size(); ++j) {
        if (k >> j & 1) index |= std::uint64_t(1) << wires[j];
      }
      return index;
    };
    std::uint64_t kept_mask = 0;
    for (const auto w : kept_wires) kept_mask |= std::uint64_t(1) << w;
    std::uint64_t fixed_mask = 0;  // kept wires that a deferred measurement fixes
    for (const auto w : deferred) fixed_mask |= std::uint64_t(1) << w & kept_mask;

    const std::uint64_t kept_count = std::uint64_t(1) << kept_wires.size();
    for (std::uint64_t d = 0; d < std::uint64_t(1) << deferred.size(); ++d) {
      const std::uint64_t outcome = spread(d, deferred);
      std::vector<std::vector<Amplitude>> states;
      double probability = 0;
      for (std::uint64_t t = 0; t < std::uint64_t(1) << traced.size(); ++t) {
        const std::uint64_t base = outcome | spread(t, traced);
        std::vector<Amplitude> state(kept_count);
        double weight = 0;
        for (std::uint64_t k = 0; k < kept_count; ++k) {
          const std::uint64_t index = spread(k, kept_wires);
          if ((index & fixed_mask) != (outcome & fixed_mask)) continue;
          state[k] = run.state.get((base & ~fixed_mask) | index);
          weight += std::norm(state[k]);
        }
        if (weight <= negligible) continue;
        probability += weight;
        if (!kept_wires.empty()) {
          stored_ += kept_count;
          if (stored_ > most_amplitudes) throw Unsupported("so many final states");
          states.push_back(std::move(state));
        }
      }
      if (probability == 0) continue;
      Ending& ending = endings_.by_bits[key(run, d)];
      ending.probability += probability;
      for (auto& state : states) ending.states.push_back(std::move(state));
    }
    const std::uint64_t ancilla_mask = spread(~std::uint64_t(0), ancillas);
    for (std::uint64_t k = 0; ancilla_mask != 0 && k < run.state.dimension(); ++k) {
      if (k & ancilla_mask) endings_.stray += std::norm(run.state.get(k));
    }
  }

  /// The bits after the deferred measurements gave `outcomes`, bit j for the j-th of them.
  std::string key(const Run& run, std::uint64_t outcomes) const {
    Memory memory = run.memory;
    std::size_t next = 0;
    for (std::size_t k = 0; k < deferral_.waits.size(); ++k) {
      if (!deferral_.waits[k]) continue;
      const Operation& op = circuit_.body()[k];
      if (op.kind == Kind::measure) {
        if (op.payload != no_bit) memory.set_bit(op.payload, outcomes >> next & 1);
        ++next;
      } else {
        classical(memory, op);
      }
    }
    return memory.key(shown_);
  }

  /// A deferred statement or branch of statements.
  void classical(Memory& memory, const Operation& op) const {
    if (op.kind == Kind::classical) return memory.run(circuit_.statements[op.payload]);
    const auto block = chosen_block(memory, circuit_.branches[op.payload]);
    if (!block) return;
    for (const Operation& inner : circuit_.blocks[*block]) classical(memory, inner);
  }

  const Circuit& circuit_;
  std::span<const double> inputs_;
  std::span<const std::uint32_t> shown_;
  const std::vector<bool>& kept_;
  bool ends_clean_;
  const RunLimits& limits_;
  Deferral deferral_;
  std::uint32_t references_ = 0;
  std::map<std::pair<std::uint32_t, std::size_t>, std::vector<Kernel>> kernels_;
  Endings endings_;
  std::size_t splits_ = 0;
  std::size_t stored_ = 0;
  bool is_cut_ = false;
  bool starts_round_ = false;
  std::vector<Run> waiting_;
};

}  // namespace

Endings endings_of(const Circuit& circuit, const Start& start, std::span<const double> inputs,
                   std::span<const std::uint32_t> shown, const std::vector<bool>& kept, bool ends_clean,
                   const RunLimits& limits) {
  return Runner(circuit, inputs, shown, kept, ends_clean, limits).result(start);
}

std::vector<bool> kept_qubits(const Circuit& circuit) {
  std::vector<bool> is_measured_last(circuit.wires, false);
  for (const Operation& op : circuit.body()) {
    if (op.kind == Kind::barrier || op.kind == Kind::delay) continue;
    for (const auto w : circuit.operands(op)) is_measured_last[w] = op.kind == Kind::measure;
  }
  std::vector<bool> kept(circuit.source_qubits);
  for (std::uint32_t q = 0; q < circuit.source_qubits; ++q) kept[q] = !is_measured_last[circuit.end_wire[q]];
  return kept;
}

}  // namespace isinglass
