// Standard output that remembers why a write failed.
#pragma once

#include <streambuf>
#include <vector>

namespace coilassay {

/// Buffers what goes to a file descriptor. After the first failed write everything fails, and sync() leaves that first
/// reason in errno: a full disk is told from a reader that went away.
class DescriptorBuffer final : public std::streambuf {
 public:
  explicit DescriptorBuffer(int descriptor);
  ~DescriptorBuffer() override;
  DescriptorBuffer(const DescriptorBuffer&) = delete;
  DescriptorBuffer& operator=(const DescriptorBuffer&) = delete;

 protected:
  int_type overflow(int_type c) override;
  int sync() override;

 private:
  int descriptor_;
  int trouble_ = 0;  // errno of the first failure
  std::vector<char> block_;
};

}  // namespace coilassay
