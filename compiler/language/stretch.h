// Stretches: durations that are found so that every box is as long as it says.
//
//     box[1us] { delay[a] $0; x $0; delay[a] $0; }      x takes 0.4us   ==>   a = 0.3us
//
// A span is a box, or what stands between two barriers: pieces of work in their order, each on some wires. On
// a wire the pieces between two that it shares with other wires follow one another; where one of them can
// stretch they fill the time exactly, elsewhere they may wait. Among all lengths that fit, the spans without
// a length of their own are as short as they can be; then wires wait as little as they can; then the longest
// stretch is as short as it can be, then the next, and so on (the lexicographic min-max).
#pragma once

#include <cstdint>
#include <optional>
#include <vector>

#include "circuit/angle.h"
#include "language/syntax.h"

namespace isinglass {

/// One free length: at least `least`, in nanoseconds.
struct Stretch {
  double least = 0;
};

/// Nanoseconds: `fixed` + forms[form] over the stretches, each counted from its least length.
struct TimedPiece {
  std::vector<std::uint32_t> wires;
  double fixed = 0;
  std::uint32_t form = 0;
  /// A barrier that opens or closes an inner span of given length: the two carry the same number, 0 = none.
  std::uint32_t inner = 0;
  double inner_length = 0;
};

struct StretchedSpan {
  std::vector<TimedPiece> pieces;
  std::optional<double> length;  // nanoseconds; without it the span is as long as it must be
  syntax::Span at;               // for messages
};

struct StretchProblem {
  syntax::Span at;
  std::string text;
};

/// What each stretch is longer than its least length, in nanoseconds: stretches that no span holds stay at
/// it. Spans that share stretches are solved together. What has no solution, or is too large to be solved, is
/// told in `problems`.
std::vector<double> solved(const std::vector<Stretch>& stretches, const std::vector<StretchedSpan>& spans,
                           const Forms& forms, std::vector<StretchProblem>& problems);

}  // namespace isinglass
