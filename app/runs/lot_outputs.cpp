#include "app/runs/lot_outputs.h"

#include "report/html_report.h"
#include "report/lot_report.h"

namespace coilassay {

Result<void> write_lot_report(const LotRecord& lot, const std::string& path, const RunContext& context) {
  const std::string page = lot_report(lot);
  if (!path.ends_with(".pdf")) return context.write(path, page);
  const Result<std::string> pdf = pdf_from_html(page);
  if (!pdf) return failure(pdf);
  return context.write(path, *pdf);
}

}  // namespace coilassay
