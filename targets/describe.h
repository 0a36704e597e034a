// What a machine description means, as text or JSON: what `isinglass target` says.
#pragma once

#include <numbers>
#include <optional>
#include <string>
#include <utility>

#include "targets/trap_machine.h"

namespace isinglass {

/// What is asked about a machine beyond its chain.
struct TargetQuestion {
  std::string path;  // of the description
  bool as_json = false;
  std::optional<std::pair<int, int>> pair;         // the light of this pair ...
  double theta = std::numbers::pi / 2;             // ... for this angle, 0 < theta <= pi/2
  std::optional<std::pair<double, double>> drive;  // global drive: mu in MHz, Rabi frequency in kHz
  bool all_pairs = false;                          // the figures of every pair
  std::string plot;                                // SVG file to write; empty = none
  int threads = 0;                                 // 0 = as many as cores
  ReportProgress progress;                         // of the search for light
};

/// The answer for the standard output, ending with a newline; the plot is written when asked for. Throws
/// Failure: target_cannot for a faulty description or a pair that cannot be reached, usage for a question
/// that does not fit the machine, file_trouble for the plot.
std::string answer(const TargetQuestion& question);

}  // namespace isinglass
