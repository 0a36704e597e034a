// Time of each pass and of the whole on random circuits of 20 wires, with the time per gate and the growth
// from size to size (Google Benchmark's complexity fit). Run: bench_passes [--benchmark_filter=whole]
#include <benchmark/benchmark.h>

#include <random>
#include <string>

#include "passes/expand_controls.h"
#include "passes/lower.h"
#include "passes/optimize.h"

namespace {

using namespace isinglass;

/// A third of the gates cx, the rest one-qubit gates of all sorts, a few with two controls: source gates.
Circuit random_source(std::int64_t gates) {
  std::mt19937_64 random(1);
  Circuit circuit;
  constexpr std::uint32_t wires = 20;
  add_register(circuit, "q", wires);
  std::uniform_real_distribution<double> angle(-pi, pi);
  circuit.body().reserve(static_cast<std::size_t>(gates));
  for (std::int64_t i = 0; i < gates; ++i) {
    const auto a = static_cast<std::uint32_t>(random() % wires);
    const auto b = static_cast<std::uint32_t>((a + 1 + random() % (wires - 1)) % wires);
    const auto choice = random() % 12;
    if (choice < 4) {
      circuit.body().push_back(circuit.make(Kind::x, {a, b}));
    } else if (choice < 6) {
      circuit.body().push_back(circuit.make(Kind::h, {a}));
    } else if (choice < 8) {
      circuit.body().push_back(circuit.make(Kind::rz, {a}, {{angle(random)}}));
    } else if (choice < 10) {
      circuit.body().push_back(circuit.make(Kind::r, {a}, {{angle(random)}, {angle(random)}}));
    } else if (choice < 11) {
      circuit.body().push_back(circuit.make(Kind::p, {a, b}, {{angle(random)}}));
    } else {
      circuit.body().push_back(
          circuit.make(Kind::u, {a}, {{angle(random)}, {angle(random)}, {angle(random)}}));
    }
  }
  return circuit;
}

void measure_pass(benchmark::State& state, const Pass& pass, bool is_lowered) {
  Circuit source = random_source(state.range(0));
  if (is_lowered) source = lower(source, {});
  for (auto _ : state) benchmark::DoNotOptimize(pass.run(source, {}).wires);
  state.SetItemsProcessed(state.iterations() * state.range(0));
  state.SetComplexityN(state.range(0));
}

void measure_whole(benchmark::State& state, Effort effort) {
  const Circuit source = random_source(state.range(0));
  PassContext context;
  context.effort = effort;
  context.threads = 2;
  for (auto _ : state) benchmark::DoNotOptimize(optimize(source, context).wires);
  state.SetItemsProcessed(state.iterations() * state.range(0));
  state.SetComplexityN(state.range(0));
}

const int registered = [] {
  bool is_lowered = false;
  for (const Pass& pass : all_passes()) {
    benchmark::RegisterBenchmark(("pass/" + std::string(pass.name)).c_str(),
                                 [&pass, is_lowered](auto& state) { measure_pass(state, pass, is_lowered); })
        ->RangeMultiplier(10)
        ->Range(1000, 100000)
        ->Unit(benchmark::kMillisecond)
        ->Complexity();
    // The table's order: what follows "lower" takes the machine's gates.
    if (pass.name == "lower") is_lowered = true;
  }
  const auto whole = [](const char* name, Effort effort, std::int64_t largest) {
    benchmark::RegisterBenchmark(name, [effort](auto& state) { measure_whole(state, effort); })
        ->RangeMultiplier(10)
        ->Range(1000, largest)
        ->Unit(benchmark::kMillisecond)
        ->UseRealTime()
        ->Complexity();
  };
  whole("whole/quick", Effort::quick, 1000000);
  whole("whole/steady", Effort::steady, 100000);
  return 0;
}();

}  // namespace
