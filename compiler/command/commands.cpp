// The command line as a whole: help, version, errors and exit statuses.
#include "command/commands.h"

#include <fmt/format.h>

#include <iostream>
#include <new>

namespace isinglass {

namespace {

constexpr std::string_view about =
    "isinglass compiles quantum circuits (OpenQASM 3 and 2) for trapped-ion machines: Ising interactions of "
    "any\n"
    "angle between pairs of ions, one-qubit rotations, free changes of the Z frame. It places, times and "
    "costs\n"
    "the result, and checks it against the source before anything is written.";

constexpr std::string_view footer =
    "Exit status: 0 done; 1 the answer is no (over a limit, not equivalent); 2 wrong usage; 3 the source "
    "program\n"
    "is at fault; 4 the target cannot run it; 5 a file could not be read or written; 70 isinglass is at "
    "fault.\n"
    "A file named - is the standard input or output. `isinglass COMMAND --help` says more of each command.";

int parse(CLI::App& app, int argc, const char* const* argv) {
  try {
    app.parse(argc, argv);
    return -1;
  } catch (const CLI::Success& wish) {  // help or version was asked for
    return app.exit(wish);
  } catch (const CLI::ParseError& error) {
    std::cerr << "error: " << error.what() << "\n    help: isinglass --help lists commands and options\n";
    return static_cast<int>(Exit::usage);
  }
}

}  // namespace

int run(int argc, const char* const* argv) {
  Exit status = Exit::done;
  CLI::App app{std::string(about), "isinglass"};
  app.footer(std::string(footer));
  app.set_version_flag("--version", std::string("isinglass ") + ISINGLASS_VERSION);
  app.require_subcommand(1);
  add_compile(app, status);
  add_tally(app, status);
  add_guard(app, status);
  add_bind(app, status);
  add_verify(app, status);
  add_target(app, status);
  try {
    const int early = parse(app, argc, argv);
    return early >= 0 ? early : static_cast<int>(status);
  } catch (const Failure& failure) {
    for (const Message& message : failure.messages) std::cerr << printed(message);
    return static_cast<int>(failure.exit);
  } catch (const std::bad_alloc&) {
    std::cerr << "error: this machine has not enough memory for the job\n";
  } catch (const std::exception& error) {
    std::cerr << "error: isinglass itself is at fault: " << error.what() << "\n"
              << "    note: nothing was written\n";
  }
  return static_cast<int>(Exit::internal);
}

}  // namespace isinglass
