// Would it pay to diagonalize commuting sets together? Interactions of sets of commuting Pauli rotations,
// means over ten of a family: solved by the greedy networks as they are (`engine`); with a Clifford in front
// that turns all strings into one letter a wire, and its inverse in the end (van den Berg, Temme, Quantum 4,
// 322 (2020), from memory; here by eliminating the lightest string first), between them the greedy networks
// again
// (`diagonalized`) or a parity network in Gray-code order (Amy, Azimzadeh, Mosca, Quantum Science and
// Technology 4, 015002 (2018), from memory; `parity`). Known angles, wires renamed, the best of twelve tastes
// each, counted after stretches have merged. `wins`: sets on which diagonalizing first took fewer.
//
//   build/bench_commuting_sets
#include <benchmark/benchmark.h>

#include <algorithm>
#include <bit>
#include <limits>
#include <random>

#include "passes/greedy_network.h"

namespace {

using namespace isinglass;

using Set = std::vector<Exponential>;
using Random = std::mt19937_64;

constexpr std::array<Letter, 3> letters = {Letter::X, Letter::Y, Letter::Z};
constexpr int sets = 10;

Turn pair_turn(unsigned a, Letter la, unsigned b, Letter lb) {
  return {static_cast<std::uint8_t>(a), static_cast<std::uint8_t>(b), la, lb, false, {pi / 2}, {}};
}

Turn single_turn(unsigned a, Letter letter, Angle angle) {
  return {static_cast<std::uint8_t>(a), 0, letter, Letter::I, false, angle, {}};
}

/// The fewest interactions of `first` followed by a network that does the rest.
int best_of(const Network& rest, const std::vector<Turn>& first) {
  int best = std::numeric_limits<int>::max();
  for (unsigned seed = 1; seed <= 12; ++seed) {
    Dice dice(seed);
    const Taste taste = seed == 1 ? Taste() : random_taste(dice);
    const auto sequence = greedy_sequence(rest, taste, {}, dice);
    if (!sequence) continue;
    std::vector<Turn> turns = first;
    turns.insert(turns.end(), sequence->turns.begin(), sequence->turns.end());
    best = std::min(best, price_of(turns, rest.wires, true, {}).interactions);
  }
  return best;
}

/// The only letter of the wire in all strings, I where there is none, or nothing where there are several.
std::optional<Letter> letter_of(const Set& set, unsigned wire) {
  Letter found = Letter::I;
  for (const Exponential& e : set) {
    const Letter letter = e.string.letter(wire);
    if (letter == Letter::I || letter == found) continue;
    if (found != Letter::I) return std::nullopt;
    found = letter;
  }
  return found;
}

/// Turns that leave one letter a wire; the set becomes what they make of it. Strings commute, so a wire that
/// is the only mixed one of a string has one letter in all.
std::vector<Turn> diagonalize(Set& set, unsigned wires) {
  std::vector<Turn> turns;
  while (true) {
    std::uint64_t mixed = 0;
    for (unsigned w = 0; w < wires; ++w) mixed |= std::uint64_t{!letter_of(set, w)} << w;
    const auto weight = [&](const Exponential& e) { return std::popcount(e.string.support() & mixed); };
    const Row* lightest = nullptr;
    for (const Exponential& e : set) {
      if (weight(e) < 2) continue;
      if (lightest == nullptr || weight(e) < std::popcount(lightest->support() & mixed)) lightest = &e.string;
    }
    if (lightest == nullptr) return turns;
    const std::uint64_t support = lightest->support() & mixed;
    const auto a = static_cast<unsigned>(std::countr_zero(support));
    const auto b = static_cast<unsigned>(63 - std::countl_zero(support));
    Turn best;
    unsigned least = std::numeric_limits<unsigned>::max();
    for (const Letter p : letters) {
      for (const Letter q : letters) {
        if ((p == lightest->letter(a)) == (q == lightest->letter(b))) continue;
        unsigned sum = 0;
        for (const Exponential& e : set) {
          Row row = e.string;
          conjugate(row, a, p, b, q, false);
          sum += row.weight();
        }
        if (sum >= least) continue;
        least = sum;
        best = pair_turn(a, p, b, q);
      }
    }
    for (Exponential& e : set) conjugate(e.string, best.a, best.la, best.b, best.lb, false);
    turns.push_back(best);
  }
}

/// Turns that perform a diagonal set by CNOTs in Gray-code order, and the Clifford turns among them.
class ParityNetwork {
 public:
  ParityNetwork(const Set& set, unsigned wires) : set_(set), wires_(wires) {
    for (unsigned w = 0; w < wires; ++w) {
      letter_.push_back(letter_of(set, w).value_or(Letter::Z));
      if (letter_[w] == Letter::I) letter_[w] = Letter::Z;
      parity_.push_back(std::uint64_t{1} << w);
    }
    Job all{{}, (std::uint64_t{1} << wires) - 1, none};
    for (const Exponential& e : set) {
      all.parities.push_back(e.string.support());
      wanted_.push_back(e.string.support());
    }
    rotate_what_is_there();
    for (jobs_.push_back(all); !jobs_.empty();) work();
  }

  std::vector<Turn> turns, cliffords;

 private:
  static constexpr unsigned none = 64;

  struct Job {
    std::vector<std::uint64_t> parities;  // in terms of what the wires hold by now
    std::uint64_t columns;
    unsigned target;
  };

  void work() {
    Job job = std::move(jobs_.back());
    jobs_.pop_back();
    if (job.parities.empty()) return;
    for (unsigned j = 0; job.target != none && j < wires_; ++j) {
      const bool is_common = std::all_of(job.parities.begin(), job.parities.end(),
                                         [&](std::uint64_t parity) { return (parity >> j & 1) != 0; });
      if (j == job.target || !is_common) continue;
      jobs_.push_back(std::move(job));
      add_cnot(j, jobs_.back().target);
      job = std::move(jobs_.back());
      jobs_.pop_back();
    }
    if (job.columns == 0) return;
    const auto ones = [&](unsigned column) {
      return std::count_if(job.parities.begin(), job.parities.end(),
                           [&](std::uint64_t parity) { return (parity >> column & 1) != 0; });
    };
    const auto all = static_cast<std::ptrdiff_t>(job.parities.size());
    unsigned best = none;
    for (unsigned c = 0; c < wires_; ++c) {
      if ((job.columns >> c & 1) == 0) continue;
      if (best == none || std::max(ones(c), all - ones(c)) > std::max(ones(best), all - ones(best))) best = c;
    }
    const std::uint64_t columns = job.columns & ~(std::uint64_t{1} << best);
    Job without{{}, columns, job.target}, with{{}, columns, job.target == none ? best : job.target};
    for (const std::uint64_t parity : job.parities) {
      ((parity >> best & 1) != 0 ? with : without).parities.push_back(parity);
    }
    jobs_.push_back(std::move(with));
    jobs_.push_back(std::move(without));
  }

  void add_cnot(unsigned control, unsigned target) {
    const Letter flip = letter_[target] == Letter::X ? Letter::Z : Letter::X;
    for (const Turn& turn :
         {pair_turn(control, letter_[control], target, flip),
          single_turn(control, letter_[control], {-pi / 2}), single_turn(target, flip, {-pi / 2})}) {
      turns.push_back(turn);
      cliffords.push_back(turn);
    }
    parity_[target] ^= parity_[control];
    for (Job& job : jobs_) {
      for (std::uint64_t& parity : job.parities) {
        if ((parity >> target & 1) != 0) parity ^= std::uint64_t{1} << control;
      }
    }
    rotate_what_is_there();
  }

  void rotate_what_is_there() {
    for (std::size_t k = 0; k < set_.size(); ++k) {
      for (unsigned w = 0; w < wires_ && wanted_[k] != 0; ++w) {
        if (parity_[w] != wanted_[k]) continue;
        turns.push_back(single_turn(w, letter_[w], set_[k].angle));
        wanted_[k] = 0;
      }
    }
  }

  const Set& set_;
  unsigned wires_;
  std::vector<Letter> letter_;         // of each wire
  std::vector<std::uint64_t> parity_;  // that each wire holds
  std::vector<std::uint64_t> wanted_;  // 0 once it is done
  std::vector<Job> jobs_;
};

// ---- families

double some_angle(Random& random) {
  return std::uniform_real_distribution<double>(0.1, 1.4)(random);
}

Set diagonal_set(Random& random, unsigned wires, unsigned count, unsigned lightest, unsigned heaviest) {
  Set set;
  while (set.size() < count) {
    const unsigned weight = lightest + static_cast<unsigned>(random() % (heaviest - lightest + 1));
    Row row;
    while (row.weight() < weight) row.z |= std::uint64_t{1} << random() % wires;
    const bool is_new = std::none_of(set.begin(), set.end(),
                                     [&](const Exponential& e) { return e.string.same_letters(row); });
    if (is_new) set.push_back({row, {some_angle(random)}, {}});
  }
  return set;
}

/// Diagonal strings behind a random Clifford of that many turns a wire.
Set hidden_set(Random& random, unsigned wires, unsigned depth) {
  Set set = diagonal_set(random, wires, 3 * wires, 1, 4);
  for (unsigned k = 0; k < depth * wires; ++k) {
    const auto a = static_cast<unsigned>(random() % wires);
    const auto b = static_cast<unsigned>((a + 1 + random() % (wires - 1)) % wires);
    const Letter la = letters[random() % 3], lb = letters[random() % 3];
    for (Exponential& e : set) conjugate(e.string, a, la, b, lb, false);
  }
  return set;
}

/// The eight strings of a double excitation (Jordan-Wigner), on every four wires or on two fours far apart.
Set excitations(Random& random, unsigned wires, bool is_long) {
  Set set;
  const unsigned fours = is_long ? 2 : wires / 4;
  for (unsigned k = 0; k < fours; ++k) {
    const std::array<unsigned, 4> orbital =
        is_long ? std::array<unsigned, 4>{k, wires / 3 + k, wires / 2 + k, wires - 1 - k}
                : std::array<unsigned, 4>{4 * k, 4 * k + 1, 4 * k + 2, 4 * k + 3};
    const double angle = some_angle(random);
    Set eight;
    for (unsigned ys = 0; ys < 16; ++ys) {
      if (std::popcount(ys) % 2 == 0) continue;
      Row row;
      for (unsigned j = 0; j < 4; ++j) {
        row.x |= std::uint64_t{1} << orbital[j];
        row.z |= std::uint64_t{ys >> j & 1} << orbital[j];
      }
      for (unsigned w = orbital[0] + 1; w < orbital[1]; ++w) row.z |= std::uint64_t{1} << w;
      for (unsigned w = orbital[2] + 1; w < orbital[3]; ++w) row.z |= std::uint64_t{1} << w;
      row.negative = random() % 2 == 0;
      eight.push_back({row, {angle}, {}});
    }
    const bool commutes = std::all_of(eight.begin(), eight.end(), [&](const Exponential& e) {
      return std::all_of(set.begin(), set.end(),
                         [&](const Exponential& other) { return other.string.commutes_with(e.string); });
    });
    if (commutes) set.insert(set.end(), eight.begin(), eight.end());
  }
  return set;
}

template <typename Make>
void compare(benchmark::State& state, Make make) {
  const auto wires = static_cast<unsigned>(state.range(0));
  Random random(5);
  double engine = 0, diagonalized = 0, parity = 0, wins = 0;
  for (auto _ : state) {
    for (int k = 0; k < sets; ++k) {
      Set set = make(random, wires);
      const int as_it_is = best_of({wires, set, network_of({}, wires).rows}, {});
      const std::vector<Turn> first = diagonalize(set, wires);
      const int between = best_of({wires, set, network_of(inverted(first), wires).rows}, first);
      const ParityNetwork network(set, wires);
      std::vector<Turn> turns = first, cliffords = first;
      turns.insert(turns.end(), network.turns.begin(), network.turns.end());
      cliffords.insert(cliffords.end(), network.cliffords.begin(), network.cliffords.end());
      const int gray = best_of({wires, {}, network_of(inverted(cliffords), wires).rows}, turns);
      engine += as_it_is;
      diagonalized += between;
      parity += gray;
      wins += std::min(between, gray) < as_it_is;
    }
  }
  state.counters["engine"] = engine / sets;
  state.counters["diagonalized"] = diagonalized / sets;
  state.counters["parity"] = parity / sets;
  state.counters["wins"] = wins;
}

#define FAMILY(name, make) \
  BENCHMARK_CAPTURE(compare, name, make)->Arg(8)->Arg(12)->Iterations(1)->Unit(benchmark::kMillisecond)
FAMILY(z_weight_3, [](Random& r, unsigned n) { return diagonal_set(r, n, 3 * n, 3, 3); });
FAMILY(z_weight_2_to_4, [](Random& r, unsigned n) { return diagonal_set(r, n, 4 * n, 2, 4); });
FAMILY(z_any_weight, [](Random& r, unsigned n) { return diagonal_set(r, n, 3 * n, 2, n); });
FAMILY(hidden_shallow, [](Random& r, unsigned n) { return hidden_set(r, n, 1); });
FAMILY(hidden_deep, [](Random& r, unsigned n) { return hidden_set(r, n, 3); });
FAMILY(double_excitations, [](Random& r, unsigned n) { return excitations(r, n, false); });
FAMILY(long_double_excitations, [](Random& r, unsigned n) { return excitations(r, n, true); });

}  // namespace
