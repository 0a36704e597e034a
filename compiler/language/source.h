// The texts that a program is made of, the file itself and what it includes, and messages about places in
// them.
#pragma once

#include <deque>
#include <optional>
#include <string>
#include <string_view>

#include "circuit/message.h"
#include "language/syntax.h"

namespace isinglass {

struct Source {
  std::string file;       // as messages name it
  std::string_view text;  // UTF-8
};

class Sources {
 public:
  /// The text must live as long as this object; at most 65,536 texts of below 4 GiB, else Failure.
  std::uint16_t add(std::string file, std::string_view text);
  /// Keeps the text itself.
  std::uint16_t keep(std::string file, std::string text);
  const Source& operator[](std::uint16_t index) const { return list_[index]; }
  std::size_t size() const { return list_.size(); }

  /// A message about a place: file, line, column, the line of text (a long one is cut to what surrounds the
  /// place) and the underlining.
  Message message(Message::Severity severity, syntax::Span at, std::string text,
                  std::vector<std::string> notes = {}) const;
  Message error(syntax::Span at, std::string text, std::vector<std::string> notes = {}) const {
    return message(Message::Severity::error, at, std::move(text), std::move(notes));
  }
  Message warning(syntax::Span at, std::string text, std::vector<std::string> notes = {}) const {
    return message(Message::Severity::warning, at, std::move(text), std::move(notes));
  }

 private:
  std::deque<Source> list_;
  std::deque<std::string> kept_;  // texts do not move
};

/// Nothing when the text is UTF-8 without control characters other than blanks and line ends; else what is
/// wrong with it, for a message on the whole file (a binary file, a wrong encoding).
std::optional<Message> unreadable(const Source& source);

}  // namespace isinglass
