// Attainable light and the global drive, against values from outside this tree.
#include <doctest/doctest.h>

#include <map>
#include <utility>

#include "targets/global_drive.h"
#include "targets/pair_search.h"
#include "targets/trap_support.h"

using namespace isinglass;
using namespace isinglass::support;

namespace {

constexpr double full_chi = std::numbers::pi / 4;

// Adjacent, at half the chain's length, end to end.
enum Distance { adjacent, middle, ends };

std::pair<int, int> pair_at(int ions, Distance distance) {
  const int left = (ions - 1 - ions / 2) / 2;
  if (distance == adjacent) return {ions / 2 - 1, ions / 2};
  return distance == middle ? std::pair{left, left + ions / 2} : std::pair{0, ions - 1};
}

const Chain& chain_of(int ions) {
  static std::map<int, Chain> chains;
  const auto known = chains.find(ions);
  return known != chains.end() ? known->second : chains.emplace(ions, standard_chain(ions)).first->second;
}

// One entry of the table, and the detunings in MHz at which its two figures are attained.
struct Entry {
  int ions;
  double duration_us;
  Distance distance;
  double rms_khz = 0, peak_khz = 0;
  double at_rms = 0, at_peak = 0;
};

PulseSpace space_of(const Entry& entry, double detuning_mhz) {
  return {chain_of(entry.ions).transverse_hz,
          {Shape::steps, 4 * entry.ions, Robust::none},
          entry.duration_us * 1e-6,
          detuning_mhz * 1e6};
}

Eigen::VectorXd weight_of(const Entry& entry) {
  const auto [a, b] = pair_at(entry.ions, entry.distance);
  return weights(standard_eta(chain_of(entry.ions)), a, b);
}

double least_rms_khz(const Entry& entry, double detuning_mhz) {
  const double chi = std::abs(space_of(entry, detuning_mhz).strongest(weight_of(entry)).chi);
  return std::sqrt(full_chi / chi) / (2 * std::numbers::pi) / 1e3;
}

// clang-format off
constexpr Entry table[] = {
    {2, 100, adjacent, 64.5, 74, 2.936219, 2.981719},
    {2, 200, adjacent, 31.4, 35, 2.929219, 2.994719},
    {2, 300, adjacent, 20.6, 22, 2.927052, 2.926885},
    {5, 100, adjacent, 73, 84, 2.877031, 2.877531},
    {5, 100, middle, 67, 76, 2.901031, 2.901031},
    {5, 100, ends, 66, 76, 2.969031, 2.969031},
    {5, 200, adjacent, 40, 48, 2.872781, 2.872781},
    {5, 200, middle, 36, 42, 2.916781, 2.916781},
    {5, 200, ends, 35, 42, 2.984281, 2.984281},
    {5, 300, adjacent, 30, 42, 2.871697, 2.859364},
    {5, 300, middle, 27, 35, 2.906864, 2.904864},
    {5, 300, ends, 27, 30, 2.983697, 2.952697},
    {10, 100, adjacent, 80, 96, 2.843088, 2.842588},
    {10, 100, middle, 90, 123, 2.889588, 2.857088},
    {10, 100, ends, 244, 366, 3.005588, 3.005588},
    {10, 200, adjacent, 36, 40, 2.858588, 2.858588},
    {10, 200, middle, 41, 47, 2.906088, 2.906088},
    {10, 200, ends, 45, 57, 2.999338, 3.000338},
    {10, 300, adjacent, 26, 32, 2.856755, 2.856755},
    {10, 300, middle, 28, 32, 2.904422, 2.904422},
    {10, 300, ends, 25, 29, 2.986922, 2.986922},
    {15, 100, adjacent, 90, 112, 2.836164, 2.836664},
    {15, 100, middle, 169, 283, 2.850664, 2.825164},
    {15, 200, adjacent, 43, 48, 2.852414, 2.852914},
    {15, 200, middle, 50, 58, 2.891164, 2.891414},
    {15, 200, ends, 88, 125, 3.003914, 3.008914},
    {15, 300, adjacent, 28, 30, 2.850498, 2.850498},
    {15, 300, middle, 36, 41, 2.892831, 2.892664},
    {15, 300, ends, 35, 43, 3.002331, 3.002331},
    {20, 100, adjacent, 95, 116, 2.834079, 2.833079},
    {20, 200, adjacent, 44, 50, 2.839829, 2.839829},
    {20, 200, middle, 70, 89, 2.900579, 2.900579},
    {20, 300, adjacent, 28, 31, 2.848412, 2.848412},
    {20, 300, middle, 37, 44, 2.898579, 2.898745},
    {20, 300, ends, 59, 88, 3.002412, 3.005579},
    {32, 100, adjacent, 195, 342, 2.950512, 2.946512},
    {32, 200, adjacent, 49, 63, 2.836512, 2.836512},
    {32, 200, middle, 168, 318, 2.840762, 2.846012},
    {32, 300, adjacent, 32, 36, 2.838512, 2.838512},
    {32, 300, middle, 51, 64, 2.893846, 2.893846},
    {32, 500, ends, 76, 216, 3.004312, 3.002312},
    {32, 600, ends, 37, 86, 3.001096, 3.001012}};
// clang-format on

}  // namespace

// Source: computed (an independent calculation; 3 MHz transverse, smallest spacing 4.5 um, 355 nm
// counter-propagating, 171Yb+, 4N steps): the rms and the peak in kHz that a full interaction takes, each the
// least over detunings. Both within 5 %, or less light than stated (a finer scan finds it). In one entry all
// 32 paths closed to 1e-24 cost more: 226 kHz instead of 195, which is reached when conditions that hold to
// 1e-9 are left out.
TEST_CASE("rms and peak of the light agree with the table of attainable pulses") {
  for (const Entry& entry : table) {
    CAPTURE(entry.ions);
    CAPTURE(entry.duration_us);
    CAPTURE(int(entry.distance));
    const double rms = least_rms_khz(entry, entry.at_rms);
    const bool closure_costs = entry.ions == 32 && entry.duration_us == 100;
    CHECK(rms < (closure_costs ? 1.17 : 1.05) * entry.rms_khz);
    CHECK(rms > 0.7 * entry.rms_khz);
    const PulseSpace space = space_of(entry, entry.at_peak);
    const auto found = space.gentlest(weight_of(entry), full_chi, 1.05e3 * entry.peak_khz);
    REQUIRE(found);
    const Pulse pulse = space.pulse(found->y);
    CHECK(pulse.peak() <= 1.05e3 * entry.peak_khz);
    const auto [a, b] = pair_at(entry.ions, entry.distance);
    const Response seen = response(pulse, chain_of(entry.ions).transverse_hz);
    CHECK(residual(seen, standard_eta(chain_of(entry.ions)), a, b) < 1e-24);
    CHECK(std::abs(weight_of(entry).dot(seen.area)) == doctest::Approx(full_chi).epsilon(1e-10));
  }
}

// Source: the same table: motion cannot cross the chain in the time. Said here as: no detuning of a scan of
// two points per 1 / duration gets by with less than 600 kHz rms.
TEST_CASE("what the table calls not attainable is far out of reach") {
  for (const Entry& entry :
       {Entry{15, 100, ends}, Entry{20, 100, middle}, Entry{20, 100, ends}, Entry{20, 200, ends},
        Entry{32, 100, middle}, Entry{32, 100, ends}, Entry{32, 200, ends}, Entry{32, 300, ends}}) {
    CAPTURE(entry.ions);
    CAPTURE(entry.duration_us);
    const Eigen::VectorXd& modes = chain_of(entry.ions).transverse_hz;
    const double width = 1 / entry.duration_us;  // MHz
    for (double mu = modes[0] * 1e-6 - 2 * width; mu < modes[entry.ions - 1] * 1e-6 + 2 * width;
         mu += width / 2)
      CHECK(least_rms_khz(entry, mu) > 600);
  }
}

// The search that users meet, at the same settings: it keeps a peak 5 % above the table's, and with light to
// spare takes no more than 5 % above the table's rms; 10 % where the detuning that needs less is narrower
// than the search looks (ten ions, half their length apart, in 100 us).
TEST_CASE("the search attains what the table says, up to ten ions") {
  for (const Entry& entry : table) {
    if (entry.ions > 10) continue;
    CAPTURE(entry.ions);
    CAPTURE(entry.duration_us);
    CAPTURE(int(entry.distance));
    const Chain& chain = chain_of(entry.ions);
    const auto lit = [&](double peak_khz) {
      const LightLimits limits{
          {Shape::steps, 4 * entry.ions, Robust::none}, {entry.duration_us * 1e-6}, {}, peak_khz * 1e3};
      return find_light(chain, standard_eta(chain), limits, {}, {pair_at(entry.ions, entry.distance)}, 1)
          .light[0];
    };
    const auto limited = lit(1.05 * entry.peak_khz);
    REQUIRE(limited);
    CHECK(limited->pulse.peak() <= 1.05e3 * entry.peak_khz);
    const auto free = lit(10 * entry.peak_khz);
    REQUIRE(free);
    const bool narrow = entry.ions == 10 && entry.duration_us == 100 && entry.distance == middle;
    CHECK(free->pulse.rms() < (narrow ? 1.1e3 : 1.05e3) * entry.rms_khz);
  }
}

// Source: common practice, and Britton et al., Nature 484, 489 (2012): couplings fall as 1 / distance^a with
// a in (0, 3); computed range at ten ions: 0.02 to 2.94.
TEST_CASE("the global drive's exponent runs from about 0.02 to 2.9 with the detuning") {
  const Chain chain = standard_chain(10);
  const double dk = wave_number_difference(355e-9, std::numbers::pi);
  const double top = chain.transverse_hz[9];
  double last = 0;
  for (const double above : {50.0, 1e3, 1e4, 1e5, 1e6, 1e7}) {
    const auto exponent = range_exponent(drive_couplings(chain, dk, top + above, 100e3));
    REQUIRE(exponent);
    CHECK(*exponent > last);
    last = *exponent;
  }
  const auto nearest = range_exponent(drive_couplings(chain, dk, top + 100, 100e3));
  CHECK(*nearest < 0.03);
  CHECK(last > 2.85);
  CHECK(last < 3);
  // Between two modes the couplings change sign.
  CHECK_FALSE(
      range_exponent(drive_couplings(chain, dk, (chain.transverse_hz[4] + chain.transverse_hz[5]) / 2, 1e5)));
}

// Source: computed (direct sum over modes in Lamb-Dicke factors), and chi -> -J t for a long constant drive.
TEST_CASE("J agrees with a direct sum and with the chi of a long pulse") {
  const Chain chain = standard_chain(6);
  const double dk = wave_number_difference(355e-9, std::numbers::pi);
  const Eigen::MatrixXd eta = standard_eta(chain);
  const double two_pi = 2 * std::numbers::pi;
  const double mu = chain.transverse_hz[5] + 80e3, rabi = 40e3;
  const Eigen::MatrixXd couplings = drive_couplings(chain, dk, mu, rabi);
  for (int i = 0; i < 6; ++i) {
    CHECK(couplings(i, i) == 0);
    for (int k = 0; k < 6; ++k) {
      if (i == k) continue;
      double sum = 0;
      for (int m = 0; m < 6; ++m) {
        const double w = two_pi * chain.transverse_hz[m];
        sum += eta(i, m) * eta(k, m) * w / (std::pow(two_pi * mu, 2) - w * w);
      }
      CHECK(couplings(i, k) == doctest::Approx(std::pow(two_pi * rabi, 2) * sum / two_pi).epsilon(1e-10));
      CHECK(couplings(i, k) > 0);
    }
  }
  const Pulse flat{Shape::steps, 4e-3, mu, Eigen::VectorXd::Constant(8, rabi)};
  const double chi = weights(eta, 2, 3).dot(response(flat, chain.transverse_hz).area);
  CHECK(chi == doctest::Approx(-two_pi * couplings(2, 3) * 4e-3).epsilon(0.01));
}

// Source: common practice: nearest-neighbour J / 2 pi of a few hundred Hz to 1 kHz.
TEST_CASE("common settings give a nearest-neighbour J of some hundred Hz") {
  const Chain chain = standard_chain(10);
  const double dk = wave_number_difference(355e-9, std::numbers::pi);
  const Eigen::MatrixXd couplings = drive_couplings(chain, dk, chain.transverse_hz[9] + 60e3, 200e3);
  CHECK(couplings(4, 5) > 200);
  CHECK(couplings(4, 5) < 1000);
}
