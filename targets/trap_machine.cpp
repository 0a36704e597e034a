// Reading the trap form, and keeping the light that was found.
#include "targets/trap_machine.h"

#include <fmt/format.h>

#include <algorithm>
#include <cmath>
#include <cstdlib>
#include <filesystem>
#include <fstream>
#include <nlohmann/json.hpp>
#include <sstream>
#include <thread>

#include "algebra/sha256.h"
#include "circuit/files.h"

namespace isinglass {
namespace {

using Need = Section::Need;

// The place of a key that is known to be there, else of its table.
toml::source_region place_of(const MachineFile& file, std::string_view table, std::string_view key) {
  const auto view = file.root()[table];
  if (const toml::node* node = view[key].node()) return node->source();
  return view.node() != nullptr ? view.node()->source() : file.root().source();
}

Species read_species(MachineFile& file, Section& section) {
  std::string name;
  section.words("species", name);
  Species species;
  std::uint32_t charge = 1;
  section.number("mass_u", species.mass_u, {1, 400, false});
  section.whole("charge", charge, 1, 10);
  species.charge = static_cast<int>(charge);
  if (section.has("species") && (section.has("mass_u") || section.has("charge"))) {
    file.complain(place_of(file, "trap", "species"), "give either 'species' or 'mass_u' and 'charge'");
  } else if (section.has("species")) {
    const auto known = species_named(name);
    if (known) return *known;
    if (!name.empty()) {
      file.complain(place_of(file, "trap", "species"), fmt::format("unknown species \"{}\"", name),
                    fmt::format("known are {}; any other by 'mass_u' (of the ion) and 'charge'",
                                fmt::join(species_names(), ", ")));
    }
  } else if (!section.has("mass_u")) {
    file.complain(section.where(), "the key 'species' (or 'mass_u') is missing in [trap]");
  }
  species.name = fmt::format("mass {:g} u, charge {}", species.mass_u, species.charge);
  return species;
}

Trap read_trap_table(MachineFile& file) {
  Section section(file, "trap");
  Trap trap;
  trap.species = read_species(file, section);
  std::uint32_t ions = 0;
  section.whole("ions", ions, 1, longest_chain, Need::required);
  trap.ions = static_cast<int>(ions);
  double axial_khz = 0, transverse_mhz = 0;
  section.number("axial_khz", axial_khz, positive, Need::required);
  section.number("quartic", trap.quartic, not_negative);
  section.number("transverse_mhz", transverse_mhz, positive, Need::required);
  trap.axial_hz = axial_khz * 1e3;
  trap.transverse_hz = transverse_mhz * 1e6;
  section.finish();
  return trap;
}

std::vector<double> read_durations(MachineFile& file, Section& section) {
  const toml::node* node = section.node("duration_us", Need::required);
  if (node == nullptr) return {};
  std::vector<double> durations;
  const auto take = [&](const toml::node& entry) {
    const auto value = entry.value<double>();
    if (!entry.is_number() || !value || !(*value > 0) || !std::isfinite(*value)) {
      file.complain(entry.source(), "'duration_us' must be a time above 0, or a list of such times");
    } else {
      durations.push_back(*value * 1e-6);
    }
  };
  if (const toml::array* list = node->as_array()) {
    if (list->empty()) file.complain(node->source(), "'duration_us' must name at least one time");
    for (const toml::node& entry : *list) take(entry);
  } else {
    take(*node);
  }
  std::sort(durations.begin(), durations.end());
  durations.erase(std::unique(durations.begin(), durations.end()), durations.end());
  return durations;
}

LightLimits read_pulse_table(MachineFile& file) {
  Section section(file, "pulse");
  LightLimits limits;
  std::size_t shape = 1, robust = 0;
  section.choice("shape", shape, {"steps", "ramps"});
  section.choice("robust", robust, {"none", "motion", "motion+angle"});
  limits.form.shape = static_cast<Shape>(shape);
  limits.form.robust = static_cast<Robust>(robust);
  limits.durations = read_durations(file, section);
  std::uint32_t segments = 2;
  section.whole("segments", segments, 2, 2000, Need::required);
  limits.form.segments = static_cast<int>(segments);
  double detuning_mhz = 0;
  section.number("detuning_mhz", detuning_mhz, positive);
  if (section.has("detuning_mhz")) limits.detuning = detuning_mhz * 1e6;
  section.finish();
  return limits;
}

Noise read_noise_table(MachineFile& file) {
  Section section(file, "noise");
  Noise noise;
  section.number("mode_drift_hz", noise.mode_drift_hz, not_negative);
  section.number("heating_quanta_per_s", noise.heating_per_s, not_negative);
  section.number("mean_phonons", noise.mean_phonons, not_negative);
  section.number("t2_s", noise.t2_s, positive);
  section.number("scattering_per_pi_pulse", noise.scattering_per_pi_pulse, probability);
  section.finish();
  return noise;
}

// ---- keeping what was found ----

constexpr std::string_view store_format = "isinglass-light 2";

// Where found light is kept: empty = nowhere.
std::filesystem::path store() {
  if (const char* own = std::getenv("ISINGLASS_CACHE")) return own;
  if (const char* shared = std::getenv("XDG_CACHE_HOME"); shared != nullptr && *shared != '\0')
    return std::filesystem::path(shared) / "isinglass";
  if (const char* home = std::getenv("HOME"); home != nullptr && *home != '\0')
    return std::filesystem::path(home) / ".cache" / "isinglass";
  return {};
}

// Everything that the light depends on, as text.
std::string content_of(const TrapMachine& machine, const std::vector<std::pair<int, int>>& pairs) {
  const Trap& trap = machine.chain.trap;
  const LightLimits& limits = machine.limits;
  const Noise& noise = machine.noise;
  std::string text = fmt::format(
      "{} {}\n{} {} {} {} {} {}\n{}\n{} {} {} {} {} {}\n{} {} {} {} {}\n", store_format, ISINGLASS_VERSION,
      trap.species.mass_u, trap.species.charge, trap.ions, trap.axial_hz, trap.quartic, trap.transverse_hz,
      machine.wave_number_difference, int(limits.form.shape), limits.form.segments, int(limits.form.robust),
      limits.peak_hz, limits.detuning.value_or(0), fmt::join(limits.durations, ","), noise.mode_drift_hz,
      noise.heating_per_s, noise.mean_phonons, noise.t2_s, noise.scattering_per_pi_pulse);
  for (const auto& [a, b] : pairs) text += fmt::format("{},{} ", a, b);
  return text;
}

nlohmann::json json_of(const std::vector<PairLight>& found) {
  nlohmann::json list = nlohmann::json::array();
  for (const PairLight& light : found) {
    nlohmann::json entry = {{"a", light.a}, {"b", light.b}};
    if (light.lit) {
      const Pulse& pulse = light.lit->pulse;
      entry["duration"] = pulse.duration;
      entry["detuning"] = pulse.detuning;
      entry["turned"] = light.lit->turned;
      entry["rabi"] = std::vector<double>(pulse.rabi.begin(), pulse.rabi.end());
      entry["law"] = {light.law.floor, light.law.root, light.law.slope, light.law.square};
    }
    list.push_back(std::move(entry));
  }
  return list;
}

std::vector<PairLight> light_from(const nlohmann::json& list, Shape shape) {
  std::vector<PairLight> found;
  for (const auto& entry : list) {
    PairLight light{entry.at("a"), entry.at("b"), std::nullopt, {}};
    if (entry.contains("rabi")) {
      const auto rabi = entry.at("rabi").get<std::vector<double>>();
      Pulse pulse{shape, entry.at("duration"), entry.at("detuning"),
                  Eigen::Map<const Eigen::VectorXd>(rabi.data(), static_cast<Eigen::Index>(rabi.size()))};
      light.lit = LitPair{light.a, light.b, entry.at("turned"), std::move(pulse)};
      const auto law = entry.at("law").get<std::array<double, 4>>();
      light.law = {law[0], law[1], law[2], law[3]};
    }
    found.push_back(std::move(light));
  }
  return found;
}

// A kept file opens with the digest of the rest: what is damaged counts as absent.
std::optional<std::vector<PairLight>> kept_light(const std::filesystem::path& path, Shape shape,
                                                 std::size_t expected) {
  std::ifstream in(path, std::ios::binary);
  std::string digest;
  if (!in || !std::getline(in, digest)) return std::nullopt;
  std::ostringstream rest;
  rest << in.rdbuf();
  const std::string body = rest.str();
  if (sha256(body) != digest) return std::nullopt;
  auto found = light_from(nlohmann::json::parse(body), shape);
  if (found.size() != expected) return std::nullopt;
  return found;
}

// A full or read-only disk is no reason to fail: then nothing is kept.
void keep_light(const std::filesystem::path& path, const std::vector<PairLight>& found) {
  std::error_code ignored;
  std::filesystem::create_directories(path.parent_path(), ignored);
  const std::string body = json_of(found).dump();
  try {
    write_whole(path.string(), [&](std::ostream& out) { out << sha256(body) << '\n' << body; });
  } catch (const Failure&) {
  }
}

int threads_or_cores(int threads) {
  return threads > 0 ? threads : std::max(1, static_cast<int>(std::thread::hardware_concurrency()));
}

void add_laws(const TrapMachine& machine, std::vector<PairLight>& found, int threads) {
  std::vector<std::thread> workers;
  for (int t = 0; t < threads; ++t) {
    workers.emplace_back([&, t] {
      for (std::size_t k = static_cast<std::size_t>(t); k < found.size();
           k += static_cast<std::size_t>(threads))
        if (found[k].lit)
          found[k].law = error_law(*found[k].lit, machine.chain.transverse_hz, machine.eta, machine.noise);
    });
  }
  for (std::thread& worker : workers) worker.join();
}

std::vector<PairLight> found_light(const TrapMachine& machine, const std::vector<std::pair<int, int>>& pairs,
                                   int threads, const ReportProgress& progress, double& least_rms_hz) {
  FoundLight light =
      find_light(machine.chain, machine.eta, machine.limits, machine.noise, pairs, threads, progress);
  least_rms_hz = light.least_rms_hz;
  std::vector<PairLight> found;
  for (std::size_t k = 0; k < pairs.size(); ++k)
    found.push_back({pairs[k].first, pairs[k].second, std::move(light.light[k]), {}});
  add_laws(machine, found, threads);
  return found;
}

// The file that keeps the light of these pairs; empty = it is kept nowhere.
std::filesystem::path keeping_place(const TrapMachine& machine,
                                    const std::vector<std::pair<int, int>>& pairs) {
  const std::filesystem::path folder = store();
  return folder.empty() ? folder : folder / (sha256(content_of(machine, pairs)) + ".light");
}

std::vector<PairLight> light_of(const TrapMachine& machine, const std::vector<std::pair<int, int>>& pairs,
                                int threads, const ReportProgress& progress, double& least_rms_hz) {
  if (auto kept = kept_light_of(machine, pairs)) return *std::move(kept);
  auto found = found_light(machine, pairs, threads_or_cores(threads), progress, least_rms_hz);
  const std::filesystem::path path = keeping_place(machine, pairs);
  if (!path.empty()) keep_light(path, found);
  return found;
}

PairFigures figures_of(const PairLight& light) {
  PairFigures figures;
  figures.takes_us = light.lit->pulse.duration * 1e6;
  figures.floor = {light.law.floor};
  figures.root = {light.law.root};
  figures.slope = {light.law.slope};
  figures.square = {light.law.square};
  return figures;
}

void complain_of_peak(MachineFile& file, std::string what, double least_rms_hz) {
  const std::string needed =
      least_rms_hz > 0 && std::isfinite(least_rms_hz)
          ? fmt::format("in the longest time at least {:.4g} kHz rms are needed, and more at the peak",
                        least_rms_hz / 1e3)
          : "raise it, or allow a longer 'duration_us'";
  file.complain(place_of(file, "light", "peak_rabi_khz"), std::move(what), needed);
}

Target blank_target(const TrapMachine& machine) {
  Target target = typical(static_cast<std::uint32_t>(machine.chain.ions()));
  target.name = machine.name;
  for (IonFigures& ion : target.ion)
    if (machine.noise.t2_s > 0) ion.t2_us.value = machine.noise.t2_s * 1e6;
  return target;
}

}  // namespace

bool is_trap_form(const MachineFile& file) {
  return file.root().contains("trap");
}

TrapMachine read_trap(MachineFile& file) {
  TrapMachine machine;
  Section top(file, "");
  top.words("name", machine.name, Need::required);
  for (const std::string_view table : {"trap", "light", "pulse"}) top.node(table, Need::required);
  for (const std::string_view table : {"noise", "machine", "ion", "pair"}) top.node(table);
  top.finish();

  const Trap trap = read_trap_table(file);
  Section light(file, "light");
  double wavelength_nm = 0, angle_deg = 180, peak_khz = 0;
  light.number("wavelength_nm", wavelength_nm, positive, Need::required);
  light.number("angle_deg", angle_deg, {0, 180, true});
  light.number("peak_rabi_khz", peak_khz, positive, Need::required);
  light.finish();
  machine.limits = read_pulse_table(file);
  machine.limits.peak_hz = peak_khz * 1e3;
  machine.noise = read_noise_table(file);
  file.refuse_if_faulty();

  try {
    machine.chain = solve_chain(trap);
  } catch (const ImpossibleTrap& impossible) {
    file.complain(place_of(file, "trap", "transverse_mhz"), impossible.what());
  }
  file.refuse_if_faulty();
  machine.wave_number_difference = wave_number_difference(wavelength_nm * 1e-9, angle_deg * pi / 180);
  machine.eta = lamb_dicke(machine.chain, machine.wave_number_difference);
  return machine;
}

std::vector<std::pair<int, int>> wanted_pairs(MachineFile& file, const TrapMachine& machine) {
  const int ions = machine.chain.ions();
  LightForm form = machine.limits.form;
  if (ions > 1 && !can_close(form, ions)) {
    const int given = form.segments;
    while (!can_close(form, ions)) ++form.segments;
    file.complain(place_of(file, "pulse", "segments"),
                  fmt::format("{} segments cannot close the paths of {} modes: at least {} are needed", given,
                              ions, form.segments));
  }
  Target target = blank_target(machine);
  apply_figures(file, target, false);
  file.refuse_if_faulty();
  std::vector<std::pair<int, int>> pairs;
  for (std::uint32_t a = 0; a < target.ions; ++a)
    for (std::uint32_t b = a + 1; b < target.ions; ++b)
      if (target.pair(a, b).reachable && target.ion[a].addressed && target.ion[b].addressed)
        pairs.emplace_back(static_cast<int>(a), static_cast<int>(b));
  return pairs;
}

std::optional<std::vector<PairLight>> kept_light_of(const TrapMachine& machine,
                                                    const std::vector<std::pair<int, int>>& pairs) {
  const std::filesystem::path path = keeping_place(machine, pairs);
  if (path.empty()) return std::nullopt;
  return kept_light(path, machine.limits.form.shape, pairs.size());
}

std::vector<PairLight> light_of(const TrapMachine& machine, const std::vector<std::pair<int, int>>& pairs,
                                int threads, const ReportProgress& progress) {
  double least_rms_hz = 0;
  return light_of(machine, pairs, threads, progress, least_rms_hz);
}

void refuse_pair(MachineFile& file, const TrapMachine& machine, int a, int b) {
  const FoundLight light = find_light(machine.chain, machine.eta, machine.limits, machine.noise, {{a, b}}, 1);
  complain_of_peak(
      file,
      fmt::format("ions {} and {} cannot interact: with this peak no allowed time is long enough", a, b),
      light.least_rms_hz);
  file.refuse();
}

Target target_of_trap(MachineFile& file, int threads, const ReportProgress& progress) {
  const TrapMachine machine = read_trap(file);
  const auto pairs = wanted_pairs(file, machine);
  double least_rms_hz = 0;
  const auto found = light_of(machine, pairs, threads, progress, least_rms_hz);

  // Pairs without light are marked by a time of 0, which only a calibration of their own in the file can
  // replace.
  Target target = blank_target(machine);
  target.sha256 = sha256(file.text());
  for (PairFigures& figures : target.pairs) figures.takes_us = 0;
  bool any = false;
  for (const PairLight& light : found) {
    if (!light.lit) continue;
    any = true;
    target.pair(static_cast<std::uint32_t>(light.a), static_cast<std::uint32_t>(light.b)) = figures_of(light);
  }
  if (!pairs.empty() && !any) {
    complain_of_peak(file, "no pair can be reached in any of the allowed times with this peak", least_rms_hz);
    file.refuse();
  }
  apply_figures(file, target, false);
  for (PairFigures& figures : target.pairs) {
    if (figures.takes_us > 0) continue;
    figures = PairFigures{};
    figures.reachable = false;
  }
  return target;
}

}  // namespace isinglass
