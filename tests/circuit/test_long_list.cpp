// Room for long lists: what is in them stays, whatever pages they lie in.
#include <doctest/doctest.h>

#include <cstdint>
#include <numeric>

#include "circuit/long_list.h"

using namespace isinglass;

TEST_CASE("a list that grows into large pages keeps what it holds") {
  std::vector<std::uint32_t> list(5000);
  std::iota(list.begin(), list.end(), 7u);
  constexpr std::size_t long_one = 10'000'000;  // 40 MB: several large pages
  reserve_long(list, long_one);
  CHECK(list.capacity() >= long_one);
  const std::uint32_t* place = list.data();
  while (list.size() < long_one) list.push_back(7u + static_cast<std::uint32_t>(list.size()));
  CHECK(list.data() == place);
  std::size_t wrong = 0;
  for (std::size_t i = 0; i < list.size(); ++i) wrong += list[i] != 7 + i;
  CHECK(wrong == 0);
  reserve_long(list, 10);  // never shrinks
  CHECK(list.size() == long_one);
}
