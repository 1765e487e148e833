// One self-contained page: prints well on A4, reads in grey, opens without a network.
#pragma once

#include <string>

#include "analysis/measurement.h"
#include "base/result.h"
#include "base/utc_time.h"

namespace coilassay {

struct ReportContext {
  std::string program;  // "coilassay 0.1.0"
  UtcTime when;
  std::string operator_name;  // may be empty; outside text
};

/// The page for one measurement. Figures are drawn by gnuplot; without it the page says how to install it and keeps the
/// numbers.
std::string html_report(const Measurement& measurement, const ReportContext& context);

/// Prints a page to PDF with headless Chromium; missing_helper when it is not there.
Result<std::string> pdf_from_html(const std::string& html);

}  // namespace coilassay
