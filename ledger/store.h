// The SQLite file under a ledger: opening, transactions, rows as text, and SQLite's troubles in plain words.
#pragma once

#include <cstdint>
#include <functional>
#include <memory>
#include <string>
#include <string_view>
#include <variant>
#include <vector>

#include "base/result.h"

namespace coilassay {

/// A value bound to a statement; nothing of it is ever part of the SQL text.
using SqlValue = std::variant<std::monostate, std::int64_t, std::string>;
using SqlRow = std::vector<std::string>;  // NULL is empty

class LedgerStore {
 public:
  /// Opens a file that must be there. `adding`: also for writing. Nothing about its contents is checked.
  static Result<LedgerStore> open(const std::string& path, bool adding, int wait_s);
  ~LedgerStore();
  LedgerStore(LedgerStore&&) noexcept;
  LedgerStore& operator=(LedgerStore&&) noexcept;

  Result<void> run(std::string_view sql, const std::vector<SqlValue>& values = {});
  /// Calls `row` for each row with its first `columns` columns, until it says false. Numbers come as decimal text when the
  /// statement casts them to text.
  Result<void> each(std::string_view sql, const std::vector<SqlValue>& values, std::size_t columns,
                    const std::function<bool(const SqlRow&)>& row);
  /// The only row; empty when there is none.
  Result<SqlRow> first(std::string_view sql, const std::vector<SqlValue>& values, std::size_t columns);

  const std::string& path() const { return path_; }

 private:
  struct Session;
  LedgerStore(std::string path, std::unique_ptr<Session> session);
  tl::unexpected<Error> trouble(int code) const;

  std::string path_;
  std::unique_ptr<Session> session_;
};

}  // namespace coilassay
