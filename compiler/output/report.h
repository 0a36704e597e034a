// The report: one HTML page with its pictures inside, for people who decide whether to run the program.
#pragma once

#include <ostream>

#include "output/timeline.h"

namespace isinglass {

/// Tally before and after, errors by source, timeline, pairs to calibrate, placement. Needs no other file.
void write_report(std::ostream& out, const Compiled& compiled);

}  // namespace isinglass
