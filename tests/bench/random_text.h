// The random circuits that benchmarks of the whole line share.
#pragma once

#include <fmt/format.h>

#include <cstdint>
#include <random>
#include <string>

namespace isinglass {

inline constexpr int qubits = 20;

/// Gates as circuits in circulation have them: half of them on two qubits.
inline std::string random_text(std::int64_t gates) {
  std::mt19937_64 random(7);
  const auto below = [&](int limit) {
    return static_cast<int>(random() % static_cast<std::uint64_t>(limit));
  };
  std::string text = fmt::format("OPENQASM 3.0;\ninclude \"stdgates.inc\";\nqubit[{}] q;\n", qubits);
  for (std::int64_t i = 0; i < gates; ++i) {
    const int a = below(qubits);
    const int b = (a + 1 + below(qubits - 1)) % qubits;
    switch (below(6)) {
      case 0:
        text += fmt::format("h q[{}];\n", a);
        break;
      case 1:
        text += fmt::format("t q[{}];\n", a);
        break;
      case 2:
        text += fmt::format("rz({}) q[{}];\n", below(1000) / 100.0, a);
        break;
      case 3:
        text += fmt::format("cp(pi/{}) q[{}], q[{}];\n", 2 << below(5), a, b);
        break;
      default:
        text += fmt::format("cx q[{}], q[{}];\n", a, b);
    }
  }
  return text;
}

}  // namespace isinglass
