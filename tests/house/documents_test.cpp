// What the documents say and what the code does are compared, so that neither can drift away from the other.
#include <gmock/gmock.h>
#include <gtest/gtest.h>

#include <filesystem>
#include <map>
#include <regex>
#include <set>
#include <string>

#include "analysis/coupling.h"
#include "analysis/reading.h"
#include "analysis/resistance.h"
#include "analysis/ring_down.h"
#include "base/number_text.h"
#include "tests/house/source_tree.h"

namespace coilassay::test {
namespace {

namespace fs = std::filesystem;
using testing::Contains;
using testing::ElementsAre;
using testing::IsEmpty;

/// Codes of findings (or cautions about people) raised in a source text: a quoted word with a severity after it, or one
/// handed to a function that refuses.
std::set<std::string> codes_raised_in(const std::string& source) {
  std::string text;
  for (const std::string& line : lines_of(source)) text += line.substr(0, line.find("//")) + '\n';
  static const std::regex with_severity(R"re("([a-z][a-z0-9_]*)"\s*,\s*[^"{};]{0,80}(Severity::|\bseverity\b))re");
  static const std::regex refused(R"re(\brefuse\(\s*"([a-z][a-z0-9_]*)")re");
  std::set<std::string> codes;
  for (const std::regex* form : {&with_severity, &refused}) {
    for (auto at = std::sregex_iterator(text.begin(), text.end(), *form); at != std::sregex_iterator(); ++at) {
      codes.insert((*at)[1]);
    }
  }
  return codes;
}

/// Words in backquotes that head the sections of a page: "### `clipped`".
std::set<std::string> codes_headed_in(const SourceFile& page) {
  static const std::regex heading(R"(^#+ `([a-z][a-z0-9_]*)`)");
  std::set<std::string> codes;
  for (const std::string& line : page.lines) {
    std::smatch match;
    if (std::regex_search(line, match, heading)) codes.insert(match[1]);
  }
  return codes;
}

std::string join(const std::set<std::string>& words) {
  std::string all;
  for (const std::string& word : words) all += word + ' ';
  return all;
}

void compare_codes(const std::vector<SourceFile>& sources, const std::string& page_name) {
  const SourceFile page = source_file(page_name);
  ASSERT_FALSE(page.path.empty()) << page_name << " is missing";
  std::set<std::string> raised;
  for (const SourceFile& file : sources) raised.merge(codes_raised_in(file.text()));
  const std::set<std::string> documented = codes_headed_in(page);
  ASSERT_FALSE(raised.empty());
  std::set<std::string> unexplained, unknown;
  std::set_difference(raised.begin(), raised.end(), documented.begin(), documented.end(),
                      std::inserter(unexplained, unexplained.end()));
  std::set_difference(documented.begin(), documented.end(), raised.begin(), raised.end(),
                      std::inserter(unknown, unknown.end()));
  EXPECT_THAT(unexplained, IsEmpty()) << "raised, but without a paragraph in " << page_name << ": " << join(unexplained);
  EXPECT_THAT(unknown, IsEmpty()) << "explained in " << page_name << ", but raised nowhere: " << join(unknown);
}

/// Rooms that raise findings, and the runs, which alone see the files of a lot; report/ and commands only show them.
std::vector<SourceFile> raising_rooms() {
  auto files = source_files({"base", "acquire", "fitting", "analysis", "inspection", "ledger", "app/runs"}, {".h", ".cpp"});
  std::erase_if(files, [](const SourceFile& file) { return file.path == "analysis/cautions.cpp"; });
  return files;
}

TEST(Documents, EveryFindingHasItsParagraphAndEveryParagraphItsFinding) {
  compare_codes(raising_rooms(), "docs/findings.md");
}

TEST(Documents, EveryCautionHasItsParagraphAndEveryParagraphItsCaution) {
  compare_codes({source_file("analysis/cautions.cpp")}, "docs/cautions.md");
}

TEST(Documents, FindingsAreSeenInEveryFormTheyAreRaisedIn) {
  EXPECT_THAT(codes_raised_in("f.push_back({\"clipped\", Severity::note, \"words\"});"), ElementsAre("clipped"));
  EXPECT_THAT(codes_raised_in("{\"second_mode\",\n  share > 0.03 ? Severity::caution : Severity::note,"),
              ElementsAre("second_mode"));
  EXPECT_THAT(codes_raised_in("{\"coarse_range\", severity, message}"), ElementsAre("coarse_range"));
  EXPECT_THAT(codes_raised_in("refuse(\"no_ringing\",\n \"words\", 0);"), ElementsAre("no_ringing"));
  EXPECT_THAT(codes_raised_in("find(\"clipped\"); \"other\", 3; Severity::note"), IsEmpty());
  EXPECT_THAT(codes_raised_in("std::string code;  // \"clipped\", ...\nSeverity severity;"), IsEmpty());
}

/// The word by which a heading is linked to, as hosting sites and viewers make it.
std::string anchor_of(const std::string& heading) {
  std::string anchor;
  for (const char c : heading) {
    const auto u = static_cast<unsigned char>(c);
    if (u >= 'A' && u <= 'Z') anchor += static_cast<char>(c + ('a' - 'A'));
    else if (c == ' ') anchor += '-';
    else if (c == '-' || c == '_' || std::isalnum(u) || u >= 0x80) anchor += c;
  }
  return anchor;
}

std::set<std::string> anchors_of(const SourceFile& page) {
  std::set<std::string> anchors;
  bool code = false;
  for (const std::string& line : page.lines) {
    if (line.starts_with("```")) code = !code;
    const std::size_t depth = line.find_first_not_of('#');
    if (code || depth == 0 || depth == std::string::npos || line[depth] != ' ') continue;
    anchors.insert(anchor_of(line.substr(depth + 1)));
  }
  return anchors;
}

/// What is wrong with a link from a file in `folder`; empty when it leads somewhere.
std::string broken_link(const fs::path& folder, const std::string& target) {
  const std::size_t hash = target.find('#');
  const std::string file = target.substr(0, hash);
  const fs::path path = file.empty() ? fs::path() : (folder / file).lexically_normal();
  if (!file.empty() && !fs::exists(path)) return "no such file: " + path.generic_string();
  if (hash == std::string::npos || file.empty()) return {};
  const SourceFile page = source_file(path.generic_string());
  const std::string anchor = target.substr(hash + 1);
  if (path.extension() == ".md" && !anchors_of(page).contains(anchor)) return "no heading '" + anchor + "' in " + page.path;
  return {};
}

TEST(Documents, EveryLinkLeadsSomewhere) {
  static const std::regex link(R"(\]\(([^)\s]+)\))");
  const auto pages = source_files({"README.md", "DEVELOPERS.md", "CHANGELOG.md", "NOTICE.md", "docs", "sample-data"}, {".md"});
  ASSERT_GT(pages.size(), 8u);
  for (const SourceFile& page : pages) {
    const std::set<std::string> own = anchors_of(page);
    for (const std::string& line : page.lines) {
      for (auto at = std::sregex_iterator(line.begin(), line.end(), link); at != std::sregex_iterator(); ++at) {
        const std::string target = (*at)[1];
        if (target.starts_with("https:") || target.starts_with("http:") || target.starts_with("mailto:")) continue;
        if (target.starts_with("#")) {
          EXPECT_THAT(own, Contains(target.substr(1))) << page.path << " links to a heading it has not";
        } else {
          EXPECT_EQ(broken_link(fs::path(page.path).parent_path(), target), "") << page.path;
        }
      }
    }
  }
}

TEST(Documents, PagesNamedInTheCodeExist) {
  static const std::regex page(R"(docs/[a-z0-9_-]+\.md(#[a-z0-9_-]+)?)");
  std::size_t seen = 0;
  const std::vector<std::string> rooms{"base", "acquire", "fitting", "analysis", "inspection", "ledger", "report", "app"};
  for (const SourceFile& file : source_files(rooms, {".h", ".cpp"})) {
    for (const std::string& line : file.lines) {
      for (auto at = std::sregex_iterator(line.begin(), line.end(), page); at != std::sregex_iterator(); ++at, ++seen) {
        EXPECT_EQ(broken_link(".", at->str()), "") << file.path;
      }
    }
  }
  EXPECT_GT(seen, 3u);
}

TEST(Documents, EveryPackageThatIsInstalledIsExplained) {
  const SourceFile list = source_file("cmake/debian-packages.sh");
  const std::string page = source_file("docs/dependencies.md").text();
  static const std::regex assigned(R"(packages_to_[a-z]+='([^']*)')");
  const std::string text = list.text();
  std::size_t count = 0;
  for (auto at = std::sregex_iterator(text.begin(), text.end(), assigned); at != std::sregex_iterator(); ++at) {
    std::istringstream words((*at)[1]);
    for (std::string package; words >> package; ++count) {
      EXPECT_NE(page.find("`" + package + "`"), std::string::npos) << package << " is not in docs/dependencies.md";
    }
  }
  EXPECT_GT(count, 15u);
}

TEST(Documents, DefaultTolerancesAreThoseOfTheCode) {
  namespace d = ring_down_defaults;
  const std::string page = source_file("docs/uncertainty.md").text();
  const auto percent = [](double ratio) { return std::to_string(static_cast<int>(ratio * 100 + 0.5)) + " %"; };
  const std::map<std::string, std::string> rows{
      {"added capacitor", "±" + percent(d::kCapacitorRatio)},
      {"dissipation of the capacitor, not given", "0 to " + to_text(d::kDissipation, Unit::one, Script::utf8, 1)},
      {"probe capacitance, not given", "0 to " + to_text(d::kProbeCapacitance_f, Unit::farad, Script::utf8, 2)},
      {"probe resistance, not given", to_text(1 / d::kProbeConductance_s, Unit::ohm, Script::utf8, 1) + " to infinity"},
      {"probe or stray capacitance, given without tolerance", "±" + percent(d::kStatedCapacitanceRatio)},
      {"resistance of probe or across, given without tolerance", "±" + percent(d::kStatedResistanceRatio)},
      {"gain of a voltmeter, readings of a winding", "±" + to_shortest(100 * resistance_defaults::kMeterVoltageRatio) + " %"},
      {"gain of an ammeter, readings of a winding", "±" + percent(resistance_defaults::kMeterCurrentRatio)},
      {"thermal offset, one polarity only", "±" + to_text(resistance_defaults::kThermalOffset_v, Unit::volt, Script::utf8, 2)},
      {"accuracy of an instrument, not stated in its profile", "±" + percent(reading_defaults::kAccuracyRatio)},
      {"value of a meter, coupled windings, given without tolerance", "±" + percent(coupling_defaults::kValueRatio)},
      {"impedances of a file, coupled windings", "±" + to_shortest(100 * coupling_defaults::kSweepRatio) + " %"},
      {"scattering of a port file, coupled windings", "±" + to_shortest(coupling_defaults::kScattering)},
      {"inductance of a short, not given", "0 to " + to_text(coupling_defaults::kLink_h, Unit::henry, Script::utf8, 2)},
      {"inductance or resistance of a short, given without tolerance", "±" + percent(coupling_defaults::kLinkRatio)},
      {"temperature of a winding or of the air", "±" + to_text(resistance_defaults::kTemperature_k, Unit::kelvin, Script::utf8, 1)},
      {"temperature coefficient of the wire", "±" + percent(resistance_defaults::kCoefficientRatio)},
      {"cold resistance of a winding", "±" + percent(resistance_defaults::kColdRatio)},
      {"time base", "±" + std::to_string(static_cast<int>(d::kTimebaseRatio * 1e6 + 0.5)) + " ppm"},
  };
  for (const auto& [what, value] : rows) {
    EXPECT_NE(page.find("| " + what + " | " + value + " |"), std::string::npos) << "| " << what << " | " << value << " |";
  }
}

}  // namespace
}  // namespace coilassay::test
