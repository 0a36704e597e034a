// Choosing how to compare two programs, and saying what that proves; see equivalence.h.
#include "verify/equivalence.h"

#include <fmt/format.h>

#include <algorithm>
#include <cmath>
#include <random>

#include "verify/dense.h"
#include "verify/late_bits.h"
#include "verify/memory.h"
#include "verify/paths.h"
#include "verify/programs.h"
#include "verify/rotations.h"
#include "verify/side_by_side.h"
#include "verify/trim.h"

namespace isinglass {

namespace {

// ---- inputs ----

InputValues random_values(const Job& job, std::mt19937_64& engine) {
  InputValues values;
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

/// Makes `check` with as many sets of input values as it takes.
template <typename Check>
int for_each_input_set(const Job& job, Check check) {
  const int sets = job.source.inputs.empty() ? 1 : 3;
  std::mt19937_64 engine(job.options.seed);
  for (int k = 0; k < sets; ++k) check(random_values(job, engine));
  return sets;
}

Verdict compare_unitaries(const Job& job) {
  Deviation deviation;
  const int sets =
      for_each_input_set(job, [&](const InputValues& values) { deviation.include(by_unitary(job, values)); });
  const std::string words = fmt::format(
      "Both unitaries on {} qubits were computed in full and compared up to one global phase: this decides "
      "for every "
      "input state.",
      job.source.source_qubits);
  return judged(job, "unitary", deviation, words + for_inputs(job, sets));
}

Verdict compare_states(const Job& job) {
  Deviation deviation;
  const int sets =
      for_each_input_set(job, [&](const InputValues& values) { deviation.include(by_states(job, values)); });
  const std::uint32_t qubits = job.source.source_qubits;
  std::string subject = "up to one global phase";
  if (!is_fragment(job.source)) {
    subject = job.promise.keep_bits_only ? "as distributions of the measured bits"
                                         : "up to a phase for each value of the measured bits";
  }
  const std::string words =
      job.promise.zero_start ? fmt::format(
                                   "Both final states of {} qubits from |0...0> were computed and compared "
                                   "{}: this decides for a "
                                   "program that starts there.",
                                   qubits, subject)
                             : fmt::format(
                                   "Both final states of {} qubits from {} random product state{} were "
                                   "computed and compared {}: "
                                   "programs that differ agree there only by a chance of probability zero.",
                                   qubits, state_count(job), state_count(job) == 1 ? "" : "s", subject);
  return judged(job, job.promise.zero_start ? "state" : "states", deviation, words + for_inputs(job, sets));
}

Verdict compare_programs(const Job& job) {
  ProgramCheck check;
  Deviation deviation;
  const int sets = for_each_input_set(job, [&](const InputValues& values) {
    check = by_branches(job, values);
    deviation.include(check.deviation);
  });
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
      "bits), and {} compared.",
      start, check.runs, check.endings, kept);
  if (deviation.cut > 0) {
    words += fmt::format(" Runs of loops beyond {} rounds, of probability {:.1e}, were left out.",
                         job.options.most_rounds, deviation.cut);
  }
  return judged(job, "branches", deviation, words + for_inputs(job, sets));
}

/// The bits that are measured, in ascending order.
std::vector<std::uint32_t> measured_bits(const Circuit& circuit) {
  std::vector<std::uint32_t> bits;
  for (const Operation& op : circuit.body()) {
    if (op.kind == Kind::measure) bits.push_back(op.payload);
  }
  std::sort(bits.begin(), bits.end());
  return bits;
}

/// Whether both circuits measure the same bits, at the end only or not at all.
bool is_simple(const Job& job) {
  return measures_only_at_end(job.source) && measures_only_at_end(job.compiled) &&
         measured_bits(job.source) == measured_bits(job.compiled);
}

/// The method that decides most at a bearable cost.
Verdict compare_densely(const Job& job) {
  const unsigned wires = std::max(job.source.wires, job.compiled.wires);
  const bool are_fragments = is_fragment(job.source) && is_fragment(job.compiled);
  if (are_fragments && !job.promise.keep_bits_only) {
    const bool whole =
        !job.promise.zero_start && job.source.source_qubits + wires <= 2 * job.options.most_unitary_wires;
    return whole ? compare_unitaries(job) : compare_states(job);
  }
  const bool small = wires <= 6;  // where references can cover every input at once
  if (is_simple(job) && (job.promise.zero_start || !small)) return compare_states(job);
  return compare_programs(job);
}

/// Without amplitudes: what the Pauli rotations of both show.
Verdict compare_rotations(const Job& job) {
  RotationResult worst;
  worst.state = RotationResult::State::cancelled;
  const int sets = for_each_input_set(job, [&](const InputValues& values) {
    if (worst.state != RotationResult::State::cancelled) return;
    const double before = worst.distance;
    worst = by_rotations(job, values);
    worst.distance = std::max(worst.distance, before);
  });
  const std::string both = fmt::format(
      "Both circuits were written as Pauli rotations ({} in all) and a Clifford part", worst.rotations);
  if (worst.state == RotationResult::State::stuck) {
    return not_shown(fmt::format(
        "{}; {} of them could not be cancelled against each other, which proves nothing.", both, worst.left));
  }
  const Deviation deviation{worst.distance, worst.distance * worst.distance, 0};
  const std::string words =
      worst.state == RotationResult::State::cancelled
          ? both + "; all of them cancel and the Clifford part does nothing: this decides."
          : both + "; what is left after all cancels is not nothing.";
  return judged(job, "rotations", deviation, words + for_inputs(job, sets));
}

/// Without amplitudes: both circuits followed gate by gate.
Verdict compare_side_by_side(const Job& job) {
  SideBySide worst;
  worst.state = SideBySide::State::same;
  const int sets = for_each_input_set(job, [&](const InputValues& values) {
    if (worst.state != SideBySide::State::same) return;
    const double before = worst.distance;
    worst = by_following(job, values);
    worst.distance = std::max(worst.distance, before);
  });
  const std::string both = fmt::format(
      "Both circuits were followed gate by gate ({} fused gates), keeping what they differ in", worst.gates);
  if (worst.state == SideBySide::State::too_wide) {
    return not_shown(
        fmt::format("{}; after {} gates that could not be held on {} wires or fewer any more, which proves "
                    "nothing.",
                    both, worst.followed, worst.widest));
  }
  // The bound adds up what every stretch was rounded by, the compiler's own rounding included.
  CheckOptions options = job.options;
  options.tolerance = std::max(options.tolerance, 1e-12 * static_cast<double>(worst.gates));
  if (worst.state == SideBySide::State::same && worst.distance > options.tolerance) {
    return not_shown(fmt::format(
        "{}; what was rounded on the way adds up to {:.1e}, more than the tolerance.", both, worst.distance));
  }
  const Deviation deviation{worst.distance, worst.distance * worst.distance, 0};
  const std::string words =
      worst.state == SideBySide::State::same
          ? fmt::format(
                "{}: it never touched more than {} wires together and is nothing at the end, which decides.",
                both, worst.widest)
          : both + ": at the end it is not nothing.";
  return judged({job.source, job.compiled, job.promise, options}, "following", deviation,
                words + for_inputs(job, sets));
}

/// Without amplitudes: both as sums over paths. Shows sameness or nothing.
Verdict compare_paths(const Job& job) {
  bool are_same = true;
  PathResult worst;
  const int sets = for_each_input_set(job, [&](const InputValues& values) {
    if (!are_same) return;
    const double before = worst.distance;
    worst = by_paths(job, values);
    worst.distance = std::max(worst.distance, before);
    are_same = worst.are_same;
  });
  if (!are_same) return not_shown("Their sums over paths are not written alike, which proves nothing.");
  const Deviation deviation{worst.distance, worst.distance * worst.distance, 0};
  const std::string words = fmt::format(
      "Both circuits were written as sums over paths, polynomials in {} variables; all of them are equal, "
      "which decides.",
      worst.variables);
  return judged(job, "paths", deviation, words + for_inputs(job, sets));
}

/// The methods without amplitudes, the cheaper first.
Verdict compare_sparsely(const Job& job) {
  if (!is_simple(job)) {
    return not_shown("The programs are too large for state vectors, and measure on the way.");
  }
  if (job.options.most_followed_wires == 0) return compare_rotations(job);
  Verdict verdict = compare_side_by_side(job);
  for (const auto method : {compare_paths, compare_rotations}) {
    if (verdict.answer != Answer::not_shown) return verdict;
    std::string words = verdict.explanation;
    try {
      verdict = method(job);
      if (verdict.answer == Answer::not_shown) verdict.explanation = words + " " + verdict.explanation;
    } catch (const Unsupported& limit) {
      verdict.explanation =
          fmt::format("{} Another method came to no end either: {} was beyond it.", words, limit.what());
    }
  }
  return verdict;
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
  const Renumbered renumbered = with_variables_of(source, compiled);
  if (!renumbered.mismatch.empty()) {
    return different("The variable " + renumbered.mismatch + " has another type in the compiled program.");
  }
  auto [left, right] = without_idle_wires(source, renumbered.circuit);
  for (Circuit* circuit : {&left, &right}) {
    if (auto plain = with_late_bits_on_wires(*circuit)) *circuit = *std::move(plain);
  }
  const Job job{left, right, promise, options};
  if (const std::string name = missing_input(job); !name.empty()) {
    return different("The compiled program has no input " + name + ".");
  }
  const bool is_dense = std::max(left.wires, right.wires) <= options.most_state_wires;
  try {
    return is_dense ? compare_densely(job) : compare_sparsely(job);
  } catch (const Unsupported& limit) {
    return not_shown(fmt::format("The comparison ended without a result: {} was beyond it.", limit.what()));
  }
}

namespace {

/// Without state vectors. Most steps hold whatever the start, which is easier to follow than a known one.
Verdict compared_sparsely(const Circuit& source, const Circuit& compiled, Promise promise,
                          CheckOptions options) {
  options.most_state_wires = 0;
  const bool is_known_start = promise.zero_start;
  promise.zero_start = false;
  Verdict verdict = compare(source, compiled, promise, options);
  if (verdict.answer == Answer::same || !is_known_start) return verdict;
  promise.zero_start = true;
  return compare(source, compiled, promise, options);
}

/// Steps that prove each its own come to this together, or to the reason why not.
Verdict followed_along(const Circuit& source, std::span<const Circuit> steps, const Circuit& compiled,
                       const Promise& promise, const CheckOptions& options) {
  Verdict sum;
  const Circuit* before = &source;
  for (std::size_t k = 0; k <= steps.size(); ++k) {
    const Circuit& after = k < steps.size() ? steps[k] : compiled;
    const Verdict step = compared_sparsely(*before, after, promise, options);
    if (step.answer != Answer::same) return step;
    sum.distance += step.distance;
    before = &after;
  }
  if (sum.distance > options.tolerance) return not_shown("What was rounded on the way adds up to too much.");
  sum.answer = Answer::same;
  sum.method = "steps";
  sum.explanation = fmt::format(
      "The way from the source to the result was followed in {} steps, each of them gate by gate or as Pauli "
      "rotations, and each is nothing: together this decides. Largest deviation {:.1e}.",
      steps.size() + 1, sum.distance);
  return sum;
}

/// Whether state vectors would take more than a moment.
bool are_states_dear(const Circuit& source, const Circuit& compiled) {
  const std::uint32_t wires = std::max(source.wires, compiled.wires);
  const auto gates = static_cast<double>(source.body().size() + compiled.body().size());
  return wires >= 64 || gates * std::pow(2.0, wires) > 3e8;
}

}  // namespace

Verdict compare_along(const Circuit& source, std::span<const Circuit> steps, const Circuit& compiled,
                      const Promise& promise, const CheckOptions& options) {
  const bool is_cut = options.infidelity > 0;  // then some step is not the same
  if (is_cut || steps.empty() || !are_states_dear(source, compiled))
    return compare(source, compiled, promise, options);
  Verdict direct = compared_sparsely(source, compiled, promise, options);
  if (direct.answer == Answer::same) return direct;
  Verdict along = followed_along(source, steps, compiled, promise, options);
  if (along.answer == Answer::same) return along;
  const bool has_states = std::max(source.wires, compiled.wires) <= options.most_state_wires;
  return has_states ? compare(source, compiled, promise, options) : direct;
}

}  // namespace isinglass
