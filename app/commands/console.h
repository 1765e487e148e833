// Everything outside the program that a command may touch, passed in so that tests can stand in for it.
#pragma once

#include <chrono>
#include <functional>
#include <iosfwd>
#include <optional>
#include <string>
#include <string_view>

#include "app/runs/context.h"
#include "base/number_text.h"
#include "base/result.h"
#include "base/utc_time.h"
#include "report/result_text.h"

namespace coilassay {

/// What the terminal and the environment say.
struct Surroundings {
  Script script = Script::ascii;
  bool no_color = false;  // NO_COLOR is set
  bool out_is_terminal = false;
  bool error_is_terminal = false;
  std::size_t width = 80;  // of the terminal
};

/// Text is UTF-8 when the first of LC_ALL, LC_CTYPE and LANG that is set says so; no locale is ever set.
Script script_of_locale(std::string_view lc_all, std::string_view lc_ctype, std::string_view lang);

class Console {
 public:
  Console(std::ostream& out, std::ostream& error, Surroundings surroundings, std::function<UtcTime()> clock)
      : out_(&out), error_(&error), surroundings_(surroundings), clock_(std::move(clock)) {}

  std::ostream& out() { return *out_; }
  std::ostream& error() { return *error_; }
  const Surroundings& surroundings() const { return surroundings_; }
  UtcTime now() const { return clock_(); }

  void forbid_color() { surroundings_.no_color = true; }
  /// How text on standard output or standard error looks.
  TextStyle out_style() const { return style(surroundings_.out_is_terminal); }
  TextStyle error_style() const { return style(surroundings_.error_is_terminal); }

  /// A sentence on standard error.
  void say(std::string_view sentence);
  void show(const Error& error);
  /// Writes a file, or to standard output for "-".
  Result<void> write(const std::string& path, const std::string& contents);

 private:
  TextStyle style(bool terminal) const;

  std::ostream* out_;
  std::ostream* error_;
  Surroundings surroundings_;
  std::function<UtcTime()> clock_;
};

}  // namespace coilassay
