// Placement by interaction-weighted local search, and movement; see place.h.
#include "targets/place.h"

#include <fmt/format.h>

#include <algorithm>
#include <cmath>
#include <functional>
#include <limits>
#include <numeric>
#include <random>

#include "circuit/message.h"
#include "circuit/physical.h"
#include "targets/route.h"

namespace isinglass {

namespace {

/// What a wire, or a pair of wires, does in the whole program: sums over its operations.
struct PairUse {
  double count = 0;
  double root = 0;  // sum of sqrt(s), s = theta / (pi/2)
  double slope = 0;
  double square = 0;
};
struct Neighbour {
  std::uint32_t wire;
  PairUse use;
};
struct WireUse {
  double pulses = 0;
  double readings = 0;
  double interactions = 0;
  std::vector<Neighbour> neighbours;
};

std::vector<WireUse> uses_of(const Circuit& circuit) {
  std::vector<WireUse> uses(circuit.wires);
  std::vector<PairUse> table(std::size_t{circuit.wires} * circuit.wires);
  for (const Block& block : circuit.blocks) {
    for (const Operation& op : block) {
      if (op.kind == Kind::r) ++uses[op.operand[0]].pulses;
      if (op.kind == Kind::measure) ++uses[op.operand[0]].readings;
      if (op.kind != Kind::xx) continue;
      const double s = op.form[0] == 0 ? std::abs(op.value[0]) / (pi / 2) : 1;
      const auto [a, b] = std::minmax(op.operand[0], op.operand[1]);
      PairUse& use = table[std::size_t{a} * circuit.wires + b];
      ++use.count;
      use.root += std::sqrt(s);
      use.slope += s;
      use.square += s * s;
    }
  }
  for (std::uint32_t a = 0; a < circuit.wires; ++a) {
    for (std::uint32_t b = a + 1; b < circuit.wires; ++b) {
      const PairUse& use = table[std::size_t{a} * circuit.wires + b];
      if (use.count == 0) continue;
      uses[a].neighbours.push_back({b, use});
      uses[b].neighbours.push_back({a, use});
      uses[a].interactions += use.count;
      uses[b].interactions += use.count;
    }
  }
  return uses;
}

/// Estimated error of the program under an assignment of wires to ions. Small and smooth: the sum that the
/// local search descends; the true totals come from the schedule.
class Objective {
 public:
  Objective(const std::vector<WireUse>& uses, const Target& target, const Routes& routes)
      : uses_(uses), target_(target), routes_(routes) {
    double idle = 0;
    for (const IonFigures& ion : target.ion) idle += 0.5 / ion.t2_us.value / static_cast<double>(target.ions);
    waiting_per_us_ = idle * static_cast<double>(uses.size()) / target.interactions_at_once;
  }

  double alone(std::uint32_t wire, std::uint32_t ion) const {
    const IonFigures& figures = target_.ion[ion];
    return uses_[wire].pulses * figures.pulse_error.value +
           uses_[wire].readings * figures.measure_error.value;
  }

  double together(const PairUse& use, std::uint32_t a, std::uint32_t b) const {
    const PairFigures& pair = target_.pair(a, b);
    if (!pair.reachable) return use.count * routes_.movement_error(a, b);
    return use.count * (pair.floor.value + pair.takes_us * waiting_per_us_) + use.root * pair.root.value +
           use.slope * pair.slope.value + use.square * pair.square.value;
  }

  /// Everything of `wire` if it sat on `ion` while the others sit where `ion_of` says; `skip` does not count.
  double of_wire(std::uint32_t wire, std::uint32_t ion, const std::vector<std::uint32_t>& ion_of,
                 std::uint32_t skip) const {
    double sum = alone(wire, ion);
    for (const Neighbour& other : uses_[wire].neighbours) {
      const std::uint32_t at = ion_of[other.wire];
      if (other.wire != skip && at != no_ion) sum += together(other.use, ion, at);
    }
    return sum;
  }

  double whole(const std::vector<std::uint32_t>& ion_of) const {
    double sum = 0;
    for (std::uint32_t wire = 0; wire < uses_.size(); ++wire) {
      sum += alone(wire, ion_of[wire]);
      for (const Neighbour& other : uses_[wire].neighbours) {
        if (other.wire > wire) sum += together(other.use, ion_of[wire], ion_of[other.wire]);
      }
    }
    return sum;
  }

 private:
  const std::vector<WireUse>& uses_;
  const Target& target_;
  const Routes& routes_;
  double waiting_per_us_ = 0;
};

using Assignment = std::vector<std::uint32_t>;  // ion of each wire

/// Where wires may sit: some are pinned to an ion, the others share the ions that are free, in any way.
struct Seating {
  Assignment pinned;                // by wire; no_ion where the wire is free
  std::vector<std::uint32_t> free;  // ions, ascending

  bool is_free(std::uint32_t wire) const { return pinned[wire] == no_ion; }
  std::vector<std::uint32_t> ions_for(std::uint32_t wire) const {
    return is_free(wire) ? free : std::vector<std::uint32_t>{pinned[wire]};
  }
  /// The free wires on these ions, one after the other.
  Assignment filled(const std::vector<std::uint32_t>& ions) const {
    Assignment ion_of = pinned;
    std::size_t next = 0;
    for (std::uint32_t& ion : ion_of) {
      if (ion == no_ion) ion = ions[next++];
    }
    return ion_of;
  }
};

/// Two ions that the build-up begins with.
struct Seat {
  double cost;
  std::uint32_t a;
  std::uint32_t b;
};

/// All ordered pairs of ions for the busiest pair of wires, the cheapest first.
std::vector<Seat> seats_of(std::uint32_t wire, const Neighbour& partner, const Seating& seating,
                           const Objective& objective) {
  std::vector<Seat> seats;
  for (const std::uint32_t a : seating.ions_for(wire)) {
    for (const std::uint32_t b : seating.ions_for(partner.wire)) {
      if (a == b) continue;
      seats.push_back({objective.alone(wire, a) + objective.alone(partner.wire, b) +
                           objective.together(partner.use, a, b),
                       a, b});
    }
  }
  std::stable_sort(seats.begin(), seats.end(), [](const Seat& x, const Seat& y) { return x.cost < y.cost; });
  return seats;
}

/// Continues from those that sit: always the wire that interacts most with them, on the ion that adds least.
void build_up(Assignment& ion_of, const std::vector<WireUse>& uses, const Seating& seating,
              const Objective& objective) {
  const auto wires = static_cast<std::uint32_t>(uses.size());
  std::vector<double> bound(wires, 0);  // interactions with wires that sit
  std::vector<std::uint32_t> free;
  for (const std::uint32_t ion : seating.free) {
    if (std::find(ion_of.begin(), ion_of.end(), ion) == ion_of.end()) free.push_back(ion);
  }
  const auto tell_neighbours = [&](std::uint32_t wire) {
    for (const Neighbour& other : uses[wire].neighbours) bound[other.wire] += other.use.count;
  };
  for (std::uint32_t w = 0; w < wires; ++w) {
    if (ion_of[w] != no_ion) tell_neighbours(w);
  }
  while (true) {
    std::uint32_t next = wires;
    for (std::uint32_t w = 0; w < wires; ++w) {
      if (ion_of[w] != no_ion) continue;
      if (next == wires ||
          std::pair(bound[w], uses[w].interactions) > std::pair(bound[next], uses[next].interactions)) {
        next = w;
      }
    }
    if (next == wires) return;
    const auto cost = [&](std::uint32_t ion) { return objective.of_wire(next, ion, ion_of, no_ion); };
    std::size_t best = 0;
    for (std::size_t i = 1; i < free.size(); ++i) {
      if (cost(free[i]) < cost(free[best])) best = i;
    }
    ion_of[next] = free[best];
    free.erase(free.begin() + static_cast<std::ptrdiff_t>(best));
    tell_neighbours(next);
  }
}

/// Exchanges two wires, or moves one to an empty ion, as long as that helps.
void improve(Assignment& ion_of, const Seating& seating, const Objective& objective) {
  constexpr double least_gain = 1e-12;
  constexpr int most_rounds = 50;
  const auto wires = static_cast<std::uint32_t>(ion_of.size());
  std::vector<std::uint32_t> wire_on(seating.free.empty() ? 0 : seating.free.back() + 1, no_ion);
  for (std::uint32_t w = 0; w < wires; ++w) {
    if (seating.is_free(w)) wire_on[ion_of[w]] = w;
  }

  bool has_changed = true;
  for (int round = 0; has_changed && round < most_rounds; ++round) {
    has_changed = false;
    for (std::uint32_t a = 0; a < wires; ++a) {
      if (!seating.is_free(a)) continue;
      for (const std::uint32_t ion : seating.free) {
        const std::uint32_t from = ion_of[a];
        const std::uint32_t b = wire_on[ion];
        if (ion == from || (b != no_ion && b < a)) continue;
        // The pair (a, b) itself keeps its two ions and drops out of the difference.
        double gain = objective.of_wire(a, from, ion_of, b) - objective.of_wire(a, ion, ion_of, b);
        if (b != no_ion) {
          gain += objective.of_wire(b, ion, ion_of, a) - objective.of_wire(b, from, ion_of, a);
        }
        if (gain <= least_gain) continue;
        ion_of[a] = ion;
        wire_on[ion] = a;
        wire_on[from] = b;
        if (b != no_ion) ion_of[b] = from;
        has_changed = true;
      }
    }
  }
}

/// The results of all beginnings, the best first; of equal ones the earlier.
std::vector<Assignment> assignments(const std::vector<WireUse>& uses, const Seating& seating,
                                    const Objective& objective, const PlaceOptions& options) {
  std::vector<std::pair<double, Assignment>> found;
  const auto compete = [&](Assignment candidate) {
    improve(candidate, seating, objective);
    const double cost = objective.whole(candidate);
    found.emplace_back(cost, std::move(candidate));
  };
  const Assignment in_order = seating.filled(seating.free);
  found.emplace_back(objective.whole(in_order), in_order);
  compete(in_order);

  // Half of the beginnings: the busiest pair of wires on one of the best pairs of ions, the others around it.
  const auto busiest = std::max_element(uses.begin(), uses.end(), [](const WireUse& a, const WireUse& b) {
    return a.interactions < b.interactions;
  });
  unsigned begun = 1;
  if (busiest != uses.end() && !busiest->neighbours.empty()) {
    const auto wire = static_cast<std::uint32_t>(busiest - uses.begin());
    const auto partner =
        std::max_element(busiest->neighbours.begin(), busiest->neighbours.end(),
                         [](const Neighbour& a, const Neighbour& b) { return a.use.count < b.use.count; });
    for (const Seat& seat : seats_of(wire, *partner, seating, objective)) {
      if (begun >= std::max(options.starts / 2, 2u)) break;
      Assignment candidate = seating.pinned;
      candidate[wire] = seat.a;
      candidate[partner->wire] = seat.b;
      build_up(candidate, uses, seating, objective);
      compete(std::move(candidate));
      ++begun;
    }
  }
  std::mt19937_64 random(options.seed);
  for (; begun < options.starts; ++begun) {
    std::vector<std::uint32_t> shuffled = seating.free;
    for (std::size_t k = shuffled.size(); k > 1; --k) std::swap(shuffled[k - 1], shuffled[random() % k]);
    compete(seating.filled(shuffled));
  }
  std::stable_sort(found.begin(), found.end(),
                   [](const auto& a, const auto& b) { return a.first < b.first - 1e-12; });
  std::vector<Assignment> list;
  for (auto& [cost, assignment] : found) list.push_back(std::move(assignment));
  return list;
}

/// Throws where the machine has too few ions, or not the one that a physical qubit names.
Seating seating_of(const Circuit& circuit, const Target& target) {
  Seating seating;
  seating.pinned = pinned_ions(circuit);
  std::vector<bool> is_free(target.ions);
  std::size_t reached = 0;
  for (std::uint32_t ion = 0; ion < target.ions; ++ion) {
    is_free[ion] = target.ion[ion].addressed;
    if (is_free[ion]) ++reached;
  }
  for (std::uint32_t wire = 0; wire < circuit.wires; ++wire) {
    const std::uint32_t ion = seating.pinned[wire];
    if (ion == no_ion) continue;
    const std::string qubit = circuit.wire_name(wire);
    if (ion >= target.ions) {
      throw Failure(Exit::target_cannot,
                    fmt::format("{} is ion {} of the machine, and {} has ions 0 to {} only", qubit, ion,
                                target.name, target.ions - 1));
    }
    if (!target.ion[ion].addressed) {
      throw Failure(Exit::target_cannot,
                    fmt::format("{} is ion {} of the machine, which light does not reach on {}", qubit, ion,
                                target.name));
    }
    is_free[ion] = false;
  }
  if (circuit.wires > reached) {
    throw Failure(Exit::target_cannot,
                  fmt::format("the program needs {} ions, the machine {} has {}{}", circuit.wires,
                              target.name, reached, reached < target.ions ? " that light reaches" : ""));
  }
  for (std::uint32_t ion = 0; ion < target.ions; ++ion) {
    if (is_free[ion]) seating.free.push_back(ion);
  }
  return seating;
}

void refuse_missing_abilities(const Circuit& circuit, const Target& target) {
  for (const Block& block : circuit.blocks) {
    for (const Operation& op : block) {
      const auto refuse = [&](std::string_view what) {
        const auto lines = circuit.origins.lines(op.origin);
        const std::string where = lines.empty() ? "" : fmt::format(" (line {} of the source)", lines.front());
        throw Failure(Exit::target_cannot, fmt::format("the program needs {}{}, which the machine {} lacks",
                                                       what, where, target.name));
      };
      if (op.kind == Kind::reset && !target.has_reset) refuse("reset");
      if (op.kind == Kind::branch && !target.has_feed_forward) refuse("branches on measured bits");
    }
  }
}

/// Whether it makes no difference which ion holds which wire.
bool is_uniform(const Target& target) {
  const auto differs = [](const auto& list) {
    return std::adjacent_find(list.begin(), list.end(), std::not_equal_to<>()) != list.end();
  };
  const bool reaches_all =
      target.pairs.empty() ? target.every_pair.reachable : target.pairs.front().reachable;
  return reaches_all && !differs(target.ion) && !differs(target.pairs);
}

}  // namespace

Placed place(Circuit circuit, const Target& target, const PlaceOptions& options) {
  const Seating seating = seating_of(circuit, target);
  refuse_missing_abilities(circuit, target);
  if (target.pairs.empty() || is_uniform(target)) {  // everybody stays in the order of the source
    return settled(std::move(circuit), target, seating.filled(seating.free));
  }
  std::vector<std::uint32_t> held;
  for (const std::uint32_t ion : seating.pinned) {
    if (ion != no_ion) held.push_back(ion);
  }
  const Routes routes(target, held);
  const std::vector<WireUse> uses = uses_of(circuit);
  const Objective objective(uses, target, routes);
  const auto list = assignments(uses, seating, objective, options);
  return routes.is_complete() ? settled(std::move(circuit), target, list.front())
                              : best_routed(circuit, target, routes, list);
}

}  // namespace isinglass
