#include "tests/end_to_end/lot_bench.h"

#include <gtest/gtest.h>

#include <filesystem>
#include <sstream>

#include "tests/report/schema_check.h"

namespace coilassay::test {

LotBench::LotBench(const std::string& more) {
  std::filesystem::create_directory(folder_ / "lot");
  folder_.file("bench.toml",
               "[voltage]\ncolumn = \"CH1\"\ninput_capacitance = \"13 pF ± 2 pF\"\ninput_resistance = \"10 Mohm ± 2 %\"\n"
               "[timebase]\ntolerance = \"25 ppm\"\n"
               "[[capacitor]]\nvalue = \"10 nF ± 20 pF (k=2)\"\ndissipation_factor = \"0.0003 ± 0.0003\"\n"
               "[room]\ntemperature = \"23 ± 2 degC\"\n"
               "[[equipment]]\nid = \"C-10n\"\ncertificate = \"SBW-114\"\ncalibrated = 2026-01-10\ndue = 2099-01-10\n");
  folder_.file("drum.toml",
               "[part]\nname = \"drum-47\"\nrevision = \"C\"\nsupplier = \"Reel Hall\"\n"
               "[[limit]]\nquantity = \"L_s\"\nmin = \"37.6 uH\"\nmax = \"56.4 uH\"\ntest = \"ringdown\"\n"
               "at = { frequency = \"230 kHz\" }\n"
               "[tolerance_of_conditions]\nfrequency = \"12 %\"\n"
               "[test.ringdown]\nbench = \"bench.toml\"\n" +
                   more);
}

void LotBench::unit(const std::string& serial, double inductance_uh, std::uint64_t seed,
                    const std::vector<std::string>& parameters) const {
  std::vector<std::string> arguments = {"simulate",     "ringdown",
                                        "-o",           lot() + "/" + serial + ".ringdown.csv",
                                        "--inductance", std::to_string(inductance_uh) + "uH",
                                        "--seed",       std::to_string(seed),
                                        "--samples",    "1500",
                                        "--interval",   "80ns",
                                        "--noise",      "2mV",
                                        "--quiet"};
  arguments.insert(arguments.end(), parameters.begin(), parameters.end());
  const ProgramEnd end = run_program_process(arguments);
  EXPECT_EQ(end.exit_code, 0) << end.error;
}

void LotBench::good_units(int count) const {
  for (int i = 1; i <= count; ++i) {
    unit((i < 10 ? "0" : "") + std::to_string(i), 45 + 0.1 * i, static_cast<std::uint64_t>(i));
  }
}

void LotBench::remove(const std::string& serial) const {
  std::filesystem::remove(lot() + "/" + serial + ".ringdown.csv");
}

ProgramEnd LotBench::inspect(std::vector<std::string> options) const {
  options.insert(options.begin(), {"inspect", sheet(), lot()});
  return run_program_process(std::move(options));
}

nlohmann::json LotBench::inspected(std::vector<std::string> options, int exit_code) const {
  options.emplace_back("--json");
  const ProgramEnd end = inspect(std::move(options));
  EXPECT_EQ(end.exit_code, exit_code) << end.out << end.error;
  EXPECT_EQ(schema_trouble(end.out, exit_code == 2 || exit_code == 4 ? "error" : "lot"), "") << end.out;
  const nlohmann::json document = nlohmann::json::parse(end.out, nullptr, false);
  return document.is_discarded() ? nlohmann::json::object() : document;
}

std::vector<nlohmann::json> LotBench::followed(std::vector<std::string> options, int exit_code) const {
  options.emplace_back("--follow");
  const ProgramEnd end = inspect(std::move(options));
  EXPECT_EQ(end.exit_code, exit_code) << end.out << end.error;
  std::vector<nlohmann::json> documents;
  std::istringstream lines(end.out);
  for (std::string line; std::getline(lines, line);) {
    documents.push_back(nlohmann::json::parse(line, nullptr, false));
    const bool last = documents.back().is_object() && documents.back().value("schema", "") == "coilassay.lot/1";
    EXPECT_EQ(schema_trouble(line, last ? "lot" : "unit"), "") << line;
  }
  return documents;
}

nlohmann::json unit_of(const nlohmann::json& lot, const std::string& serial) {
  for (const nlohmann::json& unit : lot.at("units")) {
    if (unit.at("serial") == serial) return unit;
  }
  ADD_FAILURE() << "there is no unit " << serial;
  return nlohmann::json::object();
}

}  // namespace coilassay::test
