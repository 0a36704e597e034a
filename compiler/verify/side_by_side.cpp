// The difference of two circuits as a product of small factors; see side_by_side.h.
#include "verify/side_by_side.h"

#include <Eigen/Dense>
#include <algorithm>
#include <bit>
#include <cmath>
#include <iterator>
#include <numeric>
#include <optional>
#include <set>
#include <unordered_map>

#include "verify/dense.h"
#include "verify/memory.h"

namespace isinglass {

namespace {

using Matrix = Eigen::MatrixXcd;
using Wires = std::vector<std::uint32_t>;

constexpr double nothing = 1e-9;  // entries up to this are rounding

/// The gates of one circuit in the order that their wires demand.
class Queue {
 public:
  Queue(const Circuit& circuit, std::span<const double> inputs, std::size_t wires)
      : by_wire_(wires), next_(wires) {
    Block gates;
    for (const Operation& op : circuit.body()) {
      if (op.is_unitary()) gates.push_back(op);
    }
    kernels_ = fused(circuit, gates, inputs);
    std::erase_if(kernels_, [](const Kernel& k) { return k.controls.empty() && k.targets.empty(); });
    find_tail(circuit);
    for (std::uint32_t k = 0; k < kernels_.size(); ++k) {
      Wires wires_of = kernels_[k].controls;
      wires_of.insert(wires_of.end(), kernels_[k].targets.begin(), kernels_[k].targets.end());
      for (const auto w : wires_of) by_wire_[w].push_back(k);
      wires_.push_back(std::move(wires_of));
    }
  }

  std::size_t size() const { return kernels_.size(); }
  const Kernel& kernel(std::uint32_t k) const { return kernels_[k]; }
  const Wires& wires(std::uint32_t k) const { return wires_[k]; }

  /// The gate that comes next on the wire, if all its wires are ready for it.
  std::optional<std::uint32_t> ready(std::uint32_t wire) const {
    if (next_[wire] == by_wire_[wire].size()) return {};
    const std::uint32_t k = by_wire_[wire][next_[wire]];
    for (const auto w : wires_[k]) {
      if (by_wire_[w][next_[w]] != k) return {};
    }
    return k;
  }

  void take(std::uint32_t k) {
    for (const auto w : wires_[k]) ++next_[w];
  }

  /// Whether all that is left on the wire is its measurement and the tail.
  bool is_ended(std::uint32_t wire) const {
    if (!is_measured_[wire]) return false;
    return next_[wire] == by_wire_[wire].size() || in_tail_[by_wire_[wire][next_[wire]]];
  }

 private:
  /// Looking back from the measurements: gates that turn phases of basis states of measured wires change no
  /// outcome and are left out; those that exchange basis states, phases apart, are the tail.
  void find_tail(const Circuit& circuit) {
    is_measured_.assign(next_.size(), false);
    for (const Operation& op : circuit.body()) {
      if (op.kind == Kind::measure) is_measured_[circuit.operands(op)[0]] = true;
    }
    std::vector<bool> is_open = is_measured_;
    std::vector<Kernel> kept;
    std::vector<bool> in_tail;
    for (; !kernels_.empty(); kernels_.pop_back()) {
      Kernel& kernel = kernels_.back();
      const auto open = [&](std::uint32_t w) { return bool(is_open[w]); };
      const bool all_open =
          std::ranges::all_of(kernel.controls, open) && std::ranges::all_of(kernel.targets, open);
      if (all_open && is_diagonal(kernel)) continue;
      in_tail.push_back(all_open && exchanges(kernel));
      if (!in_tail.back()) {
        for (const auto w : kernel.controls) is_open[w] = false;
        for (const auto w : kernel.targets) is_open[w] = false;
      }
      kept.push_back(std::move(kernel));
    }
    kernels_.assign(std::make_move_iterator(kept.rbegin()), std::make_move_iterator(kept.rend()));
    in_tail_.assign(in_tail.rbegin(), in_tail.rend());
  }

  static bool is_diagonal(const Kernel& kernel) {
    const std::size_t size = std::size_t(1) << kernel.targets.size();
    for (std::size_t k = 0; k < size * size; ++k) {
      if (k % (size + 1) != 0 && kernel.matrix[k] != Amplitude(0)) return false;
    }
    return true;
  }

  /// Whether each row has one entry only.
  static bool exchanges(const Kernel& kernel) {
    const std::size_t size = std::size_t(1) << kernel.targets.size();
    for (std::size_t row = 0; row < size; ++row) {
      const auto begin = kernel.matrix.begin() + static_cast<std::ptrdiff_t>(row * size);
      const auto zeros = std::count(begin, begin + static_cast<std::ptrdiff_t>(size), Amplitude(0));
      if (static_cast<std::size_t>(zeros) != size - 1) return false;
    }
    return true;
  }

  std::vector<Kernel> kernels_;
  std::vector<bool> in_tail_;  // by kernel
  std::vector<bool> is_measured_;
  std::vector<Wires> wires_;
  std::vector<std::vector<std::uint32_t>> by_wire_;
  std::vector<std::size_t> next_;
};

/// One factor of D: rows stand for wires of the source (bit j: source[j]), columns for wires of the compiled
/// circuit. Where wires started in |0>, the compiled circuit can only be in some states: `reached` projects
/// on them, and any D' with D' reached = D reached can stand for D. Without rows: every state.
struct Factor {
  Wires source;
  Wires compiled;
  Matrix d;
  Matrix reached = {};
  bool is_changed = false;

  bool is_partial() const { return reached.rows() > 0; }
  Matrix reached_or_all() const {
    return is_partial() ? reached : Matrix(Matrix::Identity(d.rows(), d.rows()));
  }
};

/// Multiplies a kernel on the row index of m; `bit_of` gives the bit of each wire.
template <typename BitOf>
void multiply_rows(Matrix& m, const Kernel& kernel, const BitOf& bit_of, bool conjugate) {
  std::uint64_t control_mask = 0;
  std::uint64_t target_mask = 0;
  std::uint64_t offset[4] = {0, 0, 0, 0};
  const std::size_t size = std::size_t(1) << kernel.targets.size();
  for (const auto w : kernel.controls) control_mask |= std::uint64_t(1) << bit_of(w);
  for (std::size_t t = 0; t < kernel.targets.size(); ++t) {
    const std::uint64_t bit = std::uint64_t(1) << bit_of(kernel.targets[t]);
    target_mask |= bit;
    for (std::size_t k = 0; k < size; ++k) {
      if (k >> t & 1) offset[k] |= bit;
    }
  }
  for (Eigen::Index c = 0; c < m.cols(); ++c) {
    for (std::uint64_t r = 0; r < static_cast<std::uint64_t>(m.rows()); ++r) {
      if ((r & target_mask) != 0 || (r & control_mask) != control_mask) continue;
      Amplitude old[4];
      for (std::size_t k = 0; k < size; ++k) old[k] = m(static_cast<Eigen::Index>(r | offset[k]), c);
      for (std::size_t row = 0; row < size; ++row) {
        Amplitude sum = 0;
        for (std::size_t k = 0; k < size; ++k) {
          const Amplitude entry = kernel.matrix[row * size + k];
          sum += (conjugate ? std::conj(entry) : entry) * old[k];
        }
        m(static_cast<Eigen::Index>(r | offset[row]), c) = sum;
      }
    }
  }
}

/// m g^-1 = (conj(g) m^T)^T.
template <typename BitOf>
void multiply_inverse(Matrix& m, const Kernel& kernel, const BitOf& bit_of) {
  Matrix transposed = m.transpose();
  multiply_rows(transposed, kernel, bit_of, true);
  m = transposed.transpose();
}

Matrix product(const Matrix& low, const Matrix& high) {
  Matrix m(low.rows() * high.rows(), low.cols() * high.cols());
  for (Eigen::Index r = 0; r < high.rows(); ++r) {
    for (Eigen::Index c = 0; c < high.cols(); ++c) {
      m.block(r * low.rows(), c * low.cols(), low.rows(), low.cols()) = high(r, c) * low;
    }
  }
  return m;
}

std::size_t position(const Wires& wires, std::uint32_t wire) {
  return static_cast<std::size_t>(std::find(wires.begin(), wires.end(), wire) - wires.begin());
}

/// k with a zero bit put in at position `bit`.
Eigen::Index widened(Eigen::Index k, std::size_t bit) {
  const Eigen::Index low = (Eigen::Index(1) << bit) - 1;
  return (k & low) | (k & ~low) << 1;
}

class Follower {
 public:
  Follower(const Job& job, const InputValues& inputs)
      : job_(job),
        wires_(std::max(job.source.wires, job.compiled.wires)),
        source_(job.source, inputs.source, wires_),
        compiled_(job.compiled, inputs.compiled, wires_),
        factor_of_source_(wires_),
        factor_of_compiled_(wires_) {
    for (std::uint32_t w = 0; w < wires_; ++w) {
      Factor factor;
      factor.source = factor.compiled = {w};
      factor.d = Matrix::Identity(2, 2);
      if (job.promise.zero_start || w >= job.source.source_qubits) {
        factor.reached = Matrix::Zero(2, 2);
        factor.reached(0, 0) = 1;
      }
      factor_of_source_[w] = factor_of_compiled_[w] = w;
      factors_.push_back(std::move(factor));
    }
  }

  SideBySide result() {
    SideBySide result;
    result.gates = source_.size() + compiled_.size();
    while (true) {
      take_free();
      settle();
      if (take_pair()) continue;
      const std::optional<Choice> choice = best_choice();
      result.followed = taken_;
      result.widest = widest_;
      result.distance = rounded_;
      if (!choice) break;
      if (choice->wires > job_.options.most_followed_wires) return result;
      take(choice->from_source, choice->kernel);
      if (std::chrono::steady_clock::now() > job_.options.deadline) throw Unsupported("the time given");
    }
    const bool forgives =
        job_.promise.zero_start || !is_fragment(job_.source) || wires_ > job_.source.source_qubits;
    const bool keeps = is_nothing();
    result.distance = keeps ? rounded_ : 1;
    if (keeps) result.state = SideBySide::State::same;
    if (!keeps && !forgives) result.state = SideBySide::State::differs;
    return result;
  }

 private:
  struct Choice {
    bool from_source;
    std::uint32_t kernel;
    std::size_t wires;  // of the factor that it makes
  };

  const Queue& queue(bool from_source) const { return from_source ? source_ : compiled_; }

  std::set<std::size_t> factors_of(bool from_source, std::uint32_t kernel) const {
    std::set<std::size_t> result;
    for (const auto w : queue(from_source).wires(kernel)) {
      result.insert(from_source ? factor_of_source_[w] : factor_of_compiled_[w]);
    }
    return result;
  }

  std::size_t width_of(const std::set<std::size_t>& factors) const {
    std::size_t sum = 0;
    for (const std::size_t f : factors) sum += factors_[f].source.size();
    return sum;
  }

  /// Takes all gates that lie within one factor or do nothing to known states, from both circuits, until
  /// there are none.
  void take_free() {
    bool found = true;
    while (found) {
      found = false;
      for (const bool from_source : {true, false}) {
        for (std::uint32_t w = 0; w < wires_; ++w) {
          const auto kernel = queue(from_source).ready(w);
          if (!kernel) continue;
          const auto factors = factors_of(from_source, *kernel);
          const bool is_within = factors.size() == 1;
          if (!is_within && !is_absorbed(from_source, *kernel, factors)) continue;
          take(from_source, *kernel);
          if (!is_within) settle();
          found = true;
        }
      }
    }
  }

  /// Whether the factors, some of them known on a few states only, fall apart again right after the gate.
  bool is_absorbed(bool from_source, std::uint32_t k, const std::set<std::size_t>& factors) const {
    constexpr std::size_t most_wires = 3;
    if (width_of(factors) > most_wires) return false;
    if (std::ranges::none_of(factors, [&](std::size_t f) { return factors_[f].is_partial(); })) return false;
    Factor joined = joined_of(factors);
    multiply(joined, from_source, queue(from_source).kernel(k));
    return falls_apart(joined.d * joined.reached_or_all());
  }

  Factor joined_of(const std::set<std::size_t>& factors) const {
    Factor joined = factors_[*factors.begin()];
    for (auto f = std::next(factors.begin()); f != factors.end(); ++f) join_factors(joined, factors_[*f]);
    return joined;
  }

  /// Whether nothing but one-qubit factors is left.
  static bool falls_apart(Matrix d) {
    for (Eigen::Index size = d.rows(); size > 2; size /= 2) {
      const auto width = static_cast<std::size_t>(std::countr_zero(std::uint64_t(size)));
      std::optional<Split> split;
      for (const bool same_place : {true, false}) {
        for (const auto& [i, j] : pairs_of_bits(width, same_place)) {
          if (!split) split = split_at(d, i, j);
        }
      }
      if (!split) return false;
      d = std::move(split->rest);
    }
    return true;
  }

  /// Takes a gate of each circuit that answer each other: behind both of them the factors fall apart again.
  bool take_pair() {
    constexpr std::size_t most_wires = 4;
    for (std::uint32_t w = 0; w < wires_; ++w) {
      const auto kernel = source_.ready(w);
      if (!kernel || source_.wires(*kernel).front() != w) continue;
      const auto factors = factors_of(true, *kernel);
      if (width_of(factors) > most_wires) continue;
      for (const std::uint32_t answer : answers(factors)) {
        Factor joined = joined_of(factors);
        multiply(joined, true, source_.kernel(*kernel));
        multiply(joined, false, compiled_.kernel(answer));
        if (!falls_apart(joined.d) && !(joined.is_partial() && falls_apart(joined.d * joined.reached)))
          continue;
        take(true, *kernel);
        take(false, answer);
        return true;
      }
    }
    return false;
  }

  /// Ready gates of the compiled circuit that lie within these factors and on all of them.
  std::set<std::uint32_t> answers(const std::set<std::size_t>& factors) const {
    std::set<std::uint32_t> found;
    for (const std::size_t f : factors) {
      for (const auto w : factors_[f].compiled) {
        const auto kernel = compiled_.ready(w);
        if (kernel && factors_of(false, *kernel) == factors) found.insert(*kernel);
      }
    }
    return found;
  }

  /// The ready gate that makes the narrowest factor; among equals one that the other circuit can answer, then
  /// the one that is least far in its circuit.
  std::optional<Choice> best_choice() const {
    std::optional<Choice> best;
    std::pair<bool, double> best_order;
    for (const bool from_source : {true, false}) {
      for (std::uint32_t w = 0; w < wires_; ++w) {
        const auto kernel = queue(from_source).ready(w);
        if (!kernel) continue;
        const auto factors = factors_of(from_source, *kernel);
        const Choice choice{from_source, *kernel, width_of(factors)};
        const std::pair<bool, double> order{
            !is_answered(from_source, factors),
            static_cast<double>(*kernel) / static_cast<double>(queue(from_source).size())};
        if (!best || choice.wires < best->wires || (choice.wires == best->wires && order < best_order)) {
          best = choice;
          best_order = order;
        }
      }
    }
    return best;
  }

  /// Whether the other circuit has a ready gate of at least two factors within these.
  bool is_answered(bool from_source, const std::set<std::size_t>& factors) const {
    for (const std::size_t f : factors) {
      for (const auto w : from_source ? factors_[f].compiled : factors_[f].source) {
        const auto kernel = queue(!from_source).ready(w);
        if (!kernel) continue;
        const auto others = factors_of(!from_source, *kernel);
        if (std::includes(factors.begin(), factors.end(), others.begin(), others.end())) return true;
      }
    }
    return false;
  }

  void take(bool from_source, std::uint32_t k) {
    const auto factors = factors_of(from_source, k);
    const std::size_t f = *factors.begin();
    for (const std::size_t other : factors) {
      if (other != f) join(f, other);
    }
    Factor& factor = factors_[f];
    widest_ = std::max(widest_, factor.source.size());
    multiply(factor, from_source, queue(from_source).kernel(k));
    (from_source ? source_ : compiled_).take(k);
    factor.is_changed = true;
    ++taken_;
  }

  static void multiply(Factor& factor, bool from_source, const Kernel& kernel) {
    if (from_source) {
      multiply_rows(
          factor.d, kernel, [&](std::uint32_t w) { return position(factor.source, w); }, false);
    } else {
      const auto bit_of = [&](std::uint32_t w) { return position(factor.compiled, w); };
      multiply_inverse(factor.d, kernel, bit_of);
      if (factor.is_partial()) {
        multiply_rows(factor.reached, kernel, bit_of, false);
        multiply_inverse(factor.reached, kernel, bit_of);
      }
    }
  }

  void join(std::size_t into, std::size_t other) {
    join_factors(factors_[into], factors_[other]);
    factors_[other] = Factor();
    enter(into);
    free_.push_back(other);
  }

  static void join_factors(Factor& a, const Factor& b) {
    if (a.is_partial() || b.is_partial()) a.reached = product(a.reached_or_all(), b.reached_or_all());
    a.d = product(a.d, b.d);
    a.source.insert(a.source.end(), b.source.begin(), b.source.end());
    a.compiled.insert(a.compiled.end(), b.compiled.begin(), b.compiled.end());
  }

  void enter(std::size_t f) {
    for (const auto w : factors_[f].source) factor_of_source_[w] = f;
    for (const auto w : factors_[f].compiled) factor_of_compiled_[w] = f;
  }

  /// Splits what falls apart.
  void settle() {
    for (std::size_t f = 0; f < factors_.size(); ++f) {
      if (!factors_[f].is_changed) continue;
      factors_[f].is_changed = false;
      while (factors_[f].source.size() > 1 &&
             (simplify(f, true) || simplify(f, false) || forgive_phases(f))) {
      }
    }
  }

  /// With wires that stay what they are, or with exchanged ones: the latter only where the former will not
  /// do, since known states may hide the difference.
  bool simplify(std::size_t f, bool same_place) {
    return split_wire(f, same_place) || split_reached(f, same_place) || complete(f, same_place);
  }

  /// m = one (x) rest for bit i of the rows and bit j of the columns (operator Schmidt rank 1).
  struct Split {
    Matrix one;
    Matrix rest;
    double residual;  // the largest entry of the difference
  };
  static std::optional<Split> split_at(const Matrix& m, std::size_t i, std::size_t j) {
    const Eigen::Index half = m.rows() / 2;
    // The largest of the four blocks is the rest up to a factor; the others must be multiples of it.
    Matrix blocks[4];
    Eigen::Index largest = 0;
    for (Eigen::Index block = 0; block < 4; ++block) {
      blocks[block].resize(half, half);
      for (Eigen::Index c = 0; c < half; ++c) {
        for (Eigen::Index r = 0; r < half; ++r)
          blocks[block](r, c) = m(widened(r, i) | (block & 1) << i, widened(c, j) | (block >> 1) << j);
      }
      if (blocks[block].squaredNorm() > blocks[largest].squaredNorm()) largest = block;
    }
    const Matrix& base = blocks[largest];
    Split split{Matrix(2, 2), {}, 0};
    for (Eigen::Index block = 0; block < 4; ++block) {
      const Amplitude share = base.reshaped().dot(blocks[block].reshaped()) / base.squaredNorm();
      split.one(block & 1, block >> 1) = share;
      split.residual = std::max(split.residual, (blocks[block] - share * base).cwiseAbs().maxCoeff());
      if (split.residual > nothing) return {};
    }
    // Scale so that both are (partial) isometries.
    const double largest_singular = split.one.jacobiSvd().singularValues()(0);
    split.rest = base * largest_singular;
    split.one /= largest_singular;
    return split;
  }

  /// Puts one pair of wires aside as a factor of its own; the rest stays.
  void set_aside(std::size_t f, std::size_t i, std::size_t j, Factor one, Factor rest) {
    Factor& factor = factors_[f];
    one.source = {factor.source[i]};
    one.compiled = {factor.compiled[j]};
    rest.source = factor.source;
    rest.compiled = factor.compiled;
    rest.source.erase(rest.source.begin() + static_cast<std::ptrdiff_t>(i));
    rest.compiled.erase(rest.compiled.begin() + static_cast<std::ptrdiff_t>(j));
    const std::size_t fresh = free_.back();
    free_.pop_back();
    factors_[fresh] = std::move(one);
    factors_[f] = std::move(rest);
    enter(fresh);
    enter(f);
  }

  /// D itself falls apart. What was known of the states is kept where it falls apart likewise.
  bool split_wire(std::size_t f, bool same_place) {
    for (const auto& [i, j] : pairs_of_bits(factors_[f].source.size(), same_place)) {
      auto split = split_at(factors_[f].d, i, j);
      if (!split) continue;
      rounded_ += split->residual;
      Factor one{{}, {}, std::move(split->one)}, rest{{}, {}, std::move(split->rest)};
      if (factors_[f].is_partial()) {
        if (auto known = split_at(factors_[f].reached, j, j)) {
          one.reached = projector(known->one);
          rest.reached = projector(known->rest);
        }
      }
      set_aside(f, i, j, std::move(one), std::move(rest));
      return true;
    }
    return false;
  }

  /// D falls apart on the states that are reached, and so do these.
  bool split_reached(std::size_t f, bool same_place) {
    if (!factors_[f].is_partial()) return false;
    const Matrix d = factors_[f].d * factors_[f].reached;
    const auto completed = [](const Matrix& isometry) {
      const Eigen::JacobiSVD<Matrix> svd(isometry, Eigen::ComputeFullU | Eigen::ComputeFullV);
      return Factor{{}, {}, svd.matrixU() * svd.matrixV().adjoint(), projector(isometry)};
    };
    for (const auto& [i, j] : pairs_of_bits(factors_[f].source.size(), same_place)) {
      const auto split = split_at(d, i, j);
      if (!split) continue;
      rounded_ += split->residual;
      set_aside(f, i, j, completed(split->one), completed(split->rest));
      return true;
    }
    return false;
  }

  /// A row bit and a column bit each: those that stand at the same place, or the others.
  static std::vector<std::pair<std::size_t, std::size_t>> pairs_of_bits(std::size_t width, bool same_place) {
    std::vector<std::pair<std::size_t, std::size_t>> pairs;
    for (std::size_t i = 0; i < width; ++i) {
      for (std::size_t j = 0; j < width; ++j) {
        if ((i == j) == same_place) pairs.emplace_back(i, j);
      }
    }
    return pairs;
  }

  /// On what an isometry is known; nothing where that is everything.
  static Matrix projector(const Matrix& isometry) {
    const Matrix known = isometry.adjoint() * isometry;
    const bool is_everything = known.isIdentity(nothing);
    return is_everything ? Matrix() : known;
  }

  /// One-qubit unitaries that agree with D on the states that are reached stand for D, the knowledge is used
  /// up. They are found by setting one after the other to the best for the rest, first among turns of the
  /// frame alone, which are what a compiler leaves behind, and believed only if they fit.
  bool complete(std::size_t f, bool same_place) {
    constexpr std::size_t most_wires = 3;
    Factor& factor = factors_[f];
    const std::size_t width = factor.source.size();
    if (!factor.is_partial() || width > most_wires) return false;
    const Matrix d = factor.d * factor.reached;
    for (const bool frames_only : {true, false}) {
      std::vector<std::size_t> partner(width);  // by row bit: the column bit
      std::iota(partner.begin(), partner.end(), 0u);
      do {
        if (std::ranges::is_sorted(partner) != same_place) continue;
        const Matrix whole = best_product(d, partner, frames_only);
        const double residual = (whole * factor.reached - d).cwiseAbs().maxCoeff();
        if (residual > nothing) continue;
        rounded_ += residual;
        factor.d = whole;
        factor.reached = {};
        return true;
      } while (std::next_permutation(partner.begin(), partner.end()));
    }
    return false;
  }

  /// Phases that D turns on basis states of compiled wires that have ended change no outcome: if D does no
  /// more to such wires, it is taken to do nothing to them.
  bool forgive_phases(std::size_t f) {
    Factor& factor = factors_[f];
    std::uint64_t ended = 0;  // bits of such wires
    for (std::size_t k = 0; k < factor.compiled.size(); ++k) {
      if (compiled_.is_ended(factor.compiled[k])) ended |= std::uint64_t(1) << k;
    }
    if (ended == 0) return false;
    // The block of the outcome 0...0 stands for all.
    const auto at = [&](std::uint64_t r, std::uint64_t c) -> Amplitude& {
      return factor.d(static_cast<Eigen::Index>(r), static_cast<Eigen::Index>(c));
    };
    const auto size = static_cast<std::uint64_t>(factor.d.rows());
    Matrix plain = Matrix::Zero(factor.d.rows(), factor.d.cols());
    std::unordered_map<std::uint64_t, Amplitude> phase_of;
    for (std::uint64_t c = 0; c < size; ++c) {
      for (std::uint64_t r = 0; r < size; ++r) {
        if ((r & ended) != (c & ended)) continue;
        const Amplitude base = at(r & ~ended, c & ~ended);
        plain(static_cast<Eigen::Index>(r), static_cast<Eigen::Index>(c)) = base;
        phase_of[c & ended] += std::conj(base) * at(r, c);
      }
    }
    double residual = 0;
    for (std::uint64_t c = 0; c < size; ++c) {
      const Amplitude sum = phase_of[c & ended];
      if (std::abs(sum) < 0.5) return false;
      const Amplitude phase = sum / std::abs(sum);
      const auto column = static_cast<Eigen::Index>(c);
      residual = std::max(residual, (factor.d.col(column) - phase * plain.col(column)).cwiseAbs().maxCoeff());
    }
    if (residual > nothing || (factor.d - plain).cwiseAbs().maxCoeff() <= nothing) return false;
    rounded_ += residual;
    factor.d = std::move(plain);
    return true;
  }

  /// The product of one-qubit unitaries, the i-th from column bit partner[i] to row bit i, that overlaps most
  /// with d, as far as steps uphill from the identity lead.
  static Matrix best_product(const Matrix& d, const std::vector<std::size_t>& partner, bool frames_only) {
    constexpr int sweeps = 2000;
    std::vector<Eigen::Matrix2cd> one(partner.size(), Eigen::Matrix2cd::Identity());
    double before = 0, overlap = 0;
    for (int sweep = 0; sweep < sweeps; ++sweep) {
      for (std::size_t i = 0; i < one.size(); ++i) {
        Eigen::Matrix2cd left = left_of(d, one, partner, i);
        if (frames_only) left(0, 1) = left(1, 0) = 0;
        const Eigen::JacobiSVD<Eigen::Matrix2cd> svd(left, Eigen::ComputeFullU | Eigen::ComputeFullV);
        one[i] = svd.matrixU() * svd.matrixV().adjoint();
        overlap = svd.singularValues().sum();
      }
      if (overlap - before < 1e-15 * overlap) break;
      before = overlap;
    }
    return product_of(one, partner);
  }

  static Matrix product_of(const std::vector<Eigen::Matrix2cd>& one,
                           const std::vector<std::size_t>& partner) {
    const Eigen::Index size = Eigen::Index(1) << one.size();
    Matrix whole = Matrix::Ones(size, size);
    for (Eigen::Index c = 0; c < size; ++c) {
      for (Eigen::Index r = 0; r < size; ++r) {
        for (std::size_t i = 0; i < one.size(); ++i) whole(r, c) *= one[i](r >> i & 1, c >> partner[i] & 1);
      }
    }
    return whole;
  }

  /// d contracted with all of them but the i-th: what that one should be, but for being unitary.
  static Eigen::Matrix2cd left_of(const Matrix& d, const std::vector<Eigen::Matrix2cd>& one,
                                  const std::vector<std::size_t>& partner, std::size_t i) {
    std::vector<Eigen::Matrix2cd> others = one;
    others[i].setOnes();
    const Matrix weights = product_of(others, partner).conjugate().cwiseProduct(d);
    Eigen::Matrix2cd left = Eigen::Matrix2cd::Zero();
    for (Eigen::Index c = 0; c < d.cols(); ++c) {
      for (Eigen::Index r = 0; r < d.rows(); ++r) left(r >> i & 1, c >> partner[i] & 1) += weights(r, c);
    }
    return left;
  }

  /// Whether every factor does nothing on what it is known on, up to phases that final measurements forgive.
  bool is_nothing() {
    std::vector<bool> measured(wires_);
    std::unordered_map<std::uint32_t, std::uint32_t> source_wire_of_bit;
    std::vector<std::uint32_t> partner(wires_, no_bit);  // by compiled wire: the source wire it must end on
    for (const Operation& op : job_.source.body()) {
      if (op.kind != Kind::measure) continue;
      measured[job_.source.operands(op)[0]] = true;
      source_wire_of_bit[op.payload] = job_.source.operands(op)[0];
    }
    for (const Operation& op : job_.compiled.body()) {
      if (op.kind == Kind::measure)
        partner[job_.compiled.operands(op)[0]] = source_wire_of_bit.at(op.payload);
    }
    for (std::uint32_t q = 0; q < job_.source.source_qubits; ++q) {
      if (!measured[job_.source.end_wire[q]]) partner[job_.compiled.end_wire[q]] = job_.source.end_wire[q];
    }
    for (const Factor& factor : factors_) {
      if (!factor.source.empty() && !does_nothing(factor, partner, measured)) return false;
    }
    return true;
  }

  bool does_nothing(const Factor& factor, const std::vector<std::uint32_t>& partner,
                    const std::vector<bool>& measured) {
    const std::size_t width = factor.source.size();
    // row_bit[j]: the row bit that column bit j must equal.
    std::vector<std::size_t> row_bit(width, width);
    std::vector<bool> is_used(width);
    for (std::size_t j = 0; j < width; ++j) {
      if (partner[factor.compiled[j]] == no_bit) continue;
      row_bit[j] = position(factor.source, partner[factor.compiled[j]]);
      if (row_bit[j] == width) return false;
      is_used[row_bit[j]] = true;
    }
    for (std::size_t j = 0, i = 0; j < width; ++j) {  // ancillas in any order
      if (row_bit[j] != width) continue;
      while (is_used[i]) ++i;
      row_bit[j] = i++;
    }
    const Matrix known = factor.reached_or_all();
    const Matrix d = factor.d * known;
    // Row by row: d = phase * known, one phase for each value of the measured wires.
    std::unordered_map<std::uint64_t, Amplitude> phase_of;
    for (Eigen::Index r = 0; r < known.rows(); ++r) {
      Eigen::Index row = 0;
      std::uint64_t outcome = 0;
      for (std::size_t j = 0; j < width; ++j) {
        const auto bit = static_cast<std::uint64_t>(r) >> j & 1;
        row |= static_cast<Eigen::Index>(bit) << row_bit[j];
        if (measured[factor.source[row_bit[j]]]) outcome |= bit << j;
      }
      const Amplitude overlap = known.row(r).dot(d.row(row));
      auto& phase = phase_of[outcome];
      if (phase == Amplitude(0) && std::abs(overlap) > 1e-6) phase = overlap / std::abs(overlap);
      const double residual = (d.row(row) - phase * known.row(r)).cwiseAbs().maxCoeff();
      if (residual > 10 * nothing) return false;
      rounded_ += residual;
    }
    return true;
  }

  const Job& job_;
  std::size_t wires_;
  Queue source_;
  Queue compiled_;
  std::vector<Factor> factors_;
  std::vector<std::size_t> free_;  // empty places in factors_
  std::vector<std::size_t> factor_of_source_;
  std::vector<std::size_t> factor_of_compiled_;
  std::size_t taken_ = 0;
  std::size_t widest_ = 1;
  double rounded_ = 0;
};

}  // namespace

SideBySide by_following(const Job& job, const InputValues& inputs) {
  return Follower(job, inputs).result();
}

}  // namespace isinglass
