#pragma once
/// The session file of simulated frames, as a user would have written it beside them.

#include <string>

#include "simulate/scene.h"

namespace evenfield {

std::string session_text(const Scene& scene);

}  // namespace evenfield
