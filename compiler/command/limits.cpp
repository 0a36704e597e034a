// Limits and baselines; see limits.h.
#include "command/limits.h"

#include <fmt/format.h>
#include <toml++/toml.h>

#include <algorithm>
#include <array>
#include <filesystem>
#include <nlohmann/json.hpp>

#include "circuit/files.h"
#include "circuit/message.h"

namespace isinglass {

namespace {

constexpr std::array<std::string_view, 7> figures = {"xx",    "xx_units", "r",    "xx_depth",
                                                     "pairs", "duration", "error"};

std::string plain(const std::string& path) {
  return std::filesystem::path(path).lexically_normal().string();
}

/// Collects what is wrong with a limits file, each with its place.
struct LimitsReader {
  const std::string& path;
  const std::string& text;
  std::vector<Message> faults = {};

  void fault(const toml::source_region& where, std::string what) {
    Message message;
    message.place = {path, where.begin.line, where.begin.column};
    message.text = std::move(what);
    std::size_t start = 0;
    for (std::size_t line = 1; line < where.begin.line && start != std::string::npos; ++line) {
      start = text.find('\n', start);
      if (start != std::string::npos) ++start;
    }
    if (start != std::string::npos) message.source_line = text.substr(start, text.find('\n', start) - start);
    faults.push_back(std::move(message));
  }

  void read_limit(Limits& limits, std::string_view key, const toml::node& node,
                  const toml::source_region& where) {
    if (std::find(figures.begin(), figures.end(), key) == figures.end()) {
      fault(where, fmt::format("there is no figure {}; limits are set on {}", key, fmt::join(figures, ", ")));
      return;
    }
    const auto value = node.value<double>();
    if (!value || node.is_boolean() || !std::isfinite(*value) || *value < 0) {
      fault(node.source(), fmt::format("the limit of {} must be a number that is not negative", key));
      return;
    }
    limits[std::string(key)] = *value;
  }
};

}  // namespace

std::span<const std::string_view> limited_figures() {
  return figures;
}

double figure_of(const Totals& totals, std::string_view figure) {
  if (figure == "xx") return static_cast<double>(totals.xx);
  if (figure == "xx_units") return totals.xx_units;
  if (figure == "r") return static_cast<double>(totals.r);
  if (figure == "xx_depth") return static_cast<double>(totals.xx_depth);
  if (figure == "pairs") return static_cast<double>(totals.pairs);
  if (figure == "duration") return totals.duration;
  if (figure == "error") return totals.error;
  throw std::logic_error(fmt::format("no figure {}", figure));
}

Limits LimitsFile::of(const std::string& source) const {
  Limits limits = for_all;
  for (const auto& [path, own] : for_one) {
    if (plain(path) != plain(source)) continue;
    for (const auto& [figure, most] : own) limits[figure] = most;
  }
  return limits;
}

LimitsFile read_limits(const std::string& path) {
  const std::string text = read_text(path);
  LimitsReader reader{path, text};
  LimitsFile file;
  toml::table root;
  try {
    root = toml::parse(text, path);
  } catch (const toml::parse_error& error) {
    reader.fault(error.source(), std::string(error.description()));
    throw Failure(Exit::usage, std::move(reader.faults));
  }
  for (const auto& [key, node] : root) {
    if (key.str() != "limits" || !node.is_table()) {
      reader.fault(key.source(),
                   fmt::format("a limits file holds the table [limits] and tables [limits.\"path\"], not {}",
                               key.str()));
      continue;
    }
    for (const auto& [inner, value] : *node.as_table()) {
      if (!value.is_table()) {
        reader.read_limit(file.for_all, inner.str(), value, inner.source());
        continue;
      }
      Limits& own = file.for_one[std::string(inner.str())];
      for (const auto& [figure, limit] : *value.as_table()) {
        reader.read_limit(own, figure.str(), limit, figure.source());
      }
    }
  }
  if (!reader.faults.empty()) throw Failure(Exit::usage, std::move(reader.faults));
  return file;
}

std::map<std::string, Limits> read_baseline(const std::string& path) {
  const std::string text = read_text(path);
  const auto list = nlohmann::json::parse(text, nullptr, false);
  const Failure wrong(Exit::usage,
                      path + " is no baseline: a baseline is what `isinglass guard --format json` wrote");
  if (!list.is_array()) throw wrong;
  std::map<std::string, Limits> baseline;
  for (const auto& entry : list) {
    if (!entry.is_object() || !entry.contains("source") || !entry.contains("totals")) throw wrong;
    const auto& source = entry["source"];
    if (!source.is_object() || !source.contains("file") || !source["file"].is_string()) throw wrong;
    Limits& own = baseline[plain(source["file"].get<std::string>())];
    for (const std::string_view figure : figures) {
      const auto& totals = entry["totals"];
      if (!totals.contains(figure) || !totals[std::string(figure)].is_number()) throw wrong;
      own[std::string(figure)] = totals[std::string(figure)].get<double>();
    }
  }
  return baseline;
}

}  // namespace isinglass
