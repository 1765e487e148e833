// How long work tells how far it is, without knowing who listens.
#pragma once

#include <cstdint>
#include <string_view>

namespace coilassay {

class Progress {
 public:
  virtual ~Progress() = default;
  /// `done` of `total` (0: not known) in words such as "reading ring.csv". May be called often; false asks to stop.
  virtual bool advance(std::string_view what, std::uint64_t done, std::uint64_t total) = 0;
};

/// Listens to nothing.
class NoProgress final : public Progress {
 public:
  bool advance(std::string_view, std::uint64_t, std::uint64_t) override { return true; }
};

}  // namespace coilassay
