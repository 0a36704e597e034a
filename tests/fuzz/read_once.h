// What every fuzzer does with a program: reads it with small limits and checks what reading promises.
#pragma once

#include <cstdlib>
#include <string_view>

#include "language/language.h"

namespace isinglass::fuzz {

inline void read_once(std::string_view text) {
  ReadOptions limits;
  limits.most_operations = 20'000;
  limits.most_steps = 100'000;
  limits.most_depth = 64;
  const Reading reading = read("fuzz.qasm", text, limits);
  bool has_error = false;
  for (const Message& message : reading.messages) {
    has_error |= message.severity == Message::Severity::error;
    if (printed(message).empty()) std::abort();
  }
  if (has_error == reading.ok()) std::abort();  // a circuit exactly if there is no error
  if (reading.ok()) {
    check_invariants(*reading.circuit);
    if (listed(*reading.circuit).empty() && !reading.circuit->body().empty()) std::abort();
  }
}

}  // namespace isinglass::fuzz
