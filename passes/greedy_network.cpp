// See greedy_network.h.
#include "passes/greedy_network.h"

#include <algorithm>
#include <array>
#include <cmath>
#include <numeric>

#include "passes/clifford_table.h"

namespace isinglass {

namespace {

constexpr double least_gain = 1e-6;
constexpr std::array<Letter, 3> letters = {Letter::X, Letter::Z, Letter::Y};  // by index

/// Index 0 to 2 of a letter that is not I.
unsigned index_of(Letter letter) {
  return static_cast<unsigned>(letter) - 1;
}

/// For every pair of wires: the rows that carry two given letters there, weighted by what the potential would
/// lose
/// (`fall`) or win (`rise`) if the weight of the row fell or rose by one.
class Histogram {
 public:
  struct Cell {
    double fall = 0, rise = 0;
  };
  using Gains = std::array<std::array<double, 3>, 3>;

  explicit Histogram(unsigned wires) : wires_(wires), cells_(9 * wires * wires), single_(wires) {}

  void add(const Row& row, double fall, double rise) {
    std::array<unsigned, most_wires> wire, letter;
    unsigned count = 0;
    for (std::uint64_t left = row.support(); left != 0; left &= left - 1) {
      const auto w = static_cast<unsigned>(std::countr_zero(left));
      wire[count] = w;
      letter[count++] = index_of(row.letter(w));
    }
    for (unsigned i = 0; i < count; ++i) {
      single_[wire[i]][letter[i]] += rise;
      Cell* cells = &cells_[9 * (wire[i] * wires_)];
      for (unsigned j = i + 1; j < count; ++j) {
        Cell& cell = cells[9 * wire[j] + 3 * letter[i] + letter[j]];
        cell.fall += fall;
        cell.rise += rise;
      }
    }
  }

  /// By how much a quarter turn about each of the nine strings on wires a < b lowers the potential. A row
  /// with letters (A, B) loses one letter to (P, Q) when A = P or B = Q but not both; with (A, I) it gains
  /// one when A != P.
  Gains gains(unsigned a, unsigned b) const {
    const Cell* cells = &cells_[9 * (a * wires_ + b)];
    std::array<double, 3> fall_a{}, fall_b{}, rise_a{}, rise_b{};
    for (unsigned p = 0; p < 3; ++p) {
      for (unsigned q = 0; q < 3; ++q) {
        const Cell& cell = cells[3 * p + q];
        fall_a[p] += cell.fall;
        fall_b[q] += cell.fall;
        rise_a[p] += cell.rise;
        rise_b[q] += cell.rise;
      }
    }
    double lone_a = 0, lone_b = 0;  // rows with a letter on one of the wires only
    for (unsigned p = 0; p < 3; ++p) {
      rise_a[p] = single_[a][p] - rise_a[p];
      rise_b[p] = single_[b][p] - rise_b[p];
      lone_a += rise_a[p];
      lone_b += rise_b[p];
    }
    Gains gains;
    for (unsigned p = 0; p < 3; ++p) {
      for (unsigned q = 0; q < 3; ++q) {
        gains[p][q] =
            fall_a[p] + fall_b[q] - 2 * cells[3 * p + q].fall - (lone_a - rise_a[p]) - (lone_b - rise_b[q]);
      }
    }
    return gains;
  }

 private:
  unsigned wires_;
  std::vector<Cell> cells_;  // 9 * (a * wires + b), a < b
  std::vector<std::array<double, 3>> single_;
};

bool has_inputs(const Network& network) {
  return std::any_of(network.exponentials.begin(), network.exponentials.end(),
                     [](const Exponential& exponential) { return !exponential.angle.is_known(); });
}

/// A quarter turn about letters[p] (x) letters[q].
struct Move {
  unsigned a = 0, b = 0, p = 0, q = 0;
};

class Greedy {
 public:
  Greedy(const Network& network, const Taste& taste, const Limits& limits, Dice& dice)
      : network_(network),
        taste_(taste),
        limits_(limits),
        dice_(dice),
        wires_(network.wires),
        histogram_(wires_),
        stretches_(wires_, limits.may_rename, has_inputs(network)),
        free_turns_(wires_ * wires_, unknown) {
    value_[0] = clifford_value_[0] = 0;
    for (unsigned w = 1; w < value_.size(); ++w) {
      value_[w] = std::pow(w - 1.0, taste.power);
      clifford_value_[w] = std::pow(w - 1.0, taste.clifford_power);
    }
    coefficient_.resize(taste.layers + 2);
    for (unsigned layer = 0; layer < taste.layers; ++layer)
      coefficient_[layer] = std::pow(taste.gamma, layer);
    clifford_scale_ = network.exponentials.empty() ? 1 : taste.kappa;
    streams_ = network.exponentials.size() > taste.active;
    if (streams_) seen_ = identity_rows();
    for (const Row& row : network.rows) {
      rows_.push_back({row, clifford_layer, 0, true, {}, {}});
      contribute(rows_.back(), 1);
    }
    load();
  }

  std::optional<Sequence> run() {
    while (stretches_.interactions() <= limits_.interactions) {
      perform_singles();
      if (live_ == 0 && taste_.uses_tables && step_by_table()) continue;
      if (live_ == 0 && is_home()) {
        finish();
        if (stretches_.interactions() > limits_.interactions) return std::nullopt;
        return std::move(sequence_);
      }
      if (take_free()) continue;
      if (!take_best()) work_off_lightest();
    }
    return std::nullopt;
  }

 private:
  static constexpr int clifford_layer = -1;
  static constexpr std::uint16_t unknown = 0xffff;

  /// A row of the Clifford (layer -1) or a rotation that is being looked at.
  struct Active {
    Row string;
    int layer = 0;  // longest chain of anticommuting predecessors, capped
    std::uint32_t exponential = 0;
    bool is_live = true;
    std::vector<std::uint32_t> before, after;  // anticommuting ones, by index in rows_
  };

  std::vector<Row> identity_rows() const {
    std::vector<Row> rows;
    for (unsigned w = 0; w < wires_; ++w) {
      rows.push_back({std::uint64_t{1} << w, 0, false});
      rows.push_back({0, std::uint64_t{1} << w, false});
    }
    return rows;
  }

  void contribute(const Active& row, double sign) {
    const unsigned weight = row.string.weight();
    const bool is_clifford = row.layer == clifford_layer;
    const double scale =
        sign * (is_clifford ? clifford_scale_ : coefficient_[static_cast<std::size_t>(row.layer)]);
    if (scale == 0) return;
    const auto& value = is_clifford ? clifford_value_ : value_;
    const double rise = value[weight + 1] - value[weight];
    histogram_.add(row.string, weight == 0 ? 0 : scale * (value[weight] - value[weight - 1]), scale * rise);
  }

  // ---- which rotations are looked at, and their layers

  int layer_after(const Active& row) const {
    int layer = 0;
    const int most = static_cast<int>(taste_.layers);
    for (const std::uint32_t before : row.before) {
      if (!rows_[before].is_live) continue;
      layer = std::max(layer, std::min(rows_[before].layer + 1, most));
      if (layer == row.layer) break;  // layers only fall
    }
    return layer;
  }

  void load() {
    while (next_ < network_.exponentials.size() && (live_ < taste_.active)) {
      Active row;
      row.string = network_.exponentials[next_].string;
      row.exponential = static_cast<std::uint32_t>(next_++);
      row.layer = std::numeric_limits<int>::max();
      if (streams_) row.string = seen(row.string);
      const auto index = static_cast<std::uint32_t>(rows_.size());
      for (const std::uint32_t other : order_) {
        if (rows_[other].string.commutes_with(row.string)) continue;
        row.before.push_back(other);
        rows_[other].after.push_back(index);
      }
      row.layer = layer_after(row);
      contribute(row, 1);
      rows_.push_back(std::move(row));
      order_.push_back(index);
      ++live_;
    }
  }

  /// The string as all turns so far have conjugated it.
  Row seen(const Row& string) const {
    Row result;
    int phase = 0;
    for (std::uint64_t left = string.support(); left != 0; left &= left - 1) {
      const auto w = static_cast<unsigned>(std::countr_zero(left));
      const auto letter = static_cast<unsigned>(string.letter(w));
      if (letter & 1) phase += multiply(result, seen_[2 * w]);
      if (letter & 2) phase += multiply(result, seen_[2 * w + 1]);
      if (letter == 3) ++phase;
    }
    result.negative ^= string.negative != ((phase & 2) != 0);
    return result;
  }

  void weigh_clifford(double scale) {
    for (unsigned k = 0; k < 2 * wires_; ++k) contribute(rows_[k], -1);
    clifford_scale_ = scale;
    for (unsigned k = 0; k < 2 * wires_; ++k) contribute(rows_[k], 1);
  }

  void retire(std::uint32_t index) {
    Active& row = rows_[index];
    contribute(row, -1);
    row.is_live = false;
    order_.erase(std::find(order_.begin(), order_.end(), index));
    if (--live_ == 0 && next_ == network_.exponentials.size()) weigh_clifford(1);
    std::vector<std::uint32_t> pending = std::move(row.after);
    while (!pending.empty()) {
      const std::uint32_t later = pending.back();
      pending.pop_back();
      Active& affected = rows_[later];
      if (!affected.is_live) continue;
      const int layer = layer_after(affected);
      if (layer == affected.layer) continue;
      contribute(affected, -1);
      affected.layer = layer;
      contribute(affected, 1);
      pending.insert(pending.end(), affected.after.begin(), affected.after.end());
    }
    row.before.clear();
    row.before.shrink_to_fit();
    load();
  }

  // ---- performing turns

  void put(const Turn& turn) {
    stretches_.add(turn);
    sequence_.turns.push_back(turn);
    // What is free changes on every pair that these wires belong to.
    for (unsigned w = 0; w < wires_; ++w) {
      free_turns_[std::min<unsigned>(turn.a, w) * wires_ + std::max<unsigned>(turn.a, w)] = unknown;
      if (turn.is_pair())
        free_turns_[std::min<unsigned>(turn.b, w) * wires_ + std::max<unsigned>(turn.b, w)] = unknown;
    }
  }

  static Turn quarter_turn(const Move& move) {
    return {static_cast<std::uint8_t>(move.a),
            static_cast<std::uint8_t>(move.b),
            letters[move.p],
            letters[move.q],
            false,
            {pi / 2},
            {}};
  }

  Turn turn_of(const Active& row) const {
    const Exponential& exponential = network_.exponentials[row.exponential];
    Turn turn;
    const std::uint64_t support = row.string.support();
    turn.a = static_cast<std::uint8_t>(std::countr_zero(support));
    turn.la = row.string.letter(turn.a);
    const std::uint64_t rest = support & (support - 1);
    if (rest != 0) {
      turn.b = static_cast<std::uint8_t>(std::countr_zero(rest));
      turn.lb = row.string.letter(turn.b);
    }
    turn.negative = row.string.negative;
    turn.angle = exponential.angle;
    turn.origin = exponential.origin;
    return turn;
  }

  void conjugate_all(const Move& move) {
    const Letter la = letters[move.p], lb = letters[move.q];
    const auto update = [&](Active& row) {
      if (commute(row.string.letter(move.a), la) == commute(row.string.letter(move.b), lb)) return;
      contribute(row, -1);
      conjugate(row.string, move.a, la, move.b, lb, false);
      contribute(row, 1);
    };
    for (unsigned k = 0; k < 2 * wires_; ++k) update(rows_[k]);
    for (const std::uint32_t index : order_) update(rows_[index]);
    if (streams_) {
      for (Row& row : seen_) conjugate(row, move.a, la, move.b, lb, false);
    }
    put(quarter_turn(move));
  }

  void perform(std::uint32_t index) {
    put(turn_of(rows_[index]));
    retire(index);
  }

  /// Performs the ready rotations that need no interaction.
  void perform_singles() {
    for (bool found = true; found;) {
      found = false;
      for (const std::uint32_t index : order_) {
        if (rows_[index].layer != 0 || rows_[index].string.weight() > 1) continue;
        if (rows_[index].string.weight() == 0) {
          retire(index);
        } else {
          perform(index);
        }
        found = true;
        break;
      }
    }
  }

  // ---- choosing turns

  /// Whether the quarter turn costs nothing: a bit a turn, counted once a stretch changes.
  bool is_free(const Move& move) {
    std::uint16_t& mask = free_turns_[move.a * wires_ + move.b];
    if (mask == unknown) {
      mask = 0;
      if (stretches_.open(move.a, move.b) != nullptr) {
        for (unsigned p = 0; p < 3; ++p) {
          for (unsigned q = 0; q < 3; ++q) {
            if (stretches_.interactions_added(quarter_turn({move.a, move.b, p, q})) <= 0) {
              mask |= static_cast<std::uint16_t>(1u << (3 * p + q));
            }
          }
        }
      }
    }
    return mask >> (3 * move.p + move.q) & 1;
  }

  /// Takes the best turn that costs nothing, if there is one.
  bool take_free() {
    for (const std::uint32_t index : order_) {
      if (rows_[index].layer != 0 || rows_[index].string.weight() != 2) continue;
      const Turn turn = turn_of(rows_[index]);
      if (stretches_.open(turn.a, turn.b) == nullptr || stretches_.interactions_added(turn) > 0) continue;
      perform(index);
      return true;
    }
    Move best;
    double best_gain = least_gain;
    for (unsigned a = 0; a < wires_; ++a) {
      for (unsigned b = a + 1; b < wires_; ++b) {
        if (stretches_.open(a, b) == nullptr) continue;
        const auto gains = histogram_.gains(a, b);
        for (unsigned p = 0; p < 3; ++p) {
          for (unsigned q = 0; q < 3; ++q) {
            if (gains[p][q] <= best_gain || !is_free({a, b, p, q})) continue;
            best_gain = gains[p][q];
            best = {a, b, p, q};
          }
        }
      }
    }
    if (best.b == 0) return false;
    conjugate_all(best);
    return true;
  }

  double flavour() { return taste_.noise == 0 ? 1 : 1 + taste_.noise * dice_.real(); }

  /// Takes the turn that lowers the potential most for its one interaction, if any lowers it.
  bool take_best() {
    Move best;
    double best_gain = least_gain;
    std::optional<std::uint32_t> performed;
    for (unsigned a = 0; a < wires_; ++a) {
      for (unsigned b = a + 1; b < wires_; ++b) {
        const auto gains = histogram_.gains(a, b);
        for (unsigned p = 0; p < 3; ++p) {
          for (unsigned q = 0; q < 3; ++q) {
            if (gains[p][q] * (1 + taste_.noise) <= best_gain) continue;
            const double gain = gains[p][q] * flavour();
            if (gain <= best_gain) continue;
            best_gain = gain;
            best = {a, b, p, q};
          }
        }
      }
    }
    for (const std::uint32_t index : order_) {
      if (rows_[index].layer != 0 || rows_[index].string.weight() != 2) continue;
      const Turn turn = turn_of(rows_[index]);
      const auto gains = histogram_.gains(turn.a, turn.b);
      // Once performed, the quarter turn about the same string is free.
      const double follows = std::max(0.0, gains[index_of(turn.la)][index_of(turn.lb)]);
      const double gain = (1 + follows) * flavour();
      if (gain <= best_gain) continue;
      best_gain = gain;
      performed = index;
    }
    if (performed) {
      perform(*performed);
      return true;
    }
    if (best.b == 0) return false;
    conjugate_all(best);
    return true;
  }

  /// Works off the lightest ready rotation, or brings the lightest pair of Clifford rows home.
  void work_off_lightest() {
    std::uint32_t lightest = none;
    for (const std::uint32_t index : order_) {
      if (rows_[index].layer != 0) continue;
      if (lightest == none || rows_[index].string.weight() < rows_[lightest].string.weight())
        lightest = index;
    }
    if (lightest != none) {
      while (rows_[lightest].string.weight() > 2) lighten(lightest, none);
      perform(lightest);
    } else {
      unsigned pair = wires_;
      for (unsigned k = 0; k < wires_; ++k) {
        const unsigned weight = rows_[2 * k].string.weight() + rows_[2 * k + 1].string.weight();
        if (weight == 2) continue;
        if (pair == wires_ || weight < rows_[2 * pair].string.weight() + rows_[2 * pair + 1].string.weight())
          pair = k;
      }
      while (rows_[2 * pair].string.weight() > 1) lighten(2 * pair, none);
      while (rows_[2 * pair + 1].string.weight() > 1) lighten(2 * pair + 1, 2 * pair);
    }
  }

  /// The best turn that takes a letter from the row and leaves the kept row, of weight 1, as it is.
  void lighten(std::uint32_t index, std::uint32_t kept) {
    const Row& row = rows_[index].string;
    Move best;
    double best_gain = -std::numeric_limits<double>::infinity();
    for (unsigned a = 0; a < wires_; ++a) {
      for (unsigned b = a + 1; b < wires_; ++b) {
        const Letter la = row.letter(a), lb = row.letter(b);
        if (la == Letter::I || lb == Letter::I) continue;
        const auto gains = histogram_.gains(a, b);
        for (unsigned p = 0; p < 3; ++p) {
          for (unsigned q = 0; q < 3; ++q) {
            if ((letters[p] == la) == (letters[q] == lb) || gains[p][q] <= best_gain) continue;
            if (kept != none) {
              const Row& other = rows_[kept].string;
              if (commute(other.letter(a), letters[p]) != commute(other.letter(b), letters[q])) continue;
            }
            best_gain = gains[p][q];
            best = {a, b, p, q};
          }
        }
      }
    }
    conjugate_all(best);
  }

  // ---- the end

  bool is_home() const {
    for (unsigned k = 0; k < 2 * wires_; ++k) {
      if (rows_[k].string.weight() != 1) return false;
    }
    return true;
  }

  /// Takes the next turn of a shortest way home where only few wires are not yet there.
  bool step_by_table() {
    std::vector<unsigned> wires, lines;
    std::uint64_t taken = 0;
    for (unsigned k = 0; k < wires_; ++k) {
      const Row& x = rows_[2 * k].string;
      const bool is_alone = x.weight() == 1 && rows_[2 * k + 1].string.weight() == 1;
      if (is_alone && (limits_.may_rename || x.support() == std::uint64_t{1} << k)) {
        taken |= x.support();
      } else {
        lines.push_back(k);
      }
    }
    if (lines.size() < 2 || lines.size() > limits_.tabled_wires) return false;
    for (unsigned w = 0; w < wires_; ++w) {
      if ((taken >> w & 1) == 0) wires.push_back(w);
    }
    std::vector<Row> rows;
    for (const unsigned k : lines) {
      for (unsigned row = 2 * k; row < 2 * k + 2; ++row) {
        Row part;
        for (unsigned i = 0; i < wires.size(); ++i) {
          part.x |= (rows_[row].string.x >> wires[i] & 1) << i;
          part.z |= (rows_[row].string.z >> wires[i] & 1) << i;
        }
        rows.push_back(part);
      }
    }
    const auto step = clifford_step(rows, limits_.may_rename);
    if (!step) return false;
    conjugate_all({wires[step->a], wires[step->b], index_of(step->la), index_of(step->lb)});
    return true;
  }

  void finish() {
    for (unsigned k = 0; k < wires_; ++k) {
      const auto wire = static_cast<unsigned>(std::countr_zero(rows_[2 * k].string.support()));
      sequence_.home.push_back(static_cast<std::uint8_t>(wire));
      append_local_clifford(rows_[2 * k].string, rows_[2 * k + 1].string, wire, sequence_.turns);
    }
    if (limits_.may_rename) return;
    for (unsigned k = 0; k < wires_; ++k) {
      const std::uint8_t wire = sequence_.home[k];
      if (wire == k) continue;
      for (const Letter letter : letters) {
        put({static_cast<std::uint8_t>(k), wire, letter, letter, false, {pi / 2}, {}});
      }
      *std::find(sequence_.home.begin(), sequence_.home.end(), k) = wire;
      sequence_.home[k] = static_cast<std::uint8_t>(k);
    }
  }

  static constexpr std::uint32_t none = 0xffffffffu;

  const Network& network_;
  const Taste& taste_;
  const Limits& limits_;
  Dice& dice_;
  unsigned wires_;
  Histogram histogram_;
  PairStretches stretches_;
  std::vector<std::uint16_t> free_turns_;
  std::array<double, most_wires + 2> value_, clifford_value_;
  std::vector<double> coefficient_;
  std::vector<Active> rows_;          // Clifford rows, then rotations as they are loaded
  std::vector<std::uint32_t> order_;  // live rotations in the order of the source
  std::size_t live_ = 0;
  std::size_t next_ = 0;  // first exponential not yet loaded
  bool streams_ = false;
  std::vector<Row> seen_;      // where the turns so far take X and Z of each wire; kept only while streaming
  double clifford_scale_ = 1;  // 1 once nothing else is left
  Sequence sequence_;
};

}  // namespace

Taste random_taste(Dice& dice) {
  Taste taste;
  taste.power = dice.below(6) == 0 ? 1 : dice.real(0.4, 0.8);
  taste.gamma = dice.real(0.25, 0.5);
  taste.kappa = std::exp(dice.real(std::log(0.015), std::log(0.2)));
  taste.clifford_power = dice.real(0.6, 1.0);
  taste.uses_tables = dice.below(4) != 0;
  taste.noise = dice.below(2) == 0 ? 0 : dice.real(0, 0.2);
  return taste;
}

std::optional<Sequence> greedy_sequence(const Network& network, const Taste& taste, const Limits& limits,
                                        Dice& dice) {
  return Greedy(network, taste, limits, dice).run();
}

}  // namespace isinglass
