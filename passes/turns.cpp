// Turns to networks, inverses, local Cliffords; see turns.h.
#include "passes/turns.h"

#include <algorithm>

#include "passes/local_rotations.h"

namespace isinglass {

namespace {

Row single(unsigned wire, Letter letter) {
  const auto value = static_cast<std::uint64_t>(letter);
  return {(value & 1) << wire, (value >> 1) << wire, false};
}

Row image(const std::vector<Row>& rows, const Row& local, unsigned a, unsigned b) {
  Row result = a == b ? image(rows, a, local.letter(a), b, Letter::I)
                      : image(rows, a, local.letter(a), b, local.letter(b));
  result.negative ^= local.negative;
  return result;
}

}  // namespace

Row image(std::span<const Row> rows, unsigned a, Letter la, unsigned b, Letter lb) {
  Row result;
  int phase = 0;
  const auto times = [&](unsigned wire, Letter letter) {
    const auto value = static_cast<unsigned>(letter);
    if (value & 1) phase += multiply(result, rows[2 * wire]);
    if (value & 2) phase += multiply(result, rows[2 * wire + 1]);
    if (value == 3) ++phase;
  };
  times(a, la);
  if (lb != Letter::I) times(b, lb);
  result.negative ^= (phase & 2) != 0;
  return result;
}

int multiply(Row& left, const Row& right) {
  const std::uint64_t ax = left.x, az = left.z, bx = right.x, bz = right.z;
  const std::uint64_t forward = (ax & ~az & bx & bz) | (ax & az & ~bx & bz) | (~ax & az & bx & ~bz);
  const std::uint64_t backward = (ax & az & bx & ~bz) | (~ax & az & bx & bz) | (ax & ~az & ~bx & bz);
  left = {ax ^ bx, az ^ bz, left.negative != right.negative};
  return (std::popcount(forward) - std::popcount(backward)) & 3;
}

void conjugate(Row& row, unsigned a, Letter la, unsigned b, Letter lb, bool negative) {
  const Letter ra = row.letter(a), rb = lb == Letter::I ? Letter::I : row.letter(b);
  if (commute(la, ra) == commute(lb, rb)) return;
  // g P g^-1 = -i axis P; axis P = i^k (letters), k odd.
  const int k = product_phase(la, ra) + product_phase(lb, rb);
  const auto va = static_cast<std::uint64_t>(la), vb = static_cast<std::uint64_t>(lb);
  row.x ^= (va & 1) << a;
  row.z ^= (va >> 1) << a;
  if (lb != Letter::I) {
    row.x ^= (vb & 1) << b;
    row.z ^= (vb >> 1) << b;
  }
  row.negative ^= (k == -1) != negative;
}

Network network_of(const std::vector<Turn>& turns, unsigned wires) {
  Network network;
  network.wires = wires;
  std::vector<Row>& rows = network.rows;
  for (unsigned k = 0; k < wires; ++k) {
    rows.push_back(single(k, Letter::X));
    rows.push_back(single(k, Letter::Z));
  }
  for (const Turn& turn : turns) {
    const unsigned a = turn.a, b = turn.is_pair() ? turn.b : turn.a;
    const auto quarters = quarters_of(turn.angle);
    if (!quarters) {
      Row string = image(rows, a, turn.la, b, turn.lb);
      string.negative ^= turn.negative;
      network.exponentials.push_back({string, turn.angle, turn.origin});
      continue;
    }
    // C := g C, so that the rows become C^-1 (g^-1 X_k g) C, g^-1 the turn by minus the quarters.
    Row changed[4];
    for (unsigned i = 0; i < (a == b ? 2u : 4u); ++i) {
      const unsigned wire = i < 2 ? a : b;
      Row local = single(wire, i % 2 == 0 ? Letter::X : Letter::Z);
      for (int q = 0; q < *quarters; ++q) conjugate(local, a, turn.la, b, turn.lb, !turn.negative);
      changed[i] = image(rows, local, a, b);
    }
    for (unsigned i = 0; i < (a == b ? 2u : 4u); ++i) rows[2 * (i < 2 ? a : b) + i % 2] = changed[i];
  }
  return network;
}

std::vector<Turn> inverted(const std::vector<Turn>& turns) {
  std::vector<Turn> result(turns.rbegin(), turns.rend());
  for (Turn& turn : result) turn.negative = !turn.negative;
  return result;
}

Sequence inverted(const Sequence& sequence) {
  // U = H T with H taking wire home[k] to wire k, so U^-1 = T^-1 H^-1 = H^-1 (H T^-1 H^-1).
  Sequence result{inverted(sequence.turns), sequence.home};
  std::vector<std::uint8_t> back(sequence.home.size());
  for (std::size_t k = 0; k < back.size(); ++k) back[sequence.home[k]] = static_cast<std::uint8_t>(k);
  for (Turn& turn : result.turns) {
    turn.a = back[turn.a];
    if (turn.is_pair()) turn.b = back[turn.b];
  }
  result.home = std::move(back);
  return result;
}

void push_local_cliffords(std::vector<Turn>& turns, unsigned wires) {
  // frame[2w], frame[2w + 1]: c^-1 X c and c^-1 Z c of the Clifford c pushed so far on wire w: U = c (turns).
  std::vector<Row> frame;
  for (unsigned w = 0; w < wires; ++w) {
    frame.push_back(single(w, Letter::X));
    frame.push_back(single(w, Letter::Z));
  }
  std::vector<Turn> kept;
  kept.reserve(turns.size());
  for (Turn turn : turns) {
    const unsigned a = turn.a, b = turn.is_pair() ? turn.b : turn.a;
    const auto quarters = turn.is_pair() ? std::nullopt : quarters_of(turn.angle);
    if (quarters) {
      Row changed[2] = {single(a, Letter::X), single(a, Letter::Z)};
      for (Row& row : changed) {
        for (int q = 0; q < *quarters; ++q) conjugate(row, a, turn.la, a, Letter::I, !turn.negative);
        row = image(frame, row, a, a);
      }
      frame[2 * a] = changed[0];
      frame[2 * a + 1] = changed[1];
      continue;
    }
    const Row string = image(frame, a, turn.la, b, turn.lb);
    turn.la = string.letter(a);
    if (turn.is_pair()) turn.lb = string.letter(b);
    turn.negative ^= string.negative;
    kept.push_back(turn);
  }
  for (unsigned w = 0; w < wires; ++w) append_local_clifford(frame[2 * w], frame[2 * w + 1], w, kept);
  turns = std::move(kept);
}

void append_local_clifford(Row x, Row z, unsigned wire, std::vector<Turn>& turns) {
  const auto turn = [&](Letter letter, int quarters) {
    turns.push_back({static_cast<std::uint8_t>(wire), 0, letter, Letter::I, false, {quarters * pi / 2}, {}});
    for (int q = 0; q < quarters; ++q) {
      conjugate(x, wire, letter, wire, Letter::I, false);
      conjugate(z, wire, letter, wire, Letter::I, false);
    }
  };
  if (x.letter(wire) != Letter::X) turn(x.letter(wire) * Letter::X, 1);
  if (z.letter(wire) != Letter::Z) turn(Letter::X, 1);
  if (x.negative && z.negative) {
    turn(Letter::Y, 2);
  } else if (x.negative) {
    turn(Letter::Z, 2);
  } else if (z.negative) {
    turn(Letter::X, 2);
  }
}

}  // namespace isinglass
