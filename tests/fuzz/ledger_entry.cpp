// Bodies of ledger entries: what is read can be written, and reads the same.
#include "ledger/entry.h"
#include "tests/fuzz/target.h"

namespace {

using namespace coilassay;
using fuzz::require;

void read_body(std::string_view bytes) {
  const Result<EntryContent> content = content_of(bytes);
  if (!content) return;
  const Result<std::string> body = body_of(*content);
  require(body.has_value(), "a content that was read can be written");
  const Result<EntryContent> again = content_of(*body);
  require(again.has_value(), "and read again");
  require(body_of(*again).value_or("") == *body, "and is the same then");
  require(again->sources == content->sources && again->serial == content->serial && again->details == content->details,
          "fields stay as they are");
}

}  // namespace

COILASSAY_FUZZ_TARGET(ledger_entry, read_body)
