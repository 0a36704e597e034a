// The light of one interaction: amplitude-modulated pulses that close every mode of the chain and reach an
// angle.
//
// Time runs from -tau/2 to tau/2 here, so that the symmetric choice of phase, phi = pi/2 - mu tau/2, makes
// the light's oscillation cos(mu t). Frequencies in Hz, times in s; Rabi frequencies in Hz (Omega / 2 pi).
// Conventions and formulas: targets/README.md. Method: S.-L. Zhu, C. Monroe, L.-M. Duan, PRL 97, 050505
// (2006).
#pragma once

#include <Eigen/Dense>
#include <array>
#include <optional>
#include <vector>

namespace isinglass {

enum class Shape { steps, ramps };
/// Against an offset of the modes: not at all; paths that stay closed to first order (d alpha / d w = 0, as
/// far as the segments allow: with too few, the closed pulses of smallest slope); and an angle that stays,
/// too.
enum class Robust { none, motion, motion_and_angle };

/// How the light may be modulated.
struct LightForm {
  Shape shape = Shape::ramps;  // piecewise constant; or piecewise linear from zero to zero
  int segments = 60;
  Robust robust = Robust::none;
};

/// One pulse, the same on both ions up to a sign.
struct Pulse {
  Shape shape = Shape::ramps;
  double duration = 0;  // s
  double detuning = 0;  // mu / 2 pi in Hz
  Eigen::VectorXd
      rabi;  // steps: one value a segment; ramps: the segments + 1 knots; negative = phase turned by pi

  /// phi in (-pi, pi] for time that starts at 0.
  double phase() const;
  double peak() const;           // largest |rabi|, Hz
  double rms() const;            // root of the time mean of rabi^2, Hz
  double mean_absolute() const;  // time mean of |rabi|, Hz
  double at(double time) const;  // rabi at a time from the start, Hz
};

/// What a pulse does to each mode. alpha_im = -i eta_im loop_m (times a phase common to the mode), chi_ij =
/// sum_m eta_im eta_jm area_m.
struct Response {
  Eigen::VectorXcd loop;  // int Omega cos(mu t) e^{i w t} dt
  Eigen::VectorXd area;   // int int Omega Omega' cos(mu t) cos(mu t') sin(w |t - t'|) dt dt'
};
Response response(const Pulse& pulse, const Eigen::VectorXd& mode_hz);

/// int |loop_m(t)|^2 dt for each mode, in s: how far and how long the motion is excited. Good to
/// 1 %: the fast ripple at mu + w is sampled, not resolved.
Eigen::VectorXd excursion(const Pulse& pulse, const Eigen::VectorXd& mode_hz);

/// loop_m(t) at the given times from the start (rows) for each mode (columns); for drawing.
Eigen::MatrixXcd paths(const Pulse& pulse, const Eigen::VectorXd& mode_hz, const std::vector<double>& times);

/// All pulses of one form, duration and detuning that close every mode (and are as robust as the form asks).
/// A pulse is a vector y: its mean square is |y|^2 (rad/s)^2, chi_ij = y^T coupling(eta_i eta_j) y. The first
/// part of y makes amplitudes that are even about the middle of the pulse, the rest odd ones; neither power
/// nor chi mixes the two, so the pulse of least power is even or odd, and only a limit of the peak can ask
/// for both.
class PulseSpace {
 public:
  PulseSpace(const Eigen::VectorXd& mode_hz, const LightForm& form, double duration, double detuning);

  /// Number of free parameters; 0 when the segments do not suffice.
  Eigen::Index dimension() const { return parts_[0].knots.cols() + parts_[1].knots.cols(); }

  /// A y with its signed chi.
  struct Best {
    Eigen::VectorXd y;
    double chi = 0;
  };
  /// The y of unit length that reaches the largest |chi| for weight_m = eta_im eta_jm; for
  /// Robust::motion_and_angle among those whose chi does not change with a common offset of the modes. chi is
  /// 0 when there is none.
  Best strongest(const Eigen::VectorXd& weight) const;
  /// The same without the condition on the angle: never weaker, and quicker.
  Best strongest_unchecked(const Eigen::VectorXd& weight) const;
  /// The y of least power that reaches |chi| and whose peak stays within `peak_hz`; empty when none was
  /// found.
  std::optional<Best> gentlest(const Eigen::VectorXd& weight, double chi, double peak_hz) const;

  /// |d loop_m / d w|^2 of each mode, in s^2.
  Eigen::VectorXd loop_slope_squares(const Eigen::VectorXd& y) const;
  /// d chi / d w for an offset common to all modes, in s.
  double chi_slope(const Eigen::VectorXd& weight, const Eigen::VectorXd& y) const;
  /// excursion() of the pulse by its values at the segments' ends: good enough to compare candidates.
  Eigen::VectorXd rough_excursion(const Pulse& pulse) const;
  /// The amplitudes.
  Pulse pulse(const Eigen::VectorXd& y) const;

 private:
  // Even or odd amplitudes.
  struct Part {
    Eigen::MatrixXd knots;       // all knots or steps x dimension, rad/s
    Eigen::MatrixXd area;        // dimension^2 x modes: the quadratic forms of Response::area
    Eigen::MatrixXd area_slope;  // their derivatives in the modes' frequencies
    Eigen::MatrixXd loop_slope;  // modes x dimension
  };
  Best strongest(const Eigen::VectorXd& weight, bool with_angle) const;
  // Over both parts at once, y as it stands.
  Eigen::MatrixXd joined_knots() const;
  Eigen::MatrixXd joined_form(Eigen::MatrixXd Part::*table, const Eigen::VectorXd& weight) const;
  static Eigen::MatrixXd form_of(const Eigen::MatrixXd& table, const Eigen::VectorXd& weight);

  LightForm form_;
  double duration_;
  double detuning_;
  std::array<Part, 2> parts_;
  // Modes x segments: integral of cos(mu t) e^{i w t} over the segment, and with a factor rising from 0 to 1.
  std::array<Eigen::MatrixXcd, 2> segment_integrals_;
};

}  // namespace isinglass
