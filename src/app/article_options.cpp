#include "app/article_options.hpp"

#include <fmt/format.h>

#include <CLI/App.hpp>
#include <CLI/Config.hpp>
#include <CLI/Formatter.hpp>
#include <algorithm>
#include <utility>

#include "ringwright/error.hpp"

namespace ringwright::app {
namespace {

constexpr const char* group = "About the article";

std::optional<MeasuredValue> positive_value(const std::string& text, const char* option,
                                            Dimension dimension) {
    if (text.empty()) return std::nullopt;
    MeasuredValue measured = parse_measured_value(text, option, dimension);
    if (!(measured.value > 0.0))
        throw UsageError(
            {option, "", fmt::format("{} is not above zero", text), "Give the value that was weighed"});
    return measured;
}

std::optional<MeasuredValue> gravity_value(const std::string& text) {
    constexpr double least = 9.7, most = 9.9;  // m/s², on the ground
    if (text.empty()) return std::nullopt;
    MeasuredValue measured = parse_measured_value(text, "--gravity", Dimension::acceleration);
    if (!(measured.value > least && measured.value < most))
        throw UsageError({"--gravity", "", fmt::format("{} is not found on the ground", text),
                          "Give it as in --gravity \"9.8128 m/s2\""});
    return measured;
}

MeasuredValue added_mass_from(const std::string& text) {
    MeasuredValue measured = parse_measured_value(text, "--added-mass", Dimension::mass);
    if (measured.value < 0.0)
        throw UsageError({"--added-mass", "", fmt::format("{} is below zero", text),
                          "Give what was added to the article for the FILE before it"});
    return measured;
}

}  // namespace

void add_article_options(CLI::App& command, ArticleArguments& arguments) {
    const auto add = [&](const char* name, std::string& text, const char* help) {
        command.add_option(name, text, help)->type_name("VALUE")->group(group);
    };
    add("--mass", arguments.mass,
        "Moving mass: \"12.40(5) kg\" with a standard uncertainty, \"12.4 ± 0.1 kg\" with a tolerance");
    add("--inertia", arguments.inertia, "Moment of inertia of a torsion test, e.g. \"0.0100(2) kg m2\"");
    add("--spring-mass", arguments.spring_mass, "Mass of the spring, a third of which moves");
    add("--gravity", arguments.gravity,
        "Of the place, for drops, e.g. \"9.8128(2) m/s2\"; else 9.80665 m/s², from 9.780 to 9.832");
}

Article article_from(const ArticleArguments& arguments) {
    if (!arguments.mass.empty() && !arguments.inertia.empty())
        throw UsageError({"--inertia", "", "--mass and --inertia exclude each other",
                          "Give --mass for a test in a straight line, --inertia for a torsion test"});
    return {positive_value(arguments.mass, "--mass", Dimension::mass),
            positive_value(arguments.inertia, "--inertia", Dimension::inertia),
            positive_value(arguments.spring_mass, "--spring-mass", Dimension::mass),
            gravity_value(arguments.gravity)};
}

CLI::Option* add_added_mass_option(CLI::App& command, std::vector<std::string>& added_masses) {
    return command
        .add_option("--added-mass", added_masses,
                    "Mass added to the article for the FILE before it; two or more "
                    "different ones give stiffness and mass")
        ->type_name("VALUE")
        ->allow_extra_args(false)
        ->group(group);
}

void add_file_arguments(CLI::App& command, FileArguments& arguments) {
    arguments.file_option =
        command.add_option("FILE", arguments.files, "Recordings, CSV or sound files; - is standard input")
            ->required()
            ->type_name("")
            ->allow_extra_args(true);
    arguments.added_mass_option = add_added_mass_option(command, arguments.added_masses);
}

void load_sides(const CLI::App& command, const CLI::Option* added_mass_option,
                const std::vector<std::string>& added_masses, std::vector<FileSide>& sides) {
    std::size_t next_mass = 0;
    LoadedFile* last = nullptr;
    for (const CLI::Option* option : command.parse_order()) {
        if (option == added_mass_option && next_mass < added_masses.size()) {
            const std::string& text = added_masses[next_mass++];
            if (last == nullptr || last->added_mass)
                throw UsageError({"--added-mass", "", fmt::format("{} follows no FILE of its own", text),
                                  "Example: a.csv --added-mass \"0 kg\" b.csv --added-mass \"1.000(1) kg\""});
            last->added_mass = added_mass_from(text);
        }
        for (FileSide& side : sides)
            if (option == side.option && side.loaded.size() < side.files.size())
                last = &side.loaded.emplace_back(LoadedFile{side.files[side.loaded.size()], std::nullopt});
    }
    std::ptrdiff_t from_standard_input = 0;
    for (const FileSide& side : sides) from_standard_input += std::ranges::count(side.files, "-");
    if (from_standard_input > 1)
        throw UsageError({"FILE", "", "standard input is named twice", "Name - once"});
}

std::vector<LoadedFile> files_from(const CLI::App& command, const FileArguments& arguments) {
    std::vector<FileSide> sides{{arguments.file_option, arguments.files}};
    load_sides(command, arguments.added_mass_option, arguments.added_masses, sides);
    return std::move(sides.front().loaded);
}

}  // namespace ringwright::app
