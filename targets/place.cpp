// Placement by interaction-weighted local search, and movement; see place.h.
#include "targets/place.h"

#include <fmt/format.h>

#include <algorithm>
#include <cmath>
#include <limits>
#include <numeric>
#include <random>

#include "circuit/message.h"
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
    for (const IonFigures& ion : target.ion) idle += 0.5 / ion.t2_us / static_cast<double>(target.ions);
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

  static constexpr std::uint32_t no_ion = 0xffffffffu;

 private:
  const std::vector<WireUse>& uses_;
  const Target& target_;
  const Routes& routes_;
  double waiting_per_us_ = 0;
};

using Assignment = std::vector<std::uint32_t>;  // ion of each wire

/// Two ions that the build-up begins with.
struct Seat {
  double cost;
  std::uint32_t a;
  std::uint32_t b;
};

/// All ordered pairs of ions for the busiest pair of wires, the cheapest first.
std::vector<Seat> seats_of(std::uint32_t wire, const Neighbour& partner,
                           const std::vector<std::uint32_t>& ions, const Objective& objective) {
  std::vector<Seat> seats;
  for (const std::uint32_t a : ions) {
    for (const std::uint32_t b : ions) {
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
void build_up(Assignment& ion_of, const std::vector<WireUse>& uses, const std::vector<std::uint32_t>& ions,
              const Objective& objective) {
  const auto wires = static_cast<std::uint32_t>(uses.size());
  std::vector<double> bound(wires, 0);  // interactions with wires that sit
  std::vector<std::uint32_t> free;
  for (const std::uint32_t ion : ions) {
    if (std::find(ion_of.begin(), ion_of.end(), ion) == ion_of.end()) free.push_back(ion);
  }
  const auto tell_neighbours = [&](std::uint32_t wire) {
    for (const Neighbour& other : uses[wire].neighbours) bound[other.wire] += other.use.count;
  };
  for (std::uint32_t w = 0; w < wires; ++w) {
    if (ion_of[w] != Objective::no_ion) tell_neighbours(w);
  }
  while (true) {
    std::uint32_t next = wires;
    for (std::uint32_t w = 0; w < wires; ++w) {
      if (ion_of[w] != Objective::no_ion) continue;
      if (next == wires ||
          std::pair(bound[w], uses[w].interactions) > std::pair(bound[next], uses[next].interactions)) {
        next = w;
      }
    }
    if (next == wires) return;
    const auto cost = [&](std::uint32_t ion) {
      return objective.of_wire(next, ion, ion_of, Objective::no_ion);
    };
    std::size_t best = 0;
    for (std::size_t i = 1; i < free.size(); ++i) {
      if (cost(free[i]) < cost(free[best])) best = i;
    }
    ion_of[next] = free[best];
    free.erase(free.begin() + static_cast<std::ptrdiff_t>(best));
    tell_neighbours(next);
  }
}

/// Exchanges two wires, or moves one to a free ion, as long as that helps.
void improve(Assignment& ion_of, const std::vector<std::uint32_t>& ions, const Objective& objective) {
  constexpr double least_gain = 1e-12;
  constexpr int most_rounds = 50;
  const auto wires = static_cast<std::uint32_t>(ion_of.size());
  std::vector<std::uint32_t> wire_on(ions.empty() ? 0 : ions.back() + 1, Objective::no_ion);
  for (std::uint32_t w = 0; w < wires; ++w) wire_on[ion_of[w]] = w;

  bool has_changed = true;
  for (int round = 0; has_changed && round < most_rounds; ++round) {
    has_changed = false;
    for (std::uint32_t a = 0; a < wires; ++a) {
      for (const std::uint32_t ion : ions) {
        const std::uint32_t from = ion_of[a];
        const std::uint32_t b = wire_on[ion];
        if (ion == from || (b != Objective::no_ion && b < a)) continue;
        // The pair (a, b) itself keeps its two ions and drops out of the difference.
        double gain = objective.of_wire(a, from, ion_of, b) - objective.of_wire(a, ion, ion_of, b);
        if (b != Objective::no_ion) {
          gain += objective.of_wire(b, ion, ion_of, a) - objective.of_wire(b, from, ion_of, a);
        }
        if (gain <= least_gain) continue;
        ion_of[a] = ion;
        wire_on[ion] = a;
        wire_on[from] = b;
        if (b != Objective::no_ion) ion_of[b] = from;
        has_changed = true;
      }
    }
  }
}

/// The results of all beginnings, the best first; of equal ones the earlier.
std::vector<Assignment> assignments(const std::vector<WireUse>& uses, const std::vector<std::uint32_t>& ions,
                                    const Objective& objective, const PlaceOptions& options) {
  std::vector<std::pair<double, Assignment>> found;
  const auto compete = [&](Assignment candidate) {
    improve(candidate, ions, objective);
    const double cost = objective.whole(candidate);
    found.emplace_back(cost, std::move(candidate));
  };
  const Assignment in_order(ions.begin(), ions.begin() + static_cast<std::ptrdiff_t>(uses.size()));
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
    for (const Seat& seat : seats_of(wire, *partner, ions, objective)) {
      if (begun >= std::max(options.starts / 2, 2u)) break;
      Assignment candidate(uses.size(), Objective::no_ion);
      candidate[wire] = seat.a;
      candidate[partner->wire] = seat.b;
      build_up(candidate, uses, ions, objective);
      compete(std::move(candidate));
      ++begun;
    }
  }
  std::mt19937_64 random(options.seed);
  for (; begun < options.starts; ++begun) {
    std::vector<std::uint32_t> shuffled = ions;
    for (std::size_t k = shuffled.size(); k > 1; --k) std::swap(shuffled[k - 1], shuffled[random() % k]);
    shuffled.resize(uses.size());
    compete(std::move(shuffled));
  }
  std::stable_sort(found.begin(), found.end(),
                   [](const auto& a, const auto& b) { return a.first < b.first - 1e-12; });
  std::vector<Assignment> list;
  for (auto& [cost, assignment] : found) list.push_back(std::move(assignment));
  return list;
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

}  // namespace

Placed place(const Circuit& circuit, const Target& target, const PlaceOptions& options) {
  std::vector<std::uint32_t> ions;
  for (std::uint32_t ion = 0; ion < target.ions; ++ion) {
    if (target.ion[ion].addressed) ions.push_back(ion);
  }
  if (circuit.wires > ions.size()) {
    throw Failure(Exit::target_cannot, fmt::format("the program needs {} ions, the machine {} has {}{}",
                                                   circuit.wires, target.name, ions.size(),
                                                   ions.size() < target.ions ? " that light reaches" : ""));
  }
  refuse_missing_abilities(circuit, target);
  if (target.pairs.empty()) {  // all pairs alike: everybody stays in the order of the source
    ions.resize(circuit.wires);
    return routed(circuit, target, Routes(target), ions);
  }
  const std::vector<WireUse> uses = uses_of(circuit);
  const Routes routes(target);
  const Objective objective(uses, target, routes);
  const auto list = assignments(uses, ions, objective, options);
  return routes.is_complete() ? routed(circuit, target, routes, list.front())
                              : best_routed(circuit, target, routes, list);
}

}  // namespace isinglass
