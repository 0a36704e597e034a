// The line from source to checked result; see pipeline.h.
#include "command/pipeline.h"

#include <fmt/format.h>

#include <algorithm>
#include <iostream>

#include "circuit/physical.h"
#include "command/clock.h"
#include "language/language.h"
#include "output/annotations.h"
#include "output/native.h"
#include "passes/lower.h"
#include "passes/two_qubit_stretches.h"
#include "verify/memory.h"
#include "verify/native.h"

namespace isinglass {

namespace {

constexpr double deep_seconds = 60;  // what deep spends where --spend is silent

PassContext context_for(const Settings& settings, const Circuit& source, const Target& target) {
  PassContext context;
  context.cost = cost_of(target);
  context.promise = settings.promise_for(source);
  context.effort = settings.effort;
  context.tolerance = settings.tolerance;
  context.seed = settings.seed;
  context.threads = settings.thread_count();
  const auto reached = static_cast<std::uint32_t>(std::count_if(
      target.ion.begin(), target.ion.end(), [](const IonFigures& ion) { return ion.addressed; }));
  if (reached > source.source_qubits) context.spare_wires = reached - source.source_qubits;
  std::optional<double> spend = settings.spend;
  if (!spend && settings.effort == Effort::deep) spend = deep_seconds;
  if (spend) {
    context.deadline =
        std::chrono::steady_clock::now() + std::chrono::duration_cast<std::chrono::steady_clock::duration>(
                                               std::chrono::duration<double>(*spend));
  }
  return context;
}

/// The averages that passes reckon with as well, over the ions that light reaches and the reachable pairs.
GateTimes times_of(const Target& target) {
  constexpr double us = 1e3;
  const Cost cost = cost_of(target);
  GateTimes times;
  times.pulse = cost.pulse_us * us;
  times.interaction = cost.interaction_us * us;
  double ions = 0;
  double measure = 0;
  double reset = 0;
  for (const IonFigures& ion : target.ion) {
    if (!ion.addressed) continue;
    ++ions;
    measure += ion.measure_us;
    reset += ion.reset_us;
  }
  if (ions > 0) {
    times.measure = measure / ions * us;
    times.reset = reset / ions * us;
  }
  return times;
}

/// What an annotation was about may have vanished: then the native program cannot carry it. Said once for
/// all.
void warn_of_lost_annotations(const Result& result, bool quiet) {
  constexpr std::size_t most_named = 5;
  if (quiet || result.source.annotations.empty()) return;
  const std::vector<Annotation> lost = places_of(result.source.annotations, result.placed.circuit).lost;
  if (lost.empty()) return;
  std::vector<std::string> names;
  for (const Annotation& annotation : lost) {
    if (names.size() == most_named) break;
    names.push_back(
        fmt::format("{} (line {})", annotation.text.substr(0, annotation.text.find(' ')), annotation.line));
  }
  if (lost.size() > most_named) names.push_back("...");
  Message message;
  message.severity = Message::Severity::warning;
  message.place = {result.source.path, lost.front().line, 1};
  message.text = fmt::format("{} annotation{} dropped, for nothing is left of the gates under {}: {}",
                             lost.size(), lost.size() == 1 ? " is" : "s are",
                             lost.size() == 1 ? "it" : "them", fmt::join(names, ", "));
  std::cerr << printed(message);
}

/// Reads the native text back, as any other program would, and holds it against the source; `steps` are what
/// the compiler went through.
Verdict check(const Result& result, const Steps& steps, const Settings& settings) {
  Reading reading = read("the native program", result.native);
  if (!reading.ok()) {
    throw std::logic_error("the native program does not read back: " + printed(reading.messages.front()));
  }
  const Circuit native = on_source_wires(std::move(*reading.circuit), result.source.circuit);
  CheckOptions options;
  options.infidelity = settings.tolerance;
  options.threads = settings.thread_count();
  options.seed = settings.seed;
  return compare_along(result.source.circuit, steps, native, settings.promise_for(result.source.circuit),
                       options);
}

}  // namespace

Compiled Result::facts() const {
  return {source.path,
          source.sha256,
          target,
          placed,
          timed,
          before,
          verdict.explanation,
          rehearsal ? &*rehearsal : nullptr};
}

Target target_for(const Settings& settings, std::uint32_t ions, const std::function<void(double)>& progress) {
  if (settings.target.empty()) return typical(std::max(ions, 1u));
  return read_target(settings.target, static_cast<int>(settings.thread_count()), progress);
}

void rehearse(Result& result, std::size_t shots, const Settings& settings, Progress& progress) {
  progress.stage(result.source.path + ": rehearsing");
  RehearseOptions options;
  options.shots = shots;
  options.seed = settings.seed;
  options.threads = settings.thread_count();
  options.progress = [&](double share) { progress.share(share); };
  const Stopwatch watch;
  try {
    result.rehearsal = rehearse(result.placed, result.timed, result.target,
                                settings.promise_for(result.source.circuit), options);
  } catch (const Unsupported& unsupported) {
    throw Failure(Exit::usage,
                  fmt::format("{} cannot be rehearsed: {}", result.source.path, unsupported.what()));
  }
  result.seconds.emplace_back("rehearse", watch.seconds());
}

Result compile(const std::string& path, const Settings& settings, Progress& progress) {
  progress.stage("reading " + path);
  Result result;
  bool has_target = false;
  // A program that asks how long gates take needs the machine before it is read.
  result.source = read_source(path, settings.quiet, [&] {
    if (settings.target.empty()) return times_of(typical(2));
    result.target = target_for(settings, 0, [&](double share) { progress.share(share); });
    has_target = true;
    return times_of(result.target);
  });
  const Circuit& source = result.source.circuit;
  result.seconds.emplace_back("read", result.source.seconds);
  const auto timed = [&](const char* name, const char* doing, const auto& work) {
    progress.stage(fmt::format("{}: {}", path, doing));
    const Stopwatch watch;
    work();
    result.seconds.emplace_back(name, watch.seconds());
  };

  timed("target", "reading the machine", [&] {
    if (has_target) return;
    result.target = target_for(settings, ions_wanted(source), [&](double share) { progress.share(share); });
  });
  Circuit lowered;
  Steps steps;
  timed("improve", "improving", [&] {
    lowered = optimize(source, context_for(settings, source, result.target), &result.trace,
                       settings.check ? &steps : nullptr);
  });
  timed("place", "placing", [&] {
    result.placed = place(std::move(lowered), result.target, {.seed = settings.seed});
    if (result.placed.moves == 0) return;
    // A swap that movement put beside interactions of its pair becomes one stretch with them.
    const PassContext context = context_for(settings, source, result.target);
    Circuit joined = two_qubit_stretches(std::move(result.placed.circuit), context);
    result.placed.circuit = lower(std::move(joined), context);
  });
  timed("schedule", "timing", [&] {
    result.before = before_of(source);
    result.timed = schedule(result.placed, result.target, settings.promise_for(source));
    warn_of_lost_annotations(result, settings.quiet);
    result.native = native_program(result.placed, {path, result.target.name, result.source.annotations});
  });
  if (!settings.check) {
    result.verdict.explanation = "--no-verify was given.";
  } else {
    result.is_checked = true;
    timed("check", "checking", [&] { result.verdict = check(result, steps, settings); });
    if (result.verdict.answer == Answer::different) {
      throw std::logic_error(
          fmt::format("its result for {} is not the same program ({}: {}; deviation {:.2g})", path,
                      result.verdict.method, result.verdict.explanation, result.verdict.distance));
    }
  }
  return result;
}

}  // namespace isinglass
