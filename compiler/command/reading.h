// A source file on the way in: its bytes, its circuit, and the messages said about it.
#pragma once

#include <functional>
#include <string>
#include <vector>

#include "circuit/circuit.h"
#include "language/language.h"

namespace isinglass {

struct SourceFile {
  std::string path;    // as the user wrote it
  std::string sha256;  // of the bytes
  Circuit circuit;
  std::vector<Annotation> annotations;
  double seconds = 0;  // what reading took
};

/// Reads and understands one program; "-" is the standard input. Warnings go to stderr unless `quiet`.
/// `times` tells the machine's figures where the program asks for lengths of gates; without it they are those
/// of the typical machine. Throws Failure: file_trouble, or source_at_fault with all errors of the file.
SourceFile read_source(const std::string& path, bool quiet, const std::function<GateTimes()>& times = {});

}  // namespace isinglass
