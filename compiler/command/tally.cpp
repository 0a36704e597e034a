// isinglass tally SOURCE...: the counts before and after, a row a circuit; nothing is written.
#include <fmt/format.h>

#include <iostream>

#include "command/commands.h"
#include "command/many.h"
#include "command/summary.h"
#include "output/summary.h"

namespace isinglass {

namespace {

struct TallyJob {
  Settings settings;
  std::vector<std::string> sources;
};

std::vector<std::string> row_of(const Result& result) {
  const Totals& totals = result.timed.totals;
  return {result.source.path,
          fmt::format("{}", result.source.circuit.source_qubits),
          fmt::format("{}", result.before.one_qubit),
          fmt::format("{}", result.before.two_qubit),
          fmt::format("{}", totals.xx),
          fmt::format("{:.4f}", totals.xx_units),
          fmt::format("{}", totals.r),
          fmt::format("{}", totals.xx_depth),
          fmt::format("{}", totals.pairs),
          fmt::format("{:.1f}", totals.duration),
          fmt::format("{:.4g}", totals.error),
          result.verdict.method};
}

Exit run_tally(const TallyJob& job) {
  std::vector<std::vector<std::string>> rows = {{"circuit", "qubits", "one-qubit", "two-qubit", "xx", "units",
                                                 "r", "xx depth", "pairs", "us", "error", "checked by"}};
  nlohmann::ordered_json list = nlohmann::ordered_json::array();
  const Exit status = compile_each(job.sources, job.settings, [&](const Result& result) {
    if (job.settings.format == Format::json) {
      list.push_back(summary_of(result));
    } else {
      rows.push_back(row_of(result));
    }
  });
  if (job.settings.format == Format::json) {
    std::cout << list.dump(2) << "\n";
  } else if (rows.size() > 1) {
    std::cout << table(rows);
  }
  return status;
}

}  // namespace

void add_tally(CLI::App& app, Exit& status) {
  const auto job = std::make_shared<TallyJob>();
  CLI::App* command =
      app.add_subcommand("tally", "counts before and after, a row a circuit; nothing is written");
  command->add_option("SOURCE", job->sources, "OpenQASM programs")->required();
  add_compiling_options(*command, job->settings);
  command->callback([job, &status] { status = run_tally(*job); });
}

}  // namespace isinglass
