// List scheduling; see list_schedule.h.
#include "targets/list_schedule.h"

#include <algorithm>
#include <queue>

#include "circuit/long_list.h"
#include "targets/dependence.h"

namespace isinglass {

namespace {

/// What an operation occupies besides its ions.
enum class Need : std::uint8_t { nothing, pulse, interaction, reading, deciding };

Need need_of(Kind kind) {
  switch (kind) {
    case Kind::r:
      return Need::pulse;
    case Kind::xx:
      return Need::interaction;
    case Kind::measure:
    case Kind::reset:
      return Need::reading;
    case Kind::branch:
      return Need::deciding;
    default:
      return Need::nothing;
  }
}

std::uint32_t beams_of(Need need) {
  return need == Need::interaction ? 2 : need == Need::pulse ? 1 : 0;
}

double duration(const Circuit& circuit, const Operation& op, const Target& target,
                const std::vector<double>& arm_us) {
  switch (op.kind) {
    case Kind::r:
      return target.ion[op.operand[0]].pulse_us;
    case Kind::xx:
      return target.pair(op.operand[0], op.operand[1]).takes_us;
    case Kind::measure:
      return target.ion[op.operand[0]].measure_us;
    case Kind::reset:
      return target.ion[op.operand[0]].reset_us;
    case Kind::delay:
      return std::max(op.value[0], 0.0);
    case Kind::branch: {
      double longest = 0;
      for (const Branch::Arm& arm : circuit.branches[op.payload].arms) {
        longest = std::max(longest, arm_us[arm.block]);
      }
      return target.feed_forward_us + longest;
    }
    default:
      return 0;
  }
}

/// Ready operations, the most urgent on top; equal ones in the order of the program.
class Ready {
  auto later() const {
    return [this](std::uint32_t a, std::uint32_t b) {
      return urgency_[a] != urgency_[b] ? urgency_[a] < urgency_[b] : a > b;
    };
  }

 public:
  explicit Ready(const std::vector<double>& urgency) : urgency_(urgency) {}

  bool is_empty() const { return heap_.empty(); }
  std::uint32_t top() const { return heap_.front(); }
  double urgency() const { return heap_.empty() ? -1 : urgency_[heap_.front()]; }
  void push(std::uint32_t op) {
    heap_.push_back(op);
    std::push_heap(heap_.begin(), heap_.end(), later());
  }
  std::uint32_t pop() {
    std::pop_heap(heap_.begin(), heap_.end(), later());
    const std::uint32_t op = heap_.back();
    heap_.pop_back();
    return op;
  }

 private:
  const std::vector<double>& urgency_;
  std::vector<std::uint32_t> heap_;
};

class ListScheduler {
 public:
  ListScheduler(const Circuit& circuit, const Block& block, const Target& target,
                const std::vector<double>& arm_us)
      : block_(block), target_(target), graph_(circuit, block), waits_for_(graph_.predecessors) {
    reserve_long(times_.at, block.size());
    times_.at.assign(block.size(), 0);
    reserve_long(times_.takes, block.size());
    reserve_long(times_.order, block.size());
    reserve_long(urgency_, block.size());
    for (const Operation& op : block) times_.takes.push_back(duration(circuit, op, target, arm_us));
    urgency_ = times_.takes;
    for (std::size_t i = block.size(); i-- > 0;) {
      double longest = 0;
      for (const std::uint32_t next : graph_.followers(i)) longest = std::max(longest, urgency_[next]);
      urgency_[i] += longest;
    }
  }

  BlockTimes run(double begin) {
    now_ = begin;
    times_.end = begin;
    for (std::uint32_t i = 0; i < block_.size(); ++i) {
      if (waits_for_[i] == 0) becomes_ready(i);
    }
    while (true) {
      start_what_can();
      if (running_.empty()) break;
      now_ = running_.top().end;
      while (!running_.empty() && running_.top().end == now_) {
        const std::uint32_t op = running_.top().op;
        running_.pop();
        release(op);
        finish(op);
      }
    }
    return std::move(times_);
  }

 private:
  struct Running {
    double end;
    std::uint32_t op;
    bool operator>(const Running& other) const { return end != other.end ? end > other.end : op > other.op; }
  };

  Need need(std::uint32_t op) const { return need_of(block_[op].kind); }

  void becomes_ready(std::uint32_t op) {
    switch (need(op)) {
      case Need::nothing:
        start(op);
        break;
      case Need::pulse:
        pulses_.push(op);
        break;
      case Need::interaction:
        interactions_.push(op);
        break;
      case Need::reading:
        readings_.push(op);
        break;
      case Need::deciding:
        decisions_.push(op);
        break;
    }
  }

  void start(std::uint32_t op) {
    times_.at[op] = now_;
    times_.order.push_back(op);
    const double end = now_ + times_.takes[op];
    times_.end = std::max(times_.end, end);
    if (need(op) == Need::nothing && times_.takes[op] == 0) {
      instant_.push_back(op);
      return;
    }
    running_.push({end, op});
    const std::uint32_t beams = beams_of(need(op));
    beams_busy_ += beams;
    if (beams > 0) {
      ++lit_;
      light_until_ = std::max(light_until_, end);
    }
    if (need(op) == Need::interaction) ++interacting_;
    if (need(op) == Need::reading) {
      ++reading_;
      reading_until_ = std::max(reading_until_, end);
    }
    if (need(op) == Need::deciding) ++deciding_;
  }

  void release(std::uint32_t op) {
    const std::uint32_t beams = beams_of(need(op));
    beams_busy_ -= beams;
    if (beams > 0) --lit_;
    if (need(op) == Need::interaction) --interacting_;
    if (need(op) == Need::reading) --reading_;
    if (need(op) == Need::deciding) --deciding_;
  }

  /// Tells the followers; those without time or needs run through at once.
  void finish(std::uint32_t op) {
    release_followers(op);
    while (!instant_.empty()) {
      const std::uint32_t next = instant_.back();
      instant_.pop_back();
      release_followers(next);
    }
  }

  void release_followers(std::uint32_t op) {
    for (const std::uint32_t next : graph_.followers(op)) {
      if (--waits_for_[next] == 0) becomes_ready(next);
    }
  }

  void start_what_can() {
    while (!instant_.empty()) {
      const std::uint32_t next = instant_.back();
      instant_.pop_back();
      release_followers(next);
    }
    if (deciding_ > 0) return;
    while (start_one()) {
    }
  }

  /// Starts the most urgent operation that may; false when there is none.
  bool start_one() {
    const bool dark_wanted = dark_is_due();
    Ready* best = nullptr;
    const auto consider = [&](Ready& ready, bool may) {
      if (!ready.is_empty() && may && (best == nullptr || ready.urgency() > best->urgency())) best = &ready;
    };
    consider(interactions_, interaction_may(dark_wanted));
    consider(pulses_, pulse_may(dark_wanted));
    consider(readings_, reading_may());
    consider(decisions_, lit_ == 0 && reading_ == 0 && decision_is_due());
    if (best == nullptr) return false;
    const bool decides = best == &decisions_;
    start(best->pop());
    return !decides;
  }

  /// Whether a readout on its own or a branch is ready and more urgent than all light that is ready.
  bool dark_is_due() const {
    const double dark = std::max(target_.reads_alone ? readings_.urgency() : -1, decisions_.urgency());
    return dark >= 0 && dark >= std::max(interactions_.urgency(), pulses_.urgency());
  }

  bool decision_is_due() const {
    return decisions_.urgency() >=
           std::max({interactions_.urgency(), pulses_.urgency(), readings_.urgency()});
  }

  /// Light may start when no readout forbids it; where the dark is due only what delays it no further.
  bool light_may(const Ready& ready, bool dark_wanted) const {
    if (ready.is_empty() || (target_.reads_alone && reading_ > 0)) return false;
    return !dark_wanted || (lit_ > 0 && now_ + times_.takes[ready.top()] <= light_until_);
  }

  bool interaction_may(bool dark_wanted) const {
    return light_may(interactions_, dark_wanted) && interacting_ < target_.interactions_at_once &&
           beams_busy_ + 2 <= target_.beams;
  }

  bool pulse_may(bool dark_wanted) const {
    if (!light_may(pulses_, dark_wanted) || beams_busy_ + 1 > target_.beams) return false;
    // The last beams are kept for a more urgent interaction that could start but for them.
    const bool interaction_lacks_beams = !interactions_.is_empty() &&
                                         interacting_ < target_.interactions_at_once &&
                                         beams_busy_ + 2 > target_.beams;
    return !(interaction_lacks_beams && interactions_.urgency() > pulses_.urgency());
  }

  bool reading_may() const {
    if (readings_.is_empty()) return false;
    if (!target_.reads_alone) return true;
    if (lit_ > 0) return false;
    const bool is_due = readings_.urgency() >= std::max(interactions_.urgency(), pulses_.urgency());
    // A less urgent readout joins those under way if it is over with them.
    return is_due || (reading_ > 0 && now_ + times_.takes[readings_.top()] <= reading_until_);
  }

  const Block& block_;
  const Target& target_;
  Dependences graph_;
  std::vector<std::uint32_t> waits_for_;
  std::vector<double> urgency_;
  BlockTimes times_;

  double now_ = 0;
  Ready pulses_{urgency_}, interactions_{urgency_}, readings_{urgency_}, decisions_{urgency_};
  std::vector<std::uint32_t> instant_;
  std::priority_queue<Running, std::vector<Running>, std::greater<>> running_;
  std::uint32_t beams_busy_ = 0, lit_ = 0, interacting_ = 0, reading_ = 0, deciding_ = 0;
  double light_until_ = 0, reading_until_ = 0;
};

/// Moves single pulses in a finished schedule.
class PulseMover {
 public:
  PulseMover(BlockTimes& times, const Block& block, const Target& target)
      : times_(times), block_(block), target_(target), at_before_(times.at), is_moved_(block.size(), false) {
    for (const double takes : times.takes) longest_ = std::max(longest_, takes);
  }

  void move(std::uint32_t pulse, double to) {
    if (to <= times_.at[pulse] || !is_free(pulse, to, to + times_.takes[pulse])) return;
    times_.at[pulse] = to;
    if (!is_moved_[pulse]) moved_.push_back(pulse);
    is_moved_[pulse] = true;
  }

  /// Brings the order of the moved ones up to date.
  void finish() {
    std::stable_sort(times_.order.begin(), times_.order.end(),
                     [&](std::uint32_t a, std::uint32_t b) { return times_.at[a] < times_.at[b]; });
  }

 private:
  /// Whether `pulse` may be lit from `begin` to `end`; counts as at once whatever overlaps that time.
  bool is_free(std::uint32_t pulse, double begin, double end) const {
    std::uint32_t beams = 1;
    const auto allows = [&](std::uint32_t op) {
      if (op == pulse || times_.at[op] >= end || times_.at[op] + times_.takes[op] <= begin) return true;
      const Need need = need_of(block_[op].kind);
      if (need == Need::deciding || (need == Need::reading && target_.reads_alone)) return false;
      beams += beams_of(need);
      return beams <= target_.beams;
    };
    for (const std::uint32_t op : moved_) {
      if (!allows(op)) return false;
    }
    auto op = std::lower_bound(times_.order.begin(), times_.order.end(), begin - longest_,
                               [&](std::uint32_t a, double time) { return at_before_[a] < time; });
    for (; op != times_.order.end() && at_before_[*op] < end; ++op) {
      if (!is_moved_[*op] && !allows(*op)) return false;
    }
    return true;
  }

  BlockTimes& times_;
  const Block& block_;
  const Target& target_;
  const std::vector<double> at_before_;  // by which `order` is sorted until finish()
  std::vector<bool> is_moved_;
  std::vector<std::uint32_t> moved_;
  double longest_ = 0;
};

}  // namespace

void delay_first_pulses(BlockTimes& times, const Circuit& circuit, const Block& block, const Target& target) {
  constexpr std::uint32_t nobody = 0xffffffffu;
  std::vector<std::uint32_t> first(circuit.wires, nobody);
  std::vector<std::uint32_t> second(circuit.wires, nobody);
  for (const std::uint32_t op : times.order) {
    for (const std::uint32_t ion : circuit.operands(block[op])) {
      if (first[ion] == nobody) {
        first[ion] = op;
      } else if (second[ion] == nobody) {
        second[ion] = op;
      }
    }
  }
  PulseMover mover(times, block, target);
  for (std::uint32_t ion = 0; ion < circuit.wires; ++ion) {
    if (second[ion] == nobody || block[first[ion]].kind != Kind::r) continue;
    mover.move(first[ion], times.at[second[ion]] - times.takes[first[ion]]);
  }
  mover.finish();
}

BlockTimes list_schedule(const Circuit& circuit, const Block& block, const Target& target, double begin,
                         const std::vector<double>& arm_us) {
  return ListScheduler(circuit, block, target, arm_us).run(begin);
}

}  // namespace isinglass
