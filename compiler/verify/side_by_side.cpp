// The difference of two circuits as a product of small factors; see side_by_side.h.
#include "verify/side_by_side.h"

#include <Eigen/Dense>
#include <cmath>
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

 private:
  std::vector<Kernel> kernels_;
  std::vector<Wires> wires_;
  std::vector<std::vector<std::uint32_t>> by_wire_;
  std::vector<std::size_t> next_;
};

/// One factor of D: rows stand for wires of the source (bit j: source[j]), columns for wires of the compiled
/// circuit. Where wires started in |0> it is known on a subspace only and zero elsewhere.
struct Factor {
  Wires source;
  Wires compiled;
  Matrix d;
  bool is_changed = false;
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
      if (job.promise.zero_start || w >= job.source.source_qubits) factor.d(1, 1) = 0;
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

  /// Takes all gates that lie within one factor, from both circuits, until there are none.
  void take_free() {
    bool found = true;
    while (found) {
      found = false;
      for (const bool from_source : {true, false}) {
        for (std::uint32_t w = 0; w < wires_; ++w) {
          const auto kernel = queue(from_source).ready(w);
          if (!kernel || factors_of(from_source, *kernel).size() != 1) continue;
          take(from_source, *kernel);
          found = true;
        }
      }
    }
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
    const Kernel& kernel = queue(from_source).kernel(k);
    if (from_source) {
      multiply_rows(
          factor.d, kernel, [&](std::uint32_t w) { return position(factor.source, w); }, false);
      source_.take(k);
    } else {  // D g^-1 = (conj(g) D^T)^T
      Matrix transposed = factor.d.transpose();
      multiply_rows(
          transposed, kernel, [&](std::uint32_t w) { return position(factor.compiled, w); }, true);
      factor.d = transposed.transpose();
      compiled_.take(k);
    }
    factor.is_changed = true;
    ++taken_;
  }

  void join(std::size_t into, std::size_t other) {
    Factor& a = factors_[into];
    Factor& b = factors_[other];
    a.d = product(a.d, b.d);
    a.source.insert(a.source.end(), b.source.begin(), b.source.end());
    a.compiled.insert(a.compiled.end(), b.compiled.begin(), b.compiled.end());
    b = Factor();
    enter(into);
    free_.push_back(other);
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
      while (factors_[f].source.size() > 1 && (split_wire(f) || split_state(f))) {
      }
    }
  }

  /// Puts one pair of wires with a 2x2 factor aside; `rest` stays. Residual is the largest entry of the
  /// difference.
  void set_aside(std::size_t f, std::size_t i, std::size_t j, const Matrix& one, Matrix rest,
                 double residual) {
    rounded_ += residual;
    const std::size_t fresh = free_.back();
    free_.pop_back();
    Factor& factor = factors_[f];
    factors_[fresh].source = {factor.source[i]};
    factors_[fresh].compiled = {factor.compiled[j]};
    factors_[fresh].d = one;
    factors_[fresh].is_changed = false;
    factor.source.erase(factor.source.begin() + static_cast<std::ptrdiff_t>(i));
    factor.compiled.erase(factor.compiled.begin() + static_cast<std::ptrdiff_t>(j));
    factor.d = std::move(rest);
    enter(fresh);
    enter(f);
  }

  /// D = one (x) rest for some pair of a source wire and a compiled wire (operator Schmidt rank 1).
  bool split_wire(std::size_t f) {
    const Factor& factor = factors_[f];
    const std::size_t width = factor.source.size();
    const Eigen::Index half = factor.d.rows() / 2;
    for (std::size_t i = 0; i < width; ++i) {
      for (std::size_t j = 0; j < width; ++j) {
        const auto entry = [&](Eigen::Index block, Eigen::Index r, Eigen::Index c) {
          return factor.d(widened(r, i) | (block & 1) << i, widened(c, j) | (block >> 1) << j);
        };
        // The largest of the four blocks is the rest up to a factor; the others must be multiples of it.
        Matrix blocks[4];
        Eigen::Index largest = 0;
        for (Eigen::Index block = 0; block < 4; ++block) {
          blocks[block].resize(half, half);
          for (Eigen::Index c = 0; c < half; ++c) {
            for (Eigen::Index r = 0; r < half; ++r) blocks[block](r, c) = entry(block, r, c);
          }
          if (blocks[block].squaredNorm() > blocks[largest].squaredNorm()) largest = block;
        }
        const Matrix& base = blocks[largest];
        const double norm2 = base.squaredNorm();
        Matrix one(2, 2);
        double residual = 0;
        for (Eigen::Index block = 0; block < 4; ++block) {
          const Amplitude share = base.reshaped().dot(blocks[block].reshaped()) / norm2;
          one(block & 1, block >> 1) = share;
          residual = std::max(residual, (blocks[block] - share * base).cwiseAbs().maxCoeff());
          if (residual > nothing) break;
        }
        if (residual > nothing) continue;
        // Scale so that both are (partial) isometries.
        const double largest_singular = one.jacobiSvd().singularValues()(0);
        Matrix rest = base * largest_singular;
        one /= largest_singular;
        set_aside(f, i, j, one, std::move(rest), residual);
        return true;
      }
    }
    return false;
  }

  /// Where all is known to have started in |0>, D is |a><b|: if a and b differ by one-qubit unitaries only,
  /// these can stand for D. Two wires.
  bool split_state(std::size_t f) {
    const Factor& factor = factors_[f];
    if (factor.source.size() != 2) return false;
    const Eigen::JacobiSVD<Matrix> svd(factor.d, Eigen::ComputeFullU | Eigen::ComputeFullV);
    if (std::abs(svd.singularValues()(0) - 1) > nothing || svd.singularValues()(1) > nothing) return false;
    // a = U_a S V_a^T as a 2x2 matrix (row: first wire), b likewise: u = U_a U_b^+, v = V_a V_b^+ (as conj).
    const auto matrix = [](const Eigen::VectorXcd& v) {
      Matrix m(2, 2);
      m << v(0), v(2), v(1), v(3);
      return m;
    };
    const Matrix a = matrix(svd.matrixU().col(0));
    const Matrix b = matrix(svd.matrixV().col(0));
    const Eigen::JacobiSVD<Matrix> sa(a, Eigen::ComputeFullU | Eigen::ComputeFullV);
    const Eigen::JacobiSVD<Matrix> sb(b, Eigen::ComputeFullU | Eigen::ComputeFullV);
    const Matrix u = sa.matrixU() * sb.matrixU().adjoint();
    const Matrix v = (sb.matrixV() * sa.matrixV().adjoint()).transpose();
    const double residual = (a - u * b * v.transpose()).cwiseAbs().maxCoeff();
    if (residual > nothing) return false;
    set_aside(f, 0, 0, u, v, residual);
    return true;
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
    const Matrix known = factor.d.adjoint() * factor.d;
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
      const Amplitude overlap = known.row(r).dot(factor.d.row(row));
      auto& phase = phase_of[outcome];
      if (phase == Amplitude(0) && std::abs(overlap) > 1e-6) phase = overlap / std::abs(overlap);
      const double residual = (factor.d.row(row) - phase * known.row(r)).cwiseAbs().maxCoeff();
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
