// The options that all compiling commands share, and what they mean.
#pragma once

#include <CLI/CLI.hpp>
#include <cstdint>
#include <optional>
#include <string>

#include "circuit/circuit.h"
#include "passes/pass.h"

namespace isinglass {

enum class Inputs : std::uint8_t { automatic, any, zero };
enum class Format : std::uint8_t { text, json };

struct Settings {
  std::string target;  // a machine file; empty: a typical machine as large as the program
  Effort effort = Effort::steady;
  std::optional<double> spend;  // seconds
  double tolerance = 0;
  Inputs inputs = Inputs::automatic;
  bool keep_bits_only = false;
  std::uint64_t seed = 1;
  unsigned threads = 0;  // 0: as many as the machine has cores
  Format format = Format::text;
  bool quiet = false;
  bool check = true;

  /// --inputs and --keep, where a source that measures is a whole program that starts in |0>.
  Promise promise_for(const Circuit& source) const;
  unsigned thread_count() const;
};

/// --inputs, --keep, --seed, --threads, --format, --quiet: for every command that reads programs.
void add_reading_options(CLI::App& command, Settings& settings);

/// Those and --target, --effort, --spend, --tolerance, --no-verify: for every command that compiles.
void add_compiling_options(CLI::App& command, Settings& settings);

}  // namespace isinglass
