// Fuzzer: programs that follow the grammar, each byte one choice in the derivation of a program. With the
// environment variable SHOW set, the program is written out: what a found input stands for.
#include <cstdio>

#include "program_writer.h"
#include "read_once.h"

extern "C" int LLVMFuzzerTestOneInput(const std::uint8_t* bytes, std::size_t size) {
  const std::string program = isinglass::fuzz::ProgramWriter(bytes, size).program();
  if (std::getenv("SHOW") != nullptr) std::fputs(program.c_str(), stdout);
  isinglass::fuzz::read_once(program);
  return 0;
}
