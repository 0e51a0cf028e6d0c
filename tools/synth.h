#pragma once
/// evenfield synth SCENE.toml --out DIR: frames of a simulated camera, their session file and the truth about
/// them.

namespace evenfield {

/// argv[0] is the sub-command's name; the value is the exit status.
int synth_command(int argc, char** argv);

}  // namespace evenfield
