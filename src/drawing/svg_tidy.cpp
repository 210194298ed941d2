#include "drawing/svg_tidy.hpp"

#include <fmt/format.h>

#include <cctype>
#include <charconv>
#include <string_view>

#include "drawing/fonts.hpp"
#include "drawing/palette.hpp"

namespace ringwright::drawing {
namespace {

void replace_all(std::string& text, std::string_view from, std::string_view to) {
    std::string changed;
    changed.reserve(text.size());
    std::size_t begin = 0;
    for (std::size_t at = text.find(from); at != std::string::npos; at = text.find(from, begin)) {
        changed.append(text, begin, at - begin).append(to);
        begin = at + from.size();
    }
    changed.append(text, begin);
    text = std::move(changed);
}

std::string hex(Colour colour) {
    return fmt::format("#{:02x}{:02x}{:02x}", colour.red, colour.green, colour.blue);
}

/// Shortest text of a number with this many decimals.
std::string short_number(double value, int decimals) {
    const std::string text = fmt::format("{:.{}f}", value, decimals);
    std::string_view shown = text;
    while (decimals > 0 && shown.ends_with('0')) shown.remove_suffix(1);
    if (shown.ends_with('.')) shown.remove_suffix(1);
    if (shown == "-0" || shown == "0") return "0";
    const bool negative = shown.starts_with('-');
    if (negative) shown.remove_prefix(1);
    if (shown.starts_with("0.")) shown.remove_prefix(1);
    return fmt::format("{}{}", negative ? "-" : "", shown);
}

bool ends_in_digit(const std::string& text) {
    return !text.empty() && std::isdigit(static_cast<unsigned char>(text.back())) != 0;
}

/// Rounds the numbers of one path and drops the blanks and letters that SVG does not need: a line command is
/// understood after another one.
std::string rounded_path(std::string_view path) {
    // The points of a long curve lie so close that a tenth of a point shows nowhere.
    const int decimals = path.size() > 600 ? 1 : 2;
    std::string text;
    char command = ' ';
    const char* at = path.data();
    const char* const end = at + path.size();
    while (at < end) {
        if (std::isalpha(static_cast<unsigned char>(*at)) != 0) {
            const bool implied = *at == 'L' && (command == 'L' || command == 'M');
            if (!implied) text += *at;
            command = *at++;
        } else if (*at == ' ' || *at == ',') {
            ++at;
        } else {
            double value = 0.0;
            const auto [next, error] = std::from_chars(at, end, value);
            if (error != std::errc()) return std::string(path);
            const std::string number = short_number(value, decimals);
            if (ends_in_digit(text) && number.front() != '-') text += ' ';
            text += number;
            at = next;
        }
    }
    return text;
}

/// Rounds the numbers within every attribute of this name.
std::string with_rounded(const std::string& svg, std::string_view attribute) {
    const std::string opening = fmt::format(" {}=\"", attribute);
    std::string text;
    text.reserve(svg.size());
    std::size_t begin = 0;
    for (std::size_t at = svg.find(opening); at != std::string::npos; at = svg.find(opening, begin)) {
        const std::size_t value = at + opening.size(), end = svg.find('"', value);
        text.append(svg, begin, value - begin);
        text += rounded_path(std::string_view(svg).substr(value, end - value));
        begin = end;
    }
    return text.append(svg, begin);
}

/// Cairo writes shares of a colour with up to eight digits; all that matter are the 255 steps.
std::string with_hex_colours(const std::string& svg) {
    std::string text;
    std::size_t begin = 0;
    for (std::size_t at = svg.find("rgb("); at != std::string::npos; at = svg.find("rgb(", begin)) {
        const std::size_t end = svg.find(')', at);
        double share[3] = {};
        const char* from = svg.data() + at + 4;
        for (double& part : share) {
            from = std::from_chars(from, svg.data() + end, part).ptr;
            while (from < svg.data() + end && (*from == '%' || *from == ',')) ++from;
        }
        text.append(svg, begin, at - begin);
        text += fmt::format("#{:02x}{:02x}{:02x}", static_cast<int>(share[0] * 2.55 + 0.5),
                            static_cast<int>(share[1] * 2.55 + 0.5), static_cast<int>(share[2] * 2.55 + 0.5));
        begin = end + 1;
    }
    return text.append(svg, begin);
}

std::string with_renumbered_groups(const std::string& svg) {
    std::string text;
    std::size_t begin = 0, number = 0;
    for (std::size_t at = svg.find("id=\"surface"); at != std::string::npos;
         at = svg.find("id=\"surface", begin)) {
        const std::size_t end = svg.find('"', at + 4);
        text.append(svg, begin, at - begin);
        text += fmt::format("id=\"surface{}\"", ++number);
        begin = end + 1;
    }
    return text.append(svg, begin);
}

}  // namespace

std::string tidy_svg(const std::string& svg) {
    std::string text = with_renumbered_groups(svg);
    for (const std::string_view needless :
         {"stroke-miterlimit:10;", "stroke-opacity:1;", "fill-opacity:1;", "fill-rule:nonzero;",
          "stroke-linecap:butt;", "stroke-linejoin:miter;"})
        replace_all(text, needless, "");
    replace_all(text, "style=\" ", "style=\"");
    text = with_hex_colours(text);
    return with_rounded(text, "d");
}

std::string escaped(const std::string& text) {
    std::string safe;
    for (const char character : clean_utf8(text)) switch (character) {
            case '&':
                safe += "&amp;";
                break;
            case '<':
                safe += "&lt;";
                break;
            case '>':
                safe += "&gt;";
                break;
            case '"':
                safe += "&quot;";
                break;
            case '\'':
                safe += "&#39;";
                break;
            default:
                safe += character;
        }
    return safe;
}

std::string with_text(const std::string& svg, const std::vector<WrittenText>& texts, Point offset) {
    std::string added = "<g font-family=\"Liberation Sans, Arial, Helvetica, DejaVu Sans, sans-serif\">\n";
    for (const WrittenText& written : texts) {
        const TextStyle& style = written.style;
        const char* anchor = style.anchor == Anchor::start    ? ""
                             : style.anchor == Anchor::middle ? " text-anchor=\"middle\""
                                                              : " text-anchor=\"end\"";
        added += fmt::format("<text x=\"{}\" y=\"{}\" font-size=\"{}\"{}{} style=\"fill:{}\">{}</text>\n",
                             short_number(written.at.x + offset.x, 2),
                             short_number(written.at.y + offset.y, 2), short_number(style.size, 2), anchor,
                             style.weight == Weight::bold ? " font-weight=\"bold\"" : "", hex(style.colour),
                             escaped(written.text));
    }
    const std::size_t end = svg.rfind("</svg>");
    return svg.substr(0, end) + added + "</g>\n" + svg.substr(end);
}

std::string inline_svg(const std::string& svg, const std::string& id_prefix, const std::string& name) {
    std::string text = svg.substr(svg.find("<svg"));
    const std::size_t body = text.find('>') + 1;
    const std::size_t box = text.find("viewBox=\"") + 9;
    const std::string view = text.substr(box, text.find('"', box) - box);
    text.erase(0, body);
    replace_all(text, "id=\"", fmt::format("id=\"{}", id_prefix));
    replace_all(text, "xlink:href=\"#", fmt::format("href=\"#{}", id_prefix));
    replace_all(text, "url(#", fmt::format("url(#{}", id_prefix));
    for (const ThemedColour& colour : themed_colours) {
        const std::string light = hex(colour.light);
        replace_all(text, ":" + light, fmt::format(":var({},{})", colour.property, light));
    }
    return fmt::format(
               "<svg xmlns=\"http://www.w3.org/2000/svg\" viewBox=\"{}\" role=\"img\" aria-label=\"{}\">",
               view, escaped(name)) +
           text;
}

}  // namespace ringwright::drawing
