// How fast a program is read, text to Circuit: flat files of 10^4 to 10^6 gates and a loop that unrolls to
// 10^6, next to the generated lexer alone over the same bytes in the same run.
//
//   MB/s, gates/s   of text and of operations in the circuit
//   times_lexer     how many times faster than the lexer alone read the same bytes
//   exponent        of the growth of time from 10^4 gates: 1 is linear
//   bytes_per_gate  peak memory of reading (text not counted) over the number of gates, the circuit included
#include <benchmark/benchmark.h>
#include <fmt/format.h>
#include <malloc.h>

#include <cmath>
#include <ctime>
#include <fstream>
#include <map>
#include <random>
#include <string>

#include "language/language.h"
#include "language/tokens.h"

namespace {

using isinglass::Reading;

/// A file as programs write it: two thirds of the gates have an angle, written in several ways.
std::string flat_program(std::size_t gates) {
  std::mt19937 source(1);
  const auto random = [&](unsigned below) { return static_cast<unsigned>(source() % below); };
  std::string text = "OPENQASM 3.0;\ninclude \"stdgates.inc\";\nqubit[20] q;\n";
  for (std::size_t i = 0; i < gates; ++i) {
    const unsigned a = random(20);
    const unsigned b = (a + 1 + random(19)) % 20;
    switch (random(6)) {
      case 0:
        text += fmt::format("rz({:.15f}) q[{}];\n", 1e-6 * (random(3000000)), a);
        break;
      case 1:
        text += fmt::format("cp(pi/{}) q[{}], q[{}];\n", 1 + random(16), a, b);
        break;
      case 2:
        text += fmt::format("rx(-{}*pi/4) q[{}];\n", 1 + random(3), a);
        break;
      case 3:
        text += fmt::format("u3({:.6f},{:.6f},-pi/2) q[{}];\n", 1e-6 * (random(3000000)), 0.5, a);
        break;
      case 4:
        text += fmt::format("h q[{}];\n", a);
        break;
      default:
        text += fmt::format("cx q[{}], q[{}];\n", a, b);
    }
  }
  return text;
}

const std::string& flat(std::size_t gates) {
  static std::map<std::size_t, std::string> made;
  std::string& text = made[gates];
  if (text.empty()) text = flat_program(gates);
  return text;
}

constexpr std::size_t looped_gates = 1'000'000;
const std::string looped =
    "OPENQASM 3.0;\ninclude \"stdgates.inc\";\nqubit[20] q;\n"
    "for int layer in [1:10000] {\n"
    "  for int i in [0:19] { rz(layer * pi / 1024) q[i]; h q[i]; rx(0.25 * i) q[i]; }\n"
    "  for int i in [0:2:18] { cx q[i], q[i + 1]; cp(pi / (i + 1)) q[i], q[i + 1]; }\n"
    "  for int i in [0:2:18] { cx q[i + 1], q[i]; rz(-pi / 8) q[i]; }\n"
    "}\n";

/// Processor time of this program: what the neighbours on the machine do does not count.
double seconds_now() {
  return static_cast<double>(std::clock()) / CLOCKS_PER_SEC;
}

/// Bytes per second of the lexer alone, by size of the file.
std::map<std::size_t, double> lexer_speed;
/// Seconds of reading a flat file, by number of gates.
std::map<std::size_t, double> reading_time;

void report(benchmark::State& state, std::size_t bytes, std::size_t gates, double seconds) {
  state.counters["MB/s"] = static_cast<double>(bytes) / seconds / 1e6;
  state.counters["gates/s"] = static_cast<double>(gates) / seconds;
}

void lexer_alone(benchmark::State& state) {
  const std::string& text = flat(static_cast<std::size_t>(state.range(0)));
  double best = 1e9;
  for (auto _ : state) {
    const double start = seconds_now();
    isinglass::Tokens tokens(text);
    tokens.restart({}, 3);
    while (tokens.nextToken()->getType() != antlr4::Token::EOF) continue;
    best = std::min(best, seconds_now() - start);
  }
  lexer_speed[text.size()] = static_cast<double>(text.size()) / best;
  report(state, text.size(), static_cast<std::size_t>(state.range(0)), best);
}

/// Reads the program; some gates of the library are two operations.
Reading read_or_stop(benchmark::State& state, const std::string& text, std::size_t gates) {
  Reading reading = isinglass::read("bench.qasm", text);
  if (!reading.ok() || reading.circuit->body().size() < gates)
    state.SkipWithError("the program was not read");
  return reading;
}

void read_flat(benchmark::State& state) {
  const auto gates = static_cast<std::size_t>(state.range(0));
  const std::string& text = flat(gates);
  double best = 1e9;
  for (auto _ : state) {
    const double start = seconds_now();
    benchmark::DoNotOptimize(read_or_stop(state, text, gates));
    best = std::min(best, seconds_now() - start);
  }
  reading_time[gates] = best;
  report(state, text.size(), gates, best);
  state.counters["times_lexer"] = static_cast<double>(text.size()) / best / lexer_speed[text.size()];
  const auto& [fewest, shortest] = *reading_time.begin();
  if (gates > fewest) {
    state.counters["exponent"] =
        std::log(best / shortest) / std::log(static_cast<double>(gates) / static_cast<double>(fewest));
  }
}

void read_looped(benchmark::State& state) {
  double best = 1e9;
  for (auto _ : state) {
    const double start = seconds_now();
    benchmark::DoNotOptimize(read_or_stop(state, looped, looped_gates));
    best = std::min(best, seconds_now() - start);
  }
  report(state, looped.size(), looped_gates, best);
}

/// A figure of /proc/self/status in bytes ("VmRSS", "VmHWM").
double memory(const std::string& figure) {
  std::ifstream status("/proc/self/status");
  for (std::string line; std::getline(status, line);) {
    if (line.starts_with(figure + ":")) return 1024 * std::stod(line.substr(figure.size() + 1));
  }
  return 0;
}

void peak_memory(benchmark::State& state) {
  const auto gates = static_cast<std::size_t>(state.range(0));
  const std::string& text = flat(gates);
  for (auto _ : state) {
    malloc_trim(0);
    std::ofstream("/proc/self/clear_refs") << "5";  // the peak counts from here
    const double before = memory("VmRSS");
    benchmark::DoNotOptimize(read_or_stop(state, text, gates));
    state.counters["bytes_per_gate"] = (memory("VmHWM") - before) / static_cast<double>(gates);
  }
}

constexpr auto unit = benchmark::kMillisecond;
BENCHMARK(lexer_alone)->Arg(10'000)->Arg(100'000)->Arg(1'000'000)->Unit(unit)->MinTime(0.2);
BENCHMARK(read_flat)->Arg(10'000)->Arg(100'000)->Arg(1'000'000)->Unit(unit)->MinTime(0.5);
BENCHMARK(read_looped)->Unit(unit)->MinTime(0.5);
BENCHMARK(peak_memory)->Arg(100'000)->Arg(1'000'000)->Unit(unit)->Iterations(1);

}  // namespace
