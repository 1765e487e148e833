#include "inspection/sheet_check.h"

#include <gmock/gmock.h>
#include <gtest/gtest.h>

#include "tests/inspection/made_units.h"

namespace coilassay {
namespace {

using test::sheet_of;
using testing::Contains;
using testing::HasSubstr;

constexpr std::string_view kHead = "[part]\nname = \"drum-47\"\nrevision = \"C\"\n";

SheetCheck checked(const std::string& rest) { return check_sheet(sheet_of(std::string(kHead) + rest), 500); }

std::string all_of(const SheetCheck& check) {
  std::string text;
  for (const std::string& sentence : check.sentences) text += sentence + "\n";
  return text;
}

TEST(SheetCheck, ExplainsASheetInPlainWords) {
  const SheetCheck check = checked(
      "[[limit]]\nquantity = \"L_s\"\nnominal = \"47 uH ± 20 %\"\nat = { frequency = \"100 kHz\" }\n[test.sine]\nrepeats = 3\n"
      "[sampling]\nscheme = \"attributes\"\naql = 1.0\n[check_standard]\nserial = \"CS-1\"\nquantity = \"L_s\"\n");
  EXPECT_TRUE(check.usable());
  const std::string text = all_of(check);
  for (const char* said : {"drum-47, revision C", "L_s (series inductance): 37.6 µH to 56.4 µH at 100 kHz, from sine", "frequency 1 % (not stated: this is taken)",
                           "3 captures a unit, <serial>.sine.1.<ext>", "guarded: a unit passes when it conforms", "50 units, up to 1 may be nonconforming",
                           "a lot with 5 % bad passes", "counts as nonconforming", "Check standard CS-1: L_s every 8 h", "one attempt"}) {
    EXPECT_THAT(text, HasSubstr(said));
  }
}

struct Row {
  const char* sheet;
  bool contradiction;
  const char* says;
};

TEST(SheetCheck, FindsWhatCannotWork) {
  for (const Row& row : {
           Row{"[[limit]]\nquantity = \"skew\"\nmax = \"1 ns\"\ntest = \"ramp\"\n", true, "does not give skew"},
           Row{"[[limit]]\nquantity = \"k\"\nmin = 0.5\n[test.ramp]\n", false, "it needs captures <serial>.coupling.<ext>"},
           Row{"[[limit]]\nquantity = \"k\"\nmin = 0.5\ntest = \"ramp\"\n", true, "does not give k"},
           Row{"[[limit]]\nquantity = \"R_dc\"\nmax = \"1 ohm\"\nat = { frequency = \"1 kHz\" }\n[test.resistance]\n", true, "no frequency"},
           Row{"[[limit]]\nquantity = \"R_dc\"\nmax = \"1 ohm\"\n[test.resistance]\n", false, "names no temperature"},
           Row{"[[limit]]\nquantity = \"R_dc_20\"\nmax = \"1 ohm\"\nat = { temperature = \"40 degC\" }\n[test.resistance]\n", true, "at 20 degC"},
           Row{"[[limit]]\nquantity = \"L_s\"\nmin = \"40 uH\"\nat = { definition = \"ramp_secant\" }\n", true, "no saturation current"},
           Row{"[[limit]]\nquantity = \"I_sat_30\"\nmin = \"1 A\"\nat = { definition = \"bias_small_signal\" }\n[test.ramp]\n", true, "not that of its test"},
           Row{"[[limit]]\nquantity = \"I_sat_30\"\nmin = \"1 A\"\n", false, "names no definition"},
           Row{"[[limit]]\nquantity = \"L_s\"\nmin = \"40 uH\"\n[[limit]]\nquantity = \"L_s\"\nmax = \"30 uH\"\n", true, "no value of L_s meets"},
           Row{"[[limit]]\nquantity = \"L_s\"\nmin = \"40 uH\"\n[[limit]]\nquantity = \"L_s\"\nmax = \"60 uH\"\n", false, "one limit with min and max"},
           Row{"[[limit]]\nquantity = \"L_s\"\nmin = \"40 uH\"\n[test.ringdown]\n[test.ramp]\n", false, "no limit is judged from the test ramp"},
           Row{"[[limit]]\nquantity = \"L_s\"\nmin = \"40 uH\"\n[test.ringdown]\nbench = \"not-there.toml\"\n", true, "is not there"},
           Row{"[[limit]]\nquantity = \"L_s\"\nmin = \"40 uH\"\n[sampling]\nscheme = \"variables\"\nquantity = \"Q\"\n", true, "which has no limit"},
           Row{"[[limit]]\nquantity = \"L_s\"\nmin = \"40 uH\"\nmax = \"41 uH\"\n[gauge]\nL_s = \"1 uH\"\n", true, "no value of L_s that can pass"},
           Row{"[[limit]]\nquantity = \"L_s\"\nmin = \"40 uH\"\n[test.sine]\n[check_standard]\nserial = \"C\"\nquantity = \"k\"\ntest = \"ramp\"\n", true, "of the check standard"},
       }) {
    const SheetCheck check = checked(row.sheet);
    bool found = false;
    for (const SheetProblem& problem : check.problems) {
      const bool here = (problem.finding + problem.remedy).find(row.says) != std::string::npos;
      EXPECT_TRUE(!here || problem.contradiction == row.contradiction) << row.sheet;
      found |= here;
      EXPECT_FALSE(problem.place.empty());
      EXPECT_FALSE(problem.remedy.empty());
    }
    EXPECT_TRUE(found) << row.sheet;
    EXPECT_EQ(check.usable(), !row.contradiction) << row.sheet;
  }
}

// Both limits 1500 +- 0.2, process deviation 0.12, u 0.04, simple rule: consumer's risk 1.89 %, producer's 3.72 %, 9.56 %
// nonconforming (constructed, computed with scipy by quadrature; JCGM 106, 9.5).
TEST(SheetCheck, NamesTheUnitsToDrawFromALotOfThisSize) {
  const std::string sheet = "[[limit]]\nquantity = \"L_s\"\nmin = \"40 uH\"\n[sampling]\nscheme = \"attributes\"\naql = 4.0\nlevel = \"S-2\"\nseed = 9\n";
  std::string drawn;
  for (const std::uint64_t position : draw_positions(500, 3, 9)) drawn += (drawn.empty() ? "" : ", ") + std::to_string(position);
  EXPECT_THAT(all_of(checked(sheet)), HasSubstr("by seed 9: " + drawn + "."));
  EXPECT_THAT(all_of(check_sheet(sheet_of(std::string(kHead) + sheet), std::nullopt)), testing::Not(HasSubstr("Units to draw")));
}

TEST(SheetCheck, SaysWhatTheRuleDoesToAStatedProcess) {
  const std::string limits = "[[limit]]\nquantity = \"Q\"\nmin = 1499.8\nmax = 1500.2\n[process.Q]\nmean = 1500\ndeviation = 0.12\nuncertainty = 0.04\n";
  EXPECT_THAT(all_of(checked(limits + "[decision]\nrule = \"simple\"\n")),
              HasSubstr("9.56 % do not conform; 1.89 % do not conform and pass, 3.72 % conform and do not pass"));
  // A guard band moves the risk from one side to the other.
  EXPECT_THAT(all_of(checked(limits + "[decision]\nrule = \"guarded\"\n")), HasSubstr("0.113 % do not conform and pass, 19.4 % conform"));
}

TEST(SheetCheck, ASheetThatWorksRaisesNothing) {
  const SheetCheck check = checked("[[limit]]\nquantity = \"L_s\"\nmin = \"40 uH\"\nmax = \"60 uH\"\n[test.ringdown]\n");
  EXPECT_TRUE(check.problems.empty()) << check.problems.front().finding;
}

}  // namespace
}  // namespace coilassay
