// Text from outside: whatever comes, what is shown is harmless.
#include <utf8cpp/utf8.h>

#include "base/number_text.h"
#include "base/outside_text.h"
#include "tests/fuzz/target.h"

namespace {

using namespace coilassay;
using fuzz::require;

void show(std::string_view bytes) {
  const std::string safe = shown(bytes);
  require(utf8::is_valid(safe.begin(), safe.end()), "shown text is UTF-8");
  for (const char c : safe) require(static_cast<unsigned char>(c) >= 0x20 && c != 0x7f, "no control byte is shown");
  require(safe.find("\u202e") == std::string::npos, "nothing turns the direction of writing round");

  const std::string cell = csv_cell(bytes);
  const std::string_view inner = std::string_view(cell).substr(cell.starts_with('"') ? 1 : 0);
  const bool formula = !inner.empty() && std::string_view("=+-@\t\r").find(inner.front()) != std::string_view::npos;
  require(!formula || parse_plain_number(bytes).has_value(), "no cell is a formula");
  std::size_t quotes = 0;
  for (const char c : cell) quotes += c == '"' ? 1 : 0;
  require(quotes % 2 == 0, "quotes of a cell are closed");
  if (!cell.starts_with('"')) require(cell.find_first_of(",\"\r\n") == std::string::npos, "what parts cells is quoted");

  const std::string name = identifier(bytes);
  require(!name.empty() && !(name.front() >= '0' && name.front() <= '9'), "a name begins like a name");
  for (const char c : name) {
    require((c >= 'a' && c <= 'z') || (c >= 'A' && c <= 'Z') || (c >= '0' && c <= '9') || c == '_', "a name holds nothing else");
  }
}

}  // namespace

COILASSAY_FUZZ_TARGET(outside_text, show)
