// Helpers for tests of what programs mean: reading, the values of constant expressions, messages, and the
// circuit that was read written out as a program again, for the tests' own interpreter.
#pragma once

#include <string>
#include <vector>

#include "language/language.h"

namespace isinglass::meaning {

/// The circuit of a program that must be read without errors; else the test fails with the messages.
Circuit circuit_of(const std::string& text);

/// All messages, printed without source lines: "2:5: error: ...", one a line.
std::string messages_of(const std::string& text);
/// Only the errors, or only the warnings.
std::vector<std::string> errors_of(const std::string& text);
std::vector<std::string> warnings_of(const std::string& text);

/// The value of a constant expression, as the angle of an rz; `before` is put in front of it.
double number(const std::string& expression, const std::string& before = {});
/// Whether a constant expression is true.
bool holds(const std::string& expression, const std::string& before = {});

/// The circuit as an OpenQASM 3 program with the source's registers and variables.
std::string program_of(const Circuit& circuit);

/// Largest difference between what a source does and what was read from it, by the tests' own interpreter
/// (support/interpreter.h), over all measurement outcomes and all inputs.
double deviation(const std::string& source);
/// The same for two programs.
double difference_of(const std::string& source, const std::string& written);

}  // namespace isinglass::meaning
