// Everything is assembled from integrals over single segments. Each needs only the frequencies mu + w and mu
// - w and the segment's starting phase, so one set of kernels serves all pairs of the chain.
#include "targets/pulses.h"

#include <array>
#include <cmath>
#include <complex>
#include <numbers>

#include "targets/moments.h"
#include "targets/peak_limit.h"

namespace isinglass {
namespace {

using Complex = std::complex<double>;
using std::numbers::pi;

// Rows of the closure conditions whose singular value lies below this part of the largest one depend on the
// others to within rounding and are dropped.
constexpr double rank_cutoff = 1e-13;

// e^{i x} for large x: the extended type keeps the phase good to 1e-16.
std::complex<long double> turn(long double x) {
  return {std::cos(x), std::sin(x)};
}

// The segments of a pulse seen by one mode, times counted from the middle.
class SegmentView {
 public:
  SegmentView(double mode_hz, double detuning_hz, double duration, int segments)
      : length_(duration / segments), segments_(segments) {
    constexpr long double two_pi = 2 * std::numbers::pi_v<long double>;
    frequency_[0] = two_pi * (static_cast<long double>(mode_hz) + detuning_hz);
    frequency_[1] = two_pi * (static_cast<long double>(mode_hz) - detuning_hz);
    step_ = static_cast<long double>(duration) / segments;
    for (int a = 0; a < 2; ++a) {
      angle_[a] = double(frequency_[a] * step_);
      moments_[a] = moments(angle_[a]);
    }
    phases_.resize(static_cast<std::size_t>(segments));
    for (int a = 0; a < 2; ++a) {
      // Each phase from the one before: the extended type loses less than 1e-16 over a thousand segments.
      std::complex<long double> phase = 0.5L * turn(-0.5L * segments * frequency_[a] * step_);
      const std::complex<long double> onward = turn(frequency_[a] * step_);
      for (std::array<Complex, 2>& entry : phases_) {
        entry[a] = {double(phase.real()), double(phase.imag())};
        phase = {phase.real() * onward.real() - phase.imag() * onward.imag(),
                 phase.real() * onward.imag() + phase.imag() * onward.real()};
      }
    }
  }

  double length() const { return length_; }
  double start(int s) const { return double((s - 0.5L * segments_) * step_); }

  // e^{i f t} / 2 at the start of segment s for the two frequencies w + mu and w - mu.
  const std::array<Complex, 2>& phases(int s) const { return phases_[static_cast<std::size_t>(s)]; }

  // int over the segment of u^n cos(mu t) e^{i w t} dt, u from 0 to 1 along the segment, n = 0 to 2.
  std::array<Complex, 3> integrals(const std::array<Complex, 2>& phase) const {
    std::array<Complex, 3> a;
    for (std::size_t n = 0; n < 3; ++n)
      a[n] = length_ * (phase[0] * moments_[0][n] + phase[1] * moments_[1][n]);
    return a;
  }

  // The same from the segment's start to its part x, n = 0 to 1; `partial` holds moments(angle * x).
  std::array<Complex, 2> partial_integrals(const std::array<Complex, 2>& phase, double x,
                                           const std::array<Moments, 2>& partial) const {
    return {length_ * x * (phase[0] * partial[0][0] + phase[1] * partial[1][0]),
            length_ * x * x * (phase[0] * partial[0][1] + phase[1] * partial[1][1])};
  }
  std::array<Moments, 2> partial_moments(double x) const {
    return {moments(angle_[0] * x), moments(angle_[1] * x)};
  }

  // For the ordered integrals within one segment.
  void prepare_ordered() {
    for (std::size_t a = 0; a < 2; ++a)
      for (std::size_t b = 0; b < 2; ++b) ordered_[a][b] = isinglass::ordered_moments(angle_[a], angle_[b]);
  }
  // int int_{t' < t} u^n u'^m cos(mu t) cos(mu t') e^{i w (t - t')} dt dt' over the segment.
  OrderedMoments ordered(const std::array<Complex, 2>& phase) const {
    OrderedMoments sum{};
    for (std::size_t a = 0; a < 2; ++a) {
      for (std::size_t b = 0; b < 2; ++b) {
        const Complex factor = length_ * length_ * phase[a] * std::conj(phase[b]);
        for (std::size_t n = 0; n < 3; ++n)
          for (std::size_t m = 0; m < 3; ++m) sum[n][m] += factor * ordered_[a][b][n][m];
      }
    }
    return sum;
  }

 private:
  double length_;
  int segments_;
  long double step_;
  std::array<long double, 2> frequency_;
  std::vector<std::array<Complex, 2>> phases_;
  std::array<double, 2> angle_;
  std::array<Moments, 2> moments_;
  std::array<std::array<OrderedMoments, 2>, 2> ordered_{};
};

// Amplitude along a segment: from + slope * u.
struct Line {
  double from;
  double slope;
};

Line line_of(const Pulse& pulse, int segment) {
  const double omega = 2 * pi * pulse.rabi[segment];
  if (pulse.shape == Shape::steps) return {omega, 0};
  return {omega, 2 * pi * pulse.rabi[segment + 1] - omega};
}

int segments_of(const Pulse& pulse) {
  return static_cast<int>(pulse.rabi.size()) - (pulse.shape == Shape::ramps ? 1 : 0);
}

// One basis function on one segment: on unknown `index`, with value from + slope * u.
struct LocalFunction {
  Eigen::Index index;
  Line line;
};

enum class Parity { even, odd };

// The pulses of a form that are even or odd about their middle: unknowns are the values of the first half.
class Unknowns {
 public:
  Unknowns(const LightForm& form, Parity parity) : form_(form), sign_(parity == Parity::even ? 1 : -1) {
    values_ = form.shape == Shape::steps ? form.segments : form.segments - 1;
    count_ = parity == Parity::even ? (values_ + 1) / 2 : values_ / 2;
  }
  Eigen::Index count() const { return count_; }

  // The basis functions that live on segment s; `used` of the two entries are valid.
  std::array<LocalFunction, 2> on_segment(int s, int& used) const {
    std::array<LocalFunction, 2> local{};
    used = 0;
    const auto add = [&](int value, Line line) {
      const Eigen::Index index = folded(value);
      if (value < 0 || value >= values_ || index >= count_) return;  // an end, or the middle of an odd pulse
      const double sign = sign_of(value);
      local[static_cast<std::size_t>(used++)] = {index, {sign * line.from, sign * line.slope}};
    };
    if (form_.shape == Shape::steps) {
      add(s, {1, 0});
    } else {
      add(s - 1, {1, -1});
      add(s, {0, 1});
    }
    return local;
  }

  // Time mean of Omega^2 as a quadratic form.
  Eigen::MatrixXd power() const {
    Eigen::MatrixXd matrix = Eigen::MatrixXd::Zero(count_, count_);
    for (int s = 0; s < form_.segments; ++s) {
      int used = 0;
      const auto local = on_segment(s, used);
      for (int a = 0; a < used; ++a) {
        for (int b = 0; b < used; ++b) {
          const auto& [i, f] = local[static_cast<std::size_t>(a)];
          const auto& [k, g] = local[static_cast<std::size_t>(b)];
          matrix(i, k) += f.from * g.from + (f.from * g.slope + f.slope * g.from) / 2 + f.slope * g.slope / 3;
        }
      }
    }
    return matrix / form_.segments;
  }

  // From the unknowns to all steps, or to all knots with the zeros at the ends.
  Eigen::MatrixXd unfold() const {
    const int shift = form_.shape == Shape::ramps ? 1 : 0;
    Eigen::MatrixXd matrix = Eigen::MatrixXd::Zero(values_ + 2 * shift, count_);
    for (int k = 0; k < values_; ++k) {
      if (folded(k) < count_) matrix(k + shift, folded(k)) = sign_of(k);
    }
    return matrix;
  }

 private:
  Eigen::Index folded(int k) const { return std::min(k, values_ - 1 - k); }

  double sign_of(int k) const { return 2 * k < values_ ? 1 : sign_; }

  LightForm form_;
  double sign_;
  int values_;
  Eigen::Index count_;
};

// What the unknowns do to one mode.
struct ModeKernel {
  Eigen::VectorXd loop;        // real for even pulses, imaginary (the i left out) for odd ones
  Eigen::VectorXd loop_slope;  // derivative in w
  Eigen::MatrixXd area;        // quadratic form
  Eigen::MatrixXd area_slope;
};

ModeKernel mode_kernel(double mode_hz, const Unknowns& unknowns, const LightForm& form, double duration,
                       double detuning, Parity parity) {
  SegmentView view(mode_hz, detuning, duration, form.segments);
  view.prepare_ordered();
  const Eigen::Index n = unknowns.count();
  Eigen::VectorXcd sum = Eigen::VectorXcd::Zero(n);        // int f cos(mu t) e^{i w t} so far
  Eigen::VectorXcd slope_sum = Eigen::VectorXcd::Zero(n);  // with another factor t
  Eigen::MatrixXd area = Eigen::MatrixXd::Zero(n, n);
  Eigen::MatrixXd area_slope = Eigen::MatrixXd::Zero(n, n);
  const double h = view.length();
  for (int s = 0; s < form.segments; ++s) {
    const auto phase = view.phases(s);
    const auto a = view.integrals(phase);
    const OrderedMoments w = view.ordered(phase);
    const double start = view.start(s);
    int used = 0;
    const auto local = unknowns.on_segment(s, used);
    std::array<Complex, 2> whole{}, moment{};
    for (std::size_t k = 0; k < static_cast<std::size_t>(used); ++k) {
      const auto& [index, f] = local[k];
      whole[k] = f.from * a[0] + f.slope * a[1];
      moment[k] = start * whole[k] + h * (f.from * a[1] + f.slope * a[2]);
      // Against all earlier segments: Im(a conj(sum)), and for the slope Re((t - t') e^{i w (t - t')}).
      area.col(index) += whole[k].imag() * sum.real() - whole[k].real() * sum.imag();
      area_slope.col(index) += moment[k].real() * sum.real() + moment[k].imag() * sum.imag() -
                               whole[k].real() * slope_sum.real() - whole[k].imag() * slope_sum.imag();
      for (std::size_t l = 0; l < static_cast<std::size_t>(used); ++l) {
        const auto& [other, g] = local[l];
        // f(u) g(u') u^p u'^q against e^{i w (t - t')}.
        const auto within = [&](std::size_t p, std::size_t q) {
          return f.from * g.from * w[p][q] + f.slope * g.from * w[p + 1][q] + f.from * g.slope * w[p][q + 1] +
                 f.slope * g.slope * w[p + 1][q + 1];
        };
        area(other, index) += within(0, 0).imag();
        area_slope(other, index) += h * (within(1, 0) - within(0, 1)).real();
      }
    }
    for (std::size_t k = 0; k < static_cast<std::size_t>(used); ++k) {
      sum[local[k].index] += whole[k];
      slope_sum[local[k].index] += moment[k];
    }
  }
  ModeKernel kernel;
  if (parity == Parity::even) {
    kernel.loop = sum.real();
    kernel.loop_slope = -slope_sum.imag();
  } else {
    kernel.loop = sum.imag();
    kernel.loop_slope = slope_sum.real();
  }
  kernel.area = area + area.transpose();
  kernel.area_slope = area_slope + area_slope.transpose();
  return kernel;
}

// Singular value decomposition of normalized rows: columns of V in the order of falling singular values, and
// how many of these are above rounding.
struct Conditions {
  Eigen::MatrixXd v;
  Eigen::Index rank = 0;
  Eigen::MatrixXd free() const { return v.rightCols(v.cols() - rank); }
};

Conditions conditions(Eigen::MatrixXd rows) {
  rows.rowwise().normalize();
  const Eigen::JacobiSVD<Eigen::MatrixXd> svd(rows, Eigen::ComputeFullV);
  const auto& values = svd.singularValues();
  Conditions found{svd.matrixV(), 0};
  while (found.rank < values.size() && values[found.rank] > rank_cutoff * values[0]) ++found.rank;
  return found;
}

// Columns: an orthonormal basis of the vectors on which all loops vanish and, when asked, all their slopes.
Eigen::MatrixXd closed_space(const Eigen::MatrixXd& loops, const Eigen::MatrixXd& slopes, bool robust) {
  if (!robust) return conditions(loops).free();
  Eigen::MatrixXd all(2 * loops.rows(), loops.cols());
  all << loops, slopes;
  const Eigen::MatrixXd both = conditions(all).free();
  if (both.cols() > 0) return both;
  // Too few segments for all slopes: of the closed pulses those with the smallest slopes.
  const Eigen::MatrixXd closed = conditions(loops).free();
  if (closed.cols() == 0) return closed;
  const Eigen::Index some = std::min(closed.cols(), std::max<Eigen::Index>(1, loops.rows() / 3));
  const Eigen::JacobiSVD<Eigen::MatrixXd> svd(slopes * closed, Eigen::ComputeFullV);
  return closed * svd.matrixV().rightCols(some);
}

}  // namespace

double Pulse::phase() const {
  constexpr long double half_turn = std::numbers::pi_v<long double>;
  const long double phi = half_turn * (0.5L - static_cast<long double>(detuning) * duration);
  const long double wrapped = phi - 2 * half_turn * std::round(phi / (2 * half_turn));
  return double(wrapped <= -half_turn ? half_turn : wrapped);
}

double Pulse::peak() const {
  return rabi.cwiseAbs().maxCoeff();
}

double Pulse::rms() const {
  const int segments = segments_of(*this);
  double sum = 0;
  for (int s = 0; s < segments; ++s) {
    const auto [f, g] = line_of(*this, s);
    sum += f * f + f * g + g * g / 3;
  }
  return std::sqrt(sum / segments) / (2 * pi);
}

double Pulse::mean_absolute() const {
  const int segments = segments_of(*this);
  double sum = 0;
  for (int s = 0; s < segments; ++s) {
    const auto [f, g] = line_of(*this, s);
    const double end = f + g;
    sum += f * end >= 0 ? std::abs(f + end) / 2 : (f * f + end * end) / (2 * std::abs(g));
  }
  return sum / segments / (2 * pi);
}

double Pulse::at(double time) const {
  const int segments = segments_of(*this);
  const double place = std::clamp(time / duration * segments, 0.0, double(segments));
  const int s = std::min(static_cast<int>(place), segments - 1);
  const auto [f, g] = line_of(*this, s);
  return (f + g * (place - s)) / (2 * pi);
}

Response response(const Pulse& pulse, const Eigen::VectorXd& mode_hz) {
  const int segments = segments_of(pulse);
  Response result{Eigen::VectorXcd(mode_hz.size()), Eigen::VectorXd(mode_hz.size())};
  for (Eigen::Index m = 0; m < mode_hz.size(); ++m) {
    SegmentView view(mode_hz[m], pulse.detuning, pulse.duration, segments);
    view.prepare_ordered();
    Complex loop = 0;
    double area = 0;
    for (int s = 0; s < segments; ++s) {
      const auto phase = view.phases(s);
      const auto a = view.integrals(phase);
      const OrderedMoments w = view.ordered(phase);
      const auto [f, g] = line_of(pulse, s);
      const Complex here = f * a[0] + g * a[1];
      area += (here * std::conj(loop)).imag();
      area += (f * f * w[0][0] + f * g * (w[1][0] + w[0][1]) + g * g * w[1][1]).imag();
      loop += here;
    }
    result.loop[m] = loop;
    result.area[m] = 2 * area;
  }
  return result;
}

Eigen::VectorXd excursion(const Pulse& pulse, const Eigen::VectorXd& mode_hz) {
  const int segments = segments_of(pulse);
  Eigen::VectorXd result(mode_hz.size());
  for (Eigen::Index m = 0; m < mode_hz.size(); ++m) {
    const SegmentView view(mode_hz[m], pulse.detuning, pulse.duration, segments);
    std::array<std::array<Moments, 2>, 16> partial;
    for (std::size_t k = 0; k < 16; ++k) partial[k] = view.partial_moments(gauss_rule()[k].at);
    Complex loop = 0;
    double sum = 0;
    for (int s = 0; s < segments; ++s) {
      const auto phase = view.phases(s);
      const auto [f, g] = line_of(pulse, s);
      for (std::size_t k = 0; k < 16; ++k) {
        const auto [x, weight] = gauss_rule()[k];
        const auto a = view.partial_integrals(phase, x, partial[k]);
        sum += weight * std::norm(loop + f * a[0] + g * a[1]);
      }
      const auto a = view.integrals(phase);
      loop += f * a[0] + g * a[1];
    }
    result[m] = sum * view.length();
  }
  return result;
}

Eigen::MatrixXcd paths(const Pulse& pulse, const Eigen::VectorXd& mode_hz, const std::vector<double>& times) {
  const int segments = segments_of(pulse);
  Eigen::MatrixXcd result(static_cast<Eigen::Index>(times.size()), mode_hz.size());
  for (Eigen::Index m = 0; m < mode_hz.size(); ++m) {
    const SegmentView view(mode_hz[m], pulse.detuning, pulse.duration, segments);
    std::vector<Complex> before(static_cast<std::size_t>(segments) + 1);
    for (int s = 0; s < segments; ++s) {
      const auto a = view.integrals(view.phases(s));
      const auto [f, g] = line_of(pulse, s);
      before[static_cast<std::size_t>(s) + 1] = before[static_cast<std::size_t>(s)] + f * a[0] + g * a[1];
    }
    for (std::size_t k = 0; k < times.size(); ++k) {
      const double place = std::clamp(times[k] / pulse.duration * segments, 0.0, double(segments));
      const int s = std::min(static_cast<int>(place), segments - 1);
      const double x = place - s;
      const auto a = view.partial_integrals(view.phases(s), x, view.partial_moments(x));
      const auto [f, g] = line_of(pulse, s);
      result(static_cast<Eigen::Index>(k), m) = before[static_cast<std::size_t>(s)] + f * a[0] + g * a[1];
    }
  }
  return result;
}

PulseSpace::PulseSpace(const Eigen::VectorXd& mode_hz, const LightForm& form, double duration,
                       double detuning)
    : form_(form), duration_(duration), detuning_(detuning) {
  const Eigen::Index modes = mode_hz.size();
  for (Eigen::MatrixXcd& table : segment_integrals_) table.resize(modes, form.segments);
  for (Eigen::Index m = 0; m < modes; ++m) {
    const SegmentView view(mode_hz[m], detuning, duration, form.segments);
    for (int s = 0; s < form.segments; ++s) {
      const auto a = view.integrals(view.phases(s));
      segment_integrals_[0](m, s) = a[0];
      segment_integrals_[1](m, s) = a[1];
    }
  }
  for (const Parity parity : {Parity::even, Parity::odd}) {
    const Unknowns unknowns(form, parity);
    if (unknowns.count() == 0) continue;
    std::vector<ModeKernel> kernels;
    for (Eigen::Index m = 0; m < modes; ++m)
      kernels.push_back(mode_kernel(mode_hz[m], unknowns, form, duration, detuning, parity));

    // Unknowns scaled so that their square sum is the mean power: x = scale * z.
    const Eigen::LLT<Eigen::MatrixXd> cholesky(unknowns.power());
    const Eigen::MatrixXd scale =
        cholesky.matrixU().solve(Eigen::MatrixXd::Identity(unknowns.count(), unknowns.count()));
    Eigen::MatrixXd loops(modes, unknowns.count());
    Eigen::MatrixXd slopes(modes, unknowns.count());
    for (Eigen::Index m = 0; m < modes; ++m) {
      const ModeKernel& kernel = kernels[static_cast<std::size_t>(m)];
      loops.row(m) = kernel.loop.transpose() * scale;
      slopes.row(m) = kernel.loop_slope.transpose() * scale;
    }
    const Eigen::MatrixXd free = closed_space(loops, slopes, form.robust != Robust::none);
    const Eigen::MatrixXd basis = scale * free;
    Part& part = parts_[static_cast<std::size_t>(parity)];
    const Eigen::Index d = basis.cols();
    part.knots = unknowns.unfold() * basis;
    part.loop_slope = slopes * free;
    part.area.resize(d * d, modes);
    part.area_slope.resize(d * d, modes);
    for (Eigen::Index m = 0; m < modes; ++m) {
      const ModeKernel& kernel = kernels[static_cast<std::size_t>(m)];
      const Eigen::MatrixXd area = basis.transpose() * kernel.area * basis;
      part.area.col(m) = area.reshaped();
      const Eigen::MatrixXd area_slope = basis.transpose() * kernel.area_slope * basis;
      part.area_slope.col(m) = area_slope.reshaped();
    }
  }
}

Eigen::MatrixXd PulseSpace::form_of(const Eigen::MatrixXd& table, const Eigen::VectorXd& weight) {
  const Eigen::VectorXd flat = table * weight;
  const auto size = static_cast<Eigen::Index>(std::lround(std::sqrt(double(flat.size()))));
  return flat.reshaped(size, size);
}

PulseSpace::Best PulseSpace::strongest(const Eigen::VectorXd& weight, bool with_angle) const {
  Best best{Eigen::VectorXd::Zero(dimension()), 0};
  for (Eigen::Index start = 0; const Part& part : parts_) {
    const Eigen::Index d = part.knots.cols();
    if (d > 0) {
      const Eigen::MatrixXd form = form_of(part.area, weight);
      const Extreme own =
          with_angle ? largest_where_still(form, form_of(part.area_slope, weight)) : largest(form);
      if (std::abs(own.value) > std::abs(best.chi)) {
        best.y.setZero();
        best.y.segment(start, d) = own.y;
        best.chi = own.value;
      }
    }
    start += d;
  }
  return best;
}

PulseSpace::Best PulseSpace::strongest(const Eigen::VectorXd& weight) const {
  return strongest(weight, form_.robust == Robust::motion_and_angle);
}

PulseSpace::Best PulseSpace::strongest_unchecked(const Eigen::VectorXd& weight) const {
  return strongest(weight, false);
}

std::optional<PulseSpace::Best> PulseSpace::gentlest(const Eigen::VectorXd& weight, double chi,
                                                     double peak_hz) const {
  const Best unit = strongest(weight);
  if (unit.chi == 0) return std::nullopt;
  const double scale = std::sqrt(chi / std::abs(unit.chi));
  const Eigen::VectorXd free = unit.y * scale;
  const double limit = 2 * pi * peak_hz;
  if (free.norm() > limit) return std::nullopt;  // the peak is no less than the root mean square
  if (pulse(free).peak() <= peak_hz) return Best{free, unit.chi * scale * scale};

  PeakProblem problem{joined_knots(), joined_form(&Part::area, weight), {}, chi, limit};
  if (form_.robust == Robust::motion_and_angle) problem.still = joined_form(&Part::area_slope, weight);
  const auto y = gentlest_under_peak(problem, free);
  if (!y) return std::nullopt;
  return Best{*y, y->dot(problem.form * *y)};
}

Eigen::MatrixXd PulseSpace::joined_knots() const {
  Eigen::MatrixXd knots(std::max(parts_[0].knots.rows(), parts_[1].knots.rows()), dimension());
  Eigen::Index start = 0;
  for (const Part& part : parts_) {
    if (part.knots.cols() > 0) knots.middleCols(start, part.knots.cols()) = part.knots;
    start += part.knots.cols();
  }
  return knots;
}

Eigen::MatrixXd PulseSpace::joined_form(Eigen::MatrixXd Part::*table, const Eigen::VectorXd& weight) const {
  Eigen::MatrixXd form = Eigen::MatrixXd::Zero(dimension(), dimension());
  Eigen::Index start = 0;
  for (const Part& part : parts_) {
    const Eigen::Index d = part.knots.cols();
    if (d > 0) form.block(start, start, d, d) = form_of(part.*table, weight);
    start += d;
  }
  return form;
}

Eigen::VectorXd PulseSpace::loop_slope_squares(const Eigen::VectorXd& y) const {
  const Eigen::Index even = parts_[0].knots.cols();
  Eigen::VectorXd sum =
      Eigen::VectorXd::Zero(std::max(parts_[0].loop_slope.rows(), parts_[1].loop_slope.rows()));
  if (even > 0) sum += (parts_[0].loop_slope * y.head(even)).cwiseAbs2();
  if (y.size() > even) sum += (parts_[1].loop_slope * y.tail(y.size() - even)).cwiseAbs2();
  return sum;
}

double PulseSpace::chi_slope(const Eigen::VectorXd& weight, const Eigen::VectorXd& y) const {
  double sum = 0;
  for (Eigen::Index start = 0; const Part& part : parts_) {
    const Eigen::Index d = part.knots.cols();
    const auto own = y.segment(start, d);
    if (d > 0) sum += own.dot(form_of(part.area_slope, weight) * own);
    start += d;
  }
  return sum;
}

Eigen::VectorXd PulseSpace::rough_excursion(const Pulse& pulse) const {
  const Eigen::Index modes = segment_integrals_[0].rows();
  const int segments = segments_of(pulse);
  Eigen::VectorXcd loop = Eigen::VectorXcd::Zero(modes);
  Eigen::VectorXd sum = Eigen::VectorXd::Zero(modes);
  for (int s = 0; s < segments; ++s) {
    const auto [f, g] = line_of(pulse, s);
    loop += f * segment_integrals_[0].col(s) + g * segment_integrals_[1].col(s);
    sum += loop.cwiseAbs2();
  }
  return sum * (pulse.duration / segments);
}

Pulse PulseSpace::pulse(const Eigen::VectorXd& y) const {
  const Eigen::Index even = parts_[0].knots.cols();
  Eigen::VectorXd omega = Eigen::VectorXd::Zero(std::max(parts_[0].knots.rows(), parts_[1].knots.rows()));
  if (even > 0) omega += parts_[0].knots * y.head(even);
  if (y.size() > even) omega += parts_[1].knots * y.tail(y.size() - even);
  return {form_.shape, duration_, detuning_, omega / (2 * pi)};
}

}  // namespace isinglass
