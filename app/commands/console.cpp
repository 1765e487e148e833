#include "app/commands/console.h"

#include <algorithm>
#include <ostream>

#include "acquire/capture_writer.h"
#include "report/text_layout.h"

namespace coilassay {

Script script_of_locale(std::string_view lc_all, std::string_view lc_ctype, std::string_view lang) {
  std::string name(!lc_all.empty() ? lc_all : !lc_ctype.empty() ? lc_ctype : lang);
  std::transform(name.begin(), name.end(), name.begin(),
                 [](char c) { return c >= 'A' && c <= 'Z' ? static_cast<char>(c - 'A' + 'a') : c; });
  const bool utf8 = name.find("utf-8") != std::string::npos || name.find("utf8") != std::string::npos;
  return utf8 ? Script::utf8 : Script::ascii;
}

TextStyle Console::style(bool terminal) const {
  TextStyle style;
  style.script = surroundings_.script;
  style.color = terminal && !surroundings_.no_color;
  style.width = terminal ? std::clamp<std::size_t>(surroundings_.width, 40, 120) : 80;
  return style;
}

void Console::say(std::string_view sentence) {
  const TextStyle style = error_style();
  *error_ << wrapped(in_script(sentence, style.script), "", style.width);
}

void Console::show(const Error& error) {
  *error_ << to_text(error, error_style());
}

Result<void> Console::write(const std::string& path, const std::string& contents) {
  if (path != "-") return write_file(path, contents);
  *out_ << contents;
  return {};  // whether it arrived is seen when the program ends, as for all of standard output
}

}  // namespace coilassay
