// See merge_distant.h.
#include "passes/merge_distant.h"

#include <cmath>
#include <unordered_map>

#include "algebra/tableau.h"
#include "passes/local_rotations.h"

namespace isinglass {

namespace {

bool vanishes(Angle angle) {
  return angle.is_known() && is_multiple(angle.constant, 2 * pi);
}

/// Numbers the wires of a piece from 0 in the order they occur.
std::vector<std::uint32_t> numbered_wires(const std::vector<LocalRotation>& piece, std::uint32_t wires,
                                          std::size_t& count) {
  std::vector<std::uint32_t> number(wires, 0xffffffffu);
  count = 0;
  for (const LocalRotation& rotation : piece) {
    for (int side = 0; side <= static_cast<int>(rotation.is_pair()); ++side) {
      std::uint32_t& n = number[rotation.wire[side]];
      if (n == 0xffffffffu) n = static_cast<std::uint32_t>(count++);
    }
  }
  return number;
}

/// The rotations that are not Clifford, as strings seen from the start of the piece, with a way to find
/// equals.
class Seen {
 public:
  explicit Seen(std::size_t look_back) : look_back_(look_back) {}

  /// The place of an earlier rotation about the same letters that can be reached from the end.
  std::optional<std::size_t> reachable(const PauliString& string) const {
    const auto found = last_.find(string.hash_of_letters());
    if (found == last_.end()) return std::nullopt;
    std::size_t steps = 0;
    for (std::size_t i = strings_.size(); i-- > found->second;) {
      if (strings_[i].qubits() == 0) continue;  // merged into another
      if (strings_[i].same_letters(string)) return i;
      if (++steps > look_back_ || !strings_[i].commutes_with(string)) return std::nullopt;
    }
    return std::nullopt;
  }
  const PauliString& operator[](std::size_t i) const { return strings_[i]; }
  void add(PauliString string) {
    last_[string.hash_of_letters()] = strings_.size();
    strings_.push_back(std::move(string));
  }
  void forget(std::size_t i) { strings_[i] = PauliString(); }

 private:
  std::size_t look_back_;
  std::vector<PauliString> strings_;
  std::unordered_map<std::size_t, std::size_t> last_;
};

/// One round over the piece, until the deadline; returns whether anything merged.
bool merge_once(Circuit& circuit, std::vector<LocalRotation>& piece, std::size_t look_back,
                const PassContext& context) {
  std::size_t wires = 0;
  const auto number = numbered_wires(piece, circuit.wires, wires);
  Tableau before(wires);  // conjugation by the inverse of the Clifford so far
  Seen seen(look_back);
  std::vector<std::size_t> place;  // of a seen rotation in the piece
  bool merged = false;
  for (std::size_t i = 0; i < piece.size(); ++i) {
    if (i % 256 == 0 && context.out_of_time()) break;
    LocalRotation& rotation = piece[i];
    const std::size_t a = number[rotation.wire[0]], b = rotation.is_pair() ? number[rotation.wire[1]] : a;
    if (const auto quarters = quarters_of(rotation.angle)) {
      PauliString axis = PauliString::single(wires, a, rotation.letter[0]);
      if (rotation.is_pair()) axis.set(b, rotation.letter[1]);
      before.prepend(axis, 4 - *quarters);
      continue;
    }
    PauliString string = before.image(a, rotation.letter[0], b, rotation.letter[1]);
    const auto earlier = seen.reachable(string);
    if (!earlier) {
      seen.add(std::move(string));
      place.push_back(i);
      continue;
    }
    LocalRotation& target = piece[place[*earlier]];
    const bool opposite = seen[*earlier].negative != string.negative;
    target.angle = opposite ? circuit.forms.difference(target.angle, rotation.angle)
                            : circuit.forms.sum(target.angle, rotation.angle);
    target.origin = circuit.origins.merged(target.origin, rotation.origin);
    rotation.angle = {};
    if (vanishes(target.angle)) seen.forget(*earlier);
    merged = true;
  }
  if (merged) std::erase_if(piece, [](const LocalRotation& rotation) { return vanishes(rotation.angle); });
  return merged;
}

}  // namespace

Circuit merge_distant_rotations(Circuit circuit, const PassContext& context) {
  const bool is_quick = context.effort == Effort::quick;
  const std::size_t look_back = is_quick ? 200 : 5000;
  const int most_rounds = is_quick ? 2 : 10;
  rewrite_pieces(circuit, [&](Circuit& owner, std::vector<LocalRotation> piece, bool) {
    bool changed = false;
    for (int round = 0; round < most_rounds && merge_once(owner, piece, look_back, context); ++round) {
      changed = true;
    }
    return changed ? std::optional<RewrittenPiece>({std::move(piece), {}}) : std::nullopt;
  });
  return circuit;
}

}  // namespace isinglass
