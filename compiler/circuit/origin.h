// Which source lines an operation came from. One line is stored in place; sets of lines are interned.
#pragma once

#include <cstdint>
#include <map>
#include <span>
#include <vector>

namespace isinglass {

/// 0 = unknown; below 2^31 = that source line (counted from 1); else 2^31 + index of a set in Origins.
struct Origin {
  std::uint32_t code = 0;
  bool operator==(const Origin&) const = default;
};

class Origins {
 public:
  static Origin line(std::uint32_t line) { return {line}; }
  /// The union of both sets of lines.
  Origin merged(Origin a, Origin b);
  /// The lines in ascending order; empty when unknown.
  std::vector<std::uint32_t> lines(Origin origin) const;

 private:
  Origin intern(std::vector<std::uint32_t> lines);

  std::vector<std::vector<std::uint32_t>> sets_;
  std::map<std::vector<std::uint32_t>, std::uint32_t> index_;
};

}  // namespace isinglass
