// First a scan over detunings: at each one the kernels are built once and every pair asks for its pulse of
// least power. Each pair looks closer around its few best valleys; there the peak limit (and the robust
// angle) are imposed in full, best first. Pairs that mirror each other in the chain share their pulse.
#include "targets/pair_search.h"

#include <algorithm>
#include <atomic>
#include <cmath>
#include <limits>
#include <map>
#include <mutex>
#include <numbers>
#include <numeric>
#include <thread>

namespace isinglass {
namespace {

using std::numbers::pi;

constexpr double full_chi = pi / 4;
constexpr double margin_in_widths = 2.5;  // scanned beyond the outermost modes; a width is 1 / duration
constexpr double points_per_width = 16;   // of the grid of detunings
constexpr std::size_t valleys_kept = 4;   // where a pair looks closer

// All pairs look at every so many points of the grid first: at all of them where that is cheap.
std::size_t first_stride(int ions) {
  return ions <= 12 ? 1 : ions <= 24 ? 2 : 4;
}

constexpr float unseen = std::numeric_limits<float>::quiet_NaN();
constexpr float out_of_reach = std::numeric_limits<float>::infinity();

// What a pair sees at one detuning: its pulse of least power.
struct Look {
  float rms = unseen;          // Hz
  float peak = out_of_reach;   // Hz
  float score = out_of_reach;  // estimated error: a lower bound until the limits are imposed
};

// The grid points where `value` of what was seen has its lowest valleys, at most `count`.
template <typename Value>
std::vector<std::size_t> valleys(const std::vector<Look>& looks, std::size_t count, const Value& value) {
  std::vector<std::pair<float, std::size_t>> seen, low;
  for (std::size_t p = 0; p < looks.size(); ++p)
    if (!std::isnan(looks[p].rms)) seen.emplace_back(value(looks[p]), p);
  for (std::size_t k = 0; k < seen.size(); ++k) {
    const float left = k == 0 ? out_of_reach : seen[k - 1].first;
    const float right = k + 1 == seen.size() ? out_of_reach : seen[k + 1].first;
    if (seen[k].first < out_of_reach && seen[k].first <= left && seen[k].first <= right)
      low.push_back(seen[k]);
  }
  std::sort(low.begin(), low.end());
  std::vector<std::size_t> points;
  for (std::size_t k = 0; k < std::min(count, low.size()); ++k) points.push_back(low[k].second);
  return points;
}

// Runs work(k) for k = 0 to count - 1 on several threads.
template <typename Work>
void in_parallel(std::size_t count, int threads, const Work& work) {
  std::atomic<std::size_t> next{0};
  const auto run = [&] {
    for (std::size_t k = next++; k < count; k = next++) work(k);
  };
  std::vector<std::thread> others;
  for (int t = 1; t < threads; ++t) others.emplace_back(run);
  run();
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
      share_ = 1 / double(limits_.durations.size());
      base_ = double(d) * share_;
      if (!open.empty()) try_duration(limits_.durations[d], open);
    }
    base_ = 0;
    share_ = 1;
    report(1);
    return std::move(found_);
  }

 private:
  Eigen::VectorXd weight(std::size_t pair) const {
    const auto [a, b] = pairs_[pair];
    return eta_.row(a).cwiseProduct(eta_.row(b)).transpose();
  }

  std::vector<double> grid_of(double duration) const {
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

  Look look(const PulseSpace& space, std::size_t pair) const {
    PulseSpace::Best best = space.strongest_unchecked(weight(pair));
    if (best.chi == 0) return {out_of_reach};
    best.y *= std::sqrt(full_chi / std::abs(best.chi));
    Look seen{float(best.y.norm() / (2 * pi))};
    if (best.y.norm() > 2 * pi * limits_.peak_hz) return seen;
    const Pulse pulse = space.pulse(best.y);
    seen.peak = float(pulse.peak());
    seen.score = float(score(space, pair, best.y, pulse));
    return seen;
  }

  // One duration: its grid of detunings, the pairs that still have no light, and what each has seen.
  struct Scan {
    double duration = 0;
    std::vector<double> grid;
    std::vector<std::size_t> open;
    std::vector<std::vector<Look>> looks;  // a row a pair, a column a grid point
  };
  // Which pairs (places in Scan::open) have work at which grid points.
  using Work = std::map<std::size_t, std::vector<std::size_t>>;

  // Where a pair may find its best pulse: valleys of the score, of the score among pulses that keep the peak
  // limit already, and of the peak; best first.
  std::vector<std::size_t> promising(const std::vector<Look>& looks) const {
    const auto score = [](const Look& seen) { return seen.score; };
    const auto score_within = [&](const Look& seen) {
      return seen.peak <= limits_.peak_hz ? seen.score : out_of_reach;
    };
    const auto peak = [](const Look& seen) { return seen.peak; };
    std::vector<std::size_t> points = valleys(looks, valleys_kept, score);
    for (const auto& more : {valleys(looks, valleys_kept, score_within), valleys(looks, valleys_kept, peak)})
      points.insert(points.end(), more.begin(), more.end());
    std::sort(points.begin(), points.end());
    points.erase(std::unique(points.begin(), points.end()), points.end());
    std::stable_sort(points.begin(), points.end(),
                     [&](std::size_t p, std::size_t q) { return looks[p].score < looks[q].score; });
    return points;
  }

  // Builds the kernels of each grid point once and calls act(space, k, point) for the pairs that want it. The
  // progress goes from `from` to `to`.
  template <typename Act>
  void at_points(const Scan& scan, const Work& work, double from, double to, const Act& act) {
    const std::vector<Work::value_type> list(work.begin(), work.end());
    std::atomic<std::size_t> done{0};
    in_parallel(list.size(), threads_, [&](std::size_t w) {
      const auto& [point, pairs] = list[w];
      const PulseSpace space(modes_, limits_.form, scan.duration, scan.grid[point]);
      for (const std::size_t k : pairs) act(space, k, point);
      report(from + (to - from) * double(++done) / double(list.size()));
    });
  }

  void try_duration(double duration, const std::vector<std::size_t>& open) {
    Scan scan{duration, grid_of(duration), open, {}};
    scan.looks.assign(open.size(), std::vector<Look>(scan.grid.size()));
    const auto see = [&](const PulseSpace& space, std::size_t k, std::size_t point) {
      scan.looks[k][point] = look(space, open[k]);
    };
    std::vector<std::size_t> everyone(open.size());
    std::iota(everyone.begin(), everyone.end(), 0);
    Work work;
    const std::size_t first = first_stride(static_cast<int>(modes_.size()));
    for (std::size_t point = 0; point < scan.grid.size(); point += first) work[point] = everyone;
    at_points(scan, work, 0, 0.5, see);
    for (std::size_t stride = first / 2; stride > 0; stride /= 2)
      at_points(scan, closer(scan, stride), stride > 1 ? 0.5 : 0.6, stride > 1 ? 0.6 : 0.7, see);

    found_.least_rms_hz = std::numeric_limits<double>::infinity();
    for (const std::vector<Look>& looks : scan.looks)
      for (const Look& seen : looks)
        if (seen.rms < found_.least_rms_hz) found_.least_rms_hz = double(seen.rms);
    settle(scan);
  }

  // The points on both sides of each pair's valleys that it has not seen yet.
  Work closer(const Scan& scan, std::size_t stride) const {
    Work work;
    for (std::size_t k = 0; k < scan.open.size(); ++k) {
      std::vector<std::size_t> points;
      for (const std::size_t valley : promising(scan.looks[k])) {
        if (valley >= stride) points.push_back(valley - stride);
        points.push_back(valley + stride);
      }
      std::sort(points.begin(), points.end());
      points.erase(std::unique(points.begin(), points.end()), points.end());
      for (const std::size_t point : points)
        if (point < scan.grid.size() && std::isnan(scan.looks[k][point].rms)) work[point].push_back(k);
    }
    return work;
  }

  // Imposes all limits, a rank of candidates at a time, until each pair has its pulse or no candidate is left
  // that could be better.
  void settle(const Scan& scan) {
    constexpr std::size_t ranks = 3 * valleys_kept;
    struct State {
      std::vector<std::size_t> points;
      double score = 0;
      std::optional<LitPair> lit;
    };
    std::vector<State> states(scan.open.size());
    for (std::size_t k = 0; k < states.size(); ++k) states[k].points = promising(scan.looks[k]);
    for (std::size_t rank = 0; rank < ranks; ++rank) {
      Work work;
      for (std::size_t k = 0; k < states.size(); ++k) {
        const State& state = states[k];
        if (rank >= state.points.size()) continue;
        const std::size_t point = state.points[rank];
        if (!state.lit || double(scan.looks[k][point].score) < state.score) work[point].push_back(k);
      }
      at_points(scan, work, 0.7 + 0.3 * double(rank) / ranks, 0.7 + 0.3 * double(rank + 1) / ranks,
                [&](const PulseSpace& space, std::size_t k, std::size_t) {
                  const std::size_t pair = scan.open[k];
                  const auto best = space.gentlest(weight(pair), full_chi, limits_.peak_hz);
                  if (!best) return;
                  const Pulse pulse = space.pulse(best->y);
                  const double exact = score(space, pair, best->y, pulse);
                  if (states[k].lit && exact >= states[k].score) return;
                  states[k].score = exact;
                  states[k].lit = finished(pair, pulse);
                });
    }
    for (std::size_t k = 0; k < states.size(); ++k) found_.light[scan.open[k]] = states[k].lit;
  }

  // Takes out what rounding has left in the angle, and finds which sign it has: theta = -2 chi.
  LitPair finished(std::size_t pair, Pulse pulse) const {
    const double chi = weight(pair).dot(response(pulse, modes_).area);
    pulse.rabi *= std::sqrt(full_chi / std::abs(chi));
    return {pairs_[pair].first, pairs_[pair].second, chi > 0, pulse};
  }

  // part: of the present duration, 0 to 1.
  void report(double part) {
    if (!progress_) return;
    const std::lock_guard lock(progress_lock_);
    progress_(std::min(1.0, base_ + part * share_));
  }

  const Eigen::VectorXd& modes_;
  const Eigen::MatrixXd& eta_;
  const LightLimits& limits_;
  const Noise& noise_;
  int threads_;
  const ReportProgress& progress_;
  std::mutex progress_lock_;
  double base_ = 0;   // done before the present duration, of all
  double share_ = 1;  // the present duration's part
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
