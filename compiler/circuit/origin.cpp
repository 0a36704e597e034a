// Sets of source lines; see origin.h.
#include "circuit/origin.h"

#include <algorithm>
#include <iterator>

namespace isinglass {

namespace {
constexpr std::uint32_t set_flag = 0x80000000u;
// A merged operation of a long program would else carry the whole program; the first lines tell enough.
constexpr std::size_t most_lines = 64;
}  // namespace

std::vector<std::uint32_t> Origins::lines(Origin origin) const {
  if (origin.code == 0) return {};
  if (origin.code & set_flag) return sets_[origin.code & ~set_flag];
  return {origin.code};
}

Origin Origins::merged(Origin a, Origin b) {
  if (a == b || b.code == 0) return a;
  if (a.code == 0) return b;
  const auto left = lines(a);
  const auto right = lines(b);
  std::vector<std::uint32_t> both;
  std::set_union(left.begin(), left.end(), right.begin(), right.end(), std::back_inserter(both));
  if (both.size() > most_lines) both.resize(most_lines);
  return intern(std::move(both));
}

Origin Origins::intern(std::vector<std::uint32_t> lines) {
  if (lines.size() == 1) return {lines[0]};
  const auto [place, is_new] = index_.try_emplace(lines, static_cast<std::uint32_t>(sets_.size()));
  if (is_new) sets_.push_back(std::move(lines));
  return {set_flag | place->second};
}

}  // namespace isinglass
