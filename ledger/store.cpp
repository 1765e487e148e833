// The only file that knows SOCI.
#include "ledger/store.h"

#include <fcntl.h>
#include <soci/soci.h>
#include <soci/sqlite3/soci-sqlite3.h>
#include <sys/resource.h>
#include <sys/stat.h>
#include <unistd.h>

#include <cassert>
#include <cerrno>
#include <system_error>

namespace coilassay {

namespace {

namespace api = sqlite_api;

tl::unexpected<Error> failed(const std::string& path, std::string finding, std::string remedy) {
  return failure(Problem::ledger, path, std::move(finding), std::move(remedy));
}

tl::unexpected<Error> no_file(const std::string& path, int code) {
  switch (code) {
    case ENOENT:
    case ENOTDIR: return failed(path, "there is no such ledger", "look at the path; coilassay inspect --ledger FILE makes one");
    case EACCES: return failed(path, "there is no permission to read it", "ask its owner, or give another path");
    default:
      return failed(path, "the ledger cannot be opened: " + std::generic_category().message(code), "look at the path");
  }
}

/// Closed without taking the locks away that this process holds on the file through other descriptors: one that only
/// names a file (O_PATH) has none.
class NamedFile {
 public:
  explicit NamedFile(const std::string& path) : number_(::open(path.c_str(), O_PATH | O_CLOEXEC)) {}
  ~NamedFile() {
    if (number_ >= 0) ::close(number_);
  }
  NamedFile(const NamedFile&) = delete;
  NamedFile& operator=(const NamedFile&) = delete;
  int number() const { return number_; }

 private:
  int number_;
};

}  // namespace

struct LedgerStore::Session {
  soci::session sql;
  explicit Session(const std::string& connection) : sql(soci::sqlite3, connection) {}
  api::sqlite3* handle() { return static_cast<soci::sqlite3_session_backend*>(sql.get_backend())->conn_; }
};

LedgerStore::LedgerStore(std::string path, std::unique_ptr<Session> session)
    : path_(std::move(path)), session_(std::move(session)) {}
LedgerStore::~LedgerStore() = default;
LedgerStore::LedgerStore(LedgerStore&&) noexcept = default;
LedgerStore& LedgerStore::operator=(LedgerStore&&) noexcept = default;

tl::unexpected<Error> LedgerStore::trouble(int code) const {
  switch (code & 0xff) {
    case SQLITE_BUSY:
    case SQLITE_LOCKED:
      return failed(path_, "another program keeps the ledger locked", "close what has it open, then start again");
    case SQLITE_FULL: return failed(path_, "the disk is full", "free some space, then start again: what was stored is kept");
    case SQLITE_READONLY:
    case SQLITE_CANTOPEN:
    case SQLITE_PERM:
    case SQLITE_AUTH:
      return failed(path_, "the ledger, or its folder, can only be read", "ask for the right to write both, or copy it elsewhere");
    case SQLITE_CORRUPT:
    case SQLITE_FORMAT:
      return failed(path_, "the ledger is damaged", "keep the file as it is, and go on with the newest copy that holds");
    case SQLITE_NOTADB: return failed(path_, "this is no ledger", "give the path of one, or of a new file");
    case SQLITE_NOMEM: throw std::bad_alloc();
    case SQLITE_CONSTRAINT:
      return failed(path_, "the ledger's own rules refuse this: " + std::string(api::sqlite3_errmsg(session_->handle())),
                    "coilassay ledger verify says whether it holds");
    case SQLITE_IOERR: {
      int system = 0;
      api::sqlite3_file_control(session_->handle(), "main", SQLITE_FCNTL_LAST_ERRNO, &system);
      // Of a journal's write nothing more is known than that it failed.
      rlimit limit{};
      const bool limited = ::getrlimit(RLIMIT_FSIZE, &limit) == 0 && limit.rlim_cur != RLIM_INFINITY;
      if (system == EFBIG || (system == 0 && limited && code == SQLITE_IOERR_WRITE)) {
        return failed(path_, "the file would be larger than is allowed here", "raise the limit (ulimit -f)");
      }
      if (system == EDQUOT || system == ENOSPC) return trouble(SQLITE_FULL);
      return failed(path_, "the disk reports an error" + (system == 0 ? "" : ": " + std::generic_category().message(system)),
                    "keep the file as it is, and look after the disk");
    }
    default:
      return failed(path_, "the ledger cannot be used: " + std::string(api::sqlite3_errstr(code)),
                    "coilassay ledger verify says whether it holds");
  }
}

Result<LedgerStore> LedgerStore::open(const std::string& path, bool adding, int wait_s) {
  const NamedFile file(path);
  if (file.number() < 0) return no_file(path, errno);
  struct stat about {};
  if (::fstat(file.number(), &about) != 0) return no_file(path, errno);
  if (!S_ISREG(about.st_mode)) return failed(path, "this is no file", "give the path of a ledger");
  const std::string by_number = "/proc/self/fd/" + std::to_string(file.number());
  if (::access(by_number.c_str(), R_OK) != 0) return no_file(path, errno);

  std::unique_ptr<Session> session;
  try {
    // By its number, since the connection's text has no way to write every name. SQLite follows the link and keeps its
    // journal beside the file itself.
    session = std::make_unique<Session>("db=" + by_number);
  } catch (const soci::soci_error&) {
    return failed(path, "the ledger cannot be opened", "look at the path and its permissions");
  }
  api::sqlite3* const handle = session->handle();
  api::sqlite3_extended_result_codes(handle, 1);
  api::sqlite3_busy_timeout(handle, wait_s * 1000);
  api::sqlite3_db_config(handle, SQLITE_DBCONFIG_DEFENSIVE, 1, nullptr);
  api::sqlite3_db_config(handle, SQLITE_DBCONFIG_TRUSTED_SCHEMA, 0, nullptr);
  api::sqlite3_limit(handle, SQLITE_LIMIT_ATTACHED, 0);

  LedgerStore store(path, std::move(session));
  // A rollback journal, not a write-ahead log: the file alone is the whole record whenever nobody writes, it can be read in a
  // folder that may not be written, and it works on shared folders. EXTRA also syncs the folder once the journal is gone, for
  // a journal that came back after a power cut would take the entry away.
  for (const char* setting : {"PRAGMA cell_size_check = ON", "PRAGMA foreign_keys = ON", "PRAGMA recursive_triggers = ON",
                              "PRAGMA synchronous = EXTRA"}) {
    if (const Result<void> set = store.run(setting); !set) return failure(set);
  }
  if (!adding) {
    if (const Result<void> set = store.run("PRAGMA query_only = ON"); !set) return failure(set);
    return store;
  }
  if (api::sqlite3_db_readonly(handle, "main") != 0) return store.trouble(SQLITE_READONLY);
  if (const Result<void> set = store.run("PRAGMA journal_mode = DELETE"); !set) return failure(set);
  return store;
}

Result<void> LedgerStore::each(std::string_view sql, const std::vector<SqlValue>& values, std::size_t columns,
                               const std::function<bool(const SqlRow&)>& row) {
  try {
    soci::statement statement(session_->sql);
    SqlRow cells(columns);
    std::vector<soci::indicator> absent(columns);
    for (std::size_t i = 0; i < columns; ++i) statement.exchange(soci::into(cells[i], absent[i]));
    // The library keeps references: values live until the statement ends.
    std::vector<long long> numbers;
    numbers.reserve(values.size());
    soci::indicator null = soci::i_null;
    static const std::string none;
    for (const SqlValue& value : values) {
      if (const auto* text = std::get_if<std::string>(&value)) {
        statement.exchange(soci::use(*text));
      } else if (const auto* number = std::get_if<std::int64_t>(&value)) {
        statement.exchange(soci::use(numbers.emplace_back(*number)));
      } else {
        statement.exchange(soci::use(none, null));
      }
    }
    statement.alloc();
    statement.prepare(std::string(sql));
    statement.define_and_bind();
    statement.execute(columns == 0);
    while (columns > 0 && statement.fetch()) {
      for (std::size_t i = 0; i < columns; ++i) {
        if (absent[i] == soci::i_null) cells[i].clear();
      }
      if (!row(cells)) break;
    }
    return {};
  } catch (const soci::sqlite3_soci_error& error) {
    return trouble(error.result());
  } catch (const soci::soci_error& error) {
    return failed(path_, std::string("the ledger cannot be used: ") + error.what(), "coilassay ledger verify says whether it holds");
  }
}

Result<void> LedgerStore::run(std::string_view sql, const std::vector<SqlValue>& values) {
  return each(sql, values, 0, [](const SqlRow&) { return false; });
}

Result<SqlRow> LedgerStore::first(std::string_view sql, const std::vector<SqlValue>& values, std::size_t columns) {
  SqlRow found;
  const Result<void> read = each(sql, values, columns, [&found](const SqlRow& row) {
    found = row;
    return false;
  });
  if (!read) return failure(read);
  return found;
}

}  // namespace coilassay
