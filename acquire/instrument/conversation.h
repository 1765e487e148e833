// One transaction at a time with one instrument, and how the line is trusted again after something went wrong.
#pragma once

#include <cstdint>
#include <functional>
#include <memory>
#include <optional>
#include <string>
#include <string_view>
#include <vector>

#include "acquire/instrument/byte_stream.h"
#include "acquire/instrument/profile.h"

namespace coilassay {

/// What upset a transaction.
enum class Trouble {
  silent,          // nothing came in time
  cut_short,       // something came, but no end of it
  too_long,        // more came than any reply has
  extra_bytes,     // more came after the reply: which one is the answer?
  unreadable,      // a reply that cannot be understood
  lost,            // the line was lost during this transaction; it can be tried again
  // For good:
  gone,            // the line was lost, or the instrument silent, for longer than is waited for
  other_identity,  // another instrument answers now
  never_quiet,     // it talks without end
  stopped,         // the user
};
/// Whether asking again can help.
bool may_be_tried_again(Trouble trouble);

struct Upset {
  Trouble trouble = Trouble::silent;
  Error error;
};
template <class T>
using Answer = tl::expected<T, Upset>;

/// Counted since the start.
struct ConversationCounts {
  std::uint64_t transactions = 0, timeouts = 0, unreadable = 0, resynchronisations = 0, stale_bytes = 0, reconnections = 0;
};

/// Talks over one line. The rules:
///  - One question, one reply. What lies in the line before a question is sent is stale by definition: it is counted and
///    thrown away, and the line is no longer trusted.
///  - After a reply the line must be quiet for the stated time; more bytes make the reply void.
///  - A line that is not trusted (just opened, a time-out, an unreadable reply, stale bytes) is listened to in silence for
///    the stated lateness, drained until it is quiet, then the identity is asked, and a second quiet stretch must follow. Without
///    an identity silence alone has to do. Only then the next question is sent. A reply is thus discarded, never shifted.
///  - A line that is lost is opened again for as long as the link states; after that, and whenever the identity is asked,
///    it must be the one that answered first.
class Conversation {
 public:
  Conversation(LinkSetup link, std::optional<IdentitySetup> identity, StreamOpener opener, std::function<bool()> stopped = {});
  Conversation(const Conversation&) = delete;
  Conversation& operator=(const Conversation&) = delete;

  /// Opens the line and makes it trusted; one that prints unasked never falls silent and is taken as it is. gone when it
  /// cannot be opened now.
  Answer<void> open(bool prints_unasked = false);
  /// The reply line without its terminator.
  Answer<std::string> ask(std::string_view question);
  /// `rows` lines.
  Answer<std::vector<std::string>> ask_rows(std::string_view question, std::size_t rows);
  /// The bytes of a definite-length block of at most `largest` bytes.
  Answer<std::string> ask_block(std::string_view question, std::size_t largest);
  /// The next whole line of an instrument that prints unasked: one that began after this call.
  Answer<std::string> next_line();
  /// Sends what has no reply.
  Answer<void> tell(std::string_view command);
  /// The last reply could not be understood: the line is not trusted any more.
  void distrust();

  const std::string& identity() const { return identity_text_; }  // as it came; empty when none is asked
  const std::string& place() const { return link_.port; }
  const ConversationCounts& counts() const { return counts_; }
  const LinkSetup& link() const { return link_; }
  bool was_stopped() const { return stopped_ && stopped_(); }

 private:
  using Take = std::function<Answer<void>(SteadyTime deadline)>;
  Answer<void> transact(std::string_view question, const Take& take);
  Answer<void> settle();
  Answer<void> reopen(SteadyTime since);
  Answer<void> silence(SteadyTime until);
  Answer<void> identify();
  Answer<void> send(std::string_view text);
  Answer<std::string> take_line(SteadyTime deadline);
  Answer<void> fill(SteadyTime deadline);
  Answer<void> expect_quiet();
  Answer<std::size_t> drained();
  Upset upset(Trouble trouble, std::string finding, std::string remedy = {}) const;
  Upset lost(const Error& error);

  LinkSetup link_;
  std::optional<IdentitySetup> identity_;
  StreamOpener opener_;
  std::function<bool()> stopped_;
  std::unique_ptr<ByteStream> stream_;
  std::string buffer_;         // bytes of the present reply that came beyond what was taken
  std::string identity_text_;
  bool unasked_ = false;
  bool trusted_ = false;
  SteadyTime distrusted_at_{};
  ConversationCounts counts_;
};

}  // namespace coilassay
