// Shared options; see settings.h.
#include "command/settings.h"

#include <algorithm>
#include <map>
#include <thread>

namespace isinglass {

namespace {

/// An option that takes one word of a few.
template <typename Value>
CLI::Option* add_choice(CLI::App& command, const std::string& name, Value& value,
                        const std::map<std::string, Value>& words, const std::string& help) {
  std::string shown;
  std::string chosen;
  for (const auto& [word, meaning] : words) {
    shown += (shown.empty() ? "" : "|") + word;
    if (meaning == value) chosen = word;
  }
  return command
      .add_option_function<std::string>(
          name,
          [&value, words, name, shown](const std::string& word) {
            const auto found = words.find(word);
            if (found == words.end()) throw CLI::ValidationError(name, "takes " + shown + ", not " + word);
            value = found->second;
          },
          help)
      ->type_name(shown)
      ->default_str(chosen);
}

}  // namespace

Promise Settings::promise_for(const Circuit& source) const {
  Promise promise;
  promise.zero_start = inputs == Inputs::zero || (inputs == Inputs::automatic && source.measures());
  promise.keep_bits_only = keep_bits_only;
  return promise;
}

unsigned Settings::thread_count() const {
  return threads > 0 ? threads : std::max(1u, std::thread::hardware_concurrency());
}

void add_reading_options(CLI::App& command, Settings& settings) {
  add_choice<Inputs>(
      command, "--inputs", settings.inputs,
      {{"automatic", Inputs::automatic}, {"any", Inputs::any}, {"zero", Inputs::zero}},
      "states the program must work on; automatic: |0...0> for a source that measures, else any");
  add_choice<bool>(command, "--keep", settings.keep_bits_only, {{"state", false}, {"bits", true}},
                   "what must be kept: the qubits' state too, or only the distribution of the bits");
  command.add_option("--seed", settings.seed, "same seed, input and version: same result")
      ->capture_default_str();
  command.add_option("--threads", settings.threads, "threads to use; 0: one a core")
      ->check(CLI::Range(0u, 1024u))
      ->capture_default_str();
  add_choice<Format>(command, "--format", settings.format, {{"text", Format::text}, {"json", Format::json}},
                     "how to print results");
  command.add_flag("--quiet", settings.quiet, "no summary, no warnings, no progress");
}

void add_compiling_options(CLI::App& command, Settings& settings) {
  command
      .add_option(
          "--target", settings.target,
          "machine description; without it a typical machine with an ion a qubit, all pairs reachable")
      ->type_name("FILE");
  add_choice<Effort>(command, "--effort", settings.effort,
                     {{"quick", Effort::quick}, {"steady", Effort::steady}, {"deep", Effort::deep}},
                     "quick: one sweep; steady: passes compete; deep: search until --spend is over");
  command
      .add_option("--spend", settings.spend,
                  "seconds that improving may take, the best by then is kept; reading, timing, checking and "
                  "writing are not counted (deep without it: 60)")
      ->check(CLI::NonNegativeNumber)
      ->type_name("SECONDS");
  command
      .add_option("--tolerance", settings.tolerance,
                  "infidelity that the compiler may add where the target's errors fall by more")
      ->check(CLI::Range(0.0, 1.0))
      ->capture_default_str();
  command.add_flag("!--no-verify", settings.check, "skip the check of the result against the source");
  add_reading_options(command, settings);
}

}  // namespace isinglass
