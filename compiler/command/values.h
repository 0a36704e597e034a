// The values file of `bind`: one set of numbers a line, as CSV or as JSON lines, read as a stream.
#pragma once

#include <istream>
#include <memory>
#include <string>
#include <utility>
#include <vector>

#include "language/bind.h"

namespace isinglass {

/// Reads set after set. CSV: the first line names the inputs. JSON lines: an object a line, input name to
/// number. Every declared input needs a value in every set; names that are no inputs are faults.
class ValueReader {
 public:
  /// The numbers of each declared input, in the order of `inputs`.
  using Set = std::vector<std::vector<double>>;

  /// "-" is the standard input. Throws Failure: file_trouble, or usage with the line where the file is wrong.
  ValueReader(const std::string& path, std::vector<DeclaredInput> inputs);

  /// Reads the next set; false at the end.
  bool next(Set& values);

 private:
  [[noreturn]] void fail(const std::string& text) const;
  bool next_line();
  void read_heading();
  void read_row(Set& values);
  void read_object(Set& values);

  std::string path_;
  std::unique_ptr<std::istream> file_;
  std::istream* stream_ = nullptr;
  std::vector<DeclaredInput> inputs_;
  std::vector<std::pair<std::size_t, std::size_t>> columns_;  // of CSV: input and cell of each column
  std::string line_;
  std::size_t line_number_ = 0;
  bool is_json_ = false;
  bool is_pending_ = false;  // the first line of JSON is read already
};

}  // namespace isinglass
