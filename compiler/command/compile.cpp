// isinglass compile SOURCE: one circuit to one native sequence, with its times, errors and report.
#include <fmt/format.h>
#include <unistd.h>

#include <filesystem>
#include <iostream>

#include "circuit/files.h"
#include "command/commands.h"
#include "command/pipeline.h"
#include "command/summary.h"
#include "output/native.h"
#include "output/report.h"
#include "output/summary.h"

namespace isinglass {

namespace {

struct CompileJob {
  Settings settings;
  std::string source;
  std::string out = "-";
  std::string timeline;
  std::string report;
  std::size_t rehearse = 0;  // shots
  bool trace = false;
};

/// Says at once, not after minutes of compiling, that a file cannot be written.
void demand_writable(const std::string& path) {
  if (path.empty() || path == "-") return;
  namespace fs = std::filesystem;
  std::error_code ignored;
  const fs::path parent = fs::path(path).has_parent_path() ? fs::path(path).parent_path() : fs::path(".");
  if (!fs::is_directory(parent, ignored)) {
    throw Failure(Exit::file_trouble,
                  fmt::format("cannot write {}: there is no folder {}", path, parent.string()));
  }
  if (fs::is_directory(path, ignored)) {
    throw Failure(Exit::file_trouble, fmt::format("cannot write {}: it is a folder", path));
  }
  if (access(parent.c_str(), W_OK) != 0) {
    throw Failure(Exit::file_trouble,
                  fmt::format("cannot write {}: no permission to write in {}", path, parent.string()));
  }
}

bool is_csv(const std::string& path) {
  return path.ends_with(".csv");
}

std::string change(double before, double after) {
  return before == after ? fmt::format("{:.6g}", after) : fmt::format("{:.6g} -> {:.6g}", before, after);
}

std::string trace_text(const Trace& trace) {
  std::vector<std::vector<std::string>> rows = {{"order", "pass", "xx", "units", "r", "gates", "ms"}};
  for (const TraceRow& row : trace.rows) {
    const auto figure = [&](double before, double after) {
      return row.is_lowered ? change(before, after) : "-";
    };
    rows.push_back({row.order, row.pass,
                    figure(static_cast<double>(row.before.xx), static_cast<double>(row.after.xx)),
                    figure(row.before.xx_units, row.after.xx_units),
                    figure(static_cast<double>(row.before.r), static_cast<double>(row.after.r)),
                    change(static_cast<double>(row.gates_before), static_cast<double>(row.gates_after)),
                    fmt::format("{:.2f}", row.seconds * 1e3)});
  }
  std::vector<std::vector<std::string>> results = {{"order", "xx", "units", "r", "error", "seconds", ""}};
  for (const TraceResult& result : trace.results) {
    results.push_back(
        {result.order, fmt::format("{}", result.tally.xx), fmt::format("{:.6g}", result.tally.xx_units),
         fmt::format("{}", result.tally.r), fmt::format("{:.4g}", result.tally.error),
         fmt::format("{:.3f}", result.seconds),
         std::string(result.is_winner ? "wins" : "") + (result.is_complete ? "" : " (out of time)")});
  }
  return table(rows) + "\n" + table(results);
}

nlohmann::ordered_json trace_json(const Trace& trace) {
  const auto tally = [](const Tally& t) {
    return nlohmann::ordered_json{{"xx", t.xx}, {"xx_units", t.xx_units}, {"r", t.r}, {"error", t.error}};
  };
  nlohmann::ordered_json passes = nlohmann::ordered_json::array();
  for (const TraceRow& row : trace.rows) {
    nlohmann::ordered_json entry = {{"order", row.order}, {"pass", row.pass}};
    if (row.is_lowered) {
      entry["before"] = tally(row.before);
      entry["after"] = tally(row.after);
    }
    entry["gates_before"] = row.gates_before;
    entry["gates_after"] = row.gates_after;
    entry["seconds"] = row.seconds;
    passes.push_back(std::move(entry));
  }
  nlohmann::ordered_json orders = nlohmann::ordered_json::array();
  for (const TraceResult& result : trace.results) {
    nlohmann::ordered_json entry = {{"order", result.order}};
    entry.update(tally(result.tally));
    entry["seconds"] = result.seconds;
    entry["wins"] = result.is_winner;
    entry["complete"] = result.is_complete;
    orders.push_back(std::move(entry));
  }
  return {{"passes", passes}, {"orders", orders}};
}

void print_summary(const CompileJob& job, const Result& result) {
  // Without --out the native program has the standard output, and the summary goes beside it.
  std::ostream& out = job.out == "-" ? std::cerr : std::cout;
  if (job.settings.format == Format::json) {
    nlohmann::ordered_json summary = summary_of(result);
    if (job.trace) summary["trace"] = trace_json(result.trace);
    out << summary.dump(2) << "\n";
    return;
  }
  if (job.trace) out << trace_text(result.trace) << "\n";
  if (job.settings.quiet) return;
  out << text_of(result.facts());
  if (result.rehearsal) out << text_of(*result.rehearsal);
  out << "\ncheck: " << (result.is_checked ? name(result.verdict.answer) : "not checked");
  out << ". " << result.verdict.explanation << "\n";
  out << "seconds";
  for (const auto& [stage, spent] : result.seconds) out << fmt::format("  {} {:.3f}", stage, spent);
  out << "\n";
}

Exit run_compile(const CompileJob& job) {
  for (const std::string& path : {job.out, job.timeline, job.report}) demand_writable(path);
  Progress progress(job.settings.quiet);
  Result result = compile(job.source, job.settings, progress);
  if (job.rehearse > 0) rehearse(result, job.rehearse, job.settings, progress);
  progress.stage("writing");
  if (!job.timeline.empty()) {
    write_whole(job.timeline, [&](std::ostream& out) {
      is_csv(job.timeline) ? write_timeline_csv(out, result.facts())
                           : write_timeline_json(out, result.facts());
    });
  }
  if (!job.report.empty()) {
    write_whole(job.report, [&](std::ostream& out) { write_report(out, result.facts()); });
  }
  write_whole(job.out, [&](std::ostream& out) { out << result.native; });
  progress.clear();
  print_summary(job, result);
  return Exit::done;
}

}  // namespace

void add_compile(CLI::App& app, Exit& status) {
  const auto job = std::make_shared<CompileJob>();
  CLI::App* command =
      app.add_subcommand("compile", "one circuit to one native sequence, placed, timed and checked");
  command->add_option("SOURCE", job->source, "OpenQASM program")->required();
  command->add_option("--out", job->out, "native program; without it: standard output")->type_name("FILE");
  command->add_option("--timeline", job->timeline, "timed gate list: JSON, or CSV when the name ends in .csv")
      ->type_name("FILE");
  command->add_option("--report", job->report, "report: one HTML page")->type_name("FILE");
  command
      ->add_option(
          "--rehearse", job->rehearse,
          "simulate the result with the target's errors: outcomes and success with and without noise")
      ->check(CLI::Range(std::size_t{1}, std::size_t{1'000'000'000}))
      ->type_name("SHOTS");
  command->add_flag("--trace", job->trace,
                    "a row a pass: what it changed, how long it took, which order won");
  add_compiling_options(*command, job->settings);
  command->callback([job, &status] { status = run_compile(*job); });
}

}  // namespace isinglass
