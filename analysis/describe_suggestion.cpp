#include "analysis/describe_suggestion.h"

#include <algorithm>
#include <cmath>
#include <numbers>

#include "analysis/decay_window.h"
#include "analysis/describe_shapes.h"
#include "analysis/describe_spectrum.h"
#include "analysis/even_steps.h"
#include "analysis/waveform_parts.h"
#include "base/outside_text.h"

namespace coilassay {

namespace {

bool may_be_voltage(const Channel& channel) {
  return channel.unit == Unit::volt || !channel.unit_stated;
}

/// The channel by its name or, where that is empty or not the only one, by its place in the file.
std::string column_word(const Capture& capture, std::size_t index) {
  const Channel& channel = capture.channels[index];
  const auto alike = std::count_if(capture.channels.begin(), capture.channels.end(),
                                   [&](const Channel& other) { return other.name == channel.name; });
  return channel.name.empty() || alike > 1 ? std::to_string(channel.column) : channel.name;
}

bool has_test(const DescribeOptions& options, const std::string& test) {
  return std::find(options.tests.begin(), options.tests.end(), test) != options.tests.end();
}

Suggestion suggestion_of(const Source& source, const std::string& test, const std::string& looks_like,
                         std::vector<std::string> words, const std::string& note, const DescribeOptions& options) {
  Suggestion suggestion;
  suggestion.looks_like = looks_like;
  if (!has_test(options, test)) {
    suggestion.note = "This program has no command for it.";
    return suggestion;
  }
  suggestion.test = test;
  suggestion.note = note;
  // A name that begins with a dash would be taken for an option.
  const bool dash = source.name.size() > 1 && source.name.front() == '-';
  suggestion.command = "coilassay " + test + " " + shell_word((dash ? "./" : "") + source.name);
  words.insert(words.end(), options.arguments.begin(), options.arguments.end());
  for (const std::string& word : words) suggestion.command += " " + shell_word(word);
  return suggestion;
}

bool time_is_known(const Capture& capture) {
  return !capture.time.uniform() || !std::isnan(capture.time.step_s);
}

std::string note_on_time(const Capture& capture) {
  return time_is_known(capture)
             ? ""
             : "The time step is not known: state sample_interval under [file] in a bench sheet and add "
               "--bench with its name.";
}

std::string joined(const std::string& a, const std::string& b) {
  return a.empty() || b.empty() ? a + b : a + " " + b;
}

/// A fit that leaves far more than the noise while the swing lasts did not meet a damped sine.
bool describes(const DampedSineFit& fit, std::span<const double> window, std::span<const double> record) {
  std::size_t lasts = window.size();
  if (fit.model.a > 0) lasts = std::min(lasts, static_cast<std::size_t>(5 / fit.model.a) + 4);
  std::vector<double> model(lasts);
  evaluate(fit.model, 0, model);
  double sum = 0, swing = 0, count = 0;
  for (std::size_t i = 0; i < lasts; ++i) {
    if (std::isnan(window[i])) continue;
    sum += (window[i] - model[i]) * (window[i] - model[i]), ++count;
    swing += (model[i] - fit.model.c) * (model[i] - fit.model.c);
  }
  if (sum < 0.01 * swing) return true;
  const double left = std::sqrt(sum / std::max(count, 1.0));
  const double noise = noise_of(record);
  return !std::isnan(noise) && left < 2 * noise;
}

/// A steady sine over the whole record.
std::optional<Swing> steady_sine(std::span<const double> samples, double resolution, std::size_t index) {
  Swing swing;
  swing.channel = index;
  DampedSineOptions options;
  options.resolution = resolution;
  if (const auto fit = fit_damped_sine(samples, options); fit && fit->model.q > 0) {
    const auto length = static_cast<double>(samples.size());
    if (std::fabs(fit->model.a) * length < 0.1 && describes(*fit, samples, samples)) {
      swing.samples_per_period = 2 * std::numbers::pi / fit->model.damped_omega();
      swing.cycles = length / swing.samples_per_period;
      return swing;
    }
  }
  // It may be too rich in harmonics for that fit.
  const SpectralLine line = strongest_line(samples);
  if (line.share < 0.9 || !is_level(samples)) return std::nullopt;
  swing.samples_per_period = 1 / line.cycles_per_sample;
  swing.cycles = static_cast<double>(samples.size()) * line.cycles_per_sample;
  return swing;
}

std::optional<Swing> swing_of(const Capture& capture, std::size_t index) {
  const Channel& channel = capture.channels[index];
  std::span<const double> samples = channel.samples;
  std::vector<double> even;
  DecaySearch search;
  search.resolution = channel.resolution;
  if (!capture.time.uniform()) {
    auto record = on_even_steps(capture, index);
    if (!record) return std::nullopt;
    if (!record->samples.empty()) {
      even = std::move(record->samples);
      samples = even;
      search.resolution = std::nan("");
    }
  }
  if (const auto decay = find_decay(samples, search)) {
    const DampedSine& model = decay->fit.model;
    const std::span<const double> window = samples.subspan(decay->first, decay->end - decay->first);
    const auto length = static_cast<double>(window.size());
    // Down to half critical damping and below it is still a release; only what is described well counts.
    const double omega = model.q > 0 ? model.damped_omega() : model.natural_omega();
    const double per_period = 2 * std::numbers::pi / omega;
    if (model.a * length > 0.3 && model.quality() > 0.35 && length > 0.8 * per_period &&
        describes(decay->fit, window, samples)) {
      return Swing{.channel = index, .decays = true, .cycles = length / per_period, .samples_per_period = per_period};
    }
  }
  return steady_sine(samples, search.resolution, index);
}

/// Voltage and current in words of the command line, and what is still to be said about the current's scale.
std::vector<std::string> pair_words(const Capture& capture, DrivenPair pair) {
  return {"--voltage", column_word(capture, pair.voltage), "--current", column_word(capture, pair.current)};
}

std::string note_on_current(const Capture& capture, DrivenPair pair) {
  const Channel& current = capture.channels[pair.current];
  if (current.unit == Unit::ampere) return "";
  return shown(current.name, 40) + " is not in ampere: add --shunt with its resistance, or --current-gain in A/V.";
}

std::optional<Likeness> driven(const Capture& capture, const DescribeOptions& options, DrivenPair pair) {
  const Source& source = capture.source;
  const std::string note = joined(note_on_current(capture, pair), note_on_time(capture));
  if (time_is_known(capture) && current_ramps(capture, pair)) {
    return Likeness{std::nullopt, suggestion_of(source, "ramp", "a current that ramps up under a steady voltage",
                                                pair_words(capture, pair), note, options)};
  }
  const auto voltage = swing_of(capture, pair.voltage);
  if (!voltage || voltage->decays) return std::nullopt;
  const auto current = swing_of(capture, pair.current);
  if (!current || current->decays) return std::nullopt;
  if (std::fabs(voltage->samples_per_period / current->samples_per_period - 1) > 0.1) return std::nullopt;
  return Likeness{voltage, suggestion_of(source, "sine", "a steady sine of voltage and current",
                                         pair_words(capture, pair), note, options)};
}

std::optional<Likeness> ringing(const Capture& capture, const DescribeOptions& options) {
  std::optional<Swing> steady;
  for (std::size_t i = 0; i < capture.channels.size(); ++i) {
    if (!may_be_voltage(capture.channels[i])) continue;
    const auto swing = swing_of(capture, i);
    if (!swing) continue;
    if (!swing->decays) {
      if (!steady) steady = swing;
      continue;
    }
    std::vector<std::string> words;
    if (capture.channels.size() > 1) words = {"--voltage", column_word(capture, i)};
    const std::string note = joined(
        "Add --capacitor with the value across the coil (such as 10nF+-1%) for L_s, R_s and Q of the coil itself.",
        note_on_time(capture));
    return Likeness{swing, suggestion_of(capture.source, "ringdown", "a free decay", words, note, options)};
  }
  if (!steady) return std::nullopt;
  Likeness alone{steady, {}};
  alone.suggestion.looks_like = "a steady sine; a test needs voltage and current at the same frequency";
  return alone;
}

/// Pairs of channels that may be voltage and current: what says ampere first.
std::vector<DrivenPair> pairs_of(const Capture& capture, bool in_ampere) {
  std::vector<DrivenPair> pairs;
  const auto& channels = capture.channels;
  const auto voltage = std::find_if(channels.begin(), channels.end(), may_be_voltage);
  if (voltage == channels.end()) return pairs;
  for (auto current = channels.begin(); current != channels.end(); ++current) {
    const bool fits = in_ampere ? current->unit == Unit::ampere : may_be_voltage(*current);
    if (current == voltage || !fits) continue;
    pairs.push_back(
        {static_cast<std::size_t>(voltage - channels.begin()), static_cast<std::size_t>(current - channels.begin())});
    break;
  }
  return pairs;
}

/// Voltage and current that begin and end at rest, whatever they do between.
std::optional<Likeness> burst(const Capture& capture, const DescribeOptions& options, DrivenPair pair) {
  constexpr std::size_t kFewest = 256;
  if (!capture.time.uniform() || !time_is_known(capture) || capture.samples() < kFewest) return std::nullopt;
  for (const std::size_t place : {pair.voltage, pair.current}) {
    const Channel& channel = capture.channels[place];
    if (channel.missing > 0 || !look_at_ends(channel.samples, channel.resolution).quiet) return std::nullopt;
  }
  std::vector<std::string> words = pair_words(capture, pair);
  words.push_back("--from-waveform");
  return Likeness{std::nullopt, suggestion_of(capture.source, "sweep", "a burst of voltage and current between quiet ends", words,
                                              joined(note_on_current(capture, pair), note_on_time(capture)), options)};
}

bool plain_everywhere(const std::string& word) {
  return !word.empty() && std::all_of(word.begin(), word.end(), [](char c) {
    return (c >= 'a' && c <= 'z') || (c >= 'A' && c <= 'Z') || (c >= '0' && c <= '9') ||
           std::string_view("_-./,:=+@%").find(c) != std::string_view::npos;
  });
}

}  // namespace

Likeness likely_test(const Capture& capture, const DescribeOptions& options) {
  for (const DrivenPair pair : pairs_of(capture, true)) {
    if (voltage_follows_current(capture, pair)) {
      return {std::nullopt, suggestion_of(capture.source, "resistance", "readings of voltage and current",
                                          pair_words(capture, pair), note_on_current(capture, pair), options)};
    }
    if (auto found = driven(capture, options, pair)) return *found;
  }
  std::optional<Likeness> swings = ringing(capture, options);
  if (swings && swings->swing->decays) return *swings;
  for (const DrivenPair pair : pairs_of(capture, false)) {
    if (auto found = driven(capture, options, pair)) return *found;
  }
  if (swings) return *swings;
  for (const bool in_ampere : {true, false}) {
    for (const DrivenPair pair : pairs_of(capture, in_ampere)) {
      if (auto found = burst(capture, options, pair)) return *found;
    }
  }
  return Likeness{};
}

Suggestion likely_test(const Sweep& sweep, const DescribeOptions& options) {
  // What goes from one port to another is a coupling; a sweep is of one coil.
  if (sweep.ports > 1) return suggestion_of(sweep.source, "coupling", "impedance between windings against frequency", {}, "", options);
  return suggestion_of(sweep.source, "sweep", "impedance against frequency", {}, "", options);
}

std::string shell_word(const std::string& outside) {
  if (plain_everywhere(outside)) return outside;
  if (shown(outside, outside.size()) == outside) {
    std::string word = "'";
    for (const char c : outside) word += c == '\'' ? std::string("'\\''") : std::string(1, c);
    return word + "'";
  }
  constexpr char kDigits[] = "01234567";
  std::string word = "$'";
  for (const char c : outside) {
    const auto byte = static_cast<unsigned char>(c);
    if (c == '\'' || c == '\\') {
      word += {'\\', c};
    } else if (byte < 0x20 || byte >= 0x7f) {
      // Three octal digits, never more: what follows cannot be taken for a part of it.
      word += {'\\', kDigits[byte >> 6U], kDigits[byte >> 3U & 7U], kDigits[byte & 7U]};
    } else {
      word += c;
    }
  }
  return word + "'";
}

}  // namespace coilassay
