// isinglass guard SOURCE... --limits FILE: the gate in a CI pipeline. Compiles, compares, fails when over.
#include <fmt/format.h>

#include <filesystem>
#include <iostream>
#include <pugixml.hpp>

#include "circuit/files.h"
#include "command/commands.h"
#include "command/limits.h"
#include "command/many.h"
#include "command/summary.h"
#include "output/summary.h"

namespace isinglass {

namespace {

struct GuardJob {
  Settings settings;
  std::vector<std::string> sources;
  std::string limits;
  std::string baseline;
  std::string junit;
  double slack = 0;  // percent
};

/// One figure of one circuit that is over what is allowed.
struct Excess {
  std::string figure;
  double value;
  double allowed;
  std::string by;  // "limit" or "baseline"

  std::string text() const { return fmt::format("{} is {:.6g}, {} {:.6g}", figure, value, by, allowed); }
};

struct Case {
  std::string source;
  double seconds = 0;
  std::vector<Excess> excesses;
  std::string failure;  // why it could not be compiled
};

std::vector<Excess> excesses_of(const Totals& totals, const Limits& limits, const Limits* baseline,
                                double slack) {
  std::vector<Excess> excesses;
  for (const auto& [figure, most] : limits) {
    const double value = figure_of(totals, figure);
    if (value > most) excesses.push_back({figure, value, most, "limit"});
  }
  if (baseline == nullptr) return excesses;
  for (const auto& [figure, earlier] : *baseline) {
    const double value = figure_of(totals, figure);
    const double most = earlier * (1 + slack / 100);
    // Sums of the same numbers in another order differ in the last digits: that is no change.
    if (value > most + 1e-9 * std::abs(most)) excesses.push_back({figure, value, earlier, "baseline"});
  }
  return excesses;
}

void write_junit(const std::string& path, const std::vector<Case>& cases) {
  pugi::xml_document document;
  auto declaration = document.append_child(pugi::node_declaration);
  declaration.append_attribute("version") = "1.0";
  declaration.append_attribute("encoding") = "UTF-8";
  auto suite = document.append_child("testsuites").append_child("testsuite");
  std::size_t failures = 0;
  std::size_t errors = 0;
  double seconds = 0;
  for (const Case& one : cases) {
    failures += one.excesses.empty() ? 0 : 1;
    errors += one.failure.empty() ? 0 : 1;
    seconds += one.seconds;
  }
  suite.append_attribute("name") = "isinglass guard";
  suite.append_attribute("tests") = cases.size();
  suite.append_attribute("failures") = failures;
  suite.append_attribute("errors") = errors;
  suite.append_attribute("time") = fmt::format("{:.3f}", seconds).c_str();
  for (const Case& one : cases) {
    auto test = suite.append_child("testcase");
    test.append_attribute("classname") = "isinglass.guard";
    test.append_attribute("name") = one.source.c_str();
    test.append_attribute("time") = fmt::format("{:.3f}", one.seconds).c_str();
    if (!one.failure.empty()) {
      test.append_child("error").append_attribute("message") = one.failure.c_str();
    } else if (!one.excesses.empty()) {
      std::string all;
      for (const Excess& excess : one.excesses) all += excess.text() + "\n";
      auto failure = test.append_child("failure");
      failure.append_attribute("message") = one.excesses.front().text().c_str();
      failure.text() = all.c_str();
    }
  }
  write_whole(path, [&](std::ostream& out) { document.save(out, "  "); });
}

void print_text(const GuardJob& job, const std::vector<Case>& cases) {
  if (job.settings.quiet) return;
  for (const Case& one : cases) {
    const bool is_good = one.excesses.empty() && one.failure.empty();
    std::cout << fmt::format("{}  {}\n", is_good ? "ok  " : "OVER", one.source);
    if (!one.failure.empty()) std::cout << "      not compiled: " << one.failure << "\n";
    for (const Excess& excess : one.excesses) std::cout << "      " << excess.text() << "\n";
  }
}

Exit run_guard(const GuardJob& job) {
  const LimitsFile limits = job.limits.empty() ? LimitsFile{} : read_limits(job.limits);
  std::map<std::string, Limits> baseline;
  if (!job.baseline.empty()) baseline = read_baseline(job.baseline);
  std::vector<Case> cases;
  nlohmann::ordered_json list = nlohmann::ordered_json::array();
  bool is_over = false;
  Exit status = compile_each(
      job.sources, job.settings,
      [&](const Result& result) {
        const std::string& source = result.source.path;
        const auto earlier = baseline.find(std::filesystem::path(source).lexically_normal().string());
        Case one{source, 0, {}, {}};
        for (const auto& stage : result.seconds) one.seconds += stage.second;
        one.excesses = excesses_of(result.timed.totals, limits.of(source),
                                   earlier == baseline.end() ? nullptr : &earlier->second, job.slack);
        is_over = is_over || !one.excesses.empty();
        nlohmann::ordered_json summary = summary_of(result);
        summary["over"] = nlohmann::ordered_json::array();
        for (const Excess& excess : one.excesses) {
          summary["over"].push_back({{"figure", excess.figure},
                                     {"value", excess.value},
                                     {"allowed", excess.allowed},
                                     {"by", excess.by}});
        }
        list.push_back(std::move(summary));
        cases.push_back(std::move(one));
      },
      [&](const std::string& source, const std::string& why) {
        cases.push_back({source, 0, {}, why});
      });
  if (!job.junit.empty()) write_junit(job.junit, cases);
  if (job.settings.format == Format::json) {
    std::cout << list.dump(2) << "\n";
  } else {
    print_text(job, cases);
  }
  return status == Exit::done && is_over ? Exit::answer_is_no : status;
}

}  // namespace

void add_guard(CLI::App& app, Exit& status) {
  const auto job = std::make_shared<GuardJob>();
  CLI::App* command = app.add_subcommand("guard", "compiles and fails when a circuit is over its limits");
  command->add_option("SOURCE", job->sources, "OpenQASM programs")->required();
  command->add_option("--limits", job->limits, "limits (TOML): [limits] for all, [limits.\"path\"] for one")
      ->required()
      ->type_name("FILE");
  CLI::Option* baseline = command
                              ->add_option("--baseline", job->baseline,
                                           "an earlier output of guard --format json: no figure may be worse")
                              ->type_name("FILE");
  command->add_option("--slack", job->slack, "percent that a figure may be worse than the baseline")
      ->needs(baseline)
      ->check(CLI::NonNegativeNumber)
      ->type_name("PERCENT");
  command->add_option("--junit", job->junit, "the same as JUnit XML")->type_name("FILE");
  add_compiling_options(*command, job->settings);
  command->callback([job, &status] { status = run_guard(*job); });
}

}  // namespace isinglass
