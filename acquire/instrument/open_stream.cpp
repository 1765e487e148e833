#include "acquire/instrument/open_stream.h"

#include "acquire/instrument/descriptor_stream.h"
#include "acquire/instrument/played_session.h"
#include "acquire/instrument/serial_stream.h"

namespace coilassay {

StreamOpener opener_of(const LinkSetup& link, std::shared_ptr<ByteLog> log) {
  StreamOpener opener;
  switch (link.kind) {
    case LinkSetup::Kind::serial: opener = [link] { return open_serial(link.port, link.serial); }; break;
    case LinkSetup::Kind::tcp:
      opener = [link] {
        return open_tcp(link.port, std::chrono::duration_cast<Span>(std::chrono::duration<double>(link.timeout_s)));
      };
      break;
    case LinkSetup::Kind::recorded:
      opener = [link, played = std::make_shared<bool>(false)]() -> Result<std::unique_ptr<ByteStream>> {
        if (*played) return failure(Problem::instrument, link.port, "the recorded session is over", "play it with the profile it was recorded with");
        *played = true;
        return open_played_session(link.port);
      };
      break;
  }
  return log ? logged(std::move(opener), std::move(log)) : opener;
}

}  // namespace coilassay
