// One line on the terminal that says what is being done and for how long; silent elsewhere.
#pragma once

#include <condition_variable>
#include <mutex>
#include <string>
#include <thread>

#include "command/clock.h"

namespace isinglass {

/// Writes to stderr, and only if that is a terminal and `quiet` is false. Stages shorter than half a second
/// are not shown. The line is wiped when the object ends or clear() is called.
class Progress {
 public:
  explicit Progress(bool quiet);
  ~Progress();
  Progress(const Progress&) = delete;
  Progress& operator=(const Progress&) = delete;

  void stage(const std::string& what);
  /// Of the current stage, in [0, 1]; shown as a bar.
  void share(double done);
  void clear();

 private:
  void tick();
  void draw() const;

  bool is_shown_;
  bool is_over_ = false;
  mutable bool is_drawn_ = false;
  std::string what_;
  double share_ = -1;
  Stopwatch watch_;
  std::mutex mutex_;
  std::condition_variable wake_;
  std::thread ticker_;
};

}  // namespace isinglass
