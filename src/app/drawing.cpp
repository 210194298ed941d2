#include "app/drawing.hpp"

#include <dlfcn.h>
#include <fmt/format.h>

#include <CLI/App.hpp>
#include <CLI/Config.hpp>
#include <CLI/Formatter.hpp>
#include <algorithm>
#include <cctype>
#include <filesystem>
#include <system_error>

#include "app/messages.hpp"
#include "ringwright/drawing_module.hpp"
#include "ringwright/error.hpp"
#include "ringwright/version.hpp"

namespace ringwright::app {
namespace {

constexpr const char* module_name = "ringwright_drawing.so";

[[noreturn]] void fail_to_load(const std::string& why) {
    throw OutputError({module_name, "", "reports and figures cannot be drawn: " + without_period(why),
                       "Keep this file beside the program, and install Cairo, Pango and PLplot"});
}

/// Beside the program, or in lib/ringwright beside its folder where it was installed.
std::filesystem::path module_path() {
    std::error_code error;
    const auto folder = std::filesystem::read_symlink("/proc/self/exe", error).parent_path();
    const auto beside = folder / module_name;
    if (std::filesystem::exists(beside, error)) return beside;
    return folder.parent_path() / "lib" / "ringwright" / module_name;
}

const DrawingFunctions& load_module() {
    void* module = dlopen(module_path().c_str(), RTLD_NOW | RTLD_LOCAL);
    if (module == nullptr) fail_to_load(dlerror());
    void* symbol = dlsym(module, drawing_module_symbol);
    if (symbol == nullptr) fail_to_load(dlerror());
    const DrawingFunctions* functions = reinterpret_cast<decltype(&ringwright_drawing_functions)>(symbol)();
    if (functions->version != version())
        fail_to_load(fmt::format("it is of version {}, the program of {}", functions->version, version()));
    return *functions;
}

const DrawingFunctions& drawing() {
    static const DrawingFunctions& functions = load_module();
    return functions;
}

PaperSize paper_from(const std::string& text) {
    if (text == "a4" || text == "A4") return PaperSize::a4;
    if (text == "letter" || text == "Letter") return PaperSize::letter;
    throw UsageError(
        {"--paper", "", fmt::format("\"{}\" is no paper that is known", text), "Give a4 or letter"});
}

/// `missing` says of which recordings there are no figures.
const NamedFigure& figure_named(const std::vector<NamedFigure>& figures, const std::string& name,
                                const std::vector<std::string>& missing) {
    const auto found = std::ranges::find(figures, name, &NamedFigure::name);
    if (found != figures.end()) return *found;
    std::string names, gone;
    for (const NamedFigure& figure : figures) names += (names.empty() ? "" : ", ") + figure.name;
    for (const std::string& sentence : missing) gone.append(". ").append(without_period(sentence));
    throw UsageError(
        {"--figure", "",
         (figures.empty() ? std::string("this result has no figure")
                          : fmt::format("\"{}\" is not among the figures of this result", name)) +
             gone,
         !missing.empty()  ? "Name the folder with the recording: --recordings FOLDER"
         : figures.empty() ? std::string("Ask for the report: -o report.html")
                           : "Give one of " + names});
}

ImageFormat image_format_from(DrawnForm form) {
    if (form == DrawnForm::svg) return ImageFormat::svg;
    return form == DrawnForm::pdf ? ImageFormat::pdf : ImageFormat::png;
}

std::string one_figure(const ReportInput& input, const std::string& name, DrawnForm form) {
    if (form == DrawnForm::html)
        throw UsageError(
            {"--figure", "", "a single figure is not written as HTML", "Give -o with .svg, .pdf or .png"});
    std::vector<NamedFigure> figures = drawing().figures_of_result(input.result_json, input.file);
    figures.insert(figures.end(), input.figures.begin(), input.figures.end());
    const bool judged = std::ranges::find(figures, "verdict", &NamedFigure::name) != figures.end();
    const bool decay = std::ranges::find(figures, "decay-1", &NamedFigure::name) != figures.end();
    const std::string first = judged            ? "verdict"
                              : decay           ? "decay-1"
                              : figures.empty() ? ""
                                                : figures.front().name;
    return drawing().draw_figure(
        figure_named(figures, name.empty() ? first : name, input.missing_figures).figure,
        image_format_from(form), {});
}

/// In lower case and without the point.
std::string ending_of(const std::string& output) {
    std::string ending = std::filesystem::path(output).extension().string();
    if (!ending.empty()) ending.erase(0, 1);
    std::ranges::transform(ending, ending.begin(),
                           [](unsigned char letter) { return static_cast<char>(std::tolower(letter)); });
    return ending;
}

}  // namespace

void add_drawing_options(CLI::App& command, DrawingArguments& arguments, const std::string& names) {
    constexpr const char* group = "About the answer";
    command.add_option("--figure", arguments.figure, "Draw this figure alone: " + names)
        ->type_name("NAME")
        ->group(group);
    command.add_option("--paper", arguments.paper, "Paper of a report as PDF")
        ->type_name("a4|letter")
        ->capture_default_str()
        ->group(group);
}

std::optional<DrawnForm> drawn_form_of(const std::string& output) {
    const std::string ending = ending_of(output);
    if (ending == "html" || ending == "htm") return DrawnForm::html;
    if (ending == "pdf") return DrawnForm::pdf;
    if (ending == "svg") return DrawnForm::svg;
    if (ending == "png") return DrawnForm::png;
    return std::nullopt;
}

void require_known_ending(const std::string& output, bool draws) {
    const std::string ending = ending_of(output);
    for (const char* known : {"", "txt", "csv", "json", "jsonl"})
        if (ending == known) return;
    const bool drawn = drawn_form_of(output).has_value();
    if (drawn && draws) return;
    throw UsageError({"-o", "",
                      drawn ? fmt::format("this command draws nothing, so it writes no .{}", ending)
                            : fmt::format("\".{}\" is no ending that is known", ending),
                      draws ? "Give a name that ends in .html, .pdf, .svg or .png for a drawn answer, in "
                              ".txt, .csv or .json for text in the form of --format"
                            : "Give a name that ends in .txt, .csv or .json"});
}

bool require_drawable(const std::string& output, const DrawingArguments& arguments) {
    require_known_ending(output, true);
    const bool drawn = drawn_form_of(output).has_value();
    if (!drawn && !arguments.figure.empty())
        throw UsageError({"--figure", "", "there is no file to draw it in",
                          "Give -o with a name that ends in .svg, .pdf or .png"});
    return drawn;
}

void refuse_drawn(const std::string& output) {
    if (drawn_form_of(output))
        throw UsageError({"-o", "",
                          fmt::format("\"{}\" asks for a drawing, and this answer has none", output),
                          "Give another ending, such as .txt or .json"});
}

std::vector<NamedFigure> sample_figures(const Identification& identification) {
    return drawing().figures_of(identification);
}

std::string drawn_answer(const ReportInput& input, const DrawingArguments& arguments, DrawnForm form) {
    const PaperSize paper = paper_from(arguments.paper);
    const bool picture = form == DrawnForm::svg || form == DrawnForm::png;
    if (picture || !arguments.figure.empty()) return one_figure(input, arguments.figure, form);
    return form == DrawnForm::html ? drawing().report_html(input) : drawing().report_pdf(input, paper);
}

}  // namespace ringwright::app
