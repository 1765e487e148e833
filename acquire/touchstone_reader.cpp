#include "acquire/touchstone_reader.h"

#include <fmt/format.h>

#include <algorithm>
#include <cmath>
#include <numbers>

#include "acquire/byte_source_lines.h"
#include "acquire/number_scan.h"
#include "acquire/table_cells.h"
#include "acquire/touchstone_keywords.h"
#include "base/outside_text.h"

namespace coilassay {
namespace {

using Complex = std::complex<double>;

/// N of "coil.s2p"; 0 when the name does not say.
std::size_t ports_of_name(std::string_view file_name) {
  const std::size_t dot = file_name.rfind('.');
  if (dot == std::string_view::npos) return 0;
  const std::string ending = lower_case(file_name.substr(dot + 1));
  if (ending.size() < 3 || ending.size() > 4 || ending.front() != 's' || ending.back() != 'p') return 0;
  std::size_t ports = 0;
  for (const char c : ending.substr(1, ending.size() - 2)) {
    if (!number_scan_detail::digit(c)) return 0;
    ports = ports * 10 + static_cast<std::size_t>(c - '0');
  }
  return ports;
}

std::string_view without_comment(std::string_view line) { return bare_cell(line.substr(0, line.find('!'))); }

std::string letter(PortParameter kind) {
  switch (kind) {
    case PortParameter::s: return "S";
    case PortParameter::z: return "Z";
    case PortParameter::y: return "Y";
    case PortParameter::h: return "H";
    case PortParameter::g: return "G";
  }
  return "";
}

class TouchstoneRead {
 public:
  TouchstoneRead(ByteSource& source, const ReadOptions& options)
      : name_(source.name()), source_(source), blocks_(source), options_(options) {
    setup_.ports = ports_of_name(plain_name(name_));
  }

  static std::string plain_name(std::string name) {
    for (const std::string_view ending : {".gz", ".zst"}) {
      if (name.ends_with(ending)) name.resize(name.size() - ending.size());
    }
    return name;
  }

  Result<Recording> run() {
    LineBlock block;
    do {
      if (const auto got = blocks_.next(block); !got) return failure(got);
      for (const TableLine& line : lines_of(block.text(), true)) {
        ++line_;
        if (section_ == Section::end) break;
        if (const auto done = read_line(line.text); !done) return failure(done);
      }
      if (options_.progress != nullptr &&
          !options_.progress->advance("reading " + shown(name_), blocks_.bytes_read(), source_.size_hint())) {
        return failure(Problem::interrupted, name_, "stopped while it was being read", "");
      }
    } while (block.size > 0);
    if (const auto done = finish(); !done) return failure(done);
    return Recording(std::move(sweep_));
  }

 private:
  enum class Section { head, information, network, noise, end };

  std::string place() const { return fmt::format("{}:{}", name_, line_); }
  tl::unexpected<Error> damaged(const std::string& finding) const {
    return failure(Problem::damaged, place(), finding, "repair that line, or export the file again");
  }

  Result<void> read_line(std::string_view raw) {
    if (line_ == 1 && raw.starts_with("\xEF\xBB\xBF")) raw.remove_prefix(3);
    const std::string_view line = without_comment(raw);
    if (line.empty()) return {};
    if (section_ == Section::information) {
      const auto keyword = keyword_of(line);
      if (keyword && keyword->name == "end information") section_ = Section::head;
      return {};
    }
    if (line.front() == '#') {
      // Numbers before it were read as the defaults say; it cannot change them any more.
      if (numbers_seen() && !setup_.option_line_seen) return damaged("the option line stands behind the first numbers");
      return read_option_line(line, place(), setup_);
    }
    if (const auto keyword = keyword_of(line)) return take_keyword(*keyword);
    if (section_ == Section::noise) return {};
    if (section_ == Section::head && setup_.version_2) return more_references(line);
    return read_numbers(line);
  }

  Result<void> take_keyword(const TouchstoneKeyword& keyword) {
    references_open_ = keyword.name == "reference";
    if (keyword.name == "begin information") {
      section_ = Section::information;
    } else if (keyword.name == "network data") {
      section_ = Section::network;
    } else if (keyword.name == "noise data") {
      section_ = Section::noise;
    } else if (keyword.name == "end") {
      section_ = Section::end;
    } else {
      if (numbers_seen()) return damaged(fmt::format("[{}] stands behind the first numbers", shown(keyword.name, 40)));
      return read_keyword(keyword, place(), setup_);
    }
    return {};
  }

  bool numbers_seen() const { return checked_ || !pending_.empty(); }

  /// The references of many ports may go on in the next lines.
  Result<void> more_references(std::string_view line) {
    if (!references_open_) return damaged(fmt::format("'{}' stands before [Network Data]", shown(line, 40)));
    return read_keyword({"reference continued", std::string(line)}, place(), setup_);
  }

  Result<void> read_numbers(std::string_view line) {
    const auto cells = cells_of(line, ' ');
    if (ended_by_noise(cells)) {
      section_ = Section::noise;
      return {};
    }
    if (pending_.empty() && setup_.ports == 0) guess_ports(cells.size());
    for (const std::string_view cell : cells) {
      const bool frequency = pending_.empty();
      const CellValue value = read_cell(cell, '.', frequency ? setup_.frequency_exponent : 0);
      if (value.kind == CellKind::text || (frequency && value.kind != CellKind::number)) {
        return damaged(fmt::format("'{}' is no number", shown(cell, 40)));
      }
      if (frequency && value.value < 0) return damaged(fmt::format("a frequency of {} is below zero", shown(cell, 40)));
      pending_.push_back(value.value);
      if (pending_.size() == numbers_per_point()) {
        if (const auto done = take_point(); !done) return done;
      }
    }
    return {};
  }

  /// Version 1 two-ports: lines of five numbers that begin with a lower frequency are noise.
  bool ended_by_noise(const std::vector<std::string_view>& cells) const {
    if (setup_.version_2 || setup_.ports != 2 || !pending_.empty() || cells.size() != 5 || sweep_.frequency_hz.empty()) return false;
    const CellValue frequency = read_cell(cells.front(), '.', setup_.frequency_exponent);
    return frequency.kind == CellKind::number && frequency.value <= sweep_.frequency_hz.back();
  }

  /// A name that does not tell: a point of one port has 3 numbers in its line, of two ports 9, of three ports 7 in the first.
  void guess_ports(std::size_t numbers) { setup_.ports = numbers == 9 ? 2 : numbers == 7 ? 3 : 1; }

  std::size_t entries() const {
    const std::size_t n = setup_.ports;
    return setup_.matrix == TouchstoneSetup::MatrixFormat::full ? n * n : n * (n + 1) / 2;
  }
  std::size_t numbers_per_point() const { return 1 + 2 * entries(); }

  Complex value_of(double a, double b) const {
    constexpr double kDegree = std::numbers::pi / 180;
    switch (setup_.format) {
      case TouchstoneSetup::Format::real_imaginary: return {a, b};
      case TouchstoneSetup::Format::magnitude_angle: return a * Complex{std::cos(b * kDegree), std::sin(b * kDegree)};
      case TouchstoneSetup::Format::decibel_angle:
        return std::pow(10.0, a / 20) * Complex{std::cos(b * kDegree), std::sin(b * kDegree)};
    }
    return {};
  }

  /// Row and column of the k-th pair of numbers.
  std::pair<std::size_t, std::size_t> position(std::size_t k) const {
    const std::size_t n = setup_.ports;
    if (setup_.matrix == TouchstoneSetup::MatrixFormat::full) {
      // Version 1 writes a two-port as 11 21 12 22; version 2 says its order.
      const bool by_columns = n == 2 && !(setup_.version_2 && setup_.order_12_21.value_or(false));
      return by_columns ? std::pair{k % n, k / n} : std::pair{k / n, k % n};
    }
    const bool lower = setup_.matrix == TouchstoneSetup::MatrixFormat::lower;
    std::size_t row = 0;
    std::size_t in_row = lower ? 1 : n;
    while (k >= in_row) {
      k -= in_row;
      ++row;
      in_row = lower ? in_row + 1 : in_row - 1;
    }
    return {row, lower ? k : row + k};
  }

  Result<void> take_point() {
    if (const auto ready = check_setup(); !ready) return ready;
    const std::size_t n = setup_.ports;
    std::vector<Complex> matrix(n * n);
    for (std::size_t k = 0; k < entries(); ++k) {
      const auto [row, column] = position(k);
      const Complex value = value_of(pending_[1 + 2 * k], pending_[2 + 2 * k]);
      matrix[row * n + column] = value;
      if (setup_.matrix != TouchstoneSetup::MatrixFormat::full) matrix[column * n + row] = value;
    }
    sweep_.frequency_hz.push_back(pending_.front());
    if (setup_.parameter == PortParameter::s) sweep_.scattering.push_back(matrix);
    auto z = to_impedance(setup_.parameter, std::move(matrix), setup_.reference_ohm, !setup_.version_2);
    sweep_.bad.push_back(!z);
    if (!z) z = std::vector<Complex>(n * n, Complex(std::nan(""), std::nan("")));
    sweep_.z_ohm.push_back(std::move(*z));
    pending_.clear();
    return {};
  }

  /// Once, before the first point.
  Result<void> check_setup() {
    if (checked_) return {};
    checked_ = true;
    const std::size_t n = setup_.ports;
    if (setup_.version_2 && n == 2 && setup_.matrix == TouchstoneSetup::MatrixFormat::full && !setup_.order_12_21) {
      return damaged("a two-port of version 2 must say its [Two-Port Data Order]");
    }
    if (n != 2 && (setup_.parameter == PortParameter::h || setup_.parameter == PortParameter::g)) {
      return damaged("hybrid parameters are those of two ports only");
    }
    if (setup_.reference_ohm.size() == 1) setup_.reference_ohm.resize(n, setup_.reference_ohm.front());
    if (setup_.reference_ohm.size() != n) {
      return damaged(fmt::format("there are {} references for {} ports", setup_.reference_ohm.size(), n));
    }
    sweep_.ports = n;
    return {};
  }

  Result<void> finish() {
    if (!pending_.empty()) {
      return damaged(fmt::format("the last point has {} numbers of {}: the file was cut short, or has another number of ports than {}",
                                 pending_.size(), numbers_per_point(), setup_.ports));
    }
    if (sweep_.frequency_hz.empty()) {
      return failure(Problem::not_a_capture, name_, "it holds no network data", "export the sweep again");
    }
    sweep_.as_read = letter(setup_.parameter);
    sweep_.reference_ohm = setup_.reference_ohm;
    sweep_.dialect.format = "touchstone";
    sweep_.dialect.encoding = "utf-8";
    sweep_.dialect.delimiter = " ";
    sweep_.dialect.decimal = ".";
    sweep_.dialect.settings["version"] = setup_.version_2 ? "2" : "1";
    check_count();
    check_reciprocity();
    return {};
  }

  void check_count() {
    const std::size_t present = sweep_.frequency_hz.size();
    if (setup_.frequencies == 0 || setup_.frequencies == present) return;
    sweep_.findings.push_back({"header_contradicts", Severity::note,
                               fmt::format("the file states {} frequencies and holds {}", setup_.frequencies, present), "frequencies",
                               static_cast<double>(present), Unit::one});
  }

  /// Coils are reciprocal: where Z12 and Z21 differ, the numbers stand in another order than was taken, or are not a coil's.
  void check_reciprocity() {
    constexpr double kDifferent = 0.05;
    const std::size_t n = sweep_.ports;
    double worst = 0;
    double at_hz = 0;
    for (std::size_t p = 0; p < sweep_.z_ohm.size(); ++p) {
      if (sweep_.bad[p]) continue;
      const auto& z = sweep_.z_ohm[p];
      for (std::size_t i = 0; i < n; ++i) {
        for (std::size_t j = 0; j < i; ++j) {
          const double scale = std::sqrt(std::abs(z[i * n + i]) * std::abs(z[j * n + j]));
          const double difference = std::abs(z[i * n + j] - z[j * n + i]) / scale;
          if (difference > worst) {
            worst = difference;
            at_hz = sweep_.frequency_hz[p];
          }
        }
      }
    }
    if (worst <= kDifferent) return;
    sweep_.findings.push_back({"not_reciprocal", Severity::caution,
                               fmt::format("forward and reverse transfer differ by {:.1f} % of the ports' own impedance at {:.6g} Hz; "
                                           "coils are reciprocal: look at the order of the ports and the calibration",
                                           100 * worst, at_hz),
                               "ports", worst, Unit::one});
  }

  std::string name_;
  ByteSource& source_;
  LineBlocks blocks_;
  const ReadOptions& options_;
  TouchstoneSetup setup_;
  Sweep sweep_;
  Section section_ = Section::head;
  std::vector<double> pending_;  // numbers of the point being read
  std::size_t line_ = 0;
  bool references_open_ = false;
  bool checked_ = false;
};

class TouchstoneReader final : public Reader {
 public:
  std::string_view format_name() const override { return "touchstone"; }

  bool recognises(std::string_view file_name, std::string_view first_bytes) const override {
    if (ports_of_name(file_name) > 0 || lower_case(file_name).ends_with(".ts")) return true;
    for (const TableLine& line : lines_of(first_bytes, false)) {
      const std::string_view text = without_comment(line.text);
      if (text.empty()) continue;
      const auto keyword = keyword_of(text);
      return (keyword && keyword->name == "version") || is_option_line(text);
    }
    return false;
  }

  Result<Recording> read(ByteSource& bytes, std::string_view first_bytes, const ReadOptions& options) const override {
    if (first_bytes.find('\0') != std::string_view::npos) {
      return failure(Problem::not_a_capture, bytes.name(), "it is a binary file, not port parameters in text", "export it again");
    }
    return TouchstoneRead(bytes, options).run();
  }
};

}  // namespace

std::unique_ptr<Reader> touchstone_reader() { return std::make_unique<TouchstoneReader>(); }

}  // namespace coilassay
