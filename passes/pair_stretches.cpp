// Counting interactions of stretches by their invariants and canonical coordinates; see pair_stretches.h.
#include "passes/pair_stretches.h"

#include <Eigen/Eigenvalues>
#include <algorithm>
#include <cmath>
#include <span>

namespace isinglass {

namespace {

using Complex = std::complex<double>;

constexpr double tolerance = 1e-12;  // of invariants, which lose a few units in the last place

bool is_whole_turn(double angle) {
  return is_multiple(angle, pi, least_interaction);
}

/// Distance of an angle from the next multiple of pi: what an interaction of that angle costs.
double reduced(double angle) {
  return std::abs(std::remainder(angle, pi));
}

/// Interactions from tr g and tr g^2 of g = u (YY) u^T (YY), u in SU(4): with canonical coordinates (x, y, z)
/// tr g = 4 (cos 2x cos 2y cos 2z - i sin 2x sin 2y sin 2z), and tr g^2 the same of 4x, 4y, 4z. Shende,
/// Bullock, Markov, quant-ph/0308033.
int count(Complex trace, Complex trace_of_square) {
  if (std::abs(trace.imag()) > tolerance) return 3;
  const double t = trace.real();
  if (std::abs(trace_of_square - (t * t / 2 - 4)) > tolerance) return 2;
  return 4 - std::abs(t) > tolerance ? 1 : 0;
}

/// row r of a Pauli letter has its only entry in column r ^ flip.
Complex entry(Letter letter, int row) {
  switch (letter) {
    case Letter::Z:
      return row == 0 ? 1 : -1;
    case Letter::Y:
      return row == 0 ? Complex(0, -1) : Complex(0, 1);
    default:
      return 1;
  }
}

/// matrix (YY) matrix^T (YY)
std::array<Complex, 16> gamma_of(const std::array<Complex, 16>& u) {
  // YY = antidiagonal (-1, 1, 1, -1).
  constexpr double sign[4] = {-1, 1, 1, -1};
  std::array<Complex, 16> left{}, g{};
  for (int r = 0; r < 4; ++r) {
    for (int c = 0; c < 4; ++c) left[4 * r + c] = u[4 * r + (3 - c)] * sign[c];
  }
  for (int r = 0; r < 4; ++r) {
    for (int c = 0; c < 4; ++c) {
      Complex sum = 0;
      for (int k = 0; k < 4; ++k) sum += left[4 * r + k] * u[4 * c + k];
      g[4 * r + c] = sum;
    }
  }
  for (int r = 0; r < 4; ++r) {
    std::array<Complex, 4> row;
    for (int c = 0; c < 4; ++c) row[c] = g[4 * r + (3 - c)] * sign[c];
    for (int c = 0; c < 4; ++c) g[4 * r + c] = row[c];
  }
  return g;
}

/// Of interactions of these angles (radians, each reduced to [0, pi/2]).
Price price_of_angles(std::span<const double> angles, const Cost& cost) {
  Price price;
  for (const double angle : angles) {
    if (angle <= least_interaction) continue;
    ++price.interactions;
    price.error += cost.interaction(angle) + 2 * cost.pulse;
  }
  return price;
}

}  // namespace

PairStretch::PairStretch(unsigned a, unsigned b, bool may_rename, bool has_inputs)
    : a_(a), b_(b), may_rename_(may_rename), matrix_{} {
  if (has_inputs) form_.emplace();
  for (int k = 0; k < 4; ++k) matrix_[static_cast<std::size_t>(5 * k)] = 1;
}

std::pair<Letter, Letter> PairStretch::letters(const Turn& turn) const {
  if (!turn.is_pair()) return turn.a == a_ ? std::pair(turn.la, Letter::I) : std::pair(Letter::I, turn.la);
  return turn.a == a_ ? std::pair(turn.la, turn.lb) : std::pair(turn.lb, turn.la);
}

bool PairStretch::commutes_with_all(Letter la, Letter lb) const {
  for (std::size_t k = 0; k < axes_.count; ++k) {
    if (commute(axes_.axis[k].la, la) != commute(axes_.axis[k].lb, lb)) return false;
  }
  for (const Letter single : {Letter::X, Letter::Y, Letter::Z}) {
    const int bit = 1 << static_cast<int>(single);
    if ((singles_[0] & bit && !commute(single, la)) || (singles_[1] & bit && !commute(single, lb)))
      return false;
  }
  return true;
}

Turn PairStretch::named(const Turn& turn) const {
  Turn result = turn;
  result.a = turn.a == a_ ? 0 : 1;
  result.b = turn.is_pair() && turn.b == b_ ? 1 : 0;
  return result;
}

bool PairStretch::can_take(const Turn& turn) const {
  if (!symbolic_ && turn.angle.is_known()) return true;
  const auto [la, lb] = letters(turn);
  if (commuting_ && commutes_with_all(la, lb)) return true;
  if (!form_ || !form_->can_take(named(turn))) return false;
  return interactions_with(turn) <= interactions_ + 1;  // else it does better on its own
}

void PairStretch::Axes::add(Letter la, Letter lb, const Turn& turn) {
  const bool is_symbolic = !turn.angle.is_known();
  for (std::size_t k = 0; k < count; ++k) {
    if (axis[k].la != la || axis[k].lb != lb) continue;
    axis[k].angle += turn.signed_constant();
    axis[k].is_symbolic |= is_symbolic;
    return;
  }
  axis[count++] = {la, lb, turn.signed_constant(), is_symbolic};
}

int PairStretch::count(const Axes& axes, bool may_rename) {
  int plain = 0, mirrored = 3 - static_cast<int>(axes.count);
  for (std::size_t k = 0; k < axes.count; ++k) {
    const AxisAngle& axis = axes.axis[k];
    plain += axis.is_symbolic || !is_whole_turn(axis.angle);
    mirrored += axis.is_symbolic || !is_whole_turn(axis.angle + pi / 2);
  }
  return may_rename ? std::min(plain, mirrored) : plain;
}

int PairStretch::count(const Matrix& matrix, bool may_rename) {
  const auto g = gamma_of(matrix);
  Complex trace = 0, square = 0;
  for (std::size_t r = 0; r < 4; ++r) {
    trace += g[5 * r];
    for (std::size_t c = 0; c < 4; ++c) square += g[4 * r + c] * g[4 * c + r];
  }
  const int plain = isinglass::count(trace, square);
  if (!may_rename || plain == 0) return plain;
  // SWAP adds pi/4 to each coordinate, which takes tr g to -i conj(i tr g) and tr g^2 to its negative.
  return std::min(plain, isinglass::count({trace.imag(), -trace.real()}, -square));
}

int PairStretch::count(const PairForm& form, bool may_rename) {
  const auto count = [&](bool is_mirrored) {
    const auto angles = form.interactions(is_mirrored);
    return static_cast<int>(
        std::count_if(angles.begin(), angles.end(), [](double angle) { return angle > least_interaction; }));
  };
  return may_rename ? std::min(count(false), count(true)) : count(false);
}

void PairStretch::multiply(Matrix& matrix, Letter la, Letter lb, double angle) {
  const Complex c = std::cos(angle / 2), s = Complex(0, -std::sin(angle / 2));
  const int flip = (static_cast<int>(la) & 1) | (static_cast<int>(lb) & 1) << 1;
  Matrix result;
  for (int row = 0; row < 4; ++row) {
    const Complex factor = s * entry(la, row & 1) * entry(lb, row >> 1);
    for (int column = 0; column < 4; ++column) {
      const auto at = static_cast<std::size_t>(4 * row + column);
      const auto from = static_cast<std::size_t>(4 * (row ^ flip) + column);
      result[at] = c * matrix[at] + factor * matrix[from];
    }
  }
  matrix = result;
}

int PairStretch::interactions_with(const Turn& turn) const {
  const auto [la, lb] = letters(turn);
  if (commuting_ && commutes_with_all(la, lb)) {
    Axes axes = axes_;
    axes.add(la, lb, turn);
    return count(axes, may_rename_);
  }
  if (symbolic_ || !turn.angle.is_known()) {
    PairForm form = *form_;
    form.add(named(turn));
    return count(form, may_rename_);
  }
  Matrix matrix = matrix_;
  multiply(matrix, la, lb, turn.signed_constant());
  return count(matrix, may_rename_);
}

void PairStretch::take(const Turn& turn) {
  const auto [la, lb] = letters(turn);
  symbolic_ |= !turn.angle.is_known();
  commuting_ = commuting_ && commutes_with_all(la, lb);
  if (commuting_) axes_.add(la, lb, turn);
  add_to_form(turn);
  if (!symbolic_) multiply(matrix_, la, lb, turn.signed_constant());
  recount();
}

/// The form is given up where it has no room.
void PairStretch::add_to_form(const Turn& turn) {
  if (form_ && !form_->can_take(named(turn))) form_.reset();
  if (form_) form_->add(named(turn));
}

void PairStretch::recount() {
  interactions_ = commuting_  ? count(axes_, may_rename_)
                  : symbolic_ ? count(*form_, may_rename_)
                              : count(matrix_, may_rename_);
}

bool PairStretch::take_single(const Turn& turn) {
  const auto [la, lb] = letters(turn);
  const bool commutes = commuting_ && commutes_with_all(la, lb);
  if ((symbolic_ || !turn.angle.is_known()) && !commutes) {
    if (!form_ || !form_->can_take(named(turn)) || interactions_with(turn) > interactions_) return false;
  }
  add_to_form(turn);
  commuting_ = commutes;
  symbolic_ |= !turn.angle.is_known();
  const bool on_a = la != Letter::I;
  singles_[on_a ? 0 : 1] |= static_cast<std::uint8_t>(1 << static_cast<int>(on_a ? la : lb));
  if (!symbolic_) multiply(matrix_, la, lb, turn.signed_constant());
  if (symbolic_) recount();
  return true;
}

PairStretch::Prices PairStretch::prices(const Cost& cost) const {
  if (commuting_) {
    // An axis of unknown angle costs the same with SWAP as without.
    std::array<double, 3> plain{}, mirrored{};
    for (std::size_t k = 0; k < 3; ++k) {
      const bool is_used = k < axes_.count;
      const double angle = is_used ? axes_.axis[k].angle : 0;
      const bool is_symbolic = is_used && axes_.axis[k].is_symbolic;
      plain[k] = is_symbolic ? pi / 2 : reduced(angle);
      mirrored[k] = is_symbolic ? pi / 2 : reduced(angle + pi / 2);
    }
    return {price_of_angles(plain, cost), price_of_angles(mirrored, cost)};
  }
  if (symbolic_) {
    const auto price = [&](bool is_mirrored) {
      return price_of_angles(form_->interactions(is_mirrored), cost);
    };
    return {price(false), price(true)};
  }
  // Eigenvalues of g are exp(2i(x - y + z)), exp(2i(x + y - z)), exp(-2i(x + y + z)), exp(2i(-x + y + z)).
  const auto g = gamma_of(matrix_);
  Eigen::Matrix4cd m;
  for (int r = 0; r < 4; ++r) {
    for (int c = 0; c < 4; ++c) m(r, c) = g[static_cast<std::size_t>(4 * r + c)];
  }
  const Eigen::Vector4cd eigenvalues = m.eigenvalues();
  std::array<double, 4> phase{};
  for (int k = 0; k < 4; ++k) phase[static_cast<std::size_t>(k)] = std::arg(eigenvalues(k));
  // Sums of two eigenphases are +-4x, +-4y, +-4z up to full turns: angles 2x = half the sum of the first with
  // each.
  std::array<double, 3> plain{}, mirrored{};
  for (std::size_t k = 0; k < 3; ++k) {
    plain[k] = reduced((phase[0] + phase[k + 1]) / 2);
    mirrored[k] = reduced((phase[0] + phase[k + 1]) / 2 + pi / 2);
  }
  return {price_of_angles(plain, cost), price_of_angles(mirrored, cost)};
}

bool PairStretch::is_mirrored(const Cost& cost) const {
  if (!may_rename_) return false;
  const Prices both = prices(cost);
  return both.mirrored.error < both.plain.error - 1e-15;
}

Price PairStretch::price(const Cost& cost) const {
  const Prices both = prices(cost);
  return may_rename_ && both.mirrored.error < both.plain.error - 1e-15 ? both.mirrored : both.plain;
}

int PairStretches::add(const Turn& turn) {
  int& current = current_[turn.a];
  if (!turn.is_pair()) {
    if (current == none) return none;
    PairStretch& stretch = stretches_[static_cast<std::size_t>(current)];
    interactions_ -= stretch.interactions();
    const bool goes_on = open(stretch.a(), stretch.b()) != nullptr && stretch.take_single(turn);
    interactions_ += stretch.interactions();
    if (!goes_on) current = none;
    return current;
  }
  const PairStretch* found = open(turn.a, turn.b);
  if (found != nullptr && found->can_take(turn)) {
    PairStretch& stretch = stretches_[static_cast<std::size_t>(current)];
    interactions_ -= stretch.interactions();
    stretch.take(turn);
    interactions_ += stretch.interactions();
    return current;
  }
  stretches_.emplace_back(turn.a, turn.b, may_rename_, has_inputs_);
  stretches_.back().take(turn);
  interactions_ += stretches_.back().interactions();
  current_[turn.a] = current_[turn.b] = static_cast<int>(stretches_.size()) - 1;
  return current;
}

const PairStretch* PairStretches::open(unsigned a, unsigned b) const {
  if (current_[a] == none || current_[a] != current_[b]) return nullptr;
  return &stretches_[static_cast<std::size_t>(current_[a])];
}

int PairStretches::interactions_added(const Turn& turn) const {
  const PairStretch* stretch = open(turn.a, turn.b);
  if (stretch == nullptr || !stretch->can_take(turn)) {
    return turn.angle.is_known() && is_whole_turn(turn.angle.constant) ? 0 : 1;
  }
  return stretch->interactions_with(turn) - stretch->interactions();
}

Price PairStretches::price(const Cost& cost) const {
  Price price;
  for (const PairStretch& stretch : stretches_) {
    const Price its = stretch.price(cost);
    price.interactions += its.interactions;
    price.error += its.error;
  }
  return price;
}

bool has_inputs(const std::vector<Turn>& turns) {
  return std::any_of(turns.begin(), turns.end(), [](const Turn& turn) { return !turn.angle.is_known(); });
}

Price price_of(const std::vector<Turn>& turns, unsigned wires, bool may_rename, const Cost& cost) {
  PairStretches stretches(wires, may_rename, has_inputs(turns));
  for (const Turn& turn : turns) stretches.add(turn);
  return stretches.price(cost);
}

}  // namespace isinglass
