// The Pauli-rotation passes: merging and synthesis from 10^3 to 10^5 gates on 30 qubits, and unitary coupled
// cluster as a table of interactions against the textbook's CNOTs. ISINGLASS_SECONDS sets the time of a row
// (default 30).
//
//   build/bench_rotation_networks --benchmark_filter=coupled
#include <benchmark/benchmark.h>

#include <cstdlib>

#include "passes/expand_controls.h"
#include "passes/merge_distant.h"
#include "passes/optimize.h"
#include "passes/rotation_networks.h"
#include "support/families_chemistry.h"
#include "support/random_circuits.h"

using namespace isinglass;

namespace {

Circuit random_source(std::int64_t gates) {
  support::Random random(7);
  return support::random_circuit(random, {30, static_cast<int>(gates), 1, support::Family::clifford_t});
}

void merge_quick(benchmark::State& state) {
  PassContext context;
  context.effort = Effort::quick;
  const Circuit source = random_source(state.range(0));
  for (auto _ : state) benchmark::DoNotOptimize(merge_distant_rotations(source, context));
  state.SetComplexityN(state.range(0));
}

void synthesize_steady(benchmark::State& state) {
  const PassContext context;
  const Circuit source =
      merge_distant_rotations(expand_controls(random_source(state.range(0)), context), context);
  Tally after;
  for (auto _ : state) after = tally_of(synthesize_rotation_networks(source, context));
  state.counters["xx_before"] = static_cast<double>(tally_of(source).xx);
  state.counters["xx"] = static_cast<double>(after.xx);
  state.SetComplexityN(state.range(0));
}

/// Arguments: qubits, electrons, whether amplitudes are inputs.
void coupled_cluster(benchmark::State& state) {
  const Circuit source = support::unitary_coupled_cluster(
      static_cast<unsigned>(state.range(0)), static_cast<unsigned>(state.range(1)), state.range(2) != 0, 1);
  double textbook = 0;
  for (const Operation& op : source.body()) textbook += op.operand_count == 2;
  const char* wanted = std::getenv("ISINGLASS_SECONDS");
  const double seconds = wanted == nullptr ? 30 : std::atof(wanted);
  Tally after;
  for (auto _ : state) {
    PassContext context;
    context.effort = Effort::deep;
    context.deadline =
        std::chrono::steady_clock::now() + std::chrono::duration_cast<std::chrono::steady_clock::duration>(
                                               std::chrono::duration<double>(seconds));
    after = tally_of(optimize(source, context));
  }
  state.counters["cnot"] = textbook;
  state.counters["xx"] = static_cast<double>(after.xx);
  state.counters["ratio"] = textbook / static_cast<double>(after.xx);
  state.counters["units"] = after.xx_units;
}

}  // namespace

BENCHMARK(merge_quick)
    ->RangeMultiplier(10)
    ->Range(1000, 1000000)
    ->Unit(benchmark::kMillisecond)
    ->Complexity();
BENCHMARK(synthesize_steady)
    ->RangeMultiplier(10)
    ->Range(1000, 100000)
    ->Unit(benchmark::kMillisecond)
    ->Iterations(1)
    ->Complexity();
BENCHMARK(coupled_cluster)
    ->ArgNames({"qubits", "electrons", "inputs"})
    ->ArgsProduct({{4}, {2}, {0, 1}})
    ->ArgsProduct({{6}, {2}, {0, 1}})
    ->ArgsProduct({{8}, {4}, {0, 1}})
    ->ArgsProduct({{10}, {4}, {0, 1}})
    ->ArgsProduct({{12}, {6}, {0, 1}})
    ->ArgsProduct({{14}, {4}, {0, 1}})
    ->Unit(benchmark::kSecond)
    ->Iterations(1);
