// Statements in, messages and the circuit out; versions, includes and the fast lane. See reader.h.
#include "language/reader.h"

#include <fmt/format.h>

#include <algorithm>
#include <cmath>
#include <filesystem>
#include <fstream>
#include <iterator>
#include <numbers>

#include "circuit/long_list.h"

namespace isinglass {

namespace {

constexpr std::size_t most_errors = 100;
constexpr std::size_t most_includes = 64;

constexpr std::array<std::string_view, 66> reserved_words = {
    "OPENQASM", "include",  "defcalgrammar", "def",    "cal",     "defcal",
    "gate",     "extern",   "box",           "let",    "break",   "continue",
    "if",       "else",     "end",           "return", "for",     "while",
    "in",       "pragma",   "input",         "output", "const",   "readonly",
    "mutable",  "qreg",     "qubit",         "creg",   "bool",    "bit",
    "int",      "uint",     "float",         "angle",  "complex", "array",
    "void",     "duration", "stretch",       "gphase", "inv",     "pow",
    "ctrl",     "negctrl",  "durationof",    "delay",  "reset",   "measure",
    "barrier",  "true",     "false",         "im",     "switch",  "case",
    "default",  "nop",      "ion",           "r",      "xx",      "U",
    "pi",       "tau",      "euler",         "sizeof", "real",    "imag"};

/// Whether text waits to be spoken about as a file next to another.
std::optional<std::string> file_contents(const std::filesystem::path& path) {
  std::error_code error;
  if (!std::filesystem::is_regular_file(path, error)) return std::nullopt;
  std::ifstream stream(path, std::ios::binary);
  if (!stream) return std::nullopt;
  return std::string(std::istreambuf_iterator<char>(stream), {});
}

bool is_old(const syntax::Statement& statement) {
  if (const auto* qubits = std::get_if<syntax::QubitDeclaration>(&statement.what)) return qubits->old_form;
  if (const auto* bits = std::get_if<syntax::Declaration>(&statement.what)) return bits->old_form;
  if (const auto* gate = std::get_if<syntax::GateDefinition>(&statement.what)) return gate->opaque;
  if (const auto* include = std::get_if<syntax::Include>(&statement.what))
    return include->path.ends_with("qelib1.inc");
  return false;
}

}  // namespace

Reading read(const std::string& file_name, std::string_view text, const ReadOptions& options) {
  Reader reader(options);
  return reader.run(file_name, text);
}

Reader::Reader(const ReadOptions& options) : options_(options) {
  for (const std::string_view word : reserved_words) native_names_.emplace(word);
  for (const LibraryGate& gate : library(Library::stdgates)) native_names_.emplace(gate.name);
}

Reading Reader::run(const std::string& file_name, std::string_view text) {
  try {
    const std::uint16_t source = sources_.add(file_name, text);
    include_stack_.push_back(file_name);
    // A flat file has one statement a semicolon, and a gate is rarely more than two operations; what is
    // reserved and never touched costs nothing.
    const auto semicolons = static_cast<std::size_t>(std::count(text.begin(), text.end(), ';'));
    reserve_long(circuit_.body(), std::min(2 * semicolons, options_.most_operations));
    read_statements(sources_, source, *this);
    if (version_ == 0) decide_version(31, {});
    if (!any_statement_ && errors_ == 0) report({{0, 1, 1, 1, source}, "the file holds no program", {}});
    finish();
  } catch (const Overflow& overflow) {
    report(overflow.trouble);
  } catch (const Failure& failure) {
    if (times_asked_ && !times_) throw;  // the caller's own trouble, not the source's
    messages_.insert(messages_.end(), failure.messages.begin(), failure.messages.end());
    ++errors_;
  } catch (const std::bad_alloc&) {
    report({{}, "this program needs more memory than there is", {}});
  }
  Reading reading;
  reading.version = version_;
  if (errors_ == 0) reading.circuit = std::move(circuit_);
  reading.messages = std::move(messages_);
  reading.annotations = std::move(annotations_);
  return reading;
}

// Messages.

void Reader::report(const Trouble& trouble) {
  ++errors_;
  if (trouble.text.empty()) return;
  const std::string key = fmt::format("{}:{}:{}", trouble.at.source, trouble.at.offset, trouble.text);
  if (!reported_.insert(key).second) return;
  if (sources_.size() == 0) {
    messages_.push_back({Message::Severity::error, {}, trouble.text, {}, 1, trouble.notes});
  } else {
    messages_.push_back(sources_.error(trouble.at, trouble.text, trouble.notes));
  }
  if (reported_.size() == most_errors) {
    throw Overflow{{trouble.at, "too many errors; reading ends here", {}}};
  }
}

void Reader::warn(syntax::Span at, std::string text, std::vector<std::string> notes) {
  const std::string key = fmt::format("w{}:{}:{}", at.source, at.offset, text);
  if (reported_.size() >= 4 * most_errors || !reported_.insert(key).second) return;
  messages_.push_back(sources_.warning(at, std::move(text), std::move(notes)));
}

void Reader::fail(syntax::Span at, std::string text, std::vector<std::string> notes) const {
  throw Trouble{at, std::move(text), std::move(notes)};
}

void Reader::throw_fault(syntax::Span at, const Fault& fault) const {
  std::vector<std::string> notes;
  if (!fault.help.empty()) notes.push_back("help: " + fault.help);
  throw Trouble{at, fault.text, std::move(notes)};
}

void Reader::count_step(syntax::Span at) {
  if (++steps_ > options_.most_steps) {
    throw Overflow{
        {at,
         fmt::format("more than {} steps while compiling", options_.most_steps),
         {"note: loops and calls whose course is known are run by the compiler; is this one endless?"}}};
  }
}

void Reader::syntax_message(Message message, std::vector<std::string> names) {
  any_statement_ = true;
  if (message.severity == Message::Severity::error) ++errors_;
  messages_.push_back(std::move(message));
  if (version_ == 0) return;
  for (std::string& name : names) {
    if (scopes_.find_anywhere(name) != nullptr) continue;
    Symbol symbol;
    symbol.name = std::move(name);
    scopes_.add(std::move(symbol));
  }
}

// Versions and files.

int Reader::language() const {
  return version_ == 0 ? 0 : (version_ == 20 ? 2 : 3);
}

void Reader::decide_version(int version, syntax::Span at) {
  version_ = version;
  if (!version_given_ && any_statement_) {
    if (at.line == 0) at = {0, 1, 1, 1, 0};
    warn(at, fmt::format("the version line is missing; read as OpenQASM {}.{}", version / 10, version % 10),
         {fmt::format("help: write `OPENQASM {}.{};` in the first line", version / 10, version % 10)});
  }
  declare_built_ins();
  scopes_.open();
}

int Reader::version_of(const syntax::Statement& statement) const {
  if (is_old(statement)) return 20;
  if (std::holds_alternative<syntax::Pragma>(statement.what)) return 0;
  if (std::holds_alternative<syntax::GateDefinition>(statement.what)) return 0;
  if (const auto* include = std::get_if<syntax::Include>(&statement.what)) {
    return include->path == "stdgates.inc" ? 31 : 0;
  }
  return 31;
}

void Reader::statement(syntax::Statement&& statement) {
  if (const auto* version = std::get_if<syntax::Version>(&statement.what)) {
    const bool in_include = include_stack_.size() > 1;
    if (in_include) {
      warn(statement.at, "a version line in an included file is ignored");
    } else if (any_statement_) {
      report({statement.at, "the version line must be the first statement", {}});
    } else {
      any_statement_ = true;
      declare_version(*version, statement.at);
    }
    return;
  }
  any_statement_ = true;
  if (version_ == 0) {
    const int version = version_of(statement);
    if (version == 0) {
      waiting_.push_back(std::move(statement));
      return;
    }
    decide_version(version, statement.at);
    for (syntax::Statement& earlier : std::exchange(waiting_, {})) take(std::move(earlier));
  }
  take(std::move(statement));
}

void Reader::declare_version(const syntax::Version& version, syntax::Span at) {
  version_given_ = true;
  if (version.major == 2 && version.minor == 0) return decide_version(20, at);
  if (version.major == 3) {
    if (version.minor > 2) {
      warn(at, fmt::format("OpenQASM 3.{} is not known; read as 3.2", version.minor));
    }
    return decide_version(30 + static_cast<int>(std::min(version.minor, 2u)), at);
  }
  report({at,
          fmt::format("OpenQASM {}.{} is not supported", version.major, version.minor),
          {"note: versions 2.0 and 3.0 to 3.2 are"}});
  decide_version(version.major == 2 ? 20 : 31, at);
}

void Reader::declare_built_ins() {
  const auto constant = [this](const char* name, double value) {
    Symbol symbol;
    symbol.kind = Symbol::Kind::constant;
    symbol.name = name;
    symbol.type = {Base::real, 64};
    symbol.cells = {of_real(value, symbol.type)};
    symbol.is_set = true;
    scopes_.add(std::move(symbol));
  };
  constant("pi", pi);
  if (version_ != 20) {
    constant("π", pi);
    constant("tau", 2 * pi);
    constant("τ", 2 * pi);
    constant("euler", std::numbers::e);
    constant("ℇ", std::numbers::e);
  }
  for (const LibraryGate& gate : library(version_ == 20 ? Library::built_in2 : Library::built_in3)) {
    Symbol symbol;
    symbol.kind = Symbol::Kind::gate;
    symbol.name = gate.name;
    symbol.gate = gate.gate;
    symbol.is_library = true;
    scopes_.add(std::move(symbol));
  }
}

void Reader::declare_library(Library which, syntax::Span at) {
  const bool version2 = version_ == 20;
  const char* file = which == Library::stdgates ? "stdgates.inc" : "qelib1.inc";
  for (const LibraryGate& gate : library(which)) {
    const Symbol* existing = scopes_.find_innermost(gate.name);
    if (existing != nullptr && existing->kind != Symbol::Kind::broken) {
      if (existing->is_library) {
        if (existing->gate == gate.gate) {
          fail(at, fmt::format("{} declares `{}` once more", file, gate.name),
               {"note: a second include repeats all declarations of the first"});
        }
        continue;
      }
      if (version2) continue;  // a definition that the file brings wins
      fail(at, fmt::format("{} declares `{}`, which is declared already", file, gate.name));
    }
    Symbol symbol;
    symbol.kind = Symbol::Kind::gate;
    symbol.name = gate.name;
    symbol.gate = gate.gate;
    symbol.is_library = true;
    symbol.at = at;
    scopes_.add(std::move(symbol));
  }
}

void Reader::include(const syntax::Include& include, syntax::Span at) {
  if (scopes_.depth() != 1 || block_ != 0) fail(at, "include is for the global scope only");
  if (include.path == "stdgates.inc") return declare_library(Library::stdgates, at);
  if (include.path == "qelib1.inc") return declare_library(Library::qelib1, at);
  const std::filesystem::path path(include.path);
  const std::filesystem::path beside = std::filesystem::path(include_stack_.back()).parent_path() / path;
  std::filesystem::path found = beside;
  auto contents = file_contents(beside);
  if (!contents) {
    found = path;
    contents = file_contents(path);
  }
  if (!contents) {
    if (path.filename() == "qelib1.inc") return declare_library(Library::qelib1, at);
    if (path.filename() == "stdgates.inc") return declare_library(Library::stdgates, at);
    fail(include.path_at, fmt::format("cannot read the included file \"{}\"", include.path),
         {fmt::format("note: sought as {} and in the current directory", beside.string())});
  }
  if (std::find(include_stack_.begin(), include_stack_.end(), found.string()) != include_stack_.end()) {
    fail(include.path_at, fmt::format("\"{}\" includes itself", include.path));
  }
  if (include_stack_.size() >= most_includes) fail(at, "includes nest too deep");
  include_stack_.push_back(found.string());
  const std::uint16_t source = sources_.keep(found.string(), std::move(*contents));
  ++generation_;  // the included text numbers its names anew
  read_statements(sources_, source, *this);
  ++generation_;
  include_stack_.pop_back();
}

/// Runs one statement of the global scope.
void Reader::take(syntax::Statement&& statement) {
  const bool lives_on = std::holds_alternative<syntax::Subroutine>(statement.what) ||
                        std::holds_alternative<syntax::Extern>(statement.what);
  if (lives_on) {
    kept_.push_back(std::move(statement));
    run_checked(kept_.back());
    return;
  }
  if (has_ended_) return;
  checked_.clear();
  if (run_checked(statement) == Ending::ends) has_ended_ = true;
}

/// What the program's variables hold at its end is its result: known values are told to it as well.
void Reader::finish_values() {
  const std::vector<Symbol*> globals = scopes_.globals();
  const bool any_output =
      std::any_of(globals.begin(), globals.end(), [](const Symbol* symbol) { return symbol->is_output; });
  const bool has_results = circuit_.measures();
  for (Symbol* symbol : globals) {
    if (symbol->kind != Symbol::Kind::variable || symbol->runs || !symbol->is_set) continue;
    const bool is_result = symbol->is_output || (!any_output && has_results);
    if (!is_result || symbol->type.base == Base::duration || symbol->type.base == Base::stretch) continue;
    try {
      move_to_native(*symbol);
    } catch (const Fault& fault) {
      report({symbol->at, fault.text, {}});
    }
  }
}

void Reader::finish() {
  if (errors_ > 0) return;
  if (!has_ended_) finish_values();
  solve_stretches();
  for (std::uint32_t block = 0; block < circuit_.blocks.size(); ++block) {
    Angle phase = phase_[block];
    if (phase.is_known()) phase.constant = wrapped(phase.constant);
    if (phase == Angle{}) continue;
    circuit_.blocks[block].push_back(circuit_.make(Kind::phase, {}, {phase}));
  }
}

// The fast lane: plain calls of gates at the outermost level.

bool Reader::plain_call(const PlainCall& call, const PlainNames& names) {
  if (has_ended_ || version_ == 0) return false;
  if (&names != plain_names_ || plain_generation_ != generation_) {
    plain_names_ = &names;
    plain_generation_ = generation_;
    plain_symbols_.clear();
  }
  if (plain_symbols_.size() < names.size()) plain_symbols_.resize(names.size());
  const auto symbol_of = [&](std::uint32_t number) -> const Symbol* {
    PlainSymbol& entry = plain_symbols_[number];
    if (!entry.is_known) entry = {scopes_.find(names[number]), true};
    return entry.symbol;
  };
  const Symbol* gate = symbol_of(call.gate);
  if (gate == nullptr || gate->kind != Symbol::Kind::gate || gate->gate == nullptr || gate->is_opaque ||
      !gate->derived.empty()) {
    return false;
  }
  if (call.angles.size() != gate->gate->parameters || call.operands.size() != gate->gate->operands)
    return false;
  if (call.uses_pi && pi_is_hidden_) return false;
  plain_wires_.clear();
  for (const PlainOperand& operand : call.operands) {
    const Symbol* reg = symbol_of(operand.name);
    if (reg == nullptr || reg->kind != Symbol::Kind::qubits) return false;
    if (operand.index == PlainOperand::whole) {
      if (!reg->is_scalar) return false;
      plain_wires_.push_back(reg->wires[0]);
    } else {
      if (reg->is_scalar || operand.index < 0 ||
          static_cast<std::size_t>(operand.index) >= reg->wires.size()) {
        return false;
      }
      plain_wires_.push_back(reg->wires[static_cast<std::size_t>(operand.index)]);
    }
  }
  for (std::size_t i = 1; i < plain_wires_.size(); ++i) {
    for (std::size_t j = 0; j < i; ++j) {
      if (plain_wires_[i] == plain_wires_[j]) return false;
    }
  }
  plain_angles_.clear();
  for (const double angle : call.angles) {
    if (!std::isfinite(angle)) return false;
    plain_angles_.push_back({angle, 0});
  }
  any_statement_ = true;
  emit_template(*gate->gate, plain_angles_, plain_wires_, call.at);
  return true;
}

}  // namespace isinglass
