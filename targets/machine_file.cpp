// Typed access to a machine description with messages at the exact place; see machine_file.h.
#include "targets/machine_file.h"

#include <fmt/format.h>

#include <algorithm>
#include <cmath>

#include "circuit/files.h"

namespace isinglass {

namespace {

std::string line_of(const std::string& text, std::size_t line) {
  std::size_t begin = 0;
  for (std::size_t i = 1; i < line; ++i) {
    begin = text.find('\n', begin);
    if (begin == std::string::npos) return {};
    ++begin;
  }
  std::string found = text.substr(begin, text.find('\n', begin) - begin);
  if (!found.empty() && found.back() == '\r') found.pop_back();
  return found;
}

Message fault_at(const std::string& path, const std::string& text, std::size_t line, std::size_t column,
                 std::string what, std::string help) {
  Message message;
  message.place = {path, line, column};
  message.text = std::move(what);
  message.source_line = line > 0 ? line_of(text, line) : "";
  if (!help.empty()) message.notes.push_back("help: " + help);
  return message;
}

std::string described(const Range& range) {
  if (range.least == 0 && range.most == 1) return "a probability, 0 to 1";
  if (range.least == 0 && std::isinf(range.most)) return range.above ? "above 0" : "0 or more";
  if (std::isinf(range.least) && std::isinf(range.most)) return "finite";
  return fmt::format("{} {} and at most {}", range.above ? "above" : "at least", range.least, range.most);
}

bool holds(const Range& range, double value) {
  return std::isfinite(value) && value >= range.least && value <= range.most &&
         !(range.above && value == range.least);
}

/// Number of single-character edits between two words; to guess which key was meant.
std::size_t distance(std::string_view a, std::string_view b) {
  std::vector<std::size_t> row(b.size() + 1);
  for (std::size_t j = 0; j <= b.size(); ++j) row[j] = j;
  for (std::size_t i = 1; i <= a.size(); ++i) {
    std::size_t diagonal = row[0];
    row[0] = i;
    for (std::size_t j = 1; j <= b.size(); ++j) {
      const std::size_t above = row[j];
      row[j] = std::min({above + 1, row[j - 1] + 1, diagonal + (a[i - 1] == b[j - 1] ? 0 : 1)});
      diagonal = above;
    }
  }
  return row.back();
}

}  // namespace

MachineFile::MachineFile(const std::string& path) : path_(path), text_(read_text(path)) {
  try {
    root_ = toml::parse(text_, path);
  } catch (const toml::parse_error& error) {
    const auto& begin = error.source().begin;
    throw Failure(Exit::target_cannot, {fault_at(path_, text_, begin.line, begin.column,
                                                 fmt::format("not TOML: {}", error.description()), {})});
  }
}

void MachineFile::complain(const toml::source_region& where, std::string what, std::string help) {
  const bool is_known = std::any_of(faults_.begin(), faults_.end(), [&](const Message& fault) {
    return fault.place.line == where.begin.line && fault.place.column == where.begin.column &&
           fault.text == what;
  });
  if (is_known) return;
  faults_.push_back(
      fault_at(path_, text_, where.begin.line, where.begin.column, std::move(what), std::move(help)));
}

std::uint32_t MachineFile::origin_of(const toml::node& node) {
  return origins_.try_emplace(&node, static_cast<std::uint32_t>(origins_.size() + 1)).first->second;
}

void MachineFile::refuse_if_faulty() const {
  if (!faults_.empty()) refuse();
}

void MachineFile::refuse() const {
  auto in_order = faults_;
  std::stable_sort(in_order.begin(), in_order.end(), [](const Message& a, const Message& b) {
    return std::pair(a.place.line, a.place.column) < std::pair(b.place.line, b.place.column);
  });
  throw Failure(Exit::target_cannot, std::move(in_order));
}

Section::Section(MachineFile& file, std::string_view name) : file_(file), title_(name) {
  if (name.empty()) {
    table_ = &file.root();
    return;
  }
  const toml::node* found = file.root().get(name);
  if (found == nullptr) return;
  table_ = found->as_table();
  if (table_ == nullptr)
    file.complain(found->source(), fmt::format("'{}' must be a table: [{}]", name, name));
}

Section::Section(MachineFile& file, std::string title, const toml::table& table)
    : file_(file), title_(std::move(title)), table_(&table) {}

const toml::source_region& Section::where() const {
  return table_ != nullptr ? table_->source() : file_.root().source();
}

const toml::node* Section::node(std::string_view key, Need need) {
  known_.emplace_back(key);
  const toml::node* found = table_ != nullptr ? table_->get(key) : nullptr;
  if (found == nullptr && need == Need::required) {
    toml::source_region place = where();
    if (place.begin.line == 0) place.begin = {1, 1};
    file_.complain(place, title_.empty() ? fmt::format("the key '{}' is missing", key)
                                         : fmt::format("the key '{}' is missing in [{}]", key, title_));
  }
  return found;
}

void Section::number(std::string_view key, double& value, Range range, Need need) {
  const toml::node* found = node(key, need);
  if (found == nullptr) return;
  const auto read = found->value<double>();
  if (!found->is_number() || !read) {
    file_.complain(found->source(), fmt::format("'{}' must be a number", key));
  } else if (!holds(range, *read)) {
    file_.complain(found->source(), fmt::format("'{}' must be {}", key, described(range)));
  } else {
    value = *read;
  }
}

void Section::whole(std::string_view key, std::uint32_t& value, std::uint32_t least, std::uint32_t most,
                    Need need) {
  const toml::node* found = node(key, need);
  if (found == nullptr) return;
  const auto read = found->is_integer() ? found->value<std::int64_t>() : std::nullopt;
  if (!read || *read < std::int64_t{least} || *read > std::int64_t{most}) {
    file_.complain(found->source(),
                   fmt::format("'{}' must be a whole number from {} to {}", key, least, most));
  } else {
    value = static_cast<std::uint32_t>(*read);
  }
}

void Section::flag(std::string_view key, bool& value) {
  const toml::node* found = node(key);
  if (found == nullptr) return;
  if (!found->is_boolean()) {
    file_.complain(found->source(), fmt::format("'{}' must be true or false", key));
  } else {
    value = *found->value<bool>();
  }
}

void Section::words(std::string_view key, std::string& value, Need need) {
  const toml::node* found = node(key, need);
  if (found == nullptr) return;
  if (!found->is_string()) {
    file_.complain(found->source(), fmt::format("'{}' must be a text in quotes", key));
  } else {
    value = *found->value<std::string>();
  }
}

void Section::choice(std::string_view key, std::size_t& value,
                     std::initializer_list<std::string_view> words) {
  const toml::node* found = node(key);
  if (found == nullptr) return;
  const auto read = found->value<std::string>();
  const auto* place = read ? std::find(words.begin(), words.end(), *read) : words.end();
  if (place == words.end()) {
    file_.complain(found->source(),
                   fmt::format("'{}' must be one of \"{}\"", key, fmt::join(words, "\", \"")));
  } else {
    value = static_cast<std::size_t>(place - words.begin());
  }
}

void Section::figure(std::string_view key, Figure& value, double factor, Need need, Range range) {
  const toml::node* found = node(key, need);
  if (found == nullptr) return;
  double best = 0;
  double deviation = 0;
  if (const toml::array* both = found->as_array()) {
    const bool fits = both->size() == 2 && (*both)[0].is_number() && (*both)[1].is_number();
    if (!fits) {
      file_.complain(found->source(),
                     fmt::format("'{}' must be a number or [number, standard deviation]", key));
      return;
    }
    best = *(*both)[0].value<double>();
    deviation = *(*both)[1].value<double>();
  } else if (found->is_number()) {
    best = *found->value<double>();
  } else {
    file_.complain(found->source(),
                   fmt::format("'{}' must be a number or [number, standard deviation]", key));
    return;
  }
  if (!holds(range, best * factor) || !holds(not_negative, deviation)) {
    file_.complain(found->source(), fmt::format("'{}' must be {}{}", key, described(range),
                                                deviation < 0 ? ", with a deviation of 0 or more" : ""));
    return;
  }
  value = {best * factor, deviation * factor, deviation > 0 ? file_.origin_of(*found) : 0};
}

void Section::finish() {
  if (table_ == nullptr) return;
  for (const auto& [key, value] : *table_) {
    const std::string_view word = key.str();
    if (std::find(known_.begin(), known_.end(), word) != known_.end()) continue;
    const auto nearest = std::min_element(known_.begin(), known_.end(), [&](const auto& a, const auto& b) {
      return distance(word, a) < distance(word, b);
    });
    const bool is_near = nearest != known_.end() && distance(word, *nearest) <= 2 + word.size() / 4;
    file_.complain(key.source(),
                   title_.empty() ? fmt::format("unknown key '{}'", word)
                                  : fmt::format("unknown key '{}' in [{}]", word, title_),
                   is_near ? fmt::format("did you mean '{}'?", *nearest) : std::string{});
  }
}

}  // namespace isinglass
