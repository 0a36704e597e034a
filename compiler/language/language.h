// The one door of this room: the text of an OpenQASM program in, a Circuit or messages out.
//
// What is known while compiling is evaluated, loops are unrolled and calls inlined; what depends on an
// `input` becomes an angle affine in the inputs (or a derived input); what depends on measured bits is kept
// as classical statements and branches. See README.md in this folder.
#pragma once

#include <cstddef>
#include <functional>
#include <optional>
#include <string>
#include <string_view>
#include <vector>

#include "circuit/annotation.h"
#include "circuit/circuit.h"
#include "circuit/message.h"

namespace isinglass {

/// What durationof() and boxes reckon with, in nanoseconds: the figures of the typical machine, or those of a
/// target.
struct GateTimes {
  double pulse = 5'000;          // one gate on one qubit; changes of frame take no time
  double interaction = 200'000;  // one xx
  double measure = 120'000;
  double reset = 20'000;
};

struct ReadOptions {
  /// More operations than this, after unrolling and inlining, is an error that says where it happened.
  std::size_t most_operations = 20'000'000;
  /// More classical steps (statements run, loop rounds) than this is an error: no constant loop hangs.
  std::size_t most_steps = 50'000'000;
  /// Nested calls of `def`, so that unbounded recursion is an error.
  std::size_t most_depth = 256;
  /// Length of the time unit `dt`, which the standard leaves to the machine, in nanoseconds.
  double dt_ns = 1.0;
  /// Asked for once, and only where lengths of gates matter: machines may be slow to read. What it throws
  /// comes out of read().
  std::function<GateTimes()> times;
};

/// What reading gave. `circuit` is there exactly if no message is an error; it satisfies check_invariants().
struct Reading {
  std::optional<Circuit> circuit;
  std::vector<Message> messages;  // in the order of the source
  /// Of statements in the program's own file that were run; those of definitions and included files are
  /// dropped.
  std::vector<Annotation> annotations;
  int version = 0;  // 20, 30, 31, 32: as declared, or decided when the line is missing

  bool ok() const { return circuit.has_value(); }
};

/// Reads one whole program. `file_name` is for messages only, and for finding included files: those named by
/// `include` are sought beside it and then in the current directory; stdgates.inc and qelib1.inc are built
/// in. Never throws for bad input, whatever the bytes.
Reading read(const std::string& file_name, std::string_view text, const ReadOptions& options = {});

}  // namespace isinglass
