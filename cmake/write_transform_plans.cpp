// Run by the build: writes what FFTW's planner decides for each length of transform as a C++ table, so that
// the program need not decide again at each start (src/value/transform_plans.hpp).

#include <fftw3.h>

#include <cstdio>
#include <cstdlib>
#include <memory>

namespace {

struct FreeFftw {
    void operator()(void* memory) const { fftw_free(memory); }
};

/// The planner's decision for one length, as FFTW writes it: lines without quotes or backslashes.
char* decision(int length) {
    const std::unique_ptr<double, FreeFftw> input(fftw_alloc_real(static_cast<std::size_t>(length)));
    const std::unique_ptr<fftw_complex, FreeFftw> output(
        fftw_alloc_complex(static_cast<std::size_t>(length) / 2 + 1));
    fftw_forget_wisdom();
    fftw_plan plan = fftw_plan_dft_r2c_1d(length, input.get(), output.get(), FFTW_ESTIMATE);
    if (plan == nullptr) return nullptr;
    fftw_destroy_plan(plan);
    return fftw_export_wisdom_to_string();
}

}  // namespace

int main(int argc, char** argv) {
    constexpr int shortest = 16, longest = 1 << 21;
    if (argc != 2) return 2;
    std::FILE* out = std::fopen(argv[1], "w");
    if (out == nullptr) return 1;
    std::fputs("#include \"value/transform_plans.hpp\"\n\nnamespace ringwright {\n\n", out);
    std::fputs("const char* kept_decision(std::size_t length) {\n    switch (length) {\n", out);
    for (int length = shortest; length <= longest; length *= 2) {
        char* text = decision(length);
        if (text == nullptr) return 1;
        std::fprintf(out, "        case %d:\n            return R\"plan(%s)plan\";\n", length, text);
        std::free(text);
    }
    std::fputs("        default:\n            return nullptr;\n    }\n}\n\n}  // namespace ringwright\n",
               out);
    return std::fclose(out) == 0 ? 0 : 1;
}
