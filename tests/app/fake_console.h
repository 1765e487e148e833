// A console whose streams can be read and whose clock stands still.
#pragma once

#include <sstream>
#include <string>
#include <vector>

#include "app/commands/console.h"
#include "app/commands/program.h"

namespace coilassay::test {

struct FakeConsole {
  explicit FakeConsole(Surroundings surroundings = {.script = Script::utf8})
      : console(out, error, surroundings, [] { return *parse_utc_time("2026-03-04T10:22:00Z"); }) {}
  std::ostringstream out, error;
  Console console;
};

struct Ended {
  int code;
  std::string out, error;
};

inline Ended run(const std::vector<std::string>& words, Surroundings surroundings = {.script = Script::utf8}) {
  FakeConsole fake(surroundings);
  const int code = run_program(words, fake.console);
  return {code, fake.out.str(), fake.error.str()};
}

inline bool contains(const std::string& text, std::string_view part) {
  return text.find(part) != std::string::npos;
}

}  // namespace coilassay::test
