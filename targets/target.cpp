// Machine descriptions by figures; see target.h, and README.md for every key.
#include "targets/target.h"

#include <fmt/format.h>

#include <optional>

#include "algebra/sha256.h"
#include "targets/machine_file.h"
#include "targets/trap_machine.h"

namespace isinglass {

namespace {

using Need = Section::Need;

/// Average infidelity to process infidelity: (1 - Fe) = (1 - F)(d + 1)/d (Horodecki 1999; Nielsen 2002).
struct Conversion {
  double one = 1;
  double two = 1;
};

Need needed(bool is_required) {
  return is_required ? Need::required : Need::optional;
}

void read_ion(Section& section, IonFigures& ion, const Conversion& conversion, bool complete) {
  section.number("prepare_us", ion.prepare_us, not_negative);
  section.number("pulse_us", ion.pulse_us, positive, needed(complete));
  section.number("measure_us", ion.measure_us, positive);
  section.number("reset_us", ion.reset_us, positive);
  section.figure("prepare_error", ion.prepare_error);
  section.figure("pulse_error", ion.pulse_error, conversion.one, needed(complete));
  section.figure("measure_error", ion.measure_error, 1, needed(complete));
  section.figure("reset_error", ion.reset_error);
  section.figure("t2_s", ion.t2_us, 1e6, Need::optional, positive);
  section.flag("addressed", ion.addressed);
}

void read_pair(Section& section, PairFigures& pair, const Conversion& conversion, bool complete) {
  section.number("interaction_us", pair.takes_us, positive, needed(complete));
  section.figure("error_floor", pair.floor, conversion.two, needed(complete));
  section.figure("error_root", pair.root, conversion.two);
  section.figure("error_slope", pair.slope, conversion.two, needed(complete));
  section.figure("error_square", pair.square, conversion.two);
}

/// `entry` as an ion's number; complains and gives nothing when it is none.
std::optional<std::uint32_t> ion_number(MachineFile& file, const toml::node& entry, std::uint32_t ions) {
  const auto number = entry.is_integer() ? entry.value<std::int64_t>() : std::nullopt;
  if (!number || *number < 0 || *number >= std::int64_t{ions}) {
    file.complain(entry.source(), fmt::format("ions are numbered 0 to {} here", ions - 1));
    return std::nullopt;
  }
  return static_cast<std::uint32_t>(*number);
}

/// Calls `each` with every table of the array of tables [[TITLE.at]].
template <class Each>
void overrides(MachineFile& file, Section& section, const std::string& title, Each each) {
  const toml::node* found = section.node("at");
  if (found == nullptr) return;
  const toml::array* list = found->as_array();
  if (list == nullptr || !list->is_homogeneous(toml::node_type::table)) {
    file.complain(found->source(), fmt::format("'at' must be tables of their own: [[{}.at]]", title));
    return;
  }
  for (const toml::node& entry : *list) {
    Section one(file, title + ".at", *entry.as_table());
    each(one);
    one.finish();
  }
}

const toml::array* list_of(MachineFile& file, Section& section, std::string_view key) {
  const toml::node* found = section.node(key, Need::required);
  if (found == nullptr) return nullptr;
  const toml::array* list = found->as_array();
  if (list == nullptr) file.complain(found->source(), fmt::format("'{}' must be a list", key));
  return list;
}

void read_ions(MachineFile& file, Target& target, const Conversion& conversion, bool complete) {
  Section section(file, "ion");
  for (IonFigures& ion : target.ion) read_ion(section, ion, conversion, complete);
  overrides(file, section, "ion", [&](Section& one) {
    const toml::array* list = list_of(file, one, "ions");
    if (list == nullptr) return;
    for (const toml::node& entry : *list) {
      const auto number = ion_number(file, entry, target.ions);
      if (number) read_ion(one, target.ion[*number], conversion, false);
    }
  });
  section.finish();
}

/// `reach`: "all", "listed" (only pairs of [[pair.at]]), or the farthest distance along the chain.
void read_reach(MachineFile& file, Section& section, Target& target) {
  const toml::node* found = section.node("reach");
  if (found == nullptr) return;
  const std::string word = found->value_or(std::string());
  const std::int64_t farthest = found->is_integer() ? found->value_or(std::int64_t{0}) : 0;
  if (word != "all" && word != "listed" && farthest < 1) {
    file.complain(found->source(), "'reach' must be \"all\", \"listed\" or a distance of 1 or more");
    return;
  }
  if (word == "all") return;
  for (std::uint32_t a = 0; a < target.ions; ++a) {
    for (std::uint32_t b = a + 1; b < target.ions; ++b) {
      if (word == "listed" || std::int64_t{b - a} > farthest) target.pair(a, b).reachable = false;
    }
  }
}

void read_pairs(MachineFile& file, Target& target, const Conversion& conversion, bool complete) {
  Section section(file, "pair");
  for (PairFigures& pair : target.pairs) read_pair(section, pair, conversion, complete);
  if (target.pairs.empty()) {  // a single ion: the keys are checked all the same
    PairFigures unused;
    read_pair(section, unused, conversion, complete);
  }
  read_reach(file, section, target);
  overrides(file, section, "pair", [&](Section& one) {
    const toml::array* list = list_of(file, one, "pairs");
    if (list == nullptr) return;
    for (const toml::node& entry : *list) {
      const toml::array* two = entry.as_array();
      if (two == nullptr || two->size() != 2) {
        file.complain(entry.source(), "a pair is a list of two ions: [0, 1]");
        continue;
      }
      const auto a = ion_number(file, (*two)[0], target.ions);
      const auto b = ion_number(file, (*two)[1], target.ions);
      if (!a || !b) continue;
      if (*a == *b) {
        file.complain(entry.source(), "a pair has two different ions");
        continue;
      }
      PairFigures& pair = target.pair(*a, *b);
      pair.reachable = true;
      one.flag("reachable", pair.reachable);
      read_pair(one, pair, conversion, false);
    }
  });
  section.finish();
}

/// Without steering each beam has its ion: those in the middle of the chain.
void keep_middle_ions(Target& target) {
  if (target.beams >= target.ions) return;
  const std::uint32_t first = (target.ions - target.beams) / 2;
  for (std::uint32_t i = 0; i < target.ions; ++i) {
    target.ion[i].addressed = i >= first && i < first + target.beams;
  }
}

}  // namespace

Target typical(std::uint32_t ions) {
  Target target;
  target.name = fmt::format("typical-{}", ions);
  target.ions = ions;
  target.ion.resize(ions);
  if (ions >= 2 && ions <= most_described_ions) target.pairs.resize(std::size_t{ions} * (ions - 1) / 2);
  return target;
}

void apply_figures(MachineFile& file, Target& target, bool complete) {
  Section machine(file, "machine");
  if (complete) machine.node("ions");  // read before: the target has its ions
  machine.whole("beams", target.beams, target.ions > 1 ? 2 : 1, most_described_ions);
  bool is_steered = true;
  machine.flag("beams_steered", is_steered);
  machine.whole("interactions_at_once", target.interactions_at_once, 1, most_described_ions / 2);
  machine.figure("crosstalk", target.crosstalk);
  machine.flag("reads_alone", target.reads_alone);
  machine.flag("has_reset", target.has_reset);
  machine.flag("has_feed_forward", target.has_feed_forward);
  machine.number("feed_forward_us", target.feed_forward_us, not_negative);
  std::size_t convention = 0;
  machine.choice("errors_are", convention, {"process", "average"});
  machine.finish();
  if (!is_steered) keep_middle_ions(target);

  const Conversion conversion = convention == 0 ? Conversion{1, 1} : Conversion{1.5, 1.25};
  read_ions(file, target, conversion, complete);
  read_pairs(file, target, conversion, complete);
}

Target read_target(const std::string& path, int threads, const std::function<void(double)>& progress) {
  MachineFile file(path);
  if (is_trap_form(file)) return target_of_trap(file, threads, progress);
  Section top(file, "");
  std::string name;
  top.words("name", name, Need::required);
  for (const std::string_view table : {"machine", "ion", "pair"}) top.node(table);
  top.finish();

  std::uint32_t ions = 1;
  Section machine(file, "machine");
  machine.whole("ions", ions, 1, most_described_ions, Need::required);
  Target target = typical(ions);
  target.name = name;
  target.sha256 = sha256(file.text());
  apply_figures(file, target, true);
  file.refuse_if_faulty();
  return target;
}

Cost cost_of(const Target& target) {
  Cost cost;
  double ions = 0;
  double pulse = 0;
  double pulse_us = 0;
  double idle = 0;
  for (const IonFigures& ion : target.ion) {
    if (!ion.addressed) continue;
    ++ions;
    pulse += ion.pulse_error.value;
    pulse_us += ion.pulse_us;
    idle += 0.5 / ion.t2_us.value;
  }
  if (ions > 0) {
    cost.pulse = pulse / ions;
    cost.pulse_us = pulse_us / ions;
    cost.idle_per_us = idle / ions;
  }
  // The straight line through the errors of a quarter and of a full interaction.
  double pairs = 0;
  double quarter = 0;
  double full = 0;
  double takes = 0;
  const auto count = [&](const PairFigures& pair) {
    ++pairs;
    quarter += pair.error(pi / 8);
    full += pair.error(pi / 2);
    takes += pair.takes_us;
  };
  if (target.pairs.empty()) count(target.every_pair);
  for (std::uint32_t a = 0; a < target.ions && !target.pairs.empty(); ++a) {
    for (std::uint32_t b = a + 1; b < target.ions; ++b) {
      const bool is_lit = target.ion[a].addressed && target.ion[b].addressed;
      if (is_lit && target.pair(a, b).reachable) count(target.pair(a, b));
    }
  }
  if (pairs > 0) {
    cost.interaction_slope = (full - quarter) / pairs / 0.75;
    cost.interaction_floor = full / pairs - cost.interaction_slope;
    cost.interaction_us = takes / pairs;
  }
  return cost;
}

}  // namespace isinglass
