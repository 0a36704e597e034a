// How long the light of a long chain takes: the kernels, all 496 pairs at one detuning, and a whole search.
//   build/bench_pulses
#include <benchmark/benchmark.h>

#include <numbers>

#include "targets/pair_search.h"

using namespace isinglass;

namespace {

struct LongChain {
  Chain chain = solve_chain({*species_named("171Yb+"), 32, 74.5e3, 0, 3e6});
  Eigen::MatrixXd eta = lamb_dicke(chain, wave_number_difference(355e-9, std::numbers::pi));
  std::vector<std::pair<int, int>> pairs;
  LongChain() {
    for (int a = 0; a < 32; ++a)
      for (int b = a + 1; b < 32; ++b) pairs.emplace_back(a, b);
  }
};

const LongChain& long_chain() {
  static const LongChain made;
  return made;
}

void kernels(benchmark::State& state) {
  for (auto _ : state) {
    const PulseSpace space(long_chain().chain.transverse_hz, {Shape::ramps, 128, Robust::none}, 300e-6,
                           2.9e6);
    benchmark::DoNotOptimize(space.dimension());
  }
}

void all_pairs_at_one_detuning(benchmark::State& state) {
  const LongChain& machine = long_chain();
  for (auto _ : state) {
    const PulseSpace space(machine.chain.transverse_hz, {Shape::ramps, 128, Robust::none}, 300e-6, 2.9e6);
    double sum = 0;
    for (const auto& [a, b] : machine.pairs) {
      const Eigen::VectorXd weight = machine.eta.row(a).cwiseProduct(machine.eta.row(b)).transpose();
      sum += space.strongest(weight).chi;
    }
    benchmark::DoNotOptimize(sum);
  }
}

// The whole of targets/clipper-32.toml, on as many threads as the argument says.
void whole_search(benchmark::State& state) {
  const LongChain& machine = long_chain();
  const LightLimits limits{{Shape::ramps, 160, Robust::motion}, {250e-6, 400e-6, 600e-6}, {}, 160e3};
  const Noise noise{60, 15, 0.08, 2, 2e-6, 0};
  for (auto _ : state) {
    const FoundLight found = find_light(machine.chain, machine.eta, limits, noise, machine.pairs,
                                        static_cast<int>(state.range(0)));
    benchmark::DoNotOptimize(found.light.size());
  }
}

}  // namespace

BENCHMARK(kernels)->Unit(benchmark::kMillisecond);
BENCHMARK(all_pairs_at_one_detuning)->Unit(benchmark::kMillisecond);
BENCHMARK(whole_search)->Arg(2)->Iterations(1)->Unit(benchmark::kSecond)->UseRealTime();
