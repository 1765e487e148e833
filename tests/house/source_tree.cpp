#include "tests/house/source_tree.h"

#include <algorithm>
#include <filesystem>
#include <fstream>
#include <regex>
#include <sstream>

namespace coilassay::test {

namespace fs = std::filesystem;

namespace {

SourceFile read(const fs::path& path) {
  std::ifstream in(path, std::ios::binary);
  std::stringstream text;
  text << in.rdbuf();
  return {path.lexically_normal().generic_string(), lines_of(text.str())};
}

bool ends_in_one_of(const std::string& name, const std::vector<std::string>& endings) {
  return std::any_of(endings.begin(), endings.end(), [&](const std::string& ending) { return name.ends_with(ending); });
}

}  // namespace

std::string SourceFile::text() const {
  std::string all;
  for (const std::string& line : lines) all += line + '\n';
  return all;
}

std::string SourceFile::room() const { return path.substr(0, path.find('/')); }

std::vector<SourceFile> source_files(const std::vector<std::string>& below, const std::vector<std::string>& endings) {
  std::vector<SourceFile> files;
  for (const std::string& start : below) {
    if (fs::is_regular_file(start)) {
      files.push_back(read(start));
      continue;
    }
    if (!fs::is_directory(start)) continue;
    for (auto at = fs::recursive_directory_iterator(start); at != fs::recursive_directory_iterator(); ++at) {
      const std::string name = at->path().filename().string();
      if (at->is_directory() && (name.starts_with(".") || name.starts_with("build"))) {
        at.disable_recursion_pending();
      } else if (at->is_regular_file() && ends_in_one_of(name, endings)) {
        files.push_back(read(at->path()));
      }
    }
  }
  std::sort(files.begin(), files.end(), [](const SourceFile& a, const SourceFile& b) { return a.path < b.path; });
  return files;
}

SourceFile source_file(const std::string& path) {
  return fs::is_regular_file(path) ? read(path) : SourceFile{};
}

std::vector<Include> includes_of(const std::vector<std::string>& lines) {
  static const std::regex form(R"(^\s*#\s*include\s*([<"])([^>"]+)[>"])");
  std::vector<Include> found;
  for (std::size_t i = 0; i < lines.size(); ++i) {
    std::smatch match;
    if (lines[i].find("include") == std::string::npos) continue;
    if (std::regex_search(lines[i], match, form)) found.push_back({match[2], match[1] == "<", i + 1});
  }
  return found;
}

std::vector<std::string> lines_of(const std::string& text) {
  std::vector<std::string> lines;
  std::stringstream in(text);
  for (std::string line; std::getline(in, line);) lines.push_back(line);
  return lines;
}

}  // namespace coilassay::test
