#include "inspection/sheet_problems.h"

#include <fmt/format.h>

#include <algorithm>
#include <cmath>
#include <filesystem>

#include "analysis/symbols.h"
#include "base/number_text.h"
#include "base/outside_text.h"
#include "fitting/statistics.h"
#include "inspection/words.h"

namespace coilassay {

namespace {

class Problems {
 public:
  explicit Problems(const PartSheet& sheet) : sheet_(sheet) {}

  std::vector<SheetProblem> all() {
    for (const Limit& limit : sheet_.limits) about_limit(limit);
    about_pairs();
    for (const TestPlan& test : sheet_.tests) about_test(test);
    about_the_rest();
    return std::move(problems_);
  }

 private:
  void contradiction(const std::string& place, std::string finding, std::string remedy) {
    problems_.push_back({place, true, std::move(finding), std::move(remedy)});
  }
  void look(const std::string& place, std::string finding, std::string remedy) {
    problems_.push_back({place, false, std::move(finding), std::move(remedy)});
  }

  /// Kinds of test a limit may be judged from, as far as the sheet says.
  std::vector<std::string> kinds_for(const Limit& limit) const {
    std::vector<std::string> kinds;
    for (const TestPlan& test : sheet_.tests) {
      if (limit_uses(limit, test)) kinds.push_back(test.kind);
    }
    if (!kinds.empty()) return kinds;
    for (const char* kind : {"ringdown", "ramp", "sine", "sweep", "coupling", "resistance", "reading"}) {
      TestPlan test;
      test.name = test.kind = kind;
      const bool may = limit.test.empty() ? std::string_view(kind) != "reading" : limit.test == kind;   // a kind needs no section
      if (may && limit_uses(limit, test)) kinds.emplace_back(kind);
    }
    return kinds;
  }

  void about_limit(const Limit& limit) {
    const std::vector<std::string> kinds = kinds_for(limit);
    if (kinds.empty()) {
      contradiction(limit.place, limit.test.empty() ? fmt::format("nobody measures {}: no kind of test gives it", limit.quantity)
                                                    : fmt::format("the test {} does not give {}", shown(limit.test, 60), limit.quantity),
                    "add a test that gives it, or take the limit out");
      return;
    }
    const bool section = std::any_of(sheet_.tests.begin(), sheet_.tests.end(), [&](const TestPlan& test) { return limit_uses(limit, test); });
    if (!section && !sheet_.tests.empty() && limit.test != "reading") {
      look(limit.place, fmt::format("no [test.NAME] of this sheet gives {}: it needs captures <serial>.{}.<ext>, measured with no bench sheet",
                                    limit.quantity, kinds.front()),
           fmt::format("add [test.{}] and its bench sheet", kinds.front()));
    }
    const auto only = [&](std::initializer_list<std::string_view> some) {
      return std::all_of(kinds.begin(), kinds.end(), [&](const std::string& k) { return std::find(some.begin(), some.end(), k) != some.end(); });
    };
    about_definition(limit, only({"ramp"}), only({"sine"}));
    if (limit.at.frequency_hz && only({"ramp", "resistance"})) {
      contradiction(limit.place, fmt::format("{} is measured by {}, which has no frequency: the limit can never be compared", limit.quantity, kinds.front()),
                    "leave the frequency out, or name another test");
    }
    if (limit.at.frequency_hz && only({"ringdown"}) && !sheet_.tolerances.frequency.stated) {
      look(limit.place, fmt::format("a ring-down has a frequency of its own: {} is comparable only within {} of the stated one", limit.quantity,
                                    percent_in_words(sheet_.tolerances.frequency.value)),
           "state frequency below [tolerance_of_conditions]");
    }
    if (limit.quantity == "R_dc_20" && limit.at.temperature_degc && std::fabs(*limit.at.temperature_degc - 20) > sheet_.tolerances.temperature.value) {
      contradiction(limit.place, "R_dc_20 is the resistance at 20 degC, and the limit is stated at another temperature",
                    "use R_dc with that temperature, or convert the limit");
    }
    if (limit.quantity == "R_dc" && !limit.at.temperature_degc) {
      look(limit.place, "the limit on R_dc names no temperature; copper changes by 3.9 % in 10 K",
           "add at = { temperature = \"20 degC\" }, or limit R_dc_20");
    }
    const auto gauge = sheet_.gauge_sigma.find(limit.quantity);
    const bool guarded = sheet_.decision.rule == DecisionRule::guarded || sheet_.decision.rule == DecisionRule::guarded_acceptance;
    if (gauge != sheet_.gauge_sigma.end() && guarded && limit.min && limit.max &&
        2 * normal_quantile(1 - sheet_.decision.risk) * gauge->second >= *limit.max - *limit.min) {
      contradiction(limit.place, fmt::format("the gauge's deviation alone leaves no value of {} that can pass", limit.quantity),
                    "measure better, or agree on a larger risk");
    }
  }

  void about_definition(const Limit& limit, bool only_ramp, bool only_sine) {
    const std::string& definition = limit.at.definition;
    const bool saturation = limit.quantity.starts_with("I_sat");
    if (definition.empty()) {
      if (saturation && !only_ramp && !only_sine) {
        look(limit.place, fmt::format("the limit on {} names no definition: a ramp and a table over bias give different currents", limit.quantity),
             "add at = { definition = \"ramp_incremental\" }, ramp_secant or bias_small_signal");
      }
      return;
    }
    if (!saturation && limit.quantity != "L_0") {
      contradiction(limit.place, fmt::format("{} is no saturation current and has no definition", limit.quantity), "leave the definition out");
    } else if ((definition == "bias_small_signal" && only_ramp) || (definition.starts_with("ramp") && only_sine)) {
      contradiction(limit.place, fmt::format("the definition {} is not that of its test", definition), "name the other test, or the other definition");
    } else if (limit.quantity.ends_with("_secant") && definition != "ramp_secant") {
      contradiction(limit.place, fmt::format("{} is by the secant, and the definition says {}", limit.quantity, definition),
                    "write ramp_secant, or leave it out");
    }
  }

  static bool same_conditions(const Limit& a, const Limit& b) {
    return a.quantity == b.quantity && a.test == b.test && a.at.frequency_hz == b.at.frequency_hz && a.at.level_v == b.at.level_v &&
           a.at.level_a == b.at.level_a && a.at.bias_a == b.at.bias_a && a.at.temperature_degc == b.at.temperature_degc &&
           a.at.definition == b.at.definition;
  }

  void about_pairs() {
    for (std::size_t i = 0; i < sheet_.limits.size(); ++i) {
      for (std::size_t j = 0; j < i; ++j) {
        const Limit &a = sheet_.limits[j], &b = sheet_.limits[i];
        if (!same_conditions(a, b)) continue;
        const bool apart = (a.min && b.max && *a.min > *b.max) || (b.min && a.max && *b.min > *a.max);
        if (apart) {
          contradiction(b.place, fmt::format("no value of {} meets this limit and the one of {}", b.quantity, a.place), "correct one of them");
        } else {
          look(b.place, fmt::format("{} is limited at the same conditions by {}", b.quantity, a.place), "write one limit with min and max");
        }
      }
    }
  }

  void about_test(const TestPlan& test) {
    const bool used = std::any_of(sheet_.limits.begin(), sheet_.limits.end(), [&](const Limit& l) { return limit_uses(l, test); });
    if (!used) look(test.place, fmt::format("no limit is judged from the test {}", test.name), "take it out, or add a limit");
    for (const auto& [what, path] : {std::pair{"bench sheet", test.bench}, {"fixture set", test.fixture}}) {
      std::error_code error;
      if (path && !std::filesystem::exists(*path, error)) {
        contradiction(test.place, fmt::format("the {} {} of the test {} is not there", what, shown(*path), test.name), "correct the path");
      }
    }
  }

  bool measured(const std::string& quantity, const std::string& test) const {
    Limit as_if;
    as_if.quantity = quantity;
    as_if.test = test;
    return !kinds_for(as_if).empty();
  }

  void about_the_rest() {
    const auto limits_on = [&](const std::string& quantity) {
      return std::count_if(sheet_.limits.begin(), sheet_.limits.end(), [&](const Limit& l) { return l.quantity == quantity; });
    };
    if (sheet_.sampling.scheme == SamplingScheme::variables) {
      const std::string& quantity = sheet_.sampling.quantity;
      if (limits_on(quantity) == 0) {
        contradiction(sheet_.path, fmt::format("the variables plan is for {}, which has no limit", quantity), "add a limit, or name another quantity");
      } else if (limits_on(quantity) > 1) {
        contradiction(sheet_.path, fmt::format("the variables plan is for {}, which has several limits", quantity), "leave one limit, with min and max");
      } else if (sheet_.limits.size() > 1) {
        look(sheet_.path, fmt::format("the variables plan decides by {} alone; the other limits judge units, not the lot", quantity),
             "a second sheet by attributes covers them");
      }
    }
    if (sheet_.check_standard && !measured(sheet_.check_standard->quantity, sheet_.check_standard->test)) {
      contradiction(sheet_.path, fmt::format("nobody measures {} of the check standard", sheet_.check_standard->quantity), "add a test that gives it");
    }
    for (const auto& [symbol, sigma] : sheet_.gauge_sigma) {
      if (limits_on(symbol) == 0) look(sheet_.path, fmt::format("[gauge] states {}, which has no limit", symbol), "take it out");
    }
  }

  const PartSheet& sheet_;
  std::vector<SheetProblem> problems_;
};

}  // namespace

std::vector<SheetProblem> sheet_problems(const PartSheet& sheet) { return Problems(sheet).all(); }

}  // namespace coilassay
