// Values with units and uncertainties, as on the command line. The first byte chooses the dimension wanted.

#include "fuzz/reading.hpp"
#include "ringwright/measured_value.hpp"
#include "ringwright/units.hpp"

using namespace ringwright;

extern "C" int LLVMFuzzerTestOneInput(const std::uint8_t* data, std::size_t size) {
    if (size == 0) return 0;
    const std::string_view text = fuzz::text_of(data + 1, size - 1);
    if (const auto unit = find_unit(text))
        fuzz::promise(unit->si_factor > 0.0 && std::isfinite(unit->si_factor));
    fuzz::promise(!suggested_unit(text).empty() || text.size() < 100'000);
    static constexpr Dimension wanted[] = {Dimension::mass, Dimension::inertia, Dimension::length,
                                           Dimension::stiffness};
    fuzz::with_messages([&] {
        const MeasuredValue value = parse_measured_value(text, "--mass", wanted[*data % 4]);
        fuzz::promise(std::isfinite(value.value) && std::isfinite(value.standard_uncertainty));
        fuzz::promise(value.standard_uncertainty >= 0.0);
    });
    fuzz::with_messages([&] { fuzz::promise(std::isfinite(parse_number(text, "--rate"))); });
    return 0;
}
