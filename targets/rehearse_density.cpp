// The rehearsal by density matrices: exact, for a few ions; see rehearse.h.
//
// The matrix of m wires is a state of 2m: wire w of the left index, wire m + w of the right one. A unitary
// acts on both (on the right complex conjugate), a channel is a mixture.
#include <algorithm>
#include <cmath>

#include "targets/rehearse_stage.h"

namespace isinglass {

namespace {

class Density {
 public:
  explicit Density(const State& pure) : wires_(pure.wires()), matrix_(2 * pure.wires(), 0) {
    for (std::uint64_t i = 0; i < pure.dimension(); ++i) {
      for (std::uint64_t j = 0; j < pure.dimension(); ++j) {
        matrix_.set(j << wires_ | i, 0, pure.get(i) * std::conj(pure.get(j)));
      }
    }
  }

  /// K rho K^dagger.
  void apply(const Kernel& k) { apply(matrix_, k); }

  /// Rho becomes (1 - p) rho + p (K2 K1) rho (K2 K1)^dagger.
  void mix(double p, std::initializer_list<Kernel> kernels) {
    if (p <= 0) return;
    State other = matrix_;
    for (const Kernel& k : kernels) apply(other, k);
    blend(p, other);
  }

  /// With probability p one of the Paulis but the identity, all alike. With the identity among them they
  /// would leave nothing of the wires: they are replaced by the mixed state.
  void depolarize(double p, std::initializer_list<std::uint32_t> wires) {
    if (p <= 0) return;
    const double all = std::pow(4.0, static_cast<double>(wires.size()));
    State other = matrix_;
    for (const std::uint32_t w : wires) {
      other.apply({{}, {w, wires_ + w}, {0.5, 0, 0, 0.5, 0, 0, 0, 0, 0, 0, 0, 0, 0.5, 0, 0, 0.5}});
    }
    blend(p * all / (all - 1), other);
  }

  void reset(std::uint32_t w) {
    matrix_.apply({{}, {w, wires_ + w}, {1, 0, 0, 1, 0, 0, 0, 0, 0, 0, 0, 0, 0, 0, 0, 0}});
  }

  double probability(std::uint64_t basis) const { return matrix_.get(basis << wires_ | basis).real(); }

  double fidelity(const State& pure) const {
    Amplitude sum = 0;
    for (std::uint64_t i = 0; i < pure.dimension(); ++i) {
      for (std::uint64_t j = 0; j < pure.dimension(); ++j) {
        sum += std::conj(pure.get(i)) * matrix_.get(j << wires_ | i) * pure.get(j);
      }
    }
    return sum.real();
  }

 private:
  void apply(State& state, const Kernel& k) const {
    state.apply(k);
    Kernel right = k;
    for (std::uint32_t& w : right.controls) w += wires_;
    for (std::uint32_t& w : right.targets) w += wires_;
    for (Amplitude& entry : right.matrix) entry = std::conj(entry);
    state.apply(right);
  }

  void blend(double p, const State& other) {
    for (std::uint64_t k = 0; k < matrix_.dimension(); ++k) {
      matrix_.set(k, 0, (1 - p) * matrix_.get(k) + p * other.get(k));
    }
  }

  std::uint32_t wires_;
  State matrix_;
};

class ExactRun {
 public:
  ExactRun(const Stage& stage, bool is_noisy)
      : stage_(stage),
        is_noisy_(is_noisy),
        density_(stage.first_state()),
        is_alive_(stage.placed.circuit.wires, false),
        flip_(stage.placed.circuit.bits, 0) {
    if (!stage.promise.zero_start) {
      for (const std::uint32_t ion : stage.placed.start) is_alive_[ion] = true;
    }
  }

  void run(const std::function<void(double)>& progress) {
    const auto& list = stage_.timed.blocks[0].operations;
    for (std::size_t i = 0; i < list.size(); ++i) {
      step(list[i]);
      if (progress) progress(static_cast<double>(i + 1) / static_cast<double>(list.size()));
    }
  }

  const Density& density() const { return density_; }
  /// Probability that the readout of a bit is wrong.
  double flip(std::uint32_t bit) const { return flip_[bit]; }

 private:
  void step(const TimedOperation& entry) {
    const Operation* op = stage_.operation(0, entry);
    switch (entry.kind) {
      case TimedKind::prepare:
        err(entry.error, {pauli(stage_.wire_of[entry.ion[0]], 1)});
        break;
      case TimedKind::r:
      case TimedKind::xx:
        density_.apply(stage_.kernels[0][entry.operation]);
        gate_errors(entry, *op);
        break;
      case TimedKind::rz:
        density_.apply(stage_.kernels[0][entry.operation]);
        break;
      case TimedKind::measure:
        if (op->payload != no_bit && is_noisy_) flip_[op->payload] = entry.error;
        is_alive_[op->operand[0]] = false;
        break;
      case TimedKind::reset:
        density_.reset(stage_.wire_of[op->operand[0]]);
        err(entry.error, {pauli(stage_.wire_of[op->operand[0]], 1)});
        is_alive_[op->operand[0]] = false;
        break;
      case TimedKind::wait:
        if (op == nullptr) {
          idle(entry.ion[0], entry.takes);
        } else {
          for (const std::uint32_t ion : stage_.placed.circuit.operands(*op)) idle(ion, entry.takes);
        }
        break;
      default:
        break;
    }
  }

  void idle(std::uint32_t ion, double us) {
    if (is_alive_[ion]) err(stage_.target.ion[ion].idle_error(us), {pauli(stage_.wire_of[ion], 3)});
  }

  void gate_errors(const TimedOperation& entry, const Operation& op) {
    const std::uint32_t a = stage_.wire_of[op.operand[0]];
    is_alive_[op.operand[0]] = true;
    if (entry.kind == TimedKind::xx) is_alive_[op.operand[1]] = true;
    if (!is_noisy_) return;
    if (entry.kind == TimedKind::xx) {
      density_.depolarize(Stage::own_error(entry), {a, stage_.wire_of[op.operand[1]]});
    } else {
      density_.depolarize(Stage::own_error(entry), {a});
    }
    const Leaks leaks = leaks_of(op, stage_.placed, stage_.target);
    const double p = Stage::leak_error(entry, leaks);
    for (const Leak& leak : leaks.all()) {
      const std::uint32_t wire = stage_.wire_of[leak.ion];
      const Kernel lit = equator(wire == nowhere ? 0 : wire, stage_.angle(op, 1 + leak.meant));
      if (!leak.has_partner) {
        err(p, {lit});
        continue;
      }
      const Kernel partner = equator(stage_.wire_of[leak.partner], stage_.angle(op, 2 - leak.meant));
      if (wire == nowhere) {
        err(p, {partner});
      } else {
        err(p, {lit, partner});
      }
    }
  }

  /// An error that happens with probability p.
  void err(double p, std::initializer_list<Kernel> kernels) {
    if (is_noisy_) density_.mix(p, kernels);
  }

  const Stage& stage_;
  bool is_noisy_;
  Density density_;
  std::vector<bool> is_alive_;
  std::vector<double> flip_;
};

/// The bits' distribution from the probabilities of all basis states.
Distribution read_out(const Stage& stage, const ExactRun& run) {
  std::vector<std::pair<std::uint32_t, std::uint32_t>> readings;  // wire, bit
  for (const Operation& op : stage.placed.circuit.body()) {
    if (op.kind == Kind::measure && op.payload != no_bit) {
      readings.emplace_back(stage.wire_of[op.operand[0]], op.payload);
    }
  }
  std::vector<double> of_bits(std::size_t{1} << readings.size(), 0.0);
  for (std::uint64_t basis = 0; basis < std::uint64_t{1} << (stage.wires + stage.references); ++basis) {
    std::size_t index = 0;
    for (std::size_t k = 0; k < readings.size(); ++k) index |= (basis >> readings[k].first & 1) << k;
    of_bits[index] += run.density().probability(basis);
  }
  for (std::size_t k = 0; k < readings.size(); ++k) {
    const double p = run.flip(readings[k].second);
    for (std::size_t index = 0; index < of_bits.size(); ++index) {
      if ((index >> k & 1) != 0) continue;
      const std::size_t other = index | std::size_t{1} << k;
      const double zero = of_bits[index];
      const double one = of_bits[other];
      of_bits[index] = (1 - p) * zero + p * one;
      of_bits[other] = (1 - p) * one + p * zero;
    }
  }
  Distribution result;
  for (std::size_t index = 0; index < of_bits.size(); ++index) {
    if (of_bits[index] < 1e-12) continue;
    Memory memory(stage.placed.circuit, stage.inputs);
    for (std::size_t k = 0; k < readings.size(); ++k)
      memory.set_bit(readings[k].second, (index >> k & 1) != 0);
    result[stage.text(memory)] += of_bits[index];
  }
  return result;
}

}  // namespace

Rehearsal rehearse_exactly(const Stage& stage, const RehearseOptions& options) {
  Rehearsal result;
  result.method = Rehearsal::Method::density_matrix;
  ExactRun noisy(stage, true);
  noisy.run(options.progress);
  if (stage.is_unitary) result.fidelity = noisy.density().fidelity(stage.last_state());
  if (!stage.measures) return result;
  ExactRun ideal(stage, false);
  ideal.run({});
  compare(result, read_out(stage, ideal), read_out(stage, noisy));
  return result;
}

}  // namespace isinglass
