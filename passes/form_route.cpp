// See form_route.h.
#include "passes/form_route.h"

#include <algorithm>
#include <bit>
#include <cmath>
#include <limits>

namespace isinglass {

namespace {

using Additions = std::vector<Addition>;

constexpr Form bit(unsigned wire) {
  return Form{1} << wire;
}

/// How a form is written in the forms on the wires changes with them.
void follow(Form& form, Addition step) {
  form ^= (form >> step.to & 1) << step.from;
}

/// Additions that bring the form onto one wire.
int distance(Form form) {
  return form == 0 ? 0 : std::popcount(form) - 1;
}
int distance(const Stop& stop) {
  return distance(stop[0]) + distance(stop[1]) + distance(stop[2]);
}

void follow(FormTask& task, Addition step) {
  for (Stop& stop : task.stops) {
    for (Form& form : stop) follow(form, step);
  }
  for (Form& form : task.home) follow(form, step);
}

/// The potential: what a stop, and a form of the end, cost by their distance.
class Taste {
 public:
  explicit Taste(Dice& dice) : noise_(dice.real(0, 0.3)) {
    const double power = dice.real(0.3, 1.0), home_power = dice.real(0.5, 1.5);
    const double home = std::pow(10, dice.real(-2, 0));
    for (int d = 0; d <= farthest; ++d) {
      stop_[d] = std::pow(d, power);
      home_[d] = home * std::pow(d, home_power);
    }
  }
  double stop(int distance) const { return stop_[std::clamp(distance, 0, farthest)]; }
  double home(int distance) const { return home_[std::clamp(distance, 0, farthest)]; }
  /// A factor near 1 for each gain.
  double noise(Dice& dice) const { return 1 + noise_ * dice.real(-1, 1); }

 private:
  static constexpr int farthest = 40;  // beyond, all distances are alike
  std::array<double, farthest + 1> stop_{};
  std::array<double, farthest + 1> home_{};
  double noise_;
};

/// Tastes to draw from, since they take longer to make than short routes do.
class Tastes {
 public:
  explicit Tastes(Dice& dice) {
    for (int k = 0; k < 32; ++k) all_.emplace_back(dice);
  }
  const Taste& any(Dice& dice) const { return all_[dice.below(static_cast<unsigned>(all_.size()))]; }

 private:
  std::vector<Taste> all_;
};

/// One greedy route.
class Walk {
 public:
  Walk(FormTask task, const Taste& taste, Dice& dice)
      : task_(std::move(task)),
        taste_(taste),
        dice_(dice),
        near_(task_.wires),
        from_afar_(task_.wires),
        difference_(task_.wires * task_.wires) {
    forget_reached();
  }

  std::optional<Additions> run(std::size_t most) {
    Additions route;
    while (!is_home()) {
      if (route.size() >= most) return std::nullopt;
      weigh();
      const auto step = next(route);
      if (!step) {
        if (is_bound_) return std::nullopt;
        is_bound_ = true;
        continue;
      }
      route.push_back(*step);
      follow(task_, *step);
      const std::size_t before = task_.stops.size();
      forget_reached();
      if (task_.stops.size() != before || task_.stops.empty()) is_bound_ = false;
    }
    return route;
  }

 private:
  void forget_reached() {
    std::erase_if(task_.stops, [](const Stop& stop) { return distance(stop) == 0; });
  }
  bool is_home() const {
    return task_.stops.empty() &&
           std::all_of(task_.home.begin(), task_.home.end(), [](Form form) { return distance(form) == 0; });
  }

  /// How much each addition changes the potential. Nothing is gained from a wire that shares no form with the
  /// target, so only the others are listed, as differences from what such a wire would do.
  void weigh() {
    for (unsigned to = 0; to < task_.wires; ++to) {
      for (Form rest = near_[to]; rest != 0; rest &= rest - 1) difference(lowest(rest), to) = 0;
    }
    std::fill(near_.begin(), near_.end(), 0);
    std::fill(from_afar_.begin(), from_afar_.end(), 0.0);
    for (const Stop& stop : task_.stops) weigh(stop);
    const double scale = task_.stops.empty() ? 1 / taste_.home(1) : 1;
    for (const Form form : task_.home) {
      const int d = distance(form);
      const double further = scale * (taste_.home(d + 1) - taste_.home(d));
      const double nearer = scale * (taste_.home(d - 1) - taste_.home(d));
      for (Form rest = form; rest != 0; rest &= rest - 1) {
        const unsigned to = lowest(rest);
        from_afar_[to] += further;
        near_[to] |= form;
        for (Form other = form; other != 0; other &= other - 1) {
          difference(lowest(other), to) += nearer - further;
        }
      }
    }
  }

  void weigh(const Stop& stop) {
    const int d = distance(stop);
    std::array<double, 7> change;  // of the potential where the distance changes by -3 to 3
    for (int k = -3; k <= 3; ++k) change[k + 3] = taste_.stop(d + k) - taste_.stop(d);
    for (Form rest = stop[0] | stop[1] | stop[2]; rest != 0; rest &= rest - 1) {
      const unsigned to = lowest(rest);
      int affected = 0;
      Form once = 0, twice = 0, thrice = 0;  // wires in one, two, three of the affected forms
      for (const Form form : stop) {
        if ((form >> to & 1) == 0) continue;
        ++affected;
        thrice |= twice & form;
        twice |= once & form;
        once |= form;
      }
      from_afar_[to] += change[affected + 3];
      near_[to] |= once;
      for (Form other = once; other != 0; other &= other - 1) {
        const unsigned from = lowest(other);
        const int shared = 1 + static_cast<int>(twice >> from & 1) + static_cast<int>(thrice >> from & 1);
        difference(from, to) += change[affected - 2 * shared + 3] - change[affected + 3];
      }
    }
  }

  static unsigned lowest(Form form) { return static_cast<unsigned>(std::countr_zero(form)); }
  double& difference(unsigned from, unsigned to) { return difference_[to * task_.wires + from]; }

  /// The best addition; bound to the nearest stop, or row of the end, where nothing gains.
  std::optional<Addition> next(const Additions& route) {
    const Stop goal = is_bound_ ? nearest() : Stop{};
    double best = is_bound_ ? std::numeric_limits<double>::max() : -1e-9;
    std::optional<Addition> step;
    for (unsigned to = 0; to < task_.wires; ++to) {
      for (Form rest = near_[to] & ~bit(to); rest != 0; rest &= rest - 1) {
        const unsigned from = lowest(rest);
        const double gain = from_afar_[to] + difference(from, to);
        if (!is_bound_ && gain >= 0) continue;
        if (is_bound_ && !is_nearer(goal, {static_cast<std::uint8_t>(from), static_cast<std::uint8_t>(to)})) {
          continue;
        }
        if (!route.empty() && route.back().from == from && route.back().to == to) continue;
        const double weighed = gain * taste_.noise(dice_);
        if (weighed >= best) continue;
        best = weighed;
        step = Addition{static_cast<std::uint8_t>(from), static_cast<std::uint8_t>(to)};
      }
    }
    return step;
  }

  static bool is_nearer(Stop stop, Addition step) {
    const int before = distance(stop);
    for (Form& form : stop) follow(form, step);
    return distance(stop) < before;
  }

  Stop nearest() const {
    Stop best{};
    for (const Stop& stop : task_.stops) {
      if (distance(best) == 0 || distance(stop) < distance(best)) best = stop;
    }
    if (!task_.stops.empty()) return best;
    for (const Form form : task_.home) {
      if (distance(form) > 0 && (distance(best) == 0 || distance(form) < distance(best))) best = {form, 0, 0};
    }
    return best;
  }

  FormTask task_;
  const Taste& taste_;
  Dice& dice_;
  std::vector<Form> near_;          // by target: the wires that share a form with it
  std::vector<double> from_afar_;   // by target: the change if any other wire is added to it
  std::vector<double> difference_;  // by target and source near it
  bool is_bound_ = false;
};

std::vector<std::uint8_t> ends_of(std::vector<Form> home, const Additions& route) {
  std::vector<std::uint8_t> where;
  for (Form form : home) {
    for (const Addition step : route) follow(form, step);
    where.push_back(static_cast<std::uint8_t>(std::countr_zero(form)));
  }
  return where;
}

/// Cuts windows out of a route and solves them again.
class Improver {
 public:
  Improver(const FormTask& task, const FormRoutePlan& plan, const Tastes& tastes, Dice& dice)
      : task_(task), plan_(plan), tastes_(tastes), dice_(dice) {}

  Additions run(Additions route) {
    Additions best = route;
    for (unsigned k = 0; k < plan_.windows && route.size() >= least; ++k) {
      if (k % 64 == 0 && plan_.deadline <= std::chrono::steady_clock::now()) break;
      if (k > plan_.windows / 8 && 4 * best.size() > 5 * plan_.worth) break;  // windows rarely save so much
      heat_ = 0.01 + 1.0 * (1 - static_cast<double>(k) / plan_.windows);
      try_window(route);
      if (route.size() < best.size()) best = route;
    }
    return best;
  }

 private:
  static constexpr std::size_t least = 3;
  static constexpr unsigned longest = 40;

  void try_window(Additions& route) {
    const auto size = static_cast<unsigned>(route.size());
    const unsigned length =
        std::min(size, static_cast<unsigned>(least) + dice_.below(std::min(longest, size)));
    const unsigned from = dice_.below(size - length + 1);
    const FormTask window = cut(route, from, from + length);
    const unsigned slack = std::array{0u, 0u, 1u, 2u}[dice_.below(4)];
    const auto solved = Walk(window, tastes_.any(dice_), dice_).run(length + slack);
    if (!solved) return;
    const double longer = static_cast<double>(solved->size()) - length;
    if (longer > 0 && dice_.real() >= std::exp(-longer / heat_)) return;
    const auto where = ends_of(window.home, *solved);
    Additions next(route.begin(), route.begin() + from);
    next.insert(next.end(), solved->begin(), solved->end());
    for (unsigned k = from + length; k < size; ++k)
      next.push_back({where[route[k].from], where[route[k].to]});
    route = std::move(next);
  }

  /// The part of the task that additions [from, to) must do: the stops not reached before or after.
  FormTask cut(const Additions& route, unsigned from, unsigned to) const {
    FormTask window;
    window.wires = task_.wires;
    std::vector<Form> forms(task_.wires);  // on the wires, in those of the window's start
    for (unsigned w = 0; w < task_.wires; ++w) forms[w] = bit(w);
    for (unsigned k = from; k < to; ++k) forms[route[k].to] ^= forms[route[k].from];
    window.home = std::move(forms);
    for (const Stop& stop : task_.stops) {
      Stop now = stop, at_start = stop;
      bool is_reached = false;
      for (unsigned k = 0;; ++k) {
        if (k == from) at_start = now;
        is_reached = (k <= from || k >= to) && distance(now) == 0;
        if (is_reached || k == route.size()) break;
        for (Form& form : now) follow(form, route[k]);
      }
      if (!is_reached) window.stops.push_back(at_start);
    }
    return window;
  }

  const FormTask& task_;
  const FormRoutePlan& plan_;
  const Tastes& tastes_;
  Dice& dice_;
  double heat_ = 0;
};

}  // namespace

std::optional<FormRoute> find_form_route(const FormTask& task, const FormRoutePlan& plan, Dice& dice) {
  constexpr std::size_t most = 2000;
  const Tastes tastes(dice);
  std::optional<Additions> best;
  for (unsigned k = 0; k < plan.starts; ++k) {
    if (best && plan.deadline <= std::chrono::steady_clock::now()) break;
    auto route = Walk(task, tastes.any(dice), dice).run(best ? best->size() : most);
    if (route && (!best || route->size() < best->size())) best = std::move(route);
  }
  if (!best) return std::nullopt;
  FormRoute route;
  route.additions = Improver(task, plan, tastes, dice).run(std::move(*best));
  for (Stop stop : task.stops) {
    std::size_t k = 0;
    for (; distance(stop) > 0; ++k) {
      for (Form& form : stop) follow(form, route.additions[k]);
    }
    route.reached.push_back(k);
  }
  route.where = ends_of(task.home, route.additions);
  return route;
}

}  // namespace isinglass
