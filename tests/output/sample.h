// A compiled program with everything in it, for the tests of the writers.
#pragma once

#include "output/timeline.h"
#include "targets/place.h"
#include "targets/schedule.h"

namespace isinglass {

inline Expression literal(const std::string& text) {
  Expression e;
  e.text = text;
  return e;
}

inline Expression bit_of(std::uint32_t variable, const std::string& index) {
  Expression name;
  name.kind = Expression::Kind::variable;
  name.variable = variable;
  Expression e;
  e.kind = Expression::Kind::index;
  e.arguments = {name, literal(index)};
  return e;
}

/// Two registers, inputs (one derived), a branch with two arms, every kind of operation.
inline Circuit sample_circuit() {
  Circuit c;
  add_register(c, "q", 2);
  add_register(c, "anc", 1, true);
  add_bits(c, "c", 2);
  add_bits(c, "ion_2", 1, true);
  c.variables[1].source = "ion";
  c.inputs.push_back({"t", "float", false, {}});
  Expression sine;
  sine.kind = Expression::Kind::call;
  sine.text = "sin";
  Expression t;
  t.kind = Expression::Kind::input;
  sine.arguments = {t};
  c.inputs.push_back({"sin(t)", "float", true, sine});
  const std::uint32_t form =
      c.forms.sum(c.forms.scaled(c.forms.of_input(0), 2.5), c.forms.scaled(c.forms.of_input(1), -1));
  const auto at = [](std::uint32_t line) { return Origins::line(line); };

  Expression condition;
  condition.kind = Expression::Kind::binary;
  condition.text = "==";
  condition.arguments = {bit_of(0, "0"), literal("1")};
  c.blocks.resize(3);
  c.blocks[1] = {c.make(Kind::r, {2}, {{pi}, {0.25}}, at(8)),
                 c.make(Kind::xx, {1, 2}, {{0.5}, {0.1}, {0.2}}, at(8))};
  c.blocks[2] = {c.make(Kind::r, {1}, {{1.5}, {-0.25}}, at(9))};
  c.branches.push_back({Branch::Kind::if_else, condition, 0, {{{}, 1}, {{}, 2}}});
  ClassicalStatement assign;
  assign.target = bit_of(0, "1");
  assign.value = bit_of(0, "0");
  c.statements.push_back(assign);

  Operation first = c.make(Kind::measure, {0}, {}, at(5));
  first.payload = 0;
  Operation last = c.make(Kind::measure, {1}, {}, at(11));
  last.payload = 2;
  Operation delay = c.make(Kind::delay, {1});
  delay.value[0] = 12.5;
  Operation statement;
  statement.kind = Kind::classical;
  Operation branch = c.make(Kind::branch, {1, 2}, {}, at(7));
  c.body() = {c.make(Kind::r, {0}, {{1.0 / 3}, {0.1}}, at(2)),
              c.make(Kind::xx, {0, 1}, {{pi / 4}, {0}, {pi / 2}}, c.origins.merged(at(3), at(4))),
              first,
              statement,
              delay,
              c.make(Kind::barrier, {0, 1, 2}),
              branch,
              c.make(Kind::r, {2}, {{0.5, form}, {0.1}}, at(10)),
              last,
              c.make(Kind::reset, {1}, {}, at(12)),
              c.make(Kind::rz, {2}, {{0.75}}, at(13))};
  return c;
}

struct Sample {
  Target target = typical(4);
  Placed placed = place(sample_circuit(), target);
  Timed timed = schedule(placed, target, {true, false});
  Compiled compiled{"buoy, \"nine\".qasm", std::string(64, 'a'), target, placed, timed, {9, 4, 3}, "exact"};
};

}  // namespace isinglass
