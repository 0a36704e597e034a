// See clifford_table.h.
#include "passes/clifford_table.h"

#include <algorithm>
#include <array>
#include <mutex>
#include <unordered_map>

namespace isinglass {

namespace {

constexpr std::array<Letter, 3> letters = {Letter::X, Letter::Z, Letter::Y};

/// A Pauli string on up to four wires without its sign, two bits a wire: letter of wire w at bit 2 w.
using Word = std::uint8_t;
/// Two words of each wire's line; the third is their product.
using Lines = std::array<std::array<Word, 2>, most_tabled_wires>;

/// What quarter turns do to a word: the product with the axis where they anticommute.
Word turned(Word word, Word axis) {
  const unsigned x = word & 0x55u, z = word >> 1 & 0x55u, ax = axis & 0x55u, az = axis >> 1 & 0x55u;
  return std::popcount((x & az) ^ (z & ax)) % 2 == 0 ? word : static_cast<Word>(word ^ axis);
}

Word axis_word(unsigned a, Letter la, unsigned b, Letter lb) {
  return static_cast<Word>(static_cast<unsigned>(la) << 2 * a | static_cast<unsigned>(lb) << 2 * b);
}

Lines lines_of(std::span<const Row> rows) {
  Lines lines{};
  for (std::size_t k = 0; k < rows.size(); ++k) {
    for (unsigned w = 0; w < rows.size() / 2; ++w) {
      lines[k / 2][k % 2] |= static_cast<Word>(static_cast<unsigned>(rows[k].letter(w)) << 2 * w);
    }
  }
  return lines;
}

Lines turned(Lines lines, unsigned wires, Word axis) {
  for (unsigned k = 0; k < wires; ++k) {
    for (Word& word : lines[k]) word = turned(word, axis);
  }
  return lines;
}

/// The least description of lines over all renamings of letters.
class Key {
 public:
  Key(unsigned wires, bool may_rename) : wires_(wires), may_rename_(may_rename) {}

  std::uint64_t operator()(const Lines& lines) {
    for (unsigned k = 0; k < wires_; ++k) {
      words_[k] = {lines[k][0], lines[k][1], static_cast<Word>(lines[k][0] ^ lines[k][1])};
    }
    best_ = ~std::uint64_t{0};
    find_signatures();
    try_renamings(0);
    return best_;
  }

 private:
  /// What a letter of a wire looks like from outside, whatever it and the lines are called: a sum of hashes
  /// of the strings that carry it.
  void find_signatures() {
    for (auto& wire : signature_) wire = {};
    for (unsigned k = 0; k < wires_; ++k) {
      unsigned shape = 0;  // weights of the line's strings, in any order
      for (const Word word : words_[k]) shape += 1u << 4 * weight(word);
      if (!may_rename_) shape |= k << 24;
      for (const Word word : words_[k]) {
        const std::uint64_t hash = (shape * 16 + weight(word)) * 0x9e3779b97f4a7c15u;
        for (unsigned w = 0; w < wires_; ++w) {
          signature_[w][word >> 2 * w & 3] += (hash ^ hash >> 29) * (hash >> 11 | 1);
        }
      }
    }
  }
  static unsigned weight(Word word) {
    return static_cast<unsigned>(std::popcount((word | word >> 1) & 0x55u));
  }

  /// Renames the letters of wires from `wire` on in all ways that keep their signatures in order.
  void try_renamings(unsigned wire) {
    if (wire == wires_) {
      best_ = std::min(best_, description());
      return;
    }
    std::array<unsigned, 3> order = {1, 2, 3};
    const auto& signature = signature_[wire];
    do {
      if (signature[order[0]] > signature[order[1]] || signature[order[1]] > signature[order[2]]) continue;
      for (unsigned rank = 0; rank < 3; ++rank) renamed_[wire][order[rank]] = rank + 1;
      try_renamings(wire + 1);
    } while (std::next_permutation(order.begin(), order.end()));
  }

  std::uint64_t description() const {
    std::array<unsigned, most_tabled_wires> line{};
    for (unsigned k = 0; k < wires_; ++k) {
      std::array<unsigned, 3> words{};
      for (unsigned i = 0; i < 3; ++i) {
        for (unsigned w = 0; w < wires_; ++w) words[i] |= renamed_[w][words_[k][i] >> 2 * w & 3] << 2 * w;
      }
      const unsigned low = std::min({words[0], words[1], words[2]});
      const unsigned high = std::max({words[0], words[1], words[2]});
      line[k] = low << 8 | high;
    }
    if (may_rename_) std::sort(line.begin(), line.end());  // lines that there are not come first, as 0
    std::uint64_t key = 0;
    for (const unsigned words : line) key = key << 16 | words;
    return key;
  }

  unsigned wires_;
  bool may_rename_;
  std::array<std::array<Word, 3>, most_tabled_wires> words_{};
  std::array<std::array<std::uint64_t, 4>, most_tabled_wires> signature_{};
  std::array<std::array<unsigned, 4>, most_tabled_wires> renamed_{};
  std::uint64_t best_ = 0;
};

/// Calls visit(a, la, b, lb) for every two-letter axis.
template <class Visit>
void for_each_axis(unsigned wires, Visit visit) {
  for (unsigned a = 0; a < wires; ++a) {
    for (unsigned b = a + 1; b < wires; ++b) {
      for (const Letter la : letters) {
        for (const Letter lb : letters) visit(a, la, b, lb);
      }
    }
  }
}

using Distances = std::unordered_map<std::uint64_t, int>;

Distances breadth_first(unsigned wires, bool may_rename) {
  Distances distance;
  Key key(wires, may_rename);
  Lines identity{};
  for (unsigned k = 0; k < wires; ++k)
    identity[k] = {axis_word(k, Letter::X, k, Letter::I), axis_word(k, Letter::Z, k, Letter::I)};
  distance.emplace(key(identity), 0);
  std::vector<Lines> front = {identity};
  for (int steps = 1; !front.empty(); ++steps) {
    std::vector<Lines> next;
    for (const Lines& lines : front) {
      for_each_axis(wires, [&](unsigned a, Letter la, unsigned b, Letter lb) {
        const Lines neighbour = turned(lines, wires, axis_word(a, la, b, lb));
        if (distance.emplace(key(neighbour), steps).second) next.push_back(neighbour);
      });
    }
    front = std::move(next);
  }
  return distance;
}

const Distances& distances(unsigned wires, bool may_rename) {
  static std::array<std::once_flag, 2 * (most_tabled_wires + 1)> once;
  static std::array<Distances, 2 * (most_tabled_wires + 1)> tables;
  const std::size_t which = 2 * wires + may_rename;
  std::call_once(once[which], [&] { tables[which] = breadth_first(wires, may_rename); });
  return tables[which];
}

}  // namespace

int clifford_distance(std::span<const Row> rows, bool may_rename) {
  const auto wires = static_cast<unsigned>(rows.size() / 2);
  return distances(wires, may_rename).at(Key(wires, may_rename)(lines_of(rows)));
}

std::optional<Turn> clifford_step(std::span<const Row> rows, bool may_rename) {
  const auto wires = static_cast<unsigned>(rows.size() / 2);
  const Distances& distance = distances(wires, may_rename);
  const Lines lines = lines_of(rows);
  Key key(wires, may_rename);
  const int here = distance.at(key(lines));
  std::optional<Turn> step;
  if (here == 0) return step;
  for_each_axis(wires, [&](unsigned a, Letter la, unsigned b, Letter lb) {
    if (step || distance.at(key(turned(lines, wires, axis_word(a, la, b, lb)))) != here - 1) return;
    step = Turn{static_cast<std::uint8_t>(a), static_cast<std::uint8_t>(b), la, lb, false, {pi / 2}, {}};
  });
  return step;
}

std::size_t clifford_classes(unsigned wires, bool may_rename) {
  return distances(wires, may_rename).size();
}

}  // namespace isinglass
