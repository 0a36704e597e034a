// Building of syntax trees; see tree.h.
#include "language/tree.h"

#include <algorithm>
#include <charconv>

#include "language/parser.h"

namespace isinglass {

using antlr4::tree::TerminalNode;
using syntax::Body;
using syntax::Expression;
using syntax::Name;
using syntax::Operator;
using syntax::Span;
using syntax::Statement;
using syntax::Type;
using syntax::Unit;

namespace {

using P = OpenQasm3Parser;

constexpr std::string_view blanks = " \t\r";

std::string_view trimmed(std::string_view text) {
  const std::size_t first = text.find_first_not_of(blanks);
  if (first == std::string_view::npos) return {};
  return text.substr(first, text.find_last_not_of(blanks) - first + 1);
}

std::string_view without_quotes(std::string_view text) {
  return text.substr(1, text.size() - 2);
}

const antlr4::Token* terminal(antlr4::tree::ParseTree* node) {
  const auto* leaf = dynamic_cast<TerminalNode*>(node);
  return leaf == nullptr ? nullptr : const_cast<TerminalNode*>(leaf)->getSymbol();
}

struct BinaryOperator {
  Operator op;
  int level;  // the higher, the tighter
};

constexpr int unary_level = 11;
constexpr int power_level = 12;

BinaryOperator binary_operator(std::size_t token, int language) {
  switch (token) {
    case P::CONCATENATE:
      return {Operator::concatenate, 0};
    case P::LOGICAL_OR:
      return {Operator::logical_or, 1};
    case P::LOGICAL_AND:
      return {Operator::logical_and, 2};
    case P::BIT_OR:
      return {Operator::bit_or, 3};
    case P::BIT_XOR:
      if (language == 2) return {Operator::power, power_level};
      return {Operator::bit_xor, 4};
    case P::BIT_AND:
      return {Operator::bit_and, 5};
    case P::EQUAL:
      return {Operator::equal, 6};
    case P::NOT_EQUAL:
      return {Operator::not_equal, 6};
    case P::LESS:
      return {Operator::less, 7};
    case P::LESS_EQUAL:
      return {Operator::less_equal, 7};
    case P::GREATER:
      return {Operator::greater, 7};
    case P::GREATER_EQUAL:
      return {Operator::greater_equal, 7};
    case P::SHIFT_LEFT:
      return {Operator::shift_left, 8};
    case P::SHIFT_RIGHT:
      return {Operator::shift_right, 8};
    case P::PLUS:
      return {Operator::plus, 9};
    case P::MINUS:
      return {Operator::minus, 9};
    case P::TIMES:
      return {Operator::times, 10};
    case P::DIVIDE:
      return {Operator::divide, 10};
    case P::REMAINDER:
      return {Operator::remainder, 10};
    default:
      return {Operator::power, power_level};
  }
}

/// From the start of one place to the end of another.
Span joined(Span first, const Span& last) {
  if (first.line == last.line)
    first.length = static_cast<std::uint16_t>(last.column + last.length - first.column);
  return first;
}

Operator compound(std::string_view assignment) {
  constexpr std::pair<std::string_view, Operator> table[] = {
      {"+=", Operator::plus},        {"-=", Operator::minus},       {"*=", Operator::times},
      {"/=", Operator::divide},      {"%=", Operator::remainder},   {"**=", Operator::power},
      {"&=", Operator::bit_and},     {"|=", Operator::bit_or},      {"^=", Operator::bit_xor},
      {"<<=", Operator::shift_left}, {">>=", Operator::shift_right}};
  for (const auto& [written, op] : table) {
    if (written == assignment) return op;
  }
  return Operator::none;
}

}  // namespace

Span span_of(const Source& source, std::uint16_t index, const antlr4::Token& first,
             const antlr4::Token& last) {
  Span span;
  span.offset = static_cast<std::uint32_t>(first.getStartIndex());
  span.line = static_cast<std::uint32_t>(first.getLine());
  span.column = static_cast<std::uint32_t>(first.getCharPositionInLine() + 1);
  span.source = index;
  constexpr std::size_t longest = 1000;
  std::size_t characters = 0;
  const std::size_t end = std::min(last.getStopIndex() + 1, source.text.size());
  for (std::size_t i = span.offset; i < end && source.text[i] != '\n' && characters < longest; ++i) {
    if ((static_cast<unsigned char>(source.text[i]) & 0xC0) != 0x80) ++characters;
  }
  span.length = static_cast<std::uint16_t>(std::max<std::size_t>(characters, 1));
  return span;
}

// ---- helpers

/// One expression as the grammar reads it: operands with their signs, and the operators between them. The
/// first operand of a statement is a name, not a term.
struct TreeBuilder::Chain {
  std::vector<P::TermContext*> terms;
  std::vector<P::BinaryOperatorContext*> operators;
  P::NameTermContext* head = nullptr;
  std::size_t next_term = 0;
  std::size_t next_operator = 0;
  std::size_t next_sign = 0;  // within the next term
};

std::string TreeBuilder::text(const Token& token) const {
  return std::string(
      source_.text.substr(token.getStartIndex(), token.getStopIndex() - token.getStartIndex() + 1));
}

std::string TreeBuilder::digits(const Token& token) const {
  std::string result = text(token);
  std::erase(result, '_');
  return result;
}

Name TreeBuilder::name(TerminalNode* node) const {
  const Token& token = *node->getSymbol();
  return {text(token), at(token, token)};
}

std::vector<Name> TreeBuilder::names(P::NamesContext* context) const {
  std::vector<Name> result;
  if (context == nullptr) return result;
  for (TerminalNode* node : context->IDENTIFIER()) result.push_back(name(node));
  return result;
}

void TreeBuilder::complain(Span place, std::string what, std::vector<std::string> notes) {
  if (!complained_) complaint_(place, std::move(what), std::move(notes));
  complained_ = true;
}

Body TreeBuilder::next_block() {
  return std::move(blocks_[blocks_used_++]);
}

// ---- statements

std::optional<Statement> TreeBuilder::statement(P::StatementContext& context, const Token& last) {
  Statement result;
  antlr4::ParserRuleContext* what = nullptr;
  for (antlr4::tree::ParseTree* child : context.children) {
    auto* part = dynamic_cast<antlr4::ParserRuleContext*>(child);
    if (part->getRuleIndex() == P::RuleAnnotation) {
      result.annotations.push_back(annotation(*part->start));
    } else {
      what = part;
    }
  }
  result.at = at(*what->start, last);
  for (syntax::Annotation& annotation : result.annotations) {
    annotation.last_line = static_cast<std::uint32_t>(last.getLine());
  }
  fill(result, *what);
  if (complained_) return std::nullopt;
  return result;
}

void TreeBuilder::fill(Statement& statement, antlr4::ParserRuleContext& context) {
  switch (context.getRuleIndex()) {
    case P::RuleVersion:
      statement.what = version(static_cast<P::VersionContext&>(context));
      break;
    case P::RuleInclude:
      statement.what = include(static_cast<P::IncludeContext&>(context));
      break;
    case P::RulePragma:
      statement.what = pragma(static_cast<P::PragmaContext&>(context));
      break;
    case P::RuleQubitDeclaration:
      statement.what = qubit_declaration(static_cast<P::QubitDeclarationContext&>(context));
      break;
    case P::RuleCreg:
      statement.what = creg(static_cast<P::CregContext&>(context));
      break;
    case P::RuleDeclaration:
      statement.what = declaration(static_cast<P::DeclarationContext&>(context));
      break;
    case P::RuleConstant:
      statement.what = constant(static_cast<P::ConstantContext&>(context));
      break;
    case P::RuleInputOutput:
      statement.what = input_output(static_cast<P::InputOutputContext&>(context));
      break;
    case P::RuleAlias: {
      auto& alias = static_cast<P::AliasContext&>(context);
      statement.what = syntax::Alias{name(alias.IDENTIFIER()), expression(*alias.expression())};
      break;
    }
    case P::RuleGate:
      statement.what = gate(static_cast<P::GateContext&>(context));
      break;
    case P::RuleOpaque:
      statement.what = opaque(static_cast<P::OpaqueContext&>(context));
      break;
    case P::RuleSubroutine:
      statement.what = subroutine(static_cast<P::SubroutineContext&>(context));
      break;
    case P::RuleExternDeclaration:
      statement.what = external(static_cast<P::ExternDeclarationContext&>(context));
      break;
    case P::RuleExpressionStatement:
      expression_statement(statement, static_cast<P::ExpressionStatementContext&>(context));
      break;
    case P::RuleModifiedGate: {
      auto& modified = static_cast<P::ModifiedGateContext&>(context);
      syntax::GateCall call;
      for (P::ModifierContext* one : modified.modifier()) call.modifiers.push_back(modifier(*one));
      syntax::GateCall plain = gate_call(*modified.nameTerm(), modified.operands());
      plain.modifiers = std::move(call.modifiers);
      statement.what = std::move(plain);
      break;
    }
    case P::RuleMeasurement:
      statement.what = measurement(static_cast<P::MeasurementContext&>(context));
      break;
    case P::RuleResetStatement:
      statement.what = syntax::Reset{operand(*static_cast<P::ResetStatementContext&>(context).operand())};
      break;
    case P::RuleBarrier:
      statement.what = syntax::Barrier{operands(static_cast<P::BarrierContext&>(context).operands())};
      break;
    case P::RuleNop:
      statement.what = syntax::Nop{operands(static_cast<P::NopContext&>(context).operands())};
      break;
    case P::RuleDelay: {
      auto& delay = static_cast<P::DelayContext&>(context);
      statement.what = syntax::Delay{*designator(delay.designator()), operands(delay.operands())};
      break;
    }
    case P::RuleBox: {
      std::optional<Expression> length = designator(static_cast<P::BoxContext&>(context).designator());
      statement.what = syntax::Box{std::move(length), next_block()};
      break;
    }
    case P::RuleIfElse:
      statement.what = if_else(static_cast<P::IfElseContext&>(context));
      break;
    case P::RuleForLoop:
      statement.what = for_loop(static_cast<P::ForLoopContext&>(context));
      break;
    case P::RuleWhileLoop: {
      Expression condition = parenthesized(*static_cast<P::WhileLoopContext&>(context).parenthesized());
      statement.what = syntax::While{std::move(condition), next_block()};
      break;
    }
    case P::RuleSwitchCase:
      statement.what = switch_case(static_cast<P::SwitchCaseContext&>(context));
      break;
    case P::RuleJump: {
      const std::size_t word = context.start->getType();
      if (word == P::BREAK) statement.what = syntax::Break{};
      if (word == P::CONTINUE) statement.what = syntax::Continue{};
      if (word == P::END) statement.what = syntax::End{};
      break;
    }
    case P::RuleReturning: {
      syntax::Return result;
      if (auto* returned = static_cast<P::ReturningContext&>(context).value())
        result.value = value(*returned);
      statement.what = std::move(result);
      break;
    }
    case P::RuleBlock:
      statement.what = next_block();
      break;
    default:
      statement.what = calibration(static_cast<P::CalibrationContext&>(context));
  }
}

syntax::Annotation TreeBuilder::annotation(const Token& token) {
  const std::string line = text(token).substr(1);
  const std::size_t end = std::min(line.find_first_of(" \t\r"), line.size());
  if (end == 0) complain(at(token, token), "an annotation needs a name directly after '@'");
  return {line.substr(0, end), std::string(trimmed(std::string_view(line).substr(end))), at(token, token), 0};
}

syntax::Version TreeBuilder::version(P::VersionContext& context) {
  const Token& token = *terminal(context.children[1]);
  const std::string number = text(token);
  syntax::Version result;
  const char* end = number.data() + number.size();
  auto [point, error] = std::from_chars(number.data(), end, result.major);
  bool good = error == std::errc();
  if (good && point != end) {
    const auto minor = std::from_chars(point + 1, end, result.minor);
    good = *point == '.' && minor.ec == std::errc() && minor.ptr == end;
  }
  if (!good) {
    complain(at(token, token), "'" + number.substr(0, 40) + "' is not a version of OpenQASM",
             {"help: write 'OPENQASM 3.0;' or 'OPENQASM 2.0;'"});
  }
  return result;
}

syntax::Include TreeBuilder::include(P::IncludeContext& context) {
  const Token& token = *context.STRING()->getSymbol();
  return {std::string(without_quotes(text(token))), at(token, token)};
}

syntax::Pragma TreeBuilder::pragma(P::PragmaContext& context) {
  const std::string line = text(*context.start);
  const std::size_t word_end = line.find("pragma") + std::string_view("pragma").size();
  return {std::string(trimmed(std::string_view(line).substr(word_end)))};
}

syntax::Calibration TreeBuilder::calibration(P::CalibrationContext& context) {
  syntax::Calibration result;
  if (context.DEFCAL() != nullptr) result.kind = syntax::Calibration::Kind::definition;
  if (context.DEFCALGRAMMAR() != nullptr) result.kind = syntax::Calibration::Kind::grammar;
  const std::size_t first = context.start->getStopIndex() + 1;
  result.text = std::string(trimmed(source_.text.substr(first, context.stop->getStopIndex() + 1 - first)));
  return result;
}

syntax::QubitDeclaration TreeBuilder::qubit_declaration(P::QubitDeclarationContext& context) {
  return {name(context.IDENTIFIER()), designator(context.designator()), context.QREG() != nullptr};
}

syntax::Declaration TreeBuilder::creg(P::CregContext& context) {
  syntax::Declaration result;
  result.type = old_register(Type::Kind::bit, *context.start, context.designator());
  result.name = name(context.IDENTIFIER());
  result.old_form = true;
  return result;
}

syntax::Declaration TreeBuilder::declaration(P::DeclarationContext& context) {
  syntax::Declaration result;
  result.type = type(context.scalarType(), context.arrayType());
  result.name = name(context.IDENTIFIER());
  if (context.value() != nullptr) result.value = value(*context.value());
  return result;
}

syntax::Declaration TreeBuilder::constant(P::ConstantContext& context) {
  syntax::Declaration result;
  result.role = syntax::Declaration::Role::constant;
  result.type = type(context.scalarType(), context.arrayType());
  result.name = name(context.IDENTIFIER());
  result.value = value(*context.value());
  return result;
}

syntax::Declaration TreeBuilder::input_output(P::InputOutputContext& context) {
  using Role = syntax::Declaration::Role;
  syntax::Declaration result;
  result.role = context.INPUT() != nullptr ? Role::input : Role::output;
  result.type = type(context.scalarType(), context.arrayType());
  result.name = name(context.IDENTIFIER());
  return result;
}

syntax::GateDefinition TreeBuilder::gate(P::GateContext& context) {
  syntax::GateDefinition result;
  result.name = name(context.IDENTIFIER());
  // Both lists are optional: the one in front of the closing parenthesis is that of the parameters.
  for (P::NamesContext* list : context.names()) {
    const bool inside = context.RIGHT_PAREN() != nullptr &&
                        list->start->getStartIndex() < context.RIGHT_PAREN()->getSymbol()->getStartIndex();
    (inside ? result.parameters : result.qubits) = names(list);
  }
  if (result.qubits.empty()) {
    complain(result.name.at, "the gate '" + result.name.text + "' names no qubits to act on",
             {"help: write 'gate " + result.name.text + " a { ... }'"});
  }
  result.body = next_block();
  return result;
}

syntax::GateDefinition TreeBuilder::opaque(P::OpaqueContext& context) {
  syntax::GateDefinition result;
  result.opaque = true;
  result.name = name(context.IDENTIFIER());
  const std::vector<P::NamesContext*> lists = context.names();
  if (lists.size() > 1) result.parameters = names(lists.front());
  result.qubits = names(lists.back());
  return result;
}

syntax::Subroutine TreeBuilder::subroutine(P::SubroutineContext& context) {
  syntax::Subroutine result;
  result.name = name(context.IDENTIFIER());
  if (context.parameters() != nullptr) {
    for (P::ParameterContext* one : context.parameters()->parameter())
      result.parameters.push_back(parameter(*one));
  }
  result.result = this->result(context.result());
  result.body = next_block();
  return result;
}

syntax::Extern TreeBuilder::external(P::ExternDeclarationContext& context) {
  syntax::Extern result;
  result.name = name(context.IDENTIFIER());
  if (context.externParameters() != nullptr) {
    for (P::ExternParameterContext* one : context.externParameters()->externParameter()) {
      result.parameters.push_back(extern_parameter(*one));
    }
  }
  result.result = this->result(context.result());
  return result;
}

syntax::Parameter TreeBuilder::parameter(P::ParameterContext& context) {
  syntax::Parameter result;
  if (context.scalarType() != nullptr) {
    result.type = scalar_type(*context.scalarType());
  } else if (context.arrayReference() != nullptr) {
    result.type = array_reference(*context.arrayReference());
  } else {
    const Type::Kind kind = context.CREG() != nullptr ? Type::Kind::bit : Type::Kind::qubit;
    result.type = old_register(kind, *context.start, context.designator());
  }
  result.name = name(context.IDENTIFIER());
  return result;
}

Type TreeBuilder::extern_parameter(P::ExternParameterContext& context) {
  if (context.scalarType() != nullptr) return scalar_type(*context.scalarType());
  if (context.arrayReference() != nullptr) return array_reference(*context.arrayReference());
  return old_register(Type::Kind::bit, *context.start, context.designator());
}

Type TreeBuilder::result(P::ResultContext* context) {
  if (context == nullptr) return {};
  if (context->scalarType() != nullptr) return scalar_type(*context->scalarType());
  Type nothing;
  nothing.kind = Type::Kind::nothing;
  nothing.at = at(*context->VOID()->getSymbol(), *context->VOID()->getSymbol());
  return nothing;
}

Type TreeBuilder::scalar_type(P::ScalarTypeContext& context) {
  Type result;
  result.at = at(context);
  switch (context.start->getType()) {
    case P::BIT:
      result.kind = Type::Kind::bit;
      break;
    case P::INT:
      result.kind = Type::Kind::integer;
      break;
    case P::UINT:
      result.kind = Type::Kind::uinteger;
      break;
    case P::FLOAT:
      result.kind = Type::Kind::real;
      break;
    case P::ANGLE:
      result.kind = Type::Kind::angle;
      break;
    case P::BOOL:
      result.kind = Type::Kind::boolean;
      break;
    case P::DURATION:
      result.kind = Type::Kind::duration;
      break;
    case P::STRETCH:
      result.kind = Type::Kind::stretch;
      break;
    default:
      result.kind = Type::Kind::complex;
  }
  if (context.designator() != nullptr) result.width.push_back(*designator(context.designator()));
  if (context.scalarType() != nullptr) result.element.push_back(scalar_type(*context.scalarType()));
  return result;
}

Type TreeBuilder::array_type(P::ArrayTypeContext& context) {
  Type result;
  result.kind = Type::Kind::array;
  result.at = at(context);
  result.element.push_back(scalar_type(*context.scalarType()));
  result.dimensions = expressions(context.expressions());
  return result;
}

Type TreeBuilder::array_reference(P::ArrayReferenceContext& context) {
  Type result;
  result.kind = Type::Kind::array;
  result.access = context.READONLY() != nullptr ? Type::Access::readonly_ : Type::Access::mutable_;
  result.at = at(context);
  result.element.push_back(scalar_type(*context.scalarType()));
  if (context.DIM() != nullptr) {
    result.dimension_count.push_back(expression(*context.expression()));
  } else {
    result.dimensions = expressions(context.expressions());
  }
  return result;
}

Type TreeBuilder::type(P::ScalarTypeContext* scalar, P::ArrayTypeContext* array) {
  return scalar != nullptr ? scalar_type(*scalar) : array_type(*array);
}

Type TreeBuilder::old_register(Type::Kind kind, const Token& keyword, P::DesignatorContext* size) {
  Type result;
  result.kind = kind;
  result.at = at(keyword, keyword);
  if (size != nullptr) result.width.push_back(*designator(size));
  return result;
}

// ---- statements that begin with a name, and other quantum statements

void TreeBuilder::expression_statement(Statement& statement, P::ExpressionStatementContext& context) {
  P::NameTermContext& head = *context.nameTerm();
  const bool has_operators = !context.binaryOperator().empty();
  const bool assigns = context.value() != nullptr;
  if (has_operators && (assigns || context.operands() != nullptr)) {
    complain(at(*head.start, *context.term().back()->stop),
             assigns ? "only a variable can be assigned to" : "only a gate can be applied to operands");
    return;
  }
  if (assigns) {
    if (head.arguments() != nullptr || head.GPHASE() != nullptr) {
      complain(at(head), "only a variable can be assigned to");
      return;
    }
    Expression target = name_term(head);
    const Token& sign = context.EQUALS() != nullptr ? *context.EQUALS()->getSymbol()
                                                    : *context.COMPOUND_ASSIGNMENT()->getSymbol();
    const Operator op = compound(text(sign));
    if (P::MeasureContext* measure = context.value()->measure()) {
      if (op != Operator::none) complain(at(*measure), "a measurement is assigned with '='");
      statement.what = syntax::Measurement{operand(*measure->operand()), std::move(target)};
    } else {
      statement.what = syntax::Assignment{std::move(target), op, value(*context.value())};
    }
  } else if (context.operands() != nullptr || (head.GPHASE() != nullptr && !has_operators)) {
    statement.what = gate_call(head, context.operands());
  } else {
    Chain chain{context.term(), context.binaryOperator(), &head};
    statement.what = syntax::ExpressionStatement{whole(chain)};
  }
}

syntax::GateCall TreeBuilder::gate_call(P::NameTermContext& callee, P::OperandsContext* operands) {
  syntax::GateCall result;
  result.name = name(callee.IDENTIFIER() != nullptr ? callee.IDENTIFIER() : callee.GPHASE());
  if (callee.arguments() != nullptr) {
    result.parentheses = true;
    result.angles = expressions(callee.arguments()->expressions());
  }
  const std::vector<P::IndexContext*> indices = callee.index();
  for (P::IndexContext* index : indices) {
    const std::vector<P::IndexItemContext*> items = index->indexItem();
    const bool is_duration = indices.size() == 1 && items.size() == 1 && items[0]->expression() != nullptr &&
                             items[0]->rangeRest() == nullptr;
    if (is_duration) {
      result.duration = expression(*items[0]->expression());
    } else {
      complain(at(*index), "between a gate and its operands there is room for one duration only");
    }
  }
  result.operands = this->operands(operands);
  return result;
}

syntax::Modifier TreeBuilder::modifier(P::ModifierContext& context) {
  using Kind = syntax::Modifier::Kind;
  syntax::Modifier result;
  result.at = at(*context.start, *context.stop);
  switch (context.start->getType()) {
    case P::INV:
      result.kind = Kind::inv;
      break;
    case P::POW:
      result.kind = Kind::pow;
      break;
    case P::CTRL:
      result.kind = Kind::ctrl;
      break;
    default:
      result.kind = Kind::negctrl;
  }
  if (context.parenthesized() != nullptr) result.argument = parenthesized(*context.parenthesized());
  return result;
}

std::vector<Expression> TreeBuilder::operands(P::OperandsContext* context) {
  std::vector<Expression> result;
  if (context == nullptr) return result;
  for (P::OperandContext* one : context->operand()) result.push_back(operand(*one));
  return result;
}

Expression TreeBuilder::operand(P::OperandContext& context) {
  const Token& token = *context.start;
  const bool named = token.getType() == P::IDENTIFIER;
  return indexed(literal(named ? Expression::Kind::name : Expression::Kind::hardware, token),
                 context.index());
}

syntax::Measurement TreeBuilder::measurement(P::MeasurementContext& context) {
  syntax::Measurement result{operand(*context.measure()->operand()), std::nullopt};
  if (context.operand() != nullptr) result.target = operand(*context.operand());
  return result;
}

// ---- control

syntax::If TreeBuilder::if_else(P::IfElseContext& context) {
  syntax::If result;
  result.condition = parenthesized(*context.parenthesized());
  result.then = next_block();
  if (context.ELSE() != nullptr) result.otherwise = next_block();
  return result;
}

syntax::For TreeBuilder::for_loop(P::ForLoopContext& context) {
  syntax::For result;
  result.type = scalar_type(*context.scalarType());
  result.name = name(context.IDENTIFIER());
  if (P::RangeContext* over = context.range()) {
    result.over = range(*context.LEFT_BRACKET()->getSymbol(), *context.RIGHT_BRACKET()->getSymbol(),
                        over->expression(), *over->rangeRest());
  } else if (context.set() != nullptr) {
    result.over = set(*context.set());
  } else {
    result.over = expression(*context.expression());
  }
  result.body = next_block();
  return result;
}

syntax::Switch TreeBuilder::switch_case(P::SwitchCaseContext& context) {
  syntax::Switch result;
  result.selector = parenthesized(*context.parenthesized());
  for (P::SwitchItemContext* item : context.switchItem()) {
    syntax::Switch::Case one;
    one.at = at(*item->start, *item->start);
    one.labels = expressions(item->expressions());
    one.body = next_block();
    result.cases.push_back(std::move(one));
  }
  return result;
}

// ---- expressions

Expression TreeBuilder::expression(P::ExpressionContext& context) {
  Chain chain{context.term(), context.binaryOperator()};
  return whole(chain);
}

Expression TreeBuilder::whole(Chain& chain) {
  std::size_t nodes = 0;
  for (P::TermContext* term : chain.terms) nodes += term->children.size();
  if (depth_ + nodes > max_expression_depth) {
    const antlr4::ParserRuleContext& first = *chain.terms.front();
    complain(
        at(*first.start, *chain.terms.back()->stop), "this expression has too many operators",
        {"note: at most " + std::to_string(max_expression_depth) + " are read; compute it in several steps"});
    return {};
  }
  depth_ += nodes;
  Expression result = chained(chain, 0);
  depth_ -= nodes;
  return result;
}

Expression TreeBuilder::chained(Chain& chain, int lowest) {
  Expression left = prefixed(chain);
  while (chain.next_operator < chain.operators.size()) {
    const auto [op, level] =
        binary_operator(chain.operators[chain.next_operator]->start->getType(), language_);
    if (level < lowest) break;
    ++chain.next_operator;
    Expression right = chained(chain, op == Operator::power ? level : level + 1);
    Expression both;
    both.kind = Expression::Kind::binary;
    both.op = op;
    both.at = joined(left.at, right.at);
    both.arguments.reserve(2);
    both.arguments.push_back(std::move(left));
    both.arguments.push_back(std::move(right));
    left = std::move(both);
  }
  return left;
}

Expression TreeBuilder::prefixed(Chain& chain) {
  if (chain.head != nullptr) return name_term(*std::exchange(chain.head, nullptr));
  P::TermContext& term = *chain.terms[chain.next_term];
  if (const Token* sign = terminal(term.children[chain.next_sign])) {
    ++chain.next_sign;
    Expression result;
    result.kind = Expression::Kind::unary;
    result.op = sign->getType() == P::MINUS         ? Operator::negate
                : sign->getType() == P::LOGICAL_NOT ? Operator::logical_not
                                                    : Operator::bit_not;
    result.arguments.push_back(chained(chain, unary_level));
    result.at = joined(at(*sign, *sign), result.arguments[0].at);
    return result;
  }
  ++chain.next_term;
  chain.next_sign = 0;
  return indexed(primary(*term.primary()), term.index());
}

Expression TreeBuilder::primary(P::PrimaryContext& context) {
  using Kind = Expression::Kind;
  const Token& token = *context.start;
  if (context.parenthesized() != nullptr) {
    Expression inner = parenthesized(*context.parenthesized());
    if (context.scalarType() == nullptr) {
      inner.at = at(context);
      return inner;
    }
    Expression cast;
    cast.kind = Kind::cast;
    cast.at = at(context);
    cast.type.push_back(scalar_type(*context.scalarType()));
    cast.arguments.push_back(std::move(inner));
    return cast;
  }
  switch (token.getType()) {
    case P::IDENTIFIER: {
      if (context.arguments() == nullptr) return literal(Kind::name, token);
      Expression call = literal(Kind::call, token);
      call.at = at(context);
      call.arguments = expressions(context.arguments()->expressions());
      return call;
    }
    case P::POW: {
      Expression call = literal(Kind::call, token);
      call.at = at(context);
      call.arguments = expressions(context.arguments()->expressions());
      return call;
    }
    case P::INTEGER:
      return literal(Kind::integer, token);
    case P::REAL:
      return literal(Kind::real, token);
    case P::IMAGINARY: {
      Expression result = literal(Kind::imaginary, token);
      result.text = trimmed(std::string_view(result.text).substr(0, result.text.size() - 2));
      return result;
    }
    case P::TIMING:
      return timing(token);
    case P::TRUE:
    case P::FALSE:
      return literal(Kind::boolean, token);
    case P::STRING:
      return bit_string(token);
    case P::HARDWARE_QUBIT:
      return literal(Kind::hardware, token);
    default: {
      Expression result;
      result.kind = Kind::durationof;
      result.at = at(context);
      result.body = next_block().statements;
      return result;
    }
  }
}

Expression TreeBuilder::name_term(P::NameTermContext& context) {
  if (context.GPHASE() != nullptr) {
    const Token& word = *context.start;
    complain(at(word, word), "'gphase' is a gate: it has no value");
  }
  Expression result = literal(Expression::Kind::name, *context.start);
  if (context.arguments() != nullptr) {
    result.kind = Expression::Kind::call;
    result.at = at(*context.start, *context.arguments()->stop);
    result.arguments = expressions(context.arguments()->expressions());
  }
  return indexed(std::move(result), context.index());
}

Expression TreeBuilder::literal(Expression::Kind kind, const Token& token) {
  using Kind = Expression::Kind;
  const bool is_number = kind == Kind::integer || kind == Kind::real || kind == Kind::imaginary;
  Expression result;
  result.kind = kind;
  result.at = at(token, token);
  result.text = is_number ? digits(token) : text(token);
  return result;
}

Expression TreeBuilder::bit_string(const Token& token) {
  Expression result = literal(Expression::Kind::bit_string, token);
  std::string written = std::move(result.text);
  const std::string_view bits = without_quotes(written);
  bool good = written[0] == '"' && !bits.empty() && bits.front() != '_' && bits.back() != '_' &&
              bits.find("__") == std::string_view::npos &&
              bits.find_first_not_of("01_") == std::string_view::npos;
  if (!good) {
    complain(result.at, "a text is no value here",
             {"note: a bit string consists of 0 and 1, with single '_' between them: \"0101\""});
  }
  result.text = bits;
  std::erase(result.text, '_');
  return result;
}

Expression TreeBuilder::timing(const Token& token) {
  constexpr std::pair<std::string_view, Unit> units[] = {
      {"ns", Unit::ns}, {"us", Unit::us}, {"\u00B5s", Unit::us}, {"\u03BCs", Unit::us},
      {"ms", Unit::ms}, {"dt", Unit::dt}, {"s", Unit::s}};  // "s" last: it ends the others
  Expression result = literal(Expression::Kind::timing, token);
  const std::string written = digits(token);
  for (const auto& [name, unit] : units) {
    if (written.ends_with(name)) {
      result.unit = unit;
      result.text = trimmed(std::string_view(written).substr(0, written.size() - name.size()));
      break;
    }
  }
  return result;
}

Expression TreeBuilder::indexed(Expression value, const std::vector<P::IndexContext*>& indices) {
  if (indices.size() > max_nesting) complain(value.at, "too many indices follow one another");
  for (P::IndexContext* index : indices) {
    Expression result;
    result.kind = Expression::Kind::index;
    result.at = joined(value.at, at(*index));
    result.arguments.push_back(std::move(value));
    if (index->set() != nullptr) result.arguments.push_back(set(*index->set()));
    for (P::IndexItemContext* item : index->indexItem()) result.arguments.push_back(index_item(*item));
    value = std::move(result);
  }
  return value;
}

Expression TreeBuilder::index_item(P::IndexItemContext& context) {
  if (context.rangeRest() == nullptr) return expression(*context.expression());
  return range(*context.start, *context.stop, context.expression(), *context.rangeRest());
}

Expression TreeBuilder::range(const Token& first, const Token& last, P::ExpressionContext* start,
                              P::RangeRestContext& rest) {
  Expression result;
  result.kind = Expression::Kind::range;
  result.at = at(first, last);
  result.arguments.resize(3);  // absent
  if (start != nullptr) result.arguments[0] = expression(*start);
  // `first:last` or `first:step:last`: what stands before a second colon is the step.
  TerminalNode* colon = rest.COLON();
  for (P::ExpressionContext* part : rest.expression()) {
    const bool is_step =
        colon != nullptr && part->start->getStartIndex() < colon->getSymbol()->getStartIndex();
    result.arguments[is_step ? 1 : 2] = expression(*part);
  }
  return result;
}

Expression TreeBuilder::set(P::SetContext& context) {
  Expression result;
  result.kind = Expression::Kind::set;
  result.at = at(context);
  for (P::ElementContext* element : context.element()) {
    result.arguments.push_back(element->set() != nullptr ? set(*element->set())
                                                         : expression(*element->expression()));
  }
  return result;
}

Expression TreeBuilder::measured(P::MeasureContext& context) {
  Expression result;
  result.kind = Expression::Kind::measure;
  result.at = at(context);
  result.arguments.push_back(operand(*context.operand()));
  return result;
}

Expression TreeBuilder::value(P::ValueContext& context) {
  if (context.set() != nullptr) return set(*context.set());
  if (context.measure() != nullptr) return measured(*context.measure());
  Expression result = expression(*context.expression());
  if (context.operands() == nullptr) return result;
  const bool is_call = result.kind == Expression::Kind::call || result.kind == Expression::Kind::name;
  if (!is_call) complain(at(*context.operands()), "only a gate or a calibration can be applied to operands");
  Expression call;
  call.kind = Expression::Kind::defcal_call;
  call.at = at(context);
  call.text = std::move(result.text);
  result.kind = Expression::Kind::set;
  call.arguments.push_back(std::move(result));
  for (Expression& one : operands(context.operands())) call.arguments.push_back(std::move(one));
  return call;
}

std::vector<Expression> TreeBuilder::expressions(P::ExpressionsContext* context) {
  std::vector<Expression> result;
  if (context == nullptr) return result;
  for (P::ExpressionContext* one : context->expression()) result.push_back(expression(*one));
  return result;
}

std::optional<Expression> TreeBuilder::designator(P::DesignatorContext* context) {
  if (context == nullptr) return std::nullopt;
  return expression(*context->expression());
}

}  // namespace isinglass
