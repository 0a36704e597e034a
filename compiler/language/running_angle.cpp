// Sums over bits, and gates that take them bit by bit; see running_angle.h.
#include "language/running_angle.h"

#include <algorithm>
#include <cmath>
#include <numeric>

#include "language/evaluate.h"
#include "language/unitary.h"

namespace isinglass {

namespace {

constexpr double exact = 0x1p53;  // whole numbers below are doubles without rounding

/// A number as a sum over bits; `type` tells how the language goes on with it.
struct Sum {
  Type type;
  Angle fixed;
  std::vector<std::pair<Expression, double>> bits;
  bool wraps = false;

  bool is_fixed() const { return bits.empty(); }
};

Expression bit_of(const Expression& number, std::uint32_t bit) {
  Expression index;
  index.kind = Expression::Kind::index;
  index.arguments = {number, literal(std::to_string(bit))};
  return index;
}

class Walk {
 public:
  Walk(const Circuit& circuit, const Rules& rules) : circuit_(circuit), rules_(rules) {}

  std::optional<Sum> sum(const Expression& node) const {
    if (!runs(node)) return fixed(node);
    switch (node.kind) {
      case Expression::Kind::variable:
        return variable(node);
      case Expression::Kind::index:
        return index(node);
      case Expression::Kind::cast:
        return cast(node);
      case Expression::Kind::unary:
        return negated(node);
      case Expression::Kind::binary:
        if (node.text == "+" || node.text == "-") return added(node);
        if (node.text == "*" || node.text == "/") return multiplied(node);
        return std::nullopt;
      default:
        return std::nullopt;
    }
  }

 private:
  static bool runs(const Expression& node) {
    if (node.kind == Expression::Kind::variable) return true;
    return std::any_of(node.arguments.begin(), node.arguments.end(), runs);
  }
  static bool is_whole(const Sum& s) {
    const Base base = s.type.base;
    return base == Base::bit || base == Base::boolean || base == Base::integer || base == Base::natural;
  }
  static bool is_real(const Sum& s) {
    return s.type.base == Base::real || (s.type.base == Base::angle && s.type.width == 0);
  }
  static bool is_sized_angle(const Sum& s) { return s.type.base == Base::angle && s.type.width > 0; }

  /// Numbers, and inputs that are real.
  std::optional<Sum> fixed(const Expression& node) const {
    Value value;
    try {
      value = evaluate(
          node,
          [this](const Expression& leaf) {
            Value input;
            if (leaf.kind != Expression::Kind::input) return input;
            const Type type = type_of(circuit_.inputs[leaf.variable].type);
            if (type.base != Base::real && (type.base != Base::angle || type.width > 0)) return input;
            input.type = type;
            input.form = rules_.forms->of_input(leaf.variable);
            return input;
          },
          rules_);
    } catch (const Fault&) {
      return std::nullopt;
    }
    Sum result;
    result.type = value.type;
    if (value.is_affine()) {
      result.fixed = {value.real, value.form};
      return result;
    }
    if (!value.is_known() || !(is_whole(result) || is_real(result) || is_sized_angle(result)))
      return std::nullopt;
    result.fixed.constant = radians_of(value);
    return result;
  }

  /// The bits of a number with their weights.
  static Sum weighted(const Expression& number, Type type, std::uint32_t width) {
    Sum result;
    result.type = type;
    for (std::uint32_t k = 0; k < width; ++k) {
      double weight = std::ldexp(1.0, static_cast<int>(k));
      if (type.base == Base::integer && k + 1 == width) weight = -weight;
      if (type.base == Base::angle) weight *= 2 * pi / std::ldexp(1.0, static_cast<int>(width));
      result.bits.emplace_back(bit_of(number, k), weight);
    }
    return result;
  }

  std::optional<Sum> variable(const Expression& node) const {
    const Variable& variable = circuit_.variables[node.variable];
    const Type type = type_of(variable.type);
    if (variable.type.starts_with("array")) return std::nullopt;
    if ((variable.bits == 1 && variable.is_scalar) || type.base == Base::boolean) {
      Sum result;
      result.type = type;
      result.bits.emplace_back(node, 1.0);
      return result;
    }
    const bool has_bits =
        type.base == Base::natural || type.base == Base::integer || type.base == Base::angle;
    if (!has_bits || type.width == 0 || type.width > 64) return std::nullopt;
    return weighted(node, type, type.width);
  }

  /// One bit of a register or number.
  std::optional<Sum> index(const Expression& node) const {
    if (node.arguments.size() != 2 || node.arguments[0].kind != Expression::Kind::variable ||
        node.arguments[1].kind != Expression::Kind::literal) {
      return std::nullopt;
    }
    if (circuit_.variables[node.arguments[0].variable].type.starts_with("array")) return std::nullopt;
    Sum result;
    result.type = {Base::bit, 0};
    result.bits.emplace_back(node, 1.0);
    return result;
  }

  std::optional<Sum> cast(const Expression& node) const {
    const Type to = type_of(node.text);
    const Expression& inner = node.arguments[0];
    const bool is_register = inner.kind == Expression::Kind::variable &&
                             circuit_.variables[inner.variable].bits > 0 &&
                             !circuit_.variables[inner.variable].is_scalar;
    if (is_register) {
      const bool fits = to.base == Base::natural || to.base == Base::integer || to.base == Base::angle;
      if (!fits || to.width != circuit_.variables[inner.variable].bits || to.width > 64) return std::nullopt;
      return weighted(inner, to, to.width);
    }
    auto result = sum(inner);
    if (!result) return std::nullopt;
    const Type from = result->type;
    result->type = to;
    if (to.base == Base::real && to.width == 0) return result;
    if (to.base == Base::real && to.width == 64) return result;
    if (to.base == Base::angle && to.width == 0) return result;
    // Only into what holds every value of the narrower type.
    const bool widens = to.width == 0 || (from.width > 0 && from.width <= to.width);
    if (to.base == Base::natural && from.base == Base::natural && widens) return result;
    if (to.base == Base::integer && from.base == Base::integer && widens) return result;
    if (to.base == Base::integer && from.base == Base::natural && from.width > 0 && from.width < 64 &&
        (to.width == 0 || from.width < to.width)) {
      return result;
    }
    if ((to.base == Base::natural || to.base == Base::integer) && to.width != 1 &&
        (from.base == Base::bit || from.base == Base::boolean)) {
      return result;
    }
    if (to.base == Base::angle && from.base == Base::angle && widens && !result->wraps) return result;
    return std::nullopt;
  }

  void scale(Sum& s, double factor) const {
    s.fixed = rules_.forms->scaled(s.fixed, factor);
    for (auto& [bit, weight] : s.bits) weight *= factor;
  }

  std::optional<Sum> negated(const Expression& node) const {
    if (node.text != "-") return std::nullopt;
    auto result = sum(node.arguments[0]);
    if (!result || is_whole(*result)) return std::nullopt;
    result->wraps = result->wraps || is_sized_angle(*result);
    scale(*result, -1);
    return result;
  }

  std::optional<Sum> added(const Expression& node) const {
    auto left = sum(node.arguments[0]);
    auto right = sum(node.arguments[1]);
    if (!left || !right) return std::nullopt;
    const bool sized = is_sized_angle(*left) || is_sized_angle(*right);
    if (sized && !(is_sized_angle(*left) && is_sized_angle(*right)))
      return std::nullopt;                                                   // rounds to the grid
    if (!sized && is_whole(*left) && is_whole(*right)) return std::nullopt;  // wraps at some width
    if (node.text == "-") scale(*right, -1);
    Sum result = std::move(*left);
    result.fixed = rules_.forms->sum(result.fixed, right->fixed);
    result.bits.insert(result.bits.end(), right->bits.begin(), right->bits.end());
    result.wraps = sized;
    if (sized) {
      result.type.width = std::max(result.type.width, right->type.width);
    } else {
      result.type = {Base::real, 0};
    }
    return result;
  }

  std::optional<Sum> multiplied(const Expression& node) const {
    auto left = sum(node.arguments[0]);
    auto right = sum(node.arguments[1]);
    if (!left || !right) return std::nullopt;
    const bool divides = node.text == "/";
    if (divides && !right->is_fixed()) return std::nullopt;
    Sum& variable = left->is_fixed() ? *right : *left;
    const Sum& factor = left->is_fixed() ? *left : *right;
    if (!factor.is_fixed() || !factor.fixed.is_known()) return std::nullopt;
    const double by = factor.fixed.constant;
    if (divides && by == 0) return std::nullopt;
    if (is_sized_angle(variable)) {
      if (divides || !is_whole(factor)) return std::nullopt;
      variable.wraps = true;
      scale(variable, by);
      return variable;
    }
    if (is_sized_angle(factor)) return std::nullopt;
    if (is_whole(variable) && is_whole(factor)) {
      // Without a width it is a number of the machine, which wraps only beyond 2^53 here.
      double most = 0;
      for (const auto& [bit, weight] : variable.bits) most += std::abs(weight) * std::abs(by);
      const bool signs = by < 0 && variable.type.base != Base::integer;
      if (divides || factor.type.width > 0 || signs || most > exact) return std::nullopt;
      scale(variable, by);
      variable.type.width = 0;
      if (variable.type.base != Base::natural) variable.type.base = Base::integer;
      return variable;
    }
    scale(variable, divides ? 1 / by : by);
    if (!is_real(variable)) variable.type = {Base::real, 0};
    return variable;
  }

  const Circuit& circuit_;
  const Rules& rules_;
};

}  // namespace

std::optional<RunningAngle> running_angle(const Expression& expression, const Circuit& circuit,
                                          const Rules& rules) {
  auto sum = Walk(circuit, rules).sum(expression);
  if (!sum) return std::nullopt;
  return RunningAngle{sum->fixed, std::move(sum->bits), sum->wraps};
}

RotationTest rotation_in(const GateTemplate& gate, std::span<const Angle> angles, std::size_t which) {
  constexpr std::size_t most_operands = 4;
  constexpr std::size_t most_acts = 100;
  constexpr double tolerance = 1e-11;
  if (gate.operands > most_operands || gate.acts.size() > most_acts) return {};
  for (const Act& act : gate.acts) {
    if (act.kind == Kind::barrier) return {};
  }
  std::vector<std::uint32_t> wires(gate.operands);
  std::iota(wires.begin(), wires.end(), 0u);
  const auto at = [&](double angle) {
    std::vector<Angle> arguments(angles.begin(), angles.end());
    arguments[which] = {angle, 0};
    Forms forms;
    return matrix_of(instance(gate, arguments, wires, forms), wires);
  };
  RotationTest test;
  // Entries are trigonometric polynomials of low degree: agreement at these points is agreement.
  const Eigen::MatrixXcd one = at(0);
  if (!one.isIdentity(tolerance)) return test;
  for (const auto& [a, b] :
       {std::pair(0.3, 1.1), std::pair(-2.7, 0.4), std::pair(5.1, 2.2), std::pair(-0.9, -4.3)}) {
    if (!(at(a) * at(b)).isApprox(at(a + b), tolerance)) return test;
  }
  test.is_rotation = true;
  test.has_period_2pi = at(2 * pi).isIdentity(tolerance);
  return test;
}

}  // namespace isinglass
