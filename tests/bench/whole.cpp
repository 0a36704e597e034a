// The whole line on random circuits of 20 qubits: reading, improving, placing, timing, writing; without the
// check. Counters: microseconds a gate, gates a second, and the peak memory of the process so far a gate.
// Sizes ascend, so the last row of a benchmark is its own peak. Growth from size to size: the ratio of the
// "us_per_gate" column.
#include <benchmark/benchmark.h>
#include <sys/resource.h>

#include "bench/random_text.h"
#include "language/language.h"
#include "output/native.h"
#include "passes/optimize.h"
#include "targets/place.h"
#include "targets/schedule.h"

namespace {

using namespace isinglass;

double peak_bytes() {
  rusage usage{};
  getrusage(RUSAGE_SELF, &usage);
  return static_cast<double>(usage.ru_maxrss) * 1024;
}

void report(benchmark::State& state) {
  const auto gates = static_cast<double>(state.range(0));
  state.counters["us_per_gate"] = benchmark::Counter(
      gates * 1e-6, benchmark::Counter::kIsIterationInvariantRate | benchmark::Counter::kInvert);
  state.counters["peak_bytes_per_gate"] = peak_bytes() / gates;
  state.SetComplexityN(state.range(0));
}

PassContext context_of(Effort effort) {
  PassContext context;
  context.effort = effort;
  context.threads = 2;
  return context;
}

void whole(benchmark::State& state, Effort effort) {
  const std::string text = random_text(state.range(0));
  const Target target = typical(qubits);
  for (auto _ : state) {
    const Reading reading = read("bench", text);
    const Circuit lowered = optimize(*reading.circuit, context_of(effort));
    const Placed placed = place(lowered, target);
    const Timed timed = schedule(placed, target, {});
    benchmark::DoNotOptimize(timed.totals.xx);
    benchmark::DoNotOptimize(native_program(placed, {"bench", target.name}));
  }
  report(state);
}

void reading_alone(benchmark::State& state) {
  const std::string text = random_text(state.range(0));
  for (auto _ : state) benchmark::DoNotOptimize(read("bench", text));
  report(state);
}

void improving_alone(benchmark::State& state, Effort effort) {
  const Reading reading = read("bench", random_text(state.range(0)));
  for (auto _ : state) benchmark::DoNotOptimize(optimize(*reading.circuit, context_of(effort)));
  report(state);
}

void placing_and_timing(benchmark::State& state) {
  const Reading reading = read("bench", random_text(state.range(0)));
  const Circuit lowered = optimize(*reading.circuit, context_of(Effort::quick));
  const Target target = typical(qubits);
  for (auto _ : state) benchmark::DoNotOptimize(schedule(place(lowered, target), target, {}));
  report(state);
}

constexpr int small = 1000;
constexpr int large = 100'000;

BENCHMARK(reading_alone)
    ->RangeMultiplier(10)
    ->Range(small, large)
    ->Complexity()
    ->Unit(benchmark::kMillisecond);
BENCHMARK_CAPTURE(improving_alone, quick, Effort::quick)
    ->RangeMultiplier(10)
    ->Range(small, large)
    ->Complexity()
    ->Unit(benchmark::kMillisecond);
BENCHMARK_CAPTURE(improving_alone, steady, Effort::steady)
    ->RangeMultiplier(10)
    ->Range(small, large)
    ->Unit(benchmark::kMillisecond);
BENCHMARK(placing_and_timing)
    ->RangeMultiplier(10)
    ->Range(small, large)
    ->Complexity()
    ->Unit(benchmark::kMillisecond);
BENCHMARK_CAPTURE(whole, quick, Effort::quick)
    ->RangeMultiplier(10)
    ->Range(small, large)
    ->Complexity()
    ->Unit(benchmark::kMillisecond);
BENCHMARK_CAPTURE(whole, steady, Effort::steady)
    ->RangeMultiplier(10)
    ->Range(small, large)
    ->Unit(benchmark::kMillisecond);

}  // namespace
