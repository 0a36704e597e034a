// The progress line; see progress.h.
#include "command/progress.h"

#include <fmt/format.h>
#include <unistd.h>

#include <algorithm>
#include <cstdio>

namespace isinglass {

namespace {
constexpr double patience = 0.5;  // seconds before a stage is worth a line
constexpr int bar_width = 24;
constexpr std::size_t widest = 60;
}  // namespace

Progress::Progress(bool quiet) : is_shown_(!quiet && isatty(STDERR_FILENO) == 1) {
  if (is_shown_) ticker_ = std::thread([this] { tick(); });
}

Progress::~Progress() {
  if (!is_shown_) return;
  {
    const std::lock_guard lock(mutex_);
    is_over_ = true;
  }
  wake_.notify_all();
  ticker_.join();
  clear();
}

void Progress::stage(const std::string& what) {
  if (!is_shown_) return;
  const std::lock_guard lock(mutex_);
  what_ = what.size() > widest ? "..." + what.substr(what.size() - widest) : what;
  share_ = -1;
  watch_ = {};
}

void Progress::share(double done) {
  if (!is_shown_) return;
  const std::lock_guard lock(mutex_);
  share_ = std::clamp(done, 0.0, 1.0);
}

void Progress::clear() {
  if (!is_shown_) return;
  const std::lock_guard lock(mutex_);
  if (is_drawn_) std::fputs("\r\033[K", stderr);
  std::fflush(stderr);
  is_drawn_ = false;
}

void Progress::tick() {
  std::unique_lock lock(mutex_);
  while (!is_over_) {
    wake_.wait_for(lock, std::chrono::milliseconds(200));
    if (!is_over_ && !what_.empty() && watch_.seconds() > patience) draw();
  }
}

void Progress::draw() const {
  std::string line = what_;
  if (share_ >= 0) {
    const int full = static_cast<int>(share_ * bar_width);
    line += fmt::format(" [{}{}] {:3.0f} %", std::string(full, '#'), std::string(bar_width - full, '.'),
                        share_ * 100);
  }
  fmt::print(stderr, "\r\033[K{} {:.0f} s", line, watch_.seconds());
  std::fflush(stderr);
  is_drawn_ = true;
}

}  // namespace isinglass
