// Figures of a compiled program as JSON and as text; see summary.h.
#include "output/summary.h"

#include <fmt/format.h>

#include <algorithm>

namespace isinglass {

namespace {

std::size_t width(std::string_view text) {
  return static_cast<std::size_t>(
      std::count_if(text.begin(), text.end(), [](char byte) { return (byte & 0xC0) != 0x80; }));
}

bool looks_like_number(std::string_view cell) {
  return cell == "-" ||
         (!cell.empty() &&
          (std::isdigit(static_cast<unsigned char>(cell.back())) != 0 || cell.ends_with('%')) &&
          std::isalpha(static_cast<unsigned char>(cell.front())) == 0);
}

std::string short_number(double x) {
  if (x == 0) return "0";
  return std::abs(x) < 1e-3 ? fmt::format("{:.2e}", x) : fmt::format("{:.4g}", x);
}

}  // namespace

nlohmann::ordered_json json_of(const Totals& totals) {
  nlohmann::ordered_json json;
  json["xx"] = totals.xx;
  json["xx_units"] = totals.xx_units;
  json["r"] = totals.r;
  json["xx_depth"] = totals.xx_depth;
  json["pairs"] = totals.pairs;
  json["duration"] = totals.duration;
  json["success"] = totals.success;
  json["error"] = totals.error;
  auto& shares = json["error_by_source"];
  for (std::size_t i = 0; i < source_count; ++i) {
    shares[std::string(name(static_cast<Source>(i)))] = totals.error_by_source[i];
  }
  if (totals.success_low < totals.success_high) {
    json["success_interval"] = {totals.success_low, totals.success_high};
  }
  return json;
}

nlohmann::ordered_json json_of(const Before& before) {
  return {{"one_qubit", before.one_qubit},
          {"two_qubit", before.two_qubit},
          {"two_qubit_depth", before.two_qubit_depth}};
}

nlohmann::ordered_json json_of(const Rehearsal& rehearsal) {
  nlohmann::ordered_json json;
  json["method"] = name(rehearsal.method);
  json["shots"] = rehearsal.shots;
  json["estimate"] = rehearsal.estimate;
  if (rehearsal.no_error >= 0) {
    json["no_error"] = rehearsal.no_error;
    json["no_error_deviation"] = rehearsal.no_error_deviation;
  }
  if (rehearsal.fidelity >= 0) {
    json["fidelity"] = rehearsal.fidelity;
    json["fidelity_deviation"] = rehearsal.fidelity_deviation;
  }
  json["distance"] = rehearsal.distance;
  json["outcomes"] = nlohmann::ordered_json::array();
  for (const RehearsedOutcome& outcome : rehearsal.outcomes) {
    json["outcomes"].push_back({{"bits", outcome.bits},
                                {"without_noise", outcome.without_noise},
                                {"with_noise", outcome.with_noise}});
  }
  json["left_out"] = left_out_by_the_model();
  return json;
}

nlohmann::ordered_json json_of(const Compiled& compiled) {
  nlohmann::ordered_json json = {
      {"source", {{"file", compiled.source_file}, {"sha256", compiled.source_sha256}}},
      {"target", {{"name", compiled.target.name}, {"sha256", compiled.target.sha256}}},
      {"totals", json_of(compiled.timed.totals)},
      {"before", json_of(compiled.before)}};
  if (compiled.rehearsal != nullptr) json["rehearsal"] = json_of(*compiled.rehearsal);
  return json;
}

std::string text_of(const Compiled& compiled) {
  const Totals& totals = compiled.timed.totals;
  const Before& before = compiled.before;
  const auto count = [](std::size_t n) { return fmt::format("{}", n); };
  std::string text = table({
      {"", "before", "after"},
      {"two-qubit gates / interactions", count(before.two_qubit), count(totals.xx)},
      {"  in units of a full interaction", count(before.two_qubit), fmt::format("{:.4g}", totals.xx_units)},
      {"  longest chain of them", count(before.two_qubit_depth), count(totals.xx_depth)},
      {"one-qubit gates / pulses", count(before.one_qubit), count(totals.r)},
  });
  if (compiled.placed.moves > 0) {
    text += fmt::format("{} swaps, counted in, bring qubits to where pairs are reachable\n",
                        compiled.placed.moves);
  }
  text += fmt::format("\nduration {:.6g} us on {}, {} pair{} to calibrate\n", totals.duration,
                      compiled.target.name, totals.pairs, totals.pairs == 1 ? "" : "s");
  text += fmt::format("success {:.4f}", totals.success);
  if (totals.success_low < totals.success_high) {
    text += fmt::format(" (95 %: {:.4f} to {:.4f})", totals.success_low, totals.success_high);
  }
  text += fmt::format(", error {}", short_number(totals.error));
  if (totals.error > 0) {
    text += " =";
    for (std::size_t i = 0; i < source_count; ++i) {
      text += fmt::format("{} {} {}", i > 0 ? " +" : "", name(static_cast<Source>(i)),
                          short_number(totals.error_by_source[i]));
    }
  }
  return text + "\n";
}

std::string text_of(const Rehearsal& rehearsal) {
  constexpr std::size_t most_rows = 10;
  std::string text = fmt::format("rehearsal by {}", name(rehearsal.method));
  if (rehearsal.shots > 0) text += fmt::format(", {} shots", rehearsal.shots);
  text += fmt::format("\nestimated success {:.4f}", rehearsal.estimate);
  if (rehearsal.no_error >= 0) {
    text += fmt::format(", shots without error {:.4f} +- {:.4f}", rehearsal.no_error,
                        rehearsal.no_error_deviation);
  }
  if (rehearsal.fidelity >= 0) {
    text += fmt::format(", fidelity {:.6f}", rehearsal.fidelity);
    if (rehearsal.fidelity_deviation > 0) text += fmt::format(" +- {:.6f}", rehearsal.fidelity_deviation);
  }
  text += "\n";
  if (!rehearsal.outcomes.empty()) {
    std::vector<std::vector<std::string>> rows = {{"outcome", "without noise", "with noise"}};
    for (const RehearsedOutcome& outcome : rehearsal.outcomes) {
      if (rows.size() > most_rows) break;
      rows.push_back({outcome.bits, fmt::format("{:.4f}", outcome.without_noise),
                      fmt::format("{:.4f}", outcome.with_noise)});
    }
    text += "\n" + table(rows);
    if (rehearsal.outcomes.size() > most_rows) {
      text += fmt::format("and {} other outcomes\n", rehearsal.outcomes.size() - most_rows);
    }
    text += fmt::format("total variation distance of the two {:.4f}\n", rehearsal.distance);
  }
  return text + std::string(left_out_by_the_model()) + "\n";
}

std::string table(const std::vector<std::vector<std::string>>& rows) {
  std::vector<std::size_t> widths;
  for (const auto& row : rows) {
    widths.resize(std::max(widths.size(), row.size()), 0);
    for (std::size_t i = 0; i < row.size(); ++i) widths[i] = std::max(widths[i], width(row[i]));
  }
  std::vector<bool> is_number(widths.size(), true);
  for (std::size_t r = 1; r < rows.size(); ++r) {
    for (std::size_t i = 0; i < rows[r].size(); ++i) {
      is_number[i] = is_number[i] && (rows[r][i].empty() || looks_like_number(rows[r][i]));
    }
  }
  std::string text;
  for (const auto& row : rows) {
    std::string line;
    for (std::size_t i = 0; i < row.size(); ++i) {
      const std::string padding(widths[i] - width(row[i]), ' ');
      if (i > 0) line += "  ";
      line += is_number[i] ? padding + row[i] : row[i] + padding;
    }
    line.erase(line.find_last_not_of(' ') + 1);
    text += line + "\n";
  }
  return text;
}

}  // namespace isinglass
