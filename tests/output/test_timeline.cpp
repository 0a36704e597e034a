// The timed list as JSON and CSV: keys and columns as promised, the same rows in both, ids in order.
#include <doctest/doctest.h>
#include <fmt/format.h>

#include <nlohmann/json.hpp>
#include <set>
#include <sstream>

#include "output/sample.h"
#include "output/summary.h"

using namespace isinglass;
using nlohmann::json;

namespace {

json timeline(const Sample& sample) {
  std::ostringstream text;
  write_timeline_json(text, sample.compiled);
  return json::parse(text.str());
}

std::set<std::string> keys(const json& object) {
  std::set<std::string> found;
  for (const auto& [key, value] : object.items()) found.insert(key);
  return found;
}

/// All operations, nested ones too, in the order of their ids.
void collect(const json& list, std::vector<json>& all) {
  for (const json& op : list) {
    all.push_back(op);
    if (!op.contains("arms")) continue;
    for (const json& arm : op["arms"]) collect(arm["operations"], all);
  }
}

std::vector<std::string> cells(const std::string& line) {
  std::vector<std::string> found(1);
  bool is_quoted = false;
  for (const char byte : line) {
    if (byte == '"') {
      is_quoted = !is_quoted;
    } else if (byte == ',' && !is_quoted) {
      found.emplace_back();
    } else {
      found.back() += byte;
    }
  }
  return found;
}

}  // namespace

TEST_CASE("JSON: the keys of the format") {
  const Sample sample;
  const json list = timeline(sample);
  CHECK(keys(list) == std::set<std::string>{"format", "version", "source", "target", "units", "ions",
                                            "placement", "operations", "totals", "before"});
  CHECK(list["format"] == "isinglass-timeline");
  CHECK(list["version"] == 1);
  CHECK(list["source"] == json{{"file", "buoy, \"nine\".qasm"}, {"sha256", std::string(64, 'a')}});
  CHECK(list["units"] == json{{"time", "us"}, {"angle", "rad"}});
  CHECK(list["ions"] == 4);
  CHECK(list["placement"][2] == json{{"qubit", "anc"}, {"start", 2}, {"end", 2}});
  CHECK(keys(list["totals"]) == std::set<std::string>{"xx", "xx_units", "r", "xx_depth", "pairs", "duration",
                                                      "success", "error", "error_by_source"});
  CHECK(keys(list["totals"]["error_by_source"]) ==
        std::set<std::string>{"prepare", "r", "xx", "idle", "crosstalk", "measure"});
  CHECK(list["before"] == json{{"one_qubit", 9}, {"two_qubit", 4}, {"two_qubit_depth", 3}});
}

TEST_CASE("JSON: each kind has what it needs, ids count through, times lie within their branch") {
  const Sample sample;
  std::vector<json> all;
  collect(timeline(sample)["operations"], all);
  std::map<std::string, json> of_kind;
  for (std::size_t i = 0; i < all.size(); ++i) {
    CHECK(all[i]["id"] == i);
    for (const char* key : {"kind", "ions", "at", "takes", "error", "from"}) CHECK(all[i].contains(key));
    of_kind.emplace(all[i]["kind"], all[i]);
  }
  CHECK(of_kind["prepare"]["from"].empty());
  CHECK(of_kind["r"]["theta"] == 1.0 / 3);
  CHECK(of_kind["r"]["phi"] == 0.1);
  CHECK(of_kind["xx"]["theta"] == pi / 4);
  CHECK(of_kind["xx"]["phi"] == json{0.0, pi / 2});
  CHECK(of_kind["xx"]["from"] == json{3, 4});
  CHECK(of_kind["measure"]["bits"] == json{"c[0]"});
  CHECK(of_kind["rz"]["phi"] == 0.75);
  CHECK(of_kind["compute"]["statement"] == "c[1] = c[0];");
  CHECK(of_kind["barrier"]["ions"] == json{0, 1, 2});
  CHECK(of_kind.contains("wait"));
  CHECK(of_kind.contains("reset"));
  const json decide = of_kind["decide"];
  CHECK(decide["condition"] == "if (c[0] == 1)");
  REQUIRE(decide["arms"].size() == 2);
  CHECK(decide["arms"][0]["when"] == "then");
  CHECK(decide["arms"][1]["when"] == "else");
  const double begin = decide["at"].get<double>() + sample.target.feed_forward_us;
  for (const json& arm : decide["arms"]) {
    for (const json& op : arm["operations"]) {
      CHECK(op["at"].get<double>() >= begin - 1e-9);
      CHECK(op["at"].get<double>() + op["takes"].get<double>() <=
            decide["at"].get<double>() + decide["takes"].get<double>() + 1e-9);
    }
  }
  // The symbolic angle is an expression.
  bool has_expression = false;
  for (const json& op : all)
    has_expression = has_expression || op.value("theta", json()) == "0.5 + 2.5*t - (sin(t))";
  CHECK(has_expression);
}

TEST_CASE("CSV: the same rows in the same order") {
  const Sample sample;
  std::vector<json> all;
  collect(timeline(sample)["operations"], all);
  std::ostringstream stream;
  write_timeline_csv(stream, sample.compiled);
  std::istringstream text(stream.str());
  std::string line;
  std::getline(text, line);
  CHECK(line == "id,kind,ions,theta,phi,bits,at,takes,error,crosstalk,from,condition,arm");
  std::size_t row = 0;
  for (; std::getline(text, line); ++row) {
    const auto cell = cells(line);
    REQUIRE(cell.size() == 13);
    REQUIRE(row < all.size());
    CHECK(cell[0] == std::to_string(all[row]["id"].get<int>()));
    CHECK(cell[1] == all[row]["kind"]);
    CHECK(std::stod(cell[6]) == all[row]["at"]);
    CHECK(std::stod(cell[7]) == all[row]["takes"]);
    CHECK(std::stod(cell[8]) == all[row]["error"]);
    if (cell[1] == "measure") CHECK(cell[5] == all[row]["bits"][0]);
    if (cell[1] == "xx" && cell[12].empty()) CHECK(cell[2] == "0 1");
  }
  CHECK(row == all.size());
}

TEST_CASE("the summary shows what the JSON says") {
  const Sample sample;
  const json summary = json::parse(json_of(sample.compiled).dump());
  CHECK(keys(summary) == std::set<std::string>{"source", "target", "totals", "before"});
  const std::string text = text_of(sample.compiled);
  CHECK(text.find("duration") != std::string::npos);
  CHECK(text.find(fmt::format("{:.4f}", sample.timed.totals.success)) != std::string::npos);
}

TEST_CASE("the rehearsal in the summary") {
  Sample sample;
  Rehearsal rehearsal;
  rehearsal.shots = 200;
  rehearsal.estimate = 0.9;
  rehearsal.no_error = 0.895;
  rehearsal.no_error_deviation = 0.02;
  rehearsal.distance = 0.05;
  rehearsal.outcomes = {{"c=01", 0.75, 0.7}, {"c=10", 0.25, 0.3}};
  sample.compiled.rehearsal = &rehearsal;
  const json summary = json::parse(json_of(sample.compiled).dump());
  CHECK(keys(summary["rehearsal"]) == std::set<std::string>{"method", "shots", "estimate", "no_error",
                                                            "no_error_deviation", "distance", "outcomes",
                                                            "left_out"});
  CHECK(summary["rehearsal"]["outcomes"][1] ==
        json{{"bits", "c=10"}, {"without_noise", 0.25}, {"with_noise", 0.3}});
  const std::string text = text_of(rehearsal);
  CHECK(text.find("c=01            0.7500      0.7000\n") != std::string::npos);
  CHECK(text.find("0.8950 +- 0.0200") != std::string::npos);
}

TEST_CASE("tables align: words left, numbers right") {
  CHECK(table({{"name", "xx"}, {"buoy", "7"}, {"a", "1200"}}) ==
        "name    xx\n"
        "buoy     7\n"
        "a     1200\n");
  CHECK(table({{"é", "x"}, {"ab", "y"}}) == "é   x\nab  y\n");
}
