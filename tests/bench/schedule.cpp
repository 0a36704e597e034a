// How placement, timing and the writers grow with the program: 20 ions, 10^3 to 10^6 operations. Each reports
// the time per operation; linear growth shows as the same time from row to row.
#include <benchmark/benchmark.h>

#include <random>
#include <sstream>

#include "output/native.h"
#include "output/report.h"
#include "output/timeline.h"
#include "targets/dependence.h"
#include "targets/schedule.h"

namespace {

using namespace isinglass;

constexpr std::uint32_t ions = 20;
constexpr Promise whole{true, false};

Circuit program(std::int64_t operations) {
  std::mt19937_64 random(1);
  std::uniform_real_distribution<double> angle(0.01, pi / 2);
  Circuit c;
  add_register(c, "q", ions);
  for (std::int64_t i = 0; i < operations; ++i) {
    const auto a = static_cast<std::uint32_t>(random() % ions);
    const auto b = static_cast<std::uint32_t>((a + 1 + random() % (ions - 1)) % ions);
    const Origin origin = Origins::line(static_cast<std::uint32_t>(i + 1));
    c.body().push_back(i % 3 == 0 ? c.make(Kind::xx, {a, b}, {{angle(random)}, {0.1}, {0.2}}, origin)
                                  : c.make(Kind::r, {a}, {{angle(random)}, {angle(random)}}, origin));
  }
  return c;
}

void per_operation(benchmark::State& state) {
  state.counters["per operation"] =
      benchmark::Counter(static_cast<double>(state.range(0)) * static_cast<double>(state.iterations()),
                         benchmark::Counter::kIsRate | benchmark::Counter::kInvert);
}

void placing(benchmark::State& state) {
  const Circuit c = program(state.range(0));
  const Target target = typical(ions);
  for (auto _ : state) benchmark::DoNotOptimize(place(c, target));
  per_operation(state);
}

void dependences(benchmark::State& state) {
  const Circuit c = program(state.range(0));
  for (auto _ : state) benchmark::DoNotOptimize(Dependences(c, c.body()));
  per_operation(state);
}

void timing(benchmark::State& state) {
  const Target target = typical(ions);
  const Placed placed = place(program(state.range(0)), target);
  for (auto _ : state) benchmark::DoNotOptimize(schedule(placed, target, whole));
  per_operation(state);
}

/// A stream that takes everything and keeps nothing.
struct Nowhere : std::streambuf {
  std::streamsize xsputn(const char*, std::streamsize count) override { return count; }
  int overflow(int byte) override { return byte; }
};

template <class Write>
void writing(benchmark::State& state, Write write) {
  const Target target = typical(ions);
  const Placed placed = place(program(state.range(0)), target);
  const Timed timed = schedule(placed, target, whole);
  const Compiled compiled{"bench.qasm", "", target, placed, timed, {}, ""};
  Nowhere sink;
  std::ostream out(&sink);
  for (auto _ : state) write(out, compiled);
  per_operation(state);
}

void native(benchmark::State& state) {
  writing(state, [](std::ostream& out, const Compiled& c) { write_native(out, c.placed, {"a", "b"}); });
}
void timeline_json(benchmark::State& state) {
  writing(state, [](std::ostream& out, const Compiled& c) { write_timeline_json(out, c); });
}
void timeline_csv(benchmark::State& state) {
  writing(state, [](std::ostream& out, const Compiled& c) { write_timeline_csv(out, c); });
}
void report(benchmark::State& state) {
  writing(state, [](std::ostream& out, const Compiled& c) { write_report(out, c); });
}

// NOLINTBEGIN
#define SIZES ->RangeMultiplier(10)->Range(1000, 1000000)->Unit(benchmark::kMillisecond)
BENCHMARK(placing) SIZES;
BENCHMARK(dependences) SIZES;
BENCHMARK(timing) SIZES;
BENCHMARK(native) SIZES;
BENCHMARK(timeline_json) SIZES;
BENCHMARK(timeline_csv) SIZES;
BENCHMARK(report) SIZES;
// NOLINTEND

}  // namespace
