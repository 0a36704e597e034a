// See window_search.h.
#include "passes/window_search.h"

#include <algorithm>
#include <bit>
#include <cmath>

namespace isinglass {

namespace {

using Clock = std::chrono::steady_clock;

constexpr std::size_t least_pairs = 3;     // in a window worth solving
constexpr std::size_t most_scanned = 600;  // turns looked at for a window on few wires
constexpr std::size_t margin = 16;         // turns around a window whose stretches it may break or join

std::uint64_t wires_of(const Turn& turn) {
  return std::uint64_t{1} << turn.a | (turn.is_pair() ? std::uint64_t{1} << turn.b : 0);
}

/// Places of the turns of a window, ascending. All of them can be moved to the first place.
using Window = std::vector<std::size_t>;

class Search {
 public:
  Search(Sequence& sequence, unsigned wires, const SearchPlan& plan, Dice& dice)
      : turns_(sequence.turns), home_(sequence.home), wires_(wires), plan_(plan), dice_(dice) {}

  Price run() {
    const auto begin = Clock::now();
    const double full = plan_.cost.interaction(pi / 2);
    double error = price(turns_).error;
    Sequence best{turns_, home_};
    double best_error = error;
    for (std::uint64_t round = 0; round < plan_.tries; ++round) {
      double spent = static_cast<double>(round) / static_cast<double>(plan_.tries);
      if (round % 16 == 0) {
        const auto now = Clock::now();
        if (now >= plan_.deadline) break;
        if (plan_.deadline != Clock::time_point::max()) {
          spent_ = std::chrono::duration<double>(now - begin) /
                   std::chrono::duration<double>(plan_.deadline - begin);
        }
      }
      spent = std::max(spent, spent_);
      heat_ = plan_.heat * full * std::max(0.0, 1 - spent / 0.9);
      const double change = try_window();
      error += change;
      if (accepted_ >= 100) {
        push_local_cliffords(turns_, wires_);
        accepted_ = 0;
      }
      if (change < 0 && error < best_error - 1e-12) {
        error = price(turns_).error;
        if (error < best_error - 1e-12) {
          best_error = error;
          best = {turns_, home_};
        }
      }
    }
    turns_ = std::move(best.turns);
    home_ = std::move(best.home);
    push_local_cliffords(turns_, wires_);
    return price(turns_);
  }

 private:
  Price price(const std::vector<Turn>& turns) const {
    return price_of(turns, wires_, plan_.may_rename, plan_.cost);
  }

  // ---- choosing a window

  Window consecutive() {
    const auto wanted = static_cast<std::size_t>(std::exp(dice_.real(std::log(5.0), std::log(40.0))));
    Window window;
    std::size_t pairs = 0;
    for (std::size_t i = dice_.below(static_cast<unsigned>(turns_.size()));
         i < turns_.size() && pairs < wanted; ++i) {
      window.push_back(i);
      pairs += turns_[i].is_pair();
    }
    return pairs < least_pairs ? Window() : window;
  }

  Window closed() {
    const int most = 3 + static_cast<int>(dice_.below(4));
    const std::size_t wanted = 6 + dice_.below(40);
    Window window;
    std::uint64_t inside = 0, outside = 0;  // wires of the window still open; wires that skipped turns touch
    std::size_t pairs = 0;
    const std::size_t start = dice_.below(static_cast<unsigned>(turns_.size()));
    const std::size_t end = std::min(turns_.size(), start + most_scanned);
    for (std::size_t i = start; i < end && pairs < wanted; ++i) {
      const std::uint64_t wires = wires_of(turns_[i]);
      const bool connects = inside == 0 || (wires & inside) != 0;
      if (connects && (wires & outside) == 0 && std::popcount(inside | wires) <= most) {
        inside |= wires;
        window.push_back(i);
        pairs += turns_[i].is_pair();
      } else {
        outside |= wires;
        if (inside != 0 && std::popcount(inside & ~outside) < 2) break;
      }
    }
    return pairs < least_pairs ? Window() : window;
  }

  // ---- solving it

  /// Tries one window; returns by how much the error changed.
  double try_window() {
    const Window window = dice_.below(2) == 0 ? consecutive() : closed();
    if (window.empty()) return 0;
    std::array<std::uint8_t, most_wires> local{};
    std::vector<std::uint8_t> wire;  // of each local number
    std::uint64_t used = 0;
    std::vector<Turn> cut;
    cut.reserve(window.size());
    for (const std::size_t place : window) {
      Turn turn = turns_[place];
      for (std::uint8_t* end : {&turn.a, &turn.b}) {
        if (end == &turn.b && !turn.is_pair()) continue;
        if ((used >> *end & 1) == 0) {
          used |= std::uint64_t{1} << *end;
          local[*end] = static_cast<std::uint8_t>(wire.size());
          wire.push_back(*end);
        }
        *end = local[*end];
      }
      cut.push_back(turn);
    }
    const auto count = static_cast<unsigned>(wire.size());
    const Price before = price_of(cut, count, plan_.may_rename, plan_.cost);
    const auto solved = solve(cut, count, before.interactions + (dice_.below(4) == 0 ? 1 : 0));
    if (!solved) return 0;
    const Price after = price_of(solved->turns, count, plan_.may_rename, plan_.cost);
    if (!is_taken(after.error - before.error)) return 0;
    return splice(window, wire, *solved);
  }

  std::optional<Sequence> solve(const std::vector<Turn>& cut, unsigned count, int most) {
    const bool backwards = dice_.below(2) == 0;
    const Network network = network_of(backwards ? inverted(cut) : cut, count);
    auto solved = greedy_sequence(network, random_taste(dice_), {most, plan_.may_rename, 3}, dice_);
    if (solved && backwards) solved = inverted(*solved);
    return solved;
  }

  bool is_taken(double change) {
    if (change <= 1e-12) return true;
    return heat_ > 0 && dice_.real() < std::exp(-change / heat_);
  }

  // ---- putting it back

  double splice(const Window& window, const std::vector<std::uint8_t>& wire, const Sequence& solved) {
    std::array<std::uint8_t, most_wires> where;
    for (unsigned w = 0; w < most_wires; ++w) where[w] = static_cast<std::uint8_t>(w);
    for (std::size_t k = 0; k < wire.size(); ++k) where[wire[k]] = wire[solved.home[k]];
    const auto renamed = [&](Turn turn) {
      turn.a = where[turn.a];
      if (turn.is_pair()) turn.b = where[turn.b];
      return turn;
    };
    // The neighbourhood: some turns before, the window's result, the turns it skipped, some turns after.
    const std::size_t first = window.front() < margin ? 0 : window.front() - margin;
    const std::size_t last = std::min(turns_.size(), window.back() + 1 + margin);
    std::vector<Turn> patch(turns_.begin() + static_cast<std::ptrdiff_t>(first),
                            turns_.begin() + static_cast<std::ptrdiff_t>(window.front()));
    for (Turn turn : solved.turns) {
      turn.a = wire[turn.a];
      if (turn.is_pair()) turn.b = wire[turn.b];
      patch.push_back(turn);
    }
    std::size_t next = 0;
    for (std::size_t i = window.front(); i < last; ++i) {
      if (next < window.size() && window[next] == i) {
        ++next;
      } else {
        patch.push_back(renamed(turns_[i]));
      }
    }
    const auto from = turns_.begin() + static_cast<std::ptrdiff_t>(first);
    const auto to = turns_.begin() + static_cast<std::ptrdiff_t>(last);
    const double change = price(patch).error - price(std::vector<Turn>(from, to)).error;
    if (!is_taken(change)) return 0;
    for (auto turn = to; turn != turns_.end(); ++turn) *turn = renamed(*turn);
    for (std::uint8_t& end : home_) end = where[end];
    const std::size_t kept = std::min(patch.size(), last - first);
    std::copy_n(patch.begin(), kept, from);
    if (patch.size() > kept) {
      turns_.insert(to, patch.begin() + static_cast<std::ptrdiff_t>(kept), patch.end());
    } else {
      turns_.erase(from + static_cast<std::ptrdiff_t>(kept), to);
    }
    ++accepted_;
    return change;
  }

  std::vector<Turn>& turns_;
  std::vector<std::uint8_t>& home_;
  unsigned wires_;
  const SearchPlan& plan_;
  Dice& dice_;
  double heat_ = 0;
  double spent_ = 0;  // share of the time
  int accepted_ = 0;  // since local Cliffords were pushed
};

}  // namespace

Price search_windows(Sequence& sequence, unsigned wires, const SearchPlan& plan, Dice& dice) {
  return Search(sequence, wires, plan, dice).run();
}

}  // namespace isinglass
