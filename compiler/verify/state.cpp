// Fusing of gates and the loops over amplitudes; see state.h.
#include "verify/state.h"

#include <algorithm>
#include <stdexcept>

namespace isinglass {

namespace {

using Matrix = std::vector<Amplitude>;

Matrix times(const Matrix& a, const Matrix& b, std::size_t size) {
  Matrix c(size * size);
  for (std::size_t i = 0; i < size; ++i) {
    for (std::size_t k = 0; k < size; ++k) {
      for (std::size_t j = 0; j < size; ++j) c[i * size + j] += a[i * size + k] * b[k * size + j];
    }
  }
  return c;
}

/// A 2x2 matrix on bit `bit` of a two-bit index.
Matrix on_bit(const Matrix& m, int bit) {
  Matrix wide(16);
  const std::size_t mine = std::size_t(1) << bit;
  const std::size_t other = 3 ^ mine;
  for (std::size_t r = 0; r < 4; ++r) {
    for (std::size_t c = 0; c < 4; ++c) {
      if ((r & other) == (c & other)) wide[r * 4 + c] = m[((r & mine) != 0) * 2u + ((c & mine) != 0)];
    }
  }
  return wide;
}

/// The same 4x4 matrix with its two targets exchanged.
Matrix exchanged(const Matrix& m) {
  static constexpr std::size_t other[] = {0, 2, 1, 3};
  Matrix result(16);
  for (std::size_t r = 0; r < 4; ++r) {
    for (std::size_t c = 0; c < 4; ++c) result[other[r] * 4 + other[c]] = m[r * 4 + c];
  }
  return result;
}

/// Matrix under one control (low bit) as a 4x4 matrix.
Matrix with_control(const Matrix& m) {
  Matrix wide(16);
  wide[0] = wide[2 * 4 + 2] = 1;
  for (std::size_t r = 0; r < 2; ++r) {
    for (std::size_t c = 0; c < 2; ++c) wide[(2 * r + 1) * 4 + 2 * c + 1] = m[r * 2 + c];
  }
  return wide;
}

/// Collects kernels and folds each new gate into the last one on its wires where both fit on two wires.
class Fuser {
 public:
  explicit Fuser(std::uint32_t wires) : last_(wires, none) {}

  void add(Kernel kernel) {
    simplify(kernel);
    if (!kernel.controls.empty() || kernel.targets.empty()) return append(std::move(kernel));
    if (kernel.targets.size() == 1) return add_one(std::move(kernel));
    add_two(std::move(kernel));
  }

  std::vector<Kernel> result() {
    std::erase_if(kernels_, [](const Kernel& k) { return k.matrix.empty(); });
    return std::move(kernels_);
  }

 private:
  static constexpr std::size_t none = ~std::size_t(0);

  /// Turns controlled kinds on one or two wires into plain matrices.
  static void simplify(Kernel& kernel) {
    if (kernel.targets.empty() && !kernel.controls.empty()) {
      kernel.targets = {kernel.controls.back()};
      kernel.controls.pop_back();
      kernel.matrix = {1, 0, 0, kernel.matrix[0]};
    }
    if (kernel.targets.size() == 1 && kernel.controls.size() == 1) {
      kernel.targets = {kernel.controls[0], kernel.targets[0]};
      kernel.controls.clear();
      kernel.matrix = with_control(kernel.matrix);
    }
  }

  bool is_plain(std::size_t k) const {
    return k != none && kernels_[k].controls.empty() && !kernels_[k].targets.empty();
  }

  void append(Kernel kernel) {
    for (const auto w : kernel.controls) last_[w] = kernels_.size();
    for (const auto w : kernel.targets) last_[w] = kernels_.size();
    kernels_.push_back(std::move(kernel));
  }

  void add_one(Kernel kernel) {
    const std::size_t k = last_[kernel.targets[0]];
    if (!is_plain(k)) return append(std::move(kernel));
    Kernel& before = kernels_[k];
    if (before.targets.size() == 1) {
      before.matrix = times(kernel.matrix, before.matrix, 2);
    } else {
      const int bit = before.targets[0] == kernel.targets[0] ? 0 : 1;
      before.matrix = times(on_bit(kernel.matrix, bit), before.matrix, 4);
    }
  }

  void add_two(Kernel kernel) {
    const std::size_t a = last_[kernel.targets[0]];
    const std::size_t b = last_[kernel.targets[1]];
    if (a == b && is_plain(a) && kernels_[a].targets.size() == 2) {
      const bool same_order = kernels_[a].targets[0] == kernel.targets[0];
      kernels_[a].matrix =
          times(same_order ? kernel.matrix : exchanged(kernel.matrix), kernels_[a].matrix, 4);
      return;
    }
    for (int bit = 0; bit < 2; ++bit) {
      const std::size_t k = last_[kernel.targets[bit]];
      if (!is_plain(k) || kernels_[k].targets.size() != 1) continue;
      kernel.matrix = times(kernel.matrix, on_bit(kernels_[k].matrix, bit), 4);
      kernels_[k].matrix.clear();  // it lives on in this kernel; result() sweeps it out
    }
    append(std::move(kernel));
  }

  std::vector<Kernel> kernels_;
  std::vector<std::size_t> last_;
};

}  // namespace

std::vector<Kernel> fused(const Circuit& circuit, std::span<const Operation> operations,
                          std::span<const double> inputs) {
  Fuser fuser(circuit.wires);
  for (const Operation& op : operations) {
    if (op.kind == Kind::barrier || op.kind == Kind::delay) continue;
    if (!op.is_unitary()) throw std::logic_error("only unitary operations can be fused");
    Operation valued = op;
    for (int a = 0; a < 3; ++a) valued.set_angle(a, {circuit.forms.value(op.angle(a), inputs), 0});
    const auto controls = circuit.controls(op);
    const auto targets = circuit.targets(op);
    fuser.add({{controls.begin(), controls.end()}, {targets.begin(), targets.end()}, matrix_of(valued)});
  }
  return fuser.result();
}

State::State(unsigned wires, unsigned batch)
    : wires_(wires),
      batch_(batch),
      re_(std::size_t(1) << (wires + batch)),
      im_(std::size_t(1) << (wires + batch)) {}

namespace {

/// Runs over the indices in which all of some bits are zero, in runs of neighbours.
struct Runs {
  std::vector<unsigned> positions;  // ascending
  std::uint64_t run;                // length of a run
  std::uint64_t count;              // number of runs

  Runs(std::vector<unsigned> bits, unsigned all) : positions(std::move(bits)) {
    std::sort(positions.begin(), positions.end());
    run = std::uint64_t(1) << positions[0];
    count = std::uint64_t(1) << (all - positions.size() - positions[0]);
  }

  std::uint64_t start(std::uint64_t k) const {
    k <<= positions[0];
    for (const unsigned p : positions) {
      const std::uint64_t low = (std::uint64_t(1) << p) - 1;
      k = (k & low) | (k & ~low) << 1;
    }
    return k;
  }
};

// The loops are compiled twice: for any x86-64, and for those with wide registers, chosen at run time.
template <int size>
inline __attribute__((always_inline)) void multiply(double* __restrict re, double* __restrict im,
                                                    const Runs& runs, std::uint64_t fixed,
                                                    const std::uint64_t* offset, const double* mr,
                                                    const double* mi) {
  constexpr std::uint64_t most = 64;  // amplitudes of a target value handled at once, in the stack
  const std::uint64_t length = std::min(runs.run, most);
  for (std::uint64_t k = 0; k < runs.count; ++k) {
    const std::uint64_t start = runs.start(k) | fixed;
    for (std::uint64_t part = 0; part < runs.run; part += length) {
      double ar[size][most];
      double ai[size][most];
      for (int c = 0; c < size; ++c) {
        for (std::uint64_t j = 0; j < length; ++j) {
          ar[c][j] = re[(start | offset[c]) + part + j];
          ai[c][j] = im[(start | offset[c]) + part + j];
        }
      }
      for (int r = 0; r < size; ++r) {
        double* outr = re + (start | offset[r]) + part;
        double* outi = im + (start | offset[r]) + part;
        for (std::uint64_t j = 0; j < length; ++j) {
          double sr = 0;
          double si = 0;
          for (int c = 0; c < size; ++c) {
            sr += mr[r * size + c] * ar[c][j] - mi[r * size + c] * ai[c][j];
            si += mr[r * size + c] * ai[c][j] + mi[r * size + c] * ar[c][j];
          }
          outr[j] = sr;
          outi[j] = si;
        }
      }
    }
  }
}

template <int size>
void multiply_plain(double* re, double* im, const Runs& runs, std::uint64_t fixed,
                    const std::uint64_t* offset, const double* mr, const double* mi) {
  multiply<size>(re, im, runs, fixed, offset, mr, mi);
}

#if defined(__x86_64__)
template <int size>
__attribute__((target("avx2,fma"))) void multiply_wide(double* re, double* im, const Runs& runs,
                                                       std::uint64_t fixed, const std::uint64_t* offset,
                                                       const double* mr, const double* mi) {
  multiply<size>(re, im, runs, fixed, offset, mr, mi);
}
const bool is_wide = __builtin_cpu_supports("avx2") && __builtin_cpu_supports("fma");
#endif

template <int size>
void multiply_best(double* re, double* im, const Runs& runs, std::uint64_t fixed, const std::uint64_t* offset,
                   const double* mr, const double* mi) {
#if defined(__x86_64__)
  if (is_wide) return multiply_wide<size>(re, im, runs, fixed, offset, mr, mi);
#endif
  multiply_plain<size>(re, im, runs, fixed, offset, mr, mi);
}

}  // namespace

void State::apply(const Kernel& kernel) {
  std::vector<unsigned> positions;
  std::uint64_t fixed = 0;
  std::uint64_t offset[4] = {0, 0, 0, 0};
  double mr[16];
  double mi[16];
  const std::size_t size = std::size_t(1) << kernel.targets.size();
  for (std::size_t k = 0; k < size * size; ++k) {
    mr[k] = kernel.matrix[k].real();
    mi[k] = kernel.matrix[k].imag();
  }
  for (const auto w : kernel.controls) {
    positions.push_back(w + batch_);
    fixed |= std::uint64_t(1) << (w + batch_);
  }
  for (std::size_t t = 0; t < kernel.targets.size(); ++t) {
    positions.push_back(kernel.targets[t] + batch_);
    for (std::size_t k = 0; k < size; ++k) {
      if (k >> t & 1) offset[k] |= std::uint64_t(1) << (kernel.targets[t] + batch_);
    }
  }
  if (positions.empty()) {  // a global phase
    for (std::size_t k = 0; k < re_.size(); ++k) {
      const Amplitude a = kernel.matrix[0] * Amplitude(re_[k], im_[k]);
      re_[k] = a.real();
      im_[k] = a.imag();
    }
    return;
  }
  const Runs runs(std::move(positions), wires_ + batch_);
  if (size == 1) multiply_best<1>(re_.data(), im_.data(), runs, fixed, offset, mr, mi);
  if (size == 2) multiply_best<2>(re_.data(), im_.data(), runs, fixed, offset, mr, mi);
  if (size == 4) multiply_best<4>(re_.data(), im_.data(), runs, fixed, offset, mr, mi);
}

double State::weight(std::uint32_t wire, bool value) const {
  double sum = 0;
  for (std::uint64_t k = 0; k < re_.size(); ++k) {
    if ((k >> (wire + batch_) & 1) == std::uint64_t(value)) sum += re_[k] * re_[k] + im_[k] * im_[k];
  }
  return sum;
}

void State::project(std::uint32_t wire, bool value) {
  for (std::uint64_t k = 0; k < re_.size(); ++k) {
    if ((k >> (wire + batch_) & 1) != std::uint64_t(value)) re_[k] = im_[k] = 0;
  }
}

void State::flip(std::uint32_t wire) {
  const std::uint64_t bit = std::uint64_t(1) << (wire + batch_);
  for (std::uint64_t k = 0; k < re_.size(); ++k) {
    if (k & bit) continue;
    std::swap(re_[k], re_[k | bit]);
    std::swap(im_[k], im_[k | bit]);
  }
}

}  // namespace isinglass
