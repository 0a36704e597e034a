// A machine described by its trap: the chain and its light as the description says, and the figures that
// follow.
//
// Keys, units and defaults stand in README.md beside this file.
#pragma once

#include <optional>
#include <string>
#include <utility>
#include <vector>

#include "targets/chain.h"
#include "targets/error_model.h"
#include "targets/machine_file.h"
#include "targets/pair_search.h"
#include "targets/target.h"

namespace isinglass {

struct TrapMachine {
  std::string name;
  Chain chain;
  double wave_number_difference = 0;  // 1/m
  Eigen::MatrixXd eta;                // Lamb-Dicke factors, row = ion, column = transverse mode
  LightLimits limits;
  Noise noise;
};

/// The light of one pair with its error law; `lit` is empty when the pair cannot be reached.
struct PairLight {
  int a = 0;
  int b = 0;
  std::optional<LitPair> lit;
  ErrorLaw law;
};

/// Whether the description is by the trap.
bool is_trap_form(const MachineFile& file);

/// Reads the tables [trap], [light], [pulse] and [noise] and solves the chain. Throws Failure(target_cannot)
/// with the place of every fault: unknown, missing and impossible keys, a chain that buckles, too few
/// segments.
TrapMachine read_trap(MachineFile& file);

/// Light for the given pairs, in their order. The light of all pairs asked for together is kept on disk (see
/// README.md), named by the content of the description, and found there the next time.
std::vector<PairLight> light_of(const TrapMachine& machine, const std::vector<std::pair<int, int>>& pairs,
                                int threads, const ReportProgress& progress = {});

/// What light_of() kept for exactly these pairs, if it did.
std::optional<std::vector<PairLight>> kept_light_of(const TrapMachine& machine,
                                                    const std::vector<std::pair<int, int>>& pairs);

/// Throws Failure(target_cannot) at the place of the peak limit, saying how much light a pair without light
/// would need.
[[noreturn]] void refuse_pair(MachineFile& file, const TrapMachine& machine, int a, int b);

/// The compiler's view: computed figures, overridden by whatever [machine], [ion] and [pair] of the file say.
/// `threads` 0 = as many as there are cores. Throws Failure(target_cannot) as read_trap does, and when no
/// pair of a chain can be reached.
Target target_of_trap(MachineFile& file, int threads = 0, const ReportProgress& progress = {});

/// The pairs that the file lets be used: both ions addressed, within reach.
std::vector<std::pair<int, int>> wanted_pairs(MachineFile& file, const TrapMachine& machine);

}  // namespace isinglass
