// Fuzzer: any bytes as a program.
#include "read_once.h"

extern "C" int LLVMFuzzerTestOneInput(const std::uint8_t* bytes, std::size_t size) {
  isinglass::fuzz::read_once({reinterpret_cast<const char*>(bytes), size});
  return 0;
}
