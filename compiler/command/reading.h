// A source file on the way in: its bytes, its circuit, and the messages said about it.
#pragma once

#include <string>

#include "circuit/circuit.h"

namespace isinglass {

struct SourceFile {
  std::string path;    // as the user wrote it
  std::string sha256;  // of the bytes
  Circuit circuit;
  double seconds = 0;  // what reading took
};

/// Reads and understands one program; "-" is the standard input. Warnings go to stderr unless `quiet`.
/// Throws Failure: file_trouble, or source_at_fault with all errors of the file.
SourceFile read_source(const std::string& path, bool quiet);

}  // namespace isinglass
