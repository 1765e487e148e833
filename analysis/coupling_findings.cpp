#include "analysis/coupling_findings.h"

#include <algorithm>
#include <cmath>
#include <numbers>
#include <string>

#include "analysis/cautions.h"
#include "analysis/coupling_contradiction.h"
#include "base/number_text.h"
#include "base/outside_text.h"

namespace coilassay {

namespace {

using Complex = std::complex<double>;
constexpr double kTwoPi = 2 * std::numbers::pi;
constexpr double kBeyondChance = 3.5;      // standard uncertainties
constexpr double kShortCounts = 0.005;     // of the shorted inductance
constexpr double kShortLarge = 0.10;
constexpr double kShortRatio = 30;         // w L over R of the shorted winding
constexpr double kSlopeCounts = 0.02;      // of the open inductance over the frequencies used
constexpr double kCancelCounts = 0.2;      // half-width over k, or over 1 - k
constexpr double kOtherFrequency = 1.02;   // ratio
constexpr double kFarFrequency = 3;        // ratio over which inductances of real windings are seen to change

std::string text(double value, Unit unit, int digits = 3) { return to_text(value, unit, Script::utf8, digits); }

std::span<const double> unknowns(const CouplingSolution& s) {
  return {s.fit.parameters.data(), static_cast<std::size_t>(s.fit.parameters.size())};
}

bool has(const CouplingSolution& s, std::initializer_list<CouplingItem> items) {
  return std::any_of(s.readings.traces.begin(), s.readings.traces.end(), [&](const CouplingTrace& t) {
    return std::find(items.begin(), items.end(), t.item) != items.end();
  });
}

const CouplingTrace* find_trace(const CouplingSolution& s, CouplingItem item) {
  for (const CouplingTrace& t : s.readings.traces) {
    if (t.item == item) return &t;
  }
  return nullptr;
}

/// What to add so that k is determined, by what is there.
std::string what_to_add(const CouplingSolution& s) {
  using enum CouplingItem;
  const bool first = has(s, {primary_open}), second = has(s, {secondary_open});
  const std::string look_again = "what is needed was given, and does not tell it: look at the values, and measure where the inductances outweigh the resistances";
  if (has(s, {ratio_forward}) && !has(s, {ratio_reverse})) {
    return first && second ? look_again : "add --ratio-reverse (k² is the product of both), or both windings open";
  }
  if (has(s, {ratio_reverse}) && !has(s, {ratio_forward})) {
    return first && second ? look_again : "add --ratio-forward (k² is the product of both), or both windings open";
  }
  if (has(s, {ratio_reverse})) return look_again;
  if (has(s, {aiding, opposing})) {
    std::vector<std::string> add;
    if (!has(s, {aiding})) add.emplace_back("--aiding");
    if (!has(s, {opposing})) add.emplace_back("--opposing");
    if (!first) add.emplace_back("--primary-open");
    if (!second) add.emplace_back("--secondary-open");
    if (add.empty()) return look_again;
    std::string words = "add " + add.front();
    for (std::size_t i = 1; i < add.size(); ++i) words += (i + 1 < add.size() ? ", " : " and ") + add[i];
    return words;
  }
  const bool short1 = has(s, {primary_short}), short2 = has(s, {secondary_short});
  if ((first && short1) || (second && short2)) return look_again;
  if (first && second) return "add --primary-short (for close coupling), or --aiding and --opposing, or a voltage ratio (for loose coupling)";
  if (first) return "add --primary-short, which gives k by itself; with --secondary-open also M and n";
  if (short1) return "add --primary-open, which gives k by itself; with --secondary-open also M and n";
  if (second) return "add --secondary-short, which gives k by itself; with --primary-open also M and n";
  return "add --secondary-open, which gives k by itself; with --primary-open also M and n";
}

void note_refusals(Measurement& m, const CouplingSolution& s, const CouplingVerdict& v) {
  if (v.short_over_open > 0) {
    m.findings.push_back({"short_above_open", Severity::refusal,
                          "a winding measures " + text(v.short_over_open, Unit::one) +
                              " times as much with the other shorted as with it open, and a short can only lower it: the two files are "
                              "exchanged, or the open winding resonates with its capacitance below the sweep",
                          "k", v.short_over_open, Unit::one});
    return;
  }
  if (!s.k_determined) {
    m.findings.push_back({"too_few_inputs", Severity::refusal, "what was measured does not determine k: " + what_to_add(s), "k",
                          static_cast<double>(s.readings.traces.size()), Unit::one});
    return;
  }
  if (v.beyond && s.squared) {
    m.findings.push_back({"short_above_open", Severity::refusal,
                          "a winding measures more with the other shorted than with it open, by more than the tolerances allow (k² would "
                          "be " + text(s.fit.parameters[kCoupling], Unit::one) +
                              "): open and short are exchanged, were read at different frequencies or levels, or the open winding "
                              "resonates with its capacitance",
                          "k", s.fit.parameters[kCoupling], Unit::one});
    return;
  }
  if (v.beyond) {
    m.findings.push_back({"k_above_one", Severity::refusal,
                          "these values force k to " + text(s.fit.parameters[kCoupling], Unit::one, 4) +
                              ", and no pair of windings has more than 1: look for a value of the wrong winding or unit, a ratio the "
                              "wrong way round, different frequencies or levels, or a winding that resonates",
                          "k", s.fit.parameters[kCoupling], Unit::one});
  }
}

void note_cancellation(Measurement& m, const CouplingSolution& s, const CouplingVerdict& v) {
  if (!s.k_determined || v.beyond) return;
  const std::string loose = "for loose coupling use voltage ratios both ways, or series aiding and opposing";
  const std::string close = "for close coupling short one winding and measure the other";
  if (v.at_high && v.at_low && s.widened > 1) {
    m.findings.push_back({"inputs_disagree", Severity::refusal, "the inputs contradict each other so far that they leave any k possible", "k", s.widened, Unit::one});
  } else if (v.at_high && v.at_low) {
    m.findings.push_back({"k_cancellation", Severity::refusal, "the inputs leave any k possible: better known values are needed", "k", 1, Unit::one});
  } else if (v.at_low) {
    m.findings.push_back({"k_cancellation", Severity::refusal,
                          "k follows from a small difference of nearly equal numbers and cannot be told from zero; it is at most " +
                              text(v.high, Unit::one, 2) + ". " + (s.squared ? "Instead of open and short, " + loose : "Better known values are needed: " + loose),
                          "k", v.high, Unit::one});
  } else if (v.at_high) {
    m.findings.push_back({"k_cancellation", Severity::refusal,
                          (s.squared ? "what the resistances of winding and short leave hides the leakage; k is at least "
                                     : "1 - k follows from a small difference of nearly equal numbers and cannot be told from zero; k is at least ") +
                              text(v.low, Unit::one, 3) + (s.squared ? ". Measure at a higher frequency" : ". Instead, " + close),
                          "k", v.low, Unit::one});
  } else {
    const double half = std::fmax(v.high - v.best, v.best - v.low), size = std::fabs(v.best);
    if (half > kCancelCounts * size) {
      m.findings.push_back({"k_cancellation", Severity::note,
                            "k is a small difference of nearly equal numbers here: its interval is ±" + to_percent_text(half / size) + " of it; " + loose,
                            "k", half / size, Unit::one});
    } else if (size > 0.9 && half > 2 * kCancelCounts * (1 - size)) {
      m.findings.push_back({"k_cancellation", Severity::note,
                            "the leakage is a small difference of nearly equal numbers here: its interval is ±" +
                                to_percent_text(half / (1 - size)) + " of it; " + close,
                            "one_minus_k", half / (1 - size), Unit::one});
    }
  }
}

void note_sign(Measurement& m, const CouplingSolution& s, const CouplingRequest& request) {
  if (!s.k_determined || s.readings.sign_shown || request.dots || (m.find("k") == nullptr && m.bounds.empty())) return;
  m.findings.push_back({"sign_unknown", Severity::note,
                        "nothing tells how the windings' dots lie, so M and k are given as positive: state --dots same or opposite",
                        "M", 1, Unit::one});
}

/// What resistance and link do to the inductance read with the other winding shorted, at the lowest frequency used.
void note_short(Measurement& m, const CouplingSolution& s) {
  if (!s.k_determined) return;
  if (!s.link_referred) {
    const bool stated = std::any_of(s.priors.begin(), s.priors.end(), [](const CouplingPrior& p) { return p.error.basis == "stated"; });
    if (stated) {
      m.findings.push_back({"imperfect_short", Severity::note,
                            "the inductance of the shorted winding is not known, so neither its resistance nor the link is taken out: "
                            "measure it open too", "k", 0, Unit::one});
    }
    return;
  }
  const WindingPair pair = s.pair_at(unknowns(s));
  double largest = 0, lowest_ratio = HUGE_VAL;
  bool seen = false;
  std::string at;
  for (const CouplingTrace& t : s.readings.traces) {
    const bool first = t.item == CouplingItem::primary_short;
    if (!first && t.item != CouplingItem::secondary_short) continue;
    const CouplingReading& r = t.readings.front();
    WindingPair ideal = pair;
    ideal.r1_ohm = ideal.r2_ohm = ideal.skin1_ohm = ideal.skin2_ohm = ideal.link_h = ideal.link_ohm = 0;
    const auto read = [&](const WindingPair& p) {
      return std::isfinite(r.omega) ? predicted(t.item, p, r.omega).imag() / r.omega : predicted_ideal(t.item, p);
    };
    const double change = read(pair) / read(ideal) - 1;
    if (std::isfinite(r.omega)) {
      const double resistance = (first ? pair.r2_ohm : pair.r1_ohm) + pair.link_ohm;
      if (resistance > 0) lowest_ratio = std::fmin(lowest_ratio, r.omega * (first ? pair.l2_h : pair.l1_h) / resistance);
    }
    seen = seen || !r.real;
    if (std::fabs(change) > std::fabs(largest)) {
      largest = change;
      at = std::string(in_words(t.item)) + (std::isfinite(r.omega) ? " at " + text(r.omega / kTwoPi, Unit::hertz) : "");
    }
  }
  if (std::fabs(largest) < kShortCounts && !(lowest_ratio < kShortRatio)) return;
  const bool large = std::fabs(largest) > kShortLarge && !seen;
  const std::string low = lowest_ratio < kShortRatio ? "; ωL of the shorted winding is only " + text(lowest_ratio, Unit::one, 2) + " times its resistance"
                                                     : "";
  m.findings.push_back({"imperfect_short", large ? Severity::caution : Severity::note,
                        "resistance and link of the short change the value read with the " + at + " by " + to_percent_text(std::fabs(largest)) +
                            ", which is taken out" + low + (large ? ". Measure at a higher frequency, with a shorter link" : ""),
                        "L_leak_1", largest, Unit::one});
}

/// The slope of an open winding's inductance that its capacitance makes.
void note_capacitance(Measurement& m, const CouplingSolution& s) {
  const WindingPair pair = s.pair_at(unknowns(s));
  const bool modelled = pair.c1_f > 0 || pair.c2_f > 0;
  for (const CouplingItem item : {CouplingItem::primary_open, CouplingItem::secondary_open}) {
    double low = HUGE_VAL, high = 0, l_low = 0, l_high = 0;
    for (const CouplingTrace& t : s.readings.traces) {
      if (t.item != item) continue;
      for (const CouplingReading& r : t.readings) {
        if (!std::isfinite(r.omega)) continue;
        const double l = r.real ? r.size : r.z.imag() / r.omega;
        if (r.omega < low) low = r.omega, l_low = l;
        if (r.omega > high) high = r.omega, l_high = l;
      }
    }
    if (!(high > low) || !(l_low > 0)) continue;
    const double rise = l_high > 0 ? l_high / l_low - 1 : HUGE_VAL;
    if (rise < kSlopeCounts && !(l_high <= 0)) continue;
    if (l_high > 0 && l_high < l_low) continue;
    const std::string words = std::string(in_words(item)) + (l_high > 0 ? ": the inductance rises by " + to_percent_text(rise) : ": the winding resonates") +
                              " between " + text(low / kTwoPi, Unit::hertz) + " and " + text(high / kTwoPi, Unit::hertz);
    if (modelled) {
      m.findings.push_back({"winding_capacitance", Severity::note,
                            words + ", as " + (pair.c1_f > 0 && s.side1 ? text(pair.c1_f, Unit::farad) + " across the primary" : "") +
                                (pair.c1_f > 0 && pair.c2_f > 0 && s.side1 && s.side2 ? " and " : "") +
                                (pair.c2_f > 0 && s.side2 ? text(pair.c2_f, Unit::farad) + " across the secondary" : "") +
                                " make it; L_1, L_2 and k are those at low frequency unless --at asks for others",
                            item == CouplingItem::primary_open ? "L_1" : "L_2", rise, Unit::one});
    } else {
      m.findings.push_back({"winding_capacitance", Severity::caution,
                            words + ", and these points are too few to take the winding's capacitance out: give values at three "
                                    "frequencies or more, a sweep, or a lower frequency",
                            item == CouplingItem::primary_open ? "L_1" : "L_2", rise, Unit::one});
    }
    return;   // once is enough: both windings show what is across either
  }
}

void note_frequencies(Measurement& m, const CouplingSolution& s) {
  double low = HUGE_VAL, high = 0;
  for (const CouplingTrace& t : s.readings.traces) {
    for (const CouplingReading& r : t.readings) {
      if (!r.real || !std::isfinite(r.omega) || is_ratio(t.item)) continue;
      low = std::fmin(low, r.omega);
      high = std::fmax(high, r.omega);
    }
  }
  const WindingPair pair = s.pair_at(unknowns(s));
  const bool modelled = pair.c1_f > 0 || pair.c2_f > 0 || (pair.r1_ohm > 0 && pair.r2_ohm > 0);
  if (!(high > kOtherFrequency * low) || modelled || m.has_finding("winding_capacitance")) return;
  const bool far = high > kFarFrequency * low && s.k_determined;
  m.findings.push_back({"mixed_frequencies", far ? Severity::refusal : Severity::caution,
                        "the values were read at frequencies from " + text(low / kTwoPi, Unit::hertz) + " to " + text(high / kTwoPi, Unit::hertz) +
                            ", and without resistances and capacitances nothing says how they change between: read all at one "
                            "frequency, or state --winding-resistance",
                        "k", high / low, Unit::one});
  if (far) withhold_coupling(m, Withheld::coupled);
}

void note_reciprocity(Measurement& m, const CouplingSolution& s) {
  const CouplingTrace* one = find_trace(s, CouplingItem::mutual_12);
  const CouplingTrace* two = find_trace(s, CouplingItem::mutual_21);
  double m12 = 0, m21 = 0, difference = 0, u = 0;
  if (one != nullptr && two != nullptr && one->readings.size() == two->readings.size()) {
    // Point by point: what both share, the model included, is not in the difference.
    double sum = 0, square = 0, weight = 0;
    std::size_t unlike = 0;
    double previous = 0, serial = 0;
    for (std::size_t i = 0; i < one->readings.size(); ++i) {
      const CouplingReading& a = one->readings[i];
      const CouplingReading& b = two->readings[i];
      if (std::fabs(a.omega / b.omega - 1) > 1e-6) ++unlike;
      const double middle = (std::abs(a.z) + std::abs(b.z)) / 2;
      const double d = ((a.z - b.z) / Complex(0, middle)).real();
      sum += d;
      square += d * d;
      serial += d * previous;
      previous = d;
      weight += 1;
      m12 += a.z.imag() / a.omega;
      m21 += b.z.imag() / b.omega;
    }
    if (unlike > 0 || weight < 1) return;
    m12 /= weight;
    m21 /= weight;
    difference = sum / weight;
    const double variance = std::fmax(square / weight - difference * difference, 0);
    const double noise = weight > 3 ? std::sqrt(variance / weight) : std::hypot(one->readings[0].u_size, two->readings[0].u_size);
    // The accuracy of S can set both directions apart.
    double apart = 0;
    const CouplingReading& a = one->readings[one->readings.size() / 2];
    for (const auto& [error, effect] : a.shared) {
      if (s.readings.shared[error].source.starts_with("scattering")) apart += std::norm(effect);
    }
    u = std::hypot(noise, std::sqrt(apart));
    u = std::fmax(u, 1e-6);
  } else {
    const CouplingTrace* forward = find_trace(s, CouplingItem::ratio_forward);
    const CouplingTrace* reverse = find_trace(s, CouplingItem::ratio_reverse);
    const CouplingTrace* l1 = find_trace(s, CouplingItem::primary_open);
    const CouplingTrace* l2 = find_trace(s, CouplingItem::secondary_open);
    if (forward == nullptr || reverse == nullptr || l1 == nullptr || l2 == nullptr) return;
    double relative = 0;
    const auto value = [&](const CouplingTrace& t) {
      const CouplingReading& r = t.readings.front();
      relative = std::hypot(relative, r.real ? r.u_size / std::fabs(r.size) : r.u_size);
      return r.real ? std::fabs(r.size) : is_ratio(t.item) ? std::abs(r.z) : r.z.imag() / r.omega;
    };
    m21 = value(*forward) * value(*l1);
    m12 = value(*reverse) * value(*l2);
    difference = (m12 - m21) / ((std::fabs(m12) + std::fabs(m21)) / 2);
    u = relative;
  }
  if (!(std::fabs(difference) > kBeyondChance * u)) return;
  const double figure = std::fabs(difference);
  m.findings.push_back({"not_reciprocal", Severity::caution,
                        "M seen from the primary is " + text(m21, Unit::henry, 4) + " and from the secondary " + text(m12, Unit::henry, 4) +
                            ", which differ by " + to_percent_text(figure) +
                            " and must be the same for any pair of windings: check which port is which, the order of a two-port file's "
                            "columns, and that all was read at one frequency and level",
                        "M", figure, Unit::one});
}

/// What chi-square of a solution that fits may be; third differences know a scatter to a tenth only.
double fine_chi_square(const CouplingSolution& s) {
  const double n = std::fmax(s.degrees, 1);
  return 1.3 * n + 4 * std::sqrt(2 * n);
}

/// Which exchange of inputs, if any, makes them agree.
bool note_exchange(Measurement& m, const CouplingSolution& s) {
  using enum CouplingItem;
  const double before = s.fit.chi_square;
  const auto try_exchange = [&](std::initializer_list<std::pair<CouplingItem, CouplingItem>> pairs, bool files_only) {
    std::vector<CouplingTrace> traces = s.readings.traces;
    bool any = false;
    for (CouplingTrace& t : traces) {
      if (files_only && !t.scatter) continue;
      for (const auto& [a, b] : pairs) {
        const CouplingItem old = t.item;
        if (old == a) t.item = b;
        if (old == b) t.item = a;
        any = any || t.item != old;
        if (t.item != old) break;
      }
    }
    return any ? with_traces(s, std::move(traces)).fit.chi_square : HUGE_VAL;
  };
  struct Exchange {
    double chi_square;
    std::string words;
  };
  std::vector<Exchange> tried;
  if (has(s, {mutual_12, mutual_21})) {
    tried.push_back({try_exchange({{primary_open, secondary_open}, {mutual_12, mutual_21}}, true),
                     "the two ports of the file were exchanged: give --pair 2,1"});
  }
  tried.push_back({try_exchange({{ratio_forward, ratio_reverse}}, false), "the forward and the reverse ratio were exchanged"});
  tried.push_back({try_exchange({{primary_short, secondary_short}}, false), "the two shorted values were exchanged"});
  tried.push_back({try_exchange({{primary_open, secondary_open}}, false), "the two open values were exchanged"});
  const auto best = std::min_element(tried.begin(), tried.end(), [](const Exchange& a, const Exchange& b) { return a.chi_square < b.chi_square; });
  const double fine = fine_chi_square(s);
  if (!(best->chi_square < fine) || !(best->chi_square < before / 4)) return false;
  m.findings.push_back({"swapped_inputs", Severity::refusal, "the inputs do not fit each other, but would if " + best->words, "k", before, Unit::one});
  withhold_coupling(m);
  return true;
}

void note_disagreement(Measurement& m, const CouplingSolution& s) {
  double worst_misfit = 1;
  std::string worst;
  for (std::size_t t = 0; t < s.checks.size(); ++t) {
    if (s.checks[t].misfit > worst_misfit) worst_misfit = s.checks[t].misfit, worst = in_words(s.readings.traces[t].item);
  }
  const bool said = m.has_finding("inputs_disagree");
  const bool disagree = s.widened > 1, misfit = worst_misfit > 1;
  if (!disagree && !misfit) return;
  const CouplingSolution plain = as_scattered(s);
  const bool exchanged = note_exchange(m, plain);
  bool link = false;
  if (s.link_referred && has(s, {CouplingItem::primary_short, CouplingItem::secondary_short})) {
    const CouplingSolution freed = with_free_link(plain);
    const double found = freed.fit.parameters[kLink];
    link = found > 0 && freed.fit.chi_square < plain.fit.chi_square - 25 && freed.fit.chi_square < fine_chi_square(plain);
    if (link) {
      m.findings.push_back({"imperfect_short", Severity::caution,
                            "the inputs fit each other if the short itself had " + text(found, Unit::henry, 2) +
                                ": measure it, state it with --link-inductance, or use a shorter link",
                            "L_leak_1", found, Unit::henry});
    }
  }
  if (disagree && !said && !exchanged && !m.has_finding("not_reciprocal")) {
    // The one without which the others agree best.
    std::size_t odd = 0;
    double least = HUGE_VAL;
    for (std::size_t t = 0; t < s.readings.traces.size(); ++t) {
      if (s.readings.traces[t].scatter) continue;
      const double left = chi_square_without(s, t);
      if (left < least) least = left, odd = t;
    }
    const std::string which = least < HUGE_VAL ? ": without the " + std::string(in_words(s.readings.traces[odd].item)) + " the others agree best" : "";
    m.findings.push_back({"inputs_disagree", Severity::caution,
                          "the inputs lie " + text(s.widened, Unit::one, 2) + " times further apart than their uncertainties allow" + which +
                              "; all intervals are widened by that factor. Measure again, all at one frequency and level",
                          "k", s.widened, Unit::one});
  }
  if (misfit && !exchanged && !link) {
    m.findings.push_back({"model_misfit", Severity::caution,
                          "two windings with resistance and capacitance leave " + text(worst_misfit, Unit::one, 2) +
                              " times the noise of the sweep (worst: " + worst + "); the intervals are widened by it. A capacitance between "
                              "the windings, a core whose loss or permeability changes with frequency, or a fixture do that: use the lower "
                              "part of the sweep",
                          "k", worst_misfit, Unit::one});
  }
}

/// A winding with more turns gives more volts than the test puts in.
void caution_step_up(Measurement& m, const CouplingSolution& s, const CouplingRequest& request) {
  const WindingPair pair = s.pair_at(unknowns(s));
  if (!s.k_determined || !(pair.m_squared_h2 > 0)) return;
  const double mutual = std::sqrt(pair.m_squared_h2);
  const double forward = mutual / pair.l1_h, reverse = mutual / pair.l2_h;
  const Estimate* n = m.find("n");
  if (n == nullptr) return;   // the ratio of the windings is not known
  const double step = std::fmax(forward, reverse);
  double volts = s.readings.peak_v;
  if (request.bench.level) volts = std::fmax(std::isfinite(volts) ? volts : 0, request.bench.level->value);
  const std::string side = forward >= reverse ? "secondary" : "primary";
  for (Caution& caution : coupling_cautions({step, volts, side})) m.cautions.push_back(std::move(caution));
}

}  // namespace

void judge_coupling(Measurement& m, const CouplingSolution& s, const CouplingVerdict& v, const CouplingRequest& request) {
  note_refusals(m, s, v);
  note_cancellation(m, s, v);
  if (v.labels_swapped) {
    m.findings.push_back({"swapped_inputs", Severity::caution,
                          "series aiding measures less than series opposing: they are exchanged, and taken the other way round", "M",
                          s.fit.parameters[kCoupling], Unit::one});
  }
  note_sign(m, s, request);
  note_reciprocity(m, s);
  note_disagreement(m, s);
  note_short(m, s);
  note_capacitance(m, s);
  note_frequencies(m, s);
  caution_step_up(m, s, request);
  if (m.find("k") != nullptr && m.find("n") == nullptr) m.advice.push_back("with the other winding open as well, M, n and its leakage follow too");
  const auto independent = std::count_if(s.readings.traces.begin(), s.readings.traces.end(), [](const CouplingTrace& t) {
    return !t.scatter && t.kind == 'B' && t.basis == "stated";
  });
  if (m.find("k") != nullptr && independent > 1 && !request.common_accuracy) {
    m.advice.push_back("tolerances of several values count as independent errors; an error that all share (one meter, one range) is "
                       "stated with --common-accuracy and leaves k alone");
  }
}

}  // namespace coilassay
