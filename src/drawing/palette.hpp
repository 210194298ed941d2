#pragma once
// The few colours of the figures. Each differs from the others in lightness as well as in hue, so that a grey
// print and a colour-blind reader keep them apart; marks differ in shape and lines in dash besides.

#include <array>
#include <string_view>

namespace ringwright::drawing {

struct Colour {
    int red = 0, green = 0, blue = 0;  ///< 0 … 255
    bool operator==(const Colour&) const = default;
};

namespace palette {
inline constexpr Colour ink{31, 35, 40};          // text, marks
inline constexpr Colour muted{89, 99, 110};       // axis numbers
inline constexpr Colour frame{139, 148, 158};     // axis lines
inline constexpr Colour grid{230, 234, 239};      // grid lines
inline constexpr Colour observed{158, 167, 177};  // what was recorded
inline constexpr Colour fitted{11, 92, 173};      // what was computed from it
inline constexpr Colour accent{190, 78, 20};      // envelope, half-power points, centre lines
inline constexpr Colour band{214, 231, 247};      // intervals and noise bands
inline constexpr Colour accepted{205, 232, 217};  // within limits
inline constexpr Colour guard{246, 226, 184};     // guard band
inline constexpr Colour shade{243, 245, 248};     // every second row, analysed stretches
inline constexpr Colour alarm{160, 28, 40};       // outside a limit
inline constexpr Colour paper{255, 255, 255};
}  // namespace palette

/// A colour of the palette, its name as a CSS property, and its counterpart on a dark page.
struct ThemedColour {
    Colour light;
    std::string_view property;
    std::string_view dark;
};

inline constexpr std::array<ThemedColour, 13> themed_colours{{
    {palette::ink, "--f-ink", "#e6edf3"},
    {palette::muted, "--f-muted", "#a3adb8"},
    {palette::frame, "--f-frame", "#6b7682"},
    {palette::grid, "--f-grid", "#2a313a"},
    {palette::observed, "--f-observed", "#7f8a96"},
    {palette::fitted, "--f-fitted", "#6cb4ff"},
    {palette::accent, "--f-accent", "#ff9d5c"},
    {palette::band, "--f-band", "#17324d"},
    {palette::accepted, "--f-accepted", "#17402b"},
    {palette::guard, "--f-guard", "#57451a"},
    {palette::shade, "--f-shade", "#1b2129"},
    {palette::alarm, "--f-alarm", "#ff7b84"},
    {palette::paper, "--f-paper", "#11151a"},
}};

}  // namespace ringwright::drawing
