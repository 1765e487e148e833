#include "acquire/table_time.h"

#include <fmt/format.h>

#include <algorithm>
#include <cmath>
#include <cstdlib>
#include <limits>
#include <string>

namespace coilassay {
namespace {

/// Deviation from even steps that no measurement notices: 1e-4 of a step is 95 dB below a wave of twenty samples a period.
constexpr double kNegligible = 1e-4;

/// Relative doubt beyond which rounded stamps do not give a step any more.
constexpr double kStepLost = 0.02;

double median_step(std::span<const double> stamps) {
  std::vector<double> steps;
  for (std::size_t i = 1; i < std::min<std::size_t>(stamps.size(), 4096); ++i) {
    if (stamps[i] > stamps[i - 1]) steps.push_back(stamps[i] - stamps[i - 1]);
  }
  if (steps.empty()) return 0;
  const auto middle = steps.begin() + static_cast<std::ptrdiff_t>(steps.size() / 2);
  std::nth_element(steps.begin(), middle, steps.end());
  return *middle;
}

double rounded_to(double value, int digits) {
  const std::string text = fmt::format("{:.{}e}", value, digits - 1);
  return std::strtod(text.c_str(), nullptr);
}

}  // namespace

void TimeFollower::Digits::look_at(double stamp) {
  if (stamp == 0 || !std::isfinite(stamp)) return;
  const std::string text = fmt::format("{}", std::fabs(stamp));
  // Shortest text that reads back to the same double: the digits of the file, as far as a double can hold them.
  int places = 0;
  int written = 0;
  int zeros = 0;
  bool point = false;
  std::size_t i = 0;
  for (; i < text.size() && text[i] != 'e'; ++i) {
    if (text[i] == '.') {
      point = true;
      continue;
    }
    if (text[i] != '0') {
      written += (written > 0 ? zeros : 0) + 1;
      zeros = 0;
    } else {
      ++zeros;
    }
    if (point) ++places;
  }
  const int exponent = i < text.size() ? std::atoi(text.c_str() + i + 1) : 0;
  const int last = exponent - places + zeros;  // zeros at the end were not needed
  last_place = std::min(last_place, last);
  significant = std::max(significant, written);
  const double single = static_cast<double>(static_cast<float>(stamp));
  if (std::fabs(single - stamp) > 0.51 * std::pow(10.0, last)) single_precision = false;
}

double TimeFollower::Digits::rounding(double stamp) const {
  const double size = std::fabs(stamp);
  double step = last_place < 400 ? std::pow(10.0, last_place) : 0;
  if (size > 0 && significant > 0) {
    step = std::max(step, std::pow(10.0, std::floor(std::log10(size)) - significant + 1));
  }
  if (single_precision) step = std::max(step, size * 0x1p-23);
  return std::max(step, size * 0x1p-52);
}

bool TimeFollower::jumps_back(double before, double stamp) const {
  const double back = before - stamp;
  return back > 0 && back >= 0.99 * typical_step_ && back > 1.01 * digits_.rounding(before);
}

bool TimeFollower::restarts_at(double stamp) const { return count_ > 0 && jumps_back(last_, stamp); }

/// How many stamps come before time jumps back by at least a step; less is the rounding of the text.
std::size_t TimeFollower::until_restart(std::span<const double> stamps) const {
  double before = count_ > 0 ? last_ : stamps.front();
  bool falls = stamps.front() < before;
  for (std::size_t i = 1; i < stamps.size(); ++i) falls |= stamps[i] < stamps[i - 1];
  if (!falls) return stamps.size();
  if (typical_step_ == 0) return stamps.size();  // time that never rises is one record, and told
  double before_that = count_ > 1 ? previous_to_last_ : before - typical_step_;
  for (std::size_t i = 0; i < stamps.size(); ++i) {
    // One stamp gone wrong (a lost sign, say) jumps ahead and falls back to where time goes on: no other record.
    const bool goes_on = std::fabs(stamps[i] - before_that - 2 * typical_step_) < 0.6 * typical_step_;
    if (jumps_back(before, stamps[i]) && !goes_on) return i;
    before_that = before;
    before = stamps[i];
  }
  return stamps.size();
}

std::size_t TimeFollower::follow(std::span<const double> stamps) {
  if (stamps.empty()) return 0;
  if (typical_step_ == 0) typical_step_ = median_step(stamps);
  const std::size_t accepted = until_restart(stamps);
  stamps = stamps.first(accepted);
  if (stamps.empty()) return 0;
  // Every stamp of a short record is looked at, one in 256 of a long one.
  for (std::size_t i = 0; i < stamps.size(); i += (count_ + i < 4096 ? 1 : 256)) digits_.look_at(stamps[i]);
  look_at_pairs(stamps);
  if (summarising_) {
    summarise(stamps);
  } else {
    if (kept_.empty() && stamps.size() > kGroup) kept_.reserve(kKept + stamps.size());
    kept_.insert(kept_.end(), stamps.begin(), stamps.end());
    if (count_ < kKept && kept_.size() >= kKept) try_to_summarise();
  }
  count_ += accepted;
  previous_to_last_ = stamps.size() > 1 ? stamps[stamps.size() - 2] : last_;
  last_ = stamps.back();
  return accepted;
}

void TimeFollower::try_to_summarise() {
  const Line line = fitted();
  if (!(line.step > 0) || !fits(line, nullptr)) return;
  summarising_ = true;
  line_ = line;
  // Rounding of the stamps so far may have turned the line by this much.
  slope_doubt_ = 2 * tolerance(kept_.back(), line.step) / static_cast<double>(kept_.size());
  open_ = Group{kept_.size(), 0, 0, 0, 0};
}

void TimeFollower::look_at_pairs(std::span<const double> stamps) {
  for (std::size_t i = 0; pairs_ && i < stamps.size(); ++i) {
    const std::size_t index = count_ + i;
    const double before = i > 0 ? stamps[i - 1] : last_;
    if (index % 2 == 1) {
      pairs_ = stamps[i] == before;
    } else if (index > 0) {
      pairs_ = stamps[i] > before;
    }
  }
}

void TimeFollower::close_group() {
  if (open_.count == 0) return;
  groups_.push_back(open_);
  open_ = Group{open_.first + open_.count, 0, 0, 0, 0};
}

void TimeFollower::summarise(std::span<const double> stamps) {
  while (!stamps.empty()) {
    const std::size_t count = std::min(kGroup - open_.count, stamps.size());
    const std::size_t first = open_.first + open_.count;
    double low = std::numeric_limits<double>::infinity();
    double high = -low;
    double sum = 0;
    for (std::size_t i = 0; i < count; ++i) {
      const double deviation = stamps[i] - line_.at(static_cast<double>(first + i));
      low = std::min(low, deviation);
      high = std::max(high, deviation);
      sum += deviation;
    }
    const double allowed = 2 * std::max(tolerance(stamps.front(), line_.step), tolerance(stamps[count - 1], line_.step)) +
                           slope_doubt_ * static_cast<double>(first + count);
    if (!(low >= -allowed && high <= allowed) || std::isnan(sum)) return give_up_line(stamps);
    open_.low = open_.count == 0 ? low : std::min(open_.low, low);
    open_.high = open_.count == 0 ? high : std::max(open_.high, high);
    open_.sum += sum;
    open_.count += count;
    if (open_.count == kGroup) close_group();
    stamps = stamps.subspan(count);
  }
}

/// Steps that turn uneven late: the stamps so far are those of the line they kept to, from here on all are kept.
void TimeFollower::give_up_line(std::span<const double> rest) {
  close_group();
  const Line line = fitted();
  const std::size_t end = groups_.empty() ? kept_.size() : groups_.back().first + groups_.back().count;
  for (std::size_t n = kept_.size(); n < end; ++n) kept_.push_back(line.at(static_cast<double>(n)));
  groups_.clear();
  summarising_ = false;
  kept_.insert(kept_.end(), rest.begin(), rest.end());
}

/// Least squares, about the middle of the record.
TimeFollower::Line TimeFollower::fitted() const {
  const std::size_t summarised = groups_.empty() ? 0 : groups_.back().first + groups_.back().count - groups_.front().first;
  const std::size_t total = kept_.size() + summarised + open_.count;
  if (total < 2) return {kept_.empty() ? 0 : kept_.front(), 0};
  const double middle = static_cast<double>(total - 1) / 2;
  const double origin = kept_.front();
  double sum = 0;
  double moment = 0;
  double square = 0;
  const auto add = [&](double index, double stamp, double weight) {
    sum += weight * (stamp - origin);
    moment += weight * (index - middle) * (stamp - origin);
    square += weight * (index - middle) * (index - middle);
  };
  for (std::size_t i = 0; i < kept_.size(); ++i) add(static_cast<double>(i), kept_[i], 1);
  const auto add_group = [&](const Group& g) {
    if (g.count == 0) return;
    const auto weight = static_cast<double>(g.count);
    add(g.middle(), line_.at(g.middle()) + g.sum / weight, weight);
  };
  for (const Group& group : groups_) add_group(group);
  add_group(open_);
  const double step = moment / square;
  return {origin + sum / static_cast<double>(total) - step * middle, step};
}

/// How far a stamp may lie from its line: three quarters of a step of its writing, as the line itself may be off by a part.
double TimeFollower::tolerance(double stamp, double step) const {
  return 0.75 * digits_.rounding(stamp) + kNegligible * step;
}

bool TimeFollower::fits(const Line& line, double* largest) const {
  double worst = 0;  // in tolerances
  double worst_deviation = 0;
  // The tolerance changes slowly along the record: it is taken once for each stretch.
  for (std::size_t begin = 0; begin < kept_.size(); begin += 64) {
    const std::size_t end = std::min(begin + 64, kept_.size());
    double farthest = 0;
    for (std::size_t i = begin; i < end; ++i) {
      farthest = std::max(farthest, std::fabs(kept_[i] - line.at(static_cast<double>(i))));
    }
    worst_deviation = std::max(worst_deviation, farthest);
    const double allowed = std::max(tolerance(kept_[begin], line.step), tolerance(kept_[end - 1], line.step));
    worst = std::max(worst, farthest / allowed);
  }
  const auto look_at_group = [&](const Group& g) {
    if (g.count == 0) return;
    const double turned = line_.at(g.middle()) - line.at(g.middle());
    const double farthest = std::max(std::fabs(g.low + turned), std::fabs(g.high + turned));
    worst_deviation = std::max(worst_deviation, farthest);
    worst = std::max(worst, farthest / tolerance(line_.at(g.middle()), line.step));
  };
  for (const Group& group : groups_) look_at_group(group);
  look_at_group(open_);
  if (largest != nullptr) *largest = worst_deviation;
  return worst <= 1;
}

/// The line of a given step that fits best, through the first stamp if that fits.
std::optional<TimeFollower::Line> TimeFollower::with_step(double step, const Line& fit) const {
  if (!(step > 0)) return std::nullopt;
  const Line through_first{kept_.front(), step};
  if (fits(through_first, nullptr)) return through_first;
  const double middle = static_cast<double>(count_ - 1) / 2;
  const Line centred{fit.at(middle) - step * middle, step};
  if (fits(centred, nullptr)) return centred;
  return std::nullopt;
}

/// The step with the fewest digits that the stamps allow; they were made with such a one.
TimeFollower::Line TimeFollower::written_shortly(const Line& fit, std::optional<double> stated_step_s) const {
  if (stated_step_s) {
    if (const auto line = with_step(*stated_step_s, fit)) return *line;
  }
  for (int digits = 1; digits <= 12; ++digits) {
    const double step = rounded_to(fit.step, digits);
    // Far from the fit over the whole record: not worth a look at every stamp.
    if (std::fabs(step - fit.step) * static_cast<double>(count_) >
        4 * (tolerance(last_, fit.step) + tolerance(kept_.front(), fit.step))) {
      continue;
    }
    if (const auto line = with_step(step, fit)) return *line;
  }
  return fit;
}

TimeStory TimeFollower::finish(std::optional<double> stated_step_s) const {
  TimeStory story;
  if (count_ == 0) return story;
  if (count_ >= 4 && pairs_) {
    TimeFollower distinct;
    std::vector<double> every_second;
    const Line all = fitted();
    for (std::size_t i = 0; i < count_; i += 2) {
      every_second.push_back(i < kept_.size() ? kept_[i] : all.at(static_cast<double>(i) + 0.5));
    }
    distinct.follow(every_second);
    const TimeStory each = distinct.finish(stated_step_s);
    // Stamps that merely lost their digits repeat as well, but then differ by one in the last digit written.
    if (each.axis.uniform() && each.axis.step_s > 1.5 * digits_.rounding(last_)) {
      story.every_stamp_twice = true;
      story.distinct_step_s = each.axis.step_s;
      for (std::size_t i = 0; i < count_; ++i) {
        const double exact = each.axis.start_s + static_cast<double>(i / 2) * each.axis.step_s;
        story.axis.times_s.push_back(i < kept_.size() ? kept_[i] : exact);
      }
      return story;
    }
  }
  const Line line = fitted();
  double largest = 0;
  if (count_ >= 2 && line.step > 0 && fits(line, &largest)) {
    const Line shortest = written_shortly(line, stated_step_s);
    const bool as_stated = stated_step_s && shortest.step == *stated_step_s;
    double left_over = 0;
    fits(shortest, &left_over);
    // Rounding may turn the line by twice its size over the record; averaged over all stamps, by much less.
    const auto n = static_cast<double>(count_);
    const double at_most = as_stated ? 0 : 2 * left_over / ((n - 1) * line.step);
    story.step_doubt = as_stated ? 0 : 2 * left_over / (std::pow(n, 1.5) * line.step);
    if (at_most > kStepLost) {
      story.step_lost = true;
      story.step_doubt = at_most;
      return story;
    }
    story.axis.start_s = shortest.start;
    story.axis.step_s = shortest.step;
    return story;
  }
  story.largest_deviation_steps = line.step > 0 ? largest / line.step : 0;
  story.runs_back = !std::is_sorted(kept_.begin(), kept_.end());
  story.axis.times_s = kept_;
  for (std::size_t n = kept_.size(); n < count_; ++n) story.axis.times_s.push_back(line.at(static_cast<double>(n)));
  return story;
}

}  // namespace coilassay
