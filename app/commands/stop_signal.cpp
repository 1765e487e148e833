#include "app/commands/stop_signal.h"

#include <csignal>
#include <initializer_list>

namespace coilassay {

namespace {

volatile std::sig_atomic_t stop_came = 0;

void note(int) { stop_came = 1; }

void set_handler(int signal, void (*handler)(int)) {
  struct sigaction action {};
  action.sa_handler = handler;
  // A second signal finds the default again. Waiting calls return, so that the note is seen at once.
  action.sa_flags = handler == SIG_DFL ? 0 : static_cast<int>(SA_RESETHAND);
  sigaction(signal, &action, nullptr);
}

}  // namespace

StopSignal::StopSignal() {
  stop_came = 0;
  for (const int signal : {SIGINT, SIGTERM}) set_handler(signal, note);
}

StopSignal::~StopSignal() {
  for (const int signal : {SIGINT, SIGTERM}) set_handler(signal, SIG_DFL);
}

bool StopSignal::came() { return stop_came != 0; }

}  // namespace coilassay
