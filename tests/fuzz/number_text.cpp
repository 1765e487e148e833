// Values as people type them. The first byte chooses the unit that is expected.
#include <cmath>

#include "base/number_text.h"
#include "tests/fuzz/target.h"

namespace {

using namespace coilassay;
using fuzz::require;

void read_number(std::string_view bytes) {
  if (bytes.empty()) return;
  const auto unit = static_cast<Unit>(static_cast<unsigned char>(bytes.front()) % 19);
  const std::string_view text = bytes.substr(1);
  const Result<StatedValue> value = parse_value(text, unit, "--value");
  if (!value) {
    require(!value.error().finding.empty(), "a refusal says what was found");
    return;
  }
  require(std::isfinite(value->value), "a stated value is a number");
  require(!to_text(value->value, unit).empty(), "it can be shown");
  require(!to_text(value->value, unit, Script::ascii).empty(), "it can be shown in ASCII");

  // What the program writes it reads back.
  if (const std::optional<double> plain = parse_plain_number(text)) {
    require(std::isfinite(*plain), "a plain number is finite");
    require(parse_plain_number(to_shortest(*plain)) == *plain, "the shortest text reads back to the same double");
  }
}

}  // namespace

COILASSAY_FUZZ_TARGET(number_text, read_number)
