#pragma once
// libsndfile, loaded when the first sound file is read: with the decoders it brings it is seven libraries,
// which a command that reads text would wait for.

#include <sndfile.h>

namespace ringwright {

/// The functions of libsndfile that are used here, under their own names and with their own meaning.
struct SoundLibrary {
    decltype(&::sf_open_virtual) open_virtual;
    decltype(&::sf_strerror) strerror;
    decltype(&::sf_seek) seek;
    decltype(&::sf_readf_double) readf_double;
    decltype(&::sf_command) command;
    decltype(&::sf_close) close;
};

/// Throws InputError when the library is not installed; it stays loaded until the process ends.
[[nodiscard]] const SoundLibrary& sound_library();

}  // namespace ringwright
