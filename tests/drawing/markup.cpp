#include "drawing/markup.hpp"

#include <algorithm>

namespace ringwright::markup {
namespace {

bool never_closed(const std::string& name) {
    return name == "meta" || name == "br" || name == "link" || name == "img";
}

}  // namespace

std::string nesting_fault(const std::string& text, bool html) {
    std::vector<std::string> open;
    for (std::size_t at = text.find('<'); at != std::string::npos; at = text.find('<', at + 1)) {
        const std::size_t end = text.find('>', at);
        if (end == std::string::npos) return "a tag without end";
        if (text[at + 1] == '?' || text[at + 1] == '!') continue;
        const bool closing = text[at + 1] == '/';
        const std::size_t from = at + (closing ? 2 : 1);
        const std::string name = text.substr(from, text.find_first_of(" />\n", from) - from);
        if (closing) {
            if (open.empty() || open.back() != name) return "</" + name + "> closes nothing";
            open.pop_back();
        } else if (text[end - 1] != '/' && !(html && never_closed(name))) {
            open.push_back(name);
        }
    }
    return open.empty() ? "" : "<" + open.back() + "> stays open";
}

std::vector<std::string> attribute_values(const std::string& text, const std::string& name) {
    std::vector<std::string> values;
    const std::string opening = ' ' + name + "=\"";
    for (std::size_t at = text.find(opening); at != std::string::npos; at = text.find(opening, at + 1)) {
        const std::size_t from = at + opening.size();
        values.push_back(text.substr(from, text.find('"', from) - from));
    }
    return values;
}

std::size_t count_of(const std::string& text, const std::string& wanted) {
    std::size_t count = 0;
    for (std::size_t at = text.find(wanted); at != std::string::npos; at = text.find(wanted, at + 1)) ++count;
    return count;
}

}  // namespace ringwright::markup
