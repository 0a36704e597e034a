// What the program says about a file: an error, warning or note at a place, printed with the line and a
// caret.
#pragma once

#include <cstddef>
#include <stdexcept>
#include <string>
#include <string_view>
#include <vector>

namespace isinglass {

/// The exit statuses of the program.
enum class Exit : int {
  done = 0,
  answer_is_no = 1,
  usage = 2,
  source_at_fault = 3,
  target_cannot = 4,
  file_trouble = 5,
  internal = 70,
};

/// A place in a file; line and column count from 1, column in Unicode characters. line 0 = no place.
struct Place {
  std::string file;
  std::size_t line = 0;
  std::size_t column = 0;
};

struct Message {
  enum class Severity { error, warning };
  Severity severity = Severity::error;
  Place place;
  std::string text;
  std::string source_line;         // the whole line, without its end; empty when there is no place
  std::size_t length = 1;          // characters to underline, starting at the caret
  std::vector<std::string> notes;  // "note: ..." and "help: ..." lines that follow
};

/// FILE:LINE:COLUMN: error: text, then the source line with a caret, then the notes. Ends with a newline.
/// Long lines are cut around the caret, tabs and control characters become blanks.
std::string printed(const Message& message);

/// Ends the program with an exit status and one or more messages.
class Failure : public std::runtime_error {
 public:
  Failure(Exit exit, std::vector<Message> said);
  Failure(Exit exit, std::string text);

  Exit exit;
  std::vector<Message> messages;
};

}  // namespace isinglass
