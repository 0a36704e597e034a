// Reading of sources; see reading.h.
#include "command/reading.h"

#include <iostream>

#include "algebra/sha256.h"
#include "circuit/files.h"
#include "circuit/message.h"
#include "command/clock.h"
#include "language/language.h"

namespace isinglass {

SourceFile read_source(const std::string& path, bool quiet, const std::function<GateTimes()>& times) {
  const Stopwatch watch;
  const std::string text = read_text(path);
  ReadOptions options;
  options.times = times;
  Reading reading = read(path == "-" ? "<stdin>" : path, text, options);
  if (!reading.ok()) throw Failure(Exit::source_at_fault, std::move(reading.messages));
  if (!quiet) {
    for (const Message& message : reading.messages) std::cerr << printed(message);
  }
  return {path, sha256(text), std::move(*reading.circuit), std::move(reading.annotations), watch.seconds()};
}

}  // namespace isinglass
