// Binding of a plan of 20 ions and 2,000 interactions: sets and operations a second, next to rewriting the
// same output without thinking (each line of the finished text copied into a fresh buffer) in the same run.
#include <benchmark/benchmark.h>

#include <cstring>
#include <sstream>

#include "language/bind.h"
#include "output/native.h"

namespace {

using namespace isinglass;

constexpr std::uint32_t ions = 20;
constexpr int interactions = 2000;

/// Layers of interactions whose angles are affine in 16 inputs, with a pulse on either ion after each.
Placed plan() {
  Placed placed;
  Circuit& circuit = placed.circuit;
  add_register(circuit, "q", ions);
  for (std::uint32_t i = 0; i < 16; ++i)
    circuit.inputs.push_back({"t" + std::to_string(i), "float", false, {}, {}});
  for (std::uint32_t i = 0; i < ions; ++i) placed.start.push_back(i);
  placed.in_use.assign(ions, true);
  for (int k = 0; k < interactions; ++k) {
    const auto a = static_cast<std::uint32_t>(k) % ions;
    const auto b = (a + 1 + static_cast<std::uint32_t>(k / 20) % (ions - 1)) % ions;
    const auto form = circuit.forms.of_input(static_cast<std::uint32_t>(k / 125) % 16);
    circuit.body().push_back(circuit.make(
        Kind::xx, {a, b}, {Angle{0, circuit.forms.scaled(form, 2.0)}, Angle{0.1 * (k % 7)}, Angle{}}));
    circuit.body().push_back(circuit.make(Kind::r, {a}, {Angle{pi / 2}, Angle{0.3}}));
    circuit.body().push_back(circuit.make(Kind::r, {b}, {Angle{0.5, form}, Angle{-pi / 2}}));
  }
  return placed;
}

/// Values in which no interaction exceeds pi/2, as at the end of a search; and values anywhere.
std::vector<std::vector<double>> values(double size, int round) {
  std::vector<std::vector<double>> set;
  for (int i = 0; i < 16; ++i) set.push_back({size * (0.1 + 0.05 * ((i + round) % 16))});
  return set;
}

void counters(benchmark::State& state, std::size_t operations) {
  state.counters["sets_per_s"] = benchmark::Counter(1, benchmark::Counter::kIsIterationInvariantRate);
  state.counters["operations_per_s"] =
      benchmark::Counter(static_cast<double>(operations), benchmark::Counter::kIsIterationInvariantRate);
}

void bind_alone(benchmark::State& state) {
  const Placed placed = plan();
  Binder binder(placed.circuit);
  int round = 0;
  std::size_t operations = 0;
  for (auto _ : state) operations = binder.bind(values(1, ++round)).body().size();
  counters(state, operations);
}

void bind_and_write(benchmark::State& state, double size) {
  const Placed placed = plan();
  Binder binder(placed.circuit);
  int round = 0;
  std::size_t operations = 0;
  for (auto _ : state) {
    const Circuit& bound = binder.bind(values(size, ++round));
    benchmark::DoNotOptimize(native_program(bound, placed.start, {"plan", "machine"}));
    operations = bound.body().size();
  }
  counters(state, operations);
}

void rewrite_only(benchmark::State& state, double size) {
  Placed placed = plan();
  Binder binder(placed.circuit);
  placed.circuit = binder.bind(values(size, 1));
  const std::string text = native_program(placed, {"plan", "machine"});
  for (auto _ : state) {
    std::ostringstream out;
    for (const char* at = text.data(); at < text.data() + text.size();) {
      const auto* end = static_cast<const char*>(
          std::memchr(at, '\n', text.size() - static_cast<std::size_t>(at - text.data())));
      out.write(at, end + 1 - at);
      at = end + 1;
    }
    benchmark::DoNotOptimize(std::move(out).str());
  }
  counters(state, placed.circuit.body().size());
}

BENCHMARK_CAPTURE(rewrite_only, within_range, 1.0)->Unit(benchmark::kMicrosecond);
BENCHMARK_CAPTURE(rewrite_only, anywhere, 7.0)->Unit(benchmark::kMicrosecond);
BENCHMARK(bind_alone)->Unit(benchmark::kMicrosecond);
BENCHMARK_CAPTURE(bind_and_write, within_range, 1.0)->Unit(benchmark::kMicrosecond);
BENCHMARK_CAPTURE(bind_and_write, anywhere, 7.0)->Unit(benchmark::kMicrosecond);

}  // namespace
