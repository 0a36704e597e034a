// Machines described by their trap: what is read, what is refused and where, what is kept on disk, what is
// answered.
#include "targets/trap_machine.h"

#include <doctest/doctest.h>
#include <fmt/format.h>

#include <cstdlib>
#include <filesystem>
#include <fstream>
#include <nlohmann/json.hpp>
#include <pugixml.hpp>

#include "circuit/files.h"
#include "support/program.h"
#include "targets/describe.h"

using namespace isinglass;

namespace {

namespace fs = std::filesystem;

// A folder of its own for the file and for the kept light.
struct Harbour {
  fs::path folder = fs::temp_directory_path() / fmt::format("isinglass-trap-{}", ::getpid());
  Harbour() {
    fs::remove_all(folder);
    fs::create_directories(folder);
    ::setenv("ISINGLASS_CACHE", (folder / "kept").c_str(), 1);
  }
  ~Harbour() {
    fs::remove_all(folder);
    ::setenv("ISINGLASS_CACHE", "", 1);
  }
  std::string file(const std::string& text) const {
    const std::string path = (folder / "machine.toml").string();
    std::ofstream(path, std::ios::binary) << text;
    return path;
  }
  std::size_t kept() const {
    if (!fs::exists(folder / "kept")) return 0;
    return static_cast<std::size_t>(
        std::distance(fs::directory_iterator(folder / "kept"), fs::directory_iterator()));
  }
};

const std::string good = R"(name = "skiff-4"
[trap]
species = "171Yb+"
ions = 4
axial_khz = 420
transverse_mhz = 3.0
[light]
wavelength_nm = 355.0
peak_rabi_khz = 150.0
[pulse]
duration_us = [100, 200]
segments = 20
[noise]
mode_drift_hz = 100.0
heating_quanta_per_s = 20.0
mean_phonons = 0.1
t2_s = 1.0
)";

std::string replaced(std::string text, const std::string& what, const std::string& by) {
  const auto at = text.find(what);
  REQUIRE(at != std::string::npos);
  return text.replace(at, what.size(), by);
}

std::vector<std::string> faults(const Harbour& harbour, const std::string& text) {
  std::vector<std::string> said;
  try {
    read_target(harbour.file(text));
  } catch (const Failure& failure) {
    CHECK(failure.exit == Exit::target_cannot);
    for (const Message& m : failure.messages)
      said.push_back(fmt::format("{}:{}: {}", m.place.line, m.place.column, m.text));
  }
  return said;
}

}  // namespace

TEST_CASE("a trap becomes a target, and its light is kept") {
  const Harbour harbour;
  const std::string path = harbour.file(good);
  const Target target = read_target(path, 2);
  CHECK(target.name == "skiff-4");
  CHECK(target.ions == 4);
  CHECK(target.sha256.size() == 64);
  CHECK(target.ion[0].t2_us.value == doctest::Approx(1e6));
  for (const PairFigures& pair : target.pairs) {
    CHECK(pair.reachable);
    CHECK((pair.takes_us == doctest::Approx(100) || pair.takes_us == doctest::Approx(200)));
    CHECK(pair.error(pi / 2) > 1e-4);
    CHECK(pair.error(pi / 2) < 2e-2);
    CHECK(pair.error(pi / 8) < pair.error(pi / 2));
  }
  // Mirrored pairs have the same figures.
  CHECK(target.pair(0, 1).slope.value == doctest::Approx(target.pair(2, 3).slope.value).epsilon(1e-9));

  CHECK(harbour.kept() == 1);
  bool worked = false;
  const Target again = read_target(path, 1, [&](double) { worked = true; });
  CHECK_FALSE(worked);
  for (std::size_t k = 0; k < target.pairs.size(); ++k) {
    CHECK(again.pairs[k].takes_us == target.pairs[k].takes_us);
    CHECK(again.pairs[k].slope.value == target.pairs[k].slope.value);
  }
  // What a comment changes is no physics; what a number changes is.
  read_target(harbour.file("# a remark\n" + good));
  CHECK(harbour.kept() == 1);
  read_target(harbour.file(replaced(good, "mean_phonons = 0.1", "mean_phonons = 0.2")));
  CHECK(harbour.kept() == 2);
}

TEST_CASE("kept light that is damaged is found anew") {
  const Harbour harbour;
  const Target first = read_target(harbour.file(good), 1);
  const fs::path kept = fs::directory_iterator(harbour.folder / "kept")->path();
  const std::string whole = read_text(kept.string());
  for (const std::string& damaged : {std::string(), whole.substr(0, whole.size() / 2), "x" + whole}) {
    std::ofstream(kept, std::ios::binary | std::ios::trunc) << damaged;
    const Target again = read_target(harbour.file(good), 1);
    CHECK(again.pairs[0].slope.value == first.pairs[0].slope.value);
    CHECK(read_text(kept.string()) == whole);
  }
}

TEST_CASE("figures of a calibration override computed ones; reach and beams limit the search") {
  const Harbour harbour;
  const Target target = read_target(harbour.file(good + R"([machine]
crosstalk = 0.02
[pair]
reach = 2
[[pair.at]]
pairs = [[0, 1]]
interaction_us = 111
error_floor = [1e-3, 2e-4]
)"));
  CHECK(target.crosstalk.value == 0.02);
  CHECK_FALSE(target.pair(0, 3).reachable);
  CHECK(target.pair(0, 2).reachable);
  CHECK(target.pair(0, 1).takes_us == 111);
  CHECK(target.pair(0, 1).floor.deviation == 2e-4);
  CHECK(target.pair(0, 1).slope.value == doctest::Approx(target.pair(2, 3).slope.value).epsilon(1e-9));
}

TEST_CASE("each bad machine ends in one clear message at its place") {
  const Harbour harbour;
  const auto only = [&](const std::string& text, const std::string& expected) {
    const auto said = faults(harbour, text);
    REQUIRE(said.size() == 1);
    CHECK(said[0] == expected);
  };
  only(replaced(good, "axial_khz = 420", "axial_khz = 1800"),
       "6:18: 4 ions buckle into a zigzag: transverse over axial frequency is 1.667, a straight chain needs "
       "more than "
       "2.038");
  only(replaced(good, "171Yb+", "172Zz+"), "3:11: unknown species \"172Zz+\"");
  only(replaced(good, "mode_drift_hz = 100.0", "mode_drift_hz = -1"),
       "14:17: 'mode_drift_hz' must be 0 or more");
  only(replaced(good, "mean_phonons = 0.1", "mean_phonons = nan"), "16:16: 'mean_phonons' must be 0 or more");
  only(replaced(good, "peak_rabi_khz = 150.0", "peak_rabi_khz = 5"),
       "9:17: no pair can be reached in any of the allowed times with this peak");
  only(replaced(good, "[100, 200]", "1.5"),
       "9:17: no pair can be reached in any of the allowed times with this peak");
  only(replaced(good, "[100, 200]", "[]"), "11:15: 'duration_us' must name at least one time");
  only(replaced(good, "[100, 200]", "[100, -2]"),
       "11:21: 'duration_us' must be a time above 0, or a list of such times");
  only(replaced(good, "segments = 20", "segments = 8"),
       "12:12: 8 segments cannot close the paths of 4 modes: at least 10 are needed");
  only(replaced(good, "segments = 20", "segments = 20\nshape = \"bumps\""),
       "13:9: 'shape' must be one of \"steps\", \"ramps\"");
  only(replaced(good, "ions = 4", "ions = 65"), "4:8: 'ions' must be a whole number from 1 to 64");
  only(replaced(good, "ions = 4", "ions = 4\nmass_u = 40"),
       "3:11: give either 'species' or 'mass_u' and 'charge'");
  only(replaced(good, "t2_s = 1.0", "t2 = 1.0"), "17:1: unknown key 't2' in [noise]");
  only(replaced(good, "wavelength_nm = 355.0\n", ""), "7:1: the key 'wavelength_nm' is missing in [light]");
  only(good + "[nonsense]\n", "18:2: unknown key 'nonsense'");
  // Several faults are told together.
  CHECK(faults(harbour, replaced(replaced(good, "ions = 4", "ions = 0"), "segments = 20", "segment = 20"))
            .size() == 3);
}

TEST_CASE("any species by its mass; any ion alone") {
  const Harbour harbour;
  const Target heavy =
      read_target(harbour.file(replaced(good, "species = \"171Yb+\"", "mass_u = 170.935782\ncharge = 1")), 1);
  const Target named = read_target(harbour.file(good), 1);
  CHECK(heavy.pair(0, 1).slope.value == doctest::Approx(named.pair(0, 1).slope.value).epsilon(1e-3));
  const Target alone = read_target(harbour.file(replaced(good, "ions = 4", "ions = 1")), 1);
  CHECK(alone.ions == 1);
  CHECK(alone.pairs.empty());
}

TEST_CASE("the answer has the chain, a pair's light and the global drive") {
  const Harbour harbour;
  TargetQuestion question;
  question.path = harbour.file(good);
  question.as_json = true;
  auto json = nlohmann::json::parse(answer(question));
  CHECK(json["ions"] == 4);
  CHECK(json["positions_um"].size() == 4);
  CHECK(json["axial_khz"][0].get<double>() == doctest::Approx(420));
  CHECK(json["transverse_khz"][3].get<double>() == doctest::Approx(3000));
  CHECK(json["transverse_khz"][0].get<double>() < json["transverse_khz"][1].get<double>());
  CHECK(json["lamb_dicke"].size() == 4);
  CHECK(json["lamb_dicke"][0].size() == 4);
  CHECK(json["robust"] == "none");
  CHECK(json["fully_robust"] == true);
  CHECK(json["left_out"].get<std::string>().find("Lamb-Dicke") != std::string::npos);
  CHECK(json["length_scale_um"].get<double>() ==
        doctest::Approx(4.351 * std::pow(500.0 / 420, 2.0 / 3)).epsilon(1e-4));

  // Sixteen ramps leave eight even values: not enough for the paths of four modes and their slopes.
  TargetQuestion partly = question;
  partly.path = harbour.file(replaced(good, "segments = 20", "segments = 16\nrobust = \"motion\""));
  json = nlohmann::json::parse(answer(partly));
  CHECK(json["robust"] == "motion");
  CHECK(json["fully_robust"] == false);
  question.path = harbour.file(good);

  question.pair = {{0, 2}};
  question.theta = 0.4;
  json = nlohmann::json::parse(answer(question));
  CHECK(json["chi"].get<double>() == doctest::Approx(-0.2).epsilon(1e-12));
  CHECK(json["residual"].get<double>() < 1e-24);
  CHECK(json["rabi_khz"].size() == 21);
  CHECK(json["rabi_khz"][0] == 0.0);
  CHECK(json["peak_khz"].get<double>() < 150);
  CHECK(json["rms_khz"].get<double>() < json["peak_khz"].get<double>());
  double sum = 0;
  for (const auto& [source, value] : json["error_by_source"].items()) sum += value.get<double>();
  CHECK(json["error"].get<double>() == doctest::Approx(sum));
  CHECK(json["error_by_source"].size() == 7);
  // The light scales with the root of the angle.
  question.theta = pi / 2;
  const auto full = nlohmann::json::parse(answer(question));
  CHECK(json["peak_khz"].get<double>() ==
        doctest::Approx(full["peak_khz"].get<double>() * std::sqrt(0.4 / (pi / 2))));
  // The light of a pair alone is the light that the whole machine gives it.
  const Target whole = read_target(question.path);
  CHECK(full["duration_us"].get<double>() == doctest::Approx(whole.pair(0, 2).takes_us));
  CHECK(nlohmann::json::parse(answer(question))["rabi_khz"] == full["rabi_khz"]);

  question.pair.reset();
  question.drive = {{3.1, 200}};
  json = nlohmann::json::parse(answer(question));
  CHECK(json["coupling_hz"].size() == 4);
  CHECK(json["coupling_hz"][0][1].get<double>() > 0);
  CHECK(json["coupling_hz"][0][1] == json["coupling_hz"][1][0]);
  CHECK(json["exponent"].get<double>() > 0);
  question.drive.reset();
  question.all_pairs = true;
  CHECK(nlohmann::json::parse(answer(question))["pairs"].size() == 6);

  question.as_json = false;
  question.pair = {{3, 1}};
  question.plot = (harbour.folder / "plot.svg").string();
  const std::string text = answer(question);
  CHECK(text.find("Interaction of ions 3 and 1") != std::string::npos);
  CHECK(text.find("Left out") != std::string::npos);
  pugi::xml_document svg;
  CHECK(svg.load_file(question.plot.c_str()));
  CHECK(std::string(svg.first_child().name()) == "svg");
  std::size_t curves = 0, circles = 0;
  for (const auto& node : svg.first_child().children()) {
    curves += std::string(node.name()) == "polyline" ? 1u : 0u;
    circles += std::string(node.name()) == "circle" ? 1u : 0u;
  }
  CHECK(curves == 5);  // the pulse and four paths
  CHECK(circles == 4);
}

TEST_CASE("a pair out of reach is refused at the peak limit, with the light that it needs") {
  const Harbour harbour;
  TargetQuestion question;
  question.path = harbour.file(replaced(good, "= 150.0", "= 15.0"));
  question.pair = {{0, 3}};
  try {
    answer(question);
    FAIL("not refused");
  } catch (const Failure& failure) {
    CHECK(failure.exit == Exit::target_cannot);
    REQUIRE(failure.messages.size() == 1);
    const Message& message = failure.messages[0];
    CHECK(message.place.line == 9);
    CHECK(message.text == "ions 0 and 3 cannot interact: with this peak no allowed time is long enough");
    CHECK(printed(message).find("kHz rms are needed") != std::string::npos);
  }
}

TEST_CASE("questions that do not fit are refused") {
  const Harbour harbour;
  const auto status = [&](auto&& change) {
    TargetQuestion question;
    question.path = harbour.file(replaced(good, "[noise]", "[pair]\nreach = 1\n[noise]"));
    change(question);
    try {
      answer(question);
    } catch (const Failure& failure) {
      CHECK(failure.messages.size() == 1);
      return failure.exit;
    }
    return Exit::done;
  };
  CHECK(status([](TargetQuestion& q) { q.pair = {{0, 4}}; }) == Exit::usage);
  CHECK(status([](TargetQuestion& q) { q.pair = {{1, 1}}; }) == Exit::usage);
  CHECK(status([](TargetQuestion& q) { q.pair = {{0, 1}}, q.theta = 2; }) == Exit::usage);
  CHECK(status([](TargetQuestion& q) { q.pair = {{0, 2}}; }) == Exit::target_cannot);
  CHECK(status([](TargetQuestion& q) { q.drive = {{3.0, 100}}; }) == Exit::usage);
  CHECK(status([](TargetQuestion& q) { q.drive = {{-3.0, 100}}; }) == Exit::usage);
  CHECK(status([](TargetQuestion& q) { q.path = "/nowhere.toml"; }) == Exit::file_trouble);
}

TEST_CASE("the trap machines of the tree are sound") {
  for (const auto& [name, ions] : {std::pair{"barque-15", 15}, std::pair{"clipper-32", 32}}) {
    MachineFile file(support::tree_path(fmt::format("targets/{}.toml", name)));
    REQUIRE(is_trap_form(file));
    const TrapMachine machine = read_trap(file);
    CHECK(machine.name == name);
    CHECK(machine.chain.ions() == ions);
    CHECK(machine.chain.smallest_spacing() > 4e-6);
    CHECK(is_fully_robust(machine.limits.form, ions));
    CHECK(wanted_pairs(file, machine).size() == static_cast<std::size_t>(ions * (ions - 1) / 2));
    // A neighbouring pair can be lit; the search of all is the benchmark's.
    LightLimits quick = machine.limits;
    quick.durations = {machine.limits.durations.back()};
    quick.detuning = machine.chain.transverse_hz[1] + 1e3;
    CHECK(
        find_light(machine.chain, machine.eta, quick, machine.noise, {{ions / 2, ions / 2 + 1}}, 1).light[0]);
  }
}
