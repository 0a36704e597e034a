// Pulling out the Clifford frame and cancelling what remains; see rotations.h.
#include "verify/rotations.h"

#include <algorithm>
#include <bit>
#include <cmath>
#include <optional>
#include <unordered_map>

#include "algebra/tableau.h"
#include "verify/dense.h"
#include "verify/memory.h"

namespace isinglass {

namespace {

constexpr double nothing = 1e-10;  // angles and coefficients up to this are rounding
constexpr std::uint32_t most_controls = 16;

struct HashOfLetters {
  std::size_t operator()(const PauliString& p) const { return p.hash_of_letters(); }
};
struct SameLetters {
  bool operator()(const PauliString& a, const PauliString& b) const { return a.same_letters(b); }
};

/// A unitary as a sum of Pauli strings (their signs are in the coefficients).
using Sum = std::unordered_map<PauliString, Amplitude, HashOfLetters, SameLetters>;

/// A rotation, or a product of some that do not commute, written out as a sum.
struct Item {
  PauliString axis;  // of a rotation: positive
  double angle = 0;
  Sum sum;  // empty for a rotation

  bool is_rotation() const { return sum.empty(); }
};

bool commute(const Item& item, const PauliString& axis) {
  if (item.is_rotation()) return item.axis.commutes_with(axis);
  for (const auto& [string, coefficient] : item.sum) {
    if (!string.commutes_with(axis)) return false;
  }
  return true;
}

bool commute(const Item& a, const Item& b) {
  if (a.is_rotation()) return commute(b, a.axis);
  for (const auto& [string, coefficient] : a.sum) {
    if (!commute(b, string)) return false;
  }
  return true;
}

Sum expanded(const Item& item) {
  if (!item.is_rotation()) return item.sum;
  Sum sum;
  sum[PauliString(item.axis.qubits())] = std::cos(item.angle / 2);
  sum[item.axis] = Amplitude(0, -std::sin(item.angle / 2));
  return sum;
}

Amplitude power_of_i(int k) {
  static const Amplitude powers[] = {{1, 0}, {0, 1}, {-1, 0}, {0, -1}};
  return powers[k & 3];
}

/// later * earlier; empty when it has more than `most` strings.
Sum product(const Sum& later, const Sum& earlier, std::size_t most) {
  Sum result;
  for (const auto& [a, ca] : later) {
    for (const auto& [b, cb] : earlier) {
      PauliString string = a;
      const int phase = string.multiply(b);
      string.negative = false;
      result[std::move(string)] += power_of_i(phase) * ca * cb;
    }
    if (result.size() > most) return {};
  }
  return result;
}

/// Turns that are multiples of pi/2 up to rounding, as 0 to 3.
std::optional<int> quarters_of(double angle) {
  const double turns = angle / (pi / 2);
  const double nearest = std::nearbyint(turns);
  if (std::abs(turns - nearest) * (pi / 2) > nothing) return {};
  return static_cast<int>(static_cast<std::int64_t>(nearest) & 3);
}

// ---- from gates to rotations in front of a Clifford ----

/// C R_m ... R_1 with the inverse of C as a tableau.
class Rotations {
 public:
  explicit Rotations(std::size_t wires) : wires_(wires), inverse_(wires) {}

  /// exp(-i angle/2 string) next in time; the string has its sign.
  void add(const PauliString& string, double angle) {
    if (string.negative) angle = -angle;
    if (const auto quarters = quarters_of(angle)) {
      rounded += std::abs(std::remainder(angle, pi / 2)) / 2;
      PauliString positive = string;
      positive.negative = false;
      if (*quarters != 0) inverse_.prepend(positive, 4 - *quarters);
      return;
    }
    Item item;
    item.axis = inverse_.image(string);
    item.angle = item.axis.negative ? -angle : angle;
    item.axis.negative = false;
    merge(std::move(item));
  }

  /// The Clifford part first, so that only the rest of the tableau follows: exchange of two wires at the end.
  void exchange(std::size_t a, std::size_t b) {
    for (const Letter letter : {Letter::X, Letter::Y, Letter::Z}) {
      PauliString string(wires_);
      string.set(a, letter);
      string.set(b, letter);
      add(string, pi / 2);
    }
  }

  std::vector<Item> items;
  double rounded = 0;

  const Tableau& inverse_frame() const { return inverse_; }

 private:
  void merge(Item item) {
    for (std::size_t k = items.size(); k-- > 0;) {
      if (items[k].axis.same_letters(item.axis)) {
        items[k].angle += item.angle;
        const auto quarters = quarters_of(items[k].angle);
        if (!quarters) return;
        // It commutes with all that follows, so a quarter turn can go to the end.
        rounded += std::abs(std::remainder(items[k].angle, pi / 2)) / 2;
        if (*quarters != 0) inverse_.append(items[k].axis, 4 - *quarters);
        items.erase(items.begin() + static_cast<std::ptrdiff_t>(k));
        return;
      }
      if (!items[k].axis.commutes_with(item.axis)) break;
    }
    items.push_back(std::move(item));
  }

  std::size_t wires_;
  Tableau inverse_;
};

/// Writes the gates of a circuit as rotations.
class Converter {
 public:
  Converter(const Circuit& circuit, std::span<const double> inputs, std::size_t wires, Rotations& out)
      : circuit_(circuit), inputs_(inputs), wires_(wires), out_(out) {}

  void add(const Operation& op) {
    double v[3];
    for (int k = 0; k < 3; ++k) v[k] = circuit_.forms.value(op.angle(k), inputs_);
    const auto controls = circuit_.controls(op);
    const auto t = circuit_.targets(op);
    if (controls.size() > most_controls) throw Unsupported("a gate with so many controls");
    const auto one = [&](Letter letter, double angle) { rotate(controls, single(t[0], letter), angle); };
    const auto two = [&](Letter letter, double angle) {
      PauliString string = single(t[0], letter);
      string.set(t[1], letter);
      rotate(controls, string, angle);
    };
    const auto free_z = [&](std::uint32_t wire, double angle) { out_.add(single(wire, Letter::Z), angle); };
    switch (op.kind) {
      case Kind::phase:
        return phase(controls, v[0]);
      case Kind::x:
        phase(controls, pi / 2);
        return one(Letter::X, pi);
      case Kind::y:
        phase(controls, pi / 2);
        return one(Letter::Y, pi);
      case Kind::z:
        phase(controls, pi / 2);
        return one(Letter::Z, pi);
      case Kind::h:  // Z turned by pi/4 about Y
        phase(controls, pi / 2);
        if (controls.empty()) {
          one(Letter::Z, pi / 2);
          one(Letter::X, pi / 2);
          return one(Letter::Z, pi / 2);
        }
        out_.add(single(t[0], Letter::Y), -pi / 4);
        one(Letter::Z, pi);
        return out_.add(single(t[0], Letter::Y), pi / 4);
      case Kind::p:
        phase(controls, v[0] / 2);
        return one(Letter::Z, v[0]);
      case Kind::rz:
        return one(Letter::Z, v[0]);
      case Kind::r:
        free_z(t[0], -v[1]);
        one(Letter::X, v[0]);
        return free_z(t[0], v[1]);
      case Kind::u:
        phase(controls, (v[0] + v[1] + v[2]) / 2);
        one(Letter::Z, v[2]);
        one(Letter::Y, v[0]);
        return one(Letter::Z, v[1]);
      case Kind::swap:  // e^{i pi/4} exp(-i pi/4 (XX + YY + ZZ))
        phase(controls, pi / 4);
        two(Letter::X, pi / 2);
        two(Letter::Y, pi / 2);
        return two(Letter::Z, pi / 2);
      case Kind::zz:
        return two(Letter::Z, v[0]);
      case Kind::xx:
        free_z(t[0], -v[1]);
        free_z(t[1], -v[2]);
        two(Letter::X, v[0]);
        free_z(t[0], v[1]);
        return free_z(t[1], v[2]);
      default:
        return;  // barriers, delays and final measurements
    }
  }

 private:
  PauliString single(std::uint32_t wire, Letter letter) const {
    return PauliString::single(wires_, wire, letter);
  }

  /// Calls visit(Z on the subset, sign) for all subsets of the controls: their projector onto 1 is the sum of
  /// sign * Z / 2^count.
  template <typename Visit>
  void each_subset(std::span<const std::uint32_t> controls, PauliString string, const Visit& visit) {
    for (std::uint32_t subset = 0; subset < 1u << controls.size(); ++subset) {
      PauliString with = string;
      for (std::size_t k = 0; k < controls.size(); ++k) {
        if (subset >> k & 1) with.set(controls[k], Letter::Z);
      }
      visit(with, std::popcount(subset) % 2 == 0 ? 1.0 : -1.0);
    }
  }

  /// exp(-i angle/2 string) if all controls are 1.
  void rotate(std::span<const std::uint32_t> controls, const PauliString& string, double angle) {
    const double share = angle / static_cast<double>(1u << controls.size());
    each_subset(controls, string, [&](const PauliString& s, double sign) { out_.add(s, sign * share); });
  }

  /// e^{i angle} if all controls are 1.
  void phase(std::span<const std::uint32_t> controls, double angle) {
    const double share = -2 * angle / static_cast<double>(1u << controls.size());
    each_subset(controls, PauliString(wires_), [&](const PauliString& s, double sign) {
      if (s.weight() > 0) out_.add(s, sign * share);
    });
  }

  const Circuit& circuit_;
  std::span<const double> inputs_;
  std::size_t wires_;
  Rotations& out_;
};

// ---- cancelling ----

class Canceller {
 public:
  Canceller(std::vector<Item> items, std::size_t most_terms, std::chrono::steady_clock::time_point deadline)
      : items_(std::move(items)), most_terms_(most_terms), deadline_(deadline) {}

  /// Puts a rotation after all others and lets it move back.
  void add(Item item) {
    if (std::chrono::steady_clock::now() > deadline_) throw Unsupported("the time given");
    std::size_t k = items_.size();
    while (k > 0) {
      Item& other = items_[k - 1];
      if (same_axis(other, item)) {
        other.angle += item.angle;
        return settle(k - 1);
      }
      if (commute(other, item)) {
        --k;
        continue;
      }
      if (conjugate_through(other, item)) {
        --k;
        continue;
      }
      Sum together = product(expanded(item), expanded(other), most_terms_);
      if (together.empty()) break;
      other.sum = std::move(together);
      return settle(k - 1);
    }
    items_.insert(items_.begin() + static_cast<std::ptrdiff_t>(k), std::move(item));
  }

  /// Multiplies all that is left, if the product stays small.
  void gather() {
    while (items_.size() > 1) {
      Item& last = items_[items_.size() - 1];
      Item& before = items_[items_.size() - 2];
      Sum together = product(expanded(last), expanded(before), most_terms_);
      if (together.empty()) return;
      before.sum = std::move(together);
      items_.pop_back();
      simplify(items_.back());
    }
    if (items_.size() == 1 && is_identity(items_[0])) {
      rounded += std::abs(std::remainder(items_[0].angle, 2 * pi)) / 2;
      items_.clear();
    }
  }

  std::vector<Item> take() { return std::move(items_); }
  double rounded = 0;

 private:
  static bool is_identity(const Item& item) {
    return item.is_rotation() && std::abs(std::remainder(item.angle, 2 * pi)) <= nothing;
  }

  void erase(std::size_t k) { items_.erase(items_.begin() + static_cast<std::ptrdiff_t>(k)); }

  /// Drops vanishing strings; a sum of one string or of the identity and one other becomes a rotation.
  void simplify(Item& item) {
    double dropped = 0;
    for (auto it = item.sum.begin(); it != item.sum.end();) {
      if (std::abs(it->second) <= nothing) {
        dropped += std::norm(it->second);
        it = item.sum.erase(it);
      } else {
        ++it;
      }
    }
    rounded += std::sqrt(dropped);
    if (item.sum.size() > 2) return;
    Amplitude whole = 0;
    Amplitude turned = 0;
    for (const auto& [string, coefficient] : item.sum) {
      if (string.weight() == 0) {
        whole = coefficient;
      } else if (item.sum.size() == 1 || turned == Amplitude(0)) {
        item.axis = string;
        turned = coefficient;
      } else {
        return;  // two strings, neither the identity: P (cos + sin Q), left as it is
      }
    }
    // Up to a phase: whole = cos(a/2), turned = -i sin(a/2).
    const Amplitude ratio = whole == Amplitude(0) ? 0 : turned / whole;
    item.angle = whole == Amplitude(0) ? pi : 2 * std::atan(-ratio.imag());
    if (item.axis.qubits() == 0) item.axis = item.sum.begin()->first;
    item.sum.clear();
  }

  /// After a change of items_[k]: simplify it, and let it take in what stands before it.
  void settle(std::size_t k) {
    if (!items_[k].is_rotation()) simplify(items_[k]);
    if (is_identity(items_[k])) {
      rounded += std::abs(std::remainder(items_[k].angle, 2 * pi)) / 2;
      return erase(k);
    }
    std::size_t j = k;
    while (j > 0 && !same_axis(items_[j - 1], items_[k]) && commute(items_[j - 1], items_[k])) --j;
    if (j == 0) return;
    Item& before = items_[j - 1];
    if (same_axis(before, items_[k])) {
      before.angle += items_[k].angle;
    } else {
      // A product may take in what makes it no larger; a lone rotation takes in nothing.
      if (items_[k].is_rotation()) return;
      Sum together = product(items_[k].sum, expanded(before), items_[k].sum.size());
      if (together.empty()) return;
      before.sum = std::move(together);
    }
    erase(k);
    settle(j - 1);
  }

  static bool same_axis(const Item& a, const Item& b) {
    return a.is_rotation() && b.is_rotation() && a.axis.same_letters(b.axis);
  }

  /// Whether `other` is a Clifford: then the rotation that follows it passes with a turned axis.
  static bool conjugate_through(const Item& other, Item& item) {
    if (!item.is_rotation() || other.sum.size() > 16) return false;
    const Sum sum = expanded(other);
    double size = 0;
    for (const auto& [string, coefficient] : sum) size = std::max(size, std::abs(coefficient));
    Sum inverse;
    for (const auto& [string, coefficient] : sum) {
      // The strings of a Clifford have coefficients of one size (or none).
      if (std::abs(coefficient) > 1e-9 && size - std::abs(coefficient) > 1e-9) return false;
      inverse[string] = std::conj(coefficient);
    }
    Sum axis;
    axis[item.axis] = 1;
    const Sum turned = product(product(inverse, axis, 256), sum, 256);
    PauliString image;
    for (const auto& [string, coefficient] : turned) {
      if (std::abs(coefficient) <= 1e-9) continue;
      if (image.qubits() != 0 || std::abs(coefficient.imag()) > 1e-9) return false;
      image = string;
      if (coefficient.real() < 0) item.angle = -item.angle;
    }
    if (image.qubits() == 0) return false;
    item.axis = image;
    return true;
  }

  std::vector<Item> items_;
  std::size_t most_terms_;
  std::chrono::steady_clock::time_point deadline_;
};

// ---- what the start and the end forgive ----

bool only_z_on(const PauliString& string, const std::vector<bool>& wires) {
  for (std::size_t q = 0; q < string.qubits(); ++q) {
    const Letter letter = string.letter(q);
    if (letter != Letter::I && (letter != Letter::Z || !wires[q])) return false;
  }
  return true;
}

/// The same without its letters Z on wires that start in |0>, where Z is 1; nothing if another letter is
/// there.
std::optional<PauliString> without_start(PauliString string, const std::vector<bool>& zero_wires) {
  for (std::size_t q = 0; q < zero_wires.size(); ++q) {
    if (!zero_wires[q] || string.letter(q) == Letter::I) continue;
    if (string.letter(q) != Letter::Z) return {};
    string.set(q, Letter::I);
  }
  return string;
}

/// What can be first and is diagonal on the wires that start in |0> loses its letters there.
void strip_start(std::vector<Item>& items, const std::vector<bool>& zero_wires) {
  std::vector<Item> result;
  for (Item& item : items) {
    const bool is_first =
        std::all_of(result.begin(), result.end(), [&](const Item& before) { return commute(before, item); });
    std::optional<Item> stripped;
    if (is_first && item.is_rotation()) {
      if (const auto axis = without_start(item.axis, zero_wires)) stripped = Item{*axis, item.angle, {}};
    } else if (is_first) {
      stripped = Item{item.axis, 0, {}};
      for (const auto& [string, coefficient] : item.sum) {
        const auto rest = without_start(string, zero_wires);
        if (!rest) {
          stripped.reset();
          break;
        }
        stripped->sum[*rest] += coefficient;
      }
    }
    if (!stripped) {
      result.push_back(std::move(item));
    } else if (!stripped->is_rotation() || stripped->axis.weight() > 0) {
      result.insert(result.begin(), std::move(*stripped));
    }
  }
  items = std::move(result);
}

/// Rotations that can be last and are then diagonal on measured wires change no outcome.
void strip_end(Rotations& rotations, const std::vector<bool>& measured) {
  const Tableau frame = rotations.inverse_frame().inverse();
  std::vector<Item> kept;
  for (std::size_t k = rotations.items.size(); k-- > 0;) {
    const Item& item = rotations.items[k];
    const bool is_last =
        std::all_of(kept.begin(), kept.end(), [&](const Item& after) { return commute(after, item); });
    if (is_last && only_z_on(frame.image(item.axis), measured)) continue;
    kept.push_back(item);
  }
  rotations.items.assign(kept.rbegin(), kept.rend());
}

/// Whether C_a C_b^-1 is diagonal and acts on measured wires only.
bool frames_differ_by_phases(const Tableau& inverse_a, const Tableau& inverse_b,
                             const std::vector<bool>& measured) {
  const Tableau difference = inverse_b.then(inverse_a.inverse());
  for (std::size_t q = 0; q < measured.size(); ++q) {
    PauliString z = PauliString::single(measured.size(), q, Letter::Z);
    PauliString x = PauliString::single(measured.size(), q, Letter::X);
    if (!(difference.image(z) == z)) return false;
    PauliString image = difference.image(x);
    if (!measured[q]) {
      if (!(image == x)) return false;
      continue;
    }
    image.multiply(x);
    image.negative = false;
    if (!only_z_on(image, measured)) return false;
  }
  return true;
}

/// Where a Pauli string goes under the items and then K; nothing if an item is no Clifford.
std::optional<PauliString> image_through(const std::vector<Item>& items, const Tableau& k,
                                         PauliString string) {
  for (const Item& item : items) {
    Sum inverse;
    const Sum sum = expanded(item);
    for (const auto& [s, coefficient] : sum) inverse[s] = std::conj(coefficient);
    Sum middle;
    middle[string] = string.negative ? -1 : 1;
    const Sum turned = product(product(sum, middle, 4096), inverse, 4096);
    std::optional<PauliString> image;
    for (const auto& [s, coefficient] : turned) {
      if (std::abs(coefficient) <= 1e-9) continue;
      if (image) return {};
      image = s;
      image->negative = coefficient.real() < 0;
    }
    if (!image) return {};
    string = *image;
  }
  return k.image(string);
}

/// Whether items and K together keep every input, where zero wires are |0> at the start and must be so at the
/// end. Nothing is known if an item is no Clifford.
std::optional<bool> does_nothing(const std::vector<Item>& items, const Tableau& k,
                                 const std::vector<bool>& zero_wires) {
  bool keeps = true;
  for (std::size_t q = 0; q < zero_wires.size(); ++q) {
    for (const Letter letter : {Letter::X, Letter::Z}) {
      if (zero_wires[q] && letter == Letter::X) continue;
      const PauliString string = PauliString::single(zero_wires.size(), q, letter);
      auto image = image_through(items, k, string);
      if (!image) return {};
      if (!zero_wires[q]) {
        // Up to Z on wires that are |0>.
        for (std::size_t w = 0; w < zero_wires.size(); ++w) {
          if (zero_wires[w] && image->letter(w) == Letter::Z) image->set(w, Letter::I);
        }
        keeps = keeps && *image == string;
      } else {
        keeps = keeps && !image->negative && only_z_on(*image, zero_wires);
      }
    }
  }
  return keeps;
}

/// Exchanges wires at the end of the compiled circuit so that bits and kept qubits end where the source has
/// them.
void align_ends(const Job& job, Rotations& compiled) {
  const std::size_t wires = std::max(job.source.wires, job.compiled.wires);
  std::vector<std::uint32_t> wanted(wires, no_bit);  // by wire of the compiled circuit: wire of the source
  std::vector<bool> is_taken(wires);
  std::unordered_map<std::uint32_t, std::uint32_t> wire_of_bit;
  const auto want = [&](std::uint32_t from, std::uint32_t to) {
    if (wanted[from] != no_bit || is_taken[to]) return;
    wanted[from] = to;
    is_taken[to] = true;
  };
  for (const Operation& op : job.source.body()) {
    if (op.kind == Kind::measure) wire_of_bit[op.payload] = job.source.operands(op)[0];
  }
  for (const Operation& op : job.compiled.body()) {
    if (op.kind == Kind::measure) want(job.compiled.operands(op)[0], wire_of_bit.at(op.payload));
  }
  for (std::uint32_t q = 0; q < job.source.source_qubits; ++q)
    want(job.compiled.end_wire[q], job.source.end_wire[q]);
  for (std::uint32_t from = 0, to = 0; from < wires; ++from) {
    if (wanted[from] != no_bit) continue;
    while (is_taken[to]) ++to;
    want(from, to);
  }
  for (std::uint32_t w = 0; w < wires; ++w) {
    while (wanted[w] != w) {
      const std::uint32_t to = wanted[w];
      compiled.exchange(w, to);
      std::swap(wanted[w], wanted[to]);
    }
  }
}

std::vector<bool> measured_wires(const Circuit& circuit, std::size_t wires) {
  std::vector<bool> measured(wires);
  for (const Operation& op : circuit.body()) {
    if (op.kind == Kind::measure) measured[circuit.operands(op)[0]] = true;
  }
  return measured;
}

}  // namespace

RotationResult by_rotations(const Job& job, const InputValues& inputs) {
  const std::size_t wires = std::max(job.source.wires, job.compiled.wires);
  const auto check_time = [&] {
    if (std::chrono::steady_clock::now() > job.options.deadline) throw Unsupported("the time given");
  };
  Rotations a(wires);
  Converter convert_source(job.source, inputs.source, wires, a);
  for (const Operation& op : job.source.body()) convert_source.add(op);
  check_time();
  Rotations b(wires);
  Converter convert_compiled(job.compiled, inputs.compiled, wires, b);
  for (const Operation& op : job.compiled.body()) convert_compiled.add(op);
  align_ends(job, b);
  check_time();

  RotationResult result;
  result.rotations = a.items.size() + b.items.size();
  std::vector<bool> zero_wires(wires, true);
  if (!job.promise.zero_start) std::fill_n(zero_wires.begin(), job.source.source_qubits, false);
  const std::vector<bool> measured = measured_wires(job.source, wires);
  const bool measures = std::find(measured.begin(), measured.end(), true) != measured.end();
  if (measures) {
    strip_end(a, measured);
    strip_end(b, measured);
  }
  strip_start(a.items, zero_wires);
  strip_start(b.items, zero_wires);
  // K = C_b^-1 C_a; what follows it is pulled in front of it.
  Tableau k = a.inverse_frame().inverse().then(b.inverse_frame());
  if (measures && frames_differ_by_phases(a.inverse_frame(), b.inverse_frame(), measured)) k = Tableau(wires);
  const Tableau k_inverse = k.inverse();

  for (const std::size_t most_terms : {std::size_t(16), std::size_t(64), std::size_t(1024)}) {
    Canceller canceller(a.items, most_terms, job.options.deadline);
    for (std::size_t j = b.items.size(); j-- > 0;) {
      Item item;
      item.axis = k_inverse.image(b.items[j].axis);
      item.angle = item.axis.negative ? b.items[j].angle : -b.items[j].angle;
      item.axis.negative = false;
      canceller.add(std::move(item));
    }
    std::vector<Item> left_over = canceller.take();
    strip_start(left_over, zero_wires);
    Canceller rest(std::move(left_over), most_terms, job.options.deadline);
    rest.gather();
    left_over = rest.take();
    result.left = left_over.size();
    result.distance = a.rounded + b.rounded + canceller.rounded + rest.rounded;
    const auto keeps = does_nothing(left_over, k, zero_wires);
    if (keeps && *keeps) {
      result.state = RotationResult::State::cancelled;
      return result;
    }
    const bool forgives = measures || job.promise.zero_start || wires > job.source.source_qubits;
    const bool one_left = left_over.size() == 1 && left_over[0].is_rotation() && k == Tableau(wires);
    if (!forgives && (keeps || one_left)) {
      result.state = RotationResult::State::differs;
      result.distance = one_left ? std::abs(std::sin(left_over[0].angle / 2)) : 1;
      return result;
    }
    if (keeps && !measures) {  // Clifford all through: K on |0> is decided as well
      result.state = RotationResult::State::differs;
      result.distance = 1;
      return result;
    }
    if (left_over.empty()) break;  // larger sums would not change anything
  }
  return result;
}

}  // namespace isinglass
