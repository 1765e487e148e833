// Normal, tightened, reduced, discontinued: what the lots before make of the next one.
#include <fmt/format.h>

#include <algorithm>
#include <deque>

#include "inspection/sampling.h"

namespace coilassay {

namespace {

constexpr std::size_t kWindow = 5;             // lots in which two rejected ones bring tightened inspection
constexpr int kBackToNormal = 5;               // accepted in a row on tightened
constexpr int kToReduced = 10;                 // accepted in a row on normal
constexpr int kDiscontinue = 5;                // rejected in all while on tightened (ISO 2859-1)

/// The state after some lots, and how it came about.
class Switching {
 public:
  explicit Switching(const Sampling& sampling) : allowed_(sampling.reduced_allowed && sampling.scheme == SamplingScheme::attributes), now_(sampling.severity) {
    why_ = fmt::format("the sheet begins with {} inspection", name(now_));
  }

  void add(const LotHistory& lot) {
    // A severity other than expected was chosen by someone: counting begins anew there.
    if (lot.severity != now_) move(lot.severity, fmt::format("a lot was inspected {}", name(lot.severity)));
    const bool accepted = lot.decision == LotResult::accept, rejected = lot.decision == LotResult::reject;
    in_a_row_ = accepted ? in_a_row_ + 1 : 0;
    if (lot.decision != LotResult::undecided) {
      recent_.push_back(rejected);
      if (recent_.size() > kWindow) recent_.pop_front();
    }
    switch (now_) {
      case Severity105::normal: return after_normal();
      case Severity105::tightened: return after_tightened(rejected);
      case Severity105::reduced: return after_reduced(lot);
      case Severity105::discontinued: return;
    }
  }

  NextSeverity next() const { return {now_, why_}; }

 private:
  void move(Severity105 to, std::string why) {
    if (to == Severity105::tightened || to == Severity105::reduced) rejected_on_tightened_ = 0;
    now_ = to;
    why_ = std::move(why);
    in_a_row_ = 0;
    recent_.clear();
  }

  void after_normal() {
    const auto rejected = std::count(recent_.begin(), recent_.end(), true);
    if (rejected >= 2) return move(Severity105::tightened, fmt::format("2 of the last {} lots were rejected", recent_.size()));
    if (allowed_ && in_a_row_ >= kToReduced) {
      return move(Severity105::reduced, fmt::format("{} lots in a row were accepted, and the sheet allows it", kToReduced));
    }
    if (in_a_row_ > 0) why_ = fmt::format("{} accepted in a row on normal inspection", in_a_row_);
    else if (!recent_.empty() && recent_.back()) why_ = "one lot was rejected; a second one among five brings tightened inspection";
  }

  void after_tightened(bool rejected) {
    if (rejected && ++rejected_on_tightened_ >= kDiscontinue) {
      return move(Severity105::discontinued, fmt::format("{} lots were rejected on tightened inspection", kDiscontinue));
    }
    if (in_a_row_ >= kBackToNormal) {
      return move(Severity105::normal, fmt::format("{} lots in a row were accepted on tightened inspection", kBackToNormal));
    }
    why_ = fmt::format("on tightened inspection {} of {} lots in a row were accepted, and {} rejected", in_a_row_, kBackToNormal,
                       rejected_on_tightened_);
  }

  void after_reduced(const LotHistory& lot) {
    if (lot.decision == LotResult::reject) return move(Severity105::normal, "a lot was rejected on reduced inspection");
    if (lot.between_accept_and_reject) {
      return move(Severity105::normal, "a lot on reduced inspection fell between acceptance and rejection");
    }
    if (!allowed_) return move(Severity105::normal, "the sheet allows no reduced inspection any more");
    why_ = "reduced inspection goes on";
  }

  bool allowed_;
  Severity105 now_;
  std::string why_;
  std::deque<bool> recent_;      // rejected or not, since the last move
  int in_a_row_ = 0;             // accepted, since the last move
  int rejected_on_tightened_ = 0;
};

}  // namespace

NextSeverity next_severity(const Sampling& sampling, std::span<const LotHistory> history) {
  if (sampling.scheme != SamplingScheme::attributes && sampling.scheme != SamplingScheme::variables) {
    return {Severity105::normal, "this scheme knows no severities"};
  }
  Switching switching(sampling);
  for (const LotHistory& lot : history) {
    if (!sampling.resumed || lot.time >= *sampling.resumed) switching.add(lot);
  }
  return switching.next();
}

}  // namespace coilassay
