// The reversible benchmark family as a table: textbook CNOTs, xx and units after steady optimization, from
// Toffolis and from Clifford and T gates.
//
//   build/bench_reversible
#include <benchmark/benchmark.h>

#include "passes/optimize.h"
#include "support/families_arithmetic.h"

using namespace isinglass;

namespace {

void compiled(benchmark::State& state, const Circuit& source) {
  const Circuit expanded = support::expanded_clifford_t(source);
  double textbook = 0;
  for (const Operation& op : expanded.body()) textbook += op.operand_count == 2;
  Tally from_toffolis;
  for (auto _ : state) from_toffolis = tally_of(optimize(source, {}));
  state.counters["textbook"] = textbook;
  state.counters["xx"] = static_cast<double>(from_toffolis.xx);
  state.counters["units"] = from_toffolis.xx_units;
  state.counters["xx_from_t"] = static_cast<double>(tally_of(optimize(expanded, {})).xx);
}

void tof(benchmark::State& state) {
  compiled(state, support::tof(static_cast<std::uint32_t>(state.range(0))));
}
void barenco_tof(benchmark::State& state) {
  compiled(state, support::barenco_tof(static_cast<std::uint32_t>(state.range(0))));
}
void vbe_adder(benchmark::State& state) {
  compiled(state, support::vbe_adder(static_cast<std::uint32_t>(state.range(0))));
}
void cuccaro_adder(benchmark::State& state) {
  compiled(state, support::cuccaro_adder(static_cast<std::uint32_t>(state.range(0))));
}
void gf_multiplier(benchmark::State& state) {
  compiled(state, support::gf_multiplier(static_cast<std::uint32_t>(state.range(0))));
}

}  // namespace

BENCHMARK(tof)->Arg(3)->Arg(4)->Arg(5)->Arg(10)->Iterations(1)->Unit(benchmark::kMillisecond);
BENCHMARK(barenco_tof)->Arg(3)->Arg(4)->Arg(5)->Arg(10)->Iterations(1)->Unit(benchmark::kMillisecond);
BENCHMARK(vbe_adder)->Arg(3)->Iterations(1)->Unit(benchmark::kMillisecond);
BENCHMARK(cuccaro_adder)->Arg(6)->Iterations(1)->Unit(benchmark::kMillisecond);
BENCHMARK(gf_multiplier)->Arg(4)->Arg(6)->Arg(8)->Iterations(1)->Unit(benchmark::kMillisecond);
