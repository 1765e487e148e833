#include "acquire/table_sweep.h"

#include <fmt/format.h>

#include <algorithm>
#include <cmath>
#include <numbers>

#include "base/outside_text.h"

namespace coilassay {
namespace {

using Complex = std::complex<double>;

/// One pair of numbers as impedance.
Complex impedance(const SweepPlan& plan, double frequency_hz, double a, double b, double radians_per_unit, double reference_ohm) {
  const double w = 2 * std::numbers::pi * frequency_hz;
  const Complex j(0, 1);
  switch (plan.pair) {
    case SweepPair::re_im:
    case SweepPair::magnitude_phase: {
      Complex value(a, b);
      if (plan.pair == SweepPair::magnitude_phase) {
        const double magnitude = plan.decibels ? std::pow(10.0, a / 20) : a;
        value = Complex(magnitude * std::cos(b * radians_per_unit), magnitude * std::sin(b * radians_per_unit));
      }
      if (plan.parameter == 'Y') return 1.0 / value;
      if (plan.parameter == 'S') return reference_ohm * (1.0 + value) / (1.0 - value);
      return value;
    }
    case SweepPair::magnitude: {
      const double size = plan.decibels ? std::pow(10.0, a / 20) : std::fabs(a);
      return {plan.parameter == 'Y' ? 1 / size : size, std::nan("")};
    }
    case SweepPair::l_s_r_s: return {b, w * a};
    case SweepPair::l_s_q: return {std::fabs(w * a) / b, w * a};
    case SweepPair::l_s_d: return {std::fabs(w * a) * b, w * a};
    case SweepPair::l_p_r_p: return 1.0 / (1 / b + 1.0 / (j * w * a));
    case SweepPair::l_p_q: return 1.0 / (1 / (b * std::fabs(w * a)) + 1.0 / (j * w * a));
    case SweepPair::l_p_d: return 1.0 / (b / std::fabs(w * a) + 1.0 / (j * w * a));
    case SweepPair::c_s_r_s: return {b, -1 / (w * a)};
    case SweepPair::c_s_d: return {b / std::fabs(w * a), -1 / (w * a)};
    case SweepPair::c_p_r_p: return 1.0 / (1 / b + j * w * a);
    case SweepPair::c_p_d: return 1.0 / (b * std::fabs(w * a) + j * w * a);
    case SweepPair::c_p_g: return 1.0 / (b + j * w * a);
  }
  return {};
}

std::string as_read(const SweepPlan& plan) {
  switch (plan.pair) {
    case SweepPair::re_im:
    case SweepPair::magnitude_phase: return std::string(1, plan.parameter);
    case SweepPair::magnitude: return "|Z|";
    case SweepPair::l_s_r_s: return "L_s R_s";
    case SweepPair::l_s_q: return "L_s Q";
    case SweepPair::l_s_d: return "L_s D";
    case SweepPair::l_p_r_p: return "L_p R_p";
    case SweepPair::l_p_q: return "L_p Q";
    case SweepPair::l_p_d: return "L_p D";
    case SweepPair::c_s_r_s: return "C_s R_s";
    case SweepPair::c_s_d: return "C_s D";
    case SweepPair::c_p_r_p: return "C_p R_p";
    case SweepPair::c_p_d: return "C_p D";
    case SweepPair::c_p_g: return "C_p G";
  }
  return "";
}

const Channel* channel_at(const Capture& capture, std::size_t column) {
  for (const Channel& channel : capture.channels) {
    if (channel.column == column + 1) return &channel;
  }
  return nullptr;
}

/// No frequency, impedance or part of a coil comes near: a code for "no value" that nobody stated, or a slip of the export.
bool is_absurd(double value) { return std::fabs(value) > 1e15; }

double largest_magnitude(const std::vector<double>& values) {
  double largest = 0;
  for (const double v : values) {
    if (std::isfinite(v)) largest = std::max(largest, std::fabs(v));
  }
  return largest;
}

/// Whether a phase is in degrees: its heading says it, or its size does.
Result<bool> in_degrees(const SweepPlan& plan, const Channel& phase, const std::string& name, std::vector<Finding>& findings) {
  if (plan.degrees) return *plan.degrees;
  const double largest = largest_magnitude(phase.samples);
  constexpr double kFullCircle = 6.4;
  if (largest <= kFullCircle) {
    return failure(Problem::ambiguous, name,
                   fmt::format("the phase in '{}' has no unit and reaches {:.4g}: it may be radians or small degrees", shown(phase.name, 60), largest),
                   "write the unit into the heading, \"" + shown(phase.name, 60) + " [rad]\" or [deg], or state the columns in the bench sheet: [file] columns");
  }
  findings.push_back({"angle_unit", Severity::note,
                      fmt::format("the phase in '{}' has no unit; it reaches {:.4g}, so it was taken as degrees", shown(phase.name, 60), largest),
                      phase.name, largest, Unit::one});
  return true;
}

}  // namespace

Result<Sweep> sweep_of(Capture capture, const SweepPlan& plan) {
  const Channel* const frequency = channel_at(capture, plan.frequency);
  const Channel* const first = channel_at(capture, plan.first);
  const Channel* const second = channel_at(capture, plan.second);
  const std::string& name = capture.source.name;
  if (frequency == nullptr || first == nullptr || second == nullptr) {
    const std::size_t column = frequency == nullptr ? plan.frequency : first == nullptr ? plan.first : plan.second;
    return failure(Problem::not_a_capture, name,
                   "column " + std::to_string(column + 1) + " of the sweep holds no usable number: its cells are empty, no numbers, or out of range",
                   "export the sweep again, with the meter's range as wide as the values are");
  }
  Sweep sweep;
  sweep.dialect = capture.dialect;
  sweep.findings = capture.findings;
  double radians = 1;
  if (plan.pair == SweepPair::magnitude_phase) {
    const auto degrees = in_degrees(plan, *second, name, sweep.findings);
    if (!degrees) return failure(degrees);
    if (*degrees) radians = std::numbers::pi / 180;
  }
  const double reference = plan.reference_ohm.value_or(50);
  if (plan.parameter == 'S') {
    sweep.reference_ohm = {reference};
    if (!plan.reference_ohm) {
      sweep.findings.push_back({"scale_suspect", Severity::note,
                                "the file does not say to which reference resistance its S belongs: 50 ohm were taken", "S", reference, Unit::ohm});
    }
  }
  if (!plan.parameter_stated) {
    sweep.findings.push_back({"scale_suspect", Severity::note,
                              fmt::format("the headings '{}' and '{}' do not say of what: they were taken as impedance in ohm{}", shown(first->name, 60),
                                          shown(second->name, 60), plan.decibels ? ", 0 dB for 1 ohm" : ""),
                              first->name, 1, Unit::ohm});
  }
  for (const Channel* column : {frequency, first, second}) {
    const auto beyond = std::count_if(column->samples.begin(), column->samples.end(), is_absurd);
    if (beyond == 0 || (column == second && second == first)) continue;
    sweep.findings.push_back({"missing_samples", Severity::note,
                              fmt::format("{} of {} values of '{}' are out of range (beyond 1e15), and these points are left out", beyond,
                                          column->samples.size(), shown(column->name, 60)),
                              column->name, static_cast<double>(beyond), Unit::one});
    if (static_cast<std::size_t>(beyond) < column->samples.size()) continue;
    return failure(Problem::not_a_capture, name, "all values of '" + shown(column->name, 60) + "' are out of range (beyond 1e15)",
                   "export the sweep again, with the meter's range as wide as the values are");
  }
  const Channel* const status = plan.status ? channel_at(capture, *plan.status) : nullptr;
  sweep.ports = 1;
  sweep.as_read = as_read(plan);
  for (std::size_t i = 0; i < frequency->samples.size(); ++i) {
    const double f = frequency->samples[i];
    const Complex z = impedance(plan, f, first->samples[i], second->samples[i], radians, reference);
    const bool marked = status != nullptr && status->samples[i] != 0;
    const bool absurd = is_absurd(f) || is_absurd(first->samples[i]) || is_absurd(second->samples[i]);
    const bool usable = !absurd && f >= 0 && std::isfinite(f) && std::isfinite(z.real()) &&
                        (std::isfinite(z.imag()) || plan.pair == SweepPair::magnitude);
    sweep.frequency_hz.push_back(f);
    sweep.z_ohm.push_back({usable ? z : Complex(std::nan(""), std::nan(""))});
    sweep.bad.push_back(marked || !usable);
  }
  if (std::all_of(sweep.bad.begin(), sweep.bad.end(), [](bool bad) { return bad; })) {
    return failure(Problem::not_a_capture, name, "no point of the sweep has a usable impedance", "look at its columns and at the meter's status");
  }
  return sweep;
}

}  // namespace coilassay
