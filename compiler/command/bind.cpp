// isinglass bind PLAN --values FILE: numbers into the inputs of an already compiled program, one or a million
// sets.
#include "language/bind.h"

#include <fmt/format.h>

#include <iostream>

#include "circuit/files.h"
#include "command/commands.h"
#include "command/pipeline.h"
#include "command/values.h"
#include "output/native.h"
#include "output/plan.h"
#include "output/summary.h"

namespace isinglass {

namespace {

struct BindJob {
  Settings settings;
  std::string plan;
  std::string values;
  std::string out = "-";
  std::string timeline;
  bool tally = false;
};

constexpr std::string_view number_mark = "{}";

/// The file of set `number`: "{}" in the name stands for the number.
std::string numbered(std::string name, std::size_t number) {
  const std::size_t at = name.find(number_mark);
  if (at != std::string::npos) name.replace(at, number_mark.size(), std::to_string(number));
  return name;
}

class Binding {
 public:
  explicit Binding(const BindJob& job)
      : job_(job),
        source_(read_source(job.plan, job.settings.quiet)),
        placed_(plan_of(source_.circuit)),
        target_(target_for(job.settings, placed_.circuit.wires)),
        promise_(job.settings.promise_for(placed_.circuit)),
        binder_(placed_.circuit) {
    if (target_.ions < placed_.circuit.wires) {
      throw Failure(Exit::target_cannot, fmt::format("the plan is for {} ions, {} has {}",
                                                     placed_.circuit.wires, target_.name, target_.ions));
    }
  }

  void run() {
    ValueReader reader(job_.values, binder_.inputs());
    if (job_.tally && job_.settings.format == Format::text) {
      std::cout << "set,xx,xx_units,r,xx_depth,pairs,duration,success,error\n";
    }
    ValueReader::Set values;
    std::size_t number = 0;
    while (reader.next(values)) {
      write_set(++number, binder_.bind(values));
    }
    if (number > 1 && !is_streamed() && !is_numbered()) {
      throw Failure(Exit::usage,
                    fmt::format("{} sets of values, one file: put {} where the number of the set goes",
                                number, number_mark));
    }
    if (number == 0) throw Failure(Exit::usage, job_.values + " holds no set of values");
  }

 private:
  bool is_streamed() const { return job_.tally || (job_.out == "-" && job_.timeline.empty()); }
  bool is_numbered() const {
    const auto good = [](const std::string& name) {
      return name.empty() || name == "-" || name.find(number_mark) != std::string::npos;
    };
    return good(job_.out) && good(job_.timeline);
  }

  void write_set(std::size_t number, const Circuit& bound) {
    if (job_.tally || !job_.timeline.empty()) placed_.circuit = bound;
    if (job_.tally) {
      print_row(number, schedule(placed_, target_, promise_).totals);
      return;
    }
    if (number > 1 && !is_streamed() && !is_numbered()) return;  // said at the end, with the count
    if (!job_.timeline.empty()) write_timeline(number);
    if (job_.out == "-") {
      if (!job_.timeline.empty()) return;
      if (number > 1) std::cout << "\n";
      std::cout << "// set " << number << "\n";
      write_native(std::cout, bound, placed_.start, {job_.plan, target_.name, source_.annotations});
    } else {
      write_whole(numbered(job_.out, number), [&](std::ostream& out) {
        write_native(out, bound, placed_.start, {job_.plan, target_.name, source_.annotations});
      });
    }
  }

  void write_timeline(std::size_t number) {
    const Timed timed = schedule(placed_, target_, promise_);
    const Compiled compiled{source_.path,
                            source_.sha256,
                            target_,
                            placed_,
                            timed,
                            before_of(placed_.circuit),
                            "bound from a plan; the plan was checked when it was compiled"};
    const std::string path = numbered(job_.timeline, number);
    write_whole(path, [&](std::ostream& out) {
      path.ends_with(".csv") ? write_timeline_csv(out, compiled) : write_timeline_json(out, compiled);
    });
  }

  void print_row(std::size_t number, const Totals& totals) const {
    if (job_.settings.format == Format::json) {
      nlohmann::ordered_json row = {{"set", number}};
      row["totals"] = json_of(totals);
      std::cout << row.dump() << "\n";
      return;
    }
    std::cout << fmt::format("{},{},{},{},{},{},{},{},{}\n", number, totals.xx, totals.xx_units, totals.r,
                             totals.xx_depth, totals.pairs, totals.duration, totals.success, totals.error);
  }

  const BindJob& job_;
  SourceFile source_;
  Placed placed_;
  Target target_;
  Promise promise_;
  Binder binder_;
};

}  // namespace

void add_bind(CLI::App& app, Exit& status) {
  const auto job = std::make_shared<BindJob>();
  CLI::App* command = app.add_subcommand("bind", "numbers into the inputs of a compiled program, set by set");
  command->add_option("PLAN", job->plan, "native program with inputs, as compile wrote it")->required();
  command
      ->add_option("--values", job->values,
                   "sets of values: CSV whose first line names the inputs, or JSON lines, an object a set")
      ->required()
      ->type_name("FILE");
  command
      ->add_option(
          "--out", job->out,
          "native programs, {} in the name stands for the number of the set; without it: standard output")
      ->type_name("FILE");
  command->add_option("--timeline", job->timeline, "timed lists (JSON, or CSV), named the same way")
      ->type_name("FILE");
  command->add_flag("--tally", job->tally, "one row of totals a set instead of programs");
  command
      ->add_option("--target", job->settings.target,
                   "the machine that the plan was compiled for, for times and errors")
      ->type_name("FILE");
  add_reading_options(*command, job->settings);
  command->callback([job, &status] {
    Binding(*job).run();
    status = Exit::done;
  });
}

}  // namespace isinglass
