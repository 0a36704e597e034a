// Printing of messages; see message.h.
#include "circuit/message.h"

#include <fmt/format.h>

#include <algorithm>

namespace isinglass {

namespace {

constexpr std::size_t widest = 100;

/// The line as one string a character, so that columns count characters and not bytes.
std::vector<std::string> characters(std::string_view line) {
  std::vector<std::string> result;
  for (const char byte : line) {
    const auto code = static_cast<unsigned char>(byte);
    const bool continues = (code & 0xC0) == 0x80 && !result.empty();
    if (continues) {
      result.back() += byte;
    } else {
      result.emplace_back(1, code < 0x20 || code == 0x7F ? ' ' : byte);
    }
  }
  return result;
}

std::string with_caret(const Message& message) {
  const auto line = characters(message.source_line);
  const std::size_t at = std::min(message.place.column > 0 ? message.place.column - 1 : 0, line.size());
  std::size_t first = 0;
  std::size_t last = line.size();
  if (line.size() > widest) {
    first = at > widest / 2 ? at - widest / 2 : 0;
    last = std::min(line.size(), first + widest);
  }
  std::string text = first > 0 ? "    ..." : "    ";
  const std::size_t indent = text.size() + (at - first);
  for (std::size_t i = first; i < last; ++i) text += line[i];
  if (last < line.size()) text += "...";
  text += "\n" + std::string(indent, ' ') + "^";
  const std::size_t room = last > at ? last - at : 1;
  text += std::string(std::min(std::max<std::size_t>(message.length, 1), room) - 1, '~') + "\n";
  return text;
}

}  // namespace

std::string printed(const Message& message) {
  std::string text;
  if (!message.place.file.empty()) text += message.place.file + ":";
  if (message.place.line > 0) text += fmt::format("{}:{}:", message.place.line, message.place.column);
  if (!text.empty()) text += " ";
  text += message.severity == Message::Severity::error ? "error: " : "warning: ";
  text += message.text + "\n";
  if (message.place.line > 0 && !message.source_line.empty()) text += with_caret(message);
  for (const std::string& note : message.notes) text += "    " + note + "\n";
  return text;
}

Failure::Failure(Exit status, std::vector<Message> said)
    : std::runtime_error(said.empty() ? "failure" : said.front().text),
      exit(status),
      messages(std::move(said)) {}

Failure::Failure(Exit status, std::string text) : std::runtime_error(text), exit(status) {
  Message message;
  message.text = std::move(text);
  messages.push_back(std::move(message));
}

}  // namespace isinglass
