// See late_bits.h.
#include "verify/late_bits.h"

#include <algorithm>
#include <charconv>
#include <unordered_map>
#include <vector>

namespace isinglass {

namespace {

/// The flat bit that an expression names.
std::optional<std::uint32_t> bit_named(const Circuit& circuit, const Expression& expression) {
  const bool is_indexed = expression.kind == Expression::Kind::index;
  const Expression& name = is_indexed && !expression.arguments.empty() ? expression.arguments[0] : expression;
  if (name.kind != Expression::Kind::variable) return {};
  const Variable& variable = circuit.variables[name.variable];
  if (!is_indexed)
    return variable.bits == 1 && variable.is_scalar ? std::optional(variable.first_bit) : std::nullopt;
  if (expression.arguments.size() != 2 || expression.arguments[1].kind != Expression::Kind::literal)
    return {};
  const std::string& text = expression.arguments[1].text;
  std::uint32_t place = 0;
  const auto [end, error] = std::from_chars(text.data(), text.data() + text.size(), place);
  if (error != std::errc() || end != text.data() + text.size() || place >= variable.bits) return {};
  return variable.first_bit + place;
}

/// Adds the bits of a & b & ...; false where it is anything else.
bool add_factors(const Circuit& circuit, const Expression& expression, std::vector<std::uint32_t>& bits) {
  if (expression.kind == Expression::Kind::binary && expression.text == "&") {
    return add_factors(circuit, expression.arguments[0], bits) &&
           add_factors(circuit, expression.arguments[1], bits);
  }
  const auto bit = bit_named(circuit, expression);
  if (bit) bits.push_back(*bit);
  return bit.has_value();
}

/// A bit that is flipped where all others are 1.
struct Flip {
  std::uint32_t target = 0;
  std::vector<std::uint32_t> conditions;
};

std::optional<Flip> flip_of(const Circuit& circuit, const ClassicalStatement& statement) {
  if (statement.kind != ClassicalStatement::Kind::assign || statement.operation != "=") return {};
  const auto target = bit_named(circuit, statement.target);
  if (!target || statement.value.arguments.empty()) return {};
  if (bit_named(circuit, statement.value.arguments[0]) != target) return {};
  Flip flip{*target, {}};
  const bool is_flipped = statement.value.kind == Expression::Kind::unary &&
                          (statement.value.text == "~" || statement.value.text == "!");
  if (is_flipped) return flip;
  if (statement.value.kind != Expression::Kind::binary || statement.value.text != "^") return {};
  if (!add_factors(circuit, statement.value.arguments[1], flip.conditions)) return {};
  const auto& conditions = flip.conditions;
  if (std::find(conditions.begin(), conditions.end(), flip.target) != conditions.end()) return {};
  return flip;
}

}  // namespace

std::optional<Circuit> with_late_bits_on_wires(const Circuit& circuit) {
  Circuit result = circuit;
  Block gates, flips, measurements;
  std::unordered_map<std::uint32_t, std::uint32_t> wire_of_bit;
  std::vector<bool> is_measured(circuit.wires, false);
  for (const Operation& op : circuit.body()) {
    if (op.kind == Kind::barrier) continue;
    for (const std::uint32_t wire : circuit.operands(op)) {
      if (is_measured[wire]) return {};
    }
    if (op.kind == Kind::measure) {
      const std::uint32_t wire = circuit.operands(op)[0];
      if (op.payload == no_bit || !wire_of_bit.emplace(op.payload, wire).second) return {};
      is_measured[wire] = true;
      measurements.push_back(op);
    } else if (op.kind == Kind::classical) {
      const auto flip = flip_of(circuit, circuit.statements[op.payload]);
      if (!flip) return {};
      std::vector<std::uint32_t> bits = flip->conditions;
      std::sort(bits.begin(), bits.end());
      bits.erase(std::unique(bits.begin(), bits.end()), bits.end());
      bits.push_back(flip->target);
      std::vector<std::uint32_t> operands;
      for (const std::uint32_t bit : bits) {
        const auto wire = wire_of_bit.find(bit);
        if (wire == wire_of_bit.end()) return {};
        operands.push_back(wire->second);
      }
      flips.push_back(result.make(Kind::x, operands, {}, op.origin));
    } else if (op.kind == Kind::branch) {
      return {};
    } else {
      gates.push_back(op);
    }
  }
  if (flips.empty()) return {};
  gates.insert(gates.end(), flips.begin(), flips.end());
  gates.insert(gates.end(), measurements.begin(), measurements.end());
  result.body() = std::move(gates);
  result.statements.clear();
  return result;
}

}  // namespace isinglass
