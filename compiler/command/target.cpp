// isinglass target FILE: what a machine description means: its ions, modes, pairs, errors, pulses.
#include <CLI/CLI.hpp>
#include <iostream>
#include <memory>
#include <string>
#include <vector>

#include "command/commands.h"
#include "command/progress.h"
#include "command/settings.h"
#include "targets/describe.h"

namespace isinglass {

namespace {

struct TargetJob {
  TargetQuestion question;
  std::vector<int> pair;
  std::vector<double> drive;
  std::string format = "text";
  bool quiet = false;
};

void tell(TargetJob& job) {
  if (!job.pair.empty()) job.question.pair = {job.pair[0], job.pair[1]};
  if (!job.drive.empty()) job.question.drive = {job.drive[0], job.drive[1]};
  job.question.as_json = job.format == "json";
  Progress progress(job.quiet);
  progress.stage(job.question.path + ": seeking the light");
  job.question.progress = [&](double share) { progress.share(share); };
  const std::string text = answer(job.question);
  progress.clear();
  std::cout << text;
}

}  // namespace

void add_target(CLI::App& app, Exit& status) {
  const auto job = std::make_shared<TargetJob>();
  CLI::App* command = app.add_subcommand("target", "what a machine description means");
  command->add_option("FILE", job->question.path, "machine description (TOML)")->required();
  command->add_option("--pair", job->pair, "the light of the interaction of these ions, counted from 0")
      ->delimiter(',')
      ->expected(2)
      ->type_name("A,B");
  command->add_option("--theta", job->question.theta, "its angle in radians, up to pi/2")
      ->capture_default_str();
  command->add_option("--drive", job->drive, "couplings of a global drive: detuning, carrier Rabi frequency")
      ->delimiter(',')
      ->expected(2)
      ->type_name("MU_MHZ,RABI_KHZ");
  command->add_flag("--pairs", job->question.all_pairs, "the time and error of every pair");
  command->add_option("--plot", job->question.plot, "draw chain, spectrum, pulse and paths (SVG)")
      ->type_name("FILE");
  command->add_option("--threads", job->question.threads, "0: as many as the machine has cores")
      ->check(CLI::Range(0, 1024))
      ->capture_default_str();
  command->add_option("--format", job->format, "text or json")
      ->check(CLI::IsMember({"text", "json"}))
      ->capture_default_str();
  command->add_flag("--quiet", job->quiet, "no progress on the terminal");
  command->callback([job, &status] {
    tell(*job);
    status = Exit::done;
  });
}

}  // namespace isinglass
