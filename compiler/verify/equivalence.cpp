// Choosing how to compare two programs, and comparing them densely; see equivalence.h.
#include "verify/equivalence.h"

#include <fmt/format.h>

#include <Eigen/Dense>
#include <algorithm>
#include <cmath>
#include <future>
#include <random>

#include "verify/outcomes.h"
#include "verify/state.h"
#include "verify/trim.h"

namespace isinglass {

namespace {

using Clock = std::chrono::steady_clock;

/// What one comparison measured; the largest values over all that were made.
struct Deviation {
  double distance = 0;
  double infidelity = 0;
  double cut = 0;  // weight of runs that were left out

  void include(const Deviation& other) {
    distance = std::max(distance, other.distance);
    infidelity = std::max(infidelity, other.infidelity);
    cut = std::max(cut, other.cut);
  }
};

struct Job {
  const Circuit& source;
  const Circuit& compiled;
  const Promise& promise;
  const CheckOptions& options;
};

std::uint64_t spread(std::uint64_t k, std::span<const std::uint32_t> wires) {
  std::uint64_t index = 0;
  for (std::size_t j = 0; j < wires.size(); ++j) {
    if (k >> j & 1) index |= std::uint64_t(1) << wires[j];
  }
  return index;
}

void run(State& state, std::span<const Kernel> kernels, Clock::time_point deadline) {
  for (const Kernel& kernel : kernels) {
    if (Clock::now() > deadline) throw Unsupported("the time given");
    state.apply(kernel);
  }
}

// ---- circuits without measurements: columns of amplitudes ----

/// Fills the columns of a state whose source qubits are the lowest wires; the argument tells which block of
/// columns.
using Fill = void (*)(State& state, std::uint64_t block, std::uint64_t seed);

void fill_zero(State& state, std::uint64_t, std::uint64_t) {
  state.set(0, 0, 1);
}

void fill_basis(State& state, std::uint64_t block, std::uint64_t) {
  for (std::uint64_t c = 0; c < state.columns(); ++c) state.set(block * state.columns() + c, c, 1);
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

/// Writes a product state of the lowest wires into one column.
void fill_product(State& state, std::uint64_t column, std::span<const std::array<Amplitude, 2>> product) {
  std::vector<Amplitude> amplitudes = {1};
  for (const auto& [zero, one] : product) {
    const std::size_t half = amplitudes.size();
    amplitudes.resize(2 * half);
    for (std::size_t k = 0; k < half; ++k) {
      amplitudes[half + k] = amplitudes[k] * one;
      amplitudes[k] *= zero;
    }
  }
  for (std::size_t k = 0; k < amplitudes.size(); ++k) state.set(k, column, amplitudes[k]);
}

/// Compares the final columns of two runs up to one phase for all columns or one for each.
class Columns {
 public:
  Columns(const Job& job, bool one_phase) : job_(job), one_phase_(one_phase) {}

  void include(const State& a, const State& b) {
    const std::uint64_t rows = std::uint64_t(1) << job_.source.source_qubits;
    std::vector<Amplitude> overlap(a.columns());
    for (std::uint64_t r = 0; r < rows; ++r) {
      const std::uint64_t ra = spread(r, job_.source.end_wire);
      const std::uint64_t rb = spread(r, job_.compiled.end_wire);
      for (std::uint64_t c = 0; c < a.columns(); ++c) overlap[c] += std::conj(a.get(ra, c)) * b.get(rb, c);
    }
    Amplitude sum = 0;
    for (const Amplitude& o : overlap) sum += o;
    if (one_phase_ && total_ == Amplitude(0)) phase_ = direction(sum);
    total_ += sum;
    columns_ += a.columns();
    std::vector<double> deviation(a.columns());
    for (std::uint64_t r = 0; r < rows; ++r) {
      const std::uint64_t ra = spread(r, job_.source.end_wire);
      const std::uint64_t rb = spread(r, job_.compiled.end_wire);
      for (std::uint64_t c = 0; c < a.columns(); ++c) {
        const Amplitude phase = one_phase_ ? phase_ : direction(overlap[c]);
        deviation[c] += std::norm(phase * a.get(ra, c) - b.get(rb, c));
      }
    }
    add_stray(a, job_.source, deviation);
    add_stray(b, job_.compiled, deviation);
    for (std::uint64_t c = 0; c < a.columns(); ++c) {
      measured_.distance = std::max(measured_.distance, std::sqrt(deviation[c]));
      if (!one_phase_) measured_.infidelity = std::max(measured_.infidelity, 1 - std::norm(overlap[c]));
    }
  }

  Deviation result() const {
    Deviation d = measured_;
    if (one_phase_) d.infidelity = 1 - std::norm(total_ / static_cast<double>(columns_));
    return d;
  }

 private:
  static Amplitude direction(Amplitude overlap) {
    return std::abs(overlap) < 1e-12 ? Amplitude(1) : overlap / std::abs(overlap);
  }

  /// Weight of the part in which a wire without a source qubit is not |0>.
  static void add_stray(const State& state, const Circuit& circuit, std::vector<double>& deviation) {
    std::uint64_t mask = state.dimension() - 1;
    for (const auto w : circuit.end_wire) mask &= ~(std::uint64_t(1) << w);
    if (mask == 0) return;
    for (std::uint64_t r = 0; r < state.dimension(); ++r) {
      if ((r & mask) == 0) continue;
      for (std::uint64_t c = 0; c < state.columns(); ++c) deviation[c] += std::norm(state.get(r, c));
    }
  }

  const Job& job_;
  bool one_phase_;
  Amplitude phase_ = 1;
  Amplitude total_ = 0;
  std::uint64_t columns_ = 0;
  Deviation measured_;
};

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

constexpr unsigned block_bits = 22;  // amplitudes of one circuit that are held at once

Deviation by_unitary(const Job& job, std::span<const double> inputs,
                     std::span<const double> inputs_compiled) {
  const unsigned qubits = job.source.source_qubits;
  const unsigned wires = std::max(job.source.wires, job.compiled.wires);
  const unsigned batch = std::min(qubits, wires >= block_bits ? 0 : block_bits - wires);
  const auto left = fused(job.source, job.source.body(), inputs);
  const auto right = fused(job.compiled, job.compiled.body(), inputs_compiled);
  Columns columns(job, true);
  for (std::uint64_t block = 0; block < std::uint64_t(1) << (qubits - batch); ++block) {
    State a(job.source.wires, batch);
    State b(job.compiled.wires, batch);
    fill_basis(a, block, 0);
    fill_basis(b, block, 0);
    run_both(job, a, b, left, right);
    columns.include(a, b);
  }
  return columns.result();
}

Deviation by_states(const Job& job, std::span<const double> inputs, std::span<const double> inputs_compiled,
                    bool zero_start) {
  const auto left = fused(job.source, job.source.body(), inputs);
  const auto right = fused(job.compiled, job.compiled.body(), inputs_compiled);
  // Two states at once keep the loops busy without doubling the memory often.
  const int rounds = zero_start ? 1 : job.options.states;
  Columns columns(job, false);
  std::mt19937_64 engine(job.options.seed);
  for (int round = 0; round < rounds; ++round) {
    State a(job.source.wires, 0);
    State b(job.compiled.wires, 0);
    if (zero_start) {
      fill_zero(a, 0, 0);
      fill_zero(b, 0, 0);
    } else {
      const auto product = random_product(job.source.source_qubits, engine);
      fill_product(a, 0, product);
      fill_product(b, 0, product);
    }
    run_both(job, a, b, left, right);
    columns.include(a, b);
  }
  return columns.result();
}

// ---- programs with measurements ----

/// Distance of two ensembles of unnormalized vectors: of the vectors where there is one each, else of the
/// density matrices in the space that both span.
double ensemble_distance(const std::vector<std::vector<Amplitude>>& a,
                         const std::vector<std::vector<Amplitude>>& b) {
  const auto rows = static_cast<Eigen::Index>(a.empty() ? b[0].size() : a[0].size());
  const auto matrix = [&](const std::vector<std::vector<Amplitude>>& states) {
    Eigen::MatrixXcd m(rows, static_cast<Eigen::Index>(states.size()));
    for (std::size_t k = 0; k < states.size(); ++k) {
      m.col(static_cast<Eigen::Index>(k)) = Eigen::Map<const Eigen::VectorXcd>(states[k].data(), rows);
    }
    return m;
  };
  const Eigen::MatrixXcd ma = matrix(a);
  const Eigen::MatrixXcd mb = matrix(b);
  if (a.size() == 1 && b.size() == 1) {
    const Amplitude overlap = ma.col(0).dot(mb.col(0));
    const Amplitude phase = std::abs(overlap) < 1e-12 ? Amplitude(1) : overlap / std::abs(overlap);
    return (phase * ma - mb).norm();
  }
  const Eigen::Index all = ma.cols() + mb.cols();
  if (rows <= 256 || rows <= all) return (ma * ma.adjoint() - mb * mb.adjoint()).norm();
  Eigen::MatrixXcd both(rows, all);
  both << ma, mb;
  const Eigen::HouseholderQR<Eigen::MatrixXcd> qr(both);
  const Eigen::MatrixXcd q = qr.householderQ() * Eigen::MatrixXcd::Identity(rows, all);
  const Eigen::MatrixXcd ra = q.adjoint() * ma;
  const Eigen::MatrixXcd rb = q.adjoint() * mb;
  return (ra * ra.adjoint() - rb * rb.adjoint()).norm();
}

Deviation endings_deviation(const Endings& a, const Endings& b) {
  Deviation d;
  d.distance = std::sqrt(std::max(a.stray, b.stray));
  d.cut = std::max(a.cut, b.cut);
  static const Ending nothing;
  double variation = 0;
  const auto include = [&](const Ending& left, const Ending& right) {
    variation += std::abs(left.probability - right.probability);
    const double roots = std::abs(std::sqrt(left.probability) - std::sqrt(right.probability));
    d.distance = std::max(d.distance, roots);
    if (left.states.empty() && right.states.empty()) return;
    d.distance = std::max(d.distance, ensemble_distance(left.states, right.states));
  };
  for (const auto& [bits, left] : a.by_bits) {
    const auto other = b.by_bits.find(bits);
    include(left, other == b.by_bits.end() ? nothing : other->second);
  }
  for (const auto& [bits, right] : b.by_bits) {
    if (!a.by_bits.contains(bits)) include(nothing, right);
  }
  d.infidelity = std::max(variation / 2, d.distance * d.distance);
  return d;
}

struct ProgramCheck {
  Deviation deviation;
  std::size_t runs = 0;
  std::size_t endings = 0;
  bool with_references = false;
  int states = 1;
};

/// Variables whose values the promise is about, by their index in both circuits; empty name: the missing one.
struct Shown {
  std::vector<std::uint32_t> source;
  std::vector<std::uint32_t> compiled;
  std::string missing;
};

Shown shown_variables(const Circuit& source, const Circuit& compiled) {
  Shown shown;
  const auto source_name = [](const Variable& v) { return v.source.empty() ? v.name : v.source; };
  for (std::uint32_t k = 0; k < source.variables.size(); ++k) {
    const Variable& wanted = source.variables[k];
    if (wanted.source.empty()) continue;  // made by the compiler
    bool is_found = false;
    for (std::uint32_t j = 0; j < compiled.variables.size() && !is_found; ++j) {
      const Variable& candidate = compiled.variables[j];
      if (source_name(candidate) != wanted.source || candidate.type != wanted.type) continue;
      shown.source.push_back(k);
      shown.compiled.push_back(j);
      is_found = true;
    }
    if (!is_found) shown.missing = wanted.source;
  }
  return shown;
}

ProgramCheck by_branches(const Job& job, const Shown& shown, std::span<const double> inputs,
                         std::span<const double> inputs_compiled) {
  const std::uint32_t qubits = job.source.source_qubits;
  const std::uint32_t wires = std::max(job.source.wires, job.compiled.wires);
  std::vector<bool> kept = kept_qubits(job.source);
  if (job.promise.keep_bits_only) kept.assign(qubits, false);
  const RunLimits limits{job.options.most_branches, job.options.most_rounds, job.options.deadline};
  ProgramCheck check;
  check.with_references = !job.promise.zero_start && wires + qubits <= 12;
  check.states = job.promise.zero_start || check.with_references ? 1 : job.options.states;
  std::mt19937_64 engine(job.options.seed);
  for (int k = 0; k < check.states; ++k) {
    Start start;
    start.with_references = check.with_references;
    if (!job.promise.zero_start && !check.with_references) start.product = random_product(qubits, engine);
    const bool ends_clean = !job.promise.keep_bits_only;
    const Endings a = endings_of(job.source, start, inputs, shown.source, kept, ends_clean, limits);
    const Endings b =
        endings_of(job.compiled, start, inputs_compiled, shown.compiled, kept, ends_clean, limits);
    check.deviation.include(endings_deviation(a, b));
    check.runs = std::max({check.runs, a.runs, b.runs});
    check.endings = std::max({check.endings, a.by_bits.size(), b.by_bits.size()});
  }
  return check;
}

// ---- inputs ----

/// Random values for the inputs of both circuits, equal where the names are equal.
struct Values {
  std::vector<double> source;
  std::vector<double> compiled;
};

Values random_values(const Job& job, std::mt19937_64& engine) {
  Values values;
  values.source.resize(job.source.inputs.size());
  values.compiled.resize(job.compiled.inputs.size());
  for (std::size_t k = 0; k < values.source.size(); ++k) {
    const Input& input = job.source.inputs[k];
    if (input.is_derived) continue;
    const bool is_number = input.type.starts_with("float") || input.type.starts_with("angle");
    double x = is_number ? std::uniform_real_distribution<double>(-pi, pi)(engine)
                         : static_cast<double>(engine() % (input.type.starts_with("b") ? 2 : 4));
    if (input.type.starts_with("angle") && x < 0) x += 2 * pi;
    values.source[k] = x;
    for (std::size_t j = 0; j < values.compiled.size(); ++j) {
      if (!job.compiled.inputs[j].is_derived && job.compiled.inputs[j].name == input.name) {
        values.compiled[j] = x;
      }
    }
  }
  values.source = with_derived(job.source, std::move(values.source));
  values.compiled = with_derived(job.compiled, std::move(values.compiled));
  return values;
}

/// A declared input of the source that the compiled program lacks.
std::string missing_input(const Job& job) {
  for (const Input& input : job.source.inputs) {
    if (input.is_derived) continue;
    const auto same = [&](const Input& other) { return other.name == input.name; };
    if (std::none_of(job.compiled.inputs.begin(), job.compiled.inputs.end(), same)) return input.name;
  }
  return {};
}

bool is_fragment(const Circuit& circuit) {
  for (const Operation& op : circuit.body()) {
    if (!op.is_unitary() && op.kind != Kind::barrier && op.kind != Kind::delay) return false;
  }
  return true;
}

// ---- words ----

Verdict judged(const Job& job, std::string method, const Deviation& d, const std::string& what) {
  Verdict verdict;
  verdict.method = std::move(method);
  verdict.distance = d.distance;
  const bool is_close = d.distance <= job.options.tolerance;
  const bool is_allowed = job.options.infidelity > 0 && d.infidelity <= job.options.infidelity + 1e-12;
  verdict.answer = is_close || is_allowed ? Answer::same : Answer::different;
  verdict.explanation = what;
  if (is_close) {
    verdict.explanation += fmt::format(" Largest deviation {:.1e}.", d.distance);
  } else if (is_allowed) {
    verdict.explanation +=
        fmt::format(" They differ by an infidelity of {:.3g}, within the {:.3g} that was allowed.",
                    d.infidelity, job.options.infidelity);
  } else {
    verdict.explanation += fmt::format(" They differ: deviation {:.3g}, infidelity {:.3g}.", d.distance,
                                       std::max(0.0, d.infidelity));
  }
  return verdict;
}

Verdict not_shown(std::string why) {
  Verdict verdict;
  verdict.method = "none";
  verdict.explanation = std::move(why);
  return verdict;
}

Verdict different(std::string why) {
  Verdict verdict;
  verdict.answer = Answer::different;
  verdict.method = "names";
  verdict.explanation = std::move(why);
  verdict.distance = 1;
  return verdict;
}

std::string for_inputs(const Job& job, int sets) {
  if (job.source.inputs.empty()) return "";
  return fmt::format(
      " This was done with {} random sets of values for the inputs; both programs depend on them smoothly, "
      "so "
      "agreement by chance has probability zero.",
      sets);
}

Verdict compare_fragments(const Job& job) {
  const unsigned qubits = job.source.source_qubits;
  const unsigned wires = std::max(job.source.wires, job.compiled.wires);
  const bool whole = !job.promise.zero_start && qubits + wires <= 2 * job.options.most_unitary_wires;
  const int sets = job.source.inputs.empty() ? 1 : 3;
  std::mt19937_64 engine(job.options.seed);
  Deviation deviation;
  for (int k = 0; k < sets; ++k) {
    const Values values = random_values(job, engine);
    deviation.include(whole ? by_unitary(job, values.source, values.compiled)
                            : by_states(job, values.source, values.compiled, job.promise.zero_start));
  }
  if (whole) {
    return judged(
        job, "unitary", deviation,
        fmt::format("Both unitaries on {} qubits were computed in full and compared up to one global phase: "
                    "this decides for every input state.",
                    qubits) +
            for_inputs(job, sets));
  }
  if (job.promise.zero_start) {
    return judged(
        job, "state", deviation,
        fmt::format("Both final state vectors of {} qubits from |0...0> were computed and compared up to one "
                    "global phase: this decides for a program that starts there.",
                    qubits) +
            for_inputs(job, sets));
  }
  return judged(
      job, "states", deviation,
      fmt::format("State vectors of {} qubits were computed from {} random product states and compared up to "
                  "a phase: different unitaries agree on all of them only by a chance of probability zero.",
                  qubits, job.options.states) +
          for_inputs(job, sets));
}

Verdict compare_programs(const Job& job) {
  const Shown shown = shown_variables(job.source, job.compiled);
  if (!shown.missing.empty()) {
    return different("The compiled program has no variable " + shown.missing + " of the source's type.");
  }
  const int sets = job.source.inputs.empty() ? 1 : 3;
  std::mt19937_64 engine(job.options.seed);
  ProgramCheck check;
  Deviation deviation;
  for (int k = 0; k < sets; ++k) {
    const Values values = random_values(job, engine);
    check = by_branches(job, shown, values.source, values.compiled);
    deviation.include(check.deviation);
  }
  std::string start = "from |0...0>";
  if (!job.promise.zero_start) {
    start = check.with_references ? "on every input state (each qubit entangled with a reference)"
                                  : fmt::format("from {} random product states", check.states);
  }
  const std::string kept =
      job.promise.keep_bits_only
          ? "the joint distribution of the bits"
          : "the joint distribution of the bits and, given them, the state of every qubit not "
            "measured last";
  std::string words = fmt::format(
      "Both programs were run {} through every outcome of their measurements ({} paths, {} values of the "
      "bits): {} were compared.",
      start, check.runs, check.endings, kept);
  if (deviation.cut > 0) {
    words += fmt::format(" Runs of loops beyond {} rounds, of probability {:.1e}, were left out.",
                         job.options.most_rounds, deviation.cut);
  }
  return judged(job, "branches", deviation, words + for_inputs(job, sets));
}

}  // namespace

std::string_view name(Answer answer) {
  switch (answer) {
    case Answer::same:
      return "same";
    case Answer::different:
      return "different";
    case Answer::not_shown:
      return "not shown";
  }
  return "not shown";
}

Verdict compare(const Circuit& source, const Circuit& compiled, const Promise& promise,
                const CheckOptions& options) {
  if (source.source_qubits != compiled.source_qubits) {
    return different(fmt::format("The source has {} qubits, the compiled program {}.", source.source_qubits,
                                 compiled.source_qubits));
  }
  const auto [left, right] = without_idle_wires(source, compiled);
  const Job job{left, right, promise, options};
  if (const std::string name = missing_input(job); !name.empty()) {
    return different("The compiled program has no input " + name + ".");
  }
  const unsigned wires = std::max(left.wires, right.wires);
  if (wires > options.most_state_wires) {
    return not_shown(fmt::format("{} qubits are in use: too many for state vectors.", wires));
  }
  try {
    return is_fragment(left) && is_fragment(right) ? compare_fragments(job) : compare_programs(job);
  } catch (const Unsupported& limit) {
    return not_shown(fmt::format("The comparison ended without a result: {} was beyond it.", limit.what()));
  }
}

}  // namespace isinglass
