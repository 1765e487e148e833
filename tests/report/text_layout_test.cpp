#include "report/text_layout.h"

#include <gtest/gtest.h>

#include <algorithm>

namespace coilassay {
namespace {

TEST(TextLayout, WidthCountsWhatIsSeenNotBytes) {
  EXPECT_EQ(display_width("47 µH ± 1 Ω"), 11u);
  EXPECT_EQ(display_width("e\xcc\x81"), 1u);     // e and a combining accent
  EXPECT_EQ(display_width("\xe6\xbc\xa2"), 2u);  // a wide character
  EXPECT_EQ(display_width("a\xff"
                          "b"),
            3u);  // a byte that is no UTF-8 is shown as one replacement
}

TEST(TextLayout, AsciiHasNoByteAbove127) {
  EXPECT_EQ(in_script("47 µH ± 0.1 kΩ, 23 °C", Script::ascii), "47 uH +/- 0.1 kohm, 23 degC");
  const std::string odd = in_script("caf\xc3\xa9 \xf0\x9f\x94\xa7 \xff", Script::ascii);
  EXPECT_EQ(odd, "caf\\u00e9 \\U0001f527 \\ufffd");
  EXPECT_EQ(in_script("µ", Script::utf8), "µ");
}

TEST(TextLayout, WrapsAtBlanksAndIndentsWhatFollows) {
  EXPECT_EQ(wrapped("one two three four", "  - ", 24), "  - one two three four\n");
  EXPECT_EQ(wrapped("one two three four five", "  - ", 24), "  - one two three four\n    five\n");
  EXPECT_EQ(wrapped("", "  - ", 24), "  - \n");
}

TEST(TextLayout, NoLineIsWiderThanAsked) {
  const std::string text = wrapped(std::string(300, 'x') + " µµµ " + std::string(70, 'y') + " end", "  note     ", 60);
  std::size_t begin = 0, joined = 0;
  while (begin < text.size()) {
    const std::size_t end = text.find('\n', begin);
    EXPECT_LE(display_width(std::string_view(text).substr(begin, end - begin)), 60u);
    begin = end + 1;
  }
  joined = static_cast<std::size_t>(std::count(text.begin(), text.end(), 'x'));
  EXPECT_EQ(joined, 300u);  // broken, not cut
}

TEST(TextLayout, ColumnsStartBelowEachOther) {
  EXPECT_EQ(aligned({{"µ", "1", "x"}, {"long", "22", "y"}}, " "), " µ     1   x\n long  22  y\n");
  EXPECT_EQ(aligned({{"a", "", "x"}, {"b", "", "y"}}, ""), "a  x\nb  y\n");  // a column nobody fills takes no room
}

}  // namespace
}  // namespace coilassay
