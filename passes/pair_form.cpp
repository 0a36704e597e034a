// See pair_form.h.
#include "passes/pair_form.h"

#include <algorithm>
#include <cmath>

#include "passes/local_rotations.h"

namespace isinglass {

namespace {

constexpr std::array<Letter, 3> letters = {Letter::X, Letter::Y, Letter::Z};

Row row_of(Letter la, Letter lb) {
  const auto a = static_cast<std::uint64_t>(la), b = static_cast<std::uint64_t>(lb);
  return {(a & 1) | (b & 1) << 1, a >> 1 | (b >> 1) << 1, false};
}

/// What is left of a Clifford when at most one quarter turn is taken out: does it exchange the wires?
struct Class {
  bool exchanges = false;
  std::optional<Row> about;  // the quarter turn
};

bool is_local(const std::array<Row, 4>& rows) {
  return std::all_of(rows.begin(), rows.end(), [](const Row& row) { return row.weight() == 1; });
}

Class class_of(const std::array<Row, 4>& rows) {
  if (is_local(rows)) return {rows[0].support() == 2, {}};
  for (const Letter la : letters) {
    for (const Letter lb : letters) {
      const Row about = row_of(la, lb);
      std::array<Row, 4> left = rows;
      for (Row& row : left) conjugate(row, about);
      if (is_local(left)) return {left[0].support() == 2, about};
    }
  }
  return {};  // not reached: every two-qubit Clifford is one of these
}

}  // namespace

void conjugate(Row& row, const Row& about) {
  conjugate(row, 0, about.letter(0), 1, about.letter(1), false);
}

PairForm::PairForm()
    : rows_{row_of(Letter::X, Letter::I), row_of(Letter::Z, Letter::I), row_of(Letter::I, Letter::X),
            row_of(Letter::I, Letter::Z)} {}

Row PairForm::seen(const Turn& turn) const {
  Row result = image(rows_, turn.a, turn.la, turn.is_pair() ? turn.b : turn.a, turn.lb);
  result.negative ^= turn.negative;
  return result;
}

bool PairForm::can_take(const Turn& turn) const {
  if (quarters_of(turn.angle)) return true;
  const Row string = seen(turn);
  return std::all_of(rotations_.begin(), rotations_.end(),
                     [&](const Rotation& rotation) { return rotation.string.commutes_with(string); });
}

std::optional<int> PairForm::add(const Turn& turn) {
  if (const auto quarters = quarters_of(turn.angle)) {
    // K becomes g K, so the rows become K^-1 (g^-1 X_k g) K.
    std::array<Row, 4> changed;
    for (unsigned i = 0; i < 4; ++i) {
      Row local = row_of(i / 2 == 0 ? (i % 2 == 0 ? Letter::X : Letter::Z) : Letter::I,
                         i / 2 == 1 ? (i % 2 == 0 ? Letter::X : Letter::Z) : Letter::I);
      for (int q = 0; q < *quarters; ++q) conjugate(local, turn.a, turn.la, turn.b, turn.lb, !turn.negative);
      changed[i] = image(rows_, 0, local.letter(0), 1, local.letter(1));
      changed[i].negative ^= local.negative;
    }
    rows_ = changed;
    return in_clifford;
  }
  if (!can_take(turn)) return std::nullopt;
  const Row string = seen(turn);
  auto found = std::find_if(rotations_.begin(), rotations_.end(),
                            [&](const Rotation& rotation) { return rotation.string.same_letters(string); });
  if (found == rotations_.end()) {
    rotations_.push_back({{string.x, string.z, false}, 0, false});
    found = rotations_.end() - 1;
  }
  found->angle += string.negative ? -turn.angle.constant : turn.angle.constant;
  found->is_symbolic |= !turn.angle.is_known();
  return static_cast<int>(found - rotations_.begin());
}

std::vector<Row> PairForm::quarter_turns(bool is_mirrored) const {
  const Class kind = class_of(rows_);
  if (kind.exchanges == is_mirrored) return kind.about ? std::vector<Row>{*kind.about} : std::vector<Row>();
  // Three strings that commute, Q among them, and as many of the rotations as can be.
  std::vector<Row> three;
  const auto offer = [&](const Row& string) {
    const bool fits = std::all_of(three.begin(), three.end(), [&](const Row& other) {
      return other.commutes_with(string) && !other.same_letters(string);
    });
    if (string.weight() == 2 && fits && three.size() < 3) three.push_back({string.x, string.z, false});
  };
  if (kind.about) offer(*kind.about);
  for (const Rotation& rotation : rotations_) offer(rotation.string);
  for (const Letter la : letters) {
    for (const Letter lb : letters) offer(row_of(la, lb));
  }
  if (kind.about) three.erase(three.begin());
  return three;
}

std::vector<double> PairForm::interactions(bool is_mirrored) const {
  const auto reduced = [](const Rotation& rotation, double more) {
    return rotation.is_symbolic ? pi / 2 : std::abs(std::remainder(rotation.angle + more, pi));
  };
  std::vector<Rotation> left = rotations_;
  std::vector<double> angles;
  const auto drop_singles = [&] {
    std::erase_if(left, [](const Rotation& rotation) { return rotation.string.weight() < 2; });
  };
  drop_singles();
  for (const Row& about : quarter_turns(is_mirrored)) {
    const auto same = std::find_if(left.begin(), left.end(), [&](const Rotation& rotation) {
      return rotation.string.same_letters(about);
    });
    angles.push_back(same == left.end() ? pi / 2 : reduced(*same, pi / 2));
    if (same != left.end()) left.erase(same);
    for (Rotation& rotation : left) conjugate(rotation.string, about);
    drop_singles();
  }
  for (const Rotation& rotation : left) angles.push_back(reduced(rotation, 0));
  return angles;
}

}  // namespace isinglass
