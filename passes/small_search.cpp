// Numerical synthesis of small unitaries; see small_search.h.
//
// Idea. A circuit is a product of couplings whose axes and angles are free, and of one final rotation a
// qubit: any one-qubit gates in between only turn the axes. For a given sequence of pairs the difference to
// the target is brought to zero by damped least squares (Levenberg 1944, Marquardt 1963) with the exact
// Jacobian, which converges quadratically, so that 1e-12 costs nothing more. The number of sequences is cut
// down by operator Schmidt ranks: a coupling at most doubles the rank across a cut that it crosses. Once the
// target is met, the sum of the angles is lowered along the directions that do not leave it.
#include "passes/small_search.h"

#include <algorithm>
#include <cmath>
#include <complex>
#include <random>
#include <set>

namespace isinglass {

namespace {

using Pair = std::pair<int, int>;
using Clock = std::chrono::steady_clock;
using Large = Eigen::MatrixXcd;
using Matrix =
    Eigen::Matrix<Complex, Eigen::Dynamic, Eigen::Dynamic, 0, 16, 16>;  // up to four qubits, no heap
using Vector = Eigen::VectorXd;

constexpr double pi_ = 3.14159265358979323846;
constexpr double exact = 1e-12;  // Frobenius norm of what may be missing

/// (n.sigma) on a qubit, times m.
void apply_axis(Matrix& m, int qubit, const Axis& n) {
  const Complex up(n.x(), -n.y());
  const Complex down(n.x(), n.y());
  const Eigen::Index bit = Eigen::Index{1} << qubit;
  for (Eigen::Index c = 0; c < m.cols(); ++c) {
    Complex* column = m.data() + c * m.rows();
    for (Eigen::Index i = 0; i < m.rows(); ++i) {
      if (i & bit) continue;
      const Complex zero = column[i];
      const Complex one = column[i | bit];
      column[i] = n.z() * zero + up * one;
      column[i | bit] = down * zero - n.z() * one;
    }
  }
}

void apply_coupling(Matrix& m, const Coupling& coupling, double angle) {
  Matrix turned = m;
  apply_axis(turned, coupling.qubit[0], coupling.axis[0]);
  apply_axis(turned, coupling.qubit[1], coupling.axis[1]);
  m = std::cos(angle / 2) * m - Complex(0, std::sin(angle / 2)) * turned;
}

void apply_local(Matrix& m, int qubit, const Su2& q) {
  Matrix turned = m;
  apply_axis(turned, qubit, q.vec());
  m = q.w() * m - Complex(0, 1) * turned;
}

Matrix result_of(const SmallCircuit& circuit, Matrix m) {
  for (const Coupling& coupling : circuit.couplings) apply_coupling(m, coupling, coupling.angle);
  for (std::size_t q = 0; q < circuit.locals.size(); ++q)
    apply_local(m, static_cast<int>(q), circuit.locals[q]);
  return m;
}

/// Two unit vectors that span the plane across n.
std::pair<Axis, Axis> across(const Axis& n) {
  const Axis first = n.unitOrthogonal();
  return {first, n.cross(first)};
}

/// The columns of the target that count.
Matrix wanted_columns(const SmallTarget& target) {
  const Eigen::Index dimension = Eigen::Index{1} << target.qubits;
  Matrix columns = Matrix::Zero(dimension, dimension);
  Eigen::Index count = 0;
  for (Eigen::Index c = 0; c < dimension; ++c) {
    if ((static_cast<unsigned>(c) & target.fresh) == 0) columns.col(count++) = target.matrix.col(c);
  }
  return columns.leftCols(count);
}

/// Storage of Fit's linear algebra, kept from step to step.
struct Workspace {
  std::vector<Matrix> right;  // right[j]: the product before coupling j
  Eigen::MatrixXd jacobian;
  Vector difference;
  Eigen::MatrixXd square;  // lower triangle
  Eigen::MatrixXd damped;
  Eigen::LDLT<Eigen::MatrixXd> solver;
};

/// A circuit on its way to the target.
class Fit {
 public:
  Fit(Workspace& workspace, const SmallTarget& target, SmallCircuit circuit)
      : work_(&workspace), circuit_(std::move(circuit)), goal_(wanted_columns(target)) {
    SmallTarget identity = target;
    identity.matrix = Large::Identity(target.matrix.rows(), target.matrix.cols());
    start_ = wanted_columns(identity);
    align_phase();
  }

  const SmallCircuit& circuit() const { return circuit_; }
  double missing() const { return std::sqrt(squared_); }

  /// Damped least squares until the target is met, progress ends or `most_steps` are done.
  bool converge(int most_steps) {
    double damping = 1e-2;
    double checkpoint = squared_;
    for (int step = 0; step < most_steps && squared_ > exact * exact / 100; ++step) {
      if (step % 8 == 7) {
        if (squared_ > 0.8 * checkpoint && squared_ > 1e-6) return false;
        checkpoint = squared_;
      }
      linearize();
      const Vector slope = work_->jacobian.transpose() * work_->difference;
      bool is_better = false;
      for (int attempt = 0; attempt < 6 && !is_better; ++attempt) {
        work_->damped = work_->square;
        work_->damped.diagonal().array() += damping * (1e-3 + work_->square.diagonal().array());
        work_->solver.compute(work_->damped);
        is_better = try_step(-work_->solver.solve(slope));
        damping = is_better ? std::max(damping / 5, 1e-14) : damping * 6;
      }
      if (!is_better) break;
    }
    return missing() <= exact;
  }

  /// One descent step of the summed angles along the solutions; false when nothing is gained.
  bool lower_angles(double& step, double softness) {
    linearize();
    Vector slope = Vector::Zero(work_->jacobian.cols());
    for (std::size_t j = 0; j < circuit_.couplings.size(); ++j) {
      const double angle = circuit_.couplings[j].angle;
      slope(static_cast<Eigen::Index>(5 * j)) = angle / std::sqrt(angle * angle + softness * softness);
    }
    const Vector inside = work_->square.selfadjointView<Eigen::Lower>() * slope;
    work_->damped = work_->square;
    work_->damped.diagonal().array() += 1e-9;
    work_->solver.compute(work_->damped);
    const Vector along = slope - work_->solver.solve(inside);
    if (along.norm() < 1e-5) return false;
    const Fit before = *this;
    for (int attempt = 0; attempt < 6; ++attempt, step /= 3) {
      move(-step * along);
      align_phase();
      if (converge(6) && sum(softness) < before.sum(softness) - 1e-2 * step * along.squaredNorm()) {
        step *= 2;
        return true;
      }
      *this = before;
    }
    return false;
  }

 private:
  double sum(double softness) const {
    double total = 0;
    for (const Coupling& coupling : circuit_.couplings) {
      total += std::sqrt(coupling.angle * coupling.angle + softness * softness);
    }
    return total;
  }

  void align_phase() {
    const Matrix reached = result_of(circuit_, start_);
    phase_ = std::arg((goal_.adjoint() * reached).trace());
    squared_ = (reached - std::polar(1.0, phase_) * goal_).squaredNorm();
  }

  bool try_step(const Vector& step) {
    const SmallCircuit before = circuit_;
    const double phase_before = phase_;
    const double squared_before = squared_;
    move(step);
    align_phase();
    if (squared_ < squared_before) return true;
    circuit_ = before;
    phase_ = phase_before;
    squared_ = squared_before;
    return false;
  }

  /// Parameters: of every coupling its angle and two turns of each axis, then three of every local rotation.
  void move(const Vector& step) {
    Eigen::Index p = 0;
    for (Coupling& coupling : circuit_.couplings) {
      coupling.angle += step(p++);
      for (Axis& axis : coupling.axis) {
        const auto [first, second] = across(axis);
        axis += step(p) * first + step(p + 1) * second;
        axis.normalize();
        p += 2;
      }
    }
    for (Su2& local : circuit_.locals) {
      const Axis turn = step.segment<3>(p);
      const double angle = turn.norm();
      if (angle > 0) local = (local * rotation(turn / angle, angle)).normalized();
      p += 3;
    }
  }

  /// Jacobian and value of the difference to the target, as real numbers; the phase is the last parameter.
  void linearize() {
    const std::size_t count = circuit_.couplings.size();
    const Eigen::Index entries = start_.size();
    std::vector<Matrix>& right = work_->right;
    right.assign(1, start_);
    for (const Coupling& coupling : circuit_.couplings) {
      right.push_back(right.back());
      apply_coupling(right.back(), coupling, coupling.angle);
    }
    Eigen::MatrixXd& jacobian = work_->jacobian;
    jacobian.resize(2 * entries, static_cast<Eigen::Index>(5 * count + 3 * circuit_.locals.size() + 1));
    const auto numbers = [&](const Matrix& m) {
      return Eigen::Map<const Vector>(reinterpret_cast<const double*>(m.data()), 2 * entries);
    };
    // What follows, as its adjoint, so that gates are applied to it from the left.
    Matrix left = Matrix::Identity(start_.rows(), start_.rows());
    const auto put = [&](Eigen::Index column, const Matrix& m, Complex factor) {
      const Matrix moved = factor * (left.adjoint() * m);
      jacobian.col(column) = numbers(moved);
    };
    for (std::size_t q = circuit_.locals.size(); q-- > 0;) {
      apply_local(left, static_cast<int>(q), circuit_.locals[q].conjugate());
    }
    Eigen::Index column = static_cast<Eigen::Index>(5 * count);
    for (std::size_t q = 0; q < circuit_.locals.size(); ++q) {
      for (int k = 0; k < 3; ++k) {
        Matrix m = right.back();
        apply_axis(m, static_cast<int>(q), Axis::Unit(k));
        put(column++, m, {0, -0.5});
      }
    }
    const Matrix goal = std::polar(1.0, phase_) * goal_;
    const Matrix turned_goal = Complex(0, -1) * goal;
    jacobian.col(column) = numbers(turned_goal);
    for (std::size_t j = count; j-- > 0;) {
      const Coupling& coupling = circuit_.couplings[j];
      column = static_cast<Eigen::Index>(5 * j);
      Matrix m = right[j + 1];
      apply_axis(m, coupling.qubit[0], coupling.axis[0]);
      apply_axis(m, coupling.qubit[1], coupling.axis[1]);
      put(column++, m, {0, -0.5});
      for (const int side : {0, 1}) {
        m = right[j];
        apply_axis(m, coupling.qubit[1 - side], coupling.axis[1 - side]);
        const auto [first, second] = across(coupling.axis[side]);
        for (const Axis& turn : {first, second}) {
          Matrix turned = m;
          apply_axis(turned, coupling.qubit[side], turn);
          put(column++, turned, {0, -std::sin(coupling.angle / 2)});
        }
      }
      apply_coupling(left, coupling, -coupling.angle);
    }
    const Matrix difference = result_of(circuit_, start_) - goal;
    work_->difference = numbers(difference);
    work_->square.setZero(jacobian.cols(), jacobian.cols());
    work_->square.selfadjointView<Eigen::Lower>().rankUpdate(jacobian.transpose());
  }

  Workspace* work_;
  SmallCircuit circuit_;
  Matrix goal_;
  Matrix start_;
  double phase_ = 0;
  double squared_ = 0;
};

SmallCircuit random_circuit(int qubits, const std::vector<Pair>& pairs, std::mt19937_64& random) {
  const auto uniform = [&] { return static_cast<double>(random() >> 11) * 0x1p-53; };
  const auto axis = [&] {
    const double z = 2 * uniform() - 1;
    const double turn = 2 * pi_ * uniform();
    const double flat = std::sqrt(1 - z * z);
    return Axis(flat * std::cos(turn), flat * std::sin(turn), z);
  };
  SmallCircuit circuit;
  for (const Pair& pair : pairs) {
    Coupling coupling;
    coupling.qubit[0] = static_cast<std::uint8_t>(pair.first);
    coupling.qubit[1] = static_cast<std::uint8_t>(pair.second);
    coupling.axis[0] = axis();
    coupling.axis[1] = axis();
    coupling.angle = 0.2 + 1.3 * uniform();
    circuit.couplings.push_back(coupling);
  }
  for (int q = 0; q < qubits; ++q) circuit.locals.push_back(rotation(axis(), 2 * pi_ * uniform()));
  return circuit;
}

/// Angles in [-pi/2, pi/2]: a half turn of a coupling is a half turn of both qubits, moved to the end.
SmallCircuit folded(SmallCircuit circuit) {
  for (std::size_t j = 0; j < circuit.couplings.size(); ++j) {
    Coupling& coupling = circuit.couplings[j];
    coupling.angle = std::remainder(coupling.angle, 2 * pi_);
    if (std::abs(coupling.angle) <= pi_ / 2) continue;
    coupling.angle += coupling.angle > 0 ? -pi_ : pi_;
    for (const int side : {0, 1}) {
      const Su2 half_turn = rotation(coupling.axis[side], pi_);
      const int qubit = coupling.qubit[side];
      for (std::size_t k = j + 1; k < circuit.couplings.size(); ++k) {
        for (const int other : {0, 1}) {
          if (circuit.couplings[k].qubit[other] != qubit) continue;
          Axis& axis = circuit.couplings[k].axis[other];
          axis = half_turn.conjugate() * axis;
        }
      }
      Su2& local = circuit.locals[static_cast<std::size_t>(qubit)];
      local = (local * half_turn).normalized();
    }
  }
  return circuit;
}

/// Rank of the target across the cut between the qubits in `side` (inputs and outputs) and the others.
int rank_across(const SmallTarget& target, unsigned side) {
  const Matrix columns = wanted_columns(target);
  std::vector<unsigned> inputs;
  for (unsigned c = 0; c < (1u << target.qubits); ++c) {
    if ((c & target.fresh) == 0) inputs.push_back(c);
  }
  // Rows: (out, in) bits inside; columns: (out, in) bits outside.
  const unsigned size = 1u << target.qubits;
  Large cut = Large::Zero(size * size, size * size);
  for (unsigned row = 0; row < size; ++row) {
    for (std::size_t c = 0; c < inputs.size(); ++c) {
      const unsigned in = inputs[c];
      cut((row & side) * size + (in & side), (row & ~side) * size + (in & ~side)) =
          columns(static_cast<Eigen::Index>(row), static_cast<Eigen::Index>(c));
    }
  }
  // Only rows and columns that occur; the others are 0 and do not change the rank.
  std::set<unsigned> rows;
  for (unsigned row = 0; row < size; ++row) {
    for (const unsigned in : inputs) rows.insert((row & side) * size + (in & side));
  }
  Large small(static_cast<Eigen::Index>(rows.size()), cut.cols());
  Eigen::Index r = 0;
  for (const unsigned row : rows) small.row(r++) = cut.row(row);
  Eigen::SelfAdjointEigenSolver<Large> solver(small * small.adjoint(), Eigen::EigenvaluesOnly);
  const Vector values = solver.eigenvalues();
  int rank = 0;
  for (Eigen::Index i = 0; i < values.size(); ++i) rank += values(i) > 1e-9 * values.maxCoeff() ? 1 : 0;
  return rank;
}

int crossings_needed(int rank) {
  int needed = 0;
  while ((1 << needed) < rank) ++needed;
  return needed;
}

/// For every cut how many couplings must cross it.
std::vector<std::pair<unsigned, int>> cuts_of(const SmallTarget& target) {
  std::vector<std::pair<unsigned, int>> cuts;
  for (unsigned side = 1; side < (1u << (target.qubits - 1)); ++side) {
    cuts.emplace_back(side, crossings_needed(rank_across(target, side)));
  }
  return cuts;
}

bool crosses(const Pair& pair, unsigned side) {
  return ((side >> pair.first) & 1) != ((side >> pair.second) & 1);
}

bool satisfies(const std::vector<Pair>& pairs, const std::vector<std::pair<unsigned, int>>& cuts) {
  return std::all_of(cuts.begin(), cuts.end(), [&](const auto& cut) {
    return std::count_if(pairs.begin(), pairs.end(), [&](const Pair& p) { return crosses(p, cut.first); }) >=
           cut.second;
  });
}

std::vector<Pair> pairs_of(int qubits) {
  std::vector<Pair> pairs;
  for (int a = 0; a < qubits; ++a) {
    for (int b = a + 1; b < qubits; ++b) pairs.emplace_back(a, b);
  }
  return pairs;
}

bool is_disjoint(const Pair& a, const Pair& b) {
  return a.first != b.first && a.first != b.second && a.second != b.first && a.second != b.second;
}

/// Sequences of a length in which no pair follows itself and disjoint neighbours (which commute) stand in
/// order.
std::vector<std::vector<Pair>> sequences(int qubits, int length,
                                         const std::vector<std::pair<unsigned, int>>& cuts) {
  std::vector<std::vector<Pair>> grown{{}};
  for (int step = 0; step < length; ++step) {
    std::vector<std::vector<Pair>> longer;
    for (const auto& sequence : grown) {
      for (const Pair& pair : pairs_of(qubits)) {
        if (!sequence.empty() && sequence.back() == pair) continue;
        if (!sequence.empty() && is_disjoint(sequence.back(), pair) && pair < sequence.back()) continue;
        longer.push_back(sequence);
        longer.back().push_back(pair);
      }
    }
    grown = std::move(longer);
    if (grown.size() > 20000) break;
  }
  std::erase_if(grown, [&](const auto& sequence) {
    return static_cast<int>(sequence.size()) != length || !satisfies(sequence, cuts);
  });
  return grown;
}

}  // namespace

Eigen::MatrixXcd matrix_of(const SmallCircuit& circuit) {
  const Eigen::Index dimension = Eigen::Index{1} << circuit.locals.size();
  return result_of(circuit, Matrix::Identity(dimension, dimension));
}

double error_of(const SmallCircuit& circuit, const Cost& cost) {
  double error = 0;
  for (const Coupling& coupling : circuit.couplings) error += cost.interaction(coupling.angle);
  return error;
}

std::vector<std::int64_t> local_invariants(const SmallTarget& target) {
  // Legs of the matrix as a state: the outputs, then the inputs that are not fresh.
  const Matrix columns =
      wanted_columns(target) / std::sqrt(static_cast<double>(wanted_columns(target).cols()));
  int inputs = 0;
  while ((Eigen::Index{1} << inputs) < columns.cols()) ++inputs;
  const int legs = target.qubits + inputs;
  const Eigen::Index size = Eigen::Index{1} << legs;
  std::vector<std::int64_t> invariants{target.qubits, static_cast<std::int64_t>(target.fresh)};
  for (Eigen::Index part = 1; part < size / 2; ++part) {
    // gather the part's bits into rows, the others into columns
    std::vector<int> inside;
    std::vector<int> outside;
    for (int leg = 0; leg < legs; ++leg) ((part >> leg) & 1 ? inside : outside).push_back(leg);
    Large state = Large::Zero(Eigen::Index{1} << inside.size(), Eigen::Index{1} << outside.size());
    for (Eigen::Index i = 0; i < size; ++i) {
      Eigen::Index row = 0;
      Eigen::Index column = 0;
      for (std::size_t b = 0; b < inside.size(); ++b) row |= ((i >> inside[b]) & 1) << b;
      for (std::size_t b = 0; b < outside.size(); ++b) column |= ((i >> outside[b]) & 1) << b;
      state(row, column) = columns.data()[i];
    }
    const bool is_wide = state.rows() < state.cols();
    const Large square = is_wide ? Large(state * state.adjoint()) : Large(state.adjoint() * state);
    invariants.push_back(std::llround(square.squaredNorm() * 1e8));
  }
  return invariants;
}

int least_couplings(const SmallTarget& target) {
  const auto cuts = cuts_of(target);
  for (int length = 0;; ++length) {
    if (!sequences(target.qubits, length, cuts).empty() || length > 8) return length;
  }
}

namespace {

bool is_over(const SmallSearch& search) {
  return Clock::now() >= search.until || (search.budget && *search.budget <= 0);
}
void count_start(const SmallSearch& search) {
  if (search.budget) --*search.budget;
}

}  // namespace

namespace {

SmallCircuit with_less_angle(Workspace& workspace, const SmallTarget& target, const SmallCircuit& circuit,
                             const SmallSearch& search, const Cost& cost) {
  const SmallCircuit start = folded(circuit);
  Fit fit(workspace, target, start);
  if (!fit.converge(40)) return circuit;
  for (const double softness : {0.1, 0.003}) {
    double step = 0.3;
    for (int round = 0; round < 15 && !is_over(search); ++round) {
      if (!fit.lower_angles(step, softness)) break;
    }
  }
  const SmallCircuit result = folded(fit.circuit());
  // A coupling whose angle has become small may go altogether.
  for (std::size_t j = 0; j < result.couplings.size(); ++j) {
    if (std::abs(result.couplings[j].angle) > 0.05) continue;
    SmallCircuit shorter = result;
    shorter.couplings.erase(shorter.couplings.begin() + static_cast<std::ptrdiff_t>(j));
    Fit again(workspace, target, shorter);
    if (again.converge(40)) return with_less_angle(workspace, target, again.circuit(), search, cost);
  }
  return error_of(result, cost) < error_of(start, cost) ? result : start;
}

}  // namespace

SmallCircuit with_less_angle(const SmallTarget& target, SmallCircuit circuit, const SmallSearch& search,
                             const Cost& cost) {
  Workspace workspace;
  return with_less_angle(workspace, target, circuit, search, cost);
}

std::optional<SmallCircuit> fitted(const SmallTarget& target, const std::vector<Pair>& pairs,
                                   const SmallSearch& search, const Cost& cost) {
  std::mt19937_64 random(search.seed);
  Workspace workspace;
  std::optional<SmallCircuit> best;
  for (int start = 0; start < search.starts && !is_over(search); ++start) {
    count_start(search);
    Fit fit(workspace, target, random_circuit(target.qubits, pairs, random));
    if (!fit.converge(60)) continue;
    SmallCircuit found = with_less_angle(workspace, target, fit.circuit(), search, cost);
    if (!best || error_of(found, cost) < error_of(*best, cost)) best = std::move(found);
  }
  return best;
}

std::optional<SmallCircuit> shortest(const SmallTarget& target, int most, const SmallSearch& search,
                                     const Cost& cost) {
  constexpr int enough = 10;  // sequences of one length that fit
  const auto cuts = cuts_of(target);
  SmallSearch here = search;
  for (int length = least_couplings(target); length <= most; ++length) {
    std::optional<SmallCircuit> best;
    int fits = 0;
    for (const auto& sequence : sequences(target.qubits, length, cuts)) {
      if (is_over(search) || fits == enough) break;
      ++here.seed;
      auto found = fitted(target, sequence, here, cost);
      if (!found) continue;
      ++fits;
      if (!best || error_of(*found, cost) < error_of(*best, cost)) best = std::move(found);
    }
    if (best || is_over(search)) return best;
  }
  return std::nullopt;
}

std::optional<SmallCircuit> with_one_fewer(const SmallTarget& target, const SmallCircuit& circuit,
                                           const SmallSearch& search, const Cost& cost) {
  Workspace workspace;
  std::vector<std::size_t> order(circuit.couplings.size());
  for (std::size_t j = 0; j < order.size(); ++j) order[j] = j;
  std::stable_sort(order.begin(), order.end(), [&](std::size_t a, std::size_t b) {
    return std::abs(circuit.couplings[a].angle) < std::abs(circuit.couplings[b].angle);
  });
  for (const std::size_t left_out : order) {
    if (is_over(search)) break;
    count_start(search);
    SmallCircuit shorter = circuit;
    shorter.couplings.erase(shorter.couplings.begin() + static_cast<std::ptrdiff_t>(left_out));
    Fit fit(workspace, target, shorter);
    if (fit.converge(60)) return with_less_angle(workspace, target, fit.circuit(), search, cost);
  }
  return std::nullopt;
}

}  // namespace isinglass
