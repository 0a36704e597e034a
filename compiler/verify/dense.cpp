// Unitaries and state vectors of both circuits, next to each other; see dense.h.
#include "verify/dense.h"

#include <chrono>
#include <cmath>
#include <future>
#include <set>

#include "verify/memory.h"
#include "verify/outcomes.h"

namespace isinglass {

namespace {

using Clock = std::chrono::steady_clock;

constexpr unsigned block_bits = 22;  // amplitudes of one circuit that are held at once, as a power of 2

std::uint64_t spread(std::uint64_t k, std::span<const std::uint32_t> wires) {
  std::uint64_t index = 0;
  for (std::size_t j = 0; j < wires.size(); ++j) index |= (k >> j & 1) << wires[j];
  return index;
}

std::uint64_t mask_of(std::span<const std::uint32_t> wires) {
  return spread(~std::uint64_t(0), wires);
}

Amplitude direction(Amplitude overlap) {
  return std::abs(overlap) < 1e-12 ? Amplitude(1) : overlap / std::abs(overlap);
}

void run(State& state, std::span<const Kernel> kernels, Clock::time_point deadline) {
  for (const Kernel& kernel : kernels) {
    if (Clock::now() > deadline) throw Unsupported("the time given");
    state.apply(kernel);
  }
}

/// Applies both circuits, one a thread where two are allowed.
void run_both(const Job& job, State& a, State& b, std::span<const Kernel> left,
              std::span<const Kernel> right) {
  if (job.options.threads < 2) {
    run(a, left, job.options.deadline);
    run(b, right, job.options.deadline);
    return;
  }
  auto other = std::async(std::launch::async, [&] { run(b, right, job.options.deadline); });
  run(a, left, job.options.deadline);
  other.get();
}

/// The gates alone.
std::vector<Kernel> gates_of(const Circuit& circuit, std::span<const double> inputs) {
  Block gates;
  for (const Operation& op : circuit.body()) {
    if (op.is_unitary()) gates.push_back(op);
  }
  return fused(circuit, gates, inputs);
}

// ---- unitaries ----

/// Compares the columns of two unitaries, block by block.
class Columns {
 public:
  explicit Columns(const Job& job) : job_(job) {}

  void include(const State& a, const State& b) {
    const std::uint64_t rows = std::uint64_t(1) << job_.source.source_qubits;
    Amplitude overlap = 0;
    const auto each_row = [&](const auto& visit) {
      for (std::uint64_t r = 0; r < rows; ++r) {
        const std::uint64_t ra = spread(r, job_.source.end_wire);
        const std::uint64_t rb = spread(r, job_.compiled.end_wire);
        for (std::uint64_t c = 0; c < a.columns(); ++c) visit(a.get(ra, c), b.get(rb, c), c);
      }
    };
    each_row([&](Amplitude x, Amplitude y, std::uint64_t) { overlap += std::conj(x) * y; });
    if (columns_ == 0) phase_ = direction(overlap);
    overlap_ += overlap;
    columns_ += a.columns();
    std::vector<double> deviation(a.columns());
    each_row([&](Amplitude x, Amplitude y, std::uint64_t c) { deviation[c] += std::norm(phase_ * x - y); });
    add_stray(a, job_.source, deviation);
    add_stray(b, job_.compiled, deviation);
    for (const double d : deviation) distance_ = std::max(distance_, std::sqrt(d));
  }

  Deviation result() const { return {distance_, 1 - std::norm(overlap_ / static_cast<double>(columns_)), 0}; }

 private:
  /// Weight of the part in which a wire without a source qubit is not |0>.
  static void add_stray(const State& state, const Circuit& circuit, std::vector<double>& deviation) {
    const std::uint64_t stray = (state.dimension() - 1) & ~mask_of(circuit.end_wire);
    for (std::uint64_t r = 0; stray != 0 && r < state.dimension(); ++r) {
      if ((r & stray) == 0) continue;
      for (std::uint64_t c = 0; c < state.columns(); ++c) deviation[c] += std::norm(state.get(r, c));
    }
  }

  const Job& job_;
  Amplitude phase_ = 1;
  Amplitude overlap_ = 0;
  std::uint64_t columns_ = 0;
  double distance_ = 0;
};

// ---- states ----

/// Where the final amplitudes of a circuit stand: bit j of an outcome is the wire of the j-th measured bit.
struct Layout {
  std::vector<std::uint32_t> measured;
  std::vector<std::uint32_t> kept;    // end wires of the source qubits that are kept
  std::vector<std::uint32_t> traced;  // whatever may be anything
  std::uint64_t stray = 0;            // wires that must end in |0>
};

/// kept: by source qubit.
Layout layout_of(const Circuit& circuit, const std::vector<bool>& kept, bool ends_clean) {
  Layout layout;
  std::vector<std::pair<std::uint32_t, std::uint32_t>> bits;
  for (const Operation& op : circuit.body()) {
    if (op.kind == Kind::measure) bits.emplace_back(op.payload, circuit.operands(op)[0]);
  }
  std::sort(bits.begin(), bits.end());
  for (const auto& [bit, wire] : bits) layout.measured.push_back(wire);
  std::uint64_t left = (std::uint64_t(1) << circuit.wires) - 1;
  left &= ~mask_of(layout.measured);
  for (std::uint32_t q = 0; q < circuit.source_qubits; ++q) {
    const std::uint64_t bit = std::uint64_t(1) << circuit.end_wire[q];
    if ((left & bit) == 0) continue;
    left &= ~bit;
    (kept[q] ? layout.kept : layout.traced).push_back(circuit.end_wire[q]);
  }
  if (ends_clean) {
    layout.stray = left;
  } else {
    for (std::uint32_t w = 0; w < circuit.wires; ++w) {
      if (left >> w & 1) layout.traced.push_back(w);
    }
  }
  return layout;
}

double stray_weight(const State& state, std::uint64_t stray) {
  double weight = 0;
  for (std::uint64_t k = 0; stray != 0 && k < state.dimension(); ++k) {
    if (k & stray) weight += std::norm(state.get(k));
  }
  return weight;
}

/// Both states given every outcome, each up to a phase of its own.
Deviation state_deviation(const State& a, const Layout& la, const State& b, const Layout& lb) {
  const std::uint64_t rows = std::uint64_t(1) << la.kept.size();
  double deviation = stray_weight(a, la.stray) + stray_weight(b, lb.stray);
  double fidelity = 0;
  for (std::uint64_t m = 0; m < std::uint64_t(1) << la.measured.size(); ++m) {
    const std::uint64_t ma = spread(m, la.measured);
    const std::uint64_t mb = spread(m, lb.measured);
    Amplitude overlap = 0;
    for (std::uint64_t r = 0; r < rows; ++r) {
      overlap += std::conj(a.get(ma | spread(r, la.kept))) * b.get(mb | spread(r, lb.kept));
    }
    const Amplitude phase = overlap == Amplitude(0) ? Amplitude(1) : overlap / std::abs(overlap);
    for (std::uint64_t r = 0; r < rows; ++r) {
      deviation += std::norm(phase * a.get(ma | spread(r, la.kept)) - b.get(mb | spread(r, lb.kept)));
    }
    fidelity += std::abs(overlap);
  }
  return {std::sqrt(deviation), 1 - fidelity * fidelity, 0};
}

double probability(const State& state, const Layout& layout, std::uint64_t outcome) {
  double sum = 0;
  const std::uint64_t base = spread(outcome, layout.measured);
  for (std::uint64_t t = 0; t < std::uint64_t(1) << layout.traced.size(); ++t) {
    sum += std::norm(state.get(base | spread(t, layout.traced)));
  }
  return sum;
}

/// The distributions of the outcomes alone.
Deviation distribution_deviation(const State& a, const Layout& la, const State& b, const Layout& lb) {
  double deviation = 0;
  double fidelity = 0;
  for (std::uint64_t m = 0; m < std::uint64_t(1) << la.measured.size(); ++m) {
    const double pa = probability(a, la, m);
    const double pb = probability(b, lb, m);
    deviation += std::pow(std::sqrt(pa) - std::sqrt(pb), 2);
    fidelity += std::sqrt(pa * pb);
  }
  return {std::sqrt(deviation), 1 - fidelity * fidelity, 0};
}

/// Writes a product state of the lowest wires.
void fill_product(State& state, std::span<const std::array<Amplitude, 2>> product) {
  std::vector<Amplitude> amplitudes = {1};
  for (const auto& [zero, one] : product) {
    const std::size_t half = amplitudes.size();
    amplitudes.resize(2 * half);
    for (std::size_t k = 0; k < half; ++k) {
      amplitudes[half + k] = amplitudes[k] * one;
      amplitudes[k] *= zero;
    }
  }
  for (std::size_t k = 0; k < amplitudes.size(); ++k) state.set(k, 0, amplitudes[k]);
}

}  // namespace

bool is_fragment(const Circuit& circuit) {
  for (const Operation& op : circuit.body()) {
    if (!op.is_unitary() && op.kind != Kind::barrier && op.kind != Kind::delay) return false;
  }
  return true;
}

bool measures_only_at_end(const Circuit& circuit) {
  std::set<std::uint32_t> done;
  std::set<std::uint32_t> bits;
  for (const Operation& op : circuit.body()) {
    if (op.kind == Kind::barrier || op.kind == Kind::delay) continue;
    if (!op.is_unitary() && op.kind != Kind::measure) return false;
    for (const auto w : circuit.operands(op)) {
      if (done.contains(w)) return false;
    }
    if (op.kind != Kind::measure) continue;
    done.insert(circuit.operands(op)[0]);
    if (op.payload == no_bit || !bits.insert(op.payload).second) return false;
  }
  return true;
}

std::vector<std::array<Amplitude, 2>> random_product(std::uint32_t qubits, std::mt19937_64& engine) {
  std::normal_distribution<double> normal;
  std::vector<std::array<Amplitude, 2>> states(qubits);
  for (auto& [zero, one] : states) {
    zero = Amplitude(normal(engine), normal(engine));
    one = Amplitude(normal(engine), normal(engine));
    const double length = std::sqrt(std::norm(zero) + std::norm(one));
    zero /= length;
    one /= length;
  }
  return states;
}

Deviation by_unitary(const Job& job, const InputValues& inputs) {
  const unsigned qubits = job.source.source_qubits;
  const unsigned wires = std::max(job.source.wires, job.compiled.wires);
  const unsigned batch = std::min(qubits, wires >= block_bits ? 0 : block_bits - wires);
  const auto left = gates_of(job.source, inputs.source);
  const auto right = gates_of(job.compiled, inputs.compiled);
  Columns columns(job);
  for (std::uint64_t block = 0; block < std::uint64_t(1) << (qubits - batch); ++block) {
    State a(job.source.wires, batch);
    State b(job.compiled.wires, batch);
    for (std::uint64_t c = 0; c < a.columns(); ++c) {
      a.set(block * a.columns() + c, c, 1);
      b.set(block * b.columns() + c, c, 1);
    }
    run_both(job, a, b, left, right);
    columns.include(a, b);
  }
  return columns.result();
}

int state_count(const Job& job) {
  if (job.promise.zero_start) return 1;
  const unsigned wires = std::max(job.source.wires, job.compiled.wires);
  const int affordable = wires <= 16 ? 4 : wires <= 19 ? 2 : 1;
  return std::min(affordable, std::max(1, job.options.states));
}

Deviation by_states(const Job& job, const InputValues& inputs) {
  const auto left = gates_of(job.source, inputs.source);
  const auto right = gates_of(job.compiled, inputs.compiled);
  const bool bits_only = job.promise.keep_bits_only;
  std::vector<bool> kept = kept_qubits(job.source);
  if (bits_only) kept.assign(kept.size(), false);
  const Layout la = layout_of(job.source, kept, !bits_only);
  const Layout lb = layout_of(job.compiled, kept, !bits_only);
  std::mt19937_64 engine(job.options.seed);
  Deviation deviation;
  for (int k = state_count(job); k > 0; --k) {
    State a(job.source.wires, 0);
    State b(job.compiled.wires, 0);
    std::vector<std::array<Amplitude, 2>> product(job.source.source_qubits, {1, 0});
    if (!job.promise.zero_start) product = random_product(job.source.source_qubits, engine);
    fill_product(a, product);
    fill_product(b, product);
    run_both(job, a, b, left, right);
    deviation.include(bits_only ? distribution_deviation(a, la, b, lb) : state_deviation(a, la, b, lb));
  }
  return deviation;
}

}  // namespace isinglass
