// The project's own files, read for the tests of house rules.
#pragma once

#include <string>
#include <utility>
#include <vector>

namespace coilassay::test {

struct SourceFile {
  std::string path;                 // relative to the project's root, with '/'
  std::vector<std::string> lines;
  std::string text() const;
  /// The first folder of the path, "acquire"; for tests/ the whole first folder too.
  std::string room() const;
};

/// Files whose names end in one of `endings`, below the given folders (or the files themselves), in order of their paths.
/// Build folders and hidden ones are left out.
std::vector<SourceFile> source_files(const std::vector<std::string>& below, const std::vector<std::string>& endings);

/// A file of the project by its path; an empty path when there is none.
SourceFile source_file(const std::string& path);

/// What `#include` lines of a text name, in order: {"base/unit.h", false} for our own, {"fftw3.h", true} for <>.
struct Include {
  std::string name;
  bool angled = false;
  std::size_t line = 0;             // counted from 1
};
std::vector<Include> includes_of(const std::vector<std::string>& lines);

std::vector<std::string> lines_of(const std::string& text);

}  // namespace coilassay::test
