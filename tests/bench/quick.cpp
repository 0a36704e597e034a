// What `--effort quick` costs beside reading the same text, and how it grows: random circuits of 20 qubits,
// 10^3 to 10^6 gates, on one thread. `quick` is everything between reading and writing that makes the
// program: the passes and the placement, on a typical machine; timing it (the schedule with its errors)
// stands beside it, as it is the same whatever the effort. A row's figures are the least of its rounds, in
// microseconds of processor time a source gate. `ratio` is quick over reading; `exponent` is the slope of the
// straight line through log(time of quick) over log(gates) of the rows so far, by least squares, so that of
// the last row counts; the others likewise.
//
//   build/bench_quick
#include <benchmark/benchmark.h>

#include <algorithm>
#include <cmath>
#include <ctime>

#include "bench/random_text.h"
#include "language/language.h"
#include "passes/optimize.h"
#include "targets/place.h"
#include "targets/schedule.h"

namespace {

using namespace isinglass;

/// log(time) over log(gates) of the rows so far.
class Growth {
 public:
  /// Adds a row and returns the slope of the best straight line; 0 for the first row.
  double slope_with(double gates, double seconds) {
    points_.emplace_back(std::log(gates), std::log(seconds));
    double x = 0, y = 0;
    for (const auto& [a, b] : points_) {
      x += a / static_cast<double>(points_.size());
      y += b / static_cast<double>(points_.size());
    }
    double up = 0, across = 0;
    for (const auto& [a, b] : points_) {
      up += (a - x) * (b - y);
      across += (a - x) * (a - x);
    }
    return across == 0 ? 0 : up / across;
  }

 private:
  std::vector<std::pair<double, double>> points_;
};

/// Processor time of this program, seconds: what others do on the machine at the same time is left out.
double processor_time() {
  timespec now{};
  clock_gettime(CLOCK_PROCESS_CPUTIME_ID, &now);
  return static_cast<double>(now.tv_sec) + 1e-9 * static_cast<double>(now.tv_nsec);
}

/// The least time of many.
struct Least {
  double seconds = 1e300;
  template <typename Work>
  auto of(const Work& work) {
    const double start = processor_time();
    auto result = work();
    seconds = std::min(seconds, processor_time() - start);
    return result;
  }
};

void quick_beside_reading(benchmark::State& state) {
  static Growth reading_grows, quick_grows, timing_grows;
  const std::string text = random_text(state.range(0));
  const auto gates = static_cast<double>(state.range(0));
  const Target target = typical(qubits);
  PassContext context;
  context.effort = Effort::quick;
  Least reading, passes, placing, timing;
  for (auto _ : state) {
    const Reading source = reading.of([&] { return read("bench", text); });
    Circuit lowered = passes.of([&] { return optimize(*source.circuit, context); });
    const Placed placed = placing.of([&] { return place(std::move(lowered), target); });
    benchmark::DoNotOptimize(timing.of([&] { return schedule(placed, target, {}); }));
  }
  const double quick = passes.seconds + placing.seconds;
  state.counters["reading_us"] = reading.seconds / gates * 1e6;
  state.counters["passes_us"] = passes.seconds / gates * 1e6;
  state.counters["placing_us"] = placing.seconds / gates * 1e6;
  state.counters["timing_us"] = timing.seconds / gates * 1e6;
  state.counters["ratio"] = quick / reading.seconds;
  state.counters["exponent"] = quick_grows.slope_with(gates, quick);
  state.counters["timing_exponent"] = timing_grows.slope_with(gates, timing.seconds);
  state.counters["reading_exponent"] = reading_grows.slope_with(gates, reading.seconds);
}

BENCHMARK(quick_beside_reading)->Arg(1000)->Iterations(300)->Unit(benchmark::kMillisecond);
BENCHMARK(quick_beside_reading)->Arg(10000)->Iterations(50)->Unit(benchmark::kMillisecond);
BENCHMARK(quick_beside_reading)->Arg(100000)->Iterations(15)->Unit(benchmark::kMillisecond);
BENCHMARK(quick_beside_reading)->Arg(1000000)->Iterations(5)->Unit(benchmark::kMillisecond);

}  // namespace
