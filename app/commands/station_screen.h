// What an operator sees: a screen of large letters on a terminal, plain lines elsewhere.
#pragma once

#include <deque>
#include <iosfwd>
#include <memory>
#include <string>

#include "app/runs/station_run.h"
#include "report/result_text.h"

namespace coilassay {

/// One line for each unit and notice: "0017 passes  L_s 47.02 µH ± 0.09 µH (37.60 µH to 56.40 µH)".
class StationLines final : public StationView {
 public:
  StationLines(std::ostream& units, std::ostream& notices, TextStyle style, bool quiet)
      : units_(units), notices_(notices), style_(style), quiet_(quiet) {}
  void begun(const StationProgress& progress) override;
  void unit(const StationUnit& unit, const StationProgress& progress) override;
  void notice(const StationNotice& notice, const StationProgress& progress) override;

 private:
  std::ostream& units_;
  std::ostream& notices_;
  TextStyle style_;
  bool quiet_;
};

/// One JSON line for each unit; notices as lines on another stream.
class StationFollower final : public StationView {
 public:
  StationFollower(std::ostream& units, StationView& notices) : units_(units), notices_(notices) {}
  void begun(const StationProgress& progress) override { notices_.begun(progress); }
  void unit(const StationUnit& unit, const StationProgress& progress) override;
  void notice(const StationNotice& notice, const StationProgress& progress) override { notices_.notice(notice, progress); }

 private:
  std::ostream& units_;
  StationView& notices_;
};

/// The whole screen is drawn anew for each event: the verdict as word and shape in large letters, with the terminal's bell; the
/// unit's values; the last parts; counts, yield and how far the plan is; the commands. No question is ever asked.
class StationScreen final : public StationView {
 public:
  StationScreen(std::ostream& out, TextStyle style) : out_(out), style_(style) {}
  void begun(const StationProgress& progress) override;
  void unit(const StationUnit& unit, const StationProgress& progress) override;
  void notice(const StationNotice& notice, const StationProgress& progress) override;

 private:
  void draw(const std::vector<std::string>& large, std::string_view color, const std::vector<std::string>& below, const StationProgress& progress,
            int bells);

  std::ostream& out_;
  TextStyle style_;
  std::deque<std::string> last_;  // newest first
};

/// "first pass 94 % (47 of 50), final 96 %".
std::string yield_in_words(const StationProgress& progress);

}  // namespace coilassay
