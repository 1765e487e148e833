#include "tests/ledger/made_entries.h"

#include <gtest/gtest.h>
#include <sys/wait.h>

#include <cstdio>
#include <stdexcept>

#include "base/digest.h"

namespace coilassay::test {

EntryContent made_unit(const std::string& serial, const std::string& verdict) {
  EntryContent content;
  content.kind = EntryKind::unit;
  content.time = *parse_utc_time("2026-03-04T10:22:00Z");
  content.part = "drum-47";
  content.revision = "C";
  content.supplier = "Reel Hall";
  content.sheet_sha256 = sha256_of(std::string("sheet"));
  content.lot = "0412";
  content.serial = serial;
  content.attempt = 1;
  content.verdict = verdict;
  content.operator_name = "Åsa";
  content.instrument = "bench-lcr,4,117";
  content.program = "coilassay 0.1.0";
  content.sources = {{"ramp", serial + ".ramp.csv", sha256_of("ramp of " + serial)},
                     {"sweep", serial + ".sweep.csv", sha256_of("sweep of " + serial)}};
  content.details = R"({"limits":[{"quantity":"L_s","value":4.7e-05,"U":2.1e-07,"verdict":")" + verdict + R"("}]})";
  return content;
}

EntryContent made_lot(const std::string& lot, const std::string& decision) {
  EntryContent content = made_unit("");
  content.kind = EntryKind::lot;
  content.lot = lot;
  content.attempt = 0;
  content.verdict = decision;
  content.sources.clear();
  content.details = R"({"severity":"normal","nonconforming":0})";
  return content;
}

Ledger made_ledger(const std::string& path, int units) {
  Result<Ledger> ledger = Ledger::open({.path = path, .mode = LedgerMode::create});
  if (!ledger) throw std::runtime_error(ledger.error().finding);
  for (int i = 1; i <= units;) {
    std::vector<EntryContent> batch;
    for (; i <= units && batch.size() < kLargestBatch; ++i) {
      char serial[16];
      std::snprintf(serial, sizeof serial, "%04d", i);
      batch.push_back(made_unit(serial));
    }
    const auto stored = ledger->append(batch);
    if (!stored) throw std::runtime_error(stored.error().finding);
  }
  return std::move(*ledger);
}

ShellEnd sqlite_shell(const std::string& path, const std::string& sql) {
  std::string quoted = sql;
  for (std::size_t at = 0; (at = quoted.find('\'', at)) != std::string::npos; at += 4) quoted.replace(at, 1, "'\\''");
  std::FILE* pipe = popen(("sqlite3 -batch -cmd 'PRAGMA synchronous = OFF' '" + path + "' '" + quoted + "' 2>&1").c_str(), "r");
  ShellEnd end;
  char block[4096];
  for (std::size_t n; (n = std::fread(block, 1, sizeof block, pipe)) > 0;) end.text.append(block, n);
  const int status = pclose(pipe);
  end.exit_code = WIFEXITED(status) ? WEXITSTATUS(status) : -1;
  return end;
}

}  // namespace coilassay::test
