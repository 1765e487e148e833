#include "report/describe_text.h"

#include <fmt/format.h>

#include <algorithm>
#include <cmath>
#include <functional>

#include "base/outside_text.h"
#include "report/text_layout.h"
#include "report/wording.h"

namespace coilassay {

namespace {

using Rows = std::vector<std::vector<std::string>>;
constexpr std::string_view kIndent = "  ";
constexpr std::size_t kChannelsAbreast = 3;
constexpr std::size_t kRecordsShown = 6;
constexpr std::size_t kNameWidth = 20;

std::string counted(std::size_t n, const std::string& one, const std::string& many) {
  return n == 1 ? "1 " + one : fmt::format("{} {}", n, many);
}

std::string duration(double seconds, Script script) {
  return setting_in_words(seconds, Unit::second, script);
}

/// Paints a heading; what is shown has gone through the script.
void add_heading(std::string text, const TextStyle& style, std::string& page) {
  if (!page.empty()) page += '\n';
  std::string lines = wrapped(in_script(text, style.script), "", style.width);
  if (style.color) lines = "\x1b[1m" + lines.substr(0, lines.size() - 1) + "\x1b[0m\n";
  page += lines;
}

void add_rows(const Rows& rows, const TextStyle& style, std::string& page) {
  Rows shown_rows = rows;
  for (auto& row : shown_rows) {
    for (std::string& cell : row) cell = in_script(cell, style.script);
  }
  page += aligned(shown_rows, kIndent);
}

/// Words and what they say, the latter broken where the line ends.
void add_facts(const Rows& facts, const TextStyle& style, std::string& page) {
  std::size_t widest = 0;
  for (const auto& fact : facts) widest = std::max(widest, display_width(fact[0]));
  for (const auto& fact : facts) {
    page += wrapped(in_script(fact[1], style.script), std::string(kIndent) + padded(fact[0], widest + 2), style.width);
  }
}

std::string delimiter_in_words(const std::string& delimiter) {
  if (delimiter == ",") return "commas";
  if (delimiter == ";") return "semicolons";
  if (delimiter == "\t") return "tabs";
  if (delimiter == " ") return "blanks";
  return "'" + shown(delimiter) + "'";
}

std::string time_in_words(const Description& d, Script script) {
  const std::string start = std::isnan(d.start_s) ? "origin not known" : "from " + duration(d.start_s, script);
  if (!d.uniform) return start + " in uneven steps";
  if (std::isnan(d.sample_interval_s)) return "the step is not known";
  return start + " in even steps of " + duration(d.sample_interval_s, script);
}

std::string name_of(const ChannelDescription& c) {
  return c.name.empty() ? fmt::format("column {}", c.column) : shown(c.name, kNameWidth);
}

std::string records_in_words(const Description& d, const TextStyle& style) {
  const std::size_t most = style.verbose ? d.segments.size() : kRecordsShown;
  std::string text = fmt::format("{}:", d.segments.size());
  for (std::size_t i = 0; i < std::min(d.segments.size(), most); ++i) {
    const SegmentDescription& s = d.segments[i];
    text += fmt::format("{} {}{} samples", i == 0 ? "" : ",",
                        s.label.empty() ? "" : "'" + shown(s.label, 2 * kNameWidth) + "' ", s.samples);
    if (!std::isnan(s.start_s)) text += " from " + duration(s.start_s, style.script);
  }
  return d.segments.size() > most ? text + ", and more with --verbose" : text;
}

std::string samples_in_words(const Description& d, Script script) {
  std::string text = std::to_string(d.samples);
  if (d.segments.size() > 1) text += fmt::format(" in {} records", d.segments.size());
  if (!std::isnan(d.sample_interval_s)) text += " every " + duration(d.sample_interval_s, script);
  if (std::isnan(d.span_s)) return text;
  return text + (d.segments.size() > 1 ? ", the first over " : ", over ") + to_text(d.span_s, Unit::second, script);
}

void add_reading(const Description& d, const TextStyle& style, std::string& page) {
  add_heading("How it was read", style, page);
  Rows facts;
  facts.push_back(
      {"format", shown(d.dialect.format) + (d.dialect.encoding.empty() ? "" : ", " + shown(d.dialect.encoding))});
  if (!d.dialect.delimiter.empty()) {
    facts.push_back({"columns", "between " + delimiter_in_words(d.dialect.delimiter) + ", decimal " +
                                    (d.dialect.decimal == "," ? "comma" : "point")});
  }
  if (d.dialect.first_data_line > 0)
    facts.push_back({"numbers", fmt::format("from line {}", d.dialect.first_data_line)});
  if (d.kind == "waveform") facts.push_back({"samples", samples_in_words(d, style.script)});
  if (d.kind == "waveform") facts.push_back({"time", time_in_words(d, style.script)});
  if (d.segments.size() > 1) facts.push_back({"records", records_in_words(d, style)});
  const auto& settings = d.dialect.settings;
  if (!settings.empty() && !style.verbose) {
    facts.push_back({"head", counted(settings.size(), "setting", "settings") + " in the file's head, with --verbose"});
  }
  add_facts(facts, style, page);
  if (!style.verbose) return;
  Rows head;
  for (const auto& [key, value] : settings) head.push_back({shown(key, 60), shown(value, 200)});
  if (!d.source.sha256.empty()) head.push_back({"SHA-256", d.source.sha256});
  add_facts(head, style, page);
}

struct Property {
  std::string_view words;
  std::function<std::string(const ChannelDescription&, Script)> text;  // empty: nothing to say
};

std::string with_unit(double value, const ChannelDescription& c, Script script) {
  return std::isnan(value) ? "-" : to_text(value, c.unit, script);
}

const std::vector<Property>& properties() {
  static const std::vector<Property> all = {
      {"column", [](const auto& c, Script) { return std::to_string(c.column); }},
      {"unit", [](const auto& c,
                  Script) { return c.unit_stated ? std::string(display_symbol(c.unit)) : std::string("not stated"); }},
      {"first sample", [](const auto& c, Script s) { return with_unit(c.first, c, s); }},
      {"last sample", [](const auto& c, Script s) { return with_unit(c.last, c, s); }},
      {"least", [](const auto& c, Script s) { return with_unit(c.min, c, s); }},
      {"largest", [](const auto& c, Script s) { return with_unit(c.max, c, s); }},
      {"range used",
       [](const auto& c, Script s) { return std::isnan(c.range_used) ? "" : to_percent_text(c.range_used, s); }},
      {"step",
       [](const auto& c, Script s) { return std::isnan(c.resolution) ? "" : to_text(c.resolution, c.unit, s, 3); }},
      {"noise",
       [](const auto& c, Script s) {
         if (std::isnan(c.noise)) return std::string("-");
         return to_text(c.noise, c.unit, s, 2) + (c.noise_is_rounding ? " (rounding)" : "");
       }},
      {"effective bits",
       [](const auto& c, Script) {
         return std::isnan(c.effective_bits) ? "-" : fmt::format("{:.1f}", c.effective_bits);
       }},
      {"clipped", [](const auto& c, Script) { return c.clipped == 0 ? "none" : std::to_string(c.clipped); }},
      {"missing", [](const auto& c, Script) { return c.missing == 0 ? "none" : std::to_string(c.missing); }},
  };
  return all;
}

void add_channels(const Description& d, const TextStyle& style, std::string& page) {
  for (std::size_t first = 0; first < d.channels.size(); first += kChannelsAbreast) {
    const std::size_t end = std::min(first + kChannelsAbreast, d.channels.size());
    if (first == 0) {
      add_heading(end - first > 1 ? "Channels" : "Channel", style, page);
    } else {
      page += '\n';
    }
    Rows rows = {{""}};
    for (std::size_t i = first; i < end; ++i) rows.front().push_back(name_of(d.channels[i]));
    for (const Property& each : properties()) {
      std::vector<std::string> row = {std::string(each.words)};
      bool any = false;
      for (std::size_t i = first; i < end; ++i) {
        row.push_back(each.text(d.channels[i], style.script));
        any = any || !row.back().empty();
      }
      if (any) rows.push_back(std::move(row));
    }
    add_rows(rows, style, page);
  }
}

void add_sweep(const Description& d, const TextStyle& style, std::string& page) {
  add_heading("Sweep", style, page);
  Rows facts = {{"frequency", fmt::format("{} to {}", to_text(d.frequency_first_hz, Unit::hertz, style.script, 6),
                                          to_text(d.frequency_last_hz, Unit::hertz, style.script, 6))},
                {"quantities", shown(d.parameter)},
                {"ports", std::to_string(d.ports)}};
  std::string references;
  for (const double each : d.reference_ohm) {
    references += (references.empty() ? "" : ", ") + setting_in_words(each, Unit::ohm, style.script);
  }
  if (!references.empty()) facts.push_back({"reference", references});
  facts.push_back({"marked bad", d.bad_points == 0 ? "none" : std::to_string(d.bad_points)});
  add_facts(facts, style, page);
}

void add_findings(const Description& d, const TextStyle& style, std::string& page) {
  if (d.findings.empty()) return;
  add_heading("What to watch out for", style, page);
  for (const Finding& each : by_weight(d.findings)) {
    page += wrapped(in_script(shown(each.message, 1000), style.script),
                    std::string(kIndent) + padded(name(each.severity), 9), style.width);
  }
}

void add_suggestion(const Description& d, const TextStyle& style, std::string& page) {
  add_heading("What to do next", style, page);
  const Suggestion& s = d.suggestion;
  const std::string looks = s.looks_like.empty() ? "It looks like nothing this program has a test for."
                                                 : "It looks like " + s.looks_like + ".";
  page += wrapped(in_script(looks, style.script), kIndent, style.width);
  // Never broken or respelt: it is to be copied.
  if (!s.command.empty()) page += "\n    " + s.command + "\n";
  if (!s.note.empty()) {
    page +=
        (s.command.empty() ? "" : "\n") + wrapped(in_script(shown(s.note, 1000), style.script), kIndent, style.width);
  }
}

std::string head_of(const Description& d) {
  const std::string name = shown(d.source.name);
  if (d.kind == "sweep") {
    return fmt::format("{}: sweep of {}", name, counted(d.samples, "point", "points"));
  }
  return fmt::format("{}: waveform, {}", name, counted(d.channels.size(), "channel", "channels"));
}

std::string findings_in_short(const std::vector<Finding>& findings) {
  const auto grave =
      std::count_if(findings.begin(), findings.end(), [](const Finding& f) { return f.severity != Severity::note; });
  if (findings.empty()) return "none";
  if (grave == 0) return std::to_string(findings.size());
  return fmt::format("{} ({})", findings.size(), counted(static_cast<std::size_t>(grave), "caution", "cautions"));
}

std::vector<std::string> row_of(const Description& d, Script script) {
  std::string steps = "uneven", channels;
  if (d.kind == "sweep") {
    steps = "-";
    channels = fmt::format("{}, {}", shown(d.parameter, kNameWidth), counted(d.ports, "port", "ports"));
  } else {
    if (d.uniform) steps = std::isnan(d.sample_interval_s) ? "no time" : duration(d.sample_interval_s, script);
    for (const ChannelDescription& each : d.channels) channels += (channels.empty() ? "" : " ") + shown(each.name, 8);
    if (d.channels.size() > 3) channels = std::to_string(d.channels.size());
  }
  return {d.kind,   std::to_string(d.samples),     steps,
          channels, findings_in_short(d.findings), d.suggestion.test.empty() ? "-" : d.suggestion.test};
}

}  // namespace

std::string to_text(const Description& d, const TextStyle& style) {
  std::string page;
  add_heading(head_of(d), style, page);
  add_reading(d, style, page);
  d.kind == "sweep" ? add_sweep(d, style, page) : add_channels(d, style, page);
  add_findings(d, style, page);
  add_suggestion(d, style, page);
  return page;
}

std::string to_text(std::span<const DescribedFile> files, const TextStyle& style) {
  const auto script_of = [&style](const std::string& text) { return in_script(text, style.script); };
  std::size_t widest = 4;
  for (const DescribedFile& each : files) widest = std::max(widest, display_width(script_of(shown(each.file, 60))));
  Rows rows = {{"kind", "samples", "interval", "channels", "findings", "test"}};
  for (const DescribedFile& each : files) {
    if (each.description) rows.push_back(row_of(*each.description, style.script));
  }
  for (auto& row : rows) {
    for (std::string& cell : row) cell = script_of(cell);
  }
  // The columns are aligned among the files that were read; an error takes the whole line after its file.
  const std::string table = aligned(rows, "");
  std::string_view rest = table;
  const auto next_line = [&rest] {
    const std::string line(rest.substr(0, rest.find('\n')));
    rest.remove_prefix(line.size() + 1);
    return line;
  };
  std::string page = padded("file", widest + 2) + next_line() + '\n';
  for (const DescribedFile& each : files) {
    page += padded(script_of(shown(each.file, 60)), widest + 2);
    if (each.description) {
      page += next_line() + '\n';
      continue;
    }
    const Error& error = each.description.error();
    // The place begins with the file; what follows it is the line.
    const bool further = error.place.starts_with(each.file + ":");
    const std::string line = further ? ", line " + shown(error.place.substr(each.file.size() + 1), 30) : "";
    page += script_of("not read" + line + ": " + shown(error.finding, 300)) + '\n';
  }
  return page;
}

}  // namespace coilassay
