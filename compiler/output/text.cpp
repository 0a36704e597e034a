// Angles, bits and classical code as text; see text.h.
#include "output/text.h"

#include <algorithm>

namespace isinglass {

void TextWriter::grow(std::size_t size) {
  flush();
  if (used_ + size > buffer_.size()) buffer_.resize(used_ + std::max(size, piece));
}

std::string angle_text(Angle angle, const Circuit& circuit) {
  if (angle.form == 0) return fmt::format("{}", angle.constant);
  const bool is_dust = std::abs(angle.constant) < 1e-15;  // what rounding leaves of constants that cancelled
  std::string text = is_dust ? "" : fmt::format("{}", angle.constant);
  for (const Term& term : circuit.forms.terms(angle.form)) {
    const Input& input = circuit.inputs[term.input];
    const std::string value = input.is_derived ? "(" + printed(input.expression, circuit) + ")" : input.name;
    const double size = std::abs(term.coefficient);
    if (text.empty()) {
      text = term.coefficient < 0 ? "-" : "";
    } else {
      text += term.coefficient < 0 ? " - " : " + ";
    }
    text += size == 1 ? value : fmt::format("{}*{}", size, value);
  }
  return text;
}

std::vector<std::string> bit_names(const Circuit& circuit) {
  std::vector<std::string> names(circuit.bits);
  for (const Variable& variable : circuit.variables) {
    for (std::uint32_t i = 0; i < variable.bits; ++i) {
      names[variable.first_bit + i] =
          variable.is_scalar ? variable.name : fmt::format("{}[{}]", variable.name, i);
    }
  }
  return names;
}

std::string statement_text(const ClassicalStatement& statement, const Circuit& circuit) {
  switch (statement.kind) {
    case ClassicalStatement::Kind::assign:
      return fmt::format("{} {} {};", printed(statement.target, circuit), statement.operation,
                         printed(statement.value, circuit));
    case ClassicalStatement::Kind::call:
      return printed(statement.value, circuit) + ";";
    case ClassicalStatement::Kind::leave_loop:
      return "break;";
    case ClassicalStatement::Kind::next_round:
      return "continue;";
    case ClassicalStatement::Kind::end_program:
      return "end;";
    case ClassicalStatement::Kind::raw:
      return statement.text;
  }
  return {};
}

std::string branch_text(const Branch& branch, const Circuit& circuit) {
  const std::string condition = printed(branch.condition, circuit);
  switch (branch.kind) {
    case Branch::Kind::if_else:
      return "if (" + condition + ")";
    case Branch::Kind::while_loop:
      return "while (" + condition + ")";
    case Branch::Kind::for_loop: {
      const Variable& variable = circuit.variables[branch.variable];
      const bool is_range = branch.condition.kind == Expression::Kind::range;
      return fmt::format("for {} {} in {}", variable.type, variable.name,
                         is_range ? "[" + condition + "]" : condition);
    }
    case Branch::Kind::switch_case:
      return "switch (" + condition + ")";
  }
  return {};
}

std::string arm_text(const Branch& branch, std::size_t arm, const Circuit& circuit) {
  if (branch.kind == Branch::Kind::if_else) return arm == 0 ? "" : "else";
  if (branch.kind != Branch::Kind::switch_case) return {};
  if (branch.arms[arm].labels.empty()) return "default";
  std::string text = "case ";
  for (const Expression& label : branch.arms[arm].labels) {
    if (text.size() > 5) text += ", ";
    text += printed(label, circuit);
  }
  return text;
}

}  // namespace isinglass
