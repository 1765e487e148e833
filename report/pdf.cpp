// A page printed to PDF by a headless browser.
#include <unistd.h>

#include <fstream>
#include <sstream>

#include "report/child_process.h"
#include "report/html_report.h"

namespace coilassay {

namespace {

constexpr std::string_view kRemedy = "apt install chromium, or ask for an .html report and print it from a browser";

}  // namespace

Result<std::string> pdf_from_html(const std::string& html) {
  auto browser = find_program("chromium");
  if (!browser) browser = find_program("chromium-browser");
  if (!browser) {
    return failure(Problem::missing_helper, "chromium", "a PDF is printed by Chromium, which is not installed",
                   std::string(kRemedy));
  }
  auto scratch = ScratchFolder::make();
  if (!scratch) return failure(scratch);
  const auto page = scratch->path() / "page.html", pdf = scratch->path() / "page.pdf";
  std::ofstream file(page, std::ios::binary);
  file << html;
  file.close();
  if (!file)
    return failure(Problem::cannot_write, page.string(), "the page cannot be written here",
                   "free some space in the temporary folder");

  ChildRequest request{.program = *browser,
                       .arguments = {"--headless", "--disable-gpu", "--no-first-run", "--disable-background-networking",
                                     "--disable-component-update", "--disable-sync", "--disable-dev-shm-usage",
                                     "--user-data-dir=" + (scratch->path() / "profile").string(),
                                     "--no-pdf-header-footer", "--print-to-pdf=" + pdf.string()},
                       .input = {},
                       .folder = scratch->path(),
                       .time_limit = std::chrono::seconds(60)};
  // The sandbox of the browser refuses to run for root; the page is our own, without scripts and with no access to a
  // network.
  if (::geteuid() == 0) request.arguments.emplace_back("--no-sandbox");
  request.arguments.push_back("file://" + page.string());
  const auto outcome = run_child(request);
  if (!outcome) return failure(outcome);

  std::ifstream printed(pdf, std::ios::binary);
  std::ostringstream collected;
  collected << printed.rdbuf();
  std::string bytes = collected.str();
  if (!bytes.starts_with("%PDF-")) {
    return failure(Problem::missing_helper, "chromium", "Chromium did not print the page", std::string(kRemedy));
  }
  return bytes;
}

}  // namespace coilassay
