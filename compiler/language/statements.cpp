// Statements one by one: declarations, assignments, measurements. See reader.h.
#include <fmt/format.h>

#include <algorithm>

#include "language/reader.h"

namespace isinglass {

namespace {

constexpr std::uint32_t most_flat_bits = 1u << 24;

template <class... Alternatives>
bool is_one_of(const syntax::Statement& statement) {
  return (std::holds_alternative<Alternatives>(statement.what) || ...);
}

Value zero_of(Type type) {
  Value value;
  value.type = type;
  return value;
}

/// What the statement as such becomes in the circuit; phase stands for gates.
Kind kind_of(const syntax::Statement& statement) {
  using namespace syntax;
  if (is_one_of<Measurement>(statement)) return Kind::measure;
  if (is_one_of<syntax::Reset>(statement)) return Kind::reset;
  if (is_one_of<syntax::Barrier, Box>(statement)) return Kind::barrier;
  if (is_one_of<syntax::Delay>(statement)) return Kind::delay;
  if (is_one_of<If, For, While, Switch>(statement)) return Kind::branch;
  if (is_one_of<Assignment, ExpressionStatement, Break, Continue, End>(statement)) return Kind::classical;
  return Kind::phase;
}

const std::string* base_name(const syntax::Expression& expression) {
  const syntax::Expression* node = &expression;
  while (node->kind == syntax::Expression::Kind::index) node = &node->arguments[0];
  return node->kind == syntax::Expression::Kind::name ? &node->text : nullptr;
}

}  // namespace

// Running.

Ending Reader::run_list(const Statements& statements, std::size_t first) {
  const std::size_t errors_before = errors_;
  for (std::size_t i = first; i < statements.size(); ++i) {
    if (!pending_.empty())
      return run_guarded([&, i] { return run_list(statements, i); }, assigned_in(statements, i));
    const Ending ending = run_checked(statements[i]);
    if (ending != Ending::falls) return ending;
    if (has_ended_) return Ending::ends;
    if (errors_ - errors_before >= 20) break;
  }
  return Ending::falls;
}

/// Runs one statement; what is wrong with it is reported here, and the next one runs nevertheless.
Ending Reader::run_checked(const syntax::Statement& statement) {
  count_step(statement.at);
  if (!statement.annotations.empty()) note_annotations(statement);
  temporaries_.emplace_back();
  const std::size_t depth = scopes_.depth();
  const std::size_t frame = scopes_.frame;
  const std::size_t targets = targets_.size();
  const std::size_t arms = arms_.size();
  const std::uint32_t block = block_;
  const auto fixed = fixed_;
  const auto fixed_variables = fixed_variables_;
  const auto fixed_bits = fixed_bits_;
  Ending ending = Ending::falls;
  std::optional<Trouble> trouble;
  try {
    ending = run_statement(statement);
  } catch (const Trouble& caught) {
    trouble = caught;
  } catch (const Fault& fault) {
    trouble = Trouble{statement.at, fault.text, {}};
    if (!fault.help.empty()) trouble->notes.push_back("help: " + fault.help);
  } catch (const Split& split) {
    trouble = Trouble{split.at, "an index or angle known only while running cannot stand here", {}};
  }
  if (trouble) {
    // The statement may have been left in the middle of scopes, loops and arms.
    while (scopes_.depth() > depth) close_scope();
    scopes_.frame = frame;
    targets_.resize(targets);
    arms_.resize(arms);
    block_ = block;
    fixed_ = fixed;
    fixed_variables_ = fixed_variables;
    fixed_bits_ = fixed_bits;
    is_statement_call_ = false;
    report(*trouble);
    note_broken(statement);
  }
  for (const std::uint32_t variable : temporaries_.back()) {
    free_variables_[{&temporaries_, circuit_.variables[variable].type}].push_back(variable);
  }
  temporaries_.pop_back();
  return ending;
}

/// Annotations are kept once, however often their statement is run. What is not part of the native program as
/// such, gates, subroutines, qubits, cannot carry them.
void Reader::note_annotations(const syntax::Statement& statement) {
  using namespace syntax;
  const auto* declaration = std::get_if<Declaration>(&statement.what);
  const bool is_lost =
      capture_ != nullptr || statement.at.source != 0 ||
      is_one_of<GateDefinition, Subroutine, QubitDeclaration, syntax::Alias, Include>(statement) ||
      (declaration != nullptr && declaration->role == Declaration::Role::constant);
  for (const syntax::Annotation& annotation : statement.annotations) {
    if (is_lost) {
      warn(annotation.at,
           fmt::format("the annotation @{} is dropped: its statement is not part of the native program",
                       annotation.name));
      continue;
    }
    if (!annotated_.insert(annotation.at.offset).second) continue;
    std::string text = "@" + annotation.name;
    if (!annotation.text.empty()) text += " " + annotation.text;
    annotations_.push_back({std::move(text), annotation.at.line, statement.at.line, annotation.last_line,
                            declaration != nullptr ? declaration->name.text : std::string(),
                            kind_of(statement)});
  }
}

/// After an error in a declaration its name stands for nothing, so that uses are not reported again.
void Reader::note_broken(const syntax::Statement& statement) {
  const syntax::Name* name = nullptr;
  if (const auto* s = std::get_if<syntax::QubitDeclaration>(&statement.what)) name = &s->name;
  if (const auto* s = std::get_if<syntax::Declaration>(&statement.what)) name = &s->name;
  if (const auto* s = std::get_if<syntax::Alias>(&statement.what)) name = &s->name;
  if (const auto* s = std::get_if<syntax::GateDefinition>(&statement.what)) name = &s->name;
  if (const auto* s = std::get_if<syntax::Subroutine>(&statement.what)) name = &s->name;
  if (const auto* s = std::get_if<syntax::Extern>(&statement.what)) name = &s->name;
  if (name == nullptr || scopes_.find_innermost(name->text) != nullptr) return;
  Symbol symbol;
  symbol.name = name->text;
  symbol.at = name->at;
  scopes_.add(std::move(symbol));
}

/// Calls in the angles and indices of a gate call are made once, before it: their results are variables like
/// all others then, and the gate may need an arm for each of their values. Running cells of arrays likewise.
void Reader::hoist_calls(const syntax::GateCall& call) {
  if (capture_ != nullptr || !has_hoisted_) return;
  const Symbol* callee = scopes_.find(call.name.text);
  if (callee != nullptr && callee->kind != Symbol::Kind::gate) return;  // a subroutine in the early form
  for (const SyntaxExpression& angle : call.angles) hoist_calls(angle);
  for (const SyntaxExpression& operand : call.operands) hoist_calls(operand);
}

void Reader::hoist_calls(const SyntaxExpression& expression) {
  if (expression.kind == SyntaxExpression::Kind::call) {
    const Symbol* callee = scopes_.find(expression.text);
    const bool is_call = callee != nullptr &&
                         (callee->kind == Symbol::Kind::subroutine || callee->kind == Symbol::Kind::external);
    if (is_call) {
      const Value value = evaluated(expression);
      // What an extern gave is in a variable of its own already.
      const bool is_kept = callee->kind == Symbol::Kind::external;
      fixed_[&expression] = is_kept ? value : kept(value, callee->name + "_value");
      return;
    }
  }
  if (expression.kind == SyntaxExpression::Kind::index &&
      expression.arguments[0].kind == SyntaxExpression::Kind::name) {
    const Symbol* array = scopes_.find(expression.arguments[0].text);
    if (array != nullptr && array->is_array() && array->runs &&
        expression.arguments.size() == array->shape.size() + 1) {
      fixed_[&expression] = kept(evaluated(expression), array->name + "_cell");
      return;
    }
  }
  for (const SyntaxExpression& argument : expression.arguments) hoist_calls(argument);
}

void Reader::with_splits(syntax::Span at, const std::set<std::string>& assigned,
                         const std::function<void()>& action) {
  const std::size_t before = emitted_;
  std::optional<Split> split;
  try {
    action();
  } catch (const Split& caught) {
    split = caught;
  }
  if (!split) return;
  if (capture_ != nullptr) fail(split->at, "nothing inside a gate can depend on running values");
  if (emitted_ != before) {
    fail(at, "this statement depends on a running value that it computes itself",
         {"help: store that value in a variable first"});
  }
  run_split(*split, assigned, action);
}

void Reader::run_split(const Split& split, const std::set<std::string>& assigned,
                       const std::function<void()>& action) {
  move_assigned(assigned);
  Branch branch;
  const bool is_choice =
      split.count == 2 && (split.type.base == Base::bit || split.type.base == Base::boolean);
  branch.kind = is_choice ? Branch::Kind::if_else : Branch::Kind::switch_case;
  branch.condition = split.selector;
  if (split.node == nullptr && split.type.base == Base::angle) {
    // A switch wants an integer.
    for (const Base base : {Base::bits, Base::natural}) {
      Expression cast;
      cast.kind = Expression::Kind::cast;
      cast.text = text_of(Type{base, split.type.width});
      cast.arguments = {std::move(branch.condition)};
      branch.condition = std::move(cast);
    }
  }
  const auto outer_indices = fixed_;
  const auto outer_variables = fixed_variables_;
  const auto outer_bits = fixed_bits_;
  for (std::uint32_t i = 0; i < split.count; ++i) {
    const std::uint32_t k = is_choice ? 1 - i : i;  // `if` comes before `else`
    Value value = zero_of(split.type);
    value.integer = Integer(k);
    Branch::Arm arm;
    if (!is_choice) arm.labels = {literal(std::to_string(k))};
    if (split.node != nullptr) {
      fixed_[split.node] = value;
      if (split.type.base == Base::integer) {
        arm.labels.push_back(operation("-", {literal(std::to_string(split.count - k))}));
      }
    } else if (split.bit != no_bit) {
      fixed_bits_[split.bit] = k == 1;
    } else {
      if (split.type.base == Base::integer) value.integer = value.integer.wrapped(split.type.width);
      if (value.integer.is_negative()) arm.labels = {operation("-", {literal((-value.integer).to_string())})};
      fixed_variables_[split.variable] = value;
    }
    arm.block = open_arm();
    try {
      with_splits(split.at, assigned, action);
    } catch (const GivenTwice&) {
      warn(split.at, "for some values of the running index a qubit is given twice; nothing is done for them");
      circuit_.blocks[arm.block].clear();
    }
    close_arm();
    fixed_ = outer_indices;
    fixed_variables_ = outer_variables;
    fixed_bits_ = outer_bits;
    branch.arms.push_back(std::move(arm));
  }
  append_branch(std::move(branch), split.at);
}

Ending Reader::run_statement(const syntax::Statement& statement) {
  using namespace syntax;
  const Span at = statement.at;
  if (capture_ != nullptr && !is_one_of<GateCall, Barrier, Nop, For, Body>(statement)) {
    fail(at, "inside a gate there are calls of gates, barriers and for loops only");
  }
  if (const auto* s = std::get_if<GateCall>(&statement.what)) {
    const auto fixed = fixed_;
    hoist_calls(*s);
    with_splits(at, {}, [&] { call_gate(*s, at); });
    fixed_ = fixed;
    return has_ended_ ? Ending::ends : Ending::falls;
  }
  if (const auto* s = std::get_if<Declaration>(&statement.what)) {
    declare_variable(*s, at);
    return Ending::falls;
  }
  if (const auto* s = std::get_if<Assignment>(&statement.what)) {
    std::set<std::string> names;
    collect_assigned(statement, names);
    with_splits(at, names, [&] { assign(*s, at); });
    return Ending::falls;
  }
  if (const auto* s = std::get_if<Measurement>(&statement.what)) {
    std::set<std::string> names;
    collect_assigned(statement, names);
    with_splits(at, names, [&] { measure(*s, at); });
    return Ending::falls;
  }
  if (const auto* s = std::get_if<If>(&statement.what)) return run_if(*s, at);
  if (const auto* s = std::get_if<For>(&statement.what)) return run_for(*s, at);
  if (const auto* s = std::get_if<While>(&statement.what)) return run_while(*s, at);
  if (const auto* s = std::get_if<Switch>(&statement.what)) return run_switch(*s, at);
  if (const auto* s = std::get_if<Body>(&statement.what)) return run_block(*s);
  if (const auto* s = std::get_if<Box>(&statement.what)) return box(*s, at);
  if (const auto* s = std::get_if<Return>(&statement.what)) {
    run_return(*s, at);
    return exit_to(Ending::returns, at);
  }
  if (is_one_of<Break>(statement)) return exit_to(Ending::breaks, at);
  if (is_one_of<Continue>(statement)) return exit_to(Ending::continues, at);
  if (is_one_of<End>(statement)) return exit_to(Ending::ends, at);
  run_plain_statement(statement);
  return has_ended_ ? Ending::ends : Ending::falls;
}

void Reader::run_plain_statement(const syntax::Statement& statement) {
  using namespace syntax;
  const Span at = statement.at;
  if (const auto* s = std::get_if<QubitDeclaration>(&statement.what)) {
    declare_qubits(*s, at);
    return;
  }
  if (const auto* s = std::get_if<syntax::Reset>(&statement.what)) {
    with_splits(at, {}, [&] { reset(*s, at); });
    return;
  }
  if (const auto* s = std::get_if<syntax::Barrier>(&statement.what)) {
    with_splits(at, {}, [&] { barrier(*s, at); });
    return;
  }
  if (const auto* s = std::get_if<syntax::Delay>(&statement.what)) {
    with_splits(at, {}, [&] { delay(*s, at); });
    return;
  }
  if (const auto* s = std::get_if<Nop>(&statement.what)) {
    for (const SyntaxExpression& operand : s->operands) qubits_of(operand);
    return;
  }
  if (const auto* s = std::get_if<syntax::Alias>(&statement.what)) {
    declare_alias(*s);
    return;
  }
  if (const auto* s = std::get_if<GateDefinition>(&statement.what)) {
    define_gate(*s, at);
    return;
  }
  if (const auto* s = std::get_if<Subroutine>(&statement.what)) {
    define_subroutine(*s, at);
    return;
  }
  if (const auto* s = std::get_if<Extern>(&statement.what)) {
    define_extern(*s, at);
    return;
  }
  if (const auto* s = std::get_if<ExpressionStatement>(&statement.what)) {
    run_expression(*s, statement);
    return;
  }
  if (const auto* s = std::get_if<Include>(&statement.what)) {
    include(*s, at);
    return;
  }
  if (const auto* s = std::get_if<Pragma>(&statement.what)) {
    circuit_.pragmas.push_back(s->text);
    return;
  }
  if (std::holds_alternative<Calibration>(statement.what)) {
    fail(at,
         "cal, defcal and defcalgrammar are not supported: they program the layer of pulses, below the gates",
         {"note: pulses are this compiler's own work; see the target description"});
  }
}

void Reader::run_expression(const syntax::ExpressionStatement& statement,
                            const syntax::Statement& whole_statement) {
  const SyntaxExpression& value = statement.value;
  if (value.kind == SyntaxExpression::Kind::name) {
    const Symbol& symbol = found(value.text, value.at, "name");
    if (symbol.kind == Symbol::Kind::gate) {
      fail(value.at, fmt::format("gate `{}` is called without its qubits", value.text));
    }
    warn(value.at, "this statement has no effect");
    return;
  }
  std::set<std::string> names;
  collect_assigned(whole_statement, names);
  with_splits(whole_statement.at, names, [&] {
    if (value.kind != SyntaxExpression::Kind::call) warn(value.at, "this statement has no effect");
    is_statement_call_ = value.kind == SyntaxExpression::Kind::call;
    evaluated(value);
    is_statement_call_ = false;
  });
}

// Declarations.

void Reader::declare_qubits(const syntax::QubitDeclaration& declaration, syntax::Span at) {
  if (scopes_.depth() != 1 || block_ != 0) fail(at, "qubits are declared at the outermost level only");
  Symbol symbol;
  symbol.kind = Symbol::Kind::qubits;
  symbol.name = declaration.name.text;
  symbol.at = declaration.name.at;
  symbol.is_scalar = !declaration.size;
  if (version_ == 20 && symbol.is_scalar) {
    fail(declaration.name.at, fmt::format("the register `{}` needs a size", symbol.name),
         {fmt::format("help: write qreg {}[1];", symbol.name)});
  }
  const std::uint32_t size = declaration.size ? size_of(*declaration.size, 0, "the size of a register") : 1;
  if (circuit_.wires + std::uint64_t(size) > most_qubits) {
    fail(at, fmt::format("a program has at most {} qubits", most_qubits));
  }
  for (std::uint32_t i = 0; i < size; ++i) symbol.wires.push_back(circuit_.wires + i);
  const bool is_scalar = symbol.is_scalar;
  declare(std::move(symbol));
  add_register(circuit_, declaration.name.text, size, is_scalar);
}

void Reader::declare_variable(const syntax::Declaration& declaration, syntax::Span at) {
  using Role = syntax::Declaration::Role;
  Symbol symbol;
  symbol.kind = declaration.role == Role::constant ? Symbol::Kind::constant : Symbol::Kind::variable;
  symbol.name = declaration.name.text;
  symbol.at = declaration.name.at;
  symbol.declaration = &declaration;
  symbol.is_output = declaration.role == Role::output;
  const bool is_array = declaration.type.kind == syntax::Type::Kind::array;
  const bool global = scopes_.depth() == 1;
  symbol.type = scalar_type(is_array ? declaration.type.element[0] : declaration.type);
  if (symbol.type.base == Base::none) fail(declaration.type.at, "a variable cannot be void");
  if (version_ == 20 && declaration.old_form && declaration.type.width.empty()) {
    fail(declaration.name.at, fmt::format("the register `{}` needs a size", symbol.name),
         {fmt::format("help: write creg {}[1];", symbol.name)});
  }
  if (is_array) {
    if (!global) fail(at, "arrays are declared at the outermost level only");
    if (symbol.type.base == Base::bit || symbol.type.base == Base::bits ||
        symbol.type.base == Base::stretch) {
      fail(declaration.type.at, fmt::format("an array of {} is not allowed", text_of(symbol.type)),
           {"help: a register bit[n] holds many bits"});
    }
    symbol.shape = array_shape(declaration.type);
    has_hoisted_ = true;
  }
  if (declaration.role == Role::constant && is_array)
    fail(at, "constants are scalars; an array cannot be const");
  if ((declaration.role == Role::input || declaration.role == Role::output) && !global) {
    fail(at, "inputs and outputs are declared at the outermost level only");
  }
  if (declaration.role == Role::input) return declare_input(declaration, std::move(symbol), at);
  std::uint64_t cells = 1;
  for (const std::uint32_t size : symbol.shape) cells *= size;
  if (cells > 1'000'000) fail(at, "an array has at most 1000000 cells");
  symbol.cells.assign(cells, zero_of(symbol.type));
  if (!is_array && symbol.type.base == Base::bits) {
    if (circuit_.bits + std::uint64_t(symbol.type.width) > most_flat_bits)
      fail(at, "too many classical bits");
    symbol.set_bits.assign(symbol.type.width, false);
  }
  if (version_ == 20 || symbol.type.base == Base::stretch) {
    symbol.is_set = true;  // OpenQASM 2 starts registers at 0
    std::fill(symbol.set_bits.begin(), symbol.set_bits.end(), true);
  }
  if (symbol.kind == Symbol::Kind::constant) {
    if (!declaration.value) fail(at, "a constant needs a value");
    symbol.cells = {constant_value(*declaration.value, symbol.type)};
    declare(std::move(symbol));
    return;
  }
  initialize(std::move(symbol), declaration, at);
}

Value Reader::constant_value(const SyntaxExpression& expression, Type type) {
  if (expression.kind == SyntaxExpression::Kind::measure) {
    fail(expression.at, "a constant cannot be measured");
  }
  const Value value = constant(expression, "the value of a constant");
  const bool whole = type.base == Base::integer || type.base == Base::natural || type.base == Base::boolean;
  if (value.type.base == Base::real && whole) {
    fail(expression.at,
         fmt::format("a constant {} does not take {} without a cast", text_of(type), text_of(value.type)),
         {fmt::format("help: write {}(...)", text_of(type))});
  }
  return assigned_value(value, type, expression.at);
}

/// A length of its own that is found at the end; at least so many nanoseconds.
Value Reader::new_stretch(double least) {
  Value value = of_real(least, {Base::stretch, 0});
  value.form = lengths_.of_input(static_cast<std::uint32_t>(stretches_.size()));
  stretches_.push_back({least});
  return value;
}

/// Declares the variable, the value being evaluated before the name is seen.
void Reader::initialize(Symbol symbol, const syntax::Declaration& declaration, syntax::Span at) {
  const bool native_bits = symbol.shape.empty() &&
                           (symbol.type.base == Base::bit || symbol.type.base == Base::bits) &&
                           scopes_.depth() == 1;
  const auto announce = [&]() -> Symbol& {
    Symbol& declared = declare(std::move(symbol));
    // Global bits appear in the native program whether they are used or not, in the source's order.
    if (native_bits) native_variable(declared);
    return declared;
  };
  if (!declaration.value) {
    if (symbol.type.base == Base::stretch) symbol.cells = {new_stretch(0)};
    announce();
    return;
  }
  const SyntaxExpression& value = *declaration.value;
  if (symbol.is_array()) {
    auto values = array_values(value, symbol.type, symbol.shape);
    Symbol& declared = announce();
    write_array(whole(declared), values, at);
    declared.is_set = true;
    return;
  }
  if (value.kind == SyntaxExpression::Kind::set) fail(value.at, "a list of values is for arrays only");
  if (value.kind == SyntaxExpression::Kind::measure) {
    Symbol& declared = announce();
    with_splits(at, {declared.name},
                [&] { measure_into(qubits_of(value.arguments[0]), whole(declared), value.at); });
    return;
  }
  if (value.kind == SyntaxExpression::Kind::call) {
    // A call may need arms of its own, so that the variable must be there before.
    const Symbol* callee = scopes_.find(value.text);
    if (callee != nullptr && callee->kind == Symbol::Kind::subroutine &&
        callee != scopes_.find(symbol.name)) {
      Symbol& declared = announce();
      with_splits(at, {declared.name}, [&] {
        write(whole(declared), assigned_value(evaluated(value), declared.type, value.at), at);
      });
      return;
    }
  }
  Value result = assigned_value(evaluated(value), symbol.type, value.at);
  const bool is_stretch = symbol.type.base == Base::stretch;
  if (result.runs || (is_stretch && !result.is_known())) {
    if (is_stretch || symbol.type.base == Base::duration) {
      fail(value.at, "a duration must be known while compiling");
    }
  }
  if (is_stretch) {
    if (result.real < 0) fail(value.at, "a stretch cannot be negative");
    result = new_stretch(result.real);
  }
  Symbol& declared = announce();
  write(whole(declared), result, at);
}

void Reader::declare_input(const syntax::Declaration& declaration, Symbol symbol, syntax::Span at) {
  if (declaration.value) fail(at, "an input gets its value from outside; it has none here");
  if (symbol.type.base == Base::duration || symbol.type.base == Base::stretch) {
    fail(declaration.type.at, fmt::format("an input of type {} is not supported", text_of(symbol.type)),
         {"note: times are fixed when a program is compiled; compile it once for each length"});
  }
  if (symbol.type.base == Base::complex) {
    fail(declaration.type.at, fmt::format("an input of type {} is not supported", text_of(symbol.type)),
         {"help: take its real and its imaginary part as two inputs of type float"});
  }
  symbol.kind = Symbol::Kind::input;
  symbol.is_set = true;
  Input input;
  input.type = symbol.is_array()
                   ? fmt::format("array[{}, {}]", text_of(symbol.type), fmt::join(symbol.shape, ", "))
                   : text_of(symbol.type);
  const auto index = static_cast<std::uint32_t>(circuit_.inputs.size());
  Expression reference;
  reference.kind = Expression::Kind::input;
  reference.variable = index;
  const bool is_affine =
      symbol.type.base == Base::real || (symbol.type.base == Base::angle && symbol.type.width == 0);
  if (symbol.is_array()) {
    std::uint64_t cells = 1;
    for (const std::uint32_t size : symbol.shape) cells *= size;
    if (cells > 1'000'000) fail(at, "an array has at most 1000000 cells");
    for (std::uint32_t cell = 0; cell < cells; ++cell) {
      Expression element;
      element.kind = Expression::Kind::index;
      element.arguments = {reference};
      std::vector<std::string> indices(symbol.shape.size());
      std::uint32_t rest = cell;
      for (std::size_t d = symbol.shape.size(); d-- > 0;) {
        indices[d] = std::to_string(rest % symbol.shape[d]);
        rest /= symbol.shape[d];
      }
      for (std::string& text : indices) element.arguments.push_back(literal(std::move(text)));
      symbol.cells.push_back(of_expression(std::move(element), symbol.type, false));
    }
  } else if (is_affine) {
    Value value = zero_of(symbol.type);
    value.form = circuit_.forms.of_input(index);
    symbol.cells = {value};
  } else {
    symbol.cells = {of_expression(std::move(reference), symbol.type, false)};
  }
  input.source = declare(std::move(symbol)).name;
  input.name = native_name(input.source, declaration.name.at);
  circuit_.inputs.push_back(std::move(input));
}

void Reader::declare_alias(const syntax::Alias& alias) {
  const SyntaxExpression* node = &alias.value;
  while (node->kind == SyntaxExpression::Kind::index ||
         (node->kind == SyntaxExpression::Kind::binary && node->op == syntax::Operator::concatenate)) {
    node = &node->arguments[0];
  }
  if (node->kind == SyntaxExpression::Kind::hardware) fail(node->at, "a physical qubit has no alias");
  if (node->kind != SyntaxExpression::Kind::name)
    fail(node->at, "an alias is for registers, arrays and parts of them");
  Symbol symbol;
  symbol.name = alias.name.text;
  symbol.at = alias.name.at;
  if (found(node->text, node->at, "variable").kind == Symbol::Kind::qubits) {
    Qubits qubits = qubits_of(alias.value);
    symbol.kind = Symbol::Kind::qubits;
    symbol.is_scalar = qubits.is_scalar;
    auto sorted = qubits.wires;
    std::sort(sorted.begin(), sorted.end());
    if (std::adjacent_find(sorted.begin(), sorted.end()) != sorted.end()) {
      fail(alias.value.at, "an alias cannot name the same qubit twice");
    }
    symbol.wires = std::move(qubits.wires);
    declare(std::move(symbol));
    return;
  }
  Location location = located(alias.value);
  if (!location.running.empty())
    fail(alias.value.at, "an alias needs indices that are known while compiling");
  symbol.kind = Symbol::Kind::alias;
  symbol.type = location.type;
  symbol.shape = location.shape;
  symbol.parts_are_bits = location.shape.empty() && (location.parts_are_bits || location.parts.empty());
  symbol.parts = parts_of(location);
  for (std::size_t i = 0; symbol.parts_are_bits && i < symbol.parts.size(); ++i) {
    for (std::size_t j = 0; j < i; ++j) {
      const Part& a = symbol.parts[i];
      const Part& b = symbol.parts[j];
      if (a.symbol == b.symbol && a.cell == b.cell && a.bit == b.bit) {
        fail(alias.value.at, "an alias cannot name the same bit twice");
      }
    }
  }
  declare(std::move(symbol));
}

// Measurement, reset, barrier.

void Reader::measure(const syntax::Measurement& measurement, syntax::Span at) {
  const Qubits qubits = qubits_of(measurement.qubits);
  if (measurement.target) return measure_into(qubits, located(*measurement.target), measurement.target->at);
  for (const std::uint32_t wire : qubits.wires) {
    Operation op = circuit_.make(Kind::measure, {wire});
    op.payload = no_bit;
    append(std::move(op), at);
  }
}

void Reader::measure_into(const Qubits& qubits, const Location& target, syntax::Span at) {
  check_writable(target, at);
  const Base base = target.type.base;
  const bool one_bit = base == Base::bit || base == Base::boolean;
  if (!target.shape.empty() || (base != Base::bits && !one_bit)) {
    fail(at, fmt::format("a measurement gives bits; they do not fit {}", text_of(target.type)),
         {"help: measure into a bit register and cast it"});
  }
  if (qubits.is_scalar != one_bit) {
    fail(at, qubits.is_scalar ? "one qubit is measured into one bit, not into a register"
                              : "a register of qubits is measured into a register of bits");
  }
  if (base == Base::bits && qubits.wires.size() != target.type.width) {
    fail(at, fmt::format("{} qubits are measured into {} bits", qubits.wires.size(), target.type.width));
  }
  const bool is_whole = target.parts.empty() && target.running.empty();
  const auto parts = target.running.empty() ? parts_of(target) : std::vector<Part>{};
  const auto native_bits = [&](const Part& part) {
    return part.symbol->shape.empty() &&
           (part.symbol->type.base == Base::bit || part.symbol->type.base == Base::bits);
  };
  for (const Part& part : parts) move_to_native(*part.symbol, is_whole, at);
  for (std::size_t i = 0; i < qubits.wires.size(); ++i) {
    Operation op = circuit_.make(Kind::measure, {qubits.wires[i]});
    if (!parts.empty() && native_bits(parts[i])) {
      op.payload = circuit_.variables[parts[i].symbol->variable].first_bit + parts[i].bit;
      append(std::move(op), at);
      continue;
    }
    // Bits of numbers, and bits at a running index: by way of a bit of our own.
    const std::uint32_t bit = temporary({Base::bit, 0}, "measured", temporaries_.size() - 1);
    op.payload = circuit_.variables[bit].first_bit;
    append(std::move(op), at);
    Location one = target;
    if (!parts.empty()) one.parts = {parts[i]};
    if (!target.running.empty()) move_to_native(*target.symbol, false, at);
    if (is_whole && base == Base::boolean) one.parts.clear();
    one.is_one = true;
    emit_assignment(native_target(one), expression_of(variable_value(bit, {Base::bit, 0}), rules()), at);
  }
  mark_set(target.running.empty() ? target : whole(*target.symbol));
}

Value Reader::measured(const SyntaxExpression& expression, std::size_t frame) {
  const SyntaxExpression& operand = expression.arguments[0];
  Value result;
  with_splits(expression.at, {}, [&] {
    const Qubits qubits = qubits_of(operand);
    const Type type = qubits.is_scalar ? Type{Base::bit, 0}
                                       : Type{Base::bits, static_cast<std::uint32_t>(qubits.wires.size())};
    // Every arm of a split measures into the same bits.
    if (result.type != type) result = variable_value(temporary(type, "measured", frame), type);
    const Variable& variable = circuit_.variables[result.expression->variable];
    for (std::uint32_t i = 0; i < qubits.wires.size(); ++i) {
      Operation op = circuit_.make(Kind::measure, {qubits.wires[i]});
      op.payload = variable.first_bit + i;
      append(std::move(op), expression.at);
    }
  });
  return result;
}

void Reader::reset(const syntax::Reset& reset, syntax::Span at) {
  for (const std::uint32_t wire : qubits_of(reset.qubits).wires)
    append(circuit_.make(Kind::reset, {wire}), at);
}

void Reader::barrier(const syntax::Barrier& barrier, syntax::Span at) {
  std::vector<std::uint32_t> wires;
  for (const SyntaxExpression& operand : barrier.operands) {
    const Qubits qubits = qubits_of(operand);
    wires.insert(wires.end(), qubits.wires.begin(), qubits.wires.end());
  }
  if (barrier.operands.empty()) {
    const std::uint32_t all = capture_ != nullptr ? templates_.back().operands : circuit_.wires;
    for (std::uint32_t wire = 0; wire < all; ++wire) wires.push_back(wire);
  }
  std::sort(wires.begin(), wires.end());
  wires.erase(std::unique(wires.begin(), wires.end()), wires.end());
  if (!wires.empty()) emit(Kind::barrier, wires, {}, at);
}

// Classical statements.

void Reader::assign(const syntax::Assignment& assignment, syntax::Span at) {
  const std::string* name = base_name(assignment.target);
  if (name != nullptr) {
    const Symbol& symbol = found(*name, assignment.target.at, "variable");
    if (symbol.kind == Symbol::Kind::qubits) fail(assignment.target.at, "a qubit cannot be assigned");
  }
  const Location target = located(assignment.target);
  check_writable(target, assignment.target.at);
  if (!target.shape.empty()) {
    if (assignment.op != syntax::Operator::none)
      fail(at, "arrays are assigned as a whole, without an operator");
    return write_array(target, array_values(assignment.value, target.type, target.shape), at);
  }
  Value value = evaluated(assignment.value);
  if (assignment.op != syntax::Operator::none) {
    const Value before = read(target, assignment.target.at);
    value = at_place(at, [&] { return binary(syntax::spelling(assignment.op), before, value, rules()); });
  }
  if (target.type.base == Base::stretch)
    fail(assignment.target.at, "a stretch is found by the compiler, not assigned");
  write(target, assigned_value(value, target.type, assignment.value.at), at);
}

void Reader::emit_statement(ClassicalStatement statement, syntax::Span at) {
  Operation op;
  op.kind = Kind::classical;
  op.payload = static_cast<std::uint32_t>(circuit_.statements.size());
  circuit_.statements.push_back(std::move(statement));
  append(std::move(op), at);
}

void Reader::emit_assignment(Expression target, Expression value, syntax::Span at) {
  ClassicalStatement statement;
  statement.target = std::move(target);
  statement.value = std::move(value);
  emit_statement(std::move(statement), at);
}

}  // namespace isinglass
