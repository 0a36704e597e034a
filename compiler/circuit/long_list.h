// Room for long lists. In small pages the first touch of each would cost more than what is written to it.
#pragma once

#include <cstddef>
#include <vector>

namespace isinglass {

/// Asks the system for large pages under `bytes` bytes at `data`, where it has them and it is worth it. What
/// is stored there stays as it is.
void use_large_pages(void* data, std::size_t bytes);

/// list.reserve(count), in large pages where that is worth it.
template <typename List>
void reserve_long(List& list, std::size_t count) {
  if (count <= list.capacity()) return;
  list.reserve(count);
  use_large_pages(list.data(), count * sizeof(typename List::value_type));
}

}  // namespace isinglass
