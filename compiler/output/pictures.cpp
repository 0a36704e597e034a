// The pictures of the report; see pictures.h.
#include "output/pictures.h"

#include <fmt/format.h>

#include <algorithm>
#include <array>
#include <cmath>
#include <map>

#include "output/text.h"

namespace isinglass {

namespace {

/// A picture `width` by `height`, with its name and description.
std::string svg(double width, double height, const std::string& title, const std::string& description,
                const std::string& content) {
  return fmt::format(
      "<svg viewBox=\"0 0 {0:.0f} {1:.0f}\" style=\"max-width:{0:.0f}px\" role=\"img\" "
      "aria-label=\"{2}\"><title>{2}</title><desc>{3}</desc>\n{4}</svg>\n",
      width, height, escaped(title), escaped(description), content);
}

std::string short_figure(double x) {
  if (x == 0) return "0";
  return std::abs(x) < 1e-2 ? fmt::format("{:.1e}", x) : fmt::format("{:.3g}", x);
}

std::string time_text(double us) {
  if (us >= 1e6) return fmt::format("{:.4g} s", us * 1e-6);
  if (us >= 1e3) return fmt::format("{:.4g} ms", us * 1e-3);
  return fmt::format("{:.4g} µs", us);
}

/// A round step that divides `span` into about `parts`.
double round_step(double span, int parts) {
  const double rough = span / parts;
  const double power = std::pow(10, std::floor(std::log10(rough)));
  for (const double factor : {1.0, 2.0, 5.0}) {
    if (factor * power >= rough) return factor * power;
  }
  return 10 * power;
}

// The timeline.

constexpr double chart_left = 64;
constexpr double chart_width = 1000;
constexpr double row_height = 22;
constexpr double bar_height = 14;
constexpr double chart_top = 8;
constexpr std::size_t most_single_entries = 4000;
// Of longer chains the beginning is drawn.
constexpr int most_rows_drawn = 128;

/// What an entry looks like; the names are classes of the style sheet.
std::string_view look(TimedKind kind) {
  switch (kind) {
    case TimedKind::prepare:
    case TimedKind::reset:
      return "prep";
    case TimedKind::r:
      return "pulse";
    case TimedKind::xx:
      return "inter";
    case TimedKind::measure:
      return "read";
    default:
      return "idle";
  }
}

class TimelinePicture {
 public:
  explicit TimelinePicture(const Compiled& compiled)
      : compiled_(compiled), circuit_(compiled.placed.circuit), row_of_(circuit_.wires, -1) {
    for (std::uint32_t ion = 0; ion < circuit_.wires; ++ion) {
      if (compiled.placed.in_use[ion] && rows_ < most_rows_drawn) row_of_[ion] = rows_++;
    }
    span_ = std::max(compiled.timed.totals.duration, 1e-9);
  }

  std::string draw() {
    std::size_t entries = 0;
    for (const TimedBlock& block : compiled_.timed.blocks) entries += block.operations.size();
    axis();
    if (entries <= most_single_entries) {
      single_entries(0, 0, false);
    } else {
      stretches();
    }
    const double height = chart_top + rows_ * row_height + 30;
    return svg(chart_width, height, "Timeline of the ions",
               fmt::format("{} ions over {}: {} interactions, {} pulses", rows_, time_text(span_),
                           compiled_.timed.totals.xx, compiled_.timed.totals.r),
               text_ + links_);
  }

 private:
  bool is_drawn(std::uint32_t ion) const { return row_of_[ion] >= 0; }
  double x(double time) const { return chart_left + (chart_width - chart_left - 4) * time / span_; }
  double y(std::uint32_t ion) const { return chart_top + row_of_[ion] * row_height; }

  void axis() {
    const double bottom = chart_top + rows_ * row_height;
    const double step = round_step(span_, 8);
    for (int i = 0; i * step <= span_ * (1 + 1e-9); ++i) {
      text_ += fmt::format("<line class=\"grid\" x1=\"{0:.1f}\" x2=\"{0:.1f}\" y1=\"{1}\" y2=\"{2}\"/>",
                           x(i * step), chart_top, bottom + 4);
      text_ += fmt::format("<text class=\"tick\" x=\"{:.1f}\" y=\"{}\" text-anchor=\"{}\">{}</text>\n",
                           x(i * step), bottom + 18, x(i * step) > chart_width - 30 ? "end" : "middle",
                           i == 0 ? "0" : time_text(i * step));
    }
    for (std::uint32_t ion = 0; ion < circuit_.wires; ++ion) {
      if (!is_drawn(ion)) continue;
      const double middle = y(ion) + row_height / 2;
      text_ += fmt::format("<text class=\"tick\" x=\"{}\" y=\"{}\" text-anchor=\"end\">ion {}</text>",
                           chart_left - 8, middle + 4, ion);
      text_ += fmt::format("<line class=\"rail\" x1=\"{}\" x2=\"{}\" y1=\"{}\" y2=\"{}\"/>\n", chart_left,
                           chart_width - 4, middle, middle);
    }
  }

  void bar(std::string_view style, double at, double takes, std::uint32_t ion, const std::string& title) {
    if (!is_drawn(ion)) return;
    const double width = std::max(x(at + takes) - x(at), 1.4);
    text_ += fmt::format(
        "<rect class=\"{}\" x=\"{:.2f}\" y=\"{:.1f}\" width=\"{:.2f}\" height=\"{}\" "
        "rx=\"1.5\"><title>{}</title></rect>\n",
        style, x(at), y(ion) + (row_height - bar_height) / 2, width, bar_height, escaped(title));
  }

  std::string told(const TimedOperation& entry, const Operation* op) const {
    std::string text(name(entry.kind));
    if (op != nullptr && op->is_unitary()) {
      text += "(" + angle_text(op->angle(0), circuit_);
      for (int i = 1; i < angle_count(op->kind); ++i) text += ", " + angle_text(op->angle(i), circuit_);
      text += ")";
    }
    text += fmt::format(", at {:.6g} µs, takes {:.4g} µs, error {}", entry.at, entry.takes,
                        short_figure(entry.error));
    return text;
  }

  void single_entries(std::uint32_t block, double begin, bool is_possible) {
    for (const TimedOperation& entry : compiled_.timed.blocks[block].operations) {
      const Operation* op =
          entry.operation == no_operation ? nullptr : &circuit_.blocks[block][entry.operation];
      if (entry.kind == TimedKind::decide) {
        decision(entry, *op, begin);
      } else if (entry.kind == TimedKind::barrier) {
        for (const std::uint32_t ion : circuit_.operands(*op)) {
          if (!is_drawn(ion)) continue;
          text_ +=
              fmt::format("<line class=\"fence\" x1=\"{0:.2f}\" x2=\"{0:.2f}\" y1=\"{1}\" y2=\"{2}\"/>\n",
                          x(begin + entry.at), y(ion), y(ion) + row_height);
        }
      } else if (entry.takes > 0 && entry.ion_count > 0) {
        std::string style(look(entry.kind));
        if (is_possible) style += " maybe";
        const std::string title = told(entry, op);
        if (entry.kind == TimedKind::xx) link(style, begin + entry.at, entry);
        for (int i = 0; i < entry.ion_count; ++i)
          bar(style, begin + entry.at, entry.takes, entry.ion[i], title);
      }
    }
  }

  /// The two ions of an interaction are joined.
  void link(const std::string& style, double at, const TimedOperation& entry) {
    if (!is_drawn(entry.ion[0]) || !is_drawn(entry.ion[1])) return;
    const double middle = (x(at) + x(at + entry.takes)) / 2;
    links_ += fmt::format("<line class=\"{0}\" x1=\"{1:.2f}\" x2=\"{1:.2f}\" y1=\"{2}\" y2=\"{3}\"/>\n",
                          style, middle, y(entry.ion[0]) + row_height / 2, y(entry.ion[1]) + row_height / 2);
  }

  /// A frame around the branch, with its longest arm inside.
  void decision(const TimedOperation& entry, const Operation& op, double begin) {
    const Branch& branch = circuit_.branches[op.payload];
    std::uint32_t longest = 0;
    for (const Branch::Arm& arm : branch.arms) {
      if (longest == 0 || compiled_.timed.blocks[arm.block].takes > compiled_.timed.blocks[longest].takes) {
        longest = arm.block;
      }
    }
    std::vector<std::uint32_t> ions;
    for (const std::uint32_t ion : circuit_.operands(op)) {
      if (is_drawn(ion)) ions.push_back(ion);
    }
    if (!ions.empty()) {
      const auto [top, bottom] =
          std::minmax_element(ions.begin(), ions.end(),
                              [&](std::uint32_t a, std::uint32_t b) { return row_of_[a] < row_of_[b]; });
      text_ += fmt::format(
          "<rect class=\"branch\" x=\"{:.2f}\" y=\"{}\" width=\"{:.2f}\" height=\"{}\" "
          "rx=\"3\"><title>{}</title></rect>\n",
          x(begin + entry.at), y(*top) + 1,
          std::max(x(begin + entry.at + entry.takes) - x(begin + entry.at), 2.0),
          y(*bottom) - y(*top) + row_height - 2, escaped(branch_text(branch, circuit_)));
    }
    if (longest != 0) single_entries(longest, begin + entry.at + compiled_.target.feed_forward_us, true);
  }

  /// Many entries: each ion's time in small stretches, drawn as what fills most of it.
  void stretches() {
    constexpr std::size_t columns = 460;
    constexpr std::array<std::string_view, 4> looks = {"prep", "pulse", "inter", "read"};
    std::vector<std::array<float, 4>> filled(static_cast<std::size_t>(rows_) * columns, {0, 0, 0, 0});
    const double column_us = span_ / columns;
    fill(0, 0, column_us, columns, looks, filled);
    for (std::uint32_t ion = 0; ion < circuit_.wires; ++ion) {
      if (!is_drawn(ion)) continue;
      for (std::size_t c = 0; c < columns; ++c) {
        const auto& share = filled[static_cast<std::size_t>(row_of_[ion]) * columns + c];
        const auto most = std::max_element(share.begin(), share.end());
        const double part = *most / column_us;
        if (part < 0.02) continue;
        text_ += fmt::format(
            "<rect class=\"{}\" x=\"{:.2f}\" y=\"{:.1f}\" width=\"{:.2f}\" height=\"{}\" "
            "opacity=\"{:.2f}\"/>\n",
            looks[static_cast<std::size_t>(most - share.begin())], x(static_cast<double>(c) * column_us),
            y(ion) + (row_height - bar_height) / 2, x(column_us) - x(0) + 0.1, bar_height,
            0.25 + 0.75 * std::min(part, 1.0));
      }
    }
  }

  void fill(std::uint32_t block, double begin, double column_us, std::size_t columns,
            const std::array<std::string_view, 4>& looks, std::vector<std::array<float, 4>>& filled) {
    for (const TimedOperation& entry : compiled_.timed.blocks[block].operations) {
      if (entry.kind == TimedKind::decide) {
        const Operation& op = circuit_.blocks[block][entry.operation];
        const auto& arms = circuit_.branches[op.payload].arms;
        if (!arms.empty()) {
          fill(arms[0].block, begin + entry.at + compiled_.target.feed_forward_us, column_us, columns, looks,
               filled);
        }
      }
      const auto kind = std::find(looks.begin(), looks.end(), look(entry.kind));
      if (kind == looks.end()) continue;
      const double from = begin + entry.at;
      const double to = from + entry.takes;
      const auto last = std::min(static_cast<std::size_t>(to / column_us), columns - 1);
      for (auto c = static_cast<std::size_t>(from / column_us); c <= last; ++c) {
        const double left = static_cast<double>(c) * column_us;
        const double part = std::min(to, left + column_us) - std::max(from, left);
        for (int i = 0; i < entry.ion_count; ++i) {
          if (!is_drawn(entry.ion[i])) continue;
          const auto row = static_cast<std::size_t>(row_of_[entry.ion[i]]);
          filled[row * columns + c][static_cast<std::size_t>(kind - looks.begin())] +=
              static_cast<float>(part);
        }
      }
    }
  }

  const Compiled& compiled_;
  const Circuit& circuit_;
  std::vector<int> row_of_;
  int rows_ = 0;
  double span_ = 1;
  std::string text_;
  std::string links_;  // above all bars
};

}  // namespace

std::string escaped(std::string_view text) {
  std::string safe;
  for (const char byte : text) {
    switch (byte) {
      case '&':
        safe += "&amp;";
        break;
      case '<':
        safe += "&lt;";
        break;
      case '>':
        safe += "&gt;";
        break;
      case '"':
        safe += "&quot;";
        break;
      default:
        safe += byte;
    }
  }
  return safe;
}

namespace {

struct BarPair {
  std::string label;
  double first;
  double second;
};

/// Two bars a row on a common scale; `text(value)` stands at the end of each.
template <class Text>
std::string paired_bars(std::span<const BarPair> rows, double label_width, const std::string& title,
                        const std::string& told, Text text) {
  const double bar_width = 520 - label_width;
  double most = 1e-9;
  for (const BarPair& row : rows) most = std::max({most, row.first, row.second});
  std::string content;
  double y = 4;
  for (const BarPair& row : rows) {
    content += fmt::format("<text class=\"label\" x=\"{}\" y=\"{}\" text-anchor=\"end\">{}</text>",
                           label_width - 10, y + 17, escaped(row.label));
    for (const auto& [style, value] : {std::pair("was", row.first), std::pair("is", row.second)}) {
      const double width = bar_width * value / most;
      content += fmt::format("<rect class=\"{}\" x=\"{}\" y=\"{}\" width=\"{:.2f}\" height=\"11\" rx=\"2\"/>",
                             style, label_width, y, std::max(width, 1.0));
      content += fmt::format("<text class=\"tick\" x=\"{:.1f}\" y=\"{}\">{}</text>\n",
                             label_width + width + 6, y + 10, text(value));
      y += 14;
    }
    y += 14;
  }
  return svg(600, y - 6, title, told, content);
}

}  // namespace

std::string picture_of_tally(const Compiled& compiled) {
  const Totals& totals = compiled.timed.totals;
  const Before& before = compiled.before;
  const std::array<BarPair, 4> rows = {{
      {"two-qubit gates", static_cast<double>(before.two_qubit), static_cast<double>(totals.xx)},
      {"in full units", static_cast<double>(before.two_qubit), totals.xx_units},
      {"longest chain", static_cast<double>(before.two_qubit_depth), static_cast<double>(totals.xx_depth)},
      {"one-qubit gates", static_cast<double>(before.one_qubit), static_cast<double>(totals.r)},
  }};
  return paired_bars(
      rows, 130, "Tally before and after",
      fmt::format("two-qubit gates {} before, {} interactions after, {:.4g} in units of a full one",
                  before.two_qubit, totals.xx, totals.xx_units),
      [](double value) { return fmt::format("{:.4g}", value); });
}

std::string picture_of_outcomes(const Rehearsal& rehearsal) {
  constexpr std::size_t most_rows = 10;
  std::vector<BarPair> rows;
  std::size_t longest = 0;
  for (const RehearsedOutcome& outcome : rehearsal.outcomes) {
    if (rows.size() == most_rows) break;
    rows.push_back({outcome.bits, outcome.without_noise, outcome.with_noise});
    longest = std::max(longest, outcome.bits.size());
  }
  const double label_width = std::clamp(9.0 * static_cast<double>(longest) + 16, 60.0, 330.0);
  return paired_bars(rows, label_width, "Outcomes without and with noise",
                     fmt::format("total variation distance {:.4g}", rehearsal.distance),
                     [](double value) { return fmt::format("{:.2f} %", 100 * value); });
}

std::string picture_of_errors(const Totals& totals) {
  std::string text;
  std::string told;
  double x = 0;
  constexpr double width = 600;
  for (std::size_t i = 0; i < source_count && totals.error > 0; ++i) {
    const double share = totals.error_by_source[i] / totals.error;
    const auto source = name(static_cast<Source>(i));
    if (share > 0) {
      text += fmt::format(
          "<rect class=\"source{}\" x=\"{:.2f}\" y=\"0\" width=\"{:.2f}\" height=\"26\"><title>{} {:.1f} "
          "%</title></rect>\n",
          i, x, share * width, source, 100 * share);
      told += fmt::format("{} {:.1f} %, ", source, 100 * share);
    }
    x += share * width;
  }
  return svg(width, 26, "Errors by source", told, text);
}

std::string picture_of_timeline(const Compiled& compiled) {
  return TimelinePicture(compiled).draw();
}

std::vector<PairWork> work_by_pair(const Circuit& circuit) {
  std::map<std::pair<std::uint32_t, std::uint32_t>, PairWork> table;
  for (const Block& block : circuit.blocks) {
    for (const Operation& op : block) {
      if (op.kind != Kind::xx) continue;
      const auto [a, b] = std::minmax(op.operand[0], op.operand[1]);
      PairWork& work = table[{a, b}];
      work.a = a;
      work.b = b;
      ++work.count;
      work.units += op.form[0] == 0 ? std::abs(op.value[0]) / (pi / 2) : 1;
    }
  }
  std::vector<PairWork> list;
  for (const auto& [pair, work] : table) list.push_back(work);
  std::stable_sort(list.begin(), list.end(), [](const auto& a, const auto& b) { return a.units > b.units; });
  return list;
}

std::string picture_of_pairs(const Compiled& compiled) {
  const Circuit& circuit = compiled.placed.circuit;
  std::vector<std::uint32_t> ions;
  constexpr std::size_t nowhere = ~std::size_t{0};
  std::vector<std::size_t> place(circuit.wires, nowhere);
  for (std::uint32_t ion = 0; ion < circuit.wires; ++ion) {
    if (!compiled.placed.in_use[ion] || ions.size() == most_rows_drawn) continue;
    place[ion] = ions.size();
    ions.push_back(ion);
  }
  const auto list = work_by_pair(circuit);
  const double most = list.empty() ? 1 : std::max(list.front().units, 1e-9);
  const double cell =
      std::clamp(360.0 / static_cast<double>(std::max<std::size_t>(ions.size(), 1)), 6.0, 44.0);
  constexpr double margin = 26;
  std::string text;
  for (std::size_t i = 0; i < ions.size(); ++i) {
    const double at = margin + cell * (static_cast<double>(i) + 0.5);
    if (cell >= 11 || i % 4 == 0) {
      text += fmt::format("<text class=\"tick\" x=\"{:.1f}\" y=\"18\" text-anchor=\"middle\">{}</text>", at,
                          ions[i]);
      text += fmt::format("<text class=\"tick\" x=\"20\" y=\"{:.1f}\" text-anchor=\"end\">{}</text>\n",
                          at + 4, ions[i]);
    }
    for (std::size_t j = i + 1; j < ions.size(); ++j) {
      const bool reachable = compiled.target.pair(ions[i], ions[j]).reachable;
      text += fmt::format("<rect class=\"{}\" x=\"{:.1f}\" y=\"{:.1f}\" width=\"{:.1f}\" height=\"{:.1f}\"/>",
                          reachable ? "cell" : "cell barred", margin + cell * static_cast<double>(j),
                          margin + cell * static_cast<double>(i), cell - 1.5, cell - 1.5);
    }
    text += "\n";
  }
  for (const PairWork& work : list) {
    if (place[work.a] == nowhere || place[work.b] == nowhere) continue;
    text += fmt::format(
        "<rect class=\"inter\" opacity=\"{:.2f}\" x=\"{:.1f}\" y=\"{:.1f}\" width=\"{:.1f}\" "
        "height=\"{:.1f}\"><title>ions {} and "
        "{}: {} interactions, {:.4g} units</title></rect>\n",
        0.2 + 0.8 * work.units / most, margin + cell * static_cast<double>(place[work.b]),
        margin + cell * static_cast<double>(place[work.a]), cell - 1.5, cell - 1.5, work.a, work.b,
        work.count, work.units);
  }
  const double size = margin + cell * static_cast<double>(ions.size()) + 4;
  return svg(size, size, "Pairs that interact", fmt::format("{} pairs of {} ions", list.size(), ions.size()),
             text);
}

std::string picture_of_placement(const Compiled& compiled) {
  const Placed& placed = compiled.placed;
  const std::uint32_t ions = std::min(placed.circuit.wires, std::uint32_t{most_rows_drawn});
  constexpr std::uint32_t most_in_row = 16;
  const std::uint32_t in_row = std::min(std::max(ions, 1u), most_in_row);
  const double step = 1000.0 / in_row;
  const double radius = std::min(15.0, step / 2 - 4);
  std::vector<std::string> start(ions);
  std::vector<std::string> end(ions);
  for (std::uint32_t q = 0; q < placed.start.size(); ++q) {
    const std::uint32_t first = placed.start[q];
    const std::uint32_t last = placed.circuit.end_wire[q];
    if (first < ions) start[first] = placed.circuit.wire_name(q);
    if (last < ions) end[last] = placed.circuit.wire_name(q);
  }
  std::string text;
  const std::uint32_t rows = (ions + in_row - 1) / in_row;
  for (std::uint32_t ion = 0; ion < ions; ++ion) {
    const double x = step * (ion % in_row + 0.5);
    const double y = 46 + 96.0 * (ion / in_row);
    if (ion + 1 < ions && ion % in_row + 1 < in_row) {
      text += fmt::format("<line class=\"rail\" x1=\"{:.1f}\" x2=\"{:.1f}\" y1=\"{:.1f}\" y2=\"{:.1f}\"/>",
                          x + radius, x + step - radius, y, y);
    }
    const bool is_ancilla = placed.in_use[ion] && start[ion].empty();
    text += fmt::format("<circle class=\"{}\" cx=\"{:.1f}\" cy=\"{:.1f}\" r=\"{:.1f}\"/>",
                        !placed.in_use[ion] ? "free"
                        : is_ancilla        ? "ancilla"
                                            : "taken",
                        x, y, radius);
    text += fmt::format("<text class=\"{}\" x=\"{:.1f}\" y=\"{:.1f}\" text-anchor=\"middle\">{}</text>",
                        placed.in_use[ion] ? "number" : "tick", x, y + 4.5, ion);
    text += fmt::format("<text class=\"label\" x=\"{:.1f}\" y=\"{:.1f}\" text-anchor=\"middle\">{}</text>", x,
                        y - radius - 8, escaped(start[ion]));
    text += fmt::format(
        "<text class=\"label faint\" x=\"{:.1f}\" y=\"{:.1f}\" text-anchor=\"middle\">{}</text>\n", x,
        y + radius + 18, escaped(end[ion]));
  }
  return svg(1000, 96.0 * rows + 4, "Placement on the chain",
             "each ion with the source qubit that it holds at the start (above) and at the end (below)",
             text);
}

}  // namespace isinglass
