// Movement on machines that do not reach every pair: states are exchanged between ions until two that must
// interact sit on a reachable pair. An exchange (swap) costs three full interactions.
#pragma once

#include <cstdint>
#include <vector>

#include "targets/place.h"
#include "targets/target.h"

namespace isinglass {

/// The least-error ways between ions over reachable pairs. Where all pairs are alike nobody asks for ways.
class Routes {
 public:
  /// Ions in `held` keep what they hold: ways end at them and never lead through them.
  explicit Routes(const Target& target, const std::vector<std::uint32_t>& held = {});

  /// Whether what an ion holds must stay on it.
  bool is_held(std::uint32_t ion) const { return !held_.empty() && held_[ion]; }
  /// Whether every addressed pair is reachable: nothing ever moves.
  bool is_complete() const { return is_complete_; }
  /// Estimated error of bringing a and b together and letting them interact; large but finite where no way
  /// leads.
  double movement_error(std::uint32_t a, std::uint32_t b) const { return error_[a * ions_ + b]; }
  /// Whether movement can bring a and b together.
  bool is_connected(std::uint32_t a, std::uint32_t b) const { return error_[a * ions_ + b] < unconnected; }
  /// The ions from a to b, both included; consecutive ones are reachable pairs. Empty when there is no way.
  std::vector<std::uint32_t> way(std::uint32_t a, std::uint32_t b) const;

  static constexpr double unconnected = 1e6;

 private:
  std::size_t ions_;
  bool is_complete_ = true;
  std::vector<bool> held_;           // by ion; empty: none is
  std::vector<double> error_;        // ions x ions: of the cheapest way
  std::vector<std::uint32_t> next_;  // ions x ions: next ion on the way from a to b
};

/// The circuit on the ions of the target, wire w on ion_of[w] throughout: for machines on which nothing
/// moves.
Placed settled(Circuit circuit, const Target& target, const std::vector<std::uint32_t>& ion_of);

/// The circuit on the ions of the target, beginning with ion_of[wire], with swaps where pairs are not
/// reachable. Throws Failure(target_cannot) that names the pair when no way leads from one to the other.
Placed routed(const Circuit& circuit, const Target& target, const Routes& routes,
              const std::vector<std::uint32_t>& ion_of);

/// The cheapest of routed() from several beginnings, each of them improved by going through the program
/// backwards and forwards again: where the backward way ends is a good place to begin (Li, Ding and Xie
/// 2019).
Placed best_routed(const Circuit& circuit, const Target& target, const Routes& routes,
                   const std::vector<std::vector<std::uint32_t>>& beginnings);

}  // namespace isinglass
