#include "report/html_report.h"

#include <gtest/gtest.h>

#include <algorithm>

#include "report/child_process.h"
#include "report/html_builder.h"
#include "tests/report/made_up.h"
#include "tests/report/path_setting.h"

namespace coilassay {
namespace {

/// Without printing the whole page when it fails.
bool has(const std::string& text, std::string_view part) {
  return text.find(part) != std::string::npos;
}

ReportContext context() {
  return {"coilassay 0.1.0", *parse_utc_time("2026-03-04T10:22:00Z"), "Mara"};
}

std::size_t count(const std::string& text, std::string_view part) {
  std::size_t found = 0;
  for (std::size_t at = 0; (at = text.find(part, at)) != std::string::npos; at += part.size()) ++found;
  return found;
}

TEST(HtmlReport, SaysEverythingAReaderNeeds) {
  const std::string page = html_report(test::made_up_ring_down(), context());
  for (const char* part :
       {"<!DOCTYPE html>", "<html lang=\"en\">", "Ring-down measurement: ring.csv", "coilassay 0.1.0",
        "2026-03-04T10:22:00Z", "Mara", "<var>L<sub>s</sub></var>", "± 0.45 µH", "capacitor", "default: 2 pF",
        "second_mode", "the coil stores", "C-10n", "SBW-114", "2027-05-01", "probe capacitance 13.00 pF", "damped sine",
        "This report relates only to the items measured.", "<svg"}) {
    EXPECT_TRUE(has(page, part)) << part;
  }
  EXPECT_TRUE(has(page, std::string(64, 'a'))) << std::string(64, 'a');
}

TEST(HtmlReport, LoadsNothingAndSaysSo) {
  const std::string page = html_report(test::made_up_ring_down(), context());
  EXPECT_TRUE(has(page,
                  "http-equiv=\"Content-Security-Policy\" content=\"default-src &#39;none&#39;; style-src "
                  "&#39;unsafe-inline&#39;; img-src data:\""))
      << "http-equiv=\"Content-Security-Policy\" content=\"default-src &#39;none&#39;; style-src "
         "&#39;unsafe-inline&#39;; img-src data:\"";
  for (const char* forbidden : {"<script", "src=", "<link", "@import", "url(http", "<?xml", "javascript:"})
    EXPECT_FALSE(has(page, forbidden)) << forbidden;
  // The only addresses are names of XML namespaces.
  EXPECT_EQ(count(page, "http://"), count(page, "http://www.w3.org/"));
  EXPECT_EQ(count(page, "https://"), 0u);
}

TEST(HtmlReport, HostileNamesStayText) {
  const std::string page = html_report(test::with_hostile_names(test::made_up_ring_down()), context());
  EXPECT_TRUE(has(page, "&lt;script&gt;alert(1)&lt;/script&gt;")) << "&lt;script&gt;alert(1)&lt;/script&gt;";
  for (const char* forbidden : {"<script", "\x1b", "\xe2\x80\xae", "\xff", "\n!touch"})
    EXPECT_FALSE(has(page, forbidden)) << forbidden;
}

TEST(HtmlReport, ARefusalStandsAtTheTop) {
  const std::string page = html_report(test::made_up_refusal(), context());
  const std::size_t what = page.find("Not measured: the natural frequency f_0."),
                    why = page.find("nothing that rings was found"), how = page.find("How it was measured");
  ASSERT_NE(what, std::string::npos);
  EXPECT_LT(what, why);
  EXPECT_LT(why, how);
  EXPECT_TRUE(has(page, "trigger on the release")) << "trigger on the release";
}

TEST(HtmlReport, WithoutGnuplotItSaysHowToInstallItAndKeepsTheNumbers) {
  const test::PathSetting nowhere("");
  const std::string page = html_report(test::made_up_ring_down(), context());
  EXPECT_TRUE(has(page, "apt install gnuplot-nox")) << "apt install gnuplot-nox";
  EXPECT_TRUE(has(page, "± 0.45 µH")) << "± 0.45 µH";
  EXPECT_FALSE(has(page, "<svg")) << "<svg";
}

TEST(HtmlBuilder, EscapesTextAndAttributes) {
  HtmlBuilder page;
  page.open("p", {{"title", "\"><b onclick='x'>"}}).text("<b>&\x01").close();
  EXPECT_EQ(page.finish(), "<p title=\"&quot;&gt;&lt;b onclick=&#39;x&#39;&gt;\">&lt;b&gt;&amp;\\x01</p>\n");
}

TEST(HtmlBuilder, SymbolsHaveLowIndices) {
  HtmlBuilder page;
  page.symbol("I_sat_30").symbol("Q");
  EXPECT_EQ(page.finish(), "<var>I<sub>sat 30</sub></var><var>Q</var>");
}

TEST(Pdf, IsPrintedWhenABrowserIsThereAndRefusedWithARemedyWhenNot) {
  const bool there = find_program("chromium") || find_program("chromium-browser");
  const auto pdf = pdf_from_html(html_report(test::made_up_ring_down(), context()));
  if (there) {
    ASSERT_TRUE(pdf) << pdf.error().finding;
    EXPECT_TRUE(pdf->starts_with("%PDF-"));
    EXPECT_GT(pdf->size(), 10'000u);
  }
  const test::PathSetting nowhere("");
  const auto none = pdf_from_html("<p>x</p>");
  ASSERT_FALSE(none);
  EXPECT_EQ(none.error().problem, Problem::missing_helper);
  EXPECT_TRUE(has(none.error().remedy, "chromium")) << "chromium";
}

}  // namespace
}  // namespace coilassay
