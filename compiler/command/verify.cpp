// isinglass verify SOURCE COMPILED: are the two the same program? Says how it was decided, and how surely.
#include "verify/equivalence.h"

#include <fmt/format.h>

#include <iostream>
#include <nlohmann/json.hpp>

#include "command/commands.h"
#include "command/reading.h"
#include "command/settings.h"
#include "verify/native.h"

namespace isinglass {

namespace {

struct VerifyJob {
  Settings settings;
  std::string source;
  std::string compiled;
  double tolerance = CheckOptions{}.tolerance;
};

void print(const VerifyJob& job, const Verdict& verdict) {
  if (job.settings.format == Format::json) {
    const nlohmann::ordered_json object = {
        {"source", job.source},     {"compiled", job.compiled},           {"answer", name(verdict.answer)},
        {"method", verdict.method}, {"explanation", verdict.explanation}, {"distance", verdict.distance}};
    std::cout << object.dump(2) << "\n";
  } else if (!job.settings.quiet) {
    std::cout << fmt::format("{} ({})\n{}\nlargest deviation {:.2g}\n", name(verdict.answer), verdict.method,
                             verdict.explanation, verdict.distance);
  }
}

Exit verify(const VerifyJob& job) {
  const SourceFile source = read_source(job.source, job.settings.quiet);
  const SourceFile compiled = read_source(job.compiled, job.settings.quiet);
  const Circuit native = on_source_wires(compiled.circuit, source.circuit);
  CheckOptions options;
  options.tolerance = job.tolerance;
  options.threads = job.settings.thread_count();
  options.seed = job.settings.seed;
  const Verdict verdict = compare(source.circuit, native, job.settings.promise_for(source.circuit), options);
  print(job, verdict);
  return verdict.answer == Answer::same ? Exit::done : Exit::answer_is_no;
}

}  // namespace

void add_verify(CLI::App& app, Exit& status) {
  const auto job = std::make_shared<VerifyJob>();
  CLI::App* command = app.add_subcommand("verify", "are a source and a compiled program the same?");
  command->add_option("SOURCE", job->source, "OpenQASM program")->required();
  command->add_option("COMPILED", job->compiled, "native program, or any OpenQASM program of as many qubits")
      ->required();
  command->add_option("--within", job->tolerance, "deviation of an amplitude that counts as rounding")
      ->check(CLI::PositiveNumber)
      ->capture_default_str();
  add_reading_options(*command, job->settings);
  command->callback([job, &status] { status = verify(*job); });
}

}  // namespace isinglass
