// The report page; see report.h.
#include "output/report.h"

#include <fmt/format.h>

#include <algorithm>
#include <string>

#include "output/pictures.h"
#include "output/text.h"

namespace isinglass {

namespace {

// Colours are told apart by lightness too, and every picture repeats in words or a table what its colours
// say.
constexpr std::string_view style = R"(
:root { color-scheme: light dark; --ink: #17212b; --soft: #51606e; --paper: #fbfaf7; --card: #ffffff; --line: #dcd9d1;
  --was: #b8bfc6; --pulse: #2f8f83; --inter: #2b4c9b; --read: #c2701c; --prep: #8a7f9e; --idle: #e3e6e8; --warn: #a3262a; }
@media (prefers-color-scheme: dark) { :root { --ink: #e8eaec; --soft: #a7b2bd; --paper: #14191f; --card: #1c232b; --line: #36404b;
  --was: #5d6873; --pulse: #5cc0b2; --inter: #86a5f2; --read: #eda45c; --prep: #b9abd3; --idle: #303942; --warn: #f08a8d; } }
* { box-sizing: border-box; }
body { margin: 0; background: var(--paper); color: var(--ink); font: 16px/1.5 system-ui, "Segoe UI", "DejaVu Sans", sans-serif; }
main { max-width: 1120px; margin: 0 auto; padding: 32px 24px 64px; }
h1 { font-size: 1.7rem; line-height: 1.25; margin: 0 0 4px; overflow-wrap: anywhere; }
h2 { font-size: 1.12rem; margin: 0 0 14px; }
.under { color: var(--soft); margin: 0 0 24px; overflow-wrap: anywhere; }
.figures { display: grid; grid-template-columns: repeat(auto-fit, minmax(170px, 1fr)); gap: 14px; margin: 0 0 22px; }
.figures div { background: var(--card); border: 1px solid var(--line); border-radius: 10px; padding: 14px 16px; }
.figures dt { color: var(--soft); font-size: .86rem; }
.figures dd { margin: 0; font-size: 1.6rem; font-weight: 650; font-variant-numeric: tabular-nums; }
.figures small { display: block; font-size: .82rem; font-weight: 400; color: var(--soft); }
section { background: var(--card); border: 1px solid var(--line); border-radius: 10px; padding: 20px 22px; margin: 0 0 22px; }
.two { display: grid; grid-template-columns: repeat(auto-fit, minmax(430px, 1fr)); gap: 22px; }
.two section { margin: 0; } .two { margin-bottom: 22px; }
@media (max-width: 520px) { .two { grid-template-columns: 1fr; } }
svg { display: block; width: 100%; height: auto; margin-bottom: 10px; }
table { border-collapse: collapse; width: 100%; font-variant-numeric: tabular-nums; font-size: .93rem; }
caption { text-align: left; color: var(--soft); font-size: .86rem; padding-bottom: 6px; }
th, td { text-align: right; padding: 5px 8px; border-bottom: 1px solid var(--line); } th:first-child, td:first-child { text-align: left; }
thead th { color: var(--soft); font-weight: 600; }
.legend { display: flex; flex-wrap: wrap; gap: 4px 18px; padding: 0; margin: 12px 0 0; list-style: none; font-size: .88rem; color: var(--soft); }
.legend i, td i { display: inline-block; width: 12px; height: 12px; border-radius: 3px; margin-right: 7px; vertical-align: -1px; background: var(--was); }
i.pulse { background: var(--pulse); } i.inter { background: var(--inter); } i.read { background: var(--read); } i.prep { background: var(--prep); } i.idle { background: var(--idle); border: 1px solid var(--line); }
text { fill: var(--ink); font: 13px system-ui, "Segoe UI", "DejaVu Sans", sans-serif; } .tick { fill: var(--soft); font-size: 12px; } .faint { fill: var(--soft); } .number { fill: #fff; font-weight: 600; }
@media (prefers-color-scheme: dark) { .number { fill: #10151b; } }
rect.was { fill: var(--was); } rect.is { fill: var(--inter); } rect.pulse { fill: var(--pulse); } rect.inter { fill: var(--inter); } rect.read { fill: var(--read); } rect.prep { fill: var(--prep); } rect.idle { fill: var(--idle); }
line.inter { stroke: var(--inter); stroke-width: 1.6; } .maybe { opacity: .55; } .grid { stroke: var(--line); stroke-width: 1; } .rail { stroke: var(--line); stroke-width: 2; } .fence { stroke: var(--soft); stroke-width: 1.4; stroke-dasharray: 3 2; }
.branch { fill: none; stroke: var(--warn); stroke-width: 1.4; stroke-dasharray: 5 3; }
.cell { fill: var(--idle); } .barred { fill: none; stroke: var(--line); }
circle.taken { fill: var(--inter); } circle.ancilla { fill: var(--pulse); } circle.free { fill: var(--idle); stroke: var(--line); }
rect.source0, i.source0 { fill: var(--prep); background: var(--prep); } rect.source1, i.source1 { fill: var(--pulse); background: var(--pulse); } rect.source2, i.source2 { fill: var(--inter); background: var(--inter); }
rect.source3, i.source3 { fill: var(--was); background: var(--was); } rect.source4, i.source4 { fill: var(--warn); background: var(--warn); } rect.source5, i.source5 { fill: var(--read); background: var(--read); }
.note { color: var(--soft); font-size: .9rem; } .note p { margin: .5em 0; }
@media print { body { background: #fff; } section, .figures div { break-inside: avoid; } }
)";

std::string figure(std::string_view label, const std::string& value, const std::string& small) {
  return fmt::format("<div><dt>{}</dt><dd>{}<small>{}</small></dd></div>\n", label, value, small);
}

std::string time_text(double us) {
  return us >= 1e6   ? fmt::format("{:.4g} s", us * 1e-6)
         : us >= 1e3 ? fmt::format("{:.4g} ms", us * 1e-3)
                     : fmt::format("{:.4g} µs", us);
}

/// "62 % fewer", "as many", "8 % more".
std::string compared(double before, double after) {
  if (before == 0 || before == after) return before == after ? "as many as before" : "none before";
  const double change = 100 * std::abs(after - before) / before;
  return fmt::format("{:.3g} % {} than {:.6g} before", change, after < before ? "fewer" : "more", before);
}

class Page {
 public:
  Page(std::ostream& out, const Compiled& compiled)
      : out_(&out), c_(compiled), totals_(compiled.timed.totals) {}

  void write() {
    const std::string title = fmt::format("{} on {}", escaped(c_.source_file), escaped(c_.target.name));
    out_.add(
        "<!DOCTYPE html>\n<html lang=\"en\"><head><meta charset=\"utf-8\"/>\n<meta name=\"viewport\" "
        "content=\"width=device-width, initial-scale=1\"/>\n<title>",
        title, "</title>\n<style>", style, "</style></head>\n<body><main>\n<h1>", title, "</h1>\n");
    out_.add("<p class=\"under\">compiled by isinglass ", ISINGLASS_VERSION, " for ",
             std::uint64_t{c_.target.ions}, " ions", c_.check.empty() ? "" : " · ", escaped(c_.check),
             "</p>\n");
    headline();
    out_.add("<div class=\"two\">\n");
    tally();
    errors();
    out_.add("</div>\n");
    if (c_.rehearsal != nullptr) rehearsal(*c_.rehearsal);
    timeline();
    placement();
    pairs();
    notes();
    out_.add("</main></body></html>\n");
  }

 private:
  void headline() {
    const bool has_interval = totals_.success_low < totals_.success_high;
    out_.add("<dl class=\"figures\">\n");
    out_.add(figure("success", fmt::format("{:.2f} %", 100 * totals_.success),
                    has_interval ? fmt::format("95 %: {:.2f} to {:.2f} %", 100 * totals_.success_low,
                                               100 * totals_.success_high)
                                 : "no error happens"));
    out_.add(figure("duration", time_text(totals_.duration), "from preparation to the last bit"));
    out_.add(figure("interactions", fmt::format("{}", totals_.xx),
                    compared(static_cast<double>(c_.before.two_qubit), static_cast<double>(totals_.xx))));
    out_.add(figure("full units", fmt::format("{:.4g}", totals_.xx_units), "one unit is xx(π/2)"));
    out_.add(figure("pulses", fmt::format("{}", totals_.r),
                    compared(static_cast<double>(c_.before.one_qubit), static_cast<double>(totals_.r))));
    out_.add("</dl>\n");
  }

  void tally() {
    out_.add("<section><h2>Before and after</h2>\n", picture_of_tally(c_),
             "<ul class=\"legend\"><li><i></i>before: gate by gate in the textbook way</li><li><i "
             "class=\"inter\"></i>after</li></ul></section>\n");
  }

  void errors() {
    out_.add("<section><h2>Where errors come from</h2>\n", picture_of_errors(totals_),
             "<table><thead><tr><th scope=\"col\">source</th><th scope=\"col\">error</th><th "
             "scope=\"col\">share</th></tr></thead><tbody>\n");
    for (std::size_t i = 0; i < source_count; ++i) {
      const double part = totals_.error_by_source[i];
      out_.add(fmt::format("<tr><td><i class=\"source{}\"></i>{}</td><td>{:.2e}</td><td>{:.1f} %</td></tr>\n",
                           i, name(static_cast<Source>(i)), part,
                           totals_.error > 0 ? 100 * part / totals_.error : 0));
    }
    out_.add(fmt::format(
        "<tr><th scope=\"row\">all</th><td>{:.2e}</td><td>100 %</td></tr></tbody></table></section>\n",
        totals_.error));
  }

  void rehearsal(const Rehearsal& rehearsal) {
    out_.add("<section><h2>Rehearsal</h2>\n");
    if (!rehearsal.outcomes.empty()) {
      out_.add(picture_of_outcomes(rehearsal),
               "<ul class=\"legend\"><li><i></i>without noise</li><li><i class=\"inter\"></i>with "
               "noise</li></ul>\n");
    }
    out_.add("<p class=\"note\">By ", name(rehearsal.method),
             rehearsal.shots > 0 ? fmt::format(", {} shots", rehearsal.shots) : "",
             fmt::format(". Estimated success {:.2f} %", 100 * rehearsal.estimate));
    if (rehearsal.no_error >= 0) {
      out_.add(fmt::format(", shots without error {:.2f} ± {:.2f} %", 100 * rehearsal.no_error,
                           100 * rehearsal.no_error_deviation));
    }
    if (rehearsal.fidelity >= 0) out_.add(fmt::format(", fidelity {:.3f} %", 100 * rehearsal.fidelity));
    if (!rehearsal.outcomes.empty()) {
      out_.add(fmt::format("; the two distributions differ by {:.2f} % (total variation)",
                           100 * rehearsal.distance));
    }
    out_.add(".</p></section>\n");
  }

  void timeline() {
    out_.add("<section><h2>Timeline</h2>\n", picture_of_timeline(c_),
             "<ul class=\"legend\"><li><i class=\"inter\"></i>interaction</li><li><i "
             "class=\"pulse\"></i>pulse</li><li><i "
             "class=\"read\"></i>readout</li><li><i class=\"prep\"></i>preparation, reset</li><li><i "
             "class=\"idle\"></i>waiting with a state</li><li>dashed frame: happens on a condition, the "
             "longest way is "
             "shown</li></ul></section>\n");
  }

  void placement() {
    out_.add(
        "<section><h2>Placement</h2>\n", picture_of_placement(c_),
        "<p class=\"note\">Above each ion the qubit it holds at the start, below the qubit it holds at the "
        "end.");
    if (c_.placed.moves > 0) {
      out_.add(fmt::format(" {} swaps move qubits to where pairs are reachable.", c_.placed.moves));
    }
    out_.add("</p></section>\n");
  }

  void pairs() {
    constexpr std::size_t most_rows = 12;
    const auto list = work_by_pair(c_.placed.circuit);
    out_.add("<section><h2>Pairs to calibrate</h2><div class=\"two\"><div class=\"square\">\n",
             picture_of_pairs(c_), "</div><div><table><caption>", std::uint64_t{list.size()},
             " pairs interact", list.size() > most_rows ? "; those with most interaction" : "",
             "</caption><thead><tr><th scope=\"col\">ions</th><th scope=\"col\">times</th><th "
             "scope=\"col\">units</th><th "
             "scope=\"col\">error of xx(π/2)</th><th scope=\"col\">takes</th></tr></thead><tbody>\n");
    for (std::size_t i = 0; i < std::min(list.size(), most_rows); ++i) {
      const PairFigures& pair = c_.target.pair(list[i].a, list[i].b);
      out_.add(fmt::format(
          "<tr><td>{} and {}</td><td>{}</td><td>{:.4g}</td><td>{:.2e}</td><td>{}</td></tr>\n", list[i].a,
          list[i].b, list[i].count, list[i].units, pair.error(pi / 2), time_text(pair.takes_us)));
    }
    out_.add("</tbody></table></div></div></section>\n");
  }

  void notes() {
    out_.add(
        "<section class=\"note\"><h2>How to read this</h2>\n"
        "<p>Success is the probability that no error happens under the machine's model; the errors of single "
        "operations are taken as independent. The model leaves out coherent errors that add up from "
        "operation to "
        "operation, drift between calibrations, leakage out of the qubit, and loss of ions: component models "
        "usually predict better than what is observed, and structured programs can fail earlier than random "
        "ones "
        "of the same size.</p>\n"
        "<p>Of a condition the worse way is counted, of a loop one round. Angles in radians, "
        "r(θ, φ) = exp(−iθ/2 (cos φ X + sin φ Y)), xx(θ, φ<sub>a</sub>, φ<sub>b</sub>) = exp(−iθ/2 (cos "
        "φ<sub>a</sub> X + sin "
        "φ<sub>a</sub> Y) ⊗ (cos φ<sub>b</sub> X + sin φ<sub>b</sub> Y)).</p>\n<p>source ",
        escaped(c_.source_file), c_.source_sha256.empty() ? "" : ", SHA-256 ", c_.source_sha256,
        "<br/>machine ", escaped(c_.target.name), c_.target.sha256.empty() ? "" : ", SHA-256 ",
        c_.target.sha256, "</p></section>\n");
  }

  TextWriter out_;
  const Compiled& c_;
  const Totals& totals_;
};

}  // namespace

void write_report(std::ostream& out, const Compiled& compiled) {
  Page(out, compiled).write();
}

}  // namespace isinglass
