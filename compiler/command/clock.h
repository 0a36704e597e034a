// Wall-clock time, for the seconds that reports show.
#pragma once

#include <chrono>

namespace isinglass {

class Stopwatch {
 public:
  /// Seconds since it was made.
  double seconds() const {
    return std::chrono::duration<double>(std::chrono::steady_clock::now() - start_).count();
  }

 private:
  std::chrono::steady_clock::time_point start_ = std::chrono::steady_clock::now();
};

}  // namespace isinglass
