#include "app/commands/descriptor_buffer.h"

#include <unistd.h>

#include <cerrno>

namespace coilassay {

DescriptorBuffer::DescriptorBuffer(int descriptor) : descriptor_(descriptor), block_(1 << 16) {
  setp(block_.data(), block_.data() + block_.size());
}

DescriptorBuffer::~DescriptorBuffer() {
  sync();
}

DescriptorBuffer::int_type DescriptorBuffer::overflow(int_type c) {
  if (sync() != 0) return traits_type::eof();
  if (!traits_type::eq_int_type(c, traits_type::eof())) sputc(traits_type::to_char_type(c));
  return traits_type::not_eof(c);
}

int DescriptorBuffer::sync() {
  const char* at = pbase();
  while (trouble_ == 0 && at != pptr()) {
    const ssize_t wrote = ::write(descriptor_, at, static_cast<std::size_t>(pptr() - at));
    if (wrote > 0) {
      at += wrote;
    } else if (wrote == 0) {
      trouble_ = EIO;  // must not happen for a count above zero, and must not hang
    } else if (errno != EINTR) {
      trouble_ = errno;
    }
  }
  setp(block_.data(), block_.data() + block_.size());
  errno = trouble_;
  return trouble_ == 0 ? 0 : -1;
}

}  // namespace coilassay
