// Machine descriptions by figures: what is read, the defaults, and one clear message at the place of each
// fault.
#include <doctest/doctest.h>
#include <fmt/format.h>

#include <cmath>
#include <filesystem>
#include <fstream>

#include "algebra/sha256.h"
#include "circuit/files.h"
#include "circuit/message.h"
#include "support/program.h"
#include "support/random_circuits.h"
#include "targets/target.h"

using namespace isinglass;

namespace {

std::string tree(const std::string& path) {
  return support::tree_path(path);
}

struct TemporaryFile {
  std::string path;
  explicit TemporaryFile(const std::string& text)
      : path((std::filesystem::temp_directory_path() / fmt::format("isinglass-machine-{}.toml", ::getpid()))
                 .string()) {
    std::ofstream(path, std::ios::binary) << text;
  }
  ~TemporaryFile() { std::filesystem::remove(path); }
};

const std::string good = R"(name = "test"
[machine]
ions = 4
[ion]
pulse_us = 5
pulse_error = 1e-4
measure_error = 2e-3
[pair]
interaction_us = 200
error_floor = 1e-3
error_slope = 4e-3
)";

Target read(const std::string& text) {
  const TemporaryFile file(text);
  return read_target(file.path);
}

/// All messages of the failure that reading the text ends in, as "line:column: text".
std::vector<std::string> faults(const std::string& text) {
  try {
    read(text);
  } catch (const Failure& failure) {
    CHECK(failure.exit == Exit::target_cannot);
    std::vector<std::string> said;
    for (const Message& m : failure.messages) {
      said.push_back(fmt::format("{}:{}: {}", m.place.line, m.place.column, m.text));
    }
    return said;
  }
  return {};
}

}  // namespace

TEST_CASE("a description by figures: defaults, overrides, what stays typical") {
  const Target target = read(good +
                             "[[pair.at]]\npairs = [[3, 1]]\nerror_slope = [5e-3, 1e-3]\nreachable = true\n"
                             "[[pair.at]]\npairs = [[0, 1]]\nreachable = false\n");
  CHECK(target.ions == 4);
  CHECK(target.pairs.size() == 6);
  CHECK(target.ion[2].pulse_error.value == 1e-4);
  CHECK(target.pair(1, 3).slope.value == 5e-3);
  CHECK(target.pair(1, 3).slope.deviation == 1e-3);
  CHECK(target.pair(3, 1).error(pi / 4) == doctest::Approx(1e-3 + 2.5e-3));
  CHECK(target.pair(0, 2).slope.value == 4e-3);
  CHECK(!target.pair(0, 1).reachable);
  CHECK(target.beams == typical(4).beams);
  CHECK(target.sha256.size() == 64);
}

TEST_CASE("average infidelities are converted") {
  // 1 - Fe is 3/2 of 1 - F for one qubit and 5/4 for two (Horodecki 1999; Nielsen 2002).
  std::string text = good;
  text.insert(text.find("ions = 4"), "errors_are = \"average\"\n");
  const Target target = read(text);
  CHECK(target.ion[0].pulse_error.value == doctest::Approx(1.5e-4));
  CHECK(target.pair(0, 3).floor.value == doctest::Approx(1.25e-3));
  CHECK(target.ion[0].measure_error.value == doctest::Approx(2e-3));
}

TEST_CASE("reach limits the pairs") {
  const auto reachable = [](const std::string& reach) {
    std::string text = good;
    text += "reach = " + reach + "\n[[pair.at]]\npairs = [[0, 3]]\n";
    const Target target = read(text);
    std::size_t count = 0;
    for (const PairFigures& pair : target.pairs) count += pair.reachable ? 1 : 0;
    return count;
  };
  CHECK(reachable("\"all\"") == 6);
  CHECK(reachable("1") == 4);
  CHECK(reachable("2") == 6);
  CHECK(reachable("\"listed\"") == 1);
}

TEST_CASE("figures of one statement are wrong together") {
  std::string text = good;
  text.replace(text.find("1e-4"), 4, "[1e-4, 2e-5]");
  const Target target = read(text + "[[ion.at]]\nions = [3]\npulse_error = [3e-4, 1e-4]\n");
  CHECK(target.ion[0].pulse_error.origin != 0);
  CHECK(target.ion[0].pulse_error.origin == target.ion[2].pulse_error.origin);
  CHECK(target.ion[0].pulse_error.origin != target.ion[3].pulse_error.origin);
}

TEST_CASE("beams without steering light the middle of the chain") {
  std::string text = good;
  text.insert(text.find("ions = 4"), "beams = 2\nbeams_steered = false\n");
  const Target target = read(text);
  CHECK(!target.ion[0].addressed);
  CHECK(target.ion[1].addressed);
  CHECK(target.ion[2].addressed);
  CHECK(!target.ion[3].addressed);
}

TEST_CASE("every fault has its place") {
  const auto changed = [](const std::string& from, const std::string& to) {
    std::string text = good;
    text.replace(text.find(from), from.size(), to);
    return text;
  };
  using Said = std::vector<std::string>;
  CHECK(faults(good).empty());
  CHECK(faults(good + "speed = 3\n") == Said{"12:1: unknown key 'speed' in [pair]"});
  CHECK(faults(changed("[machine]", "[machines]")) ==
        Said{"1:1: the key 'ions' is missing in [machine]", "2:2: unknown key 'machines'"});
  CHECK(faults(changed("ions = 4", "ions = 0")) == Said{"3:8: 'ions' must be a whole number from 1 to 512"});
  CHECK(faults(changed("ions = 4", "ions = 4.5")) ==
        Said{"3:8: 'ions' must be a whole number from 1 to 512"});
  CHECK(faults(changed("pulse_us = 5", "pulse_us = -5")) == Said{"5:12: 'pulse_us' must be above 0"});
  CHECK(faults(changed("pulse_us = 5", "pulse_us = nan")) == Said{"5:12: 'pulse_us' must be above 0"});
  CHECK(faults(changed("2e-3", "1.2")) == Said{"7:17: 'measure_error' must be a probability, 0 to 1"});
  CHECK(faults(changed("2e-3", "\"low\"")) ==
        Said{"7:17: 'measure_error' must be a number or [number, standard deviation]"});
  CHECK(faults(changed("2e-3", "[2e-3, -1e-3]")) ==
        Said{"7:17: 'measure_error' must be a probability, 0 to 1, with a deviation of 0 or more"});
  CHECK(faults(changed("interaction_us = 200\n", "")) ==
        Said{"8:1: the key 'interaction_us' is missing in [pair]"});
  CHECK(faults(changed("name = \"test\"", "")) == Said{"1:1: the key 'name' is missing"});
  CHECK(faults(good + "reach = 0\n") ==
        Said{"12:9: 'reach' must be \"all\", \"listed\" or a distance of 1 or more"});
  CHECK(faults(good + "[[pair.at]]\npairs = [[0, 4]]\n") == Said{"13:14: ions are numbered 0 to 3 here"});
  CHECK(faults(good + "[[pair.at]]\npairs = [[2, 2]]\n") == Said{"13:10: a pair has two different ions"});
  CHECK(faults(good + "[[pair.at]]\npairs = [7]\n") == Said{"13:10: a pair is a list of two ions: [0, 1]"});
  CHECK(faults(good + "at = 3\n") == Said{"12:6: 'at' must be tables of their own: [[pair.at]]"});
  CHECK(faults(good + "[ion\n").front().starts_with("12:"));
  CHECK(faults("").size() >= 2);
  CHECK(faults(std::string("\0\x01\xff\xfe", 4)).size() == 1);
  // Two faults, two messages, in the order of the file.
  CHECK(faults(changed("2e-3", "1.2") + "speed = 3\n").size() == 2);
}

TEST_CASE("a damaged file is read or refused, never more than that") {
  support::Random random(31);
  const std::string whole = read_text(support::tree_path("targets/lugger-12.toml"));
  int refused = 0;
  for (int round = 0; round < 300; ++round) {
    std::string text = whole;
    for (int k = random.between(1, 4); k > 0; --k) {
      const auto at = static_cast<std::size_t>(random.below(static_cast<int>(text.size())));
      switch (random.below(4)) {
        case 0:
          text[at] = static_cast<char>(random.below(256));
          break;
        case 1:
          text.erase(at, static_cast<std::size_t>(random.between(1, 30)));
          break;
        case 2:
          text.insert(at,
                      text.substr(static_cast<std::size_t>(random.below(static_cast<int>(text.size()))), 20));
          break;
        default:
          text.resize(at + 1);
          break;
      }
    }
    try {
      const Target target = read(text);
      CHECK(target.ions > 0);
    } catch (const Failure& failure) {
      ++refused;
      CHECK(failure.exit == Exit::target_cannot);
      CHECK(!failure.messages.empty());
    }
  }
  CHECK(refused > 100);
}

TEST_CASE("a typical machine of any size") {
  const Target target = typical(100000);
  CHECK(target.pair(5, 99999).reachable);
  CHECK(cost_of(target).interaction_us == typical(2).pair(0, 1).takes_us);
}

TEST_CASE("a missing file is file trouble") {
  try {
    read_target("/nowhere/at-all.toml");
    FAIL("must throw");
  } catch (const Failure& failure) {
    CHECK(failure.exit == Exit::file_trouble);
    CHECK(failure.messages.front().place.file == "/nowhere/at-all.toml");
  }
}

TEST_CASE("the machines by figures of this tree are read") {
  const Target small = read_target(tree("targets/wherry-5.toml"));
  CHECK(small.ions == 5);
  CHECK(small.name == "wherry-5");
  CHECK(small.sha256 == sha256(read_text(tree("targets/wherry-5.toml"))));
  CHECK(small.pair(0, 4).takes_us == 240);
  const Target middle = read_target(tree("targets/lugger-12.toml"));
  CHECK(middle.ions == 12);
  for (const PairFigures& pair : middle.pairs) CHECK(pair.reachable);
  const Target limited = read_target(tree("targets/tug-9.toml"));
  CHECK(limited.pair(2, 5).reachable);
  CHECK(!limited.pair(3, 6).reachable);
  CHECK(limited.pair(0, 8).reachable);
  CHECK(!limited.pair(0, 4).reachable);
}

TEST_CASE("the cost for passes is the average machine") {
  Target target = typical(3);
  target.pair(0, 1).slope.value = 7e-3;
  target.pair(0, 2).reachable = false;
  const Cost cost = cost_of(target);
  CHECK(cost.interaction_slope == doctest::Approx((7e-3 + 4e-3) / 2));
  CHECK(cost.interaction_floor == doctest::Approx(1e-3));
  CHECK(cost.pulse == doctest::Approx(2e-4));
}
