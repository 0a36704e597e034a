// Large pages; see long_list.h.
#include "circuit/long_list.h"

#include <sys/mman.h>

#include <cstdint>

namespace isinglass {

void use_large_pages([[maybe_unused]] void* data, [[maybe_unused]] std::size_t bytes) {
#ifdef MADV_HUGEPAGE
  constexpr std::size_t large = std::size_t{1} << 21;
  constexpr std::size_t least = 2 * large;  // below, little is won and up to a page lost
  auto first = reinterpret_cast<std::uintptr_t>(data);
  const std::uintptr_t end = first + bytes;
  first = (first + large - 1) / large * large;
  if (end > first + least) madvise(reinterpret_cast<void*>(first), end - first, MADV_HUGEPAGE);
#endif
}

}  // namespace isinglass
