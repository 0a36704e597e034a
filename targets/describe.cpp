// One JSON object holds every number; the text form prints from the same values.
#include "targets/describe.h"

#include <fmt/format.h>

#include <cmath>
#include <nlohmann/json.hpp>

#include "circuit/files.h"
#include "targets/global_drive.h"
#include "targets/plot.h"

namespace isinglass {
namespace {

using Json = nlohmann::ordered_json;

std::vector<double> list_of(const Eigen::VectorXd& values, double factor = 1) {
  std::vector<double> list(values.begin(), values.end());
  for (double& value : list) value *= factor;
  return list;
}

Json rows_of(const Eigen::MatrixXd& matrix) {
  Json rows = Json::array();
  for (Eigen::Index i = 0; i < matrix.rows(); ++i) rows.push_back(list_of(matrix.row(i).transpose()));
  return rows;
}

constexpr const char* robust_names[] = {"none", "motion", "motion+angle"};  // by Robust

constexpr const char* left_out =
    "orders beyond Lamb-Dicke, noise within a gate faster than the drift, light noise, the axial motion";

Json chain_json(const TrapMachine& machine) {
  const Chain& chain = machine.chain;
  return {{"name", machine.name},
          {"ions", chain.ions()},
          {"species", chain.trap.species.name},
          {"length_scale_um", chain.length_scale * 1e6},
          {"smallest_spacing_um", chain.smallest_spacing() * 1e6},
          {"positions_um", list_of(chain.positions, chain.length_scale * 1e6)},
          {"axial_khz", list_of(chain.axial_hz, 1e-3)},
          {"transverse_khz", list_of(chain.transverse_hz, 1e-3)},
          {"lamb_dicke", rows_of(machine.eta)},
          {"critical_ratio", critical_ratio(chain.trap)},
          {"robust", robust_names[static_cast<std::size_t>(machine.limits.form.robust)]},
          {"fully_robust", is_fully_robust(machine.limits.form, chain.ions())},
          {"left_out", left_out}};
}

Json budget_json(const ErrorBudget& budget) {
  return {{"motion", budget.motion},         {"drift", budget.drift},         {"heating", budget.heating},
          {"scattering", budget.scattering}, {"dephasing", budget.dephasing}, {"carrier", budget.carrier},
          {"crosstalk", budget.crosstalk}};
}

// The light of a pair for an angle: that of a full interaction, scaled.
LitPair scaled_to(LitPair lit, double theta) {
  lit.pulse.rabi *= std::sqrt(theta / (pi / 2));
  return lit;
}

Json pair_json(const TrapMachine& machine, const LitPair& lit, double theta, double crosstalk) {
  const Pulse& pulse = lit.pulse;
  const Response seen = response(pulse, machine.chain.transverse_hz);
  const auto rows = {machine.eta.row(lit.a), machine.eta.row(lit.b)};
  double residual = 0;
  for (const auto& row : rows) residual += row.cwiseAbs2().dot(seen.loop.cwiseAbs2().transpose());
  const double sign = lit.turned ? -1 : 1;
  const double chi =
      sign * machine.eta.row(lit.a).cwiseProduct(machine.eta.row(lit.b)).dot(seen.area.transpose());
  Noise noise = machine.noise;
  noise.crosstalk = crosstalk;
  const ErrorBudget budget = error_budget(lit, theta, machine.chain.transverse_hz, machine.eta, noise);
  return {{"pair", {lit.a, lit.b}},
          {"theta", theta},
          {"duration_us", pulse.duration * 1e6},
          {"detuning_mhz", pulse.detuning * 1e-6},
          {"phase_rad", pulse.phase()},
          {"second_ion_phase_rad", wrapped(lit.turned ? pulse.phase() + pi : pulse.phase())},
          {"shape", pulse.shape == Shape::ramps ? "ramps" : "steps"},
          {"rabi_khz", list_of(pulse.rabi, 1e-3)},
          {"chi", chi},
          {"residual", residual},
          {"peak_khz", pulse.peak() * 1e-3},
          {"rms_khz", pulse.rms() * 1e-3},
          {"error", budget.total()},
          {"average_infidelity", 0.8 * budget.total()},
          {"error_by_source", budget_json(budget)}};
}

Json figures_json(const Target& target) {
  Json list = Json::array();
  for (std::uint32_t a = 0; a < target.ions; ++a) {
    for (std::uint32_t b = a + 1; b < target.ions; ++b) {
      const PairFigures& pair = target.pair(a, b);
      if (!pair.reachable || !target.ion[a].addressed || !target.ion[b].addressed) {
        list.push_back({{"pair", {a, b}}, {"reachable", false}});
      } else {
        list.push_back({{"pair", {a, b}},
                        {"reachable", true},
                        {"duration_us", pair.takes_us},
                        {"error", pair.error(pi / 2)},
                        {"error_floor", pair.floor.value},
                        {"error_root", pair.root.value},
                        {"error_slope", pair.slope.value},
                        {"error_square", pair.square.value}});
      }
    }
  }
  return list;
}

std::string joined(const Json& values, const char* form, std::size_t a_line = 8) {
  std::string text;
  for (std::size_t k = 0; k < values.size(); ++k) {
    if (k > 0 && k % a_line == 0) text += fmt::format("\n{:26}", "");
    text += fmt::format(fmt::runtime(form), values[k].get<double>());
  }
  return text;
}

std::string row(std::string_view name, const std::string& value) {
  return fmt::format("  {:<24}{}\n", name, value);
}

std::string chain_text(const Json& json, const TrapMachine& machine) {
  const double ratio = machine.chain.trap.transverse_hz / machine.chain.trap.axial_hz;
  std::string text = fmt::format("{}: {} ions of {}\n\nChain\n", machine.name, machine.chain.ions(),
                                 machine.chain.trap.species.name);
  text += row("length scale", fmt::format("{:.4f} um", json["length_scale_um"].get<double>()));
  text += row("smallest spacing", fmt::format("{:.4f} um", json["smallest_spacing_um"].get<double>()));
  text += row("straight while", fmt::format("transverse / axial > {:.3f} (here {:.3f})",
                                            json["critical_ratio"].get<double>(), ratio));
  text += row("positions, um", joined(json["positions_um"], "{:10.3f}"));
  text += row("axial modes, kHz", joined(json["axial_khz"], "{:10.2f}"));
  text += row("transverse modes, kHz", joined(json["transverse_khz"], "{:10.2f}"));
  text +=
      row("Lamb-Dicke, one ion", fmt::format("{:.4f} at the highest mode", machine.eta.rightCols(1).norm()));
  if (!is_fully_robust(machine.limits.form, machine.chain.ions()))
    text += row("robust", "in part: the segments do not suffice for all slopes of the paths to vanish");
  return text;
}

std::string pair_text(const Json& json) {
  std::string text =
      fmt::format("\nInteraction of ions {} and {}, theta = {:.6f} rad\n", json["pair"][0].get<int>(),
                  json["pair"][1].get<int>(), json["theta"].get<double>());
  const auto number = [&](const char* key, const char* form) {
    return fmt::format(fmt::runtime(form), json[key].get<double>());
  };
  text += row("duration", number("duration_us", "{:.3f} us"));
  text += row("detuning", number("detuning_mhz", "{:.6f} MHz"));
  text += row("phase", number("phase_rad", "{:.6f} rad"));
  text += row("phase on second ion", number("second_ion_phase_rad", "{:.6f} rad"));
  text += row("chi", number("chi", "{:.12f} rad"));
  text += row("residual |alpha|^2", number("residual", "{:.2e}"));
  text += row("Rabi frequency", fmt::format("{:.2f} kHz peak, {:.2f} kHz rms", json["peak_khz"].get<double>(),
                                            json["rms_khz"].get<double>()));
  text += row("light, kHz", joined(json["rabi_khz"], "{:9.2f}"));
  text += row("error", number("error", "{:.3e}"));
  for (const auto& [source, value] : json["error_by_source"].items())
    text += row("  " + source, fmt::format("{:.3e}", value.get<double>()));
  return text;
}

std::string drive_text(const Json& json) {
  const std::size_t ions = json["coupling_hz"].size();
  std::string text = "\nGlobal drive\n";
  if (ions > 1)
    text += row("first pair J / 2 pi", fmt::format("{:.3f} Hz", json["coupling_hz"][0][1].get<double>()));
  text += row("exponent", json["exponent"].is_null() ? "none: the couplings have no common sign"
                                                     : fmt::format("{:.4f}", json["exponent"].get<double>()));
  text += "  J / 2 pi, Hz\n";
  for (const auto& line : json["coupling_hz"]) {
    text += "  ";
    for (const auto& value : line) text += fmt::format("{:10.3f}", value.get<double>());
    text += '\n';
  }
  return text;
}

std::string figures_text(const Json& pairs) {
  std::string text = "\nPairs\n  pair      time, us   error of a full interaction\n";
  for (const auto& entry : pairs) {
    text += fmt::format("  {:>2} {:>2}  ", entry["pair"][0].get<int>(), entry["pair"][1].get<int>());
    text += entry["reachable"].get<bool>()
                ? fmt::format("{:10.1f}   {:.3e}\n", entry["duration_us"].get<double>(),
                              entry["error"].get<double>())
                : std::string("         -   not reachable\n");
  }
  return text;
}

[[noreturn]] void unsuitable(std::string text) {
  throw Failure(Exit::usage, std::move(text));
}

void check_pair(const TargetQuestion& question, int ions) {
  const auto [a, b] = *question.pair;
  if (a < 0 || b < 0 || a >= ions || b >= ions || a == b)
    unsuitable(fmt::format("--pair names two different ions from 0 to {}", ions - 1));
  if (!(question.theta > 0 && question.theta <= pi / 2 * (1 + 1e-12)))
    unsuitable("--theta must be above 0 and at most pi/2");
}

// A pair's light; from the kept light of the whole machine when there is some, else by a search for this pair
// alone.
LitPair light_for(const TrapMachine& machine, MachineFile& file, const TargetQuestion& question) {
  auto [a, b] = *question.pair;
  if (a > b) std::swap(a, b);
  const auto wanted = wanted_pairs(file, machine);
  const auto known = std::find(wanted.begin(), wanted.end(), std::pair{a, b});
  if (known == wanted.end())
    throw Failure(
        Exit::target_cannot,
        fmt::format("{}: ions {} and {} cannot interact: the file excludes the pair", question.path, a, b));
  std::optional<LitPair> lit;
  if (const auto kept = kept_light_of(machine, wanted)) {
    lit = (*kept)[static_cast<std::size_t>(known - wanted.begin())].lit;
  } else {
    lit = light_of(machine, {{a, b}}, question.threads, question.progress).front().lit;
  }
  if (!lit) refuse_pair(file, machine, a, b);
  if (question.pair->first > question.pair->second) std::swap(lit->a, lit->b);
  return *lit;
}

std::string answer_by_figures(const TargetQuestion& question) {
  if (question.drive || !question.plot.empty())
    unsuitable("--drive and --plot need a machine that is described by its trap");
  const Target target = read_target(question.path, question.threads, question.progress);
  Json json = {{"name", target.name},
               {"ions", target.ions},
               {"beams", target.beams},
               {"crosstalk", target.crosstalk.value}};
  if (question.pair) {
    check_pair(question, static_cast<int>(target.ions));
    const auto [a, b] = *question.pair;
    const PairFigures& pair = target.pair(static_cast<std::uint32_t>(a), static_cast<std::uint32_t>(b));
    if (!pair.reachable)
      throw Failure(Exit::target_cannot,
                    fmt::format("{}: ions {} and {} cannot interact", question.path, a, b));
    json["pair"] = {a, b};
    json["theta"] = question.theta;
    json["duration_us"] = pair.takes_us;
    json["error"] = pair.error(question.theta);
  } else {
    json["pairs"] = figures_json(target);
  }
  if (question.as_json) return json.dump(2) + "\n";
  std::string text = fmt::format("{}: {} ions, by figures\n", target.name, target.ions);
  if (question.pair) {
    text += fmt::format("\nInteraction of ions {} and {}, theta = {:.6f} rad\n", question.pair->first,
                        question.pair->second, question.theta);
    text += row("duration", fmt::format("{:.3f} us", json["duration_us"].get<double>()));
    text += row("error", fmt::format("{:.3e}", json["error"].get<double>()));
  } else {
    text += figures_text(json["pairs"]);
  }
  return text;
}

}  // namespace

std::string answer(const TargetQuestion& question) {
  MachineFile file(question.path);
  if (!is_trap_form(file)) return answer_by_figures(question);
  const TrapMachine machine = read_trap(file);
  Json json = chain_json(machine);
  std::string text = chain_text(json, machine);
  Target plain = typical(static_cast<std::uint32_t>(machine.chain.ions()));
  apply_figures(file, plain, false);
  file.refuse_if_faulty();

  std::optional<LitPair> lit;
  if (question.pair) {
    check_pair(question, machine.chain.ions());
    lit = scaled_to(light_for(machine, file, question), question.theta);
    const Json pair = pair_json(machine, *lit, question.theta, plain.crosstalk.value);
    text += pair_text(pair);
    json.update(pair);
  }
  if (question.drive) {
    const auto [mu_mhz, rabi_khz] = *question.drive;
    if (!(mu_mhz > 0) || !(rabi_khz > 0)) unsuitable("--drive needs MU_MHZ,RABI_KHZ, both above 0");
    Eigen::MatrixXd couplings;
    try {
      couplings =
          drive_couplings(machine.chain, machine.wave_number_difference, mu_mhz * 1e6, rabi_khz * 1e3);
    } catch (const std::domain_error& error) {
      unsuitable(fmt::format("--drive: {}", error.what()));
    }
    const auto exponent = range_exponent(couplings);
    json["coupling_hz"] = rows_of(couplings);
    json["exponent"] = exponent ? Json(*exponent) : Json(nullptr);
    text += drive_text(json);
  }
  if (question.all_pairs) {
    json["pairs"] = figures_json(target_of_trap(file, question.threads, question.progress));
    text += figures_text(json["pairs"]);
  }
  if (!question.plot.empty()) {
    const std::string svg = plot_of(machine, lit);
    write_whole(question.plot, [&](std::ostream& out) { out << svg; });
  }
  if (question.as_json) return json.dump(2) + "\n";
  return text + fmt::format(
                    "\nErrors are probabilities (1 - Fe). Left out: {}.\nUltraviolet light and high voltage "
                    "harm: site rules and trained staff decide.\n",
                    left_out);
}

}  // namespace isinglass
