// Speed of read_recording against pandas (read_peer.py) on the same files in the same session, in the dialects people have.
// Answers first: every channel must have the same bits as pandas' round-trip reader gives. Runs are interleaved, the best
// of each is compared, ratios are printed. On a busy machine the time on the processor says more: with one thread that of
// the calling thread (the digest has a thread of its own), with two half of all threads'. Not part of any verdict: exit 1 only for a wrong answer.
//
// usage (in the source folder): read_benchmark [ROWS] [ROUNDS]   (default 10000000 3)
#include <fmt/format.h>
#include <sys/resource.h>
#include <unistd.h>

#include <algorithm>
#include <array>
#include <chrono>
#include <cmath>
#include <cstdio>
#include <cstdlib>
#include <filesystem>
#include <fstream>
#include <map>
#include <string>
#include <vector>

#include "acquire/reader.h"
#include "base/digest.h"
#include "base/random.h"

namespace {

using namespace coilassay;

struct Form {
  const char* name;
  char separator;
  char decimal;
  int columns;
  bool engineering;
};

constexpr Form kForms[] = {
    {"two columns", ',', '.', 2, false},
    {"three columns", ',', '.', 3, false},
    {"decimal comma", ';', ',', 2, false},
    {"engineering exponents", ',', '.', 2, true},
};

/// "-1.2345E-06" with an exponent that is a multiple of three.
std::string engineering(double value) {
  int exponent = value == 0 ? 0 : static_cast<int>(std::floor(std::log10(std::fabs(value)) / 3)) * 3;
  return fmt::format("{:.6f}E{:+03d}", value / std::pow(10.0, exponent), exponent);
}

void write_table(const std::string& path, const Form& form, std::size_t rows) {
  Random random(3);
  std::ofstream out(path, std::ios::binary);
  out << (form.columns == 2 ? fmt::format("time_s{}v_V\n", form.separator) : fmt::format("time_s{0}v_V{0}i_A\n", form.separator));
  std::string text;
  for (std::size_t i = 0; i < rows; ++i) {
    const double t = -1e-3 + static_cast<double>(i) * 4e-9;
    const double v = std::cos(6.28e5 * t) * std::exp(-200 * std::fabs(t)) + 0.01 * random.normal();
    std::string row = form.engineering ? fmt::format("{}{}{}", engineering(t), form.separator, engineering(v))
                                       : fmt::format("{:.8e}{}{:.6f}", t, form.separator, v);
    if (form.columns == 3) row += fmt::format("{}{:.5e}", form.separator, 0.01 * v + 1e-4 * random.normal());
    if (form.decimal == ',') std::replace(row.begin(), row.end(), '.', ',');
    text += row;
    text += '\n';
    if (text.size() > (1U << 20U)) {
      out << text;
      text.clear();
    }
  }
  out << text;
}

struct Run {
  double seconds = 0;
  double processor = 0;  // time on the processor: of the calling thread with one thread (the digest has its own), else of all
  std::vector<std::string> digests;
};

double seconds_now() { return std::chrono::duration<double>(std::chrono::steady_clock::now().time_since_epoch()).count(); }

double processor_now(bool whole_process) {
  rusage used{};
  ::getrusage(whole_process ? RUSAGE_SELF : RUSAGE_THREAD, &used);
  const auto seconds = [](const timeval& t) { return static_cast<double>(t.tv_sec) + 1e-6 * static_cast<double>(t.tv_usec); };
  return seconds(used.ru_utime) + seconds(used.ru_stime);
}

double number_behind(const std::string& text, const std::string& key) { return std::strtod(text.c_str() + text.find(key) + key.size(), nullptr); }

bool run_ours(const std::string& path, unsigned threads, bool digest, Run& run) {
  ReadOptions options;
  options.threads = threads;
  const double began = seconds_now();
  const double began_processor = processor_now(threads > 1);
  const auto got = read_recording(path, options);
  run.seconds = seconds_now() - began;
  run.processor = (processor_now(threads > 1) - began_processor) / threads;
  if (!got) {
    std::printf("%s: %s\n", got.error().place.c_str(), got.error().finding.c_str());
    return false;
  }
  if (!digest) return true;
  for (const Channel& channel : std::get<std::vector<Capture>>(*got).front().channels) {
    const char* const bytes = reinterpret_cast<const char*>(channel.samples.data());
    run.digests.push_back(sha256_of({bytes, channel.samples.size() * sizeof(double)}));
  }
  return true;
}

bool run_peer(const std::string& path, const std::string& reader, const Form& form, Run& run) {
  const std::string command = fmt::format("/usr/bin/python3 tests/benchmarks/read_peer.py '{}' {} '{}' '{}'", path, reader, form.separator, form.decimal);
  std::FILE* const pipe = ::popen(command.c_str(), "r");
  if (pipe == nullptr) return false;
  std::array<char, 4096> line{};
  const bool got = std::fgets(line.data(), static_cast<int>(line.size()), pipe) != nullptr;
  if (::pclose(pipe) != 0 || !got) return false;
  const std::string text = line.data();
  run.seconds = number_behind(text, "\"seconds\": ");
  run.processor = number_behind(text, "\"processor\": ");
  for (std::size_t at = text.find('[') + 2; at + 64 < text.size(); at += 68) run.digests.push_back(text.substr(at, 64));
  return true;
}

bool compare(const Form& form, const std::string& path, std::size_t rows, int rounds) {
  std::printf("%s, %zu rows, %.0f MB\n", form.name, rows, static_cast<double>(std::filesystem::file_size(path)) / 1e6);
  Run ours;
  Run exact;
  if (!run_ours(path, 2, true, ours) || !run_peer(path, "pandas_round_trip", form, exact)) return false;
  if (ours.digests != exact.digests || ours.digests.empty()) {
    std::printf("  WRONG: not the bits of pandas' round-trip reader\n");
    return false;
  }
  std::map<std::string, Run> best;
  const auto note = [&best](const std::string& who, const Run& run) {
    const auto [at, fresh] = best.emplace(who, run);
    at->second.seconds = std::min(at->second.seconds, run.seconds);
    at->second.processor = std::min(at->second.processor, run.processor);
  };
  for (int round = 0; round < rounds; ++round) {
    Run run;
    for (const unsigned threads : {1U, 2U}) {
      if (!run_ours(path, threads, false, run)) return false;
      note(threads == 1 ? "ours, 1 thread" : "ours, 2 threads", run);
    }
    for (const char* reader : {"pandas", "pandas_round_trip"}) {
      if (!run_peer(path, reader, form, run)) return false;
      note(reader, run);
    }
  }
  const double per_row = 1e9 / static_cast<double>(rows);
  for (const auto& [who, run] : best) {
    std::printf("  %-18s %8.3f s  %6.1f ns a row  (%6.1f ns on the processor)\n", who.c_str(), run.seconds, per_row * run.seconds, per_row * run.processor);
  }
  for (const char* who : {"ours, 1 thread", "ours, 2 threads"}) {
    std::printf("  %-18s %5.1f times pandas, %5.1f times its round-trip reader (on the processor %5.1f, %5.1f)\n", who,
                best["pandas"].seconds / best[who].seconds, best["pandas_round_trip"].seconds / best[who].seconds,
                best["pandas"].processor / best[who].processor, best["pandas_round_trip"].processor / best[who].processor);
  }
  return true;
}

}  // namespace

int main(int count, char** words) {
  const std::size_t rows = count > 1 ? std::strtoull(words[1], nullptr, 10) : 10'000'000;
  const int rounds = count > 2 ? std::atoi(words[2]) : 3;
  const auto folder = std::filesystem::temp_directory_path() / fmt::format("read-benchmark-{}", ::getpid());
  std::filesystem::create_directories(folder);
  bool right = true;
  for (const Form& form : kForms) {
    const std::string path = (folder / "table.csv").string();
    write_table(path, form, rows);
    right = compare(form, path, rows, rounds) && right;
  }
  rusage used{};
  ::getrusage(RUSAGE_SELF, &used);
  std::printf("peak memory %ld MB; two channels of samples take %.0f MB\n", used.ru_maxrss / 1024, 16 * static_cast<double>(rows) / 1048576);
  std::error_code ignored;
  std::filesystem::remove_all(folder, ignored);
  return right ? 0 : 1;
}
