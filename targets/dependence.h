// Which operations of a block must wait for which: those that share an ion, a classical bit or a variable
// keep the order of the program.
#pragma once

#include <cstdint>
#include <span>
#include <vector>

#include "circuit/circuit.h"

namespace isinglass {

/// The graph of one block: predecessors[i] counts the edges into operation i (parallel edges each count), and
/// followers(i) are the ends of those that leave it. All edges point forward in the program.
class Dependences {
 public:
  Dependences(const Circuit& circuit, const Block& block);

  std::span<const std::uint32_t> followers(std::size_t operation) const {
    return {follower_.data() + first_[operation], first_[operation + 1] - first_[operation]};
  }
  std::vector<std::uint32_t> predecessors;

 private:
  std::vector<std::size_t> first_;
  std::vector<std::uint32_t> follower_;
};

/// What an operation reads or writes besides ions.
struct Touched {
  std::vector<std::uint32_t> bits;
  std::vector<std::uint32_t> variables;  // those without flat bits
  bool everything = false;               // leaves the loop or the program, or nobody knows
};
Touched classical_touches(const Circuit& circuit, const Operation& op);

}  // namespace isinglass
