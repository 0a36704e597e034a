// Names in code that is not run: arms that are not taken, loops without rounds, subroutines that nobody has
// called yet. An undeclared name or a wrong number of operands is an error there as well. See reader.h.
#include <fmt/format.h>

#include "language/reader.h"

namespace isinglass {

namespace {

const char* plural(std::size_t count) {
  return count == 1 ? "" : "s";
}

}  // namespace

bool Reader::is_local(const std::string& name) const {
  for (const auto& level : check_levels_) {
    if (level.contains(name)) return true;
  }
  return false;
}

/// Once for every piece of syntax, however often it is not run.
void Reader::check_unrun(const syntax::Body& body) {
  if (!checked_.insert(&body).second) return;
  const auto outer = std::exchange(check_levels_, {});
  check_list(body.statements);
  check_levels_ = outer;
}

void Reader::check_list(const Statements& statements) {
  check_levels_.emplace_back();
  for (const syntax::Statement& statement : statements) {
    try {
      check_statement(statement);
    } catch (const Trouble& trouble) {
      report(trouble);
    }
  }
  check_levels_.pop_back();
}

void Reader::check_name(const std::string& name, syntax::Span at, const char* what) {
  if (!is_local(name)) found(name, at, what);
}

void Reader::check_type(const syntax::Type& type) {
  for (const SyntaxExpression& width : type.width) check_expression(width);
  for (const syntax::Type& element : type.element) check_type(element);
  for (const SyntaxExpression& size : type.dimensions) check_expression(size);
}

void Reader::check_expression(const SyntaxExpression& expression) {
  using K = SyntaxExpression::Kind;
  if (expression.kind == K::name) check_name(expression.text, expression.at, "variable");
  if (expression.kind == K::call) {
    const bool is_known = is_local(expression.text) || scopes_.find(expression.text) != nullptr ||
                          expression.text == "sizeof" || is_function(expression.text, version_ == 20);
    if (!is_known) found(expression.text, expression.at, "function");
  }
  for (const syntax::Type& type : expression.type) check_type(type);
  for (const SyntaxExpression& argument : expression.arguments) check_expression(argument);
  if (!expression.body.empty()) check_list(expression.body);
}

void Reader::check_call(const syntax::GateCall& call) {
  for (const SyntaxExpression& angle : call.angles) check_expression(angle);
  for (const SyntaxExpression& operand : call.operands) check_expression(operand);
  std::size_t controls = 0;
  bool counts = true;
  for (const syntax::Modifier& modifier : call.modifiers) {
    if (modifier.argument) check_expression(*modifier.argument);
    if (modifier.kind != syntax::Modifier::Kind::ctrl && modifier.kind != syntax::Modifier::Kind::negctrl)
      continue;
    counts = counts && !modifier.argument;
    ++controls;
  }
  if (call.name.text == "gphase" || is_local(call.name.text)) return;
  const Symbol& symbol = found(call.name.text, call.name.at, "gate");
  if (symbol.kind != Symbol::Kind::gate || symbol.is_opaque) return;
  if (call.angles.size() != symbol.gate->parameters) {
    fail(call.name.at, fmt::format("`{}` takes {} angle{}, not {}", symbol.name, symbol.gate->parameters,
                                   plural(symbol.gate->parameters), call.angles.size()));
  }
  const std::size_t expected = symbol.gate->operands + controls;
  if (counts && call.operands.size() != expected) {
    fail(call.name.at, fmt::format("`{}`{} takes {} qubit{}, not {}", symbol.name,
                                   controls == 0 ? "" : " with its controls", expected, plural(expected),
                                   call.operands.size()));
  }
}

void Reader::check_statement(const syntax::Statement& statement) {
  using namespace syntax;
  const auto optional = [&](const std::optional<SyntaxExpression>& expression) {
    if (expression) check_expression(*expression);
  };
  const auto all = [&](const std::vector<SyntaxExpression>& expressions) {
    for (const SyntaxExpression& expression : expressions) check_expression(expression);
  };
  if (const auto* s = std::get_if<GateCall>(&statement.what)) return check_call(*s);
  if (const auto* s = std::get_if<syntax::Declaration>(&statement.what)) {
    check_levels_.back().insert(s->name.text);  // declared even where its value is wrong
    check_type(s->type);
    return optional(s->value);
  }
  if (const auto* s = std::get_if<syntax::Alias>(&statement.what)) {
    check_levels_.back().insert(s->name.text);
    return check_expression(s->value);
  }
  if (const auto* s = std::get_if<Assignment>(&statement.what)) {
    check_expression(s->target);
    return check_expression(s->value);
  }
  if (const auto* s = std::get_if<Measurement>(&statement.what)) {
    check_expression(s->qubits);
    return optional(s->target);
  }
  if (const auto* s = std::get_if<syntax::Reset>(&statement.what)) return check_expression(s->qubits);
  if (const auto* s = std::get_if<syntax::Barrier>(&statement.what)) return all(s->operands);
  if (const auto* s = std::get_if<syntax::Delay>(&statement.what)) {
    check_expression(s->length);
    return all(s->operands);
  }
  if (const auto* s = std::get_if<ExpressionStatement>(&statement.what)) return check_expression(s->value);
  if (const auto* s = std::get_if<Return>(&statement.what)) return optional(s->value);
  if (const auto* s = std::get_if<Box>(&statement.what)) {
    optional(s->length);
    return check_list(s->body.statements);
  }
  if (const auto* s = std::get_if<Body>(&statement.what)) return check_list(s->statements);
  if (const auto* s = std::get_if<If>(&statement.what)) {
    check_expression(s->condition);
    check_list(s->then.statements);
    if (s->otherwise) check_list(s->otherwise->statements);
    return;
  }
  if (const auto* s = std::get_if<While>(&statement.what)) {
    check_expression(s->condition);
    return check_list(s->body.statements);
  }
  if (const auto* s = std::get_if<For>(&statement.what)) {
    check_expression(s->over);
    check_levels_.push_back({s->name.text});
    check_list(s->body.statements);
    check_levels_.pop_back();
    return;
  }
  if (const auto* s = std::get_if<Switch>(&statement.what)) {
    check_expression(s->selector);
    for (const Switch::Case& arm : s->cases) {
      all(arm.labels);
      check_list(arm.body.statements);
    }
  }
}

/// The body of a subroutine where it is defined: it sees its parameters, itself, global constants and
/// callables.
void Reader::check_subroutine(const syntax::Subroutine& definition) {
  const std::size_t outer_frame = std::exchange(scopes_.frame, scopes_.depth() + 1);
  check_levels_ = {{}};
  for (const syntax::Parameter& parameter : definition.parameters)
    check_levels_[0].insert(parameter.name.text);
  check_list(definition.body.statements);
  check_levels_.clear();
  scopes_.frame = outer_frame;
}

}  // namespace isinglass
