// Gates of the source that undo each other, or add up, before they are taken apart.
//
//     --*-----*--        -----
//     --*--*--*--   ==>  --*--        and rz(s) ... rz(t)  ==>  rz(s + t), with controls or without
//     --X--|--X--        --|--
//     -----X-----        --X--
//
// On every wire consecutive operations that act alike (all diagonal, all about one axis, ...) form a run and
// commute there. Two gates of one kind that lie in the same runs on all their wires meet. A sweep in which a
// gate vanished is followed by another. (Common practice.)
#include "passes/merge_gates.h"

#include <algorithm>
#include <cmath>
#include <map>

namespace isinglass {

namespace {

/// How an operation acts on one of its wires: equal manners commute.
struct Manner {
  enum class What : std::uint8_t { none, diagonal, about_axis, like_itself, exchanging };
  What what = What::none;
  Kind kind = Kind::phase;      // of like_itself
  double angle[3] = {0, 0, 0};  // about_axis: the axis' phase in [0, pi); like_itself: all angles
  std::uint32_t form[3] = {0, 0, 0};
  std::uint32_t partner = 0;  // exchanging: the other wire
  bool operator==(const Manner&) const = default;
};

Manner about_axis(Angle phi) {
  Manner manner;
  manner.what = Manner::What::about_axis;
  manner.angle[0] = phi.constant;
  manner.form[0] = phi.form;
  return manner;
}

/// How `op` acts on its target number `side`.
Manner manner_on_target(const Circuit& circuit, const Operation& op, int side) {
  Manner manner;
  switch (op.kind) {
    case Kind::z:
    case Kind::p:
    case Kind::rz:
    case Kind::zz:
      manner.what = Manner::What::diagonal;
      return manner;
    case Kind::x:
      return about_axis({});
    case Kind::y:
      return about_axis({pi / 2});
    case Kind::r:
      return about_axis(op.angle(1));
    case Kind::xx:
      return about_axis(op.angle(1 + side));
    case Kind::swap:
      manner.what = Manner::What::exchanging;
      manner.partner = circuit.targets(op)[1 - side];
      return manner;
    default:
      manner.what = Manner::What::like_itself;
      manner.kind = op.kind;
      std::copy(op.value, op.value + 3, manner.angle);
      std::copy(op.form, op.form + 3, manner.form);
      return manner;
  }
}

/// What must be equal of two gates that meet: kind, the angles that are no amounts, and the runs of the
/// wires.
struct Key {
  Kind kind;
  std::vector<std::uint64_t> runs;
  auto operator<=>(const Key&) const = default;
};

bool adds_up(Kind kind) {
  return kind == Kind::phase || kind == Kind::p || kind == Kind::rz || kind == Kind::r || kind == Kind::zz ||
         kind == Kind::xx;
}

/// Two of them are nothing. (u and the rest are left to the lowering.)
bool undoes_itself(Kind kind) {
  return kind == Kind::x || kind == Kind::y || kind == Kind::z || kind == Kind::h || kind == Kind::swap;
}

class Sweep {
 public:
  Sweep(Circuit& circuit, Block& block) : circuit_(circuit), block_(block), run_(circuit.wires) {}

  bool run() {
    std::vector<bool> is_gone(block_.size(), false);
    bool any = false;
    for (std::size_t i = 0; i < block_.size(); ++i) {
      Operation& op = block_[i];
      if (!op.is_unitary()) {
        fence(op);
        continue;
      }
      const Key key = key_of(op);
      if (!adds_up(op.kind) && !undoes_itself(op.kind)) continue;
      const auto [place, is_first] = home_.try_emplace(key, i);
      if (is_first) continue;
      Operation& home = block_[place->second];
      home.origin = circuit_.origins.merged(home.origin, op.origin);
      is_gone[i] = any = true;
      if (adds_up(op.kind)) {
        home.set_angle(0, circuit_.forms.sum(home.angle(0), op.angle(0)));
        if (!is_nothing(home)) continue;
      }
      is_gone[place->second] = true;
      home_.erase(place);
    }
    std::size_t kept = 0;
    for (std::size_t i = 0; i < block_.size(); ++i) {
      if (!is_gone[i]) block_[kept++] = block_[i];
    }
    block_.resize(kept);
    return any;
  }

 private:
  struct Run {
    std::uint64_t number = 0;
    Manner manner;
  };

  /// Rotations by 2 pi are -1, which matters under controls.
  bool is_nothing(const Operation& op) const {
    const bool is_phase = op.kind == Kind::phase || op.kind == Kind::p;
    return op.angle(0).is_known() &&
           is_multiple(op.value[0], is_phase || op.control_count() == 0 ? 2 * pi : 4 * pi, 1e-13);
  }

  void fence(const Operation& op) {
    // Control may leave the block at a classical statement or a branch: no gate moves across them.
    if (op.kind == Kind::classical || op.kind == Kind::branch) {
      for (Run& run : run_) run = {};
    }
    for (const std::uint32_t wire : circuit_.operands(op)) run_[wire] = {};
  }

  std::uint64_t enter(std::uint32_t wire, const Manner& manner) {
    Run& run = run_[wire];
    if (run.number == 0 || run.manner != manner) run = {++runs_, manner};
    return run.number;
  }

  Key key_of(const Operation& op) {
    Key key{op.kind, {}};
    Manner diagonal;
    diagonal.what = Manner::What::diagonal;
    const auto operands = circuit_.operands(op);
    const int controls = op.control_count();
    for (int i = 0; i < static_cast<int>(operands.size()); ++i) {
      const Manner manner = i < controls ? diagonal : manner_on_target(circuit_, op, i - controls);
      key.runs.push_back(enter(operands[static_cast<std::size_t>(i)], manner));
    }
    // Controls may stand in any order, and so may the wires of a gate that is symmetric.
    const bool is_symmetric = op.kind == Kind::phase || op.kind == Kind::p || op.kind == Kind::z;
    const auto first_target =
        key.runs.begin() + (is_symmetric ? static_cast<std::ptrdiff_t>(key.runs.size()) : controls);
    std::sort(key.runs.begin(), first_target);
    std::sort(first_target, key.runs.end());
    key.runs.push_back(static_cast<std::uint64_t>(controls));
    return key;
  }

  Circuit& circuit_;
  Block& block_;
  std::vector<Run> run_;
  std::map<Key, std::size_t> home_;
  std::uint64_t runs_ = 0;
};

}  // namespace

Circuit merge_gates(Circuit circuit, const PassContext& context) {
  const int most_sweeps = context.effort == Effort::quick ? 1 : 50;
  for (Block& block : circuit.blocks) {
    for (int sweep = 0; sweep < most_sweeps && Sweep(circuit, block).run(); ++sweep) {
    }
  }
  return circuit;
}

}  // namespace isinglass
