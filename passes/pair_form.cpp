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

std::optional<std::size_t> PairForm::home_of(const Row& string) const {
  for (std::size_t i = rotations_.size(); i-- > 0;) {
    if (rotations_[i].string.same_letters(string)) return i;
    if (!rotations_[i].string.commutes_with(string)) break;
  }
  return std::nullopt;
}

bool PairForm::can_take(const Turn& turn) const {
  constexpr std::size_t most_rotations = 6;
  return rotations_.size() < most_rotations || quarters_of(turn.angle) || home_of(seen(turn));
}

int PairForm::add(const Turn& turn) {
  if (const auto quarters = quarters_of(turn.angle)) {
    // K becomes g K, so the rows become K^-1 (g^-1 X_k g) K.
    std::array<Row, 4> changed;
    for (unsigned i = 0; i < 4; ++i) {
      const Letter letter = i % 2 == 0 ? Letter::X : Letter::Z;
      Row local = i < 2 ? row_of(letter, Letter::I) : row_of(Letter::I, letter);
      for (int q = 0; q < *quarters; ++q) conjugate(local, turn.a, turn.la, turn.b, turn.lb, !turn.negative);
      changed[i] = image(rows_, 0, local.letter(0), 1, local.letter(1));
      changed[i].negative ^= local.negative;
    }
    rows_ = changed;
    return in_clifford;
  }
  const Row string = seen(turn);
  auto home = home_of(string);
  if (!home) {
    home = rotations_.size();
    rotations_.push_back({{string.x, string.z, false}, 0, false});
  }
  Rotation& rotation = rotations_[*home];
  rotation.angle += string.negative ? -turn.angle.constant : turn.angle.constant;
  rotation.is_symbolic |= !turn.angle.is_known();
  return static_cast<int>(*home);
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

std::vector<PairForm::Step> PairForm::steps(bool is_mirrored, bool extras_first) const {
  std::vector<Step> steps;
  std::vector<Step> left;  // rotations to perform, in order
  for (const Rotation& rotation : rotations_) {
    left.push_back({rotation.string, static_cast<int>(left.size()), false});
  }
  const auto is_ready = [&](std::size_t i) {
    return std::all_of(left.begin(), left.begin() + static_cast<std::ptrdiff_t>(i),
                       [&](const Step& earlier) { return earlier.string.commutes_with(left[i].string); });
  };
  const auto perform = [&](std::size_t i) {
    steps.push_back(left[i]);
    left.erase(left.begin() + static_cast<std::ptrdiff_t>(i));
  };
  const auto perform_singles = [&] {
    for (std::size_t i = 0; i < left.size();) {
      if (left[i].string.weight() == 1 && is_ready(i)) {
        perform(i);
        i = 0;
      } else {
        ++i;
      }
    }
  };
  const auto turns = quarter_turns(is_mirrored);
  perform_singles();
  if (extras_first) {  // those in front that no quarter turn will make free
    const auto helps = [&](const Row& about) {
      return about.same_letters(left[0].string) || !about.commutes_with(left[0].string);
    };
    while (!left.empty() && std::none_of(turns.begin(), turns.end(), helps)) {
      perform(0);
      perform_singles();
    }
  }
  for (const Row& about : turns) {
    Step turn{about, in_clifford, true};
    for (std::size_t i = 0; i < left.size(); ++i) {
      if (!left[i].string.same_letters(about) || !is_ready(i)) continue;
      turn = {left[i].string, left[i].rotation, true};
      left.erase(left.begin() + static_cast<std::ptrdiff_t>(i));
      break;
    }
    steps.push_back(turn);
    for (Step& other : left) conjugate(other.string, about);
    perform_singles();
  }
  while (!left.empty()) {
    perform(0);
    perform_singles();
  }
  return steps;
}

std::vector<PairForm::Step> PairForm::steps(bool is_mirrored) const {
  const auto pairs = [](const std::vector<Step>& list) {
    return std::count_if(list.begin(), list.end(),
                         [](const Step& step) { return step.string.weight() == 2; });
  };
  std::vector<Step> late = steps(is_mirrored, false);
  std::vector<Step> early = steps(is_mirrored, true);
  return pairs(early) < pairs(late) ? early : late;
}

std::vector<double> PairForm::interactions(bool is_mirrored) const {
  std::vector<double> angles;
  for (const Step& step : steps(is_mirrored)) {
    if (step.string.weight() < 2) continue;
    if (step.rotation == in_clifford) {
      angles.push_back(pi / 2);
      continue;
    }
    const Rotation& rotation = rotations_[static_cast<std::size_t>(step.rotation)];
    const double angle = rotation.angle + (step.is_quarter ? pi / 2 : 0);  // whatever the signs
    angles.push_back(rotation.is_symbolic ? pi / 2 : std::abs(std::remainder(angle, pi)));
  }
  return angles;
}

}  // namespace isinglass
