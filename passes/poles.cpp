// Poles of a wire; see poles.h.
#include "passes/poles.h"

#include <algorithm>
#include <limits>
#include <optional>

#include "passes/axis_form.h"

namespace isinglass {

namespace {

const Axis z_axis = Axis::UnitZ();

bool are_equal(const Axis& a, const Axis& b) {
  return (a - b).squaredNorm() < rounding * rounding;
}

/// A symbolic rotation is free where the pole lies along its axis and one pulse where it is perpendicular.
bool suits(const Need& need, const Axis& pole) {
  switch (need.what) {
    case Need::What::interaction:
      return are_perpendicular(need.axis, pole);
    case Need::What::rotation:
      return are_perpendicular(need.axis, pole) || are_parallel(need.axis, pole);
    case Need::What::end:
      return need.is_free || are_equal(need.axis, pole);
  }
  return false;
}

Axis nearest_perpendicular(const Axis& axis, const Axis& old) {
  const Axis unit = axis.normalized();
  const Axis flat = old - unit * unit.dot(old);
  // What is left of an axis that is nearly parallel is mostly rounding.
  if (flat.norm() < 1e-4) return unit.unitOrthogonal();
  return (flat - unit * unit.dot(flat)).normalized();  // again: the division has magnified what was left
}

/// For stretches of known angles: greedy over runs.
class PoleWalk {
 public:
  PoleWalk(std::span<const Need> needs, std::vector<Axis>& poles) : needs_(needs), poles_(poles) {}

  void walk() {
    Axis pole = z_axis;
    std::size_t next = extent(0, pole);
    settle(0, next, pole);
    while (next < needs_.size()) {
      const std::size_t first = next;
      pole = new_pole(first, pole, next);
      settle(first, next, pole);
    }
  }

 private:
  std::size_t extent(std::size_t first, const Axis& pole) const {
    while (first < needs_.size() && suits(needs_[first], pole)) ++first;
    return first;
  }

  void settle(std::size_t first, std::size_t last, const Axis& pole) {
    for (std::size_t i = first; i < last; ++i) poles_[needs_[i].place] = pole;
  }

  /// The pole after a pulse before needs_[first], such that the run it serves is longest; `next` = its end.
  Axis new_pole(std::size_t first, const Axis& old, std::size_t& next) const {
    const Need& need = needs_[first];
    std::optional<Axis> best;
    const auto offer = [&](const Axis& pole) {
      const std::size_t reach = extent(first, pole);
      if (reach > first && (!best || reach > next)) {
        best = pole;
        next = reach;
      }
      return reach;
    };
    next = first;
    if (need.what == Need::What::end) {
      offer(need.is_free ? old : need.axis);
      return *best;
    }
    // Of two opposite poles the nearer is taken unless only the other is what the end wants.
    const auto offer_both = [&](const Axis& axis) {
      const std::size_t reach = offer(axis.dot(old) < 0 ? Axis(-axis) : axis);
      if (reach == needs_.size() || needs_[reach].what != Need::What::end)
        return;  // the other does no better
      offer(axis.dot(old) < 0 ? axis : Axis(-axis));
    };
    if (need.what == Need::What::rotation) offer_both(need.axis);
    // The first need that is not parallel to this one spans a plane with it, or fixes the pole itself.
    std::size_t other = first + 1;
    while (other < needs_.size() && needs_[other].what != Need::What::end &&
           are_parallel(needs_[other].axis, need.axis)) {
      ++other;
    }
    if (other < needs_.size() && !needs_[other].is_free) {
      const Axis& axis = needs_[other].axis;
      if (needs_[other].what == Need::What::end) {
        offer(axis);
      } else {
        if (needs_[other].what == Need::What::rotation) offer_both(axis);
        offer_both(need.axis.cross(axis).normalized());
      }
    }
    const Axis nearest = nearest_perpendicular(need.axis, old);
    offer(nearest);
    if (best) return *best;
    next = first + 1;  // an axis that rounding has taken from unit length: as perpendicular as can be
    return nearest;
  }

  std::span<const Need> needs_;
  std::vector<Axis>& poles_;
};

/// For stretches with rotations by unknown angles: the fewest pulses over all ways through a set of poles a
/// need, by dynamic programming. The poles offered are those a greedy walk would find, those that are
/// perpendicular to two axes near by, the axes of rotations and the ends; all that the needs before have
/// found stay in the running.
class PoleSearch {
 public:
  PoleSearch(std::span<const Need> needs, std::vector<Axis>& poles) : needs_(needs), poles_(poles) {}

  void run() {
    Axis pole = z_axis;
    for (std::size_t first = 0; first < needs_.size(); first += most_at_once) {
      pole = settle(first, std::min(needs_.size(), first + most_at_once), pole);
    }
  }

 private:
  static constexpr std::size_t most_at_once = 500;  // needs that are decided together, for the memory's sake
  static constexpr std::size_t furthest = 32;       // needs ahead that are looked at
  static constexpr std::size_t most_ahead = 3;      // of which so many say something new
  static constexpr std::size_t most_states = 48;    // the cheapest are kept

  struct State {
    Axis pole;
    int pulses;          // so far
    std::size_t before;  // index in the layer before
  };

  /// Decides the needs from first to last, from that pole on; returns the pole in the end.
  Axis settle(std::size_t first, std::size_t last, const Axis& pole) {
    std::vector<std::vector<State>> layers = {{{pole, 0, 0}}};
    for (std::size_t i = first; i < last; ++i) layers.push_back(layer(i, layers.back()));
    std::size_t at = cheapest(layers.back());
    for (std::size_t i = last; i-- > first;) {
      const State& state = layers[i + 1 - first][at];
      poles_[needs_[i].place] = state.pole;
      at = state.before;
    }
    return poles_[needs_[last - 1].place];
  }

  static std::size_t cheapest(const std::vector<State>& layer) {
    return static_cast<std::size_t>(
        std::min_element(layer.begin(), layer.end(),
                         [](const State& a, const State& b) { return a.pulses < b.pulses; }) -
        layer.begin());
  }

  std::vector<State> layer(std::size_t i, const std::vector<State>& before) const {
    const std::size_t best = cheapest(before);
    std::vector<State> found;
    for (const Axis& pole : offers(i, before, before[best].pole)) {
      State state{pole, before[best].pulses + 1, best};
      for (std::size_t k = 0; k < before.size(); ++k) {
        const bool is_free = are_equal(before[k].pole, pole) || joins_on_the_way(i, before[k].pole, pole);
        if (is_free && before[k].pulses < state.pulses) state = {pole, before[k].pulses, k};
      }
      if (needs_[i].what == Need::What::rotation && !are_parallel(needs_[i].axis, pole)) ++state.pulses;
      found.push_back(state);
    }
    if (found.size() > most_states) {
      std::stable_sort(found.begin(), found.end(),
                       [](const State& a, const State& b) { return a.pulses < b.pulses; });
      found.resize(most_states);
    }
    return found;
  }

  /// Whether the pulse of a rotation just before or after the change takes it along.
  bool joins_on_the_way(std::size_t i, const Axis& from, const Axis& to) const {
    const auto takes = [&](const Need& need) {
      return need.what == Need::What::rotation && joins(need.axis, from, to);
    };
    return takes(needs_[i]) || (i > 0 && takes(needs_[i - 1]));
  }

  std::vector<Axis> offers(std::size_t i, const std::vector<State>& before, const Axis& old) const {
    const Need& need = needs_[i];
    std::vector<Axis> list;
    const auto offer = [&](const Axis& pole) {
      const bool is_known =
          std::any_of(list.begin(), list.end(), [&](const Axis& other) { return are_equal(other, pole); });
      if (!is_known && suits(need, pole)) list.push_back(pole);
    };
    const auto offer_both = [&](const Axis& pole) {
      offer(pole);
      offer(-pole);
    };
    for (const State& state : before) offer(state.pole);
    if (need.what == Need::What::end) {
      if (!need.is_free) offer(need.axis);
      return list;
    }
    if (need.what == Need::What::rotation) offer_both(need.axis);
    offer_both(nearest_perpendicular(need.axis, old));
    for (const Need* other : around(i)) {
      if (other->what != Need::What::interaction) offer_both(other->axis);
      offer_both(need.axis.cross(other->axis).normalized());
    }
    return list;
  }

  /// The next needs whose axes point elsewhere, and the last one.
  std::vector<const Need*> around(std::size_t i) const {
    std::vector<const Need*> list;
    const auto look_at = [&](const Need& other) {
      const auto is_along = [&](const Axis& axis) { return axis.cross(other.axis).norm() < 1e-6; };
      if (other.is_free || is_along(needs_[i].axis)) return;
      for (const Need* known : list) {
        if (known->what == other.what && is_along(known->axis)) return;
      }
      list.push_back(&other);
    };
    const std::size_t last = std::min(needs_.size(), i + furthest);
    for (std::size_t k = i + 1; k < last && list.size() < most_ahead; ++k) look_at(needs_[k]);
    if (i > 0) look_at(needs_[i - 1]);
    return list;
  }

  std::span<const Need> needs_;
  std::vector<Axis>& poles_;
};

}  // namespace

bool joins(const Axis& rotation, const Axis& from, const Axis& to) {
  return are_perpendicular(rotation, from) && are_perpendicular(rotation, to);
}

void choose_poles(std::span<const Need> needs, std::vector<Axis>& poles) {
  const bool is_known = std::none_of(needs.begin(), needs.end(),
                                     [](const Need& need) { return need.what == Need::What::rotation; });
  if (is_known) {
    PoleWalk(needs, poles).walk();
  } else {
    PoleSearch(needs, poles).run();
  }
}

}  // namespace isinglass
