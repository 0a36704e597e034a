// Spans as linear programs; see stretch.h.
#include "language/stretch.h"

#include <fmt/format.h>

#include <algorithm>
#include <map>
#include <numeric>
#include <set>

#include "algebra/linear_program.h"

namespace isinglass {

namespace {

constexpr std::size_t most_stretches = 64;
constexpr std::size_t most_entries = 400'000;  // of the table of one program
constexpr double unit = 1e3;                   // microseconds inside: figures near 1

/// constant + sum of coefficient * unknown.
struct Linear {
  double constant = 0;
  std::map<std::size_t, double> terms;

  void add(const Linear& other, double factor = 1) {
    constant += factor * other.constant;
    for (const auto& [unknown, coefficient] : other.terms) terms[unknown] += factor * coefficient;
  }
};

/// Spans that share stretches, as one linear program.
class System {
 public:
  System(const std::vector<Stretch>& stretches, const Forms& forms) : stretches_(stretches), forms_(forms) {}

  void add(const StretchedSpan& span) {
    Linear end;
    if (span.length) {
      end.constant = *span.length / unit;
    } else {
      end = unknown();
      ends_.push_back(end.terms.begin()->first);
    }
    chains_.clear();
    std::map<std::uint32_t, Linear> opened;
    for (const TimedPiece& piece : span.pieces) {
      const Linear takes = length_of(piece);
      if (piece.form != 0) demand_no_less(takes);
      if (piece.wires.size() == 1 && piece.inner == 0) {
        Chain& chain = chains_[piece.wires[0]];
        chain.filled.add(takes);
        chain.can_stretch = chain.can_stretch || piece.form != 0;
        continue;
      }
      const Linear start = unknown();
      for (const std::uint32_t wire : piece.wires) meet(chains_[wire], start);
      if (piece.inner != 0) {
        const auto [place, opens] = opened.try_emplace(piece.inner, start);
        if (!opens) {
          Linear gap = start;
          gap.add(place->second, -1);
          gap.constant -= piece.inner_length / unit;
          demand_zero(gap);
        }
      }
      // Wires that share a delay need not all end with it: one of them being filled is enough.
      for (const std::uint32_t wire : piece.wires)
        chains_[wire] = {start, takes, piece.wires.size() == 1 && piece.form != 0};
    }
    for (auto& [wire, chain] : chains_) meet(chain, end);
  }

  std::size_t entries() const {
    return program_.rows.size() * (program_.unknowns + program_.rows.size() + 2 * unknown_of_.size());
  }
  std::size_t stretch_count() const { return unknown_of_.size(); }

  /// Whether there are lengths that fit; then they are written to `longer`.
  bool solve(std::vector<double>& longer) {
    std::vector<bool> is_zero(program_.unknowns, false);
    for (const std::vector<std::size_t>* least : {&ends_, &slacks_}) {
      std::vector<double> cost(program_.unknowns, 0);
      for (const std::size_t u : *least) cost[u] = 1;
      const auto best = minimized(program_, cost, is_zero);
      if (!best) return false;
      for (std::size_t u = 0; u < program_.unknowns; ++u) {
        is_zero[u] = is_zero[u] || best->reduced_cost[u] > 1e-7;
      }
    }
    share(is_zero, longer);
    return true;
  }

 private:
  /// A wire since the piece that it last shared.
  struct Chain {
    Linear start;
    Linear filled;
    bool can_stretch = false;
  };

  Linear unknown() {
    Linear result;
    result.terms[program_.add_unknown()] = 1;
    return result;
  }

  Linear length_of(const TimedPiece& piece) {
    Linear result;
    result.constant = piece.fixed / unit;
    for (const Term& term : forms_.terms(piece.form)) {
      const auto [place, is_new] = unknown_of_.try_emplace(term.input, program_.unknowns);
      if (is_new) program_.add_unknown();
      result.terms[place->second] += term.coefficient;
    }
    return result;
  }

  void demand_zero(const Linear& value) {
    LinearProgram::Row row(value.terms.begin(), value.terms.end());
    program_.add_row(std::move(row), -value.constant);
  }

  void demand_no_less(Linear value) {
    value.terms[program_.add_unknown()] -= 1;
    demand_zero(value);
  }

  /// What fills the chain ends when `at` comes; a chain that cannot stretch may wait for it.
  void meet(const Chain& chain, const Linear& at) {
    Linear gap = at;
    gap.add(chain.start, -1);
    gap.add(chain.filled, -1);
    if (!chain.can_stretch) {
      const std::size_t slack = program_.add_unknown();
      slacks_.push_back(slack);
      gap.terms[slack] -= 1;
    }
    demand_zero(gap);
  }

  /// Rounds of "the longest as short as it can be"; those that cannot be shorter are settled.
  void share(const std::vector<bool>& is_zero, std::vector<double>& longer) const {
    std::map<std::size_t, double> settled;  // by unknown
    while (settled.size() < unknown_of_.size()) {
      LinearProgram round = program_;
      std::vector<bool> zero = is_zero;
      const std::size_t longest = round.add_unknown();
      std::map<std::size_t, std::size_t> below;  // unknown: what it is shorter than the longest
      for (const auto& [stretch, u] : unknown_of_) {
        const auto known = settled.find(u);
        if (known != settled.end()) {
          round.add_row({{u, 1}}, known->second);
          continue;
        }
        below[u] = round.add_unknown();
        round.add_row({{u, 1}, {below[u], 1}, {longest, -1}}, -stretches_[stretch].least / unit);
      }
      zero.resize(round.unknowns, false);
      std::vector<double> cost(round.unknowns, 0);
      cost[longest] = 1;
      const auto best = minimized(round, cost, zero);
      if (!best) return;  // rounding only: what is settled stands
      const std::size_t before = settled.size();
      for (const auto& [u, shorter] : below) {
        if (best->reduced_cost[shorter] > 1e-7) settled[u] = best->x[u];
      }
      if (settled.size() == before) {  // none is bound: all have their least length
        for (const auto& [u, shorter] : below) settled[u] = best->x[u];
      }
    }
    for (const auto& [stretch, u] : unknown_of_) longer[stretch] = settled[u] * unit;
  }

  const std::vector<Stretch>& stretches_;
  const Forms& forms_;
  LinearProgram program_;
  std::map<std::uint32_t, std::size_t> unknown_of_;  // of a stretch
  std::vector<std::size_t> ends_;
  std::vector<std::size_t> slacks_;
  std::map<std::uint32_t, Chain> chains_;
};

/// The same work on other wires is the same span: loops write many of them.
std::vector<double> fingerprint(const StretchedSpan& span) {
  std::map<std::uint32_t, double> number;
  std::vector<double> print = {span.length.value_or(-1)};
  for (const TimedPiece& piece : span.pieces) {
    print.insert(print.end(),
                 {piece.fixed, static_cast<double>(piece.form), static_cast<double>(piece.inner != 0),
                  piece.inner_length, static_cast<double>(piece.wires.size())});
    for (const std::uint32_t wire : piece.wires) {
      print.push_back(number.try_emplace(wire, static_cast<double>(number.size())).first->second);
    }
  }
  return print;
}

}  // namespace

std::vector<double> solved(const std::vector<Stretch>& stretches, const std::vector<StretchedSpan>& spans,
                           const Forms& forms, std::vector<StretchProblem>& problems) {
  std::vector<double> longer(stretches.size(), 0);
  // Groups of spans that share stretches, by union and find.
  std::vector<std::size_t> group(stretches.size());
  std::iota(group.begin(), group.end(), std::size_t{0});
  const auto root = [&](std::size_t s) {
    while (group[s] != s) s = group[s] = group[group[s]];
    return s;
  };
  std::vector<std::size_t> first(spans.size(), stretches.size());
  std::set<std::vector<double>> seen;
  for (std::size_t i = 0; i < spans.size(); ++i) {
    if (!seen.insert(fingerprint(spans[i])).second) continue;
    for (const TimedPiece& piece : spans[i].pieces) {
      for (const Term& term : forms.terms(piece.form)) {
        if (first[i] == stretches.size()) first[i] = term.input;
        group[root(term.input)] = root(first[i]);
      }
    }
  }
  std::map<std::size_t, std::vector<const StretchedSpan*>> groups;
  for (std::size_t i = 0; i < spans.size(); ++i) {
    if (first[i] < stretches.size()) groups[root(first[i])].push_back(&spans[i]);
  }
  for (const auto& [unused, members] : groups) {
    System system(stretches, forms);
    const StretchedSpan* culprit = members.front();
    for (const StretchedSpan* span : members) {
      system.add(*span);
      if (span->length) culprit = span;
    }
    if (system.stretch_count() > most_stretches || system.entries() > most_entries) {
      problems.push_back(
          {culprit->at, fmt::format("{} stretches and what stands between them hang together here: "
                                    "too much to be solved",
                                    system.stretch_count())});
    } else if (!system.solve(longer)) {
      problems.push_back(
          {culprit->at, members.size() == 1
                            ? "no lengths of its stretches give this box its length"
                            : "no lengths of the stretches fit this box and the others that use "
                              "the same stretches"});
    }
  }
  return longer;
}

}  // namespace isinglass
