// Values files; see values.h.
#include "command/values.h"

#include <fmt/format.h>

#include <algorithm>
#include <charconv>
#include <cmath>
#include <cstring>
#include <fstream>
#include <iostream>
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

}  // namespace

ValueReader::ValueReader(const std::string& path, const std::vector<Input>& inputs)
    : path_(path == "-" ? "<stdin>" : path), inputs_(inputs) {
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

std::size_t ValueReader::input_named(const std::string& name) const {
  for (std::size_t i = 0; i < inputs_.size(); ++i) {
    if (!inputs_[i].is_derived && inputs_[i].name == name) return i;
  }
  fail("the plan has no input " + name);
}

void ValueReader::read_heading() {
  for_each_cell(line_, [&](std::string_view cell) {
    const std::size_t input = input_named(std::string(cell));
    if (std::find(columns_.begin(), columns_.end(), input) != columns_.end()) {
      fail(fmt::format("the input {} stands in two columns", cell));
    }
    columns_.push_back(input);
  });
  for (std::size_t i = 0; i < inputs_.size(); ++i) {
    if (!inputs_[i].is_derived && std::find(columns_.begin(), columns_.end(), i) == columns_.end()) {
      fail("no column gives the input " + inputs_[i].name);
    }
  }
}

bool ValueReader::next(std::vector<double>& values) {
  if (!is_pending_ && !next_line()) return false;
  is_pending_ = false;
  values.assign(inputs_.size(), 0.0);
  is_json_ ? read_object(values) : read_row(values);
  return true;
}

void ValueReader::read_row(std::vector<double>& values) {
  std::size_t column = 0;
  for_each_cell(line_, [&](std::string_view cell) {
    if (column == columns_.size()) fail(fmt::format("more than {} values", columns_.size()));
    double value = 0;
    const auto [end, fault] = std::from_chars(cell.data(), cell.data() + cell.size(), value);
    if (fault != std::errc{} || end != cell.data() + cell.size() || !std::isfinite(value)) {
      fail(fmt::format("\"{}\" is no number", cell));
    }
    values[columns_[column++]] = value;
  });
  if (column < columns_.size()) fail(fmt::format("{} values where {} are named", column, columns_.size()));
}

void ValueReader::read_object(std::vector<double>& values) {
  const auto object = nlohmann::json::parse(line_, nullptr, false);
  if (!object.is_object()) fail("not a JSON object on one line");
  for (const auto& [name, value] : object.items()) {
    const std::size_t input = input_named(name);
    if (!value.is_number()) fail(fmt::format("the value of {} is no number", name));
    values[input] = value.get<double>();
  }
  for (const Input& input : inputs_) {
    if (!input.is_derived && !object.contains(input.name)) fail("no value for the input " + input.name);
  }
}

}  // namespace isinglass
