#include "app/runs/gauge_run.h"

#include <algorithm>
#include <atomic>
#include <filesystem>
#include <map>

#include "analysis/symbols.h"
#include "app/runs/gauge_readings.h"
#include "app/runs/unit_tests.h"
#include "base/digest.h"
#include "base/number_text.h"
#include "base/outside_text.h"
#include "base/parallel.h"
#include "base/sheet.h"
#include "inspection/evidence.h"
#include "report/figure_gauge.h"

namespace coilassay {

namespace {

/// What a study asks of each capture: the quantity, the conditions it is compared at, and how it is measured.
struct Question {
  Limit limit;
  ConditionTolerances tolerances;
  std::optional<PartSheet> sheet;
};

/// The symbol a kind of test is made for.
std::string usual_quantity(std::string_view kind) {
  // A ring-down and a sine lead with what they see (f_0, Z); what is studied is the coil.
  if (kind == "ringdown" || kind == "sine") return "L_s";
  return std::string(leading_symbol(kind));
}

Result<Question> question_of(const GaugeJob& job) {
  Question question;
  if (job.part_sheet) {
    if (job.bench_sheet) {
      return failure(Problem::usage, "--bench", "the part sheet names its own bench sheets", "leave --bench or --part-sheet out");
    }
    Result<PartSheet> sheet = read_part_sheet(*job.part_sheet);
    if (!sheet) return failure(sheet);
    question.sheet = std::move(*sheet);
    question.tolerances = question.sheet->tolerances;
    const std::vector<Limit>& limits = question.sheet->limits;
    if (!job.quantity && limits.size() > 1) {
      return failure(Problem::usage, "--quantity", "the part sheet limits several quantities", "name the one of this study, such as --quantity L_s");
    }
    const auto found = std::find_if(limits.begin(), limits.end(), [&](const Limit& l) { return !job.quantity || l.quantity == *job.quantity; });
    if (found != limits.end()) question.limit = *found;
  }
  if (job.quantity) {
    const Symbol* symbol = find_symbol(*job.quantity);
    if (symbol == nullptr) {
      std::vector<std::string_view> known;
      for (const Symbol& each : symbols()) known.push_back(each.symbol);
      const std::string_view near = nearest(*job.quantity, known);
      return failure(Problem::usage, "--quantity", "'" + shown(*job.quantity, 40) + "' is no quantity that is measured",
                     near.empty() ? "give a symbol such as L_s" : "did you mean " + std::string(near) + "?");
    }
    question.limit.quantity = symbol->symbol;
    question.limit.unit = symbol->unit;
  }
  return question;
}

/// How the captures of each test are measured, by its name.
Result<std::map<std::string, PreparedTest>> tests_of(const GaugeJob& job, const Question& question) {
  std::map<std::string, PreparedTest> tests;
  if (question.sheet) {
    Result<std::vector<PreparedTest>> prepared = prepare_tests(*question.sheet);
    if (!prepared) return failure(prepared);
    for (PreparedTest& test : *prepared) tests.emplace(test.plan.name, std::move(test));
  } else {
    for (const std::string_view kind : unit_test_kinds()) {
      PreparedTest test;
      test.plan.name = test.plan.kind = kind;
      test.plan.bench = job.bench_sheet;
      tests.emplace(std::string(kind), std::move(test));
    }
  }
  // Each capture is a trial of its own.
  for (auto& [name, test] : tests) test.plan.repeats = 1;
  return tests;
}

/// The test whose captures are looked at: the only one in the folder that gives the quantity.
Result<std::string> chosen_test(const GaugeFolder& folder, const std::map<std::string, PreparedTest>& tests, const Limit& limit) {
  const std::string& quantity = limit.quantity;
  std::string chosen;
  for (const GaugeCapture& capture : folder.captures) {
    const auto test = tests.find(capture.test);
    if (test == tests.end() || capture.test == chosen) continue;
    if (!quantity.empty() && !limit_uses(limit, test->second.plan)) continue;
    if (!chosen.empty()) {
      return failure(Problem::usage, "--quantity", "the folder holds captures of " + shown(chosen, 40) + " and of " + shown(capture.test, 40),
                     "name a quantity that only one of them gives, or keep them in folders of their own");
    }
    chosen = capture.test;
  }
  if (chosen.empty()) {
    return failure(Problem::usage, "--quantity", "no capture in the folder gives " + quantity, "name another quantity, or check the names of the files");
  }
  if (tests.at(chosen).plan.joint_captures() > 1) {
    return failure(Problem::usage, shown(chosen, 40), "this test measures several captures together, and a study has one for each trial",
                   "give the readings as a table");
  }
  return chosen;
}

struct OneReading {
  std::optional<double> value;
  std::string why_not, sha256;
};

OneReading measure_one(const GaugeCapture& capture, const PreparedTest& test, const Question& question) {
  LotUnit unit{capture.part, {UnitCaptures{capture.test, {capture.path}, std::nullopt}}, std::nullopt};
  RunContext alone;
  alone.threads = 1;   // readings are measured side by side instead
  const std::vector<TestRun> runs = run_tests({test}, unit, false, alone);
  const std::vector<TestedUnit> measured = tested(runs);
  std::vector<const TestedUnit*> one;
  for (const TestedUnit& each : measured) one.push_back(&each);
  const Evidence evidence = evidence_of(question.limit, question.tolerances, capture.test, one);
  OneReading reading;
  if (!measured.empty() && !measured.front().measurement.sources.empty()) reading.sha256 = measured.front().measurement.sources.front().source.sha256;
  if (!evidence.values.empty()) reading.value = evidence.values.front().estimate.quantity.value;
  else if (!evidence.not_comparable.empty()) reading.why_not = "not comparable, " + evidence.not_comparable;
  else reading.why_not = evidence.missing.empty() ? "only a limit of the value is known" : evidence.missing;
  return reading;
}

Result<void> read_captures_of(const GaugeJob& job, Question& question, GaugeRecord& record, const RunContext& context) {
  const Result<std::map<std::string, PreparedTest>> tests = tests_of(job, question);
  if (!tests) return failure(tests);
  std::vector<std::string> names;
  for (const auto& [name, test] : *tests) names.push_back(name);
  const Result<GaugeFolder> folder = read_gauge_folder(job.input, names);
  if (!folder) return failure(folder);
  const Result<std::string> test = chosen_test(*folder, *tests, question.limit);
  if (!test) return failure(test);
  const PreparedTest& how = tests->at(*test);
  if (question.limit.quantity.empty()) {
    question.limit.quantity = usual_quantity(how.plan.kind);
    question.limit.unit = find_symbol(question.limit.quantity)->unit;
  }
  std::vector<GaugeCapture> captures;
  for (const GaugeCapture& capture : folder->captures) {
    if (capture.test == *test) captures.push_back(capture);
  }
  std::vector<OneReading> readings(captures.size());
  std::atomic<std::uint64_t> done{0};
  std::atomic<bool> stop{false};
  for_each_index(captures.size(), context.threads, [&](std::size_t i) {
    if (stop) return;
    readings[i] = measure_one(captures[i], how, question);
    const std::uint64_t now = ++done;
    if (context.progress != nullptr && !context.progress->advance("measuring readings", now, captures.size())) stop = true;
  });
  if (stop) return failure(Problem::interrupted, job.input, "stopped before every reading was measured", "run it again");
  for (std::size_t i = 0; i < captures.size(); ++i) {
    if (!readings[i].value) {
      return failure(Problem::damaged, captures[i].path, "this reading has no " + question.limit.quantity + ": " + readings[i].why_not,
                     "measure it alone to see more (coilassay " + how.plan.kind + "), then capture it again or leave that part out: a crossed study needs every "
                     "reading");
    }
    record.readings.push_back({captures[i].part, captures[i].operator_name, captures[i].trial, *readings[i].value});
    record.files.push_back({captures[i].path, readings[i].sha256});
  }
  if (!folder->strays.empty()) {
    record.findings.push_back({"stray_file", Severity::note,
                               std::to_string(folder->strays.size()) + " files are not named PART.OPERATOR.TRIAL.TEST.ENDING and were not measured: '" +
                                   shown(folder->strays.front(), 60) + (folder->strays.size() > 1 ? "' and others" : "'"),
                               job.input, static_cast<double>(folder->strays.size()), Unit::one});
  }
  return {};
}

Result<void> read_table(const GaugeJob& job, const Question& question, GaugeRecord& record) {
  const Result<std::string> text = read_sheet_text(job.input);
  if (!text) return failure(text.error().problem, job.input, text.error().finding, "give a folder of captures, or a table of readings");
  Result<std::vector<GaugeReading>> readings = parse_gauge_table(*text, job.input, question.limit.unit);
  if (!readings) return failure(readings);
  record.readings = std::move(*readings);
  record.files.push_back({job.input, sha256_of(*text)});
  return {};
}

Result<std::optional<double>> tolerance_of(const GaugeJob& job, const Question& question) {
  if (!job.tolerance) {
    const Limit& limit = question.limit;
    if (limit.min && limit.max) return *limit.max - *limit.min;
    return std::nullopt;
  }
  const auto value = parse_value(*job.tolerance, question.limit.unit, "--tolerance");
  if (!value) return failure(value);
  if (!(value->value > 0)) return failure(Problem::bad_number, "--tolerance", "a tolerance is wider than nothing", "give max - min");
  return value->value;
}

}  // namespace

Result<GaugeRecord> run_gauge(const GaugeJob& job, const RunContext& context) {
  Result<Question> question = question_of(job);
  if (!question) return failure(question);
  GaugeRecord record;
  record.input = job.input;
  std::error_code error;
  const Result<void> read = std::filesystem::is_directory(job.input, error) ? read_captures_of(job, *question, record, context)
                                                                           : read_table(job, *question, record);
  if (!read) return failure(read);
  record.quantity = question->limit.quantity;
  record.unit = question->limit.unit;
  record.conditions = conditions_in_words(question->limit.at);
  const Result<std::optional<double>> tolerance = tolerance_of(job, *question);
  if (!tolerance) return failure(tolerance);
  record.tolerance = *tolerance;
  GaugeOptions options;
  options.tolerance = record.tolerance;
  options.pooling_probability = job.pooling.value_or(options.pooling_probability);
  options.seed = job.seed;
  Result<GaugeStudy> study = study_gauge(record.readings, options);
  if (!study) return failure(study.error().problem, job.input, study.error().finding, study.error().remedy);
  record.study = std::move(*study);
  if (job.figure) {
    const Result<std::string> svg = draw_svg(figure_of(record));
    if (!svg) return failure(svg);
    if (const Result<void> written = context.write(*job.figure, *svg); !written) return failure(written);
  }
  return record;
}

}  // namespace coilassay
