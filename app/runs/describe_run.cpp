#include "app/runs/describe_run.h"

#include <algorithm>
#include <filesystem>

#include "acquire/table_head.h"
#include "base/number_text.h"
#include "base/outside_text.h"

namespace coilassay {

namespace {

Result<ReadOptions> reading_of(const DescribeJob& job) {
  if (!job.bench_sheet) return job.stated;
  Result<BenchSetup> sheet = read_bench_sheet(*job.bench_sheet);
  if (!sheet) return failure(sheet);
  BenchSetup stated;
  stated.reading = job.stated;
  return overridden(std::move(*sheet), stated).reading;
}

Result<void> check_job(const DescribeJob& job) {
  if (std::count(job.files.begin(), job.files.end(), "-") > 1) {
    return failure(Problem::usage, "-", "standard input can be read only once",
                   "give '-' once and name the other files");
  }
  if (!job.bench_out) return {};
  if (job.files.size() > 1) {
    return failure(Problem::usage, "--bench-out", "a reading key is that of one file",
                   "describe one typical file with it");
  }
  if (*job.bench_out == "-") {
    return failure(Problem::usage, "--bench-out", "a bench sheet is written to a file", "give the name of a new file");
  }
  std::error_code trouble;
  if (std::filesystem::exists(std::filesystem::symlink_status(*job.bench_out, trouble))) {
    return failure(Problem::usage, *job.bench_out, "there is such a file already, and it is not changed",
                   "give another name, and copy what you need into your sheet");
  }
  return {};
}

/// Text as a TOML string.
std::string toml_text(const std::string& text) {
  std::string quoted = "\"";
  for (const char c : text) {
    if (c == '"' || c == '\\') quoted += '\\';
    quoted += c;
  }
  return quoted + "\"";
}

std::string delimiter_text(char delimiter) {
  if (delimiter == '\t') return "tab";
  if (delimiter == ' ') return "space";
  return {delimiter};
}

/// A column as a sheet names it; a name that could not be shown as it is gives way to the position.
std::string column_text(const Description& d, const ChannelDescription& channel) {
  const auto alike = std::count_if(d.channels.begin(), d.channels.end(),
                                   [&](const ChannelDescription& other) { return other.name == channel.name; });
  const bool safe = !channel.name.empty() && shown(channel.name) == channel.name;
  return safe && alike == 1 ? toml_text(channel.name) : std::to_string(channel.column);
}

/// The columns this could be about, commented out: what they mean is for people to say.
std::string likely_columns(const Description& d) {
  const auto& all = d.channels;
  const auto voltage = std::find_if(all.begin(), all.end(),
                                    [](const ChannelDescription& c) { return c.unit == Unit::volt || !c.unit_stated; });
  auto current =
      std::find_if(all.begin(), all.end(), [](const ChannelDescription& c) { return c.unit == Unit::ampere; });
  const bool in_ampere = current != all.end();
  for (auto c = all.begin(); !in_ampere && c != all.end(); ++c) {
    if (c == voltage || (c->unit != Unit::volt && c->unit_stated)) continue;
    current = c;
    break;
  }
  std::string text;
  if (voltage != all.end()) text += "# [voltage]\n# column = " + column_text(d, *voltage) + "\n";
  if (current != all.end()) {
    text += "# [current]\n# column = " + column_text(d, *current) + "\n";
    if (!in_ampere) text += "# shunt = \"0.1 ohm ± 1 %\"\n";
  }
  return text.empty() ? text : "\n# What the columns are: take away the # where it is right, or change it.\n" + text;
}

}  // namespace

Result<std::string> reading_key(const Description& description, const ReadOptions& reading,
                                const std::vector<std::string>& found) {
  const Dialect& dialect = description.dialect;
  if (dialect.format != "table" || dialect.delimiter.empty() || dialect.decimal.empty()) {
    return failure(Problem::usage, "--bench-out",
                   "the file says itself how it is to be read (" + shown(dialect.format) + "): there is no key to keep",
                   "leave it out; only tables of text have a reading key");
  }
  std::string text = "# How files like " + shown(description.source.name) + " are read.\n[file]\n";
  text += "delimiter = " + toml_text(delimiter_text(dialect.delimiter.front())) + "\n";
  text += "decimal = " + toml_text(dialect.decimal) + "\n";
  if (reading.skip > 0) text += "skip = " + std::to_string(reading.skip) + "\n";
  const std::vector<std::string>& headings = reading.columns.empty() ? found : reading.columns;
  if (!headings.empty()) {
    std::string columns;
    for (const std::string& heading : headings) columns += (columns.empty() ? "" : ", ") + toml_text(heading);
    text += "columns = [" + columns + "]\n";
  }
  if (reading.sample_interval_s) {
    text += "sample_interval = " + toml_text(to_shortest(*reading.sample_interval_s) + " s") + "\n";
  } else if (description.kind == "waveform" && description.uniform && std::isnan(description.sample_interval_s)) {
    text += "# sample_interval = \"1 us\"    # the file gives no time\n";
  }
  return text + likely_columns(description);
}

Result<std::vector<DescribedFile>> run_describe(const DescribeJob& job, const RunContext& context) {
  if (const Result<void> fine = check_job(job); !fine) return failure(fine);
  Result<ReadOptions> reading = reading_of(job);
  if (!reading) return failure(reading);
  reading->threads = context.threads;
  reading->progress = context.progress;

  std::vector<DescribedFile> described;
  for (const std::string& file : job.files) {
    const Result<Recording> recording = read_recording(file, *reading);
    if (!recording && recording.error().problem == Problem::interrupted) return failure(recording);
    described.push_back(
        {file, recording ? Result<Description>(describe(*recording, job.options)) : failure(recording)});
  }
  if (job.bench_out && described.front().description) {
    const Description& first = *described.front().description;
    std::vector<std::string> columns;
    // Standard input is used up, and a file that is gone by now has been described all the same.
    if (job.files.front() != "-" && first.dialect.format == "table") {
      columns = reading_key_columns(job.files.front(), *reading).value_or(std::vector<std::string>());
    }
    const Result<std::string> key = reading_key(first, *reading, columns);
    if (!key) return failure(key);
    if (const Result<void> written = context.write(*job.bench_out, *key); !written) return failure(written);
  }
  return described;
}

}  // namespace coilassay
