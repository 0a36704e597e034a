#include "targets/plot.h"

#include <fmt/format.h>

#include <algorithm>
#include <array>
#include <cmath>
#include <numeric>

namespace isinglass {
namespace {

// Blue, orange, purple, teal: distinct for the common kinds of colour blindness and in print.
constexpr std::array<const char*, 4> colours = {"#1f5fa8", "#d97706", "#7b3f98", "#0f8b8d"};
constexpr const char* ink = "#1b1f24";
constexpr const char* faint = "#c9ced6";
constexpr double page_width = 1120;

// A frame with axes; maps values to the page.
class Panel {
 public:
  Panel(double left, double top, double width, double height, std::array<double, 2> x,
        std::array<double, 2> y)
      : left_(left), top_(top), width_(width), height_(height), x_(x), y_(y) {}

  double at_x(double v) const { return left_ + (v - x_[0]) / (x_[1] - x_[0]) * width_; }
  double at_y(double v) const { return top_ + height_ - (v - y_[0]) / (y_[1] - y_[0]) * height_; }

  void frame(std::string& svg, std::string_view title, std::string_view x_label,
             std::string_view y_label) const {
    svg += fmt::format("<text x='{:.1f}' y='{:.1f}' class='title'>{}</text>\n", left_, top_ - 14, title);
    svg +=
        fmt::format("<rect x='{:.1f}' y='{:.1f}' width='{:.1f}' height='{:.1f}' fill='none' stroke='{}'/>\n",
                    left_, top_, width_, height_, faint);
    for (const double v : ticks(x_)) {
      svg += fmt::format("<line x1='{0:.1f}' x2='{0:.1f}' y1='{1:.1f}' y2='{2:.1f}' stroke='{3}'/>\n",
                         at_x(v), top_ + height_, top_ + height_ + 5, ink);
      svg += fmt::format("<text x='{:.1f}' y='{:.1f}' text-anchor='middle'>{:g}</text>\n", at_x(v),
                         top_ + height_ + 19, v);
    }
    svg += fmt::format("<text x='{:.1f}' y='{:.1f}' text-anchor='middle'>{}</text>\n", left_ + width_ / 2,
                       top_ + height_ + 37, x_label);
    if (y_label.empty()) return;
    for (const double v : ticks(y_)) {
      svg += fmt::format("<line x1='{:.1f}' x2='{:.1f}' y1='{:.1f}' y2='{:.1f}' stroke='{}'/>\n", left_ - 5,
                         left_, at_y(v), at_y(v), ink);
      svg += fmt::format("<text x='{:.1f}' y='{:.1f}' text-anchor='end'>{:g}</text>\n", left_ - 9,
                         at_y(v) + 4, v);
    }
    svg +=
        fmt::format("<text transform='translate({:.1f} {:.1f}) rotate(-90)' text-anchor='middle'>{}</text>\n",
                    left_ - 48, top_ + height_ / 2, y_label);
  }

  void upright(std::string& svg, double v, const char* colour, double width, double part = 1,
               const char* dash = "none") const {
    svg += fmt::format(
        "<line x1='{0:.2f}' x2='{0:.2f}' y1='{1:.1f}' y2='{2:.1f}' stroke='{3}' stroke-width='{4}' "
        "stroke-dasharray='{5}'/>\n",
        at_x(v), top_ + height_ * (1 - part), top_ + height_, colour, width, dash);
  }

  void level(std::string& svg, double v) const {
    svg += fmt::format("<line x1='{:.1f}' x2='{:.1f}' y1='{:.2f}' y2='{:.2f}' stroke='{}'/>\n", left_,
                       left_ + width_, at_y(v), at_y(v), faint);
  }

  void curve(std::string& svg, const std::vector<std::array<double, 2>>& points, const char* colour) const {
    svg += fmt::format("<polyline fill='none' stroke='{}' stroke-width='1.6' points='", colour);
    for (const auto& [x, y] : points) svg += fmt::format("{:.2f},{:.2f} ", at_x(x), at_y(y));
    svg += "'/>\n";
  }

  void note(std::string& svg, int line, const char* colour, std::string_view text) const {
    const double y = top_ + 18 + 18 * line;
    svg += fmt::format("<rect x='{:.1f}' y='{:.1f}' width='14' height='4' fill='{}'/>\n", left_ + 10, y - 6,
                       colour);
    svg += fmt::format("<text x='{:.1f}' y='{:.1f}'>{}</text>\n", left_ + 30, y, text);
  }

 private:
  // Round values within a range, about five of them.
  static std::vector<double> ticks(std::array<double, 2> range) {
    const double rough = (range[1] - range[0]) / 5;
    const double power = std::pow(10, std::floor(std::log10(rough)));
    const double part = rough / power;
    const double step = power * (part < 1.5 ? 1 : part < 3.5 ? 2 : part < 7.5 ? 5 : 10);
    std::vector<double> values;
    for (double k = std::ceil(range[0] / step - 1e-9); k * step <= range[1] + 1e-9 * step; ++k)
      values.push_back(k == 0 ? 0 : k * step);
    return values;
  }

  double left_, top_, width_, height_;
  std::array<double, 2> x_, y_;
};

std::string escaped(std::string_view text) {
  std::string safe;
  for (const char c : text) {
    if (c == '<')
      safe += "&lt;";
    else if (c == '>')
      safe += "&gt;";
    else if (c == '&')
      safe += "&amp;";
    else
      safe += c;
  }
  return safe;
}

void draw_chain(std::string& svg, const TrapMachine& machine, const std::optional<LitPair>& lit) {
  const Eigen::VectorXd um = machine.chain.positions * machine.chain.length_scale * 1e6;
  const double reach = std::max(1.0, um.cwiseAbs().maxCoeff()) * 1.08;
  const Panel panel(80, 90, page_width - 120, 70, {-reach, reach}, {-1, 1});
  panel.frame(svg, "Chain", "position along the axis, um", "");
  for (Eigen::Index i = 0; i < um.size(); ++i) {
    const bool is_lit = lit && (i == lit->a || i == lit->b);
    svg += fmt::format(
        "<circle cx='{:.2f}' cy='{:.2f}' r='{}' fill='{}'><title>ion {}: {:.3f} um</title></circle>\n",
        panel.at_x(um[i]), panel.at_y(0), is_lit ? 9 : 6, is_lit ? colours[1] : colours[0], i, um[i]);
    if (is_lit)
      svg += fmt::format("<text x='{:.2f}' y='{:.2f}' text-anchor='middle'>{}</text>\n", panel.at_x(um[i]),
                         panel.at_y(0) - 16, i);
  }
}

void draw_spectrum(std::string& svg, const TrapMachine& machine, const std::optional<LitPair>& lit) {
  const Eigen::VectorXd mhz = machine.chain.transverse_hz * 1e-6;
  double low = mhz[0], high = mhz[mhz.size() - 1];
  if (lit) {
    low = std::min(low, lit->pulse.detuning * 1e-6);
    high = std::max(high, lit->pulse.detuning * 1e-6);
  }
  const double margin = std::max(0.05 * (high - low), 2e-3);
  const Panel panel(80, 250, page_width - 120, 110, {low - margin, high + margin}, {0, 1});
  panel.frame(svg, "Transverse modes", "frequency, MHz", "");
  for (const double mode : mhz) panel.upright(svg, mode, colours[0], 1.6, 0.6);
  panel.note(svg, 0, colours[0], "modes of the chain");
  if (!lit) return;
  panel.upright(svg, lit->pulse.detuning * 1e-6, colours[1], 2, 1, "6 4");
  panel.note(svg, 1, colours[1],
             fmt::format("detuning of the light, {:.6f} MHz", lit->pulse.detuning * 1e-6));
}

void draw_pulse(std::string& svg, const LitPair& lit) {
  const Pulse& pulse = lit.pulse;
  const double us = pulse.duration * 1e6, khz = pulse.peak() * 1e-3;
  const Panel panel(80, 450, 470, 330, {0, us}, {-1.1 * khz, 1.35 * khz});  // room for the note above
  panel.frame(svg, "Pulse", "time, us", "Rabi frequency, kHz");
  panel.level(svg, 0);
  std::vector<std::array<double, 2>> points;
  const auto values = static_cast<int>(pulse.rabi.size());
  for (int k = 0; k < values; ++k) {
    if (pulse.shape == Shape::ramps) {
      points.push_back({us * k / (values - 1), pulse.rabi[k] * 1e-3});
    } else {
      points.push_back({us * k / values, pulse.rabi[k] * 1e-3});
      points.push_back({us * (k + 1) / values, pulse.rabi[k] * 1e-3});
    }
  }
  panel.curve(svg, points, colours[0]);
  panel.note(
      svg, 0, colours[0],
      fmt::format("{:.1f} kHz peak, {:.1f} kHz rms; below 0: phase turned by pi", khz, pulse.rms() * 1e-3));
}

// alpha(t) of the first ion in the modes that move most.
void draw_paths(std::string& svg, const TrapMachine& machine, const LitPair& lit) {
  constexpr int samples = 2400;
  std::vector<double> times;
  for (int k = 0; k <= samples; ++k) times.push_back(lit.pulse.duration * k / samples);
  const Eigen::MatrixXcd loops = paths(lit.pulse, machine.chain.transverse_hz, times);
  const Eigen::MatrixXcd alpha = loops * machine.eta.row(lit.a).cast<std::complex<double>>().asDiagonal();
  std::vector<Eigen::Index> modes(static_cast<std::size_t>(alpha.cols()));
  std::iota(modes.begin(), modes.end(), 0);
  std::stable_sort(modes.begin(), modes.end(), [&](Eigen::Index m, Eigen::Index n) {
    return alpha.col(m).cwiseAbs().maxCoeff() > alpha.col(n).cwiseAbs().maxCoeff();
  });
  modes.resize(std::min(modes.size(), colours.size()));
  const double reach = 1.1 * std::max(1e-6, alpha.col(modes[0]).cwiseAbs().maxCoeff());
  // As wide as high in both directions, and to the right, so that the notes have the left upper corner.
  const Panel panel(640, 450, 440, 330, {-reach * 5 / 3, reach}, {-reach, reach});
  panel.frame(svg, fmt::format("Paths in phase space of ion {}", lit.a), "Re alpha", "Im alpha");
  panel.level(svg, 0);
  for (std::size_t k = 0; k < modes.size(); ++k) {
    std::vector<std::array<double, 2>> points;
    for (Eigen::Index s = 0; s < alpha.rows(); ++s)
      points.push_back({alpha(s, modes[k]).real(), alpha(s, modes[k]).imag()});
    panel.curve(svg, points, colours[k]);
    panel.note(svg, static_cast<int>(k), colours[k],
               fmt::format("mode {}, {:.4f} MHz", modes[k], machine.chain.transverse_hz[modes[k]] * 1e-6));
  }
}

}  // namespace

std::string plot_of(const TrapMachine& machine, const std::optional<LitPair>& lit) {
  const double height = lit ? 880 : 450;
  std::string svg = fmt::format(
      "<svg xmlns='http://www.w3.org/2000/svg' viewBox='0 0 {0} {1}' width='{0}' height='{1}' role='img'>\n"
      "<style>text{{font:13px sans-serif;fill:{2}}} .title{{font-size:16px;font-weight:bold}}</style>\n"
      "<rect width='{0}' height='{1}' fill='#ffffff'/>\n",
      page_width, height, ink);
  std::string heading = fmt::format("{}: {} ions", escaped(machine.name), machine.chain.ions());
  if (lit) heading += fmt::format(", interaction of ions {} and {}", lit->a, lit->b);
  svg += fmt::format("<title>{0}</title>\n<text x='80' y='40' class='title'>{0}</text>\n", heading);
  draw_chain(svg, machine, lit);
  draw_spectrum(svg, machine, lit);
  if (lit) {
    draw_pulse(svg, *lit);
    draw_paths(svg, machine, *lit);
  }
  svg += fmt::format(
      "<text x='80' y='{:.0f}' fill-opacity='0.7'>Laser light and trap voltages harm: site rules and trained "
      "staff "
      "decide what is done.</text>\n</svg>\n",
      height - 22);
  return svg;
}

}  // namespace isinglass
