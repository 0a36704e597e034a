// Texts and messages about them; see source.h.
#include "language/source.h"

#include <fmt/format.h>

#include <algorithm>
#include <array>

namespace isinglass {

namespace {

/// Messages show a line only up to here behind the place, and not at all when the place is farther along: the
/// line of a file without line ends may be as long as the file.
constexpr std::size_t shown_behind = 400;
constexpr std::size_t shown_before = 20000;

/// Length of the valid UTF-8 character that starts at `i`, or 0.
std::size_t character_length(std::string_view text, std::size_t i) {
  const auto byte = [&](std::size_t at) {
    return at < text.size() ? static_cast<unsigned char>(text[at]) : 0U;
  };
  const auto continues = [&](std::size_t at) { return (byte(at) & 0xC0) == 0x80; };
  const unsigned first = byte(i);
  if (first < 0x80) return 1;
  if (first >= 0xC2 && first < 0xE0) return continues(i + 1) ? 2 : 0;
  if (first >= 0xE0 && first < 0xF0) {
    const bool overlong = first == 0xE0 && byte(i + 1) < 0xA0;
    const bool surrogate = first == 0xED && byte(i + 1) >= 0xA0;
    return continues(i + 1) && continues(i + 2) && !overlong && !surrogate ? 3 : 0;
  }
  if (first >= 0xF0 && first < 0xF5) {
    const bool overlong = first == 0xF0 && byte(i + 1) < 0x90;
    const bool beyond = first == 0xF4 && byte(i + 1) >= 0x90;
    return continues(i + 1) && continues(i + 2) && continues(i + 3) && !overlong && !beyond ? 4 : 0;
  }
  return 0;
}

}  // namespace

std::uint16_t Sources::keep(std::string file, std::string text) {
  kept_.push_back(std::move(text));
  return add(std::move(file), kept_.back());
}

std::uint16_t Sources::add(std::string file, std::string_view text) {
  if (list_.size() > 0xFFFF) throw Failure(Exit::source_at_fault, "more than 65,536 files are included");
  if (text.size() > 0xFFFFFFF0) throw Failure(Exit::file_trouble, file + ": the file is larger than 4 GiB");
  list_.push_back({std::move(file), text});
  return static_cast<std::uint16_t>(list_.size() - 1);
}

Message Sources::message(Message::Severity severity, syntax::Span at, std::string text,
                         std::vector<std::string> notes) const {
  Message message;
  message.severity = severity;
  message.text = std::move(text);
  message.notes = std::move(notes);
  if (at.source >= list_.size()) return message;
  const Source& source = list_[at.source];
  message.place = {source.file, at.line, at.column};
  message.length = at.length;
  if (at.line == 0) return message;
  const std::size_t here = std::min<std::size_t>(at.offset, source.text.size());
  const std::size_t before = here == 0 ? std::string::npos : source.text.rfind('\n', here - 1);
  const std::size_t first = before == std::string::npos ? 0 : before + 1;
  if (here - first > shown_before) return message;
  std::size_t end = std::min(source.text.find('\n', here), source.text.size());
  if (end - here > shown_behind) {
    end = here + shown_behind;
    while (end > here && (static_cast<unsigned char>(source.text[end]) & 0xC0) == 0x80) --end;
  }
  message.source_line = source.text.substr(first, end - first);
  if (message.source_line.ends_with('\r')) message.source_line.pop_back();
  return message;
}

std::optional<Message> unreadable(const Source& source) {
  static const std::array<bool, 256> plain = [] {
    std::array<bool, 256> table{};
    for (int c = 0x20; c < 0x7F; ++c) table[static_cast<std::size_t>(c)] = true;
    for (const char c : {'\n', '\r', '\t', '\f', '\v'}) table[static_cast<unsigned char>(c)] = true;
    return table;
  }();
  const std::string_view text = source.text;
  for (std::size_t i = 0;;) {
    while (i < text.size() && plain[static_cast<unsigned char>(text[i])]) ++i;
    if (i == text.size()) return std::nullopt;
    const auto byte = static_cast<unsigned char>(text[i]);
    const std::size_t length = byte < 0x80 ? 0 : character_length(text, i);
    if (length == 0) {
      Message message;
      message.place = {source.file, 0, 0};
      const auto line = 1 + std::count(text.begin(), text.begin() + static_cast<std::ptrdiff_t>(i), '\n');
      message.text =
          byte < 0x80
              ? fmt::format("this is no text file: byte {} is the control character {:#04x} (line {})", i,
                            byte, line)
              : fmt::format("this is no UTF-8 text: byte {} is {:#04x} (line {})", i, byte, line);
      return message;
    }
    i += length;
  }
}

}  // namespace isinglass
