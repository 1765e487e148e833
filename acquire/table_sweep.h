// Tables of impedance against frequency, in the many pairs of quantities meters and analysers write.
#pragma once

#include <cstddef>
#include <optional>
#include <string>
#include <vector>

#include "acquire/capture.h"
#include "acquire/reader.h"
#include "acquire/table_header.h"
#include "base/result.h"

namespace coilassay {

/// What a pair of columns holds, and how it becomes Z with w = 2 pi f.
enum class SweepPair {
  re_im,             // of Z, Y or S
  magnitude_phase,   // of Z, Y or S; magnitude perhaps in dB
  magnitude,         // of Z alone: the imaginary part of Z is missing (NaN), the real part holds the size
  l_s_r_s,           // Z = R_s + j w L_s
  l_s_q,             // R_s = |w L_s| / Q
  l_s_d,             // R_s = D |w L_s|
  l_p_r_p,           // 1/Z = 1/R_p + 1/(j w L_p)
  l_p_q,             // R_p = Q |w L_p|
  l_p_d,
  c_s_r_s,           // Z = R_s + 1/(j w C_s)
  c_s_d,             // R_s = D / |w C_s|
  c_p_r_p,           // 1/Z = 1/R_p + j w C_p
  c_p_d,             // 1/R_p = D |w C_p|
  c_p_g,             // 1/Z = G + j w C_p
};

/// Which columns make a sweep, by the headings. Columns are counted from 0.
struct SweepPlan {
  std::size_t frequency = 0;
  SweepPair pair = SweepPair::re_im;
  char parameter = 'Z';  // Z, Y or S
  bool parameter_stated = true;
  std::size_t first = 0;
  std::size_t second = 0;
  bool decibels = false;
  std::optional<bool> degrees;        // of the phase, when the heading says it
  std::optional<std::size_t> status;  // not zero: the meter marks the point as bad
  std::optional<double> reference_ohm;
};

/// A plan when the table has a column of frequency and a pair that makes an impedance; nothing otherwise.
std::optional<SweepPlan> plan_sweep(const TableHeader& header);

/// The sweep of a table that was read as channels in the order of its columns, without time.
///
/// A point with a missing number, a status or no finite impedance is marked bad. S without a stated reference is taken
/// at 50 ohm, with a finding. A file of sizes alone is read as "|Z|". A phase without a unit: beyond +-6.4 it is degrees, with a finding; otherwise it is
/// ambiguous, unless it cannot be degrees.
Result<Sweep> sweep_of(Capture capture, const SweepPlan& plan);

}  // namespace coilassay
