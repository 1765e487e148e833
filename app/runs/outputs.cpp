#include "app/runs/outputs.h"

#include <vector>

#include "app/runs/spared_files.h"
#include "app/runs/version.h"
#include "report/figure.h"
#include "report/html_report.h"

namespace coilassay {

namespace {

Result<bool> write_figure(const Measurement& measurement, const std::string& path, const RunContext& context) {
  const Figure figure = figure_of(measurement);
  if (figure.panels.empty()) return false;
  const Result<std::string> svg = draw_svg(figure);
  if (!svg) return failure(svg);
  if (const Result<void> written = context.write(path, *svg); !written) return failure(written);
  return true;
}

Result<void> write_report(const Measurement& measurement, const std::string& path, const RunContext& context) {
  const std::string page =
      html_report(measurement, {.program = program_name(), .when = context.now, .operator_name = ""});
  if (!path.ends_with(".pdf")) return context.write(path, page);
  const Result<std::string> pdf = pdf_from_html(page);
  if (!pdf) return failure(pdf);
  return context.write(path, *pdf);
}

/// A document that would take the place of a file that was measured.
Result<void> spare_inputs(const Measurement& measurement, const OutputRequest& request) {
  std::vector<GivenFile> outputs, inputs;
  if (request.figure) outputs.push_back({"--figure", *request.figure});
  if (request.report) outputs.push_back({"--report", *request.report});
  for (const SourceRecord& each : measurement.sources) inputs.push_back({"", each.source.name});
  return spare_files(outputs, inputs);
}

}  // namespace

Result<void> check_outputs(const OutputRequest& request) {
  if (request.figure && !request.figure->ends_with(".svg")) {
    return failure(Problem::usage, "--figure", "a figure is written as SVG", "give a file name that ends in .svg");
  }
  if (request.report && !request.report->ends_with(".html") && !request.report->ends_with(".pdf")) {
    return failure(Problem::usage, "--report", "a report is a page or a PDF",
                   "give a file name that ends in .html or .pdf");
  }
  return {};
}

Result<bool> write_outputs(const Measurement& measurement, const OutputRequest& request, const RunContext& context) {
  if (const Result<void> fine = spare_inputs(measurement, request); !fine) return failure(fine);
  Result<bool> drawn = true;
  if (request.figure) drawn = write_figure(measurement, *request.figure, context);
  if (request.report) {
    const Result<void> written = write_report(measurement, *request.report, context);
    if (!written && drawn) return failure(written);
  }
  return drawn;
}

}  // namespace coilassay
