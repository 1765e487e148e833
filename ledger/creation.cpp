#include "ledger/creation.h"

#include <fcntl.h>
#include <sys/stat.h>
#include <unistd.h>

#include <atomic>
#include <cerrno>
#include <filesystem>
#include <map>
#include <system_error>

#include "base/outside_text.h"
#include "ledger/schema.h"

namespace coilassay {

namespace {

namespace fs = std::filesystem;

tl::unexpected<Error> failed(const std::string& path, std::string finding, std::string remedy) {
  return failure(Problem::ledger, path, std::move(finding), std::move(remedy));
}

tl::unexpected<Error> cannot_make(const std::string& path, int code) {
  switch (code) {
    case ENOENT:
    case ENOTDIR: return failed(path, "there is no such folder for a ledger", "make the folder first, or give another path");
    case EACCES:
    case EPERM:
    case EROFS: return failed(path, "no ledger may be made in this folder", "give a path in a folder of your own");
    case ENOSPC:
    case EDQUOT: return failed(path, "the disk is full", "free some space, or give a path elsewhere");
    default: return failed(path, "no ledger can be made: " + std::generic_category().message(code), "give another path");
  }
}

/// In one transaction, and only into an empty file: what another program made meanwhile stays.
Result<void> lay_out(LedgerStore& store) {
  if (Result<void> begun = store.run("BEGIN IMMEDIATE"); !begun) return begun;
  const auto all = [&]() -> Result<void> {
    const Result<SqlRow> there = store.first("SELECT CAST(count(*) AS TEXT) FROM sqlite_master", {}, 1);
    if (!there) return failure(there);
    if (there->front() != "0") return {};
    for (const SchemaItem& item : ledger_schema()) {
      if (Result<void> made = store.run(item.sql); !made) return made;
    }
    // Settings of a file take no bound values; both are constants of this program.
    if (Result<void> set = store.run("PRAGMA application_id = " + std::to_string(kLedgerApplication)); !set) return set;
    return store.run("PRAGMA user_version = " + std::to_string(kLedgerVersion));
  }();
  if (!all) {
    (void)store.run("ROLLBACK");
    return all;
  }
  return store.run("COMMIT");
}

Result<void> lay_out_in(const std::string& file, int wait_s) {
  Result<LedgerStore> store = LedgerStore::open(file, true, wait_s);
  if (!store) return failure(store);
  return lay_out(*store);
}

/// A new empty file; 0, or the code of what went wrong.
int new_file(const std::string& path) {
  const int file = ::open(path.c_str(), O_RDWR | O_CREAT | O_EXCL | O_CLOEXEC, 0640);
  if (file < 0) return errno;
  return ::close(file) == 0 ? 0 : errno;
}

int new_file_beside(const fs::path& folder, std::string& path) {
  static std::atomic<unsigned> counter{0};
  int code = EEXIST;
  for (int attempt = 0; attempt < 100 && code == EEXIST; ++attempt) {
    path = (folder / (".ledger-" + std::to_string(::getpid()) + "-" + std::to_string(counter++))).string();
    code = new_file(path);
  }
  return code;
}

void sync_folder(const fs::path& folder) {
  if (const int directory = ::open(folder.c_str(), O_RDONLY | O_DIRECTORY | O_CLOEXEC); directory >= 0) {
    ::fsync(directory);
    ::close(directory);
  }
}

}  // namespace

Result<void> make_ledger(const std::string& path, int wait_s) {
  if (path.empty()) return failed(path, "the path is empty", "give the name of a file");
  struct stat about {};
  if (::stat(path.c_str(), &about) == 0) {
    if (!S_ISREG(about.st_mode) || about.st_size > 0) return {};
    return lay_out_in(path, wait_s);
  }
  if (errno != ENOENT) return cannot_make(path, errno);

  fs::path folder = fs::path(path).parent_path();
  if (folder.empty()) folder = ".";
  std::string beside;
  if (const int code = new_file_beside(folder, beside); code != 0) return cannot_make(path, code);
  if (const Result<void> made = lay_out_in(beside, wait_s); !made) {
    ::unlink(beside.c_str());
    Error error = made.error();
    error.place = path;
    return tl::make_unexpected(error);
  }
  // A link, since a rename would replace the ledger that another station may have made since.
  int code = ::link(beside.c_str(), path.c_str()) == 0 ? 0 : errno;
  ::unlink(beside.c_str());
  sync_folder(folder);
  if (code == EPERM || code == ENOTSUP || code == ENOSYS) {  // a file system without links
    code = new_file(path);
    if (code == 0) return lay_out_in(path, wait_s);
  }
  if (code != 0 && code != EEXIST) return cannot_make(path, code);
  return {};
}

Result<std::vector<std::string>> schema_faults(LedgerStore& store) {
  std::map<std::string, std::string> found;  // "trigger entry_stays" and its statement
  // Indexes that SQLite makes by itself for UNIQUE have no statement.
  const Result<void> read = store.each("SELECT type, name, sql FROM sqlite_master WHERE sql IS NOT NULL", {}, 3,
                                       [&found](const SqlRow& row) {
                                         found[row[0] + " " + row[1]] = row[2];
                                         return found.size() < 1000;
                                       });
  if (!read) return failure(read);
  std::vector<std::string> faults;
  for (const SchemaItem& item : ledger_schema()) {
    const auto there = found.find(std::string(item.kind) + " " + std::string(item.name));
    if (there == found.end()) {
      faults.push_back("the " + std::string(item.kind) + " '" + std::string(item.name) + "' is missing");
      continue;
    }
    if (there->second != item.sql) {
      faults.push_back("the " + std::string(item.kind) + " '" + std::string(item.name) + "' was altered");
    }
    found.erase(there);
  }
  for (const auto& [name, sql] : found) faults.push_back("it holds something of its own: the " + shown(name, 80));
  return faults;
}

Result<void> check_ledger(LedgerStore& store, bool adding) {
  const Result<SqlRow> marks = store.first(
      "SELECT CAST(a.application_id AS TEXT), CAST(v.user_version AS TEXT), CAST((SELECT count(*) FROM sqlite_master) AS TEXT)"
      " FROM pragma_application_id AS a, pragma_user_version AS v", {}, 3);
  if (!marks) return failure(marks);
  if ((*marks)[0] != std::to_string(kLedgerApplication)) {
    return (*marks)[0] == "0" && (*marks)[2] == "0"
               ? failed(store.path(), "this is no ledger: it is empty", "give the path of one")
               : failed(store.path(), "this is a database, but no ledger of this program", "give the path of one, or of a new file");
  }
  const int version = std::atoi((*marks)[1].c_str());
  if (version > kLedgerVersion) {
    return failed(store.path(), "the ledger was written by a newer version of this program", "use that version");
  }
  if (version < 1) return failed(store.path(), "the ledger is damaged: it has no version", "go on with the newest copy that holds");
  if (!adding) return {};
  const Result<std::vector<std::string>> faults = schema_faults(store);
  if (!faults) return failure(faults);
  if (!faults->empty()) {
    return failed(store.path(), "nothing is added to a ledger whose rules were touched: " + faults->front(),
                  "coilassay ledger verify says what is wrong");
  }
  return {};
}

}  // namespace coilassay
