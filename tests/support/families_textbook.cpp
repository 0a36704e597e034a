#include "support/families_textbook.h"

#include <cmath>

#include "passes/local_rotations.h"

namespace isinglass::support {

namespace {

Circuit on(std::uint32_t qubits) {
  Circuit circuit;
  add_register(circuit, "q", qubits);
  return circuit;
}

void add(Circuit& circuit, Kind kind, std::initializer_list<std::uint32_t> operands,
         std::initializer_list<Angle> angles = {}) {
  circuit.body().push_back(circuit.make(kind, operands, angles));
}

}  // namespace

Circuit fourier(std::uint32_t n) {
  Circuit circuit = on(n);
  for (std::uint32_t target = n; target-- > 0;) {
    add(circuit, Kind::h, {target});
    for (std::uint32_t control = target; control-- > 0;) {
      add(circuit, Kind::p, {control, target}, {{pi / std::pow(2.0, target - control)}});
    }
  }
  for (std::uint32_t q = 0; q < n / 2; ++q) add(circuit, Kind::swap, {q, n - 1 - q});
  return circuit;
}

Circuit random_pair(Random& random) {
  Circuit circuit = on(2);
  for (int layer = 0; layer < 12; ++layer) {
    for (const std::uint32_t q : {0u, 1u}) {
      // A Haar-random rotation: theta with density sin theta, the rest uniform.
      add(circuit, Kind::u, {q},
          {{std::acos(1 - 2 * random.real())}, {random.real(-pi, pi)}, {random.real(-pi, pi)}});
    }
    if (layer < 11) add(circuit, Kind::xx, {0, 1}, {{random.real(-pi, pi)}, {0}, {0}});
  }
  return circuit;
}

std::optional<Network> network_of_circuit(const Circuit& circuit) {
  Circuit copy = circuit;
  std::vector<LocalRotation> rotations;
  for (const Operation& op : circuit.body()) {
    if (!append_rotations(copy, op, rotations)) return std::nullopt;
  }
  std::vector<Turn> turns;
  for (const LocalRotation& r : rotations) {
    turns.push_back({static_cast<std::uint8_t>(r.wire[0]),
                     static_cast<std::uint8_t>(r.wire[1]),
                     r.letter[0],
                     r.letter[1],
                     false,
                     r.angle,
                     {}});
  }
  return network_of(turns, circuit.wires);
}

}  // namespace isinglass::support
