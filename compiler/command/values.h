// The values file of `bind`: one set of numbers a line, as CSV or as JSON lines, read as a stream.
#pragma once

#include <istream>
#include <memory>
#include <string>
#include <vector>

#include "circuit/circuit.h"

namespace isinglass {

/// Reads set after set. CSV: the first line names the inputs. JSON lines: an object a line, input name to
/// number. Every declared input needs a value in every set; names that are no inputs are faults.
class ValueReader {
 public:
  /// Declared inputs of the plan, in order; "-" is the standard input. Throws Failure: file_trouble, or usage
  /// with the line where the file is wrong.
  ValueReader(const std::string& path, const std::vector<Input>& inputs);

  /// The next set, one number a declared input (0 at derived ones). False at the end.
  bool next(std::vector<double>& values);

 private:
  [[noreturn]] void fail(const std::string& text) const;
  bool next_line();
  void read_heading();
  void read_row(std::vector<double>& values);
  void read_object(std::vector<double>& values);
  std::size_t input_named(const std::string& name) const;

  std::string path_;
  std::unique_ptr<std::istream> file_;
  std::istream* stream_ = nullptr;
  const std::vector<Input>& inputs_;
  std::vector<std::size_t> columns_;  // of CSV: the input of each column
  std::string line_;
  std::size_t line_number_ = 0;
  bool is_json_ = false;
  bool is_pending_ = false;  // the first line of JSON is read already
};

}  // namespace isinglass
