// First a scan over detunings: at each one the kernels are built once and every pair asks for its pulse of
// least power. Each pair remembers its few best detunings; there the peak limit (and the robust angle) are
// imposed in full, best first. Pairs that mirror each other in the chain share their pulse.
#include "targets/pair_search.h"

#include <algorithm>
#include <atomic>
#include <cmath>
#include <limits>
#include <map>
#include <mutex>
#include <numbers>
#include <thread>

namespace isinglass {
namespace {

using std::numbers::pi;

constexpr double full_chi = pi / 4;
constexpr std::size_t kept = 4;           // candidates that a pair remembers
constexpr double points_per_width = 4;    // of the scan, in units of 1 / duration
constexpr double margin_in_widths = 2.5;  // scanned beyond the outermost modes

struct Candidate {
  std::size_t point = 0;  // of the scan
  double score = 0;       // estimated error: a lower bound until the limits are imposed
  double peak = 0;
};

bool better(const Candidate& a, const Candidate& b) {
  return a.score != b.score ? a.score < b.score : a.point < b.point;
}

void remember(std::vector<Candidate>& list, const Candidate& candidate) {
  list.insert(std::upper_bound(list.begin(), list.end(), candidate, better), candidate);
  if (list.size() > kept) list.pop_back();
}

// What one pair has seen in a scan.
struct Seen {
  double least_rms = std::numeric_limits<double>::infinity();
  std::vector<Candidate> any;     // reach the angle with an rms within the peak limit
  std::vector<Candidate> within;  // of those, whose least-power pulse keeps the limit already
  void merge(const Seen& other) {
    least_rms = std::min(least_rms, other.least_rms);
    for (const Candidate& c : other.any) remember(any, c);
    for (const Candidate& c : other.within) remember(within, c);
  }
  // Best first, each once.
  std::vector<Candidate> all() const {
    std::vector<Candidate> list = any;
    for (const Candidate& c : within) {
      const bool known =
          std::any_of(any.begin(), any.end(), [&](const Candidate& d) { return d.point == c.point; });
      if (!known) list.push_back(c);
    }
    std::sort(list.begin(), list.end(), better);
    return list;
  }
};

// Runs work(k, thread) for k = 0 to count - 1 on several threads.
template <typename Work>
void in_parallel(std::size_t count, int threads, const Work& work) {
  std::atomic<std::size_t> next{0};
  const auto run = [&](std::size_t thread) {
    for (std::size_t k = next++; k < count; k = next++) work(k, thread);
  };
  std::vector<std::thread> others;
  for (int t = 1; t < threads; ++t) others.emplace_back(run, static_cast<std::size_t>(t));
  run(0);
  for (std::thread& other : others) other.join();
}

class Search {
 public:
  Search(const Chain& chain, const Eigen::MatrixXd& eta, const LightLimits& limits, const Noise& noise,
         const std::vector<std::pair<int, int>>& pairs, int threads, const ReportProgress& progress)
      : modes_(chain.transverse_hz),
        eta_(eta),
        limits_(limits),
        noise_(noise),
        threads_(std::max(1, threads)),
        progress_(progress),
        pairs_(pairs) {}

  FoundLight run() {
    found_.light.resize(pairs_.size());
    for (std::size_t d = 0; d < limits_.durations.size(); ++d) {
      std::vector<std::size_t> open;
      for (std::size_t k = 0; k < pairs_.size(); ++k)
        if (!found_.light[k]) open.push_back(k);
      base_ = double(d) / double(limits_.durations.size());
      if (!open.empty()) try_duration(limits_.durations[d], open);
    }
    report(1, 1);
    return std::move(found_);
  }

 private:
  Eigen::VectorXd weight(std::size_t pair) const {
    const auto [a, b] = pairs_[pair];
    return eta_.row(a).cwiseProduct(eta_.row(b)).transpose();
  }

  std::vector<double> scan_points(double duration) const {
    if (limits_.detuning) return {*limits_.detuning};
    const double step = 1 / (points_per_width * duration);
    const double low = modes_[0] - margin_in_widths / duration;
    const double high = modes_[modes_.size() - 1] + margin_in_widths / duration;
    std::vector<double> points;
    for (double mu = std::max(low, step); mu <= high; mu += step) points.push_back(mu);
    return points;
  }

  // Leading orders of the errors that depend on the detuning; with a trace of power, so that among equals the
  // gentler light wins.
  double score(const PulseSpace& space, std::size_t pair, const Eigen::VectorXd& y,
               const Pulse& pulse) const {
    const auto [a, b] = pairs_[pair];
    const Eigen::VectorXd squares = (eta_.row(a).cwiseAbs2() + eta_.row(b).cwiseAbs2()).transpose();
    const double drift = 2 * pi * noise_.mode_drift_hz;
    double sum = 1e-9 * std::pow(pulse.rms() / limits_.peak_hz, 2);
    if (drift > 0) {
      sum += drift * drift * (2 * noise_.mean_phonons + 1) * squares.dot(space.loop_slope_squares(y));
      if (limits_.form.robust != Robust::motion_and_angle) {
        const double turn = drift * space.chi_slope(weight(pair), y);
        sum += turn * turn;
      }
    }
    if (noise_.heating_per_s > 0) sum += 2 * noise_.heating_per_s * squares.dot(space.rough_excursion(pulse));
    sum += 8 * noise_.scattering_per_pi_pulse * pulse.mean_absolute() * pulse.duration;
    return sum;
  }

  void look(const PulseSpace& space, std::size_t point, std::size_t pair, Seen& seen) const {
    PulseSpace::Best best = space.strongest_unchecked(weight(pair));
    if (best.chi == 0) return;
    best.y *= std::sqrt(full_chi / std::abs(best.chi));
    seen.least_rms = std::min(seen.least_rms, best.y.norm() / (2 * pi));
    if (best.y.norm() > 2 * pi * limits_.peak_hz) return;
    const Pulse pulse = space.pulse(best.y);
    const Candidate candidate{point, score(space, pair, best.y, pulse), pulse.peak()};
    remember(seen.any, candidate);
    if (candidate.peak <= limits_.peak_hz) remember(seen.within, candidate);
  }

  void try_duration(double duration, const std::vector<std::size_t>& open) {
    const std::vector<double> points = scan_points(duration);
    std::vector<std::vector<Seen>> seen(static_cast<std::size_t>(threads_), std::vector<Seen>(open.size()));
    std::atomic<std::size_t> done{0};
    in_parallel(points.size(), threads_, [&](std::size_t point, std::size_t thread) {
      const PulseSpace space(modes_, limits_.form, duration, points[point]);
      for (std::size_t k = 0; k < open.size(); ++k) look(space, point, open[k], seen[thread][k]);
      report(0.7 * double(++done), double(points.size()));
    });
    for (std::size_t t = 1; t < seen.size(); ++t)
      for (std::size_t k = 0; k < open.size(); ++k) seen[0][k].merge(seen[t][k]);
    for (std::size_t k = 0; k < open.size(); ++k)
      found_.least_rms_hz =
          k == 0 ? seen[0][k].least_rms : std::min(found_.least_rms_hz, seen[0][k].least_rms);
    settle(duration, points, open, seen[0]);
  }

  // Imposes all limits, a rank of candidates at a time, until each pair has its pulse or no candidate is left
  // that could be better.
  void settle(double duration, const std::vector<double>& points, const std::vector<std::size_t>& open,
              const std::vector<Seen>& seen) {
    struct State {
      std::vector<Candidate> list;
      double score = 0;
      std::optional<LitPair> lit;
    };
    std::vector<State> states(open.size());
    for (std::size_t k = 0; k < open.size(); ++k) states[k].list = seen[k].all();
    for (std::size_t rank = 0; rank < 2 * kept; ++rank) {
      std::map<std::size_t, std::vector<std::size_t>> at_point;
      for (std::size_t k = 0; k < open.size(); ++k) {
        const State& state = states[k];
        if (rank < state.list.size() && (!state.lit || state.list[rank].score < state.score))
          at_point[state.list[rank].point].push_back(k);
      }
      const std::vector<std::pair<std::size_t, std::vector<std::size_t>>> work(at_point.begin(),
                                                                               at_point.end());
      in_parallel(work.size(), threads_, [&](std::size_t w, std::size_t) {
        const PulseSpace space(modes_, limits_.form, duration, points[work[w].first]);
        for (const std::size_t k : work[w].second) {
          const auto best = space.gentlest(weight(open[k]), full_chi, limits_.peak_hz);
          if (!best) continue;
          const Pulse pulse = space.pulse(best->y);
          const double exact = score(space, open[k], best->y, pulse);
          if (!states[k].lit || exact < states[k].score) {
            states[k].score = exact;
            states[k].lit = finished(open[k], pulse);
          }
        }
      });
      report(0.7 + 0.3 * double(rank + 1) / (2 * kept), 1);
    }
    for (std::size_t k = 0; k < open.size(); ++k) found_.light[open[k]] = states[k].lit;
  }

  // Takes out what rounding has left in the angle, and finds which sign it has: theta = -2 chi.
  LitPair finished(std::size_t pair, Pulse pulse) const {
    const double chi = weight(pair).dot(response(pulse, modes_).area);
    pulse.rabi *= std::sqrt(full_chi / std::abs(chi));
    return {pairs_[pair].first, pairs_[pair].second, chi > 0, pulse};
  }

  void report(double part, double whole) {
    if (!progress_) return;
    const std::lock_guard lock(progress_lock_);
    progress_(std::min(1.0, base_ + part / whole / double(limits_.durations.size())));
  }

  const Eigen::VectorXd& modes_;
  const Eigen::MatrixXd& eta_;
  const LightLimits& limits_;
  const Noise& noise_;
  int threads_;
  const ReportProgress& progress_;
  std::mutex progress_lock_;
  double base_ = 0;
  std::vector<std::pair<int, int>> pairs_;
  FoundLight found_;
};

}  // namespace

bool can_close(const LightForm& form, int ions) {
  const int values = form.shape == Shape::steps ? form.segments : form.segments - 1;
  return (values + 1) / 2 > ions;
}

bool is_fully_robust(const LightForm& form, int ions) {
  const int values = form.shape == Shape::steps ? form.segments : form.segments - 1;
  return form.robust == Robust::none || (values + 1) / 2 > 2 * ions;
}

FoundLight find_light(const Chain& chain, const Eigen::MatrixXd& eta, const LightLimits& limits,
                      const Noise& noise, const std::vector<std::pair<int, int>>& pairs, int threads,
                      const ReportProgress& progress) {
  // Of two pairs that mirror each other one is solved.
  const int last = chain.ions() - 1;
  std::map<std::pair<int, int>, std::size_t> index;
  std::vector<std::pair<int, int>> solved;
  std::vector<std::size_t> place;
  for (auto [a, b] : pairs) {
    if (a > b) std::swap(a, b);
    const auto own = std::min(std::pair{a, b}, std::pair{last - b, last - a});
    const auto [entry, is_new] = index.try_emplace(own, solved.size());
    if (is_new) solved.push_back(own);
    place.push_back(entry->second);
  }
  const FoundLight once = Search(chain, eta, limits, noise, solved, threads, progress).run();
  FoundLight all{std::vector<std::optional<LitPair>>(pairs.size()), once.least_rms_hz};
  for (std::size_t k = 0; k < pairs.size(); ++k) {
    all.light[k] = once.light[place[k]];
    if (!all.light[k]) continue;
    all.light[k]->a = pairs[k].first;
    all.light[k]->b = pairs[k].second;
  }
  return all;
}

}  // namespace isinglass
