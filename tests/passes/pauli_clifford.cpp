// Fewest interactions of Clifford unitaries, against a search of the whole group written here, and random
// circuits.
#include <doctest/doctest.h>

#include <algorithm>
#include <bit>
#include <deque>
#include <map>
#include <set>

#include "passes/clifford_table.h"
#include "passes/greedy_network.h"
#include "passes/local_rotations.h"
#include "passes/rotation_networks.h"
#include "support/families_textbook.h"
#include "support/random_circuits.h"
#include "support/simulator.h"

using namespace isinglass;

namespace {

/// The images of X and Z of every wire on n wires, phases left out: x bits low, z bits above.
using Images = std::vector<unsigned>;

bool anticommute(unsigned p, unsigned q, unsigned n) {
  const unsigned mask = (1u << n) - 1;
  return std::popcount((p & (q >> n) & mask) ^ ((p >> n) & q & mask)) % 2 == 1;
}

Images turned(Images images, unsigned axis, unsigned n) {
  for (unsigned& image : images) {
    if (anticommute(image, axis, n)) image ^= axis;
  }
  return images;
}

/// The same unitary up to one-wire gates afterwards, and up to the order of wires where that is free.
std::vector<std::vector<unsigned>> lines_of(const Images& images, bool may_rename) {
  std::vector<std::vector<unsigned>> lines;
  for (std::size_t k = 0; k < images.size(); k += 2) {
    std::vector<unsigned> line = {images[k], images[k + 1], images[k] ^ images[k + 1]};
    std::sort(line.begin(), line.end());
    lines.push_back(line);
  }
  if (may_rename) std::sort(lines.begin(), lines.end());
  return lines;
}

/// Fewest two-wire quarter turns of every element, by a search in which one-wire turns cost nothing.
std::map<std::vector<std::vector<unsigned>>, int> whole_group(unsigned n, bool may_rename) {
  std::map<std::vector<std::vector<unsigned>>, int> distance;
  std::deque<std::pair<Images, int>> queue;
  Images identity;
  for (unsigned k = 0; k < n; ++k) {
    identity.push_back(1u << k);
    identity.push_back(1u << (k + n));
  }
  queue.emplace_back(identity, 0);
  while (!queue.empty()) {
    const auto [images, steps] = queue.front();
    queue.pop_front();
    if (!distance.emplace(lines_of(images, may_rename), steps).second) continue;
    for (unsigned axis = 1; axis < 1u << (2 * n); ++axis) {
      const int weight = std::popcount((axis | axis >> n) & ((1u << n) - 1));
      if (weight == 1) queue.emplace_front(turned(images, axis, n), steps);
      if (weight == 2) queue.emplace_back(turned(images, axis, n), steps + 1);
    }
  }
  return distance;
}

std::vector<Row> rows_of(const Images& images, unsigned n) {
  std::vector<Row> rows;
  for (const unsigned image : images) rows.push_back({image & ((1u << n) - 1), image >> n, false});
  return rows;
}

Images random_images(support::Random& random, unsigned n, int turns) {
  Images images;
  for (unsigned k = 0; k < n; ++k) {
    images.push_back(1u << k);
    images.push_back(1u << (k + n));
  }
  for (int t = 0; t < turns; ++t)
    images = turned(images, static_cast<unsigned>(random.below(1 << (2 * n))), n);
  return images;
}

}  // namespace

TEST_CASE("fewest interactions of Cliffords: the whole group on two and three wires") {
  support::Random random(31);
  for (const unsigned n : {2u, 3u}) {
    for (const bool may_rename : {false, true}) {
      const auto distance = whole_group(n, may_rename);
      // |Sp(2n, 2)| = 720 and 1451520, without the 6^n one-wire gates behind and the n! orders (computed).
      const std::size_t expected = (n == 2 ? 720 / 36 : 1451520 / 216) / (may_rename ? (n == 2 ? 2 : 6) : 1);
      CHECK(distance.size() == expected);
      for (int round = 0; round < 500; ++round) {
        const Images images = random_images(random, n, 12);
        CHECK(clifford_distance(rows_of(images, n), may_rename) == distance.at(lines_of(images, may_rename)));
      }
    }
  }
  // Local, controlled not, double controlled not, swap (computed).
  CHECK(clifford_classes(2, false) == 4);
  CHECK(clifford_classes(2, true) == 2);
}

TEST_CASE("fewest interactions of Cliffords: shortest ways on four wires") {
  support::Random random(32);
  int deepest = 0;
  for (int round = 0; round < 300; ++round) {
    std::vector<Row> rows = rows_of(random_images(random, 4, 1 + round % 20), 4);
    int left = clifford_distance(rows, true);
    deepest = std::max(deepest, left);
    while (const auto step = clifford_step(rows, true)) {
      // Every neighbour is at most one step nearer, so that no way is shorter.
      const Letter letters[] = {Letter::X, Letter::Y, Letter::Z};
      for (unsigned a = 0; a < 4; ++a) {
        for (unsigned b = 0; b < a; ++b) {
          std::vector<Row> neighbour = rows;
          const Letter la = letters[random.below(3)], lb = letters[random.below(3)];
          for (Row& row : neighbour) conjugate(row, a, la, b, lb, false);
          CHECK(clifford_distance(neighbour, true) >= left - 1);
        }
      }
      for (Row& row : rows) conjugate(row, step->a, step->la, step->b, step->lb, false);
      --left;
      REQUIRE(clifford_distance(rows, true) == left);
    }
    CHECK(left == 0);
    for (const Row& row : rows) CHECK(row.weight() == 1);
  }
  MESSAGE("deepest of four wires met: " << deepest);
}

TEST_CASE("random Clifford circuits come out with the fewest interactions on two, three and four wires") {
  support::Random random(33);
  for (int round = 0; round < 60; ++round) {
    const int qubits = 2 + round % 3;
    const Circuit source =
        support::random_circuit(random, {qubits, 10 + 2 * round, 1, support::Family::clifford});
    const Circuit result = synthesize_rotation_networks(source, {});
    CHECK(support::distance(source, result) < 1e-8);
    const std::optional<Network> network = support::network_of_circuit(source);
    REQUIRE(network);
    REQUIRE(network->exponentials.empty());
    CHECK(static_cast<int>(tally_of(result).xx) == clifford_distance(network->rows, true));
  }
}

TEST_CASE("random Clifford circuits on six and eight wires: never more with more effort") {
  support::Random random(34);
  for (int round = 0; round < 4; ++round) {
    const int qubits = round % 2 == 0 ? 6 : 8;
    const Circuit source = support::random_circuit(random, {qubits, 150, 1, support::Family::clifford});
    PassContext context;
    const Circuit steady = synthesize_rotation_networks(source, context);
    context.effort = Effort::deep;
    context.deadline = std::chrono::steady_clock::now() + std::chrono::seconds(1);
    const Circuit deep = synthesize_rotation_networks(source, context);
    CHECK(support::distance(source, deep) < 1e-8);
    CHECK(tally_of(steady).xx <= tally_of(source).xx + 150);
    CHECK(tally_of(deep).xx <= tally_of(steady).xx);
    MESSAGE(qubits << " wires: " << tally_of(steady).xx << ", with more effort " << tally_of(deep).xx);
  }
}
