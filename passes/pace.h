// How long passes take a gate, so that none is begun that cannot end in time.
//
// Most passes are not interrupted. What one will take is foretold from its row in the table, times how much
// slower this machine is with the passes so far than their rows say, or from the slowest it has been on this
// program itself, whichever is more.
#pragma once

#include <map>
#include <mutex>
#include <string_view>

#include "passes/pass.h"

namespace isinglass {

/// Shared by the orders that compete, on any number of threads.
class Pace {
 public:
  /// Seconds that the pass will take on so many gates.
  double expected(const Pass& pass, std::size_t gates) const;
  void saw(const Pass& pass, std::size_t gates, double seconds);

 private:
  mutable std::mutex mutex_;
  std::map<std::string_view, double> slowest_;  // seconds a gate, by pass
  double listed_ = 1e-3, taken_ = 1e-3;         // seconds of all so far; a start, so that trifles say nothing
};

}  // namespace isinglass
