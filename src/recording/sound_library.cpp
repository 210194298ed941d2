#include "recording/sound_library.hpp"

#include <dlfcn.h>

#include "ringwright/error.hpp"

namespace ringwright {
namespace {

[[noreturn]] void refuse(const std::string& why) {
    throw InputError(Problem{"", "", "sound files cannot be read: " + why,
                             "Install libsndfile (Debian: the package libsndfile1)."});
}

template <typename Function>
void look_up(void* library, const char* name, Function& function) {
    function = reinterpret_cast<Function>(::dlsym(library, name));
    if (function == nullptr) refuse(std::string("libsndfile has no ") + name);
}

SoundLibrary load() {
    void* library = ::dlopen("libsndfile.so.1", RTLD_NOW | RTLD_LOCAL);
    if (library == nullptr) refuse(::dlerror());
    SoundLibrary functions{};
    look_up(library, "sf_open_virtual", functions.open_virtual);
    look_up(library, "sf_strerror", functions.strerror);
    look_up(library, "sf_seek", functions.seek);
    look_up(library, "sf_readf_double", functions.readf_double);
    look_up(library, "sf_command", functions.command);
    look_up(library, "sf_close", functions.close);
    return functions;
}

}  // namespace

const SoundLibrary& sound_library() {
    static const SoundLibrary functions = load();
    return functions;
}

}  // namespace ringwright
