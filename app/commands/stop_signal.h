// Ctrl-C and a request to end (SIGTERM), for commands that go on until they are stopped.
#pragma once

namespace coilassay {

/// From now on the first such signal is noted and the second ends the process, as it would have done at once before.
class StopSignal {
 public:
  StopSignal();
  ~StopSignal();
  StopSignal(const StopSignal&) = delete;
  StopSignal& operator=(const StopSignal&) = delete;
  static bool came();
};

}  // namespace coilassay
