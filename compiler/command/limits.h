// What a circuit may cost: the limits file and the baseline of `guard`.
#pragma once

#include <map>
#include <string>
#include <string_view>
#include <vector>

#include "targets/schedule.h"

namespace isinglass {

/// The figures that can be limited, by the names of the totals: xx, xx_units, r, xx_depth, pairs, duration,
/// error.
std::span<const std::string_view> limited_figures();
/// Value of the figure with that name; every name of limited_figures() is known.
double figure_of(const Totals& totals, std::string_view figure);

/// Figure name to the most that is allowed.
using Limits = std::map<std::string, double>;

struct LimitsFile {
  Limits for_all;
  std::map<std::string, Limits> for_one;  // by the path as written in the file

  /// The limits that hold for a source: those for it alone win over those for all. Paths are compared after
  /// "./" and the like are taken out.
  Limits of(const std::string& source) const;
};

/// Reads the TOML file with [limits] and [limits."path"]. Throws Failure: file_trouble, or usage with the
/// place of each unknown key, wrong type or negative limit.
LimitsFile read_limits(const std::string& path);

/// What `guard --format json` wrote earlier: totals by source path. Throws Failure: file_trouble, or usage
/// when it is no such file.
std::map<std::string, Limits> read_baseline(const std::string& path);

}  // namespace isinglass
