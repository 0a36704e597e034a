// Short sequences of CNOTs that bring given sets of linear forms onto wires.
//
//   wanted together: {a, b+c} and {a+b, c}, in the end everything back
//   c -> b,   c -> b and a -> b,   a -> b      (wire b carries b+c, then a+b, then b)
//
// Idea. Each CNOT adds the form on one wire to that on another. The next CNOT is the one that lowers a
// potential most: over all stops (sets of forms that must stand on wires at the same time) not reached yet, a
// concave function of how many forms have to be added to reach it, so that the nearest count most, and a
// little for the way home. Where nothing gains, the nearest stop is finished first. Many greedy routes with
// random parameters are tried; then windows are cut out of the best one and routed again, with the stops that
// are reached nowhere else, by simulated annealing (Kirkpatrick, Gelatt, Vecchi, Science 220, 671).
//
// Paper: the same problem with single forms is in Amy, Azimzadeh, Mosca, "On the controlled-NOT complexity of
// controlled-NOT-phase circuits", Quantum Sci. Technol. 4, 015002 (2018) (from memory).
#pragma once

#include <chrono>
#include <cstdint>
#include <optional>
#include <vector>

#include "passes/dice.h"
#include "passes/form_products.h"

namespace isinglass {

/// The form on wire `to` becomes the sum of those on both.
struct Addition {
  std::uint8_t from;
  std::uint8_t to;
};

/// Forms without constants that must stand on wires at the same time; 0 for none. Independent.
using Stop = std::array<Form, 3>;

/// Wire k starts with variable k.
struct FormTask {
  unsigned wires = 0;
  std::vector<Stop> stops;
  std::vector<Form> home;  // by wire: the form that must stand there, or elsewhere, in the end
};

struct FormRoutePlan {
  unsigned starts = 100;  // greedy routes
  unsigned windows = 1000;
  std::size_t worth = 1000;  // longer routes are of no use: where all are much longer, the search ends soon
  std::chrono::steady_clock::time_point deadline = std::chrono::steady_clock::time_point::max();
};

struct FormRoute {
  std::vector<Addition> additions;
  std::vector<std::size_t> reached;  // by stop: after how many additions it is reached first
  std::vector<std::uint8_t> where;   // by wire: where its last form stands in the end
};

/// A short route, or nothing where no greedy one came to an end.
std::optional<FormRoute> find_form_route(const FormTask& task, const FormRoutePlan& plan, Dice& dice);

}  // namespace isinglass
