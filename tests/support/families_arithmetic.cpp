// Generators of reversible arithmetic; see families_arithmetic.h.
#include "support/families_arithmetic.h"

#include <array>
#include <vector>

namespace isinglass::support {

namespace {

using Wire = std::uint32_t;

void cx(Circuit& circuit, Wire control, Wire target) {
  circuit.body().push_back(circuit.make(Kind::x, {control, target}));
}
void ccx(Circuit& circuit, Wire a, Wire b, Wire target) {
  circuit.body().push_back(circuit.make(Kind::x, {a, b, target}));
}
void negate(Circuit& circuit, Wire wire) {
  circuit.body().push_back(circuit.make(Kind::x, {wire}));
}

struct Ladder {
  std::uint32_t n;
  Wire control(std::uint32_t i) const { return i; }
  Wire ancilla(std::uint32_t i) const { return n + i; }
  Wire target() const { return 2 * n - 2; }
};

void first_step(Circuit& circuit, const Ladder& ladder) {
  ccx(circuit, ladder.control(0), ladder.control(1), ladder.ancilla(0));
}
/// Step i >= 1 flips ancilla i, or the target when i = n - 2.
void step(Circuit& circuit, const Ladder& ladder, std::uint32_t i) {
  const Wire target = i + 2 == ladder.n ? ladder.target() : ladder.ancilla(i);
  ccx(circuit, ladder.control(i + 1), ladder.ancilla(i - 1), target);
}

}  // namespace

Circuit tof(std::uint32_t n) {
  Circuit circuit;
  add_register(circuit, "q", 2 * n - 1);
  const Ladder ladder{n};
  first_step(circuit, ladder);
  for (std::uint32_t i = 1; i + 1 < n; ++i) step(circuit, ladder, i);
  for (std::uint32_t i = n - 2; i-- > 1;) step(circuit, ladder, i);
  first_step(circuit, ladder);
  return circuit;
}

Circuit barenco_tof(std::uint32_t n) {
  Circuit circuit;
  add_register(circuit, "q", 2 * n - 1);
  const Ladder ladder{n};
  for (const std::uint32_t top : {n - 2, n - 3}) {
    for (std::uint32_t i = top; i >= 1; --i) step(circuit, ladder, i);
    first_step(circuit, ladder);
    for (std::uint32_t i = 1; i <= top; ++i) step(circuit, ladder, i);
  }
  return circuit;
}

Circuit vbe_adder(std::uint32_t n) {
  Circuit circuit;
  const Wire a = add_register(circuit, "a", n).first;
  const Wire b = add_register(circuit, "b", n).first;
  const Wire c = add_register(circuit, "c", n + 1).first;
  for (std::uint32_t i = 0; i < n; ++i) {
    ccx(circuit, a + i, b + i, c + i + 1);
    cx(circuit, a + i, b + i);
    ccx(circuit, c + i, b + i, c + i + 1);
  }
  cx(circuit, c + n - 1, b + n - 1);
  for (std::uint32_t i = n - 1; i-- > 0;) {
    ccx(circuit, c + i, b + i, c + i + 1);
    cx(circuit, a + i, b + i);
    ccx(circuit, a + i, b + i, c + i + 1);
    cx(circuit, a + i, b + i);
    cx(circuit, c + i, b + i);
  }
  return circuit;
}

Circuit cuccaro_adder(std::uint32_t n) {
  Circuit circuit;
  const Wire x = add_register(circuit, "x", 1, true).first;
  const Wire a = add_register(circuit, "a", n).first;
  const Wire b = add_register(circuit, "b", n).first;
  const Wire z = add_register(circuit, "z", 1, true).first;
  for (std::uint32_t i = 1; i < n; ++i) cx(circuit, a + i, b + i);
  cx(circuit, a + 1, x);
  ccx(circuit, a, b, x);
  cx(circuit, a + 2, a + 1);
  ccx(circuit, x, b + 1, a + 1);
  cx(circuit, a + 3, a + 2);
  for (std::uint32_t i = 2; i + 3 <= n; ++i) {
    ccx(circuit, a + i - 1, b + i, a + i);
    cx(circuit, a + i + 2, a + i + 1);
  }
  ccx(circuit, a + n - 3, b + n - 2, a + n - 2);
  cx(circuit, a + n - 1, z);
  ccx(circuit, a + n - 2, b + n - 1, z);
  for (std::uint32_t i = 1; i + 1 < n; ++i) negate(circuit, b + i);
  cx(circuit, x, b + 1);
  for (std::uint32_t i = 2; i < n; ++i) cx(circuit, a + i - 1, b + i);
  ccx(circuit, a + n - 3, b + n - 2, a + n - 2);
  for (std::uint32_t i = n - 3; i >= 2; --i) {
    ccx(circuit, a + i - 1, b + i, a + i);
    cx(circuit, a + i + 2, a + i + 1);
    negate(circuit, b + i + 1);
  }
  ccx(circuit, x, b + 1, a + 1);
  cx(circuit, a + 3, a + 2);
  negate(circuit, b + 2);
  ccx(circuit, a, b, x);
  cx(circuit, a + 2, a + 1);
  negate(circuit, b + 1);
  cx(circuit, a + 1, x);
  for (std::uint32_t i = 0; i < n; ++i) cx(circuit, a + i, b + i);
  return circuit;
}

std::uint32_t field_polynomial(std::uint32_t n) {
  // Low-weight irreducible polynomials; checked in the tests.
  constexpr std::array<std::uint32_t, 11> low = {0, 0, 3, 3, 3, 5, 3, 3, 27, 17, 9};
  return low[n] | (1u << n);
}

namespace {

/// The linear map that takes h(x) of degree <= n-2, on the wires' bits, to x^n h(x) in the field: column k as
/// bits.
std::vector<std::uint32_t> high_part_map(std::uint32_t n) {
  std::vector<std::uint32_t> columns;
  std::uint32_t power = field_polynomial(n) & ((1u << n) - 1);  // x^n
  for (std::uint32_t k = 0; k < n; ++k) {
    columns.push_back(power);
    power <<= 1;
    if (power >> n) power ^= field_polynomial(n);
  }
  return columns;
}

/// CNOTs that perform an invertible linear map: Gauss elimination on its rows, read backwards.
void linear_map(Circuit& circuit, Wire first, std::uint32_t n, const std::vector<std::uint32_t>& columns) {
  std::vector<std::uint32_t> rows(n, 0);
  for (std::uint32_t k = 0; k < n; ++k) {
    for (std::uint32_t i = 0; i < n; ++i) rows[i] |= ((columns[k] >> i) & 1) << k;
  }
  std::vector<std::pair<Wire, Wire>> steps;  // row additions (from, to) that make rows the identity
  const auto add = [&](std::uint32_t from, std::uint32_t to) {
    rows[to] ^= rows[from];
    steps.emplace_back(from, to);
  };
  for (std::uint32_t k = 0; k < n; ++k) {
    for (std::uint32_t i = k + 1; i < n && !((rows[k] >> k) & 1); ++i) {
      if ((rows[i] >> k) & 1) add(i, k);
    }
    for (std::uint32_t i = 0; i < n; ++i) {
      if (i != k && ((rows[i] >> k) & 1)) add(k, i);
    }
  }
  for (std::size_t s = steps.size(); s-- > 0;) cx(circuit, first + steps[s].first, first + steps[s].second);
}

}  // namespace

Circuit gf_multiplier(std::uint32_t n) {
  Circuit circuit;
  const Wire a = add_register(circuit, "a", n).first;
  const Wire b = add_register(circuit, "b", n).first;
  const Wire c = add_register(circuit, "c", n).first;
  for (std::uint32_t i = 0; i < n; ++i) {
    for (std::uint32_t j = n - i; j < n; ++j) ccx(circuit, a + i, b + j, c + i + j - n);
  }
  if (field_polynomial(n) == ((1u << n) | 3)) {  // x^n = x + 1; the top wire is still 0
    for (std::uint32_t k = n - 1; k >= 1; --k) cx(circuit, c + k - 1, c + k);
  } else {
    linear_map(circuit, c, n, high_part_map(n));
  }
  for (std::uint32_t i = 0; i < n; ++i) {
    for (std::uint32_t j = 0; i + j < n; ++j) ccx(circuit, a + i, b + j, c + i + j);
  }
  return circuit;
}

Circuit expanded_clifford_t(const Circuit& circuit, int variant) {
  Circuit result = circuit;
  result.body().clear();
  const auto p = [&](Wire wire, double angle) {
    result.body().push_back(result.make(Kind::p, {wire}, {{angle}}));
  };
  const auto h = [&](Wire wire) { result.body().push_back(result.make(Kind::h, {wire})); };
  const double t = pi / 4;
  for (const Operation& op : circuit.body()) {
    if (op.kind != Kind::x || op.control_count() != 2) {
      result.body().push_back(op);
      continue;
    }
    const Wire a = op.operand[variant & 1 ? 1 : 0];
    const Wire b = op.operand[variant & 1 ? 0 : 1];
    const Wire c = op.operand[2];
    h(c);
    if (variant & 2) {  // the controls' part first, the target's walk the other way round
      cx(result, a, b);
      p(b, -t);
      cx(result, a, b);
      p(a, t);
      p(b, t);
      p(c, t);
      cx(result, a, c);
      p(c, -t);
      cx(result, b, c);
      p(c, t);
      cx(result, a, c);
      p(c, -t);
      cx(result, b, c);
      h(c);
    } else {
      cx(result, b, c);
      p(c, -t);
      cx(result, a, c);
      p(c, t);
      cx(result, b, c);
      p(c, -t);
      cx(result, a, c);
      p(b, t);
      p(c, t);
      h(c);
      cx(result, a, b);
      p(a, t);
      p(b, -t);
      cx(result, a, b);
    }
  }
  return result;
}

std::uint64_t run_classically(const Circuit& circuit, std::uint64_t bits) {
  for (const Operation& op : circuit.body()) {
    bool on = true;
    for (const Wire control : circuit.controls(op)) on = on && ((bits >> control) & 1);
    if (on) bits ^= std::uint64_t{1} << circuit.targets(op)[0];
  }
  return bits;
}

}  // namespace isinglass::support
