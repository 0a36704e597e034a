// Control flow: blocks, branches, loops, subroutines and the ways out of them. See reader.h.
//
// A path that is known while compiling is simply taken. Where it is not, arms become blocks of their own, and
// a way out of several of them at once (a `return` out of a branch, a `break` out of a loop that was
// unrolled) sets a flag; what it would have skipped stands under `if (!flag)`.
#include <fmt/format.h>

#include <algorithm>
#include <cmath>

#include "language/reader.h"

namespace isinglass {

namespace {

Expression variable_of(std::uint32_t variable) {
  Expression expression;
  expression.kind = Expression::Kind::variable;
  expression.variable = variable;
  return expression;
}

const std::string* base_name(const syntax::Expression& expression) {
  const syntax::Expression* node = &expression;
  while (node->kind == syntax::Expression::Kind::index) node = &node->arguments[0];
  return node->kind == syntax::Expression::Kind::name ? &node->text : nullptr;
}

void collect_names(const syntax::Expression& expression, std::set<std::string>& names) {
  if (expression.kind == syntax::Expression::Kind::name) names.insert(expression.text);
  for (const auto& argument : expression.arguments) collect_names(argument, names);
}

bool mentions(const syntax::Expression& expression, const std::set<std::string>& names) {
  std::set<std::string> found;
  collect_names(expression, found);
  return std::any_of(found.begin(), found.end(), [&](const auto& name) { return names.contains(name); });
}

/// What can be told about a loop's body without running it.
struct LoopFacts {
  std::set<std::string> measured;   // names that get measurement results, directly or by way of others
  bool leaves_on_measured = false;  // a break, return or end under a condition on such a name
};

void inspect(const std::vector<syntax::Statement>& statements, LoopFacts& facts, bool on_measured);

void inspect(const syntax::Statement& statement, LoopFacts& facts, bool on_measured) {
  using namespace syntax;
  const auto is_measured = [&](const syntax::Expression& value) {
    return value.kind == syntax::Expression::Kind::measure || value.kind == syntax::Expression::Kind::call ||
           mentions(value, facts.measured);
  };
  if (const auto* s = std::get_if<Measurement>(&statement.what)) {
    if (const std::string* name = s->target ? base_name(*s->target) : nullptr) facts.measured.insert(*name);
    return;
  }
  if (const auto* s = std::get_if<Declaration>(&statement.what)) {
    if (s->value && is_measured(*s->value)) facts.measured.insert(s->name.text);
    return;
  }
  if (const auto* s = std::get_if<Assignment>(&statement.what)) {
    const std::string* name = base_name(s->target);
    if (name != nullptr && is_measured(s->value)) facts.measured.insert(*name);
    return;
  }
  if (const auto* s = std::get_if<If>(&statement.what)) {
    const bool inner = on_measured || mentions(s->condition, facts.measured);
    inspect(s->then.statements, facts, inner);
    if (s->otherwise) inspect(s->otherwise->statements, facts, inner);
    return;
  }
  if (const auto* s = std::get_if<Switch>(&statement.what)) {
    const bool inner = on_measured || mentions(s->selector, facts.measured);
    for (const auto& arm : s->cases) inspect(arm.body.statements, facts, inner);
    return;
  }
  if (const auto* s = std::get_if<Body>(&statement.what)) {
    inspect(s->statements, facts, on_measured);
    return;
  }
  if (const auto* s = std::get_if<Box>(&statement.what)) {
    inspect(s->body.statements, facts, on_measured);
    return;
  }
  if (std::holds_alternative<Break>(statement.what) || std::holds_alternative<Return>(statement.what) ||
      std::holds_alternative<End>(statement.what)) {
    facts.leaves_on_measured = facts.leaves_on_measured || on_measured;
  }
}

void inspect(const std::vector<syntax::Statement>& statements, LoopFacts& facts, bool on_measured) {
  for (const auto& statement : statements) inspect(statement, facts, on_measured);
}

}  // namespace

// What code may assign.

void Reader::collect_assigned(const SyntaxExpression& expression, std::set<std::string>& names) const {
  if (expression.kind == SyntaxExpression::Kind::call) {
    // An array argument may be written to by the subroutine.
    for (const SyntaxExpression& argument : expression.arguments) {
      if (const std::string* name = base_name(argument)) names.insert(*name);
    }
  }
  for (const SyntaxExpression& argument : expression.arguments) collect_assigned(argument, names);
}

void Reader::collect_assigned(const syntax::Statement& statement, std::set<std::string>& names) const {
  using namespace syntax;
  const auto all = [&](const Statements& statements) {
    for (const Statement& inner : statements) collect_assigned(inner, names);
  };
  const auto target = [&](const SyntaxExpression& expression) {
    if (const std::string* name = base_name(expression)) names.insert(*name);
  };
  if (const auto* s = std::get_if<Assignment>(&statement.what)) {
    target(s->target);
    collect_assigned(s->value, names);
    return;
  }
  if (const auto* s = std::get_if<Measurement>(&statement.what)) {
    if (s->target) target(*s->target);
    return;
  }
  if (const auto* s = std::get_if<Declaration>(&statement.what)) {
    if (s->value) collect_assigned(*s->value, names);
    return;
  }
  if (const auto* s = std::get_if<ExpressionStatement>(&statement.what)) {
    collect_assigned(s->value, names);
    return;
  }
  if (const auto* s = std::get_if<GateCall>(&statement.what)) {
    for (const SyntaxExpression& angle : s->angles) {
      collect_assigned(angle, names);
      target(angle);
    }
    return;
  }
  if (const auto* s = std::get_if<Return>(&statement.what)) {
    if (s->value) collect_assigned(*s->value, names);
    return;
  }
  if (const auto* s = std::get_if<If>(&statement.what)) {
    collect_assigned(s->condition, names);
    all(s->then.statements);
    if (s->otherwise) all(s->otherwise->statements);
    return;
  }
  if (const auto* s = std::get_if<For>(&statement.what)) {
    collect_assigned(s->over, names);
    all(s->body.statements);
    return;
  }
  if (const auto* s = std::get_if<While>(&statement.what)) {
    collect_assigned(s->condition, names);
    all(s->body.statements);
    return;
  }
  if (const auto* s = std::get_if<Switch>(&statement.what)) {
    collect_assigned(s->selector, names);
    for (const Switch::Case& arm : s->cases) all(arm.body.statements);
    return;
  }
  if (const auto* s = std::get_if<Body>(&statement.what)) {
    all(s->statements);
    return;
  }
  if (const auto* s = std::get_if<Box>(&statement.what)) {
    all(s->body.statements);
  }
}

std::set<std::string> Reader::assigned_in(const Statements& statements, std::size_t first) const {
  std::set<std::string> names;
  for (std::size_t i = first; i < statements.size(); ++i) collect_assigned(statements[i], names);
  return names;
}

void Reader::move_assigned(const std::set<std::string>& names) {
  for (const std::string& name : names) {
    Symbol* symbol = scopes_.find(name);
    if (symbol == nullptr) continue;
    if (symbol->kind == Symbol::Kind::alias) {
      for (const Part& part : symbol->parts) move_if_own(*part.symbol);
    } else {
      move_if_own(*symbol);
    }
  }
}

/// A variable of an outer block was moved when that block's arm was opened.
void Reader::move_if_own(Symbol& symbol) {
  if (symbol.kind != Symbol::Kind::variable || symbol.is_readonly) return;
  if (symbol.type.base == Base::duration || symbol.type.base == Base::stretch) return;
  if (symbol.block == block_) move_to_native(symbol);
}

// Arms.

std::uint32_t Reader::open_arm() {
  arms_.push_back(block_);
  block_ = static_cast<std::uint32_t>(circuit_.blocks.size());
  circuit_.blocks.emplace_back();
  phase_.emplace_back();
  return block_;
}

void Reader::close_arm() {
  block_ = arms_.back();
  arms_.pop_back();
}

void Reader::append_branch(Branch branch, syntax::Span at) {
  std::set<std::uint32_t> wires;
  for (const Branch::Arm& arm : branch.arms) {
    for (const Operation& op : circuit_.blocks[arm.block]) {
      const auto operands = circuit_.operands(op);
      wires.insert(operands.begin(), operands.end());
    }
  }
  const std::vector<std::uint32_t> operands(wires.begin(), wires.end());
  Operation op = circuit_.make(Kind::branch, operands);
  op.payload = static_cast<std::uint32_t>(circuit_.branches.size());
  circuit_.branches.push_back(std::move(branch));
  append(std::move(op), at);
}

/// Runs what may be skipped because a flag is up, in an arm under `if (!flag)`.
Ending Reader::run_guarded(const std::function<Ending()>& rest, const std::set<std::string>& assigned) {
  move_assigned(assigned);
  std::vector<std::uint32_t> flags = std::exchange(pending_, {});
  Expression any = variable_of(flags[0]);
  for (std::size_t i = 1; i < flags.size(); ++i)
    any = operation("||", {std::move(any), variable_of(flags[i])});
  Branch branch;
  branch.condition = operation("!", {std::move(any)});
  branch.arms.push_back({{}, open_arm()});
  rest();
  close_arm();
  append_branch(std::move(branch), {});
  for (const std::uint32_t flag : flags) add_pending(flag);
  return Ending::falls;
}

void Reader::add_pending(std::uint32_t flag) {
  if (std::find(pending_.begin(), pending_.end(), flag) == pending_.end()) pending_.push_back(flag);
}

void Reader::drop_pending(std::uint32_t flag) {
  std::erase(pending_, flag);
}

// Ways out.

/// The flag of a target, made and cleared at its beginning when it is first needed.
std::uint32_t Reader::raised(Target& target, std::uint32_t& flag, syntax::Span at) {
  if (flag == no_variable) flag = temporary({Base::boolean, 0}, "left", target.frame);
  emit_assignment(variable_of(flag), literal("true"), at);
  add_pending(flag);
  return flag;
}

void Reader::insert_clear(std::uint32_t block, std::size_t position, std::uint32_t flag) {
  ClassicalStatement statement;
  statement.target = variable_of(flag);
  statement.value = literal("false");
  Operation op;
  op.kind = Kind::classical;
  op.payload = static_cast<std::uint32_t>(circuit_.statements.size());
  circuit_.statements.push_back(std::move(statement));
  auto& operations = circuit_.blocks[block];
  operations.insert(operations.begin() + static_cast<std::ptrdiff_t>(position), op);
}

Ending Reader::exit_to(Ending ending, syntax::Span at) {
  const auto native = [&](ClassicalStatement::Kind kind) {
    ClassicalStatement statement;
    statement.kind = kind;
    emit_statement(std::move(statement), at);
  };
  if (ending == Ending::ends) {
    if (block_ == 0) {
      has_ended_ = true;
      finish_values();
    } else {
      native(ClassicalStatement::Kind::end_program);
    }
    return ending;
  }
  const bool is_return = ending == Ending::returns;
  for (std::size_t i = targets_.size(); i-- > 0;) {
    Target& target = targets_[i];
    const bool is_subroutine = target.kind == Target::Kind::subroutine;
    if (is_return != is_subroutine) {
      if (!is_return) break;  // a loop outside of the subroutine
      continue;
    }
    if (target.kind == Target::Kind::native_loop) {
      native(ending == Ending::breaks ? ClassicalStatement::Kind::leave_loop
                                      : ClassicalStatement::Kind::next_round);
      return ending;
    }
    if (ending == Ending::continues ? block_ == target.round_block : block_ == target.block) return ending;
    raised(target, ending == Ending::continues ? target.continue_flag : target.flag, at);
    // Running loops between here and the subroutine's end are left one by one.
    const bool in_running_loop =
        std::any_of(targets_.begin() + static_cast<std::ptrdiff_t>(i), targets_.end(),
                    [](const Target& inner) { return inner.kind == Target::Kind::native_loop; });
    if (in_running_loop) native(ClassicalStatement::Kind::leave_loop);
    return ending;
  }
  if (is_return) fail(at, "`return` stands outside of a subroutine");
  fail(at, fmt::format("`{}` stands outside of a loop", ending == Ending::breaks ? "break" : "continue"));
}

// Blocks and branches.

Ending Reader::run_block(const syntax::Body& body) {
  scopes_.open();
  const Ending ending = run_list(body.statements);
  close_scope();
  return ending;
}

Ending Reader::run_if(const syntax::If& choice, syntax::Span at) {
  const Value condition = truth(choice.condition);
  if (condition.is_known()) {
    const bool taken = truth_of(condition);
    if (!taken) check_unrun(choice.then);
    if (taken && choice.otherwise) check_unrun(*choice.otherwise);
    if (taken) return run_block(choice.then);
    return choice.otherwise ? run_block(*choice.otherwise) : Ending::falls;
  }
  std::set<std::string> names = assigned_in(choice.then.statements, 0);
  if (choice.otherwise) names.merge(assigned_in(choice.otherwise->statements, 0));
  Branch branch;
  branch.condition = expression_of(condition, rules());
  move_assigned(names);
  const auto run_arm = [&](const syntax::Body& body) {
    const auto outer = std::exchange(pending_, {});
    branch.arms.push_back({{}, open_arm()});
    run_block(body);
    close_arm();
    for (const std::uint32_t flag : outer) add_pending(flag);
  };
  run_arm(choice.then);
  if (choice.otherwise) run_arm(*choice.otherwise);
  append_branch(std::move(branch), at);
  return Ending::falls;
}

Ending Reader::run_switch(const syntax::Switch& choice, syntax::Span at) {
  Value selector = evaluated(choice.selector);
  const Base base = selector.type.base;
  if (base == Base::bits) {
    warn(choice.selector.at, "a register as a selector is read as the unsigned number that it holds",
         {"help: the standard wants an integer, as in uint[n](c)"});
    selector = cast(selector, {Base::natural, std::max(selector.type.width, 1u)}, rules());
  } else if (base != Base::integer && base != Base::natural) {
    fail(choice.selector.at, fmt::format("a switch selects by an integer, not by {}", text_of(selector.type)),
         {"help: cast it"});
  }
  std::set<std::string> seen;
  std::vector<std::vector<Value>> labels;
  std::size_t defaults = 0;
  std::size_t otherwise = choice.cases.size();
  std::size_t chosen = choice.cases.size();
  for (std::size_t i = 0; i < choice.cases.size(); ++i) {
    const syntax::Switch::Case& arm = choice.cases[i];
    labels.emplace_back();
    if (arm.labels.empty()) {
      if (++defaults > 1) fail(arm.at, "a switch has at most one default");
      otherwise = i;
    }
    for (const SyntaxExpression& label : arm.labels) {
      const Value value = constant(label, "the label of a case");
      if (value.type.base != Base::integer && value.type.base != Base::natural) {
        fail(label.at, fmt::format("the label of a case is an integer, not {}", text_of(value.type)));
      }
      if (!seen.insert(value.integer.to_string()).second) {
        fail(label.at, fmt::format("the case {} is there already", value.integer.to_string()));
      }
      labels.back().push_back(value);
      if (selector.is_known() && selector.integer == value.integer) chosen = i;
    }
  }
  if (choice.cases.empty()) fail(at, "a switch has at least one case");
  if (selector.is_known()) {
    if (chosen == choice.cases.size()) chosen = otherwise;
    for (std::size_t i = 0; i < choice.cases.size(); ++i) {
      if (i != chosen) check_unrun(choice.cases[i].body);
    }
    return chosen == choice.cases.size() ? Ending::falls : run_block(choice.cases[chosen].body);
  }
  std::set<std::string> names;
  for (const auto& arm : choice.cases) names.merge(assigned_in(arm.body.statements, 0));
  Branch branch;
  branch.kind = Branch::Kind::switch_case;
  branch.condition = expression_of(selector, rules());
  move_assigned(names);
  for (std::size_t i = 0; i < choice.cases.size(); ++i) {
    Branch::Arm arm;
    for (const Value& label : labels[i]) arm.labels.push_back(expression_of(of_int(label.integer), rules()));
    const auto outer = std::exchange(pending_, {});
    arm.block = open_arm();
    run_block(choice.cases[i].body);
    close_arm();
    for (const std::uint32_t flag : outer) add_pending(flag);
    branch.arms.push_back(std::move(arm));
  }
  append_branch(std::move(branch), at);
  return Ending::falls;
}

// Loops.

Reader::Target Reader::new_target(Target::Kind kind) {
  Target target;
  target.kind = kind;
  target.block = block_;
  target.position = circuit_.blocks[block_].size();
  target.frame = temporaries_.size() - 1;
  return target;
}

/// One round of a loop that is unrolled. Returns how its body ended, as far as the loop is concerned.
Ending Reader::run_round(const std::function<Ending()>& body, const std::set<std::string>& assigned) {
  if (!pending_.empty()) return run_guarded([&] { return run_round(body, assigned); }, assigned);
  const std::size_t index = targets_.size() - 1;
  targets_[index].round_block = block_;
  targets_[index].round_position = circuit_.blocks[block_].size();
  targets_[index].continue_flag = no_variable;
  const Ending ending = body();
  const Target& target = targets_[index];
  if (target.continue_flag != no_variable) {
    insert_clear(target.round_block, target.round_position, target.continue_flag);
    drop_pending(target.continue_flag);
  }
  return ending == Ending::continues ? Ending::falls : ending;
}

void Reader::finish_loop() {
  const Target target = targets_.back();
  targets_.pop_back();
  if (target.flag == no_variable) return;
  insert_clear(target.block, target.position, target.flag);
  drop_pending(target.flag);
}

/// The rounds of a for loop, given one by one.
Ending Reader::run_for(const syntax::For& loop, syntax::Span at) {
  const Type type = scalar_type(loop.type);
  std::optional<Expression> running;
  LoopValues values = loop_values(loop, type, running);
  if (running) return run_running_for(loop, type, std::move(*running), at);
  const auto assigned = assigned_in(loop.body.statements, 0);
  targets_.push_back(new_target(Target::Kind::unrolled_loop));
  const std::size_t errors_before = errors_;
  Ending result = Ending::falls;
  while (auto value = values.next()) {
    count_step(at);
    const Ending ending = run_round(
        [&] {
          scopes_.open();
          Symbol variable;
          variable.kind = Symbol::Kind::variable;
          variable.name = loop.name.text;
          variable.at = loop.name.at;
          variable.type = type;
          variable.declaration = &loop;
          variable.cells = {assigned_value(*value, type, loop.over.at)};
          variable.is_set = true;
          declare(std::move(variable));
          const Ending round = run_list(loop.body.statements);
          close_scope();
          return round;
        },
        assigned);
    if (errors_ != errors_before) break;
    if (ending == Ending::breaks) break;
    if (ending != Ending::falls) {
      result = ending;
      break;
    }
  }
  finish_loop();
  return result;
}

Reader::LoopValues Reader::loop_values(const syntax::For& loop, Type type,
                                       std::optional<Expression>& running) {
  const SyntaxExpression& over = loop.over;
  LoopValues values;
  if (over.kind == SyntaxExpression::Kind::range) {
    for (const std::size_t i : {std::size_t(0), std::size_t(2)}) {
      if (over.arguments[i].kind == SyntaxExpression::Kind::absent) {
        fail(over.at, "the range of a loop needs both of its ends");
      }
    }
    Value first = evaluated(over.arguments[0]);
    Value step =
        over.arguments[1].kind == SyntaxExpression::Kind::absent ? of_int(1) : evaluated(over.arguments[1]);
    Value last = evaluated(over.arguments[2]);
    if (!first.is_known() || !step.is_known() || !last.is_known()) {
      Expression range;
      range.kind = Expression::Kind::range;
      range.arguments = {expression_of(first, rules()), expression_of(step, rules()),
                         expression_of(last, rules())};
      running = std::move(range);
      return values;
    }
    const auto is_whole = [](const Value& v) {
      return v.type.base == Base::integer || v.type.base == Base::natural || v.type.base == Base::boolean ||
             v.type.base == Base::bit;
    };
    values.is_range = true;
    values.is_real = !is_whole(first) || !is_whole(step) || !is_whole(last);
    if (values.is_real) {
      values.real_first = radians_of(first);
      values.real_step = radians_of(step);
      values.real_last = radians_of(last);
      if (values.real_step == 0) fail(over.at, "the step of a range cannot be 0");
    } else {
      values.first = first.integer;
      values.step = step.integer;
      values.last = last.integer;
      if (values.step.is_zero()) fail(over.at, "the step of a range cannot be 0");
    }
    return values;
  }
  if (over.kind == SyntaxExpression::Kind::set) {
    for (const SyntaxExpression& element : over.arguments) {
      values.list.push_back(kept(assigned_value(evaluated(element), type, element.at), "element"));
    }
    return values;
  }
  const SyntaxExpression* node = &over;
  while (node->kind == SyntaxExpression::Kind::index ||
         (node->kind == SyntaxExpression::Kind::binary && node->op == syntax::Operator::concatenate)) {
    node = &node->arguments[0];
  }
  if (node->kind == SyntaxExpression::Kind::name) {
    const Location location = located(over);
    if (!location.shape.empty()) {
      if (location.shape.size() != 1) fail(over.at, "a loop runs over arrays of one dimension only");
      for (const Value& cell : array_values(over, location.type, location.shape)) {
        values.list.push_back(kept(cell, "element"));
      }
      return values;
    }
    if (location.type.base == Base::bits && !location.running.empty()) {
      fail(over.at, "a loop cannot run over this");
    }
    if (location.type.base == Base::bits) {
      for (const Part& part : parts_of(location)) {
        Location one = location;
        one.parts = {part};
        one.parts_are_bits = true;
        one.is_one = true;
        one.type = {Base::bit, 0};
        values.list.push_back(kept(read(one, over.at), "element"));
      }
      return values;
    }
  }
  const Value value = evaluated(over);
  if (value.type.base != Base::bits || !value.is_known()) {
    fail(over.at, fmt::format("a loop runs over a range, a set, a register or an array, not over {}",
                              text_of(value.type)));
  }
  for (std::uint32_t i = 0; i < value.type.width; ++i) {
    Value bit = of_bool(value.integer.bit(i));
    bit.type = {Base::bit, 0};
    values.list.push_back(bit);
  }
  return values;
}

std::optional<Value> Reader::LoopValues::next() {
  if (!is_range) {
    if (round >= list.size()) return std::nullopt;
    return list[round++];
  }
  if (is_real) {
    const double value = real_first + static_cast<double>(round++) * real_step;
    const double slack = 1e-9 * std::abs(real_step);
    if (real_step > 0 ? value > real_last + slack : value < real_last - slack) return std::nullopt;
    return of_real(value);
  }
  if (step.is_negative() ? first < last : first > last) return std::nullopt;
  Value value = of_int(first);
  first = first + step;
  return value;
}

/// A loop whose bounds only the running program knows.
Ending Reader::run_running_for(const syntax::For& loop, Type type, Expression over, syntax::Span at) {
  move_assigned(assigned_in(loop.body.statements, 0));
  Branch branch;
  branch.kind = Branch::Kind::for_loop;
  branch.condition = std::move(over);
  const auto outer = std::exchange(pending_, {});
  branch.arms.push_back({{}, open_arm()});
  targets_.push_back(new_target(Target::Kind::native_loop));
  scopes_.open();
  Symbol variable;
  variable.kind = Symbol::Kind::variable;
  variable.name = loop.name.text;
  variable.at = loop.name.at;
  variable.type = type;
  variable.declaration = &loop;
  variable.cells = {Value{}};
  variable.is_set = true;
  Symbol& declared = declare(std::move(variable));
  move_to_native(declared, true, at);
  branch.variable = declared.variable;
  run_list(loop.body.statements);
  close_scope();
  finish_loop();
  close_arm();
  append_branch(std::move(branch), at);
  leave_outer_loops(at);
  for (const std::uint32_t flag : outer) add_pending(flag);
  return Ending::falls;
}

/// After a running loop that a `return` may have left: the running loop around it is left too.
void Reader::leave_outer_loops(syntax::Span at) {
  for (std::size_t i = targets_.size(); i-- > 0;) {
    if (targets_[i].kind == Target::Kind::subroutine) return;
    if (targets_[i].kind == Target::Kind::native_loop) break;
    if (i == 0) return;
  }
  if (pending_.empty() || targets_.empty()) return;
  for (const std::uint32_t flag : pending_) {
    Branch branch;
    branch.condition = variable_of(flag);
    branch.arms.push_back({{}, open_arm()});
    ClassicalStatement statement;
    statement.kind = ClassicalStatement::Kind::leave_loop;
    emit_statement(std::move(statement), at);
    close_arm();
    append_branch(std::move(branch), at);
  }
}

Ending Reader::run_while(const syntax::While& loop, syntax::Span at) {
  LoopFacts facts;
  // Twice, so that what is assigned late in the body is known at its beginning.
  inspect(loop.body.statements, facts, false);
  inspect(loop.body.statements, facts, false);
  const bool waits = mentions(loop.condition, facts.measured) || facts.leaves_on_measured;
  const auto assigned = assigned_in(loop.body.statements, 0);
  targets_.push_back(new_target(Target::Kind::unrolled_loop));
  const std::size_t errors_before = errors_;
  Ending result = Ending::falls;
  while (true) {
    count_step(at);
    // A flag that may be up, or a condition that is not known: from here on the loop runs.
    const bool flagged = !pending_.empty();
    const auto size_before = circuit_.blocks[block_].size();
    const Value condition = flagged ? of_bool(true) : truth(loop.condition);
    if (condition.is_known() && !truth_of(condition)) {
      check_unrun(loop.body);
      break;
    }
    if (!condition.is_known() || flagged || waits) {
      if (flagged) {
        result = run_guarded([&] { return run_running_while(loop, at); }, assigned);
      } else {
        circuit_.blocks[block_].resize(size_before);  // the condition is told again inside
        result = run_running_while(loop, at);
      }
      break;
    }
    const Ending ending = run_round([&] { return run_block(loop.body); }, assigned);
    if (errors_ != errors_before || ending == Ending::breaks) break;
    if (ending != Ending::falls) {
      result = ending;
      break;
    }
  }
  finish_loop();
  return result;
}

Ending Reader::run_running_while(const syntax::While& loop, syntax::Span at) {
  std::set<std::string> names = assigned_in(loop.body.statements, 0);
  collect_assigned(loop.condition, names);
  move_assigned(names);
  Branch branch;
  branch.kind = Branch::Kind::while_loop;
  const auto size_before = circuit_.blocks[block_].size();
  const Value condition = truth(loop.condition);
  if (condition.is_known() && !truth_of(condition)) return Ending::falls;
  // A condition that does something (a call with measurements) is told at the head of every round.
  const bool acts = circuit_.blocks[block_].size() != size_before;
  if (acts) circuit_.blocks[block_].resize(size_before);
  branch.condition = acts ? literal("true") : expression_of(condition, rules());
  const auto outer = std::exchange(pending_, {});
  branch.arms.push_back({{}, open_arm()});
  targets_.push_back(new_target(Target::Kind::native_loop));
  if (acts) {
    const Value again = truth(loop.condition);
    Branch stop;
    stop.condition = expression_of(unary("!", again, rules()), rules());
    stop.arms.push_back({{}, open_arm()});
    ClassicalStatement statement;
    statement.kind = ClassicalStatement::Kind::leave_loop;
    emit_statement(std::move(statement), at);
    close_arm();
    append_branch(std::move(stop), at);
  }
  run_block(loop.body);
  finish_loop();
  close_arm();
  append_branch(std::move(branch), at);
  leave_outer_loops(at);
  for (const std::uint32_t flag : outer) add_pending(flag);
  return Ending::falls;
}

// Subroutines.

void Reader::define_subroutine(const syntax::Subroutine& definition, syntax::Span at) {
  if (scopes_.depth() != 1 || block_ != 0) fail(at, "subroutines are defined at the outermost level only");
  std::set<std::string> names;
  for (const syntax::Parameter& parameter : definition.parameters) {
    if (!names.insert(parameter.name.text).second) {
      fail(parameter.name.at, fmt::format("`{}` is declared already", parameter.name.text));
    }
  }
  Symbol symbol;
  has_hoisted_ = true;
  symbol.kind = Symbol::Kind::subroutine;
  symbol.name = definition.name.text;
  symbol.at = definition.name.at;
  symbol.definition = &definition;
  Symbol& declared = declare(std::move(symbol));
  const std::size_t errors_before = errors_;
  check_subroutine(definition);
  if (errors_ != errors_before) declared.kind = Symbol::Kind::broken;  // nor are its calls run
}

void Reader::define_extern(const syntax::Extern& definition, syntax::Span at) {
  if (scopes_.depth() != 1 || block_ != 0)
    fail(at, "external functions are declared at the outermost level only");
  Symbol symbol;
  has_hoisted_ = true;
  symbol.kind = Symbol::Kind::external;
  symbol.name = definition.name.text;
  symbol.at = definition.name.at;
  symbol.extern_definition = &definition;
  std::vector<std::string> types;
  for (const syntax::Type& type : definition.parameters) types.push_back(text_of(scalar_type(type)));
  const Type result = scalar_type(definition.result);
  declare(std::move(symbol));
  native_names_.insert(definition.name.text);
  circuit_.externs.push_back(fmt::format("extern {}({}){};", definition.name.text, fmt::join(types, ", "),
                                         result.base == Base::none ? "" : " -> " + text_of(result)));
}

Value Reader::call_extern(const Symbol& symbol, const std::vector<const SyntaxExpression*>& arguments,
                          syntax::Span at) {
  const syntax::Extern& definition = *symbol.extern_definition;
  const bool is_statement = std::exchange(is_statement_call_, false);
  if (arguments.size() != definition.parameters.size()) {
    fail(at, fmt::format("`{}` takes {} arguments, not {}", symbol.name, definition.parameters.size(),
                         arguments.size()));
  }
  if (capture_ != nullptr) fail(at, "a gate cannot call an external function");
  Expression call;
  call.kind = Expression::Kind::call;
  call.text = symbol.name;
  for (std::size_t i = 0; i < arguments.size(); ++i) {
    const Value value =
        assigned_value(evaluated(*arguments[i]), scalar_type(definition.parameters[i]), arguments[i]->at);
    call.arguments.push_back(expression_of(value, rules()));
  }
  const Type result = scalar_type(definition.result);
  if (result.base == Base::none || is_statement) {
    ClassicalStatement statement;
    statement.kind = ClassicalStatement::Kind::call;
    statement.value = std::move(call);
    emit_statement(std::move(statement), at);
    return {};
  }
  // Called once, where it stands; its value is a variable from here on.
  return kept(of_expression(std::move(call), result, true), symbol.name + "_value");
}

void Reader::bind_qubits(const syntax::Parameter& parameter, const SyntaxExpression& argument, Bound& bound) {
  if (argument.kind == SyntaxExpression::Kind::binary && argument.op == syntax::Operator::concatenate) {
    fail(argument.at, "a concatenation cannot be an argument", {"help: give it a name with `let` first"});
  }
  Qubits qubits = qubits_of(argument);
  Symbol symbol;
  symbol.kind = Symbol::Kind::qubits;
  symbol.name = parameter.name.text;
  symbol.at = parameter.name.at;
  symbol.is_scalar = parameter.type.width.empty();
  if (symbol.is_scalar != qubits.is_scalar) {
    fail(argument.at, symbol.is_scalar ? "a single qubit is expected here, not a register"
                                       : "a register of qubits is expected here, not a single qubit");
  }
  if (!symbol.is_scalar) {
    const std::uint32_t size = size_of(parameter.type.width[0], 0, "the size of a register");
    if (size != qubits.wires.size()) {
      fail(argument.at,
           fmt::format("a register of {} qubits is expected here, not of {}", size, qubits.wires.size()));
    }
  }
  for (const std::uint32_t wire : qubits.wires) {
    if (std::find(bound.used.begin(), bound.used.end(), wire) != bound.used.end()) {
      fail(argument.at, fmt::format("qubit `{}` is given twice", circuit_.wire_name(wire)));
    }
    bound.used.push_back(wire);
  }
  symbol.wires = std::move(qubits.wires);
  bound.symbols.push_back(std::move(symbol));
}

void Reader::bind_array(const syntax::Parameter& parameter, const SyntaxExpression& argument, Bound& bound) {
  const Type type = scalar_type(parameter.type.element[0]);
  const Location location = located(argument);
  if (location.shape.empty()) fail(argument.at, "an array is expected here");
  if (location.type != type) {
    fail(argument.at,
         fmt::format("an array of {} is expected here, not of {}", text_of(type), text_of(location.type)));
  }
  if (!parameter.type.dimension_count.empty()) {
    const std::uint32_t count = size_of(parameter.type.dimension_count[0], 1, "the number of dimensions");
    if (count != location.shape.size()) {
      fail(argument.at, fmt::format("an array of {} dimensions is expected here, not of {}", count,
                                    location.shape.size()));
    }
  } else if (const auto shape = array_shape(parameter.type); shape != location.shape) {
    fail(argument.at, fmt::format("an array of shape [{}] is expected here, not [{}]", fmt::join(shape, ", "),
                                  fmt::join(location.shape, ", ")));
  }
  const bool is_mutable = parameter.type.access == syntax::Type::Access::mutable_;
  if (is_mutable) check_writable(location, argument.at);
  // A reference is an alias of all cells.
  Symbol symbol;
  symbol.kind = Symbol::Kind::alias;
  symbol.name = parameter.name.text;
  symbol.at = parameter.name.at;
  symbol.type = location.type;
  symbol.shape = location.shape;
  symbol.parts = parts_of(location);
  symbol.parts_are_bits = false;
  symbol.is_readonly = !is_mutable;
  bound.symbols.push_back(std::move(symbol));
}

void Reader::bind_value(const syntax::Parameter& parameter, const SyntaxExpression& argument, Bound& bound) {
  Symbol symbol;
  symbol.kind = Symbol::Kind::variable;
  symbol.name = parameter.name.text;
  symbol.at = parameter.name.at;
  symbol.type = scalar_type(parameter.type);
  symbol.declaration = &parameter;
  symbol.is_set = true;
  symbol.cells = {assigned_value(evaluated(argument), symbol.type, argument.at)};
  if (symbol.type.base == Base::bits) symbol.set_bits.assign(symbol.type.width, true);
  bound.symbols.push_back(std::move(symbol));
}

Value Reader::call_subroutine(const Symbol& symbol, const std::vector<const SyntaxExpression*>& arguments,
                              syntax::Span at) {
  const syntax::Subroutine& definition = *symbol.definition;
  is_statement_call_ = false;
  if (capture_ != nullptr) fail(at, "a gate cannot call a subroutine");
  if (arguments.size() != definition.parameters.size()) {
    fail(at, fmt::format("`{}` takes {} argument{}, not {}", symbol.name, definition.parameters.size(),
                         definition.parameters.size() == 1 ? "" : "s", arguments.size()));
  }
  if (call_depth_ >= options_.most_depth) {
    throw Overflow{
        {at,
         fmt::format("calls nest deeper than {}", options_.most_depth),
         {"note: subroutines are inlined; a recursion must end by what is known while compiling"}}};
  }
  count_step(at);
  Bound bound;
  for (std::size_t i = 0; i < arguments.size(); ++i) {
    const syntax::Parameter& parameter = definition.parameters[i];
    if (parameter.type.kind == syntax::Type::Kind::qubit) {
      bind_qubits(parameter, *arguments[i], bound);
    } else if (parameter.type.kind == syntax::Type::Kind::array) {
      bind_array(parameter, *arguments[i], bound);
    } else {
      bind_value(parameter, *arguments[i], bound);
    }
  }
  const Type result = scalar_type(definition.result);
  const std::size_t outer_frame = std::exchange(scopes_.frame, scopes_.depth() + 1);
  Target target = new_target(Target::Kind::subroutine);
  target.result = result;
  scopes_.open();
  ++call_depth_;
  std::vector<Symbol*> declared;
  for (Symbol& argument : bound.symbols) {
    const bool runs = argument.kind == Symbol::Kind::variable && argument.cells[0].runs;
    Symbol& added = declare(std::move(argument));
    if (runs) move_to_native(added, false, at);
  }
  // Only now: telling a run-time argument is not part of what a return could skip.
  target.position = circuit_.blocks[block_].size();
  targets_.push_back(std::move(target));
  const std::size_t errors_before = errors_;
  run_list(definition.body.statements);
  --call_depth_;
  const Target done = targets_.back();
  targets_.pop_back();
  if (done.flag != no_variable) {
    insert_clear(done.block, done.position, done.flag);
    drop_pending(done.flag);
  }
  close_scope();
  scopes_.frame = outer_frame;
  if (errors_ != errors_before) throw Trouble{};
  if (result.base == Base::none) return {};
  if (done.result_variable != no_variable) return variable_value(done.result_variable, result);
  if (!done.value) {
    if (has_ended_) return cast(of_int(0), result.base == Base::bits ? Type{Base::bit, 0} : result, rules());
    fail(at, fmt::format("`{}` ends without returning its {}", symbol.name, text_of(result)));
  }
  return *done.value;
}

void Reader::run_return(const syntax::Return& statement, syntax::Span at) {
  std::size_t index = targets_.size();
  while (index > 0 && targets_[index - 1].kind != Target::Kind::subroutine) --index;
  if (index == 0) fail(at, "`return` stands outside of a subroutine");
  --index;
  const Type type = targets_[index].result;
  if (!statement.value) {
    if (type.base != Base::none) fail(at, fmt::format("this subroutine returns {}", text_of(type)));
    return;
  }
  if (type.base == Base::none) fail(statement.value->at, "this subroutine returns nothing");
  const std::size_t frame = targets_[index].frame;
  const bool is_measure = statement.value->kind == SyntaxExpression::Kind::measure;
  const Value raw = is_measure ? measured(*statement.value, frame) : evaluated(*statement.value);
  const Value value = assigned_value(raw, type, statement.value->at);
  Target& target = targets_[index];
  const bool direct = block_ == target.block && target.result_variable == no_variable;
  if (direct && (!value.runs || is_measure)) {
    target.value = value;
    return;
  }
  // The variables of the subroutine are gone after the call: the result has one that outlives them.
  if (target.result_variable == no_variable) target.result_variable = temporary(type, "result", frame);
  emit_assignment(variable_of(targets_[index].result_variable), expression_of(value, rules()), at);
}

}  // namespace isinglass
