// Names, variables and their parts: where a value lives, how it is read and written. See reader.h.
#include <fmt/format.h>

#include <algorithm>
#include <numeric>

#include "language/reader.h"

namespace isinglass {

namespace {

constexpr std::uint64_t most_cells = 1'000'000;

std::uint32_t bits_of(Type type) {
  if (type.base == Base::bits || type.base == Base::integer || type.base == Base::natural ||
      type.base == Base::angle) {
    return type.width;
  }
  return 0;
}

bool has_bits(Type type) {
  return type.base == Base::bits || bits_of(type) > 0;
}

std::string type_text(Type type, const std::vector<std::uint32_t>& shape) {
  if (shape.empty()) return text_of(type);
  return fmt::format("array[{}, {}]", text_of(type), fmt::join(shape, ", "));
}

Expression variable_expression(std::uint32_t variable) {
  Expression expression;
  expression.kind = Expression::Kind::variable;
  expression.variable = variable;
  return expression;
}

Expression index_expression(Expression base, std::vector<Expression> indices) {
  Expression expression;
  expression.kind = Expression::Kind::index;
  expression.arguments = std::move(indices);
  expression.arguments.insert(expression.arguments.begin(), std::move(base));
  return expression;
}

Expression number(std::uint32_t value) {
  return literal(std::to_string(value));
}

}  // namespace

Symbol& Reader::declare(Symbol symbol) {
  const Symbol* existing = scopes_.find_innermost(symbol.name);
  bool replaced = existing != nullptr &&
                  (existing->kind == Symbol::Kind::broken || (version_ == 20 && existing->is_library));
  if (existing != nullptr && existing->is_library && !replaced && !symbol.is_callable()) {
    // The standard has one space of names; but short names are many, and the library's are not the user's.
    warn(symbol.at,
         fmt::format("`{}` hides the gate `{}` of the included library", symbol.name, symbol.name));
    replaced = true;
  }
  if (existing != nullptr && !replaced) {
    std::vector<std::string> notes;
    if (existing->is_library) {
      notes.push_back("note: it is a gate of the included library; all names share one space");
    } else if (existing->at.line > 0) {
      notes.push_back(fmt::format("note: first declared in line {}", existing->at.line));
    }
    fail(symbol.at, fmt::format("`{}` is declared already", symbol.name), std::move(notes));
  }
  symbol.is_global = scopes_.depth() == 1;
  if (symbol.is_global) {
    ++generation_;
    if (symbol.name == "pi") pi_is_hidden_ = true;
  }
  symbol.block = block_;
  return scopes_.add(std::move(symbol));
}

Symbol& Reader::found(std::string_view name, syntax::Span at, const char* what) {
  Symbol* symbol = scopes_.find(name);
  if (symbol != nullptr) {
    if (symbol->kind == Symbol::Kind::broken) throw Trouble{};
    return *symbol;
  }
  const Symbol* hidden = scopes_.find_anywhere(name);
  if (hidden != nullptr) {
    if (hidden->kind == Symbol::Kind::broken) throw Trouble{};
    fail(at, fmt::format("`{}` cannot be seen here", name),
         {"note: gates and subroutines see global constants, gates and subroutines only",
          "help: hand it over as an argument"});
  }
  std::vector<std::string> notes;
  const std::string similar = scopes_.similar(name, std::string_view(what) == "gate");
  if (!similar.empty()) notes.push_back(fmt::format("help: did you mean `{}`?", similar));
  if (similar.empty() && std::string_view(what) == "gate") {
    const Library file = version_ == 20 ? Library::qelib1 : Library::stdgates;
    for (const LibraryGate& gate : library(file)) {
      if (gate.name != name) continue;
      notes.push_back(fmt::format("help: it is a gate of {0}: write `include \"{0}\";`",
                                  version_ == 20 ? "qelib1.inc" : "stdgates.inc"));
    }
  }
  fail(at, fmt::format("{} `{}` is not declared", what, name), std::move(notes));
}

std::string Reader::native_name(const std::string& wanted, syntax::Span at) {
  std::string name = wanted;
  for (int i = 2; !native_names_.insert(name).second; ++i) name = fmt::format("{}_{}", wanted, i);
  if (name != wanted && at.line > 0) {
    warn(at,
         fmt::format("`{}` is called `{}` in the native program, where that name is taken", wanted, name));
  }
  return name;
}

// What an expression names.

Location Reader::whole(Symbol& symbol) {
  Location location;
  location.symbol = &symbol;
  location.type = symbol.type;
  location.shape = symbol.shape;
  location.is_one = !symbol.is_array();
  if (symbol.kind == Symbol::Kind::alias) {
    location.parts = symbol.parts;
    location.parts_are_bits = symbol.parts_are_bits;
    location.is_one = symbol.parts_are_bits && symbol.type.base == Base::bit;
  }
  return location;
}

Location Reader::located(const SyntaxExpression& expression) {
  if (expression.kind == SyntaxExpression::Kind::index) {
    return indexed(located(expression.arguments[0]), expression);
  }
  if (expression.kind == SyntaxExpression::Kind::binary && expression.op == syntax::Operator::concatenate) {
    return joined(expression);
  }
  if (expression.kind != SyntaxExpression::Kind::name) {
    fail(expression.at, "a variable, or a part of one, is expected here");
  }
  Symbol& symbol = found(expression.text, expression.at, "variable");
  if (symbol.kind == Symbol::Kind::qubits) {
    fail(expression.at,
         fmt::format("`{}` is made of qubits; a classical variable is expected here", expression.text),
         {"help: measure it into a bit first"});
  }
  if (symbol.is_callable()) {
    fail(expression.at, fmt::format("`{}` is no variable; a call needs parentheses", expression.text));
  }
  return whole(symbol);
}

/// Every bit or cell of what is named, in order.
std::vector<Part> Reader::parts_of(const Location& location) const {
  if (!location.parts.empty()) return location.parts;
  std::vector<Part> parts;
  if (!location.shape.empty()) {
    for (std::uint32_t cell = 0; cell < location.symbol->cells.size(); ++cell) {
      parts.push_back({location.symbol, cell, 0});
    }
    return parts;
  }
  const std::uint32_t bits = location.type.base == Base::bits ? location.type.width : 1;
  for (std::uint32_t bit = 0; bit < bits; ++bit) parts.push_back({location.symbol, 0, bit});
  return parts;
}

/// `a ++ b`: the left operand takes the low indices.
Location Reader::joined(const SyntaxExpression& expression) {
  const Location left = located(expression.arguments[0]);
  const Location right = located(expression.arguments[1]);
  const auto is_bits = [](const Location& side) {
    return side.running.empty() && side.shape.empty() &&
           (side.type.base == Base::bits || side.type.base == Base::bit);
  };
  Location result = left;
  result.parts = parts_of(left);
  const auto more = parts_of(right);
  result.parts.insert(result.parts.end(), more.begin(), more.end());
  if (is_bits(left) && is_bits(right)) {
    result.parts_are_bits = true;
    result.is_one = false;
    result.type = {Base::bits, static_cast<std::uint32_t>(result.parts.size())};
    return result;
  }
  const bool arrays = !left.shape.empty() && left.shape.size() == right.shape.size() &&
                      left.type == right.type &&
                      std::equal(left.shape.begin() + 1, left.shape.end(), right.shape.begin() + 1);
  if (!arrays)
    fail(expression.at, "`++` joins registers, or arrays that agree in all but their first dimension");
  result.shape[0] += right.shape[0];
  return result;
}

Location Reader::indexed(const Location& base, const SyntaxExpression& expression) {
  if (!base.shape.empty()) return indexed_cells(base, expression);
  if (expression.arguments.size() != 2) {
    fail(expression.at, fmt::format("{} has one dimension only", text_of(base.type)));
  }
  return indexed_bits(base, expression.arguments[1]);
}

Location Reader::indexed_cells(const Location& base, const SyntaxExpression& expression) {
  const std::size_t items = expression.arguments.size() - 1;
  const std::size_t dimensions = base.shape.size();
  if (items > dimensions) {
    fail(expression.at, fmt::format("{} indices for an array of {} dimension{}", items, dimensions,
                                    dimensions == 1 ? "" : "s"));
  }
  Location result = base;
  result.shape.clear();
  std::vector<std::vector<std::uint32_t>> chosen;
  std::vector<Expression> running;
  bool any_running = false;
  for (std::size_t d = 0; d < dimensions; ++d) {
    if (d >= items) {
      std::vector<std::uint32_t> all(base.shape[d]);
      std::iota(all.begin(), all.end(), 0u);
      chosen.push_back(std::move(all));
      result.shape.push_back(base.shape[d]);
      continue;
    }
    const SyntaxExpression& item = expression.arguments[d + 1];
    if (item.kind == SyntaxExpression::Kind::set) fail(item.at, "an array is not indexed by a set");
    if (item.kind != SyntaxExpression::Kind::range) {
      const Value index = evaluated(item);
      if (!index.is_known()) {
        any_running = true;
        running.push_back(expression_of(index, rules()));
        chosen.push_back({0});
        continue;
      }
    }
    bool is_one = true;
    chosen.push_back(indices(item, base.shape[d], is_one, "array"));
    if (is_one) {
      running.push_back(number(chosen.back()[0]));
    } else {
      result.shape.push_back(static_cast<std::uint32_t>(chosen.back().size()));
    }
  }
  if (any_running) {
    if (running.size() != dimensions || !base.parts.empty()) {
      fail(expression.at, "an index known only while running selects one cell of a whole array");
    }
    result.running = std::move(running);
    result.is_one = true;
    return result;
  }
  // Row-major: the last dimension runs fastest.
  std::vector<std::uint32_t> cells = {0};
  for (std::size_t d = 0; d < dimensions; ++d) {
    std::vector<std::uint32_t> next;
    for (const std::uint32_t cell : cells) {
      for (const std::uint32_t index : chosen[d]) next.push_back(cell * base.shape[d] + index);
    }
    cells = std::move(next);
  }
  result.parts.clear();
  for (const std::uint32_t cell : cells) {
    result.parts.push_back(base.parts.empty() ? Part{base.symbol, cell, 0} : base.parts[cell]);
  }
  result.parts_are_bits = false;
  result.is_one = result.shape.empty();
  return result;
}

Location Reader::indexed_bits(const Location& base, const SyntaxExpression& item) {
  const bool is_slice = base.parts_are_bits && !base.is_one;
  if (!is_slice && !has_bits(base.type)) {
    fail(item.at,
         base.type.base == Base::bit ? "a single bit has no index"
                                     : fmt::format("{} has no bits to index", text_of(base.type)),
         base.type.base == Base::bit ? std::vector<std::string>{}
                                     : std::vector<std::string>{"help: give the type a width"});
  }
  const auto size = is_slice ? static_cast<std::uint32_t>(base.parts.size()) : bits_of(base.type);
  Location result = base;
  result.parts_are_bits = true;
  const bool plain = item.kind != SyntaxExpression::Kind::range && item.kind != SyntaxExpression::Kind::set;
  if (plain) {
    const Value index = evaluated(item);
    if (!index.is_known()) {
      if (!base.parts.empty() || !base.running.empty()) {
        fail(item.at, "an index known only while running selects one bit of a whole variable");
      }
      if (index.type.base != Base::integer && index.type.base != Base::natural) {
        fail(item.at, fmt::format("an index is an integer, not {}", text_of(index.type)));
      }
      result.running = {expression_of(index, rules())};
      result.type = {Base::bit, 0};
      return result;
    }
  }
  if (!base.running.empty()) fail(item.at, "a cell chosen while running has no bits to index here");
  bool is_one = true;
  const auto chosen = indices(item, size, is_one, "register");
  std::vector<Part> parts;
  for (const std::uint32_t bit : chosen) {
    if (is_slice) {
      parts.push_back(base.parts[bit]);
    } else {
      parts.push_back({base.symbol, base.parts.empty() ? 0 : base.parts[0].cell, bit});
    }
  }
  if (!base.parts.empty() && !base.parts_are_bits) {
    for (Part& part : parts) part.symbol = base.parts[0].symbol;
  }
  result.parts = std::move(parts);
  result.is_one = is_one;
  result.type = is_one ? Type{Base::bit, 0} : Type{Base::bits, static_cast<std::uint32_t>(chosen.size())};
  return result;
}

// Reading.

Value Reader::variable_value(std::uint32_t variable, Type type) const {
  const auto fixed = fixed_variables_.find(variable);
  if (fixed != fixed_variables_.end()) return fixed->second;
  const Variable& native = circuit_.variables[variable];
  if (native.bits > 0 && !fixed_bits_.empty()) {
    Integer pattern;
    bool all = true;
    for (std::uint32_t i = 0; i < native.bits && all; ++i) {
      const auto bit = fixed_bits_.find(native.first_bit + i);
      all = bit != fixed_bits_.end();
      if (all) pattern.set_bit(i, bit->second);
    }
    if (all) {
      Value value = of_bits(std::move(pattern), native.bits);
      value.type = type;
      return value;
    }
  }
  return of_expression(variable_expression(variable), type, true);
}

Value Reader::bit_value(std::uint32_t variable, std::uint32_t bit) const {
  const Type type = {Base::bit, 0};
  const Variable& native = circuit_.variables[variable];
  const auto value_of = [type](bool truth) {
    Value value = of_bool(truth);
    value.type = type;
    return value;
  };
  if (native.bits > 0) {
    const auto fixed = fixed_bits_.find(native.first_bit + bit);
    if (fixed != fixed_bits_.end()) return value_of(fixed->second);
  }
  const auto whole_value = fixed_variables_.find(variable);
  if (whole_value != fixed_variables_.end()) {
    const Value& value = whole_value->second;
    return value_of(value.integer.is_negative() ? value.integer.modulo(value.type.width).bit(bit)
                                                : value.integer.bit(bit));
  }
  if (native.is_scalar) return of_expression(variable_expression(variable), type, true);
  return of_expression(index_expression(variable_expression(variable), {number(bit)}), type, true);
}

void Reader::warn_unset(Symbol& symbol, const std::vector<Part>& bits, syntax::Span at) {
  if (symbol.kind != Symbol::Kind::variable || symbol.name.empty()) return;
  if (!symbol.is_set) {
    warn(at, fmt::format("`{}` is read before anything was assigned to it; taken as 0", symbol.name));
    symbol.is_set = true;
    std::fill(symbol.set_bits.begin(), symbol.set_bits.end(), true);
    return;
  }
  if (symbol.set_bits.empty()) return;
  const auto check = [&](std::uint32_t bit) {
    if (symbol.set_bits[bit]) return;
    symbol.set_bits[bit] = true;
    warn(at, fmt::format("bit {} of `{}` is read before anything was assigned to it; taken as 0", bit,
                         symbol.name));
  };
  if (bits.empty()) {
    for (std::uint32_t i = 0; i < symbol.set_bits.size(); ++i) {
      if (!symbol.set_bits[i]) return check(i);
    }
  }
  for (const Part& part : bits) check(part.bit);
}

Value Reader::read_symbol(Symbol& symbol, syntax::Span at) {
  if (symbol.kind != Symbol::Kind::constant) read_variable_ = true;
  if (symbol.is_array())
    fail(at, fmt::format("`{}` is an array; a single value is expected here", symbol.name));
  warn_unset(symbol, {}, at);
  if (symbol.runs) return variable_value(symbol.variable, symbol.type);
  return symbol.cells[0];
}

Expression Reader::native_cell(const Symbol& symbol, std::uint32_t cell) const {
  if (!symbol.is_array()) return variable_expression(symbol.variable);
  std::vector<Expression> indices(symbol.shape.size());
  for (std::size_t d = symbol.shape.size(); d-- > 0;) {
    indices[d] = number(cell % symbol.shape[d]);
    cell /= symbol.shape[d];
  }
  return index_expression(variable_expression(symbol.variable), std::move(indices));
}

/// Bits of one variable that stand in equal steps, as one native index.
std::optional<Expression> Reader::native_bits(const std::vector<Part>& parts) const {
  const Symbol& symbol = *parts[0].symbol;
  const auto step = parts.size() > 1 ? static_cast<std::int64_t>(parts[1].bit) - parts[0].bit : 1;
  for (std::size_t i = 0; i < parts.size(); ++i) {
    if (parts[i].symbol != &symbol || parts[i].cell != parts[0].cell) return std::nullopt;
    if (parts[i].bit != parts[0].bit + step * static_cast<std::int64_t>(i)) return std::nullopt;
  }
  if (step == 0) return std::nullopt;
  Expression range;
  range.kind = Expression::Kind::range;
  Expression by = step < 0 ? operation("-", {literal(std::to_string(-step))}) : literal(std::to_string(step));
  range.arguments = {number(parts.front().bit), std::move(by), number(parts.back().bit)};
  return index_expression(native_cell(symbol, parts[0].cell), {std::move(range)});
}

Value Reader::read_bits(const Location& location, syntax::Span at) {
  for (const Part& part : location.parts) {
    warn_unset(*part.symbol, {part}, at);
    if (part.symbol->kind != Symbol::Kind::constant) read_variable_ = true;
  }
  std::vector<Value> bits;
  bool all_known = true;
  for (const Part& part : location.parts) {
    Symbol& symbol = *part.symbol;
    if (symbol.runs) {
      bits.push_back(symbol.is_array()
                         ? of_expression(index_expression(native_cell(symbol, part.cell), {number(part.bit)}),
                                         {Base::bit, 0}, true)
                         : bit_value(symbol.variable, part.bit));
    } else {
      const Value& value = symbol.cells[part.cell];
      if (value.is_known()) {
        const Integer pattern =
            value.integer.is_negative() ? value.integer.modulo(value.type.width) : value.integer;
        Value bit = of_bool(pattern.bit(part.bit));
        bit.type = {Base::bit, 0};
        bits.push_back(std::move(bit));
      } else {
        bits.push_back(of_expression(index_expression(expression_of(value, rules()), {number(part.bit)}),
                                     {Base::bit, 0}, value.runs));
      }
    }
    all_known = all_known && bits.back().is_known();
  }
  if (location.is_one) return bits[0];
  const auto width = static_cast<std::uint32_t>(bits.size());
  if (all_known) {
    Integer pattern;
    for (std::uint32_t i = 0; i < width; ++i) pattern.set_bit(i, !bits[i].integer.is_zero());
    return of_bits(std::move(pattern), width);
  }
  const Symbol& first = *location.parts[0].symbol;
  if (first.runs) {
    if (auto expression = native_bits(location.parts)) {
      return of_expression(std::move(*expression), location.type, true);
    }
  }
  // Scattered bits: gathered in a register of their own.
  const std::uint32_t gathered = temporary(location.type, "gathered", temporaries_.size() - 1);
  for (std::uint32_t i = 0; i < width; ++i) {
    emit_assignment(index_expression(variable_expression(gathered), {number(i)}),
                    expression_of(bits[i], rules()), at);
  }
  return of_expression(variable_expression(gathered), location.type, true);
}

Value Reader::read(const Location& location, syntax::Span at) {
  Symbol& symbol = *location.symbol;
  if (!location.running.empty()) {
    read_variable_ = true;
    if (!location.is_one) fail(at, "a single value is expected here");
    if (!symbol.runs && symbol.block == block_ && symbol.kind == Symbol::Kind::variable) {
      move_to_native(symbol, false, at);
    }
    if (symbol.runs) {
      return of_expression(index_expression(variable_expression(symbol.variable), location.running),
                           location.type, true);
    }
    if (symbol.kind == Symbol::Kind::input && !symbol.is_array()) {
      return of_expression(index_expression(expression_of(symbol.cells[0], rules()), location.running),
                           location.type, true);
    }
    // A constant or a variable of outside: its value in a variable of its own.
    const std::uint32_t copy = temporary_array(symbol, at);
    return of_expression(index_expression(variable_expression(copy), location.running), location.type, true);
  }
  if (location.parts.empty()) return read_symbol(symbol, at);
  if (location.parts_are_bits) return read_bits(location, at);
  if (!location.is_one) fail(at, "an array is no single value");
  const Part& part = location.parts[0];
  Symbol& owner = *part.symbol;
  if (owner.kind != Symbol::Kind::constant) read_variable_ = true;
  warn_unset(owner, {}, at);
  if (!owner.runs) return owner.cells[part.cell];
  return of_expression(native_cell(owner, part.cell), location.type, true);
}

/// A native copy of a variable whose value is known, for reading at a running index.
std::uint32_t Reader::temporary_array(Symbol& symbol, syntax::Span at) {
  const auto key =
      std::make_pair(static_cast<const void*>(&temporaries_), type_text(symbol.type, symbol.shape));
  auto& free = free_variables_[key];
  std::uint32_t copy = no_variable;
  if (!free.empty()) {
    copy = free.back();
    free.pop_back();
  } else {
    copy = add_variable("copy", "", symbol.type, symbol.shape, {});
  }
  temporaries_.back().push_back(copy);
  for (std::uint32_t cell = 0; cell < symbol.cells.size(); ++cell) {
    Symbol shadow;
    shadow.shape = symbol.shape;
    shadow.variable = copy;
    emit_assignment(native_cell(shadow, cell), expression_of(symbol.cells[cell], rules()), at);
  }
  return copy;
}

// Native variables.

std::uint32_t Reader::add_variable(const std::string& name, const std::string& source, Type type,
                                   const std::vector<std::uint32_t>& shape, syntax::Span at) {
  if (type.base == Base::duration || type.base == Base::stretch) {
    throw Fault{"a duration must be known while compiling", {}};
  }
  const std::string native = native_name(name, at);
  std::uint32_t variable = 0;
  if ((type.base == Base::bit || type.base == Base::bits) && shape.empty()) {
    variable = add_bits(circuit_, native, type.base == Base::bit ? 1 : type.width, type.base == Base::bit);
  } else {
    Variable added;
    added.name = native;
    added.type = type_text(type, shape);
    circuit_.variables.push_back(std::move(added));
    variable = static_cast<std::uint32_t>(circuit_.variables.size() - 1);
  }
  circuit_.variables[variable].source = source;
  return variable;
}

std::uint32_t Reader::native_variable(Symbol& symbol) {
  if (symbol.variable != no_variable) return symbol.variable;
  auto& free = free_variables_[{symbol.declaration, type_text(symbol.type, symbol.shape)}];
  if (!symbol.is_global && !free.empty()) {
    symbol.variable = free.back();
    free.pop_back();
    return symbol.variable;
  }
  symbol.variable = add_variable(symbol.name, symbol.is_global ? symbol.name : "", symbol.type, symbol.shape,
                                 symbol.is_global ? symbol.at : syntax::Span{});
  circuit_.variables[symbol.variable].is_output = symbol.is_output;
  return symbol.variable;
}

void Reader::move_to_native(Symbol& symbol, bool overwritten, syntax::Span at) {
  if (symbol.runs) return;
  if (symbol.kind != Symbol::Kind::variable) return;
  native_variable(symbol);
  const bool is_fresh = symbol.is_global && !symbol.was_native;
  symbol.runs = true;
  symbol.was_native = true;
  if (overwritten || !symbol.is_set) return;
  for (std::uint32_t cell = 0; cell < symbol.cells.size(); ++cell) {
    const Value& value = symbol.cells[cell];
    // Variables start as zero, so a zero at the start of the program need not be said.
    const bool is_zero =
        value.is_known() && value.integer.is_zero() && value.real == 0 && value.imaginary == 0;
    if (is_fresh && is_zero) continue;
    emit_assignment(native_cell(symbol, cell), expression_of(value, rules()), at);
  }
}

std::uint32_t Reader::temporary(Type type, const std::string& stem, std::size_t frame) {
  auto& free = free_variables_[{&temporaries_, text_of(type)}];
  std::uint32_t variable = no_variable;
  if (!free.empty()) {
    variable = free.back();
    free.pop_back();
  } else {
    variable = add_variable(stem, "", type, {}, {});
  }
  temporaries_[frame].push_back(variable);
  return variable;
}

Value Reader::kept(const Value& value, const std::string& stem) {
  if (!value.runs) return value;
  const std::uint32_t variable = temporary(value.type, stem, temporaries_.size() - 1);
  emit_assignment(variable_expression(variable), expression_of(value, rules()), {});
  return of_expression(variable_expression(variable), value.type, true);
}

void Reader::close_scope() {
  for (const auto& symbol : scopes_.innermost()) {
    if (symbol->variable == no_variable || symbol->is_global) continue;
    free_variables_[{symbol->declaration, type_text(symbol->type, symbol->shape)}].push_back(
        symbol->variable);
  }
  scopes_.close();
}

// Writing.

void Reader::check_writable(const Location& location, syntax::Span at) {
  const auto check = [&](const Symbol& symbol) {
    if (symbol.kind == Symbol::Kind::constant) fail(at, fmt::format("`{}` is constant", symbol.name));
    if (symbol.kind == Symbol::Kind::input)
      fail(at, fmt::format("`{}` is an input; it cannot be assigned", symbol.name));
    if (symbol.is_readonly) fail(at, fmt::format("`{}` is readonly here", symbol.name));
  };
  check(*location.symbol);
  for (const Part& part : location.parts) check(*part.symbol);
}

void Reader::mark_set(const Location& location) {
  if (location.parts.empty()) {
    location.symbol->is_set = true;
    std::fill(location.symbol->set_bits.begin(), location.symbol->set_bits.end(), true);
    return;
  }
  for (const Part& part : location.parts) {
    part.symbol->is_set = true;
    if (location.parts_are_bits && part.bit < part.symbol->set_bits.size())
      part.symbol->set_bits[part.bit] = true;
  }
}

Value Reader::assigned_value(const Value& value, Type type, syntax::Span at) {
  return at_place(at, [&] {
    bool narrowed = false;
    Value result = converted(value, type, rules(), &narrowed);
    if (narrowed) {
      warn(at, fmt::format("the value changes when it becomes {}", text_of(type)));
    } else if (value.type.base == Base::real && (type.base == Base::integer || type.base == Base::natural)) {
      warn(at,
           fmt::format("{} is converted to {} and loses its fraction", text_of(value.type), text_of(type)),
           {fmt::format("help: write the cast, {}(...)", text_of(type))});
    }
    return result;
  });
}

Expression Reader::native_target(const Location& location) const {
  const Symbol& symbol = *location.symbol;
  if (!location.running.empty())
    return index_expression(variable_expression(symbol.variable), location.running);
  if (location.parts.empty()) return variable_expression(symbol.variable);
  const Part& part = location.parts[0];
  Expression cell = native_cell(*part.symbol, part.cell);
  if (!location.parts_are_bits || part.symbol->type.base == Base::bit) return cell;
  return index_expression(std::move(cell), {number(part.bit)});
}

/// `value` has the location's type already.
void Reader::write(const Location& location, const Value& value, syntax::Span at) {
  Symbol& symbol = *location.symbol;
  if (!location.running.empty()) {
    move_to_native(symbol, false, at);
    mark_set(whole(symbol));
    return emit_assignment(native_target(location), expression_of(value, rules()), at);
  }
  if (!location.parts.empty()) return write_parts(location, value, at);
  const bool here = symbol.block == block_;
  mark_set(location);
  if (here && !value.runs) {
    symbol.cells[0] = value;
    symbol.runs = false;
    return;
  }
  // The value may mention the variable itself: it is told before the variable moves.
  Expression source = expression_of(value, rules());
  move_to_native(symbol, true, at);
  emit_assignment(native_target(location), std::move(source), at);
}

void Reader::write_parts(const Location& location, const Value& value, syntax::Span at) {
  bool all_here = value.is_known();
  for (const Part& part : location.parts) {
    const Symbol& owner = *part.symbol;
    const bool known_cell = !owner.runs && (!location.parts_are_bits || owner.cells[part.cell].is_known());
    all_here = all_here && owner.block == block_ && known_cell;
  }
  if (!all_here && !location.parts_are_bits && location.is_one && !value.runs) {
    const Part& part = location.parts[0];
    all_here = part.symbol->block == block_ && !part.symbol->runs;
  }
  if (all_here) {
    mark_set(location);
    if (!location.parts_are_bits) {
      location.parts[0].symbol->cells[location.parts[0].cell] = value;
      return;
    }
    for (std::size_t i = 0; i < location.parts.size(); ++i) {
      const Part& part = location.parts[i];
      Value& cell = part.symbol->cells[part.cell];
      const bool bit = location.is_one ? !value.integer.is_zero() : value.integer.bit(i);
      if (cell.type.base == Base::integer && cell.type.width > 0) {
        Integer pattern = cell.integer.modulo(cell.type.width);
        pattern.set_bit(part.bit, bit);
        cell.integer = pattern.wrapped(cell.type.width);
      } else {
        cell.integer.set_bit(part.bit, bit);
      }
    }
    return;
  }
  for (const Part& part : location.parts) move_to_native(*part.symbol, false, at);
  mark_set(location);
  if (location.is_one) return emit_assignment(native_target(location), expression_of(value, rules()), at);
  if (auto target = native_bits(location.parts)) {
    return emit_assignment(std::move(*target), expression_of(value, rules()), at);
  }
  const Expression source = expression_of(kept(value, "scattered"), rules());
  for (std::uint32_t i = 0; i < location.parts.size(); ++i) {
    Location one = location;
    one.parts = {location.parts[i]};
    one.is_one = true;
    Expression bit =
        value.is_known() ? literal(value.integer.bit(i) ? "1" : "0") : index_expression(source, {number(i)});
    emit_assignment(native_target(one), std::move(bit), at);
  }
}

// Arrays.

std::vector<Value> Reader::array_values(const SyntaxExpression& expression, Type type,
                                        const std::vector<std::uint32_t>& shape) {
  std::uint64_t count = 1;
  for (const std::uint32_t size : shape) count *= size;
  if (count > most_cells) fail(expression.at, fmt::format("an array has at most {} cells", most_cells));
  std::vector<Value> values;
  if (expression.kind == SyntaxExpression::Kind::set) {
    if (expression.arguments.size() != shape[0]) {
      fail(expression.at,
           fmt::format("{} elements for a dimension of {}", expression.arguments.size(), shape[0]));
    }
    const std::vector<std::uint32_t> rest(shape.begin() + 1, shape.end());
    for (const SyntaxExpression& element : expression.arguments) {
      if (rest.empty()) {
        values.push_back(assigned_value(evaluated(element), type, element.at));
      } else {
        auto inner = array_values(element, type, rest);
        values.insert(values.end(), inner.begin(), inner.end());
      }
    }
    return values;
  }
  if (expression.kind == SyntaxExpression::Kind::binary && expression.op == syntax::Operator::concatenate) {
    // The left operand comes first; both share all further dimensions.
    for (const SyntaxExpression& side : expression.arguments) {
      const Location part = located(side);
      if (part.shape.size() != shape.size() ||
          !std::equal(shape.begin() + 1, shape.end(), part.shape.begin() + 1)) {
        fail(side.at, "arrays are joined along their first dimension; the others must agree");
      }
      auto inner = array_values(side, type, part.shape);
      values.insert(values.end(), inner.begin(), inner.end());
    }
    if (values.size() != count)
      fail(expression.at, "the joined arrays do not have the size that is expected");
    return values;
  }
  const Location location = located(expression);
  if (location.shape != shape) {
    fail(expression.at, location.shape.empty()
                            ? "an array is expected here"
                            : fmt::format("an array of shape [{}] is expected, not [{}]",
                                          fmt::join(shape, ", "), fmt::join(location.shape, ", ")));
  }
  for (std::uint32_t cell = 0; cell < count; ++cell) {
    Location one = location;
    one.shape.clear();
    one.is_one = true;
    one.parts = {location.parts.empty() ? Part{location.symbol, cell, 0} : location.parts[cell]};
    values.push_back(assigned_value(read(one, expression.at), type, expression.at));
  }
  return values;
}

void Reader::write_array(const Location& location, const std::vector<Value>& values, syntax::Span at) {
  // Values that only the running program knows may be cells of this very array: they are saved first.
  std::vector<Value> saved;
  for (const Value& value : values) saved.push_back(kept(value, "cell"));
  for (std::uint32_t cell = 0; cell < saved.size(); ++cell) {
    Location one = location;
    one.shape.clear();
    one.is_one = true;
    one.parts = {location.parts.empty() ? Part{location.symbol, cell, 0} : location.parts[cell]};
    write_parts(one, saved[cell], at);
  }
}

}  // namespace isinglass
