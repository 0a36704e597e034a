// The pictures of the report, as SVG that stands within a page: each has a title and a description for those
// who do not see it, and takes its colours from the page (see report.cpp).
#pragma once

#include <string>

#include "output/timeline.h"

namespace isinglass {

/// Text made safe for HTML and SVG.
std::string escaped(std::string_view text);

/// Two bars a row, before and after.
std::string picture_of_tally(const Compiled& compiled);

/// One bar, divided by the sources of error.
std::string picture_of_errors(const Totals& totals);

/// Ions from top to bottom, time from left to right. Programs of more than a few thousand entries are shown
/// as what each ion does most in each small stretch of time.
std::string picture_of_timeline(const Compiled& compiled);

/// Which pairs interact: a triangle of cells, darker the more interaction there is.
std::string picture_of_pairs(const Compiled& compiled);

/// The chain with the qubits on it, at the start and at the end.
std::string picture_of_placement(const Compiled& compiled);

/// The likeliest outcomes, two bars a row: without and with noise.
std::string picture_of_outcomes(const Rehearsal& rehearsal);

/// How often and how much each pair interacts, the most used first; loops one round, all arms.
struct PairWork {
  std::uint32_t a = 0;
  std::uint32_t b = 0;
  std::size_t count = 0;
  double units = 0;
};
std::vector<PairWork> work_by_pair(const Circuit& circuit);

}  // namespace isinglass
