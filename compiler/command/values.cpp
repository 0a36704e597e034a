// Values files; see values.h.
#include "command/values.h"

#include <fmt/format.h>

#include <algorithm>
#include <charconv>
#include <cmath>
#include <cstring>
#include <fstream>
#include <iostream>
#include <map>
#include <nlohmann/json.hpp>

#include "circuit/message.h"

namespace isinglass {

namespace {

std::string_view trimmed(std::string_view text) {
  while (!text.empty() && (text.front() == ' ' || text.front() == '\t')) text.remove_prefix(1);
  while (!text.empty() && (text.back() == ' ' || text.back() == '\t' || text.back() == '\r'))
    text.remove_suffix(1);
  return text;
}

/// Calls `use` with each cell of a CSV line; quotes around a cell are taken off.
template <typename Use>
void for_each_cell(std::string_view line, const Use& use) {
  while (true) {
    const std::size_t comma = line.find(',');
    std::string_view cell = trimmed(line.substr(0, comma));
    if (cell.size() >= 2 && cell.front() == '"' && cell.back() == '"') cell = cell.substr(1, cell.size() - 2);
    use(cell);
    if (comma == std::string_view::npos) return;
    line.remove_prefix(comma + 1);
  }
}

/// How CSV names a cell of an input: "t", or "a[2]" of an array.
std::string cell_name(const DeclaredInput& input, std::size_t cell) {
  return input.count == 1 ? input.name : fmt::format("{}[{}]", input.name, cell);
}

/// The numbers of nested arrays, row by row; false where something else stands among them.
bool flatten(const nlohmann::json& value, std::vector<double>& numbers) {
  if (value.is_number()) {
    numbers.push_back(value.get<double>());
    return true;
  }
  return value.is_array() &&
         std::all_of(value.begin(), value.end(), [&](const auto& part) { return flatten(part, numbers); });
}

}  // namespace

ValueReader::ValueReader(const std::string& path, std::vector<DeclaredInput> inputs)
    : path_(path == "-" ? "<stdin>" : path), inputs_(std::move(inputs)) {
  if (path == "-") {
    stream_ = &std::cin;
  } else {
    file_ = std::make_unique<std::ifstream>(path, std::ios::binary);
    stream_ = file_.get();
    if (!*stream_)
      throw Failure(Exit::file_trouble, fmt::format("cannot read {}: {}", path, std::strerror(errno)));
  }
  if (!next_line()) throw Failure(Exit::usage, path_ + " holds no values");
  is_json_ = trimmed(line_).front() == '{';
  is_pending_ = is_json_;
  if (!is_json_) read_heading();
}

void ValueReader::fail(const std::string& text) const {
  Message message;
  message.place = {path_, line_number_, 1};
  message.text = text;
  message.source_line = line_;
  throw Failure(Exit::usage, {message});
}

bool ValueReader::next_line() {
  while (std::getline(*stream_, line_)) {
    ++line_number_;
    if (!trimmed(line_).empty()) return true;
  }
  if (stream_->bad()) throw Failure(Exit::file_trouble, "cannot read " + path_);
  return false;
}

void ValueReader::read_heading() {
  std::map<std::string, std::pair<std::size_t, std::size_t>, std::less<>> cells;
  for (std::size_t i = 0; i < inputs_.size(); ++i) {
    for (std::size_t cell = 0; cell < inputs_[i].count; ++cell)
      cells[cell_name(inputs_[i], cell)] = {i, cell};
  }
  for_each_cell(line_, [&](std::string_view name) {
    const auto found = cells.find(name);
    if (found == cells.end()) {
      fail(fmt::format("{} is no input of the plan, or stands in two columns", name));
    }
    columns_.push_back(found->second);
    cells.erase(found);
  });
  if (!cells.empty()) fail("no column gives the input " + cells.begin()->first);
}

bool ValueReader::next(Set& values) {
  if (!is_pending_ && !next_line()) return false;
  is_pending_ = false;
  values.resize(inputs_.size());
  for (std::size_t i = 0; i < inputs_.size(); ++i) values[i].assign(inputs_[i].count, 0.0);
  is_json_ ? read_object(values) : read_row(values);
  return true;
}

void ValueReader::read_row(Set& values) {
  std::size_t column = 0;
  for_each_cell(line_, [&](std::string_view text) {
    if (column == columns_.size()) fail(fmt::format("more than {} values", columns_.size()));
    double value = 0;
    const auto [end, fault] = std::from_chars(text.data(), text.data() + text.size(), value);
    if (fault != std::errc{} || end != text.data() + text.size() || !std::isfinite(value)) {
      fail(fmt::format("\"{}\" is no number", text));
    }
    const auto [input, cell] = columns_[column++];
    values[input][cell] = value;
  });
  if (column < columns_.size()) fail(fmt::format("{} values where {} are named", column, columns_.size()));
}

void ValueReader::read_object(Set& values) {
  const auto object = nlohmann::json::parse(line_, nullptr, false);
  if (!object.is_object()) fail("not a JSON object on one line");
  std::size_t used = 0;
  for (std::size_t i = 0; i < inputs_.size(); ++i) {
    const auto found = object.find(inputs_[i].name);
    if (found == object.end()) fail("no value for the input " + inputs_[i].name);
    values[i].clear();
    if (!flatten(*found, values[i])) fail(fmt::format("the value of {} is no number", inputs_[i].name));
    if (values[i].size() != inputs_[i].count) {
      fail(fmt::format("{} takes {} numbers, not {}", inputs_[i].name, inputs_[i].count, values[i].size()));
    }
    ++used;
  }
  if (used == object.size()) return;
  for (const auto& [name, value] : object.items()) {
    if (std::none_of(inputs_.begin(), inputs_.end(), [&](const auto& input) { return input.name == name; })) {
      fail(fmt::format("the plan has no input {}", name));
    }
  }
}

}  // namespace isinglass
