// The commands of the program: each file of this room adds one to the command line.
#pragma once

#include <CLI/CLI.hpp>

#include "circuit/message.h"

namespace isinglass {

/// Adds the command with its options and help. When the command line names it, its callback does the whole
/// job and stores the exit status; it throws Failure where the job cannot be done.
void add_compile(CLI::App& app, Exit& status);
void add_tally(CLI::App& app, Exit& status);
void add_guard(CLI::App& app, Exit& status);
void add_bind(CLI::App& app, Exit& status);
void add_verify(CLI::App& app, Exit& status);
void add_target(CLI::App& app, Exit& status);

/// The whole program: reads the command line, runs the command, prints messages, returns the exit status.
int run(int argc, const char* const* argv);

}  // namespace isinglass
