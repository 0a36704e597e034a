// For tests of the parser: a sink that collects what it is told, and syntax trees written on one line.
#pragma once

#include <string>
#include <vector>

#include "language/parser.h"

namespace isinglass::tree_text {

/// A tree with every nesting in parentheses: `a + b * c` is (+ a (* b c)).
std::string shown(const syntax::Expression& expression);
std::string shown(const syntax::Type& type);
std::string shown(const syntax::Body& body);
std::string shown(const syntax::Statement& statement);

/// Collects; plain calls are declined unless `fast` is set.
struct Collector : StatementSink {
  int version = 3;
  bool fast = false;
  std::vector<syntax::Statement> statements;
  std::vector<std::string> plain;  // the plain calls that were taken, shown like the statements
  std::vector<Message> messages;
  std::vector<std::string> names;  // of erroneous statements

  int language() const override { return version; }
  bool plain_call(const PlainCall& call, const PlainNames& numbered) override;
  void statement(syntax::Statement&& statement) override;
  void syntax_message(Message message, std::vector<std::string> skipped) override;
};

/// Reads `text` as language version 2 or 3.
Collector read(std::string text, int version = 3, bool fast = false);

/// All statements, `; ` between them; then the messages, each as `line:column text`.
std::string shown(std::string text, int version = 3);

/// Only the messages, each as `line:column text`, one a line.
std::string complaints(std::string text, int version = 3);

}  // namespace isinglass::tree_text
