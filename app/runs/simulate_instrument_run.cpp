#include "app/runs/simulate_instrument_run.h"

#include "acquire/instrument/profile.h"
#include "acquire/synthetic/stand_in_server.h"

namespace coilassay {

Result<void> run_simulate_instrument(const SimulateInstrumentJob& job) {
  const auto profile = read_instrument_profile(job.profile);
  if (!profile) return failure(profile);
  synthetic::StandInSetup setup = job.setup;
  setup.profile = *profile;
  auto stand_in = synthetic::StandIn::make(std::move(setup));
  if (!stand_in) return failure(stand_in);
  const auto server = synthetic::StandInServer::listen(job.listen);
  if (!server) return failure(server);
  if (job.listening) job.listening(server->port());
  server->run(*stand_in, job.line_every_s, job.stopped);
  return {};
}

}  // namespace coilassay
