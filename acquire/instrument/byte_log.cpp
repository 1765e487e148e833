#include "acquire/instrument/byte_log.h"

#include <fcntl.h>
#include <fmt/format.h>
#include <unistd.h>

#include <cerrno>
#include <cstdio>
#include <filesystem>
#include <fstream>
#include <system_error>

#include "base/outside_text.h"

namespace coilassay {

namespace {

constexpr std::string_view kTraceHead = "# coilassay trace";  // as every caller begins it

class LoggedStream final : public ByteStream {
 public:
  LoggedStream(std::unique_ptr<ByteStream> inner, std::shared_ptr<ByteLog> log) : inner_(std::move(inner)), log_(std::move(log)) {
    log_->remark("opened " + inner_->name());
  }
  ~LoggedStream() override { log_->remark("closed"); }
  LoggedStream(const LoggedStream&) = delete;
  LoggedStream& operator=(const LoggedStream&) = delete;

  const std::string& name() const override { return inner_->name(); }
  Result<void> write(std::string_view bytes, Span patience) override {
    log_->sent(bytes);
    auto done = inner_->write(bytes, patience);
    if (!done) log_->remark(done.error().finding);
    return done;
  }
  Result<std::size_t> read(std::span<char> into, Span patience) override {
    auto got = inner_->read(into, patience);
    if (!got) log_->remark(got.error().finding);
    else if (*got > 0) log_->came({into.data(), *got});
    return got;
  }

 private:
  std::unique_ptr<ByteStream> inner_;
  std::shared_ptr<ByteLog> log_;
};

/// A log begins anew only in place of an older one; what is no file (/dev/stderr) has nothing to lose.
bool may_be_replaced(const std::string& path) {
  std::error_code unknown;
  if (!std::filesystem::is_regular_file(path, unknown)) return true;
  std::ifstream in(path, std::ios::binary);
  std::string begin(kTraceHead.size(), '\0');
  in.read(begin.data(), static_cast<std::streamsize>(begin.size()));
  return in.gcount() == 0 ? std::filesystem::file_size(path, unknown) == 0 : begin == kTraceHead;
}

int digit_of(char c) {
  if (c >= '0' && c <= '9') return c - '0';
  if (c >= 'a' && c <= 'f') return c - 'a' + 10;
  return -1;
}

}  // namespace

std::string escaped_bytes(std::string_view bytes) {
  std::string text;
  for (const char c : bytes) {
    const auto u = static_cast<unsigned char>(c);
    if (c == '\n') text += "\\n";
    else if (c == '\r') text += "\\r";
    else if (c == '\t') text += "\\t";
    else if (c == '\\') text += "\\\\";
    else if (u < 0x20 || u > 0x7e) text += fmt::format("\\x{:02x}", u);
    else text += c;
  }
  return text;
}

std::string unescaped_bytes(std::string_view text, bool& fine) {
  std::string bytes;
  for (std::size_t i = 0; i < text.size(); ++i) {
    if (text[i] != '\\') {
      bytes += text[i];
      continue;
    }
    const char next = ++i < text.size() ? text[i] : '\0';
    if (next == 'n') bytes += '\n';
    else if (next == 'r') bytes += '\r';
    else if (next == 't') bytes += '\t';
    else if (next == '\\') bytes += '\\';
    else if (next == 'x' && i + 2 < text.size() && digit_of(text[i + 1]) >= 0 && digit_of(text[i + 2]) >= 0) {
      bytes += static_cast<char>(digit_of(text[i + 1]) * 16 + digit_of(text[i + 2]));
      i += 2;
    } else {
      fine = false;
      return bytes;
    }
  }
  return bytes;
}

ByteLog::ByteLog(std::string path, std::string head, std::size_t largest)
    : path_(std::move(path)), head_(std::move(head)), largest_(largest), begun_(std::chrono::steady_clock::now()) {}

ByteLog::~ByteLog() {
  if (descriptor_ >= 0) close(descriptor_);
}

Result<std::shared_ptr<ByteLog>> ByteLog::begin(const std::string& path, const std::string& head, std::size_t largest) {
  for (const std::string& file : {path, path + ".1"}) {
    if (may_be_replaced(file)) continue;
    return failure(Problem::cannot_write, file, "the file is there already and is no trace, and it would be lost", "give --trace another file name");
  }
  std::shared_ptr<ByteLog> log(new ByteLog(path, head, largest));
  if (!log->start()) {
    return failure(Problem::cannot_write, path, "the log cannot be made: " + std::generic_category().message(errno),
                   "give --trace a place where a file can be written");
  }
  return log;
}

bool ByteLog::start() {
  if (descriptor_ >= 0) close(descriptor_);
  descriptor_ = open(path_.c_str(), O_WRONLY | O_CREAT | O_TRUNC | O_CLOEXEC, 0644);
  written_ = 0;
  if (descriptor_ < 0) return false;
  put("# " + shown(head_, 300) + "\n");
  return true;
}

void ByteLog::remark(std::string_view words) { put("# " + shown(words, 300) + "\n"); }

void ByteLog::line(char direction, std::string_view bytes) {
  const double now = std::chrono::duration<double>(std::chrono::steady_clock::now() - begun_).count();
  put(fmt::format("{:12.6f} {} {}\n", now, direction, escaped_bytes(bytes)));
}

void ByteLog::put(const std::string& text) {
  if (descriptor_ < 0) return;
  if (written_ > 0 && written_ + text.size() > largest_) {
    std::rename(path_.c_str(), (path_ + ".1").c_str());
    if (!start()) return;
  }
  // A log that cannot be written any more (a full disk) must not stop the measurement.
  const ssize_t done = write(descriptor_, text.data(), text.size());
  if (done > 0) written_ += static_cast<std::size_t>(done);
}

StreamOpener logged(StreamOpener opener, std::shared_ptr<ByteLog> log) {
  return [opener = std::move(opener), log = std::move(log)]() -> Result<std::unique_ptr<ByteStream>> {
    auto stream = opener();
    if (!stream) {
      log->remark(stream.error().finding);
      return stream;
    }
    return std::make_unique<LoggedStream>(std::move(*stream), log);
  };
}

}  // namespace coilassay
