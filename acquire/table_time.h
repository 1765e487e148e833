// The time stamps of a table: even steps as start and step, anything else as it stands.
#pragma once

#include <cstddef>
#include <cstdint>
#include <optional>
#include <span>
#include <vector>

#include "acquire/capture.h"

namespace coilassay {

/// What the stamps of one record turned out to be.
struct TimeStory {
  TimeAxis axis;
  bool every_stamp_twice = false;     // minimum and maximum of an interval exported as two samples
  double distinct_step_s = 0;         // step between distinct stamps, when those are even
  double largest_deviation_steps = 0; // from even steps, when they are not
  bool runs_back = false;             // some stamps are earlier than those before them
  double step_doubt = 0;              // relative: what the rounding of the stamps leaves open of an even step
  bool step_lost = false;             // it leaves the step itself open: the axis has none
};

/// Follows the stamps of a record as they are read. Even steps within what the written digits can show are kept as a line
/// only: a long record needs no memory for its time.
class TimeFollower {
 public:
  /// How many of the stamps continue the record; the rest begin another one (time jumped back by at least a step).
  std::size_t follow(std::span<const double> stamps);

  /// Whether this stamp, coming next, would begin another record.
  bool restarts_at(double stamp) const;

  /// @param stated_step_s  step the file states; taken when the stamps agree with it
  TimeStory finish(std::optional<double> stated_step_s) const;

  std::size_t size() const { return count_; }

 private:
  /// A straight line through stamps: start + index * step.
  struct Line {
    double start = 0;
    double step = 0;
    double at(double index) const { return start + index * step; }
  };
  /// Stamps no longer kept: how far they lie from the line at most, and on average.
  struct Group {
    std::size_t first = 0;
    std::size_t count = 0;
    double sum = 0;  // of the deviations
    double low = 0;
    double high = 0;
    double middle() const { return static_cast<double>(first) + static_cast<double>(count - 1) / 2; }
  };
  /// Digits the stamps are written with.
  struct Digits {
    int last_place = 400;
    int significant = 0;
    bool single_precision = true;  // all are numbers a 32-bit float can hold, as far as the digits show
    void look_at(double stamp);
    double rounding(double stamp) const;  // step between numbers that can be written near it
  };

  static constexpr std::size_t kKept = std::size_t{1} << 19U;
  static constexpr std::size_t kGroup = 1024;

  bool jumps_back(double before, double stamp) const;
  void try_to_summarise();
  std::size_t until_restart(std::span<const double> stamps) const;
  void look_at_pairs(std::span<const double> stamps);
  void summarise(std::span<const double> stamps);
  void close_group();
  void give_up_line(std::span<const double> rest);
  Line fitted() const;
  double tolerance(double stamp, double step) const;
  bool fits(const Line& line, double* largest) const;
  Line written_shortly(const Line& fit, std::optional<double> stated_step_s) const;
  std::optional<Line> with_step(double step, const Line& fit) const;

  std::vector<double> kept_;   // all stamps, or the first kKept of a record on even steps
  std::vector<Group> groups_;  // the others
  Group open_;
  double slope_doubt_ = 0;     // of line_, per index
  bool summarising_ = false;
  Line line_;
  Digits digits_;
  double typical_step_ = 0;
  double last_ = 0;
  double previous_to_last_ = 0;
  std::size_t count_ = 0;
  bool pairs_ = true;
};

}  // namespace coilassay
