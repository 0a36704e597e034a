// First light of the passes: random circuits keep their unitary.
#include <doctest/doctest.h>

#include <algorithm>
#include <random>

#include "passes/optimize.h"

using namespace isinglass;
using C = std::complex<double>;

namespace {
void apply(const Circuit& circuit, const Operation& op, std::vector<C>& state) {
  const auto m = matrix_of(op);
  const auto controls = circuit.controls(op);
  const auto targets = circuit.targets(op);
  const std::size_t dim = std::size_t{1} << targets.size();
  for (std::size_t i = 0; i < state.size(); ++i) {
    bool base = true;
    for (auto c : controls) base = base && ((i >> c) & 1);
    for (auto t : targets) base = base && !((i >> t) & 1);
    if (!base) continue;
    std::vector<C> in(dim), out(dim);
    std::vector<std::size_t> at(dim);
    for (std::size_t k = 0; k < dim; ++k) {
      at[k] = i;
      for (std::size_t t = 0; t < targets.size(); ++t)
        if ((k >> t) & 1) at[k] |= std::size_t{1} << targets[t];
      in[k] = state[at[k]];
    }
    for (std::size_t r = 0; r < dim; ++r)
      for (std::size_t c = 0; c < dim; ++c) out[r] += m[r * dim + c] * in[c];
    for (std::size_t k = 0; k < dim; ++k) state[at[k]] = out[k];
  }
}

Circuit random_circuit(std::mt19937_64& rng, std::uint32_t n, int gates) {
  Circuit c;
  add_register(c, "q", n);
  std::uniform_real_distribution<double> angle(-7, 7);
  for (int g = 0; g < gates; ++g) {
    const Kind kind = static_cast<Kind>(rng() % 12);
    std::vector<std::uint32_t> w(n);
    for (std::uint32_t i = 0; i < n; ++i) w[i] = i;
    std::shuffle(w.begin(), w.end(), rng);
    std::size_t k = static_cast<std::size_t>(target_count(kind)) + rng() % 4;
    k = std::min<std::size_t>(k, n);
    if (k < static_cast<std::size_t>(target_count(kind))) continue;
    w.resize(k);
    std::vector<Angle> a;
    for (int i = 0; i < angle_count(kind); ++i)
      a.push_back({rng() % 3 == 0 ? pi / 2 * double(rng() % 8) : angle(rng)});
    c.body().push_back(c.make(kind, w, a));
  }
  return c;
}
}  // namespace

TEST_CASE("optimize keeps the unitary") {
  std::mt19937_64 rng(7);
  for (int trial = 0; trial < 300; ++trial) {
    const std::uint32_t n = 1 + trial * 4 / 300;
    const Circuit source = random_circuit(rng, n, trial % 3 == 0 ? 1 : 12);
    const Circuit result = optimize(source, {});
    check_invariants(result);
    C overlap = 0;
    for (std::size_t b = 0; b < (1u << n); ++b) {
      std::vector<C> s(1u << n), t(1u << n);
      s[b] = t[b] = 1;
      for (auto& op : source.body()) apply(source, op, s);
      for (auto& op : result.body()) apply(result, op, t);
      for (std::size_t i = 0; i < s.size(); ++i) {
        std::size_t j = 0;
        for (std::uint32_t q = 0; q < n; ++q)
          if ((i >> q) & 1) j |= std::size_t{1} << result.end_wire[q];
        overlap += std::conj(s[i]) * t[j];
      }
    }
    INFO(listed(source), listed(result));
    CHECK(std::abs(overlap) / double(1u << n) == doctest::Approx(1).epsilon(1e-10));
  }
}
