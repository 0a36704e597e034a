// See rotation_networks.h.
#include "passes/rotation_networks.h"

#include <algorithm>
#include <cmath>
#include <numeric>
#include <thread>

#include "passes/clifford_table.h"
#include "passes/stretch_rotations.h"
#include "passes/window_search.h"

namespace isinglass {

namespace {

using Clock = std::chrono::steady_clock;

constexpr std::size_t part_length =
    4000;  // turns that are searched together: splicing costs time in proportion

/// A sequence and what it costs.
struct Candidate {
  Sequence sequence;
  Price price;
};

std::vector<std::uint8_t> at_home(unsigned wires) {
  std::vector<std::uint8_t> home(wires);
  std::iota(home.begin(), home.end(), std::uint8_t{0});
  return home;
}

/// Appends `next` to `sequence`: it acts where the first has left things.
void append(Sequence& sequence, const Sequence& next) {
  for (Turn turn : next.turns) {
    turn.a = sequence.home[turn.a];
    if (turn.is_pair()) turn.b = sequence.home[turn.b];
    sequence.turns.push_back(turn);
  }
  std::vector<std::uint8_t> home;
  for (const std::uint8_t wire : next.home) home.push_back(sequence.home[wire]);
  sequence.home = std::move(home);
}

/// Solves one piece on at most 64 wires.
class PieceSolver {
 public:
  PieceSolver(std::vector<Turn> turns, unsigned wires, bool may_rename, const PassContext& context,
              Clock::time_point deadline)
      : source_(std::move(turns)),
        wires_(wires),
        may_rename_(may_rename),
        context_(context),
        begin_(Clock::now()),
        deadline_(deadline) {}

  /// The best sequence found, or nullopt where none is better than the source.
  std::optional<Sequence> run() {
    const double as_it_stands = error_of_pairs(source_);
    push_local_cliffords(source_, wires_);
    Candidate best{{source_, at_home(wires_)}, {}};
    best.price = price(best.sequence);
    const Price before = best.price;
    for (Candidate& candidate : candidates(before)) {
      if (candidate.price.error < best.price.error - 1e-12) best = std::move(candidate);
    }
    search(best, steady_tries(source_.size()));
    // More effort goes on from there, so that it never ends with more.
    if (is_deep() && !is_tabled()) search(best, deep_tries(source_.size()));
    if (best.price.error > as_it_stands - 1e-12) return std::nullopt;
    return std::move(best.sequence);
  }

 private:
  Price price(const Sequence& sequence) const {
    return price_of(sequence.turns, wires_, may_rename_, context_.cost);
  }
  bool is_deep() const { return context_.effort == Effort::deep; }

  /// Every pair turn as an interaction of its own.
  double error_of_pairs(const std::vector<Turn>& turns) const {
    double error = 0;
    for (const Turn& turn : turns) {
      if (!turn.is_pair()) continue;
      const double angle = turn.angle.is_known() ? std::abs(std::remainder(turn.angle.constant, pi)) : pi / 2;
      if (angle > least_interaction) error += context_.cost.interaction(angle) + 2 * context_.cost.pulse;
    }
    return error;
  }

  // ---- starts

  std::vector<Candidate> candidates(const Price& before) {
    std::vector<Candidate> found;
    if (!is_promising()) return found;
    const Network network = network_of(source_, wires_);
    const Network backwards = network_of(inverted(source_), wires_);
    Limits limits{before.interactions, may_rename_, may_rename_ || is_deep() ? 4u : 3u};
    const auto add = [&](std::optional<Sequence> sequence) {
      if (!sequence) return;
      const Price its = price(*sequence);
      limits.interactions = std::min(limits.interactions, its.interactions + its.interactions / 4);
      found.push_back({std::move(*sequence), its});
    };
    Dice dice(context_.seed);
    add(blockwise(network, limits, dice));
    // A greedy pass costs about as many steps as rotations, times rotations in sight.
    const double work = static_cast<double>(network.exponentials.size()) *
                        static_cast<double>(std::min<std::size_t>(network.exponentials.size(), 1500)) *
                        wires_;
    const int restarts = static_cast<int>(std::clamp(2e6 / (work + 1), 1.0, 12.0));
    for (int restart = 0; restart < restarts; ++restart) {
      if (restart > 0 && Clock::now() > begin_ + (deadline_ - begin_) / 8) break;
      const Taste taste = restart == 0 ? Taste() : random_taste(dice);
      const bool is_backwards = restart % 2 == 1;
      auto sequence = greedy_sequence(is_backwards ? backwards : network, taste, limits, dice);
      if (sequence && is_backwards) sequence = inverted(*sequence);
      add(std::move(sequence));
    }
    return found;
  }

  /// Whether a greedy network of the beginning of a long piece is any better than the source there.
  bool is_promising() {
    constexpr std::size_t sample = 1500;
    if (source_.size() <= 2 * sample) return true;
    const std::vector<Turn> start(source_.begin(), source_.begin() + sample);
    Dice dice(context_.seed);
    const int most = price_of(start, wires_, may_rename_, context_.cost).interactions;
    return greedy_sequence(network_of(start, wires_), Taste(), {most, may_rename_}, dice).has_value();
  }

  /// One set of commuting rotations after the other, each solved with everything brought home behind it.
  std::optional<Sequence> blockwise(const Network& network, const Limits& limits, Dice& dice) {
    Sequence result{{}, at_home(wires_)};
    const std::vector<Row> identity = network_of({}, wires_).rows;
    std::size_t i = 0;
    while (i <= network.exponentials.size()) {
      Network block{wires_, {}, identity};
      for (; i < network.exponentials.size(); ++i) {
        const Exponential& next = network.exponentials[i];
        if (!std::all_of(block.exponentials.begin(), block.exponentials.end(),
                         [&](const Exponential& other) { return other.string.commutes_with(next.string); })) {
          break;
        }
        block.exponentials.push_back(next);
      }
      if (i == network.exponentials.size()) {
        block.rows = network.rows;  // the last block ends in the Clifford
        ++i;
      }
      const auto solved = greedy_sequence(block, Taste(), limits, dice);
      if (!solved) return std::nullopt;
      append(result, *solved);
    }
    return result;
  }

  // ---- improvement

  /// Windows to try, for a source of that many turns.
  static std::uint64_t steady_tries(std::uint64_t turns) {
    return std::min({20 * turns, 300 + turns, 10000 + turns / 3});
  }
  std::uint64_t deep_tries(std::uint64_t turns) const {
    return deadline_ == Clock::time_point::max() ? 20000 + 100 * turns
                                                 : std::numeric_limits<std::uint64_t>::max();
  }
  /// Whether the piece is a Clifford that the table has solved.
  bool is_tabled() const {
    return wires_ <= most_tabled_wires && may_rename_ && network_of(source_, wires_).exponentials.empty();
  }

  /// Searches windows, in parts where the sequence is long.
  void search(Candidate& best, std::uint64_t tries) {
    std::vector<Turn>& turns = best.sequence.turns;
    const std::size_t parts = (turns.size() + part_length - 1) / part_length;
    Sequence result{{}, at_home(wires_)};
    const auto begin = Clock::now();
    for (std::size_t part = 0; part < parts; ++part) {
      const auto from = static_cast<std::ptrdiff_t>(turns.size() * part / parts);
      const auto to = static_cast<std::ptrdiff_t>(turns.size() * (part + 1) / parts);
      Sequence piece{{turns.begin() + from, turns.begin() + to}, at_home(wires_)};
      auto deadline = deadline_;
      if (deadline != Clock::time_point::max()) {
        deadline = begin + (deadline_ - begin) * static_cast<int>(part + 1) / static_cast<int>(parts);
      }
      search_part(piece, tries / parts, deadline, part);
      append(result, piece);
    }
    append(result, {{}, best.sequence.home});
    const Price after = price(result);
    if (after.error < best.price.error) best = {std::move(result), after};
  }

  /// The more windows can be tried, the hotter the search may start (measured on coupled cluster).
  static double heat(std::uint64_t tries, Clock::time_point deadline, std::size_t turns) {
    constexpr double per_second = 15000;
    double windows = static_cast<double>(tries);
    if (deadline != Clock::time_point::max()) {
      const double seconds = std::chrono::duration<double>(deadline - Clock::now()).count();
      windows = std::min(windows, std::max(0.0, seconds) * per_second);
    }
    return std::min(2.5, 0.27 * std::sqrt(windows / static_cast<double>(turns)));
  }

  /// As many searches side by side as there are threads; the best of them counts.
  void search_part(Sequence& piece, std::uint64_t tries, Clock::time_point deadline, std::size_t part) {
    if (piece.turns.empty()) return;
    SearchPlan plan{context_.cost, may_rename_, tries, deadline, heat(tries, deadline, piece.turns.size())};
    std::vector<Sequence> sequences(std::max(1u, context_.threads), piece);
    std::vector<Price> prices(sequences.size());
    const auto work = [&](std::size_t island) {
      Dice dice(context_.seed + 0x1000003 * (part + 1) + 0x10001 * island);
      prices[island] = search_windows(sequences[island], wires_, plan, dice);
    };
    std::vector<std::thread> threads;
    for (std::size_t island = 1; island < sequences.size(); ++island) threads.emplace_back(work, island);
    work(0);
    for (std::thread& thread : threads) thread.join();
    const auto best = std::min_element(prices.begin(), prices.end(),
                                       [](const Price& a, const Price& b) { return a.error < b.error; });
    piece = std::move(sequences[static_cast<std::size_t>(best - prices.begin())]);
  }

  std::vector<Turn> source_;
  unsigned wires_;
  bool may_rename_;
  const PassContext& context_;
  Clock::time_point begin_, deadline_;
};

/// A run of rotations on at most 64 wires, its wires numbered.
struct Part {
  std::vector<Turn> turns;
  std::vector<std::uint32_t> wire;  // of each number
};

/// Cuts rotations into parts of at most 64 wires.
std::vector<Part> parts_of(const std::vector<LocalRotation>& rotations, std::uint32_t wires) {
  constexpr std::uint8_t absent = 0xff;
  std::vector<std::uint8_t> number(wires, absent);
  std::vector<Part> parts(1);
  for (const LocalRotation& rotation : rotations) {
    const int ends = rotation.is_pair() ? 2 : 1;
    std::size_t fresh = 0;
    for (int side = 0; side < ends; ++side) fresh += number[rotation.wire[side]] == absent;
    if (parts.back().wire.size() + fresh > most_wires) {
      for (const std::uint32_t wire : parts.back().wire) number[wire] = absent;
      parts.emplace_back();
    }
    Part& part = parts.back();
    Turn turn{0, 0, rotation.letter[0], rotation.letter[1], false, rotation.angle, rotation.origin};
    for (int side = 0; side < ends; ++side) {
      std::uint8_t& n = number[rotation.wire[side]];
      if (n == absent) {
        n = static_cast<std::uint8_t>(part.wire.size());
        part.wire.push_back(rotation.wire[side]);
      }
      (side == 0 ? turn.a : turn.b) = n;
    }
    part.turns.push_back(turn);
  }
  return parts;
}

/// Shares the time out among pieces by their sizes.
class TimeTable {
 public:
  TimeTable(const Circuit& circuit, Clock::time_point deadline) : deadline_(deadline) {
    Circuit copy = circuit;
    rewrite_pieces(copy, [&](Circuit&, std::vector<LocalRotation> piece, bool) {
      left_ += piece.size();
      return std::optional<RewrittenPiece>();
    });
  }
  /// When to be done with the next `size` rotations.
  Clock::time_point next(std::size_t size) {
    if (deadline_ == Clock::time_point::max()) return deadline_;
    const auto now = Clock::now();
    const double share = static_cast<double>(size) / static_cast<double>(std::max<std::size_t>(left_, 1));
    left_ -= std::min(size, left_);
    const auto time =
        std::chrono::duration<double>(std::max(deadline_ - now, Clock::duration::zero())) * share;
    return now + std::chrono::duration_cast<Clock::duration>(time);
  }

 private:
  Clock::time_point deadline_;
  std::size_t left_ = 0;  // rotations
};

}  // namespace

Circuit synthesize_rotation_networks(Circuit circuit, const PassContext& context) {
  if (context.effort == Effort::quick) return circuit;
  TimeTable time(circuit, context.deadline);
  rewrite_pieces(circuit, [&](Circuit& owner, std::vector<LocalRotation> piece, bool may_rename) {
    RewrittenPiece result;
    std::vector<std::uint32_t> where(owner.wires);
    std::iota(where.begin(), where.end(), 0u);
    bool is_better = false;
    for (Part& part : parts_of(piece, owner.wires)) {
      const auto wires = static_cast<unsigned>(part.wire.size());
      const auto deadline = time.next(part.turns.size());
      Sequence sequence{part.turns, at_home(wires)};
      if (auto solved = PieceSolver(std::move(part.turns), wires, may_rename, context, deadline).run()) {
        sequence = std::move(*solved);
        is_better = true;
      }
      const WrittenSequence rewritten = written(sequence, wires, may_rename, context.cost, owner);
      for (LocalRotation rotation : rewritten.rotations) {
        for (std::uint32_t& wire : rotation.wire) wire = where[part.wire[wire]];
        result.rotations.push_back(rotation);
      }
      std::vector<std::uint32_t> moved = where;
      for (unsigned k = 0; k < wires; ++k) moved[part.wire[k]] = where[part.wire[rewritten.home[k]]];
      where = std::move(moved);
    }
    if (!is_better) return std::optional<RewrittenPiece>();
    for (std::uint32_t wire = 0; wire < owner.wires; ++wire) {
      if (where[wire] != wire) result.moved.emplace_back(wire, where[wire]);
    }
    return std::optional<RewrittenPiece>(std::move(result));
  });
  return circuit;
}

}  // namespace isinglass
