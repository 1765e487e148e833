#include "app/runs/version.h"

namespace coilassay {

std::string version() {
  return COILASSAY_VERSION;
}
std::string program_name() {
  return "coilassay " + version();
}

}  // namespace coilassay
