#include "analysis/coupling_circuit.h"

#include <array>
#include <cmath>
#include <numbers>
#include <utility>

namespace coilassay {

namespace {

using Complex = std::complex<double>;

struct Names {
  std::string_view name, words, option;
};
constexpr std::array kNames = {Names{"primary_open", "primary open", "--primary-open"},
                               Names{"primary_short", "primary shorted", "--primary-short"},
                               Names{"secondary_open", "secondary open", "--secondary-open"},
                               Names{"secondary_short", "secondary shorted", "--secondary-short"},
                               Names{"aiding", "series aiding", "--aiding"},
                               Names{"opposing", "series opposing", "--opposing"},
                               Names{"ratio_forward", "forward ratio", "--ratio-forward"},
                               Names{"ratio_reverse", "reverse ratio", "--ratio-reverse"},
                               Names{"mutual_12", "Z12", "FILE"},
                               Names{"mutual_21", "Z21", "FILE"}};

const Names& names(CouplingItem item) { return kNames[static_cast<std::size_t>(item)]; }

/// Admittances between the terminals; only the square of Y12 is needed by items that do not show the sign.
struct Admittances {
  Complex y11, y22, y12_squared, det, y12;
};

Admittances admittances(const WindingPair& p, double omega) {
  const double skin = std::sqrt(omega / (2 * std::numbers::pi * p.skin_hz));
  const Complex z1 = Complex(p.r1_ohm, omega * p.l1_h) + Complex(1, 1) * (p.skin1_ohm * skin);
  const Complex z2 = Complex(p.r2_ohm, omega * p.l2_h) + Complex(1, 1) * (p.skin2_ohm * skin);
  const Complex det = z1 * z2 + omega * omega * p.m_squared_h2;
  const Complex z12(0, omega * p.m_h);
  return {z2 / det + Complex(0, omega * p.c1_f), z1 / det + Complex(0, omega * p.c2_f),
          -omega * omega * p.m_squared_h2 / (det * det), det, -z12 / det};
}

}  // namespace

std::string_view name(CouplingItem item) { return names(item).name; }
std::string_view in_words(CouplingItem item) { return names(item).words; }
std::string_view option_of(CouplingItem item) { return names(item).option; }

bool is_ratio(CouplingItem item) { return item == CouplingItem::ratio_forward || item == CouplingItem::ratio_reverse; }

bool shows_sign(CouplingItem item) {
  return is_ratio(item) || item == CouplingItem::aiding || item == CouplingItem::opposing ||
         item == CouplingItem::mutual_12 || item == CouplingItem::mutual_21;
}

Complex predicted(CouplingItem item, const WindingPair& p, double omega) {
  const Admittances y = admittances(p, omega);
  const Complex whole = y.y11 * y.y22 - y.y12_squared;   // determinant of the admittance matrix
  const Complex link(p.link_ohm, omega * p.link_h);
  switch (item) {
    case CouplingItem::primary_open: return y.y22 / whole;
    case CouplingItem::secondary_open: return y.y11 / whole;
    case CouplingItem::primary_short: return 1.0 / (y.y11 - y.y12_squared * link / (1.0 + link * y.y22));
    case CouplingItem::secondary_short: return 1.0 / (y.y22 - y.y12_squared * link / (1.0 + link * y.y11));
    case CouplingItem::aiding: return (y.y11 + y.y22 - 2.0 * y.y12) / whole;
    case CouplingItem::opposing: return (y.y11 + y.y22 + 2.0 * y.y12) / whole;
    case CouplingItem::ratio_forward: return -y.y12 / y.y22;
    case CouplingItem::ratio_reverse: return -y.y12 / y.y11;
    case CouplingItem::mutual_12:
    case CouplingItem::mutual_21: return -y.y12 / whole;
  }
  return {};
}

double predicted_ideal(CouplingItem item, const WindingPair& p) {
  switch (item) {
    case CouplingItem::primary_open: return p.l1_h;
    case CouplingItem::secondary_open: return p.l2_h;
    case CouplingItem::primary_short: return p.l1_h - p.m_squared_h2 / (p.l2_h + p.link_h);
    case CouplingItem::secondary_short: return p.l2_h - p.m_squared_h2 / (p.l1_h + p.link_h);
    case CouplingItem::aiding: return p.l1_h + p.l2_h + 2 * p.m_h;
    case CouplingItem::opposing: return p.l1_h + p.l2_h - 2 * p.m_h;
    case CouplingItem::ratio_forward: return p.m_h / p.l1_h;
    case CouplingItem::ratio_reverse: return p.m_h / p.l2_h;
    case CouplingItem::mutual_12:
    case CouplingItem::mutual_21: return p.m_h;
  }
  return 0;
}

}  // namespace coilassay
