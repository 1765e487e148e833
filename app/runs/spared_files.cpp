#include "app/runs/spared_files.h"

#include <filesystem>

#include "acquire/bench_sheet.h"
#include "base/outside_text.h"

namespace coilassay {

namespace {

namespace fs = std::filesystem;

tl::unexpected<Error> refusal(const GivenFile& output, const std::string& finding) {
  return failure(Problem::cannot_write, output.given_as, finding, "give another file name");
}

}  // namespace

bool same_file(const std::string& a, const std::string& b) {
  if (a == "-" || b == "-") return false;
  std::error_code unknown;
  const bool a_there = fs::exists(a, unknown), b_there = fs::exists(b, unknown);
  if (a_there != b_there) return false;
  if (a_there) return fs::is_regular_file(a, unknown) && fs::equivalent(a, b, unknown);
  const fs::path whole_a = fs::weakly_canonical(fs::absolute(a, unknown), unknown);
  const fs::path whole_b = fs::weakly_canonical(fs::absolute(b, unknown), unknown);
  return !whole_a.empty() && whole_a == whole_b;
}

Result<void> spare_files(std::span<const GivenFile> outputs, std::span<const GivenFile> inputs) {
  for (std::size_t i = 0; i < outputs.size(); ++i) {
    const GivenFile& output = outputs[i];
    for (const GivenFile& input : inputs) {
      std::error_code unknown;
      if (!fs::exists(output.path, unknown) || !same_file(output.path, input.path)) continue;
      return refusal(output, "this is the file " + (input.given_as.empty() ? shown(input.path, 100) : "of " + input.given_as) +
                                 ", which is read, and it would be lost");
    }
    for (std::size_t j = 0; j < i; ++j) {
      if (same_file(output.path, outputs[j].path)) {
        return refusal(output, "this is the file of " + outputs[j].given_as + " as well, and one of them would be lost");
      }
    }
  }
  return {};
}

void add_bench_files(std::vector<GivenFile>& inputs, const std::string& bench_sheet) {
  inputs.push_back({"", bench_sheet});
  // A sheet that cannot be read is refused where it is used.
  const Result<BenchSetup> bench = read_bench_sheet(bench_sheet);
  if (bench && bench->fixture_set) inputs.push_back({"", *bench->fixture_set});
}

}  // namespace coilassay
