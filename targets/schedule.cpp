// From times of blocks to the timed list: preparation, waiting, errors and totals; see schedule.h.
#include "targets/schedule.h"

#include <algorithm>
#include <cmath>
#include <unordered_set>

#include "circuit/long_list.h"
#include "targets/leaks.h"
#include "targets/list_schedule.h"

namespace isinglass {

namespace {

/// Figures of merit of a stretch of the program; what Totals is made from.
struct Sums {
  std::size_t xx = 0;
  double xx_units = 0;
  std::size_t r = 0;
  std::array<double, source_count> loss{};  // -log(1 - error) by source
  std::vector<double> by_origin;            // change of the loss by one deviation of each stated figure

  double whole_loss() const {
    double sum = 0;
    for (const double part : loss) sum += part;
    return sum;
  }

  void lose(Source source, double error) { loss[static_cast<std::size_t>(source)] -= std::log1p(-error); }

  /// The error is `factor` times this figure and more; the deviations of one statement add up.
  void depends(const Figure& figure, double factor, double error) {
    if (figure.deviation == 0) return;
    if (figure.origin >= by_origin.size()) by_origin.resize(figure.origin + 1, 0.0);
    by_origin[figure.origin] += figure.deviation * factor / (1 - error);
  }

  void add(const Sums& other) {
    xx += other.xx;
    xx_units += other.xx_units;
    r += other.r;
    for (std::size_t i = 0; i < source_count; ++i) loss[i] += other.loss[i];
    by_origin.resize(std::max(by_origin.size(), other.by_origin.size()), 0.0);
    for (std::size_t i = 0; i < other.by_origin.size(); ++i) by_origin[i] += other.by_origin[i];
  }
};

/// What is known of the ions while the program is walked through in time.
struct IonStates {
  std::vector<bool> is_alive;     // holds a state that dephasing can harm
  std::vector<double> free_from;  // end of its last operation
  std::vector<std::size_t> xx_depth;
};

/// Errors are below 1 so that logarithms stay finite.
double bounded(double error) {
  return std::clamp(error, 0.0, 1 - 1e-15);
}

class Estimator {
 public:
  Estimator(const Placed& placed, const Target& target, Timed& timed)
      : placed_(placed), circuit_(placed.circuit), target_(target), timed_(timed) {}

  std::size_t pairs() const { return pairs_.size(); }

  /// Completes the list of a block by errors and waits; `ions` is carried on. What comes after the block
  /// lasts until `end`; ions of `kept` that are alive wait for it.
  Sums walk(std::uint32_t block, IonStates& ions, double end, const std::vector<std::uint32_t>& kept) {
    Sums sums;
    std::vector<TimedOperation> waits;
    auto& list = timed_.blocks[block].operations;
    reserve_long(waits, list.size());
    for (TimedOperation& entry : list) {
      if (entry.kind == TimedKind::prepare) {
        prepare(entry, ions, sums);
      } else {
        step(block, entry, ions, sums, waits);
      }
    }
    for (const std::uint32_t ion : kept) wait_until(end, ion, ions, sums, waits);
    std::stable_sort(waits.begin(), waits.end(), earlier);
    std::vector<TimedOperation> both;
    reserve_long(both, list.size() + waits.size());
    std::merge(list.begin(), list.end(), waits.begin(), waits.end(), std::back_inserter(both), earlier);
    timed_.blocks[block].operations = std::move(both);
    return sums;
  }

  static bool earlier(const TimedOperation& a, const TimedOperation& b) { return a.at < b.at; }

 private:
  void prepare(TimedOperation& entry, IonStates& ions, Sums& sums) {
    const Figure& figure = target_.ion[entry.ion[0]].prepare_error;
    entry.error = bounded(figure.value);
    sums.lose(Source::prepare, entry.error);
    sums.depends(figure, 1, entry.error);
    ions.free_from[entry.ion[0]] = entry.at + entry.takes;
  }

  void step(std::uint32_t block, TimedOperation& entry, IonStates& ions, Sums& sums,
            std::vector<TimedOperation>& waits) {
    const Operation& op = circuit_.blocks[block][entry.operation];
    const auto operands = circuit_.operands(op);
    const double begin = entry.at + (entry.kind == TimedKind::decide ? target_.feed_forward_us : 0);
    for (const std::uint32_t ion : operands) {
      wait_until(begin, ion, ions, sums, waits);
      ions.free_from[ion] = entry.at + entry.takes;
    }
    switch (entry.kind) {
      case TimedKind::r:
        pulse(entry, op, sums);
        ions.is_alive[operands[0]] = true;
        break;
      case TimedKind::xx:
        interaction(entry, op, sums);
        ions.is_alive[operands[0]] = true;
        ions.is_alive[operands[1]] = true;
        ions.xx_depth[operands[0]] = ions.xx_depth[operands[1]] =
            std::max(ions.xx_depth[operands[0]], ions.xx_depth[operands[1]]) + 1;
        break;
      case TimedKind::measure:
        single(entry, target_.ion[operands[0]].measure_error, Source::measure, sums);
        ions.is_alive[operands[0]] = false;
        break;
      case TimedKind::reset:
        single(entry, target_.ion[operands[0]].reset_error, Source::prepare, sums);
        ions.is_alive[operands[0]] = false;
        break;
      case TimedKind::wait:
        for (const std::uint32_t ion : operands) {
          const double error = ions.is_alive[ion] ? idle(ion, entry.takes, sums) : 0;
          entry.error = 1 - (1 - entry.error) * (1 - error);
        }
        break;
      case TimedKind::decide:
        decide(entry, op, ions, sums);
        break;
      default:
        break;
    }
  }

  /// An ion that holds a state dephases from its last operation until `time`.
  void wait_until(double time, std::uint32_t ion, const IonStates& ions, Sums& sums,
                  std::vector<TimedOperation>& waits) {
    const double gap = time - ions.free_from[ion];
    if (gap <= 0 || !ions.is_alive[ion]) return;
    TimedOperation wait;
    wait.kind = TimedKind::wait;
    wait.at = ions.free_from[ion];
    wait.takes = gap;
    wait.ion[0] = ion;
    wait.ion_count = 1;
    wait.error = idle(ion, gap, sums);
    waits.push_back(wait);
  }

  double idle(std::uint32_t ion, double us, Sums& sums) {
    const IonFigures& figures = target_.ion[ion];
    const double error = figures.idle_error(us);
    sums.lose(Source::idle, error);
    sums.depends(figures.t2_us, figures.idle_error_slope(us), error);
    return error;
  }

  void single(TimedOperation& entry, const Figure& figure, Source source, Sums& sums) {
    entry.error = bounded(figure.value);
    sums.lose(source, entry.error);
    sums.depends(figure, 1, entry.error);
  }

  void add_crosstalk(TimedOperation& entry, const Operation& op, double theta, Sums& sums) {
    const double one = bounded(target_.leak_error(theta));
    const unsigned count = leaks_of(op, placed_, target_).count;
    if (count == 0 || one == 0) return;
    entry.crosstalk = 1 - std::pow(1 - one, count);
    sums.lose(Source::crosstalk, entry.crosstalk);
    sums.depends(target_.crosstalk, count * target_.leak_error_slope(theta), one);
    entry.error = 1 - (1 - entry.error) * (1 - entry.crosstalk);
  }

  void pulse(TimedOperation& entry, const Operation& op, Sums& sums) {
    const std::uint32_t ion = op.operand[0];
    ++sums.r;
    single(entry, target_.ion[ion].pulse_error, Source::r, sums);
    add_crosstalk(entry, op, op.form[0] == 0 ? op.value[0] : pi, sums);
  }

  void interaction(TimedOperation& entry, const Operation& op, Sums& sums) {
    const std::uint32_t a = op.operand[0];
    const std::uint32_t b = op.operand[1];
    const PairFigures& pair = target_.pair(a, b);
    const double theta = op.form[0] == 0 ? op.value[0] : pi / 2;
    const double s = std::abs(theta) / (pi / 2);
    ++sums.xx;
    sums.xx_units += s;
    pairs_.insert(std::uint64_t{std::min(a, b)} << 32 | std::max(a, b));
    entry.error = bounded(pair.error(theta));
    sums.lose(Source::xx, entry.error);
    sums.depends(pair.floor, 1, entry.error);
    sums.depends(pair.root, std::sqrt(s), entry.error);
    sums.depends(pair.slope, s, entry.error);
    sums.depends(pair.square, s * s, entry.error);
    add_crosstalk(entry, op, theta, sums);
  }

  /// Walks through all arms from the same beginning and goes on with the worst.
  void decide(TimedOperation& entry, const Operation& op, IonStates& ions, Sums& sums) {
    const auto operands = circuit_.operands(op);
    const std::vector<std::uint32_t> kept(operands.begin(), operands.end());
    IonStates before = ions;
    for (const std::uint32_t ion : operands) before.free_from[ion] = 0;  // an arm has its own clock
    Sums worst;
    for (const Branch::Arm& arm : circuit_.branches[op.payload].arms) {
      IonStates here = before;
      const Sums of_arm = walk(arm.block, here, entry.takes - target_.feed_forward_us, kept);
      const bool is_worse = of_arm.whole_loss() > worst.whole_loss();
      const std::size_t xx = std::max(worst.xx, of_arm.xx);
      const double units = std::max(worst.xx_units, of_arm.xx_units);
      const std::size_t r = std::max(worst.r, of_arm.r);
      if (is_worse) worst = of_arm;
      worst.xx = xx;
      worst.xx_units = units;
      worst.r = r;
      for (const std::uint32_t ion : operands) {
        ions.is_alive[ion] = ions.is_alive[ion] || here.is_alive[ion];
        ions.xx_depth[ion] = std::max(ions.xx_depth[ion], here.xx_depth[ion]);
      }
    }
    entry.error = -std::expm1(-worst.whole_loss());
    sums.add(worst);
  }

  const Placed& placed_;
  const Circuit& circuit_;
  const Target& target_;
  Timed& timed_;
  std::unordered_set<std::uint64_t> pairs_;  // that interact anywhere
};

TimedKind timed_kind(Kind kind) {
  switch (kind) {
    case Kind::r:
      return TimedKind::r;
    case Kind::xx:
      return TimedKind::xx;
    case Kind::rz:
      return TimedKind::rz;
    case Kind::measure:
      return TimedKind::measure;
    case Kind::reset:
      return TimedKind::reset;
    case Kind::delay:
      return TimedKind::wait;
    case Kind::barrier:
      return TimedKind::barrier;
    case Kind::classical:
      return TimedKind::compute;
    case Kind::branch:
      return TimedKind::decide;
    default:
      throw std::logic_error("only native operations are timed");
  }
}

TimedOperation entry_of(const Circuit& circuit, const Block& block, std::uint32_t index,
                        const BlockTimes& times) {
  const Operation& op = block[index];
  TimedOperation entry;
  entry.kind = timed_kind(op.kind);
  entry.at = times.at[index];
  entry.takes = times.takes[index];
  entry.operation = index;
  const auto operands = circuit.operands(op);
  if (operands.size() <= 2) {
    std::copy(operands.begin(), operands.end(), entry.ion);
    entry.ion_count = static_cast<std::uint8_t>(operands.size());
  }
  return entry;
}

/// The ions that are pumped into |0> at the start of a whole program: all that hold something the promise
/// keeps.
std::vector<std::uint32_t> prepared_ions(const Placed& placed, const Promise& promise) {
  std::vector<bool> wanted(placed.circuit.wires, false);
  for (const Block& block : placed.circuit.blocks) {
    for (const Operation& op : block) {
      for (const std::uint32_t ion : placed.circuit.operands(op)) wanted[ion] = true;
    }
  }
  std::vector<std::uint32_t> ions;
  for (std::uint32_t ion = 0; ion < placed.circuit.wires; ++ion) {
    if (wanted[ion] || (placed.in_use[ion] && !promise.keep_bits_only)) ions.push_back(ion);
  }
  return ions;
}

Totals totals_from(const Sums& sums) {
  Totals totals;
  totals.xx = sums.xx;
  totals.xx_units = sums.xx_units;
  totals.r = sums.r;
  const double loss = sums.whole_loss();
  totals.success = std::exp(-loss);
  totals.error = -std::expm1(-loss);
  for (std::size_t i = 0; i < source_count && loss > 0; ++i) {
    totals.error_by_source[i] = totals.error * sums.loss[i] / loss;
  }
  double variance = 0;
  for (const double change : sums.by_origin) variance += change * change;
  const double spread = 1.96 * std::sqrt(variance);
  totals.success_low = std::exp(-loss - spread);
  totals.success_high = std::exp(-std::max(loss - spread, 0.0));
  return totals;
}

}  // namespace

std::string_view name(TimedKind kind) {
  constexpr std::array<std::string_view, 10> names = {"prepare", "r",    "xx",      "rz",      "measure",
                                                      "reset",   "wait", "barrier", "compute", "decide"};
  return names[static_cast<std::size_t>(kind)];
}

std::string_view name(Source source) {
  constexpr std::array<std::string_view, source_count> names = {"prepare", "r",         "xx",
                                                                "idle",    "crosstalk", "measure"};
  return names[static_cast<std::size_t>(source)];
}

Timed schedule(const Placed& placed, const Target& target, const Promise& promise) {
  const Circuit& circuit = placed.circuit;
  Timed timed;
  timed.blocks.resize(circuit.blocks.size());

  auto& program = timed.blocks[0].operations;
  double begin = 0;
  if (promise.zero_start) {
    for (const std::uint32_t ion : prepared_ions(placed, promise)) {
      TimedOperation entry;
      entry.kind = TimedKind::prepare;
      entry.takes = target.ion[ion].prepare_us;
      entry.ion[0] = ion;
      entry.ion_count = 1;
      begin = std::max(begin, entry.takes);
      program.push_back(entry);
    }
  }

  std::vector<double> arm_us(circuit.blocks.size(), 0);
  for (std::size_t b = circuit.blocks.size(); b-- > 0;) {
    const Block& block = circuit.blocks[b];
    BlockTimes times = list_schedule(circuit, block, target, b == 0 ? begin : 0, arm_us);
    if (b == 0 && promise.zero_start) delay_first_pulses(times, circuit, block, target);
    arm_us[b] = timed.blocks[b].takes = times.end;
    auto& list = timed.blocks[b].operations;
    reserve_long(list, list.size() + block.size());
    for (const std::uint32_t op : times.order) list.push_back(entry_of(circuit, block, op, times));
  }

  IonStates ions{std::vector<bool>(circuit.wires, false), std::vector<double>(circuit.wires, 0),
                 std::vector<std::size_t>(circuit.wires, 0)};
  if (!promise.zero_start) {
    for (const std::uint32_t ion : placed.start) ions.is_alive[ion] = true;
  }
  Estimator estimator(placed, target, timed);
  const double end = timed.blocks[0].takes;
  const auto kept = promise.keep_bits_only ? std::vector<std::uint32_t>{} : circuit.end_wire;
  const Sums sums = estimator.walk(0, ions, end, kept);

  timed.totals = totals_from(sums);
  timed.totals.pairs = estimator.pairs();
  timed.totals.duration = end;
  if (!ions.xx_depth.empty()) {
    timed.totals.xx_depth = *std::max_element(ions.xx_depth.begin(), ions.xx_depth.end());
  }
  return timed;
}

}  // namespace isinglass
