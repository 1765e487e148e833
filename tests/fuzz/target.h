// One target, two builds: libFuzzer's entry under the preset `fuzz`, and a part of the ordinary test program that plays the
// kept inputs.
#pragma once

#include <cstddef>
#include <cstdint>
#include <string_view>

namespace coilassay::fuzz {

/// Looks at one input; whatever is not right ends the process (assert, sanitizer, `require`).
using Target = void (*)(std::string_view bytes);

/// Ends the process, with what was expected, when it is not so: a property that must hold for every input.
void require(bool holds, const char* what);

struct Registered {
  Registered(const char* name, Target target);
};

}  // namespace coilassay::fuzz

#ifdef COILASSAY_FUZZING
#define COILASSAY_FUZZ_TARGET(name, target)                                            \
  extern "C" int LLVMFuzzerTestOneInput(const std::uint8_t* data, std::size_t size) { \
    target({reinterpret_cast<const char*>(data), size});                              \
    return 0;                                                                          \
  }
#else
/// `name` is that of the folder in tests/fuzz/corpus.
#define COILASSAY_FUZZ_TARGET(name, target) \
  static const ::coilassay::fuzz::Registered registered(#name, target);
#endif
