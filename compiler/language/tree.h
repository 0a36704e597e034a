// From the generated parser's contexts of one statement to its syntax tree.
#pragma once

#include <functional>
#include <optional>
#include <string>
#include <vector>

#include "OpenQasm3Parser.h"
#include "language/source.h"
#include "language/syntax.h"

namespace isinglass {

/// The place of the text from the first to the last token, both included.
syntax::Span span_of(const Source& source, std::uint16_t index, const antlr4::Token& first,
                     const antlr4::Token& last);

/// Builds the tree of one statement. The blocks in it were built before, each as its end was read, and are
/// handed over in the order of the text.
class TreeBuilder {
 public:
  /// Told what is wrong with a statement that the grammar accepts.
  using Complaint = std::function<void(syntax::Span, std::string, std::vector<std::string>)>;

  TreeBuilder(const Source& source, std::uint16_t index, int language, std::vector<syntax::Body> blocks,
              const Complaint& complaint)
      : source_(source),
        index_(index),
        language_(language),
        blocks_(std::move(blocks)),
        complaint_(complaint) {}

  /// Nothing after a complaint. `last` is the statement's last token.
  std::optional<syntax::Statement> statement(OpenQasm3Parser::StatementContext& context,
                                             const antlr4::Token& last);

 private:
  using P = OpenQasm3Parser;
  using Token = antlr4::Token;
  struct Chain;  // the flat list of operands and operators of one expression, being read

  syntax::Span at(const Token& first, const Token& last) const {
    return span_of(source_, index_, first, last);
  }
  syntax::Span at(const antlr4::ParserRuleContext& context) const {
    return at(*context.start, *context.stop);
  }
  std::string text(const Token& token) const;
  std::string digits(const Token& token) const;
  syntax::Name name(antlr4::tree::TerminalNode* node) const;
  std::vector<syntax::Name> names(P::NamesContext* context) const;
  void complain(syntax::Span place, std::string what, std::vector<std::string> notes = {});
  syntax::Body next_block();

  syntax::Annotation annotation(const Token& token);
  void fill(syntax::Statement& statement, antlr4::ParserRuleContext& context);
  syntax::Version version(P::VersionContext& context);
  syntax::Include include(P::IncludeContext& context);
  syntax::Pragma pragma(P::PragmaContext& context);
  syntax::Calibration calibration(P::CalibrationContext& context);
  syntax::QubitDeclaration qubit_declaration(P::QubitDeclarationContext& context);
  syntax::Declaration creg(P::CregContext& context);
  syntax::Declaration declaration(P::DeclarationContext& context);
  syntax::Declaration constant(P::ConstantContext& context);
  syntax::Declaration input_output(P::InputOutputContext& context);
  syntax::GateDefinition gate(P::GateContext& context);
  syntax::GateDefinition opaque(P::OpaqueContext& context);
  syntax::Subroutine subroutine(P::SubroutineContext& context);
  syntax::Extern external(P::ExternDeclarationContext& context);
  syntax::Parameter parameter(P::ParameterContext& context);
  syntax::Type extern_parameter(P::ExternParameterContext& context);
  syntax::Type result(P::ResultContext* context);
  syntax::Type scalar_type(P::ScalarTypeContext& context);
  syntax::Type array_type(P::ArrayTypeContext& context);
  syntax::Type array_reference(P::ArrayReferenceContext& context);
  /// The first is null or the second is.
  syntax::Type type(P::ScalarTypeContext* scalar, P::ArrayTypeContext* array);
  syntax::Type old_register(syntax::Type::Kind kind, const Token& keyword, P::DesignatorContext* size);

  void expression_statement(syntax::Statement& statement, P::ExpressionStatementContext& context);
  syntax::GateCall gate_call(P::NameTermContext& callee, P::OperandsContext* operands);
  syntax::Modifier modifier(P::ModifierContext& context);
  std::vector<syntax::Expression> operands(P::OperandsContext* context);
  syntax::Expression operand(P::OperandContext& context);
  syntax::Measurement measurement(P::MeasurementContext& context);
  syntax::If if_else(P::IfElseContext& context);
  syntax::For for_loop(P::ForLoopContext& context);
  syntax::Switch switch_case(P::SwitchCaseContext& context);

  syntax::Expression value(P::ValueContext& context);
  syntax::Expression expression(P::ExpressionContext& context);
  syntax::Expression whole(Chain& chain);
  syntax::Expression chained(Chain& chain, int lowest);
  syntax::Expression prefixed(Chain& chain);
  syntax::Expression primary(P::PrimaryContext& context);
  syntax::Expression name_term(P::NameTermContext& context);
  syntax::Expression literal(syntax::Expression::Kind kind, const Token& token);
  syntax::Expression bit_string(const Token& token);
  syntax::Expression timing(const Token& token);
  syntax::Expression indexed(syntax::Expression value, const std::vector<P::IndexContext*>& indices);
  syntax::Expression index_item(P::IndexItemContext& context);
  syntax::Expression range(const Token& first, const Token& last, P::ExpressionContext* start,
                           P::RangeRestContext& rest);
  syntax::Expression set(P::SetContext& context);
  syntax::Expression measured(P::MeasureContext& context);
  syntax::Expression parenthesized(P::ParenthesizedContext& context) {
    return expression(*context.expression());
  }
  std::vector<syntax::Expression> expressions(P::ExpressionsContext* context);
  std::optional<syntax::Expression> designator(P::DesignatorContext* context);

  const Source& source_;
  std::uint16_t index_;
  int language_;
  std::vector<syntax::Body> blocks_;
  std::size_t blocks_used_ = 0;
  std::size_t depth_ = 0;  // of operators around the expression being built
  bool complained_ = false;
  const Complaint& complaint_;
};

}  // namespace isinglass
