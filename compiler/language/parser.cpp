// Reading of a text statement by statement; see parser.h.
#include "language/parser.h"

#include <exception>
#include <optional>
#include <utility>

#include "OpenQasm3Parser.h"
#include "language/recovery.h"
#include "language/tokens.h"
#include "language/tree.h"

namespace isinglass {

namespace {

using antlr4::ParserRuleContext;
using antlr4::tree::ParseTreeTracker;
using syntax::Body;
using syntax::Statement;

/// The generated parser with a hold on its memory: when a statement ends, nested or not, its contexts become
/// a syntax tree and are freed together with its tokens. What is alive at any time is one path from the
/// outermost statement to the innermost, and the syntax tree of the outermost.
class StatementParser final : public OpenQasm3Parser, private antlr4::tree::ParseTreeListener {
 public:
  using Report = std::function<void(Recovery::Error)>;

  StatementParser(const Source& source, std::uint16_t index, TokenWindow& window, const Report& report)
      : OpenQasm3Parser(&window), source_(source), index_(index), window_(window) {
    recovery_ = std::make_shared<Recovery>(source, index, window, report);
    complaint_ = [report](syntax::Span at, std::string text, std::vector<std::string> notes) {
      report({at, std::move(text), std::move(notes), {}});
    };
    removeErrorListeners();
    setErrorHandler(recovery_);
    getInterpreter<antlr4::atn::ParserATNSimulator>()->setPredictionMode(antlr4::atn::PredictionMode::SLL);
    addParseListener(this);
  }

  /// The statement at the window's place; nothing after an error, which has been reported then. Throws
  /// ReadingEnds.
  std::optional<Statement> read(int language) {
    language_ = language;
    open_.clear();
    lists_.clear();
    lists_.emplace_back();
    depth_ = 0;
    statement();
    if (!window_.has_moved()) window_.consume();  // a stray `}`
    setContext(nullptr);
    getTreeTracker().reset();
    if (lists_.front().empty()) return std::nullopt;
    return std::move(lists_.front().front());
  }

  /// After ReadingEnds: frees what was left behind.
  void abandon() {
    setContext(nullptr);
    getTreeTracker().reset();
  }

 private:
  /// A statement that has begun and not ended.
  struct Open {
    ParseTreeTracker outer;  // of the contexts around it
    std::size_t first_token;
    std::vector<Body> blocks;  // of its blocks that have ended
  };

  static bool nests(std::size_t rule) {
    return rule == RuleStatement || rule == RuleExpression || rule == RuleSet || rule == RuleScalarType;
  }

  void enterRule(ParserRuleContext* context, std::size_t state, std::size_t rule) override {
    // Whatever may throw comes before the generated parser has entered the rule, so that every rule entered
    // is left.
    const antlr4::Token& token = *window_.LT(1);
    if (nests(rule) && ++depth_ > max_nesting) {
      throw ReadingEnds(token, "this is nested too deeply to be read",
                        "note: at most " + std::to_string(max_nesting) + " levels");
    }
    OpenQasm3Parser::enterRule(context, state, rule);
  }

  void enterEveryRule(ParserRuleContext* context) override {
    switch (context->getRuleIndex()) {
      case RuleStatement:
        open_.push_back({std::exchange(getTreeTracker(), {}), window_.index(), {}});
        recovery_->statement_begins_at(window_.index());
        break;
      case RuleBlock:
      case RuleBody:
        lists_.emplace_back();
        break;
      default:
        break;
    }
  }

  void exitEveryRule(ParserRuleContext* context) override {
    const std::size_t rule = context->getRuleIndex();
    if (nests(rule)) --depth_;
    if (rule == RuleStatement) end_statement(static_cast<StatementContext&>(*context));
    if (rule == RuleBlock || rule == RuleBody) end_block(*context, rule == RuleBlock);
  }

  void visitTerminal(antlr4::tree::TerminalNode*) override {}
  void visitErrorNode(antlr4::tree::ErrorNode*) override {}

  void end_statement(StatementContext& context) {
    Open ended = std::move(open_.back());
    open_.pop_back();
    const bool is_whole = context.exception == nullptr && std::uncaught_exceptions() == 0;
    if (is_whole) {
      TreeBuilder builder(source_, index_, language_, std::move(ended.blocks), complaint_);
      std::optional<Statement> tree = builder.statement(context, *window_.LT(-1));
      if (tree) lists_.back().push_back(std::move(*tree));
    }
    context.children.clear();
    getTreeTracker().reset();
    getTreeTracker() = std::move(ended.outer);
    window_.forget_from(ended.first_token);
    if (!open_.empty()) recovery_->statement_begins_at(open_.back().first_token);
  }

  /// Of a `{ ... }`, or of the statement that stands in its place (which may be a `{ ... }`).
  void end_block(ParserRuleContext& context, bool braces) {
    Body body;
    body.statements = std::move(lists_.back());
    lists_.pop_back();
    body.braces = braces;
    if (!braces && body.statements.size() == 1 && std::holds_alternative<Body>(body.statements[0].what) &&
        body.statements[0].annotations.empty()) {
      body = std::get<Body>(std::exchange(body.statements[0].what, syntax::End{}));
    } else if (!braces && !body.statements.empty()) {
      body.at = body.statements[0].at;
    } else if (braces) {
      body.at = span_of(source_, index_, *context.start, *context.start);
    }
    open_.back().blocks.push_back(std::move(body));
  }

  const Source& source_;
  std::uint16_t index_;
  TokenWindow& window_;
  std::shared_ptr<Recovery> recovery_;
  TreeBuilder::Complaint complaint_;
  int language_ = 0;
  std::size_t depth_ = 0;
  std::vector<Open> open_;
  std::vector<std::vector<Statement>> lists_;  // statements of each open block; first, those of the text
};

/// Reads one text to its end.
class TextReader {
 public:
  TextReader(const Sources& sources, std::uint16_t index, StatementSink& sink)
      : sources_(sources),
        source_(sources[index]),
        index_(index),
        sink_(sink),
        plain_(source_.text, index),
        tokens_(source_.text),
        window_(tokens_),
        parser_(source_, index, window_, [this](Recovery::Error error) { keep(std::move(error)); }) {}

  void run() {
    constexpr std::string_view byte_order_mark = "\xEF\xBB\xBF";
    if (source_.text.starts_with(byte_order_mark)) position_.offset = byte_order_mark.size();
    while (reported_ < max_syntax_errors) {
      plain_calls();
      if (!statement()) return;
    }
  }

 private:
  void plain_calls() {
    const int language = sink_.language();
    for (;;) {
      plain_.skip_blanks(position_);
      if (language == 0) return;
      Position end;
      const PlainCall* call = plain_.read(position_, language, end);
      if (call == nullptr || !sink_.plain_call(*call, plain_.names())) return;
      position_ = end;
    }
  }

  /// Reads one statement by the grammar. False at the end of the text, or when reading cannot go on.
  bool statement() {
    const int language = sink_.language();
    tokens_.restart(position_, language);
    window_.restart();
    try {
      if (window_.LA(1) == antlr4::Token::EOF) return false;
      std::optional<Statement> statement = parser_.read(language);
      position_ = window_.position();
      report();
      if (statement) sink_.statement(std::move(*statement));
      return true;
    } catch (const ReadingEnds& end) {
      parser_.abandon();
      syntax::Span at{static_cast<std::uint32_t>(end.at.offset), static_cast<std::uint32_t>(end.at.line),
                      static_cast<std::uint32_t>(end.at.column), 1, index_};
      errors_.push_back({at, end.text, {end.note}, {}});
      report();
      return false;
    }
  }

  /// Hands on what went wrong in the statement just read. Not earlier: the sink may throw, the parser must
  /// not.
  void report() {
    for (Recovery::Error& error : errors_) {
      if (++reported_ == max_syntax_errors)
        error.notes.emplace_back("note: too many errors; the rest is not read");
      sink_.syntax_message(sources_.error(error.at, std::move(error.text), std::move(error.notes)),
                           std::move(error.names));
    }
    errors_.clear();
  }

  void keep(Recovery::Error error) {
    if (reported_ + errors_.size() < max_syntax_errors) errors_.push_back(std::move(error));
  }

  const Sources& sources_;
  const Source& source_;
  std::uint16_t index_;
  StatementSink& sink_;
  PlainReader plain_;
  Tokens tokens_;
  TokenWindow window_;
  StatementParser parser_;
  Position position_;
  std::vector<Recovery::Error> errors_;  // of the statement being read
  std::size_t reported_ = 0;
};

}  // namespace

void read_statements(const Sources& sources, std::uint16_t source, StatementSink& sink) {
  if (std::optional<Message> message = unreadable(sources[source])) {
    sink.syntax_message(std::move(*message), {});
    return;
  }
  TextReader(sources, source, sink).run();
}

}  // namespace isinglass
