// What a pass is: a function from circuit to circuit with a name and a sentence, and what it is told.
#pragma once

#include <chrono>
#include <cstdint>
#include <optional>
#include <span>
#include <string_view>

#include "circuit/circuit.h"
#include "circuit/cost.h"

namespace isinglass {

enum class Effort : std::uint8_t { quick, steady, deep };

/// Everything a pass may know besides the circuit. Plain values: a copy for a thread is safe.
struct PassContext {
  Cost cost;
  Promise promise;
  Effort effort = Effort::steady;
  double tolerance = 0;  // infidelity that passes may add in all (see approximate passes)
  std::uint64_t seed = 1;
  unsigned threads = 1;
  std::uint32_t spare_wires =
      0;  // ions of the target beyond the source's qubits: ancillas that passes may claim
  std::chrono::steady_clock::time_point deadline = std::chrono::steady_clock::time_point::max();

  bool out_of_time() const { return std::chrono::steady_clock::now() >= deadline; }
};

/// A pass keeps the program's meaning as Promise states it, and never worsens the figures it names as its
/// own.
struct Pass {
  std::string_view name;      // "merge-rotations"
  std::string_view sentence;  // what it does, one line
  double us_a_gate;           // about what it takes on common circuits (bench_passes); see pace.h
  Circuit (*run)(Circuit circuit, const PassContext& context);
  /// The same for a circuit that is still wanted, nullopt where nothing changes: spares the copy that `run`
  /// would be given. Null: there is no such shortcut.
  std::optional<Circuit> (*run_beside)(const Circuit& circuit, const PassContext& context) = nullptr;
};

/// The table of all passes, in the order of their rooms; defined in passes/table.cpp.
std::span<const Pass> all_passes();

}  // namespace isinglass
