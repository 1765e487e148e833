#include "analysis/sweep_of_sines.h"

#include <algorithm>
#include <cmath>
#include <map>
#include <set>

#include "base/outside_text.h"

namespace coilassay {

namespace {

using Complex = std::complex<double>;

const std::vector<BudgetLine>& lines_of(const Measurement& m, const std::string& symbol) {
  static const std::vector<BudgetLine> none;
  const auto at = m.budget.find(symbol);
  return at == m.budget.end() ? none : at->second;
}

double own_uncertainty(const Measurement& m, const std::string& symbol) {
  double sum = 0;
  for (const BudgetLine& line : lines_of(m, symbol)) sum += line.common ? 0 : line.u * line.u;
  return std::sqrt(sum);
}

double common_uncertainty(const Measurement& m, const std::string& symbol, const std::string& source) {
  for (const BudgetLine& line : lines_of(m, symbol)) {
    if (line.common && line.source == source) return line.u;
  }
  return 0;
}

/// The common sources that appear in any point, with their basis.
std::map<std::string, std::string> common_sources(const std::vector<Measurement>& parts) {
  std::map<std::string, std::string> sources;
  for (const Measurement& part : parts) {
    for (const char* symbol : {"Z", "phi"}) {
      for (const BudgetLine& line : lines_of(part, symbol)) {
        if (line.common) sources[line.source] = line.basis;
      }
    }
  }
  return sources;
}

}  // namespace

Result<SweepOfSines> sweep_of_sines(const std::vector<Capture>& captures, const SineRequest& request) {
  SweepOfSines made;
  Sweep& sweep = made.sweep;
  sweep.as_read = "sine";
  SineRequest each_request = request;
  each_request.traces = false;
  each_request.propagation.by_trials = false;
  std::vector<Measurement> parts;
  std::set<std::string> said;
  for (const Capture& capture : captures) {
    Result<Measurement> part = measure_sine(capture, each_request);
    if (!part) return failure(part);
    const Estimate* f = part->find("f");
    const Estimate* z = part->find("Z");
    const Estimate* phi = part->find("phi");
    const bool good = f != nullptr && z != nullptr && phi != nullptr;
    sweep.frequency_hz.push_back(good ? f->quantity.value : std::nan(""));
    sweep.z_ohm.push_back({good ? std::polar(z->quantity.value, phi->quantity.value) : Complex(std::nan(""), std::nan(""))});
    sweep.bad.push_back(!good);
    // Never nothing: a record without noise still has the rounding of its numbers.
    made.knowledge.u_ratio.push_back(good ? std::fmax(own_uncertainty(*part, "Z") / z->quantity.value, 1e-12) : std::nan(""));
    made.knowledge.u_phase.push_back(good ? std::fmax(own_uncertainty(*part, "phi"), 1e-12) : std::nan(""));
    for (Finding finding : part->findings) {
      // The same remark on every file is one remark.
      if (finding.severity == Severity::note || !said.insert(finding.code + (good ? "" : capture.source.name)).second) continue;
      if (finding.severity == Severity::refusal) finding.severity = Severity::caution;   // of one point among many
      finding.message = shown(capture.source.name, 60) + ": " + finding.message;
      sweep.findings.push_back(std::move(finding));
    }
    if (sweep.z_ohm.size() == 1) made.knowledge.corrections = part->corrections;
    made.sources.insert(made.sources.end(), part->sources.begin(), part->sources.end());
    parts.push_back(std::move(*part));
  }
  for (const auto& [source, basis] : common_sources(parts)) {
    ImpedanceErrorTerm term;
    term.source = source;
    term.law = {ErrorLaw::Kind::normal, 1, 0};
    term.basis = basis;
    for (std::size_t i = 0; i < parts.size(); ++i) {
      const Complex z = sweep.z_ohm[i][0];
      const double size = std::abs(z);
      const Complex moved = z * Complex(common_uncertainty(parts[i], "Z", source) / size, common_uncertainty(parts[i], "phi", source));
      term.dz_ohm.push_back(std::isfinite(size) ? moved : Complex(0, 0));
    }
    made.knowledge.errors.push_back(std::move(term));
  }
  made.knowledge.complete = true;
  if (!captures.empty()) sweep.source = captures.front().source;
  return made;
}

}  // namespace coilassay
