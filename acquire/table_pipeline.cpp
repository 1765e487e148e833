#include "acquire/table_pipeline.h"

#include <algorithm>
#include <condition_variable>
#include <deque>
#include <exception>
#include <memory>
#include <mutex>
#include <system_error>
#include <thread>
#include <utility>
#include <vector>

namespace coilassay {
namespace {

struct Slot {
  enum class State { waiting, parsing, parsed };
  LineBlock block;
  std::size_t from = 0;
  BlockColumns columns;
  State state = State::waiting;
  std::exception_ptr exception;  // of a helper, passed on by the calling thread
};

/// The calling thread reads and joins, and parses too when there is nothing else to do; helpers parse.
class Pipeline {
 public:
  Pipeline(const TableLayout& layout, unsigned threads) : layout_(layout), most_slots_(threads > 1 ? 2 * std::size_t{threads} : 1) {
    try {
      for (unsigned i = 1; i < threads; ++i) helpers_.emplace_back([this] { help(); });
    } catch (const std::system_error&) {
      // No more threads to be had: those that run, and the calling one, do all of the work.
    }
  }
  ~Pipeline() {
    {
      const std::lock_guard guard(lock_);
      stop_ = true;
    }
    changed_.notify_all();
  }
  Pipeline(const Pipeline&) = delete;
  Pipeline& operator=(const Pipeline&) = delete;

  Result<void> run(LineBlock first, std::size_t from, LineBlocks& rest,
                   const std::function<Result<void>(const BlockColumns&)>& join) {
    auto slot = std::make_unique<Slot>();
    slot->block = std::move(first);
    slot->from = from;
    bool ended = slot->block.size == 0;
    if (!ended) put(std::move(slot));
    while (!ended || !in_order_.empty()) {
      if (!ended && in_order_.size() < most_slots_) {
        slot = spare_slot();
        if (const auto got = rest.next(slot->block); !got) return failure(got);
        ended = slot->block.size == 0;
        if (!ended) put(std::move(slot));
        if (in_order_.size() < most_slots_ && !front_parsed()) continue;
      }
      if (in_order_.empty()) break;
      finish_front();
      if (in_order_.front()->exception) std::rethrow_exception(in_order_.front()->exception);
      if (const auto joined = join(in_order_.front()->columns); !joined) return failure(joined);
      spare_.push_back(std::move(in_order_.front()));
      in_order_.pop_front();
    }
    return {};
  }

 private:
  std::unique_ptr<Slot> spare_slot() {
    if (spare_.empty()) return std::make_unique<Slot>();
    std::unique_ptr<Slot> slot = std::move(spare_.back());
    spare_.pop_back();
    slot->from = 0;
    slot->state = Slot::State::waiting;
    return slot;
  }

  void put(std::unique_ptr<Slot> slot) {
    {
      const std::lock_guard guard(lock_);
      waiting_.push_back(slot.get());
    }
    changed_.notify_all();
    in_order_.push_back(std::move(slot));
  }

  bool front_parsed() {
    const std::lock_guard guard(lock_);
    return !in_order_.empty() && in_order_.front()->state == Slot::State::parsed;
  }

  /// Until the oldest block is parsed: parse what still waits, oldest first, then wait for the helper that has it.
  void finish_front() {
    std::unique_lock hold(lock_);
    Slot& front = *in_order_.front();
    while (front.state != Slot::State::parsed) {
      if (!waiting_.empty()) {
        parse_one(hold);
      } else {
        changed_.wait(hold, [&front] { return front.state == Slot::State::parsed; });
      }
    }
  }

  void help() {
    std::unique_lock hold(lock_);
    for (;;) {
      changed_.wait(hold, [this] { return stop_ || !waiting_.empty(); });
      if (stop_) return;
      parse_one(hold);
    }
  }

  void parse_one(std::unique_lock<std::mutex>& hold) {
    Slot& slot = *waiting_.front();
    waiting_.pop_front();
    slot.state = Slot::State::parsing;
    hold.unlock();
    try {
      read_block(slot.block, slot.from, layout_, slot.columns);
    } catch (...) {
      slot.exception = std::current_exception();  // memory has run out
    }
    hold.lock();
    slot.state = Slot::State::parsed;
    changed_.notify_all();
  }

  const TableLayout& layout_;
  const std::size_t most_slots_;
  std::deque<std::unique_ptr<Slot>> in_order_;
  std::vector<std::unique_ptr<Slot>> spare_;
  std::mutex lock_;
  std::condition_variable changed_;
  std::deque<Slot*> waiting_;
  bool stop_ = false;
  std::vector<std::jthread> helpers_;  // last: they stop before what they use goes away
};

}  // namespace

Result<void> read_blocks(LineBlock first, std::size_t from, LineBlocks& rest, const TableLayout& layout, unsigned threads,
                         const std::function<Result<void>(const BlockColumns&)>& join) {
  return Pipeline(layout, std::max(threads, 1U)).run(std::move(first), from, rest, join);
}

}  // namespace coilassay
