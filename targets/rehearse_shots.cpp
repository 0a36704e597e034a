// The rehearsal shot by shot; see rehearse.h.
#include <fmt/format.h>

#include <algorithm>
#include <cmath>
#include <exception>
#include <optional>
#include <random>
#include <thread>

#include "targets/rehearse_stage.h"

namespace isinglass {

namespace {

std::uint64_t mixed(
    std::uint64_t x) {  // Steele, Lea, Flood, "Fast splittable pseudorandom number generators" (2014)
  x += 0x9e3779b97f4a7c15u;
  x = (x ^ (x >> 30)) * 0xbf58476d1ce4e5b9u;
  x = (x ^ (x >> 27)) * 0x94d049bb133111ebu;
  return x ^ (x >> 31);
}

class Dice {
 public:
  explicit Dice(std::uint64_t seed) : engine_(mixed(seed)) {}
  double real() { return static_cast<double>(engine_() >> 11) * 0x1p-53; }
  unsigned below(unsigned limit) { return static_cast<unsigned>(real() * limit); }

 private:
  std::mt19937_64 engine_;
};

/// One shot. Errors and outcomes are diced apart, so that the errors of a program without branches are known
/// before the state is.
class Shot {
 public:
  Shot(const Stage& stage, std::uint64_t seed, bool is_noisy)
      : stage_(stage),
        memory_(stage.placed.circuit, stage.inputs),
        errors_(2 * seed),
        outcomes_(2 * seed + 1),
        is_noisy_(is_noisy),
        is_alive_(stage.placed.circuit.wires, false) {
    if (!stage.promise.zero_start) {
      for (const std::uint32_t ion : stage.placed.start) is_alive_[ion] = true;
    }
  }

  /// Only throws the dice for errors; for programs whose errors do not depend on outcomes.
  bool would_err() {
    walk(0);
    return has_erred_;
  }
  void run(State state) {
    state_ = std::move(state);
    walk(0);
  }
  /// Takes outcomes from the final state of a run without errors.
  void read_from(const std::vector<double>& cumulative) {
    const double at = outcomes_.real() * cumulative.back();
    const auto basis = static_cast<std::uint64_t>(
        std::upper_bound(cumulative.begin(), cumulative.end() - 1, at) - cumulative.begin());
    for (const Operation& op : stage_.placed.circuit.body()) {
      if (op.kind != Kind::measure || op.payload == no_bit) continue;
      memory_.set_bit(op.payload, (basis >> stage_.wire_of[op.operand[0]] & 1) != 0);
    }
  }

  bool has_erred() const { return has_erred_; }
  const State& state() const { return *state_; }
  std::string text() const { return stage_.text(memory_); }

 private:
  enum class Flow : std::uint8_t { on, leave_loop, next_round, end };

  bool happens(double probability) {
    if (!is_noisy_ || probability <= 0 || errors_.real() >= probability) return false;
    has_erred_ = true;
    return true;
  }
  void apply(const Kernel& k) {
    if (state_) state_->apply(k);
  }
  void flip(std::uint32_t wire) {
    if (state_) state_->flip(wire);
  }

  Flow walk(std::uint32_t block) {
    for (const TimedOperation& entry : stage_.timed.blocks[block].operations) {
      const Flow flow = step(block, entry);
      if (flow != Flow::on) return flow;
    }
    return Flow::on;
  }

  Flow step(std::uint32_t block, const TimedOperation& entry) {
    const Operation* op = stage_.operation(block, entry);
    switch (entry.kind) {
      case TimedKind::prepare:
        if (happens(entry.error)) flip(stage_.wire_of[entry.ion[0]]);
        break;
      case TimedKind::r:
      case TimedKind::xx:
        apply(stage_.kernels[block][entry.operation]);
        gate_errors(entry, *op);
        break;
      case TimedKind::rz:
        apply(stage_.kernels[block][entry.operation]);
        break;
      case TimedKind::measure:
        measure(entry, *op);
        break;
      case TimedKind::reset:
        if (look(op->operand[0])) flip(stage_.wire_of[op->operand[0]]);
        if (happens(entry.error)) flip(stage_.wire_of[op->operand[0]]);
        is_alive_[op->operand[0]] = false;
        break;
      case TimedKind::wait:
        if (op == nullptr) {
          idle(entry.ion[0], entry.takes);
        } else {
          for (const std::uint32_t ion : stage_.placed.circuit.operands(*op)) idle(ion, entry.takes);
        }
        break;
      case TimedKind::barrier:
        break;
      case TimedKind::compute:
        return compute(stage_.placed.circuit.statements[op->payload]);
      case TimedKind::decide:
        return decide(stage_.placed.circuit.branches[op->payload]);
    }
    return Flow::on;
  }

  void gate_errors(const TimedOperation& entry, const Operation& op) {
    const bool is_pair = entry.kind == TimedKind::xx;
    is_alive_[op.operand[0]] = true;
    if (is_pair) is_alive_[op.operand[1]] = true;
    if (happens(Stage::own_error(entry))) {
      const unsigned which = 1 + errors_.below(is_pair ? 15 : 3);  // any Pauli but the identity
      if (which % 4 != 0) apply(pauli(stage_.wire_of[op.operand[0]], which % 4));
      if (which / 4 != 0) apply(pauli(stage_.wire_of[op.operand[1]], which / 4));
    }
    const Leaks leaks = leaks_of(op, stage_.placed, stage_.target);
    const double probability = Stage::leak_error(entry, leaks);
    for (const Leak& leak : leaks.all()) {
      if (!happens(probability)) continue;
      const std::uint32_t wire = stage_.wire_of[leak.ion];
      if (wire != nowhere) apply(equator(wire, stage_.angle(op, 1 + leak.meant)));
      if (leak.has_partner) {
        apply(equator(stage_.wire_of[leak.partner], stage_.angle(op, 2 - leak.meant)));
      }
    }
  }

  void idle(std::uint32_t ion, double us) {
    if (is_alive_[ion] && happens(stage_.target.ion[ion].idle_error(us)))
      apply(pauli(stage_.wire_of[ion], 3));
  }

  /// The outcome of looking at an ion; the state is left normalized. False before there is a state.
  bool look(std::uint32_t ion) {
    if (!state_) return false;
    const std::uint32_t wire = stage_.wire_of[ion];
    const double one = state_->weight(wire, true);
    const double zero = state_->weight(wire, false);
    const bool is_one = outcomes_.real() * (one + zero) < one;
    state_->project(wire, is_one);
    const double scale = 1 / std::sqrt(is_one ? one : zero);
    state_->apply({{}, {wire}, {scale, 0, 0, scale}});
    return is_one;
  }

  void measure(const TimedOperation& entry, const Operation& op) {
    const bool seen = look(op.operand[0]);
    const bool is_wrong = happens(entry.error);
    if (op.payload != no_bit) memory_.set_bit(op.payload, seen != is_wrong);
    is_alive_[op.operand[0]] = false;
  }

  Flow compute(const ClassicalStatement& statement) {
    switch (statement.kind) {
      case ClassicalStatement::Kind::leave_loop:
        return Flow::leave_loop;
      case ClassicalStatement::Kind::next_round:
        return Flow::next_round;
      case ClassicalStatement::Kind::end_program:
        return Flow::end;
      case ClassicalStatement::Kind::raw:
        return Flow::on;
      default:
        memory_.run(statement);
        return Flow::on;
    }
  }

  Flow decide(const Branch& branch) {
    constexpr std::size_t most_rounds = 10000;
    if (branch.kind == Branch::Kind::if_else) {
      const std::size_t arm = truth(memory_.evaluate(branch.condition)) ? 0 : 1;
      return arm < branch.arms.size() ? walk(branch.arms[arm].block) : Flow::on;
    }
    if (branch.kind == Branch::Kind::switch_case) return choose(branch);
    const bool counts = branch.kind == Branch::Kind::for_loop;
    const std::vector<Value> values = counts ? memory_.round_values(branch.condition) : std::vector<Value>{};
    for (std::size_t round = 0; round < most_rounds; ++round) {
      if (counts ? round >= values.size() : !truth(memory_.evaluate(branch.condition))) return Flow::on;
      if (counts) memory_.set_variable(branch.variable, values[round]);
      const Flow flow = walk(branch.arms[0].block);
      if (flow == Flow::end) return flow;
      if (flow == Flow::leave_loop) return Flow::on;
    }
    throw Unsupported(fmt::format("a loop went on for more than {} rounds", most_rounds));
  }

  Flow choose(const Branch& branch) {
    const Value selector = memory_.evaluate(branch.condition);
    const Branch::Arm* otherwise = nullptr;
    for (const Branch::Arm& arm : branch.arms) {
      if (arm.labels.empty()) otherwise = &arm;
      for (const Expression& label : arm.labels) {
        if (cast(memory_.evaluate(label), selector.type, selector.width).whole == selector.whole) {
          return walk(arm.block);
        }
      }
    }
    return otherwise != nullptr ? walk(otherwise->block) : Flow::on;
  }

  const Stage& stage_;
  Memory memory_;
  Dice errors_;
  Dice outcomes_;
  bool is_noisy_;
  bool has_erred_ = false;
  std::vector<bool> is_alive_;
  std::optional<State> state_;
};

double overlap(const State& a, const State& b) {
  Amplitude sum = 0;
  for (std::uint64_t i = 0; i < a.dimension(); ++i) sum += std::conj(a.get(i)) * b.get(i);
  return std::norm(sum);
}

/// What the shots of one thread gave.
struct Harvest {
  std::map<std::string, std::size_t> without_noise;
  std::map<std::string, std::size_t> with_noise;
  std::size_t clean = 0;
};

class Trajectories {
 public:
  Trajectories(const Stage& stage, const RehearseOptions& options)
      : stage_(stage), options_(options), first_(stage.first_state()) {
    if (!stage.is_straight || stage.resets || !stage.reads_at_end) return;
    last_ = stage.last_state();
    double sum = 0;
    for (std::uint64_t i = 0; stage.measures && i < last_->dimension(); ++i) {
      cumulative_.push_back(sum += std::norm(last_->get(i)));
    }
  }

  Rehearsal run() {
    const unsigned threads = std::max(options_.threads, 1u);
    std::vector<Harvest> harvests(threads);
    std::vector<std::exception_ptr> troubles(threads);
    overlaps_.assign(stage_.is_unitary ? options_.shots : 0, 0.0);
    const auto work = [&](unsigned t) {
      try {
        for (std::size_t shot = t; shot < options_.shots; shot += threads) {
          take(shot, harvests[t]);
          if (t == 0 && options_.progress) {
            options_.progress(static_cast<double>(shot + 1) / static_cast<double>(options_.shots));
          }
        }
      } catch (...) {
        troubles[t] = std::current_exception();
      }
    };
    std::vector<std::thread> others;
    for (unsigned t = 1; t < threads; ++t) others.emplace_back(work, t);
    work(0);
    for (std::thread& other : others) other.join();
    for (const std::exception_ptr& trouble : troubles) {
      if (trouble) std::rethrow_exception(trouble);
    }
    return result(harvests);
  }

 private:
  void take(std::size_t number, Harvest& harvest) {
    const std::uint64_t seed = mixed(options_.seed) + number;
    if (stage_.measures) {
      Shot ideal(stage_, mixed(~seed), false);
      finish(ideal, false);
      ++harvest.without_noise[ideal.text()];
    }
    // Shots without errors, the most, share one final state.
    bool errs = true;
    if (last_) errs = Shot(stage_, seed, true).would_err();
    Shot noisy(stage_, seed, true);
    finish(noisy, errs);
    if (!noisy.has_erred()) ++harvest.clean;
    if (stage_.measures) ++harvest.with_noise[noisy.text()];
    if (stage_.is_unitary) overlaps_[number] = errs ? overlap(*last_, noisy.state()) : 1;
  }

  void finish(Shot& shot, bool errs) const {
    if (errs || !last_) {
      shot.run(first_);
    } else if (stage_.measures) {
      shot.read_from(cumulative_);
    }
  }

  Rehearsal result(const std::vector<Harvest>& harvests) const {
    Rehearsal result;
    result.method = Rehearsal::Method::trajectories;
    result.shots = options_.shots;
    const auto shots = static_cast<double>(std::max<std::size_t>(options_.shots, 1));
    Harvest all;
    for (const Harvest& harvest : harvests) {
      all.clean += harvest.clean;
      for (const auto& [bits, count] : harvest.without_noise) all.without_noise[bits] += count;
      for (const auto& [bits, count] : harvest.with_noise) all.with_noise[bits] += count;
    }
    result.no_error = static_cast<double>(all.clean) / shots;
    result.no_error_deviation = std::sqrt(result.no_error * (1 - result.no_error) / shots);
    if (stage_.is_unitary) {
      double sum = 0;
      double squares = 0;
      for (const double f : overlaps_) {
        sum += f;
        squares += f * f;
      }
      result.fidelity = sum / shots;
      result.fidelity_deviation =
          std::sqrt(std::max(squares / shots - result.fidelity * result.fidelity, 0.0) / shots);
    }
    const auto shares = [&](const std::map<std::string, std::size_t>& counts) {
      Distribution distribution;
      for (const auto& [bits, count] : counts) distribution[bits] = static_cast<double>(count) / shots;
      return distribution;
    };
    compare(result, shares(all.without_noise), shares(all.with_noise));
    return result;
  }

  const Stage& stage_;
  const RehearseOptions& options_;
  const State first_;
  std::optional<State> last_;       // without errors, where it is the same for every shot
  std::vector<double> cumulative_;  // of its probabilities
  std::vector<double> overlaps_;    // of each shot with it
};

}  // namespace

Rehearsal rehearse_by_shots(const Stage& stage, const RehearseOptions& options) {
  return Trajectories(stage, options).run();
}

}  // namespace isinglass
