// What the program answered beside the truth that the generator put in: demo_compare TRUTH.json
// NAME=RESULT.json …

#include <fmt/format.h>

#include <cstdio>
#include <exception>
#include <fstream>
#include <nlohmann/json.hpp>
#include <string>

namespace {

using nlohmann::json;

json read(const std::string& path) {
    std::ifstream file(path);
    if (!file) throw std::runtime_error("cannot read " + path);
    return json::parse(file);
}

void print_quantity(const std::string& name, double truth, const json& answer) {
    const double value = answer.at("value"), low = answer.at("interval").at(0),
                 high = answer.at("interval").at(1);
    fmt::print("    {:<20} {:>12.6g} {:>12.6g}   {:>10.6g} … {:<10.6g} {:<8} {}\n", name, truth, value, low,
               high, answer.value("unit", ""), low <= truth && truth <= high ? "inside" : "outside");
}

void print_article(const std::string& name, const json& truth, const json& result) {
    fmt::print("  {} ({} event{})\n", name, result.value("event_count", 0),
               result.value("event_count", 0) == 1 ? "" : "s");
    for (const char* quantity :
         {"natural_frequency", "damping_ratio", "stiffness", "damping_coefficient", "static_deflection"})
        if (truth.contains(quantity) && result.at("quantities").contains(quantity))
            print_quantity(quantity, truth.at(quantity), result.at("quantities").at(quantity));
}

}  // namespace

int main(int argument_count, char** arguments) try {
    if (argument_count < 3) {
        fmt::print(stderr, "usage: demo_compare TRUTH.json NAME=RESULT.json …\n");
        return 2;
    }
    const json truth = read(arguments[1]);
    fmt::print("    {:<20} {:>12} {:>12}   {:>10}   {:<10}\n", "", "truth", "answer", "interval", "at 95 %");
    for (int i = 2; i < argument_count; ++i) {
        const std::string argument = arguments[i];
        const std::size_t equals = argument.find('=');
        const std::string name = argument.substr(0, equals);
        print_article(name, truth.at(name), read(argument.substr(equals + 1)).at("result"));
    }
    return 0;
} catch (const std::exception& error) {
    fmt::print(stderr, "demo_compare: {}\n", error.what());
    return 1;
}
