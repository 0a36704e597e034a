// Sums over paths of two circuits, with names in common; see paths.h.
#include "verify/paths.h"

#include <algorithm>
#include <array>
#include <cmath>
#include <iterator>
#include <map>
#include <set>
#include <tuple>

#include "verify/memory.h"

namespace isinglass {

namespace {

using Monomial = std::vector<std::uint32_t>;  // ascending variables; empty = the constant 1
using Polynomial = std::set<Monomial>;        // empty = 0

constexpr std::size_t most_monomials = 4096;        // of one polynomial
constexpr std::size_t most_additions = 20'000'000;  // of monomials, in all
constexpr double nothing = 1e-10;                   // angles up to this are rounding

/// Adds and multiplies, and gives up when that has been too much.
class Calculator {
 public:
  Polynomial sum(Polynomial a, const Polynomial& b) {
    for (const Monomial& monomial : b) add(a, monomial);
    return a;
  }
  Polynomial product(const Polynomial& a, const Polynomial& b) {
    Polynomial result;
    for (const Monomial& left : a) {
      for (const Monomial& right : b) {
        Monomial both;
        std::set_union(left.begin(), left.end(), right.begin(), right.end(), std::back_inserter(both));
        add(result, both);
      }
    }
    return result;
  }

 private:
  void add(Polynomial& sum, const Monomial& monomial) {
    if (!sum.insert(monomial).second) sum.erase(monomial);
    if (sum.size() > most_monomials || ++additions_ > most_additions) {
      throw Unsupported("so long a polynomial");
    }
  }

  std::size_t additions_ = 0;
};

/// A gate that makes new variables: what it is, what goes in, and how often the same was there before.
using Gate = std::tuple<Kind, std::array<double, 3>, std::vector<Polynomial>, int>;

/// The first of the new variables of each gate, in common for both circuits.
using Names = std::map<Gate, std::uint32_t>;

class PathSum {
 public:
  PathSum(const Circuit& circuit, std::span<const double> inputs, const Promise& promise, Names& names,
          std::uint32_t& variables)
      : circuit_(circuit), inputs_(inputs), names_(names), variables_(variables), wire_(circuit.wires) {
    for (std::uint32_t w = 0; w < circuit.source_qubits && !promise.zero_start; ++w) wire_[w] = {{w}};
  }

  void run(std::chrono::steady_clock::time_point deadline) {
    for (const Operation& op : circuit_.body()) {
      if (std::chrono::steady_clock::now() > deadline) throw Unsupported("the time given");
      apply(op);
    }
  }

  /// What the source's qubits carry at the end, and whether all other wires carry 0.
  std::vector<Polynomial> ends() const {
    std::vector<Polynomial> ends;
    for (std::uint32_t q = 0; q < circuit_.source_qubits; ++q) ends.push_back(wire_[circuit_.end_wire[q]]);
    return ends;
  }
  bool leaves_zeros() const {
    const std::set<std::uint32_t> kept(circuit_.end_wire.begin(), circuit_.end_wire.end());
    for (std::uint32_t w = 0; w < circuit_.wires; ++w) {
      if (kept.count(w) == 0 && !wire_[w].empty()) return false;
    }
    return true;
  }
  const Polynomial& sign() const { return sign_; }
  const std::map<Polynomial, double>& phases() const { return phases_; }
  const std::set<Gate>& gates() const { return gates_; }
  const std::map<std::uint32_t, Polynomial>& bits() const { return bits_; }
  double rounded() const { return rounded_; }

 private:
  void apply(const Operation& op) {
    const auto operands = circuit_.operands(op);
    const auto controls = circuit_.controls(op);
    if (op.kind == Kind::barrier || op.kind == Kind::delay) return;
    if (op.kind == Kind::measure) {
      bits_[op.payload] = wire_[operands[0]];
      return;
    }
    Polynomial all = {{}};
    for (const std::uint32_t wire : controls) all = calculator_.product(all, wire_[wire]);
    const double angle = angle_count(op.kind) > 0 ? circuit_.forms.value(op.angle(0), inputs_) : pi;
    switch (op.kind) {
      case Kind::x:
        wire_[operands.back()] = calculator_.sum(wire_[operands.back()], all);
        return;
      case Kind::swap: {
        Polynomial& a = wire_[operands[controls.size()]];
        Polynomial& b = wire_[operands[controls.size() + 1]];
        const Polynomial moved = calculator_.product(all, calculator_.sum(a, b));
        a = calculator_.sum(a, moved);
        b = calculator_.sum(b, moved);
        return;
      }
      case Kind::phase:
        return turn(std::move(all), angle);
      case Kind::z:
      case Kind::p:
        return turn(calculator_.product(all, wire_[operands.back()]), angle);
      case Kind::rz:
        turn(calculator_.product(all, wire_[operands.back()]), angle);
        return turn(std::move(all), -angle / 2);
      default:
        return make_variables(op);
    }
  }

  /// e^{i angle} where the polynomial is 1.
  void turn(Polynomial polynomial, double angle) {
    if (polynomial.erase(Monomial()) > 0) angle = -angle;  // up to a global phase
    if (polynomial.empty()) return;
    if (std::abs(std::remainder(angle, pi)) <= nothing) {
      if (std::abs(std::remainder(angle, 2 * pi)) > 1) sign_ = calculator_.sum(std::move(sign_), polynomial);
      rounded_ += std::abs(std::remainder(angle, pi));
      return;
    }
    phases_[std::move(polynomial)] += angle;
  }

  void make_variables(const Operation& op) {
    const auto operands = circuit_.operands(op);
    std::array<double, 3> angles{};
    for (int k = 0; k < 3; ++k) angles[k] = circuit_.forms.value(op.angle(k), inputs_);
    std::vector<Polynomial> in;
    for (const std::uint32_t wire : operands) in.push_back(wire_[wire]);
    Gate gate{op.kind, angles, std::move(in), 0};
    while (!gates_.insert(gate).second) ++std::get<int>(gate);
    const auto targets = circuit_.targets(op);
    const auto [name, is_new] = names_.try_emplace(gate, variables_);
    if (is_new) variables_ += static_cast<std::uint32_t>(targets.size());
    std::uint32_t next = name->second;
    for (const std::uint32_t wire : targets) wire_[wire] = {{next++}};
  }

  Calculator calculator_;
  const Circuit& circuit_;
  std::span<const double> inputs_;
  Names& names_;
  std::uint32_t& variables_;  // how many are in use
  std::vector<Polynomial> wire_;
  Polynomial sign_;
  std::map<Polynomial, double> phases_;
  std::set<Gate> gates_;
  std::map<std::uint32_t, Polynomial> bits_;
  double rounded_ = 0;
};

}  // namespace

PathResult by_paths(const Job& job, const InputValues& inputs) {
  Names names;
  std::uint32_t variables = job.source.source_qubits;
  PathSum a(job.source, inputs.source, job.promise, names, variables);
  PathSum b(job.compiled, inputs.compiled, job.promise, names, variables);
  a.run(job.options.deadline);
  b.run(job.options.deadline);
  PathResult result;
  result.variables = variables;
  result.distance = a.rounded() + b.rounded();
  std::map<Polynomial, double> difference = a.phases();
  for (const auto& [polynomial, angle] : b.phases()) difference[polynomial] -= angle;
  Calculator calculator;
  Polynomial sign = calculator.sum(a.sign(), b.sign());
  bool are_phases_same = true;
  for (const auto& [polynomial, angle] : difference) {
    if (std::abs(std::remainder(angle, pi)) > nothing) are_phases_same = false;
    if (std::abs(std::remainder(angle, 2 * pi)) > 1) sign = calculator.sum(std::move(sign), polynomial);
    result.distance += std::abs(std::remainder(angle, pi));
  }
  result.are_same = are_phases_same && sign.empty() && a.ends() == b.ends() && a.leaves_zeros() &&
                    b.leaves_zeros() && a.gates() == b.gates() && a.bits() == b.bits();
  return result;
}

}  // namespace isinglass
